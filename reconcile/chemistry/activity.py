"""Activity coefficients of ions by name of the model; a neutral species has 1 in every model.

Every model is written as lg gamma = -z^2 D(I), where D may depend on the ion's size. To add one, write its D with its
partial derivatives and give it a row in ACTIVITY_MODELS.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np

from reconcile.records.arrays import FloatArray

# (A, B, I, size) -> D, dD/dI, dD/dA, dD/dB, dD/d(uncertain coefficient)
Exponent = Callable[
    [FloatArray, FloatArray, FloatArray, FloatArray],
    tuple[FloatArray, FloatArray, FloatArray, FloatArray, FloatArray],
]

DAVIES_COEFFICIENT = 0.3
DAVIES_RANGE = 0.5  # mol/kg
SIZE_HYDROGEN, SIZE_HYDROXIDE = 9.0, 3.5  # angstrom, Kielland 1937 (ion_sizes.csv)


@dataclass(frozen=True)
class ActivityModel:
    """One activity model.

    name : as in the settings
    exponent : D and its partial derivatives; (A, B, I, size) -> D, dD/dI, dD/dA, dD/dB, dD/dc, arrays that broadcast
    sized : whether D depends on the ion's size
    highest : ionic strength up to which it holds [mol/kg]
    coefficient : what is uncertain in it, in words
    u_coefficient : its standard uncertainty; None takes the setting uncertainty.davies_coefficient
    source : where the equation and its range stand
    """

    name: str
    exponent: Exponent
    sized: bool
    highest: float
    coefficient: str
    u_coefficient: float | None
    source: str


def davies(
    a: FloatArray, b: FloatArray, strength: FloatArray, size: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray, FloatArray]:
    """D of the Davies equation, and its partial derivatives.

    Parameters
    ----------
    a, b : ndarray (n,)
        Debye-Hueckel coefficients [(kg/mol)^0.5; the second is not used].
    strength : ndarray (n,)
        Ionic strength [mol/kg].
    size : ndarray
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


def extended(
    a: FloatArray, b: FloatArray, strength: FloatArray, size: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray, FloatArray]:
    """D of the extended Debye-Hueckel equation with an ion size, and its partial derivatives.

    Parameters
    ----------
    a, b : ndarray (n,)
        Debye-Hueckel coefficients [(kg/mol)^0.5, (kg/mol)^0.5 per angstrom].
    strength : ndarray (n,)
        Ionic strength [mol/kg].
    size : ndarray, broadcasts against (n,)
        Ion size [angstrom].

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
    return a * over_a, slope, over_a, -a * over_a * over_a * size, -a * strength * np.ones_like(over_a)


def ideal(
    a: FloatArray, b: FloatArray, strength: FloatArray, size: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray, FloatArray]:
    """D = 0: concentrations serve as activities, as in hand calculation.

    The uncertain coefficient multiplies the whole correction left out, that of the Davies equation: 0 with a standard
    uncertainty of 1, so that the uncertainty of an ideal prediction says what neglecting activity may cost.
    Parameters and returns as for `davies`.
    """
    nothing = np.zeros_like(strength)
    return nothing, nothing, nothing, nothing, davies(a, b, strength, size)[0]


ACTIVITY_MODELS: Mapping[str, ActivityModel] = {
    m.name: m
    for m in (
        ActivityModel(
            "davies",
            davies,
            False,
            DAVIES_RANGE,
            "coefficient of the linear term, 0.3",
            None,
            "Davies 1962, Ion Association, p. 41; held beyond 0.5 mol/kg",
        ),
        ActivityModel(
            "extended",
            extended,
            True,
            0.1,
            "coefficient of a linear term left out, 0",
            None,
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
    )
}


def activity_model(name: str) -> ActivityModel:
    """The model of that name; raises ValueError that lists the names allowed."""
    if name not in ACTIVITY_MODELS:
        raise ValueError(f"no activity model is called {name!r}; there are: {', '.join(ACTIVITY_MODELS)}")
    return ACTIVITY_MODELS[name]
