"""The studied acid at a given pH: apparent constants, shares of its states, how far each step is neutralised."""

from __future__ import annotations

import numpy as np

from reconcile.chemistry.acids import usual_size
from reconcile.chemistry.activity import ActivityModel
from reconcile.chemistry.temperature import solvent
from reconcile.records.arrays import FloatArray


def apparent_shift(
    model: ActivityModel, charge: int, steps: int, temperature_c: FloatArray, strength: FloatArray
) -> FloatArray:
    """Apparent (mixed) minus thermodynamic pKa of every step.

    Parameters
    ----------
    model : ActivityModel
    charge : int
        Charge of the fully protonated form.
    steps : int
    temperature_c, strength : ndarray (m,)
        Temperature [°C] and ionic strength [mol/kg].

    Returns
    -------
    ndarray (m, steps)

    Notes
    -----
    The mixed constant has the activity of the hydrogen ion and the molalities of the acid's forms, so that
    pKa' = pKa + lg gamma(base) - lg gamma(acid) = pKa + z_acid^2 D_acid - z_base^2 D_base.

    References
    ----------
    Albert and Serjeant 1984, The Determination of Ionization Constants, 3rd ed., chapter 3 (from memory: the
    distinction of mixed and thermodynamic constants).
    """
    water = solvent(temperature_c)
    squares = [
        (charge - lost) ** 2 * model.exponent(water.a, water.b, strength, np.array(usual_size(charge - lost)))[0]
        for lost in range(steps + 1)
    ]
    return np.stack([squares[j] - squares[j + 1] for j in range(steps)], axis=1)


def state_shares(ph: FloatArray, apparent: FloatArray) -> FloatArray:
    """Share of every protonation state, most protonated first.

    Parameters
    ----------
    ph : ndarray (m,)
    apparent : ndarray (m, s)
        Apparent constants at each pH's ionic strength and temperature.

    Returns
    -------
    ndarray (m, s + 1)
        Rows sum to 1.

    References
    ----------
    Stumm and Morgan, Aquatic Chemistry, 3rd ed. 1996, section 3.5 (ionization fractions).
    """
    weight = np.concatenate([np.zeros((len(ph), 1)), np.cumsum(ph[:, None] - apparent, axis=1)], axis=1)
    weight = 10.0 ** (weight - weight.max(axis=1, keepdims=True))
    return np.asarray(weight / weight.sum(axis=1, keepdims=True))


def neutralised(ph: FloatArray, apparent: FloatArray) -> FloatArray:
    """Share of each step that has lost its proton, 1 / (1 + 10^(pKa' - pH)), (m, s)."""
    return np.asarray(1.0 / (1.0 + 10.0 ** np.clip(apparent - ph[:, None], -300.0, 300.0)))
