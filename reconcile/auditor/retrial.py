"""Predictions under a supposed other recipe, computed once each by the function that the pipeline hands over."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

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

    def _change(self, supposed: Supposed, rows: IntArray) -> Change:
        """A supposed truth as the prediction engine is asked for it."""
        return Change(
            rows=self.layout.reading[rows],
            contributions=np.array(supposed.contributions, np.intp),
            form=supposed.form,
            factor=np.full(len(supposed.contributions), supposed.factor),
            dissolved_co2=supposed.co2,
        )

    def shifts(self, supposed: Sequence[Supposed]) -> list[tuple[IntArray, FloatArray]]:
        """For each supposed truth the evidence rows it touches and how far their predictions move [pH].

        A row that cannot be solved under a supposition moves by NaN, which rules the supposition out.
        """
        new = [s for s in dict.fromkeys(supposed) if s not in self._known]
        if new:
            layout = self.layout
            touched = [self._rows(s) for s in new]
            changes = [self._change(s, rows) for s, rows in zip(new, touched, strict=True)]
            for s, rows, prediction in zip(new, touched, self.repredict(changes), strict=True):
                self._known[s] = (rows, prediction.ph - layout.ph[rows])
        return [self._known[s] for s in supposed]

    def rows_of(self, supposed: Supposed) -> IntArray:
        """Evidence rows that a supposed truth touches."""
        return self._rows(supposed)

    def shifts_at(self, supposed: Sequence[Supposed], rows: IntArray) -> FloatArray:
        """How far the predictions of some evidence rows move under each supposed truth, (k, rows) [pH]; not kept."""
        predictions = self.repredict([self._change(s, rows) for s in supposed])
        return np.array([p.ph - self.layout.ph[rows] for p in predictions]).reshape(len(supposed), len(rows))

    def prediction(self, supposed: Supposed) -> tuple[IntArray, Prediction]:
        """The evidence rows a supposed truth touches, and their whole prediction under it; kept for few."""
        key = ("prediction", supposed)
        if key not in self.kept:
            rows = self._rows(supposed)
            self.kept[key] = (rows, self.repredict([self._change(supposed, rows)])[0])
        found: tuple[IntArray, Prediction] = self.kept[key]
        return found
