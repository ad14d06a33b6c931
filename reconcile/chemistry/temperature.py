"""Ionization constants and Debye-Hueckel coefficients at the temperature of a solution."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from reconcile.chemistry.water import HIGH_C, LOW_C, ZERO_CELSIUS, density, permittivity, pkw
from reconcile.records.arrays import FloatArray, IntArray

GAS_CONSTANT = 8.31446261815324  # J/(K mol), CODATA 2018, exact
T_REFERENCE = 298.15  # K
LN10 = float(np.log(10.0))
_CHARGE = 1.602176634e-19  # C, CODATA 2018, exact
_AVOGADRO = 6.02214076e23  # 1/mol, exact
_BOLTZMANN = 1.380649e-23  # J/K, exact
_VACUUM = 8.8541878128e-12  # F/m, CODATA 2018


@dataclass(frozen=True)
class Solvent:
    """Water at n temperatures: pKw and the Debye-Hueckel coefficients, each with its slope in temperature.

    temperature_c [°C]; pkw, d_pkw [1/K]; a [(kg/mol)^0.5, lg], d_a [per K]; b [(kg/mol)^0.5 / angstrom], d_b [per K].
    All (n,), NaN outside 0 to 100 °C.
    """

    temperature_c: FloatArray
    pkw: FloatArray
    d_pkw: FloatArray
    a: FloatArray
    d_a: FloatArray
    b: FloatArray
    d_b: FloatArray


def debye_hueckel(temperature_c: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Debye-Hueckel coefficients of water on the molal scale, with their slopes.

    Parameters
    ----------
    temperature_c : ndarray (n,)
        Temperature [°C].

    Returns
    -------
    tuple of ndarray (n,)
        A for lg gamma [(kg/mol)^0.5], dA/dT, B [(kg/mol)^0.5 per angstrom], dB/dT.

    Notes
    -----
    A = (2 pi N_A rho)^0.5 (e^2 / (4 pi eps0 eps k T))^1.5 / ln 10, B = (2 e^2 N_A rho / (eps0 eps k T))^0.5.

    References
    ----------
    Robinson and Stokes, Electrolyte Solutions, 2nd ed. 1959, equations 9.7 and 9.8; constants CODATA 2018.
    """
    rho, d_rho = density(temperature_c)
    eps, d_eps = permittivity(temperature_c)
    kelvin = np.asarray(temperature_c, float) + ZERO_CELSIUS
    bjerrum = _CHARGE**2 / (4.0 * np.pi * _VACUUM * eps * _BOLTZMANN * kelvin)  # m
    relative_bjerrum = -d_eps / eps - 1.0 / kelvin
    a = np.sqrt(2.0 * np.pi * _AVOGADRO * rho * 1000.0) * bjerrum**1.5 / LN10
    b = np.sqrt(8.0 * np.pi * bjerrum * _AVOGADRO * rho * 1000.0) * 1e-10
    return a, a * (0.5 * d_rho / rho + 1.5 * relative_bjerrum), b, b * 0.5 * (d_rho / rho + relative_bjerrum)


def solvent(temperature_c: FloatArray) -> Solvent:
    """Water at the given temperatures [°C] (n,); NaN outside 0 to 100 °C, where the equations do not hold."""
    given = np.asarray(temperature_c, float)
    with np.errstate(invalid="ignore"):
        inside = np.where((given >= LOW_C) & (given <= HIGH_C), given, np.nan)
    ionization, d_ionization = pkw(inside)
    a, d_a, b, d_b = debye_hueckel(inside)
    return Solvent(inside, ionization, d_ionization, a, d_a, b, d_b)


def water_at(water: Solvent, rows: IntArray) -> Solvent:
    """The entries of a Solvent named by `rows`, in that order."""
    return Solvent(*(getattr(water, name)[rows] for name in Solvent.__dataclass_fields__))


def van_t_hoff(pka_25c: FloatArray, dh: FloatArray, dcp: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Coefficients p, q, r of pKa(T) = p + q/T + r ln(T), T in kelvin.

    Parameters
    ----------
    pka_25c : ndarray (q,)
        pKa at 25 °C and I = 0 [-].
    dh, dcp : ndarray (q,)
        Enthalpy [kJ/mol] and heat capacity [J/(K mol)] of ionization at 25 °C; NaN counts as 0.

    Returns
    -------
    tuple of ndarray (q,)
        p [-], q [K], r [-].

    Notes
    -----
    Integrated with a constant heat capacity:
    ln K(T) = ln K(T0) + dH/R (1/T0 - 1/T) + dCp/R (ln(T/T0) + T0/T - 1).

    References
    ----------
    Goldberg, Kishore and Lennen 2002, doi:10.1063/1.1416902, equation 7 (terms beyond dCp left out).
    """
    enthalpy = np.nan_to_num(dh) * 1000.0 / (GAS_CONSTANT * LN10)
    capacity = np.nan_to_num(dcp) / (GAS_CONSTANT * LN10)
    p = pka_25c - enthalpy / T_REFERENCE + capacity * (np.log(T_REFERENCE) + 1.0)
    q = enthalpy - capacity * T_REFERENCE
    return p, q, -capacity


# What a missing value may be worth, as a standard uncertainty; judged from the spread over acids.csv (most carboxylic
# acids within 5 kJ/mol of 0, amines 30 to 55 kJ/mol, heat capacities mostly -250 to +100 J/(K mol)); no source.
U_MISSING_DH = 15.0  # kJ/mol
U_KNOWN_DH = 0.5  # kJ/mol
U_MISSING_DCP = 150.0  # J/(K mol)
U_KNOWN_DCP = 20.0  # J/(K mol)
U_PKW = 0.005  # half the uncertainty that IAPWS R11-07 gives for pKw of the liquid, 0.01


def spread_factors(temperature_c: FloatArray) -> tuple[FloatArray, FloatArray]:
    """What an error of the enthalpy and one of the heat capacity do to a pKa at temperature.

    Parameters
    ----------
    temperature_c : ndarray (n,)
        Temperature [°C].

    Returns
    -------
    tuple of ndarray (n,)
        dpKa/d(dH) [mol/kJ] and -dpKa/d(dCp) [K mol/J]; both 0 at 25 °C.
    """
    return spread_between(np.asarray(temperature_c + ZERO_CELSIUS), np.array(T_REFERENCE))


def spread_between(kelvin: FloatArray, reference: FloatArray) -> tuple[FloatArray, FloatArray]:
    """dpKa/d(dH) [mol/kJ] and -dpKa/d(dCp) [K mol/J] at a temperature [K], for values that hold at a reference [K]."""
    scale = 1.0 / (GAS_CONSTANT * LN10)
    by_dh = 1000.0 * scale * (1.0 / kelvin - 1.0 / reference)
    by_dcp = scale * (np.log(kelvin / reference) + reference / kelvin - 1.0)
    return np.asarray(by_dh), np.asarray(by_dcp)


def u_at(u_25c: FloatArray, u_dh: FloatArray, u_dcp: FloatArray, temperature_c: FloatArray) -> FloatArray:
    """Standard uncertainty of a pKa at temperature, from those at 25 °C, of the enthalpy and of the heat capacity.

    Parameters
    ----------
    u_25c, u_dh, u_dcp : ndarray (t,)
        Standard uncertainty of pKa at 25 °C [-], of dH [kJ/mol] and of dCp [J/(K mol)].
    temperature_c : ndarray (t,)
        Temperature [°C].

    Returns
    -------
    ndarray (t,)
        Standard uncertainty [-]; equal to u_25c at 25 °C, growing per kelvin away from it.

    References
    ----------
    JCGM 100:2008, equation 10.
    """
    by_dh, by_dcp = spread_factors(temperature_c)
    return np.asarray(np.sqrt(u_25c**2 + (by_dh * u_dh) ** 2 + (by_dcp * u_dcp) ** 2), float)
