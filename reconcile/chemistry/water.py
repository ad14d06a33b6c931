"""Liquid water at one atmosphere: density, permittivity and ionization constant, each with its slope in temperature.

Kelvin appears here and in temperature.py alone; every function takes °C.
"""

from __future__ import annotations

import numpy as np

from reconcile.records.arrays import FloatArray

ZERO_CELSIUS = 273.15
LOW_C, HIGH_C = 0.0, 100.0  # range in which every equation of this file holds
# IAPWS SR6-08, table 3: volume at 0.1 MPa
_A5 = 1.93763157e-2
_A = ((4, 6.74458446e3), (5, -2.22521604e5), (7, 1.00231247e8), (8, -1.63552118e9), (9, 8.32299658e9))
_B = (
    (1, 5.78545292e-3),
    (2, -1.53195665e-2),
    (3, 3.11337859e-2),
    (4, -4.23546241e-2),
    (5, 3.38713507e-2),
    (6, -1.19946761e-2),
)
_COMPRESSIBILITY = 4.59e-4  # 1/MPa, at 20 °C by SR6-08; 4.1e-4 to 5.1e-4 between 0 and 100 °C
_GAS_CONSTANT_WATER = 0.46151805  # kJ/(kg K)
_E = ((-43.7527, -0.05), (299.504, -1.47), (-399.364, -2.11), (221.327, -2.31))

# IAPWS R11-07(2019), table 1
_ALPHA = (-0.702132, 8681.05, -24145.1)
_BETA = (0.813876, -51.4471, -0.46992)
_GAMMA = (6.141500e-1, 4.825133e4, -6.770793e4, 1.010210e7)
_MOLAR_MASS = 18.015268  # g/mol, as R11-07 has it
_SITES = 6


def density(temperature_c: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Density of liquid water at 0.101325 MPa and its slope.

    Parameters
    ----------
    temperature_c : ndarray (n,)
        Temperature [°C]; NaN stays NaN.

    Returns
    -------
    tuple of ndarray (n,)
        Density [kg/L] and its temperature derivative [kg/(L K)].

    Notes
    -----
    v = R T_R / p0 (a5 + sum a_i alpha^n_i + sum b_i beta^m_i), alpha = 10 K / (593 K - T), beta = 10 K / (T - 232 K).
    Valid from -20 to 110 °C; the step from p0 = 0.1 MPa to one atmosphere is made with the compressibility at 20 °C.

    References
    ----------
    IAPWS SR6-08(2011), Revised supplementary release on properties of liquid water at 0.1 MPa, equation 2 and table 3.
    """
    kelvin = np.asarray(temperature_c, float) + ZERO_CELSIUS
    alpha = 10.0 / (593.0 - kelvin)
    beta = 10.0 / (kelvin - 232.0)
    volume = np.full_like(kelvin, _A5)
    slope = np.zeros_like(kelvin)
    for base, terms, sign in ((alpha, _A, 1.0), (beta, _B, -1.0)):
        power, reached = base, 1
        for n, coefficient in terms:
            while reached < n:  # by multiplication: a fraction of the cost of a power, for many temperatures
                power, reached = power * base, reached + 1
            term = coefficient * power
            volume += term
            slope += sign * n * base * term
    scale = _GAS_CONSTANT_WATER * 10.0 / 0.1 / 1000.0 * 1000.0  # L/kg
    volume *= scale
    slope *= scale / 10.0
    squeezed = 1.0 + _COMPRESSIBILITY * (0.101325 - 0.1)
    return squeezed / volume, -squeezed * slope / volume**2


DENSITY_20C = float(density(np.array(20.0))[0])
"""Density of water at 20 °C [kg/L]; amounts by volume are at 20 °C unless the record says otherwise."""


def permittivity(temperature_c: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Static permittivity (dielectric constant) of liquid water at 0.1 MPa and its slope.

    Parameters
    ----------
    temperature_c : ndarray (n,)
        Temperature [°C]; NaN stays NaN.

    Returns
    -------
    tuple of ndarray (n,)
        Relative permittivity [-] and its temperature derivative [1/K].

    Notes
    -----
    sum a_i (T / 300 K)^b_i; valid from -20 to 110 °C; agrees with IAPWS R8-97 to 0.04.

    References
    ----------
    IAPWS SR6-08(2011), equation 9 and table 8.
    """
    ratio = (np.asarray(temperature_c, float) + ZERO_CELSIUS) / 300.0
    log = np.log(ratio)
    terms = [(a * np.exp(b * log), b) for a, b in _E]
    value = sum((t for t, _ in terms), np.zeros_like(ratio))
    slope = sum((t * b for t, b in terms), np.zeros_like(ratio)) / (300.0 * ratio)
    return value, slope


def pkw(temperature_c: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Ionization constant of liquid water at 0.1 MPa, as pKw on the molal scale, and its slope.

    Parameters
    ----------
    temperature_c : ndarray (n,)
        Temperature [°C]; NaN stays NaN.

    Returns
    -------
    tuple of ndarray (n,)
        pKw [-] (thermodynamic, I = 0, mol/kg) and its temperature derivative [1/K].

    Notes
    -----
    pKw = -2 n [lg(1 + Q) - Q/(Q + 1) d (b0 + b1/T + b2 d)] + sum g_i T^-i + 2 lg(M/1000),
    Q = d exp(a0 + a1/T + a2 d^(2/3)/T^2), d in g/cm3, n = 6.

    References
    ----------
    IAPWS R11-07(2019), Release on the ionization constant of H2O, equations 3 to 6 and table 1;
    Bandura and Lvov 2006, doi:10.1063/1.1928231.
    """
    d, d_slope = density(temperature_c)
    kelvin = np.asarray(temperature_c, float) + ZERO_CELSIUS
    inverse = 1.0 / kelvin
    cube = np.cbrt(d) ** 2
    q = d * np.exp(_ALPHA[0] + _ALPHA[1] * inverse + _ALPHA[2] * cube * inverse**2)
    q_slope = q * (
        d_slope / d - _ALPHA[1] * inverse**2 + _ALPHA[2] * inverse**2 * cube * (2.0 / 3.0 * d_slope / d - 2.0 * inverse)
    )
    bracket = d * (_BETA[0] + _BETA[1] * inverse + _BETA[2] * d)
    bracket_slope = d_slope * (_BETA[0] + _BETA[1] * inverse + 2.0 * _BETA[2] * d) - d * _BETA[1] * inverse**2
    gas = _GAMMA[0] + inverse * (_GAMMA[1] + inverse * (_GAMMA[2] + inverse * _GAMMA[3]))
    gas_slope = -(inverse**2) * (_GAMMA[1] + inverse * (2.0 * _GAMMA[2] + inverse * 3.0 * _GAMMA[3]))
    share = q / (q + 1.0)
    value = -2.0 * _SITES * (np.log10(1.0 + q) - share * bracket) + gas + 2.0 * np.log10(_MOLAR_MASS / 1000.0)
    slope = (
        -2.0
        * _SITES
        * (q_slope / (1.0 + q) / np.log(10.0) - q_slope / (1.0 + q) ** 2 * bracket - share * bracket_slope)
    )
    return value, slope + gas_slope


def co2_solubility(temperature_c: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Henry constant of carbon dioxide in pure water and its slope.

    Parameters
    ----------
    temperature_c : ndarray (n,)
        Temperature [°C]; NaN stays NaN.

    Returns
    -------
    tuple of ndarray (n,)
        Molality of dissolved CO2 (with H2CO3) over its partial pressure [mol/(kg atm)], and its slope per kelvin.

    Notes
    -----
    ln K0 = A1 + A2 (100 K/T) + A3 ln(T/100 K) at salinity 0; valid from -1 to 40 °C, used to 60 °C; salting out is
    neglected (about 2 % at I = 0.1 mol/kg).

    References
    ----------
    Weiss 1974, Marine Chemistry 2:203, doi:10.1016/0304-4203(74)90015-2, equation 12 and table I, gravimetric.
    """
    hundreds = (np.asarray(temperature_c, float) + ZERO_CELSIUS) / 100.0
    value = np.exp(-60.2409 + 93.4517 / hundreds + 23.3585 * np.log(hundreds))
    return value, value * (-93.4517 / hundreds**2 + 23.3585 / hundreds) / 100.0
