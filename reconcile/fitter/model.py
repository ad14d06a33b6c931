"""Predicted pH of the readings of many cases, each with constants of its own, and its slopes."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.engine import Answers, run
from reconcile.chemistry.pair_table import Pair
from reconcile.chemistry.temperature import GAS_CONSTANT, LN10
from reconcile.chemistry.water import ZERO_CELSIUS
from reconcile.fitter.cases import Cases, Medium
from reconcile.fitter.further_acids import with_further
from reconcile.records.arrays import FloatArray, IntArray

TOGETHER = 64
"""Cases given to the engine in one call: its layout is as wide as the acids that it meets."""
PER_DH = 1000.0 / (GAS_CONSTANT * LN10)  # K mol / kJ


@dataclass(frozen=True)
class Shape:
    """Which parameters a case has: constants, their enthalpies, logarithm of the strength factor, offset of the meter.

    steps : number of ionization steps, s; charge : of the fully protonated form
    kelvin : reference temperature to which the constants are referred [K]
    dcp : FloatArray (s,)   heat capacity of ionization, held [J/(K mol)]
    """

    steps: int
    charge: int
    kelvin: float
    dcp: FloatArray

    @property
    def size(self) -> int:
        return 2 * self.steps + 2

    @property
    def pka(self) -> slice:
        return slice(0, self.steps)

    @property
    def dh(self) -> slice:
        return slice(self.steps, 2 * self.steps)

    @property
    def strength(self) -> int:
        return 2 * self.steps

    @property
    def offset(self) -> int:
        return 2 * self.steps + 1


@dataclass(frozen=True)
class Found:
    """The engine's answer for N readings.

    ph : FloatArray (N,)             without the meter's offset; NaN where not solved
    slopes : FloatArray (N, s)       dpH/dpKa of the studied acid's steps at the reading's temperature
    d_strength : FloatArray (N,)     dpH/d ln(amount of the studied acid)
    d_temperature, d_model, ionic_strength : FloatArray (N,)
    answers : the rest
    """

    ph: FloatArray
    slopes: FloatArray
    d_strength: FloatArray
    d_temperature: FloatArray
    d_model: FloatArray
    ionic_strength: FloatArray
    answers: Answers


def evaluate(medium: Medium, cases: Cases, acids: AcidTable, stands_in: IntArray, factor: FloatArray) -> Found:
    """pH of every reading with its slopes.

    Parameters
    ----------
    medium, cases
        P cases of N readings.
    acids : AcidTable
        That of the medium, with further acids behind.
    stands_in : ndarray of int (P,)
        The acid that stands in for the studied one in each case.
    factor : ndarray (P,)
        Actual over stated amount of the studied acid [-].

    Returns
    -------
    Found
        s is the largest number of steps among the acids that stand in; slopes of missing steps are 0.
    """
    answers = run(medium.contents(cases, factor), medium.forms_with(stands_in), acids, medium.model)
    own = cases.spread(stands_in)
    constants = answers.constants
    row = np.repeat(np.arange(cases.readings), np.diff(constants.start))
    step = constants.column - acids.first[own[row]]
    mine = (step >= 0) & (step < acids.steps[own[row]])
    slopes = np.zeros((cases.readings, int(acids.steps[stands_in].max(initial=1))))
    slopes[row[mine], step[mine]] = constants.value[mine]
    bring = np.where(medium.place[cases.form] >= 0, answers.entry, 0.0)
    d_strength = np.bincount(cases.reading, bring, cases.readings).astype(float)
    return Found(
        answers.ph, slopes, d_strength, answers.d_temperature, answers.d_model, answers.ionic_strength, answers
    )


def table_with(medium: Medium, shape: Shape, pka: FloatArray, dh: FloatArray) -> tuple[AcidTable, IntArray]:
    """The medium's acids with one more for each case, and the indices of these.

    Parameters
    ----------
    pka, dh : ndarray (P, s)
        Constants [-] and enthalpies [kJ/mol] at the reference temperature and I = 0.

    Notes
    -----
    pKa(T) = p + q/T + r ln T as in temperature.van_t_hoff, referred to the reference temperature of the shape.
    """
    base, count = medium.acids, len(pka)
    enthalpy, capacity = PER_DH * dh, np.broadcast_to(shape.dcp / (GAS_CONSTANT * LN10), pka.shape)
    columns = {
        "pka": pka,
        "p": pka - enthalpy / shape.kelvin + capacity * (np.log(shape.kelvin) + 1.0),
        "q": enthalpy - capacity * shape.kelvin,
        "r": -capacity,
    }
    names = tuple(f"case {k}" for k in range(count))
    table = with_further(base, names, shape.charge, columns, like=medium.studied)
    if medium.own_pairs:
        table = replace(table, pairs=base.pairs + _pairs_of(medium, names))
    return table, len(base.names) + np.arange(count)


def _pairs_of(medium: Medium, names: tuple[str, ...]) -> tuple[Pair, ...]:
    """Ion pairs and condensed species of the studied acid, again for every acid that stands in for it."""
    studied = medium.acids.names[medium.studied]

    def renamed(pair: Pair, name: str) -> Pair:
        states = {(name if acid == studied else acid, lost): n for (acid, lost), n in pair.states.items()}
        return replace(pair, states=states)

    return tuple(renamed(pair, name) for name in names for pair in medium.own_pairs)


def predict(medium: Medium, cases: Cases, shape: Shape, theta: FloatArray) -> tuple[FloatArray, FloatArray]:
    """pH that the meter would show, and its slopes in every parameter.

    Parameters
    ----------
    theta : ndarray (P, k)
        Parameters in the order of the shape.

    Returns
    -------
    ph : ndarray (N,)
        With the offset; NaN where not solved.
    jacobian : ndarray (N, k)
    """
    ph, jacobian = np.empty(cases.readings), np.empty((cases.readings, shape.size))
    together = 1 if medium.own_pairs else TOGETHER  # every pair is laid out for every row of a call
    for begin in range(0, len(cases), together):
        some = np.arange(begin, min(begin + together, len(cases)))
        part = cases if len(some) == len(cases) else cases.take(some)
        found = found_at(medium, part, shape, theta[some])
        rows = slice(int(cases.first[begin]), int(cases.first[some[-1] + 1]))
        ph[rows] = found.ph + part.spread(theta[some, shape.offset])
        jacobian[rows, shape.pka] = found.slopes
        jacobian[rows, shape.dh] = found.slopes * per_enthalpy(part.temperature_c, shape)[:, None]
        jacobian[rows, shape.strength] = found.d_strength
        jacobian[rows, shape.offset] = 1.0
    return ph, jacobian


def per_enthalpy(temperature_c: FloatArray, shape: Shape) -> FloatArray:
    """dpKa(T)/d(dH) of every reading [mol/kJ]; 0 at the reference temperature."""
    return np.asarray(PER_DH * (1.0 / (temperature_c + ZERO_CELSIUS) - 1.0 / shape.kelvin))


def found_at(medium: Medium, cases: Cases, shape: Shape, theta: FloatArray) -> Found:
    """The engine's whole answer at some parameters (P, k)."""
    acids, stands_in = table_with(medium, shape, theta[:, shape.pka], theta[:, shape.dh])
    return evaluate(medium, cases, acids, stands_in, np.exp(theta[:, shape.strength]))


def without_uncertainty(acids: AcidTable) -> AcidTable:
    """The same table with uncertainties of 0: what is left of `u_constants` is then that of pKw alone."""
    zero = np.zeros(len(acids.u))
    return replace(acids, u=zero, u_dh=zero, u_dcp=zero)
