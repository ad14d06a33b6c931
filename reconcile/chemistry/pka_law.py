"""pKa against temperature: from enthalpy and heat capacity at 25 °C, or by a published equation within its range.

A constant heat capacity serves for tens of kelvin. Beyond, the heat capacity of ionization itself changes with
temperature, for every acid that leaves an anion much as it does for water, so that the constant of HA + OH- = A- + H2O
keeps its heat capacity. pKw at the temperature therefore enters the pKa of neutral and anionic acids; the enthalpy and
heat capacity at 25 °C stay those of acids.csv.
"""

from __future__ import annotations

import csv
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cache
from pathlib import Path

import numpy as np

from reconcile.chemistry.temperature import GAS_CONSTANT, LN10, T_REFERENCE, van_t_hoff
from reconcile.chemistry.water import LOW_C, ZERO_CELSIUS, pkw
from reconcile.records.arrays import FloatArray, IntArray

FOLDER = Path(__file__).parent
NEVER = -1e3  # °C: the upper end of the range of no equation


@dataclass(frozen=True)
class Terms:
    """Coefficients of pKa(T) = p + q/T + r ln T + t T + w pKw(T), T in kelvin; arrays of one shape."""

    p: FloatArray
    q: FloatArray
    r: FloatArray
    t: FloatArray
    w: FloatArray

    def value(self, kelvin: FloatArray | float, water_pkw: FloatArray | float) -> FloatArray:
        """pKa [-] at a temperature [K] where water's constant is water_pkw."""
        own = self.p + self.q / kelvin + self.r * np.log(kelvin) + self.t * kelvin
        return np.asarray(own + self.w * water_pkw)

    def take(self, index: IntArray) -> Terms:
        return Terms(*(getattr(self, name)[..., index] for name in _NAMES))


_NAMES = ("p", "q", "r", "t", "w")


@dataclass(frozen=True)
class Equation:
    """A published equation of one constant: pKa = constant + inverse/T + log10 lg T + linear T + water pKw(T)."""

    acid: str
    step: int
    inverse: float
    constant: float
    linear: float
    log10: float
    water: float
    high_c: float
    u: float
    source: str

    @property
    def terms(self) -> Terms:
        some = (self.constant, self.inverse, self.log10 / LN10, self.linear, self.water)
        return Terms(*(np.array(v) for v in some))


@cache
def equations() -> Mapping[tuple[str, int], Equation]:
    """The equations of pka_equations.csv, (acid, step) -> Equation."""
    with (FOLDER / "pka_equations.csv").open(encoding="utf-8", newline="") as file:
        return {
            (r["acid"], int(r["step"])): Equation(
                r["acid"],
                int(r["step"]),
                float(r["inverse"]),
                float(r["constant"]),
                float(r["linear"]),
                float(r["log10"]),
                float(r["water"]),
                float(r["high_C"]),
                float(r["u_pKa"]),
                r["source"],
            )
            for r in csv.DictReader(file)
        }


@cache
def water_terms() -> tuple[float, float, float]:
    """p, q, r of pKw with enthalpy and heat capacity held at their values at 25 °C (from IAPWS R11-07)."""
    step = 0.5
    around = T_REFERENCE - ZERO_CELSIUS + np.array([-step, 0.0, step])
    value, slope = pkw(around)
    kelvin = around + ZERO_CELSIUS
    enthalpy = GAS_CONSTANT * LN10 * kelvin**2 * -slope  # J/mol, of H2O = H+ + OH-
    capacity = (enthalpy[2] - enthalpy[0]) / (2.0 * step)
    p, q, r = van_t_hoff(value[1:2], enthalpy[1:2] / 1000.0, np.array([capacity]))
    return float(p[0]), float(q[0]), float(r[0])


@dataclass(frozen=True)
class Laws:
    """pKa(T) of q constants: `within` to the upper end of the range of an equation, `beyond` above it.

    within, beyond : Terms of (q,)
    edge_c : FloatArray (q,)          upper end [°C]; NEVER where there is no equation, so that `beyond` always holds
    low_k, high_k : FloatArray (q,)   between these [K] the enthalpy's and the heat capacity's uncertainty cost nothing:
                                      25 °C, or the range of the equation
    """

    within: Terms
    beyond: Terms
    edge_c: FloatArray
    low_k: FloatArray
    high_k: FloatArray

    def value(self, index: IntArray, temperature_c: FloatArray) -> FloatArray:
        """pKa [-] of some constants, each at its own temperature [°C]; index and temperature broadcast."""
        kelvin, water = np.asarray(temperature_c, float) + ZERO_CELSIUS, pkw(np.asarray(temperature_c, float))[0]
        inside, outside = self.within.take(index), self.beyond.take(index)
        below = np.asarray(temperature_c) <= self.edge_c[index]
        return np.where(below, inside.value(kelvin, water), outside.value(kelvin, water))


def laws(
    p: FloatArray,
    q: FloatArray,
    r: FloatArray,
    charge: FloatArray,
    names: Sequence[tuple[str, int]],
    use_equations: bool,
) -> Laws:
    """The laws of q constants.

    Parameters
    ----------
    p, q, r : ndarray (q,)
        pKa(T) = p + q/T + r ln T with constant heat capacity (temperature.van_t_hoff).
    charge : ndarray (q,)
        Charge of the acid that loses the proton in each step.
    names : sequence of (acid, step) (k,)
        Of the first k constants, k <= q; the others keep a constant heat capacity.
    use_equations : bool
        Whether published equations are used where there is one.

    Returns
    -------
    Laws

    Notes
    -----
    An equation gives the course with temperature through the table's own value at 25 °C; above its range the constant
    follows its enthalpy and heat capacity again, joined to the equation at the end of the range.

    References
    ----------
    Lindsay 1980, Proc. Int. Water Conf. 41:284 (constants of reactions that keep like charges against temperature);
    Mesmer, Marshall, Palmer, Simonson and Holmes 1988, J. Solution Chem. 17:699, doi:10.1007/BF00647417 (both from
    memory). The equations have their sources in pka_equations.csv.
    """
    w = np.where((charge > 0) | (np.arange(len(p)) >= len(names)), 0.0, 1.0)
    water_p, water_q, water_r = water_terms()
    zero = np.zeros_like(p)
    beyond = [p - w * water_p, q - w * water_q, r - w * water_r, zero.copy(), w]
    within = [v.copy() for v in beyond]
    edge, low, high = np.full_like(p, NEVER), np.full_like(p, T_REFERENCE), np.full_like(p, T_REFERENCE)
    known = equations() if use_equations else {}
    for i, name in enumerate(names):
        found = known.get(name)
        if found is None:
            continue
        own = Terms(*(v[i] for v in beyond))
        at_25 = found.terms.value(T_REFERENCE, _pkw(T_REFERENCE))
        shift = own.value(T_REFERENCE, _pkw(T_REFERENCE)) - at_25
        for target, term in zip(within, _NAMES, strict=True):
            target[i] = getattr(found.terms, term)
        within[0][i] += shift
        edge[i], low[i], high[i] = found.high_c, LOW_C + ZERO_CELSIUS, found.high_c + ZERO_CELSIUS
        joined = found.terms.value(high[i], _pkw(high[i])) + shift
        beyond[0][i] += joined - own.value(high[i], _pkw(high[i]))
    return Laws(Terms(*within), Terms(*beyond), edge, low, high)


def _pkw(kelvin: float) -> float:
    return float(pkw(np.array(kelvin - ZERO_CELSIUS))[0])
