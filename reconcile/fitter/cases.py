"""Readings laid out for the engine as cases: data sets with parameters of their own, fitted together."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, fields, replace
from functools import cached_property
from typing import Any

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.activity import ActivityModel
from reconcile.chemistry.composition import Contents, FormTable, entries_at
from reconcile.chemistry.pair_table import Pair
from reconcile.records.arrays import AnyArray, FloatArray, IntArray


@dataclass(frozen=True)
class Cases:
    """N readings of P cases; the readings of one case stand together.

    first : IntArray (P + 1,)     the readings of case k are first[k] to first[k + 1]
    start : IntArray (N + 1,)     the contributions of reading i are start[i] to start[i + 1]
    form : IntArray (c,)          index into the forms of the Medium
    amount : FloatArray (c,)      [mol/kg], as stated
    temperature_c : FloatArray (N,)
    open_co2 : FloatArray (N,)    dissolved CO2 held by the air [mol/kg]; 0 for a closed vessel
    """

    first: IntArray
    start: IntArray
    form: IntArray
    amount: FloatArray
    temperature_c: FloatArray
    open_co2: FloatArray

    def __len__(self) -> int:
        return len(self.first) - 1

    @property
    def readings(self) -> int:
        return len(self.temperature_c)

    @cached_property
    def case(self) -> IntArray:
        """Case of every reading, (N,)."""
        return np.repeat(np.arange(len(self)), np.diff(self.first))

    @cached_property
    def reading(self) -> IntArray:
        """Reading of every contribution, (c,)."""
        return np.repeat(np.arange(self.readings), np.diff(self.start))

    def take(self, which: AnyArray) -> Cases:
        """Some cases, in this order; one may be taken more than once."""
        rows, _ = entries_at(self.first, np.asarray(which, np.intp))
        return self.of_readings(rows, np.diff(self.first)[which])

    def of_readings(self, rows: AnyArray, counts: AnyArray) -> Cases:
        """Some readings, in this order, as cases of so many readings each."""
        rows = np.asarray(rows, np.intp)
        entry, _ = entries_at(self.start, rows)
        return Cases(
            np.concatenate([[0], np.cumsum(counts)]).astype(np.intp),
            np.concatenate([[0], np.cumsum(np.diff(self.start)[rows])]).astype(np.intp),
            self.form[entry],
            self.amount[entry],
            self.temperature_c[rows],
            self.open_co2[rows],
        )

    def sums(self, values: FloatArray) -> FloatArray:
        """Sums over the readings of each case, (N, ...) to (P, ...)."""
        return np.asarray(np.add.reduceat(values, self.first[:-1], axis=0)) if len(self) else values[:0]

    def spread(self, values: AnyArray) -> AnyArray:
        """A value of each case given to each of its readings."""
        return np.asarray(values)[self.case]


_ACROSS = ("acid", "units")
"""Columns of a FormTable that have the forms along their second axis; the others have them along the first."""


def _by_form(table: FormTable, change: Callable[[AnyArray, int, str], AnyArray]) -> FormTable:
    changed: dict[str, Any] = {}
    for field in fields(FormTable):
        value = getattr(table, field.name)
        if isinstance(value, np.ndarray):
            changed[field.name] = change(value, 1 if field.name in _ACROSS else 0, field.name)
    return replace(table, **changed)


def forms_taken(table: FormTable, which: IntArray) -> FormTable:
    """Some forms of a table, in this order."""
    return _by_form(table, lambda value, axis, _: np.take(value, which, axis=axis))


def forms_joined(table: FormTable, further: FormTable) -> FormTable:
    """The forms of two tables, one behind the other."""
    return _by_form(table, lambda value, axis, name: np.concatenate([value, getattr(further, name)], axis=axis))


@dataclass(frozen=True)
class Medium:
    """What all cases share: the forms in the solutions, the acids they bring, and which of these is studied.

    forms : FormTable          of every form; the studied acid stands in it like any other
    acids : AcidTable          constants of the acids, their uncertainties set to 0 (the fit keeps its own budget)
    studied : int              index of the acid under study in `acids`
    model : ActivityModel
    """

    forms: FormTable
    acids: AcidTable
    studied: int
    model: ActivityModel

    @cached_property
    def own_pairs(self) -> tuple[Pair, ...]:
        """Ion pairs and condensed species of the studied acid."""
        name = self.acids.names[self.studied]
        return tuple(pair for pair in self.acids.pairs if any(acid == name for acid, _ in pair.states))

    @cached_property
    def bringing(self) -> IntArray:
        """Forms that bring the studied acid."""
        return np.flatnonzero(np.any(self.forms.acid == self.studied, axis=0))

    @cached_property
    def place(self) -> IntArray:
        """Place of every form among those that bring the studied acid; -1 for the others."""
        place = np.full(len(self.forms.charge), -1, np.intp)
        place[self.bringing] = np.arange(len(self.bringing))
        return place

    def forms_with(self, stands_in: IntArray) -> FormTable:
        """The forms, then for each case those that bring the studied acid, with the acid that stands in for it."""
        own = self.bringing
        further = forms_taken(self.forms, np.tile(own, len(stands_in)))
        acid = np.where(further.acid == self.studied, np.repeat(stands_in, len(own)), further.acid)
        return forms_joined(self.forms, replace(further, acid=acid))

    def contents(self, cases: Cases, factor: FloatArray) -> Contents:
        """What every reading holds when the amount of the studied acid is `factor` (P,) times what is stated."""
        case = cases.case[cases.reading]
        place = self.place[cases.form]
        own = place >= 0
        form = np.where(own, len(self.forms.charge) + case * len(self.bringing) + place, cases.form)
        amount = np.where(own, cases.amount * factor[case], cases.amount)
        return Contents(cases.start, form, amount, cases.temperature_c, cases.open_co2)
