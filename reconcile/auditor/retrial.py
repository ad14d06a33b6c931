"""Predictions under a supposed other recipe, computed once each by the function that the pipeline hands over."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy import sparse

from reconcile.auditor.layout import Layout
from reconcile.records.arrays import FloatArray, IntArray
from reconcile.records.results import Change, Prediction, Repredict


@dataclass(frozen=True)
class Supposed:
    """One supposed truth: contributions (of a lot or of one batch) that hold another form, or another amount.

    contributions : IntArray (j,); form : name or "" to keep it
    factor : mol of the supposed content for each mol stated
    co2 : dissolved carbon dioxide added [mol/kg]
    """

    contributions: tuple[int, ...]
    form: str = ""
    factor: float = 1.0
    co2: float = 0.0


def _groups(index: IntArray, width: int) -> list[IntArray]:
    """Positions of each value 0 to width - 1 in an index array."""
    order = np.argsort(index, kind="stable")
    ends = np.cumsum(np.bincount(index, minlength=width)).tolist()
    return [order[first:last] for first, last in zip([0, *ends], ends, strict=False)]


class Retrial:
    """Keeps what was already predicted; rows and shifts are those of the evidence (Layout order)."""

    def __init__(self, layout: Layout, repredict: Repredict) -> None:
        self.layout, self.repredict = layout, repredict
        self._known: dict[Supposed, tuple[IntArray, FloatArray]] = {}
        self._unsure: dict[Supposed, dict[tuple[str, int], tuple[IntArray, FloatArray]]] = {}
        self.kept: dict[object, Any] = {}
        """What fault kinds worked out once for this record, under keys of their own."""
        solutions = layout.records.solutions
        self._contributions_of = _groups(solutions.solution, len(solutions))
        self._rows_of = _groups(layout.solution, len(solutions))
        self._chain: dict[int, list[int]] = {}
        for contribution, lot in zip(solutions.chain_contribution.tolist(), solutions.chain_lot.tolist(), strict=True):
            self._chain.setdefault(lot, []).append(contribution)

    def contributions_of_lot(self, lot: int) -> tuple[int, ...]:
        """Every contribution that rests on a lot."""
        return tuple(sorted(self._chain.get(lot, ())))

    def contributions_of_solution(self, solution: int) -> list[int]:
        """The contributions of one solution, in recipe order."""
        return [int(c) for c in self._contributions_of[solution]]

    def _rows(self, supposed: Supposed) -> IntArray:
        """Evidence rows of the solutions that the contributions stand in."""
        solutions = np.unique(self.layout.records.solutions.solution[list(supposed.contributions)])
        rows = [self._rows_of[int(i)] for i in solutions]
        return np.sort(np.concatenate(rows)).astype(np.intp) if rows else np.zeros(0, np.intp)

    def shifts(self, supposed: Sequence[Supposed]) -> list[tuple[IntArray, FloatArray]]:
        """For each supposed truth the evidence rows it touches and how far their predictions move [pH].

        A row that cannot be solved under a supposition moves by NaN, which rules the supposition out.
        """
        new = [s for s in dict.fromkeys(supposed) if s not in self._known]
        if new:
            layout = self.layout
            touched = [self._rows(s) for s in new]
            changes = [
                Change(
                    rows=layout.reading[rows],
                    contributions=np.array(s.contributions, np.intp),
                    form=s.form,
                    factor=np.full(len(s.contributions), s.factor),
                    dissolved_co2=s.co2,
                )
                for s, rows in zip(new, touched, strict=True)
            ]
            for s, rows, prediction in zip(new, touched, self.repredict(changes), strict=True):
                self._known[s] = (rows, prediction.ph - layout.ph[rows])
                if s.form:
                    self._unsure[s] = _of_constants(prediction, rows)
        return [self._known[s] for s in supposed]

    def unsure(self, supposed: Supposed, beside: frozenset[str]) -> sparse.csc_array:
        """What the constants of a supposed form leave unsure: u(pKa) dpH/dpKa, one column a constant [pH].

        beside : acids whose constants are in the model already. Columns have unit variance; (n, number of constants)
        """
        self.shifts([supposed])
        parts = [part for (acid, _), part in sorted(self._unsure.get(supposed, {}).items()) if acid not in beside]
        n = len(self.layout)
        if not parts:
            return sparse.csc_array((n, 0))
        rows = np.concatenate([rows for rows, _ in parts])
        column = np.repeat(np.arange(len(parts)), [len(rows) for rows, _ in parts])
        values = np.concatenate([value for _, value in parts])
        return sparse.csc_array((values, (rows, column)), shape=(n, len(parts)))


def _of_constants(prediction: Prediction, rows: IntArray) -> dict[tuple[str, int], tuple[IntArray, FloatArray]]:
    """By constant: the evidence rows that feel it, and by how much for one standard uncertainty [pH]."""
    t = prediction.constants
    moved = t.value * prediction.constant_u[t.column]
    found = {}
    for column in np.unique(t.column[np.abs(moved) > 1e-4]).tolist():
        mine = t.column == column
        found[prediction.constant_names[column]] = (rows[t.row[mine]], moved[mine])
    return found
