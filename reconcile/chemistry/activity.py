"""Activity coefficients of ions by name of the model; a neutral species has 1 in every model.

Every model is written as lg gamma = -z^2 D(I), where D may depend on the ion's size and on a linear term of its own;
one adds what each pair of ions does (interactions.py). To add one, write its D with its partial derivatives and give
it a row in ACTIVITY_MODELS.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Protocol

import numpy as np

from reconcile.records.arrays import FloatArray

Five = tuple[FloatArray, FloatArray, FloatArray, FloatArray, FloatArray]


class Exponent(Protocol):
    """(A, B, I, size, linear) -> D, dD/dI, dD/dA, dD/dB, dD/d(uncertain coefficient)."""

    def __call__(
        self, a: FloatArray, b: FloatArray, strength: FloatArray, size: FloatArray, linear: FloatArray | float = 0.0
    ) -> Five: ...


DAVIES_COEFFICIENT = 0.3
DAVIES_RANGE = 0.5  # mol/kg
CONVENTION = 1.5  # (kg/mol)^0.5, the product of B and an ion size of 4.6 angstrom; Bates and Guggenheim 1960
SIZE_HYDROGEN, SIZE_HYDROXIDE = 9.0, 3.5  # angstrom, Kielland 1937 (ion_sizes.csv)


@dataclass(frozen=True)
class ActivityModel:
    """One activity model.

    name : as in the settings
    exponent : D and its partial derivatives; (A, B, I, size, linear) -> D, dD/dI, dD/dA, dD/dB, dD/dc, arrays that
        broadcast
    sized : whether D depends on the ion
    highest : ionic strength up to which it holds [mol/kg]
    coefficient : what is uncertain in it, in words
    u_coefficient : its standard uncertainty, or the name of the setting that holds it
    source : where the equation and its range stand
    linear : whether ions have linear terms of their own (sized models only)
    pairwise : whether the coefficients of interactions.csv are added
    """

    name: str
    exponent: Exponent
    sized: bool
    highest: float
    coefficient: str
    u_coefficient: float | str
    source: str
    linear: bool = False
    pairwise: bool = False


def davies(
    a: FloatArray, b: FloatArray, strength: FloatArray, size: FloatArray, linear: FloatArray | float = 0.0
) -> Five:
    """D of the Davies equation, and its partial derivatives.

    Parameters
    ----------
    a, b : ndarray (n,)
        Debye-Hueckel coefficients [(kg/mol)^0.5; the second is not used].
    strength : ndarray (n,)
        Ionic strength [mol/kg].
    size, linear : ndarray
        Not used: one D for every ion.

    Returns
    -------
    tuple of ndarray (n,)
        D, dD/dI, dD/dA, dD/dB, dD/dc, where c is the coefficient 0.3.

    Notes
    -----
    D = A (sqrt I / (1 + sqrt I) - c I). Beyond I = 0.5 mol/kg, the range of the equation, the linear term is held at
    its value for 0.5: left to grow it would make D negative near 1.8 mol/kg. Its uncertainty (dD/dc = -A I) goes on
    growing with I, which matches the spread of measured coefficients there (about 0.05 in lg gamma at 1 mol/kg).

    References
    ----------
    Davies 1962, Ion Association, Butterworths, p. 41 (equation 3.5).
    """
    root = np.sqrt(strength)
    under = 1.0 / (1.0 + root)
    shape = root * under - DAVIES_COEFFICIENT * np.minimum(strength, DAVIES_RANGE)
    with np.errstate(divide="ignore"):
        slope = a * (0.5 * under * under / root - DAVIES_COEFFICIENT * (strength < DAVIES_RANGE))
    return a * shape, slope, shape, np.zeros_like(shape), -a * strength


def bates_guggenheim(
    a: FloatArray, b: FloatArray, strength: FloatArray, size: FloatArray, linear: FloatArray | float = 0.0
) -> Five:
    """D of the convention on which the pH scale rests, used for every ion, and its partial derivatives.

    Parameters
    ----------
    a, b, strength, size, linear
        As for `davies`.

    Returns
    -------
    tuple of ndarray (n,)
        D, dD/dI, dD/dA, dD/dB, dD/dc, where c = 0 multiplies a linear term that the equation leaves out, -c A I.

    Notes
    -----
    D = A sqrt I / (1 + 1.5 sqrt I). It fixes the activity coefficient of chloride in the standard buffers to 0.1
    mol/kg; for other ions it is the Debye-Hueckel equation with one ion size of 4.6 angstrom. Beyond 0.5 mol/kg the
    uncertainty grows with the square of I.

    References
    ----------
    Bates and Guggenheim 1960, Pure Appl. Chem. 1:163, doi:10.1351/pac196001010163; Buck et al. 2002, Pure Appl. Chem.
    74:2169, doi:10.1351/pac200274112169, section 4; Guggenheim 1935, Phil. Mag. 19:588 (the linear term).
    """
    root = np.sqrt(strength)
    under = 1.0 / (1.0 + CONVENTION * root)
    shape = root * under
    with np.errstate(divide="ignore"):
        slope = 0.5 * a * under * under / root
    return a * shape, slope, shape, np.zeros_like(shape), -a * _doubt(strength)


def _doubt(strength: FloatArray) -> FloatArray:
    """I within the range, I^2 / range beyond it: what a linear term of coefficient 1 may be worth [mol/kg]."""
    return np.asarray(strength * np.maximum(1.0, strength / DAVIES_RANGE))


def extended(
    a: FloatArray, b: FloatArray, strength: FloatArray, size: FloatArray, linear: FloatArray | float = 0.0
) -> Five:
    """D of the extended Debye-Hueckel equation with an ion size, and its partial derivatives.

    Parameters
    ----------
    a, b : ndarray (n,)
        Debye-Hueckel coefficients [(kg/mol)^0.5, (kg/mol)^0.5 per angstrom].
    strength : ndarray (n,)
        Ionic strength [mol/kg].
    size : ndarray, broadcasts against (n,)
        Ion size [angstrom].
    linear
        Not used.

    Returns
    -------
    tuple of ndarray
        D, dD/dI, dD/dA, dD/dB, dD/dc, where c = 0 multiplies a linear term that the equation leaves out, -c A I.

    Notes
    -----
    D = A sqrt I / (1 + B size sqrt I), to about 0.1 mol/kg.

    References
    ----------
    Kielland 1937, J. Am. Chem. Soc. 59:1675, doi:10.1021/ja01288a032, equation 1 and table I (sizes).
    """
    root = np.sqrt(strength)
    under = 1.0 / (1.0 + b * size * root)
    with np.errstate(divide="ignore"):
        slope = 0.5 * a * under * under / root
    over_a = root * under
    return a * over_a, slope, over_a, -a * over_a * over_a * size, -a * _doubt(strength) * np.ones_like(over_a)


def truesdell_jones(
    a: FloatArray, b: FloatArray, strength: FloatArray, size: FloatArray, linear: FloatArray | float = 0.0
) -> Five:
    """D of the extended equation with a size and a linear term for each ion, and its partial derivatives.

    Parameters
    ----------
    a, b, strength, size
        As for `extended`.
    linear : ndarray, broadcasts against (n,)
        Linear coefficient of lg gamma over the square of the ion's charge [kg/mol].

    Returns
    -------
    tuple of ndarray
        D, dD/dI, dD/dA, dD/dB, dD/dc, with c as for `extended`.

    Notes
    -----
    lg gamma = -z^2 A sqrt I / (1 + B size sqrt I) + b I, so that D = A sqrt I / (1 + B size sqrt I) - (b / z^2) I.

    References
    ----------
    Truesdell and Jones 1974, J. Res. U.S. Geol. Survey 2:233, equation 16 and table 3 (from memory).
    """
    d, d_i, d_a, d_b, d_c = extended(a, b, strength, size)
    return d - linear * strength, d_i - linear, d_a, d_b, d_c


def ideal(
    a: FloatArray, b: FloatArray, strength: FloatArray, size: FloatArray, linear: FloatArray | float = 0.0
) -> Five:
    """D = 0: concentrations serve as activities, as in hand calculation.

    The uncertain coefficient multiplies the whole correction left out, that of the Davies equation: 0 with a standard
    uncertainty of 1, so that the uncertainty of an ideal prediction says what neglecting activity may cost.
    Parameters and returns as for `davies`.
    """
    nothing = np.zeros_like(strength)
    return nothing, nothing, nothing, nothing, davies(a, b, strength, size)[0]


LINEAR_TERM_LEFT_OUT = "coefficient of a linear term left out, 0"
_DAVIES_U, _LINEAR_U = "uncertainty.davies_coefficient", "uncertainty.linear_coefficient"

ACTIVITY_MODELS: Mapping[str, ActivityModel] = {
    m.name: m
    for m in (
        ActivityModel(
            "davies",
            davies,
            False,
            DAVIES_RANGE,
            "coefficient of the linear term, 0.3",
            _DAVIES_U,
            "Davies 1962, Ion Association, p. 41; held beyond 0.5 mol/kg",
        ),
        ActivityModel(
            "extended",
            extended,
            True,
            0.1,
            LINEAR_TERM_LEFT_OUT,
            _DAVIES_U,
            "Kielland 1937, J. Am. Chem. Soc. 59:1675, doi:10.1021/ja01288a032",
        ),
        ActivityModel(
            "ideal",
            ideal,
            False,
            0.005,
            "share of the activity correction left out, 0",
            1.0,
            "concentrations as activities; lg gamma of a 1:1 salt is then off by 0.03 at 0.005 mol/kg",
        ),
        ActivityModel(
            "bates-guggenheim",
            bates_guggenheim,
            False,
            DAVIES_RANGE,
            LINEAR_TERM_LEFT_OUT,
            _LINEAR_U,
            "Bates and Guggenheim 1960, doi:10.1351/pac196001010163; a convention to 0.1 mol/kg, used to 0.5 with the "
            "uncertainty of a linear term",
        ),
        ActivityModel(
            "truesdell-jones",
            truesdell_jones,
            True,
            1.0,
            LINEAR_TERM_LEFT_OUT,
            _DAVIES_U,
            "Truesdell and Jones 1974, J. Res. U.S. Geol. Survey 2:233; sizes of Kielland 1937 for other ions",
            linear=True,
        ),
        ActivityModel(
            "specific",
            bates_guggenheim,
            False,
            3.5,
            LINEAR_TERM_LEFT_OUT,
            _LINEAR_U,
            "specific ion interaction: Grenthe, Plyasunov and Spahiu 1997, in Modelling in Aquatic Chemistry (NEA), "
            "chapter IX; to 3.5 mol/kg; coefficients in interactions.csv",
            pairwise=True,
        ),
    )
}


def activity_model(name: str) -> ActivityModel:
    """The model of that name; raises ValueError that lists the names allowed."""
    if name not in ACTIVITY_MODELS:
        raise ValueError(f"no activity model is called {name!r}; there are: {', '.join(ACTIVITY_MODELS)}")
    return ACTIVITY_MODELS[name]
