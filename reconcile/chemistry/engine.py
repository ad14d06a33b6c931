"""Runs many solutions through the solver in chunks of alike shape, and gathers answers and slopes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.activity import ActivityModel
from reconcile.chemistry.composition import Contents, FormTable, pad
from reconcile.chemistry.pair_rows import laid_out, with_pairs
from reconcile.chemistry.pair_solve import solve_pairs
from reconcile.chemistry.sensitivities import Slopes, slopes
from reconcile.chemistry.solve import solve
from reconcile.chemistry.temperature import LN10, U_PKW, Solvent, solvent, water_at
from reconcile.chemistry.water import ZERO_CELSIUS
from reconcile.records.arrays import BoolArray, FloatArray, IntArray

CHUNK = 8192
"""Rows solved together: enough to hide the cost of a call, few enough that their arrays stay in the cache."""


@dataclass(frozen=True)
class Ragged:
    """A list of (column, value) for each of n rows: those of row i are start[i] to start[i + 1]."""

    start: IntArray
    column: IntArray
    value: FloatArray


@dataclass(frozen=True)
class Answers:
    """What the engine found for n solutions; arrays (n,) unless said; NaN where not solved.

    ph, ionic_strength [mol/kg], solved
    d_temperature [1/K], d_model, d_titrant [L/mol] : slopes of pH
    u_constants : share of the ionization constants, of pKw and of pairs in the uncertainty [pH]
    uneven : BoolArray           True where a constant of large uncertainty has a good part in that share
    entry : FloatArray (c,)      dpH/d ln(amount) of every contribution of the contents
    constants : Ragged           dpH/dpKa, columns are constants of the AcidTable
    degree : Ragged              protons lost over those that can be lost, columns are acids of the AcidTable
    """

    ph: FloatArray
    ionic_strength: FloatArray
    solved: BoolArray
    d_temperature: FloatArray
    d_model: FloatArray
    d_titrant: FloatArray
    u_constants: FloatArray
    uneven: BoolArray
    entry: FloatArray
    constants: Ragged
    degree: Ragged


def alike_together(contents: Contents, forms: FormTable, acids: AcidTable) -> IntArray:
    """Rows in an order that puts alike shapes together: as many acids of six steps, of five, ... of one, then charges.

    The order is a matter of speed alone, so that a shape beyond what the key can count may stand anywhere.
    """
    n = len(contents)
    if n <= CHUNK:
        return np.arange(n)
    steps = np.where(forms.acid >= 0, acids.steps[forms.acid], 0)
    charges = np.where(forms.acid >= 0, acids.charge[forms.acid], 0.0).astype(np.intp)
    code = (np.where(steps > 0, 4 ** (np.maximum(steps, 1) + 1), 0) + charges).sum(axis=0)
    sums = np.concatenate([[0], np.cumsum(code[contents.form])])
    return np.argsort(np.diff(sums[contents.start]).astype(np.uint16), kind="stable")


class _Rows:
    """Gathers (row, column, value) triplets chunk by chunk and lays them out row by row at the end."""

    def __init__(self) -> None:
        self._parts: list[tuple[IntArray, IntArray, IntArray, FloatArray]] = []

    def add(self, rows: IntArray, column: IntArray, value: FloatArray) -> None:
        """column, value : (m, cells) with -1 in column where a cell holds nothing."""
        kept = column >= 0
        self._parts.append((rows, np.count_nonzero(kept, axis=1), column[kept], value[kept]))

    def ragged(self, n: int) -> Ragged:
        counts = np.zeros(n, np.intp)
        for rows, number, *_ in self._parts:
            counts[rows] = number
        start = np.concatenate([[0], np.cumsum(counts)]).astype(np.intp)
        column, value = np.empty(start[-1], np.intp), np.empty(start[-1])
        for rows, number, some, values in self._parts:
            at = np.arange(len(some)) + np.repeat(start[rows] - np.cumsum(number) + number, number)
            column[at], value[at] = some, values
        return Ragged(start, column, value)


LARGE, GOOD_PART = 0.12, 0.2
"""u(pKa) from which on the response of pH bends, and the part of the constants' variance from which on that counts."""


def _u_of_constants(some: Slopes, acids: AcidTable, water: Solvent) -> tuple[FloatArray, BoolArray]:
    """Root-sum-square of dpH/dpKa times u(pKa) at temperature, over all constants, pKw and those of pairs [pH] (m,).

    The second array is True where a constant of large uncertainty has a good part in it.

    Steps count as independent: published constants of one acid seldom come with their covariance.
    """
    at, value = some.constant, some.constant_value  # the index -1, for none, meets a slope of 0
    u = acids.u_at(at, water.temperature_c[:, None] + ZERO_CELSIUS)
    part = (u * value) ** 2
    whole = part.sum(axis=1) + (some.d_pkw * U_PKW) ** 2 + some.of_pairs
    uneven = np.zeros(len(whole), bool)
    if np.any(u > LARGE):
        uneven = np.any((u > LARGE) & (part > GOOD_PART * whole[:, None]), axis=1)
    return np.sqrt(whole), uneven


def run(contents: Contents, forms: FormTable, acids: AcidTable, model: ActivityModel) -> Answers:
    """pH, ionic strength and slopes of n solutions.

    Parameters
    ----------
    contents : Contents
        n solutions with c contributions in all.
    forms : FormTable
        Forms that the contributions name.
    acids : AcidTable
        Ionization constants, and the ion pairs that may take part.
    model : ActivityModel
        Activity model.

    Returns
    -------
    Answers
        Row i depends on the contents of row i alone; NaN amounts or temperatures leave that row unsolved.
    """
    n = len(contents)
    temperatures, which = np.unique(contents.temperature_c, return_inverse=True)
    water = solvent(temperatures)
    order = alike_together(contents, forms, acids)
    out = {
        name: np.full(n, np.nan) for name in ("ph", "ionic_strength", "temperature", "model", "titrant", "constants")
    }
    solved, uneven = np.zeros(n, bool), np.zeros(n, bool)
    entry = np.zeros(len(contents.form))
    constants, degree = _Rows(), _Rows()
    for begin in range(0, n, CHUNK):
        rows = order[begin : begin + CHUNK]
        here = water_at(water, which[rows])
        chunk, padding = pad(contents, rows, forms, acids, here, model)
        ph, strength, fine = solve(chunk, model)
        some = slopes(chunk, padding, contents, forms, acids, here, model, ph, strength)
        if acids.pairs:
            with_pairs(chunk, padding, contents, forms, acids, here, model, (ph, strength, fine), some)
        out["ph"][rows], out["ionic_strength"][rows], solved[rows] = ph, strength, fine
        out["temperature"][rows], out["model"][rows] = some.d_temperature, some.d_model
        out["titrant"][rows] = some.d_titrant
        entry[padding.entry] = some.entry
        constants.add(rows, some.constant, some.constant_value)
        out["constants"][rows], uneven[rows] = _u_of_constants(some, acids, here)
        degree.add(rows, some.degree_acid, some.degree)
    return Answers(
        out["ph"],
        out["ionic_strength"],
        solved,
        out["temperature"],
        out["model"],
        out["titrant"],
        out["constants"],
        uneven,
        entry,
        constants.ragged(n),
        degree.ragged(n),
    )


def solved_ph(
    contents: Contents,
    forms: FormTable,
    acids: AcidTable,
    model: ActivityModel,
    constant: IntArray | None = None,
    shift: FloatArray | None = None,
) -> FloatArray:
    """pH alone of n solutions (n,), without slopes; NaN where not solved. Parameters as for `run`.

    constant, shift : (n,) index of one constant of each solution whose pKa is moved, and by how much
    """
    ph = np.full(len(contents), np.nan)
    temperatures, which = np.unique(contents.temperature_c, return_inverse=True)
    water, order = solvent(temperatures), alike_together(contents, forms, acids)
    for begin in range(0, len(contents), CHUNK):
        rows = order[begin : begin + CHUNK]
        here = water_at(water, which[rows])
        chunk, padding = pad(contents, rows, forms, acids, here, model)
        if constant is not None and shift is not None:
            for slot in chunk.slots:
                for step in range(len(slot.k)):
                    own = acids.by_step[2][step].take(slot.acid) == constant[rows]
                    slot.k[step] *= np.where(own, np.exp(-LN10 * shift[rows]), 1.0)
        found, strength, fine = solve(chunk, model)
        held, lay, _ = laid_out(chunk, padding, contents, forms, acids, here, fine)
        if lay is not None:
            found[held] = solve_pairs(lay, model, found[held], strength[held])[0]
        ph[rows] = found
    return ph
