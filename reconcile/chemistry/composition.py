"""What solutions hold, from forms and amounts, and the padded layout in which a chunk of them is solved."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.temperature import LN10, Solvent
from reconcile.chemistry.water import ZERO_CELSIUS
from reconcile.records.arrays import FloatArray, IntArray
from reconcile.records.substances import Form, ions


@dataclass(frozen=True)
class FormTable:
    """Forms as arrays: f forms, each bringing at most w acids.

    charge : FloatArray (f,)     charge of the ions that never change, per formula unit
    square : FloatArray (f,)     sum of their number times charge squared
    acid : IntArray (w, f)       acids brought; -1 for none
    units : FloatArray (w, f)    units of each
    """

    charge: FloatArray
    square: FloatArray
    acid: IntArray
    units: FloatArray


def form_table(forms: Sequence[Form], acids: AcidTable) -> FormTable:
    """The table of some forms; raises ValueError when a form brings an acid that the acid table does not hold."""
    charges = {name: float(ion.charge) for name, ion in ions().items()}
    index = acids.index
    width = max((len(f.acids) for f in forms), default=0) or 1
    charge, square = np.zeros(len(forms)), np.zeros(len(forms))
    acid, units = np.full((width, len(forms)), -1, np.intp), np.zeros((width, len(forms)))
    for i, form in enumerate(forms):
        for ion, number in form.strong_ions.items():
            charge[i] += number * charges[ion]
            square[i] += number * charges[ion] ** 2
        for slot, (name, number) in enumerate(form.acids.items()):
            if name not in index:
                raise ValueError(f"{form.name} brings {name}, which the table of acids does not hold")
            acid[slot, i] = index[name]
            units[slot, i] = number
    return FormTable(charge, square, acid, units)


@dataclass(frozen=True)
class Contents:
    """n solutions, each a list of contributions.

    start : IntArray (n + 1,)       the contributions of solution i are start[i] to start[i + 1]
    form : IntArray (c,)            index into a FormTable
    amount : FloatArray (c,)        [mol/kg]
    temperature_c : FloatArray (n,)
    open_co2 : FloatArray (n,)      molality of dissolved CO2 held by the air [mol/kg]; 0 for a closed vessel
    """

    start: IntArray
    form: IntArray
    amount: FloatArray
    temperature_c: FloatArray
    open_co2: FloatArray

    def __len__(self) -> int:
        return len(self.temperature_c)


@dataclass
class Slot:
    """One acid of every row of a chunk of m rows, padded to the largest number of steps among them.

    k : FloatArray (s, m)        thermodynamic ionization constants; 0 for steps an acid does not have
    charge : FloatArray (m,)     of the fully protonated form
    total : FloatArray (m,)      molality [mol/kg]; of an open row, that of its neutral first state
    closed : FloatArray (m,)     1; 0 where the air holds the first state's molality
    acid : IntArray (m,)         index of the acid; -1 where the row has none here
    size : FloatArray (s + 1, m) ion size of each state [angstrom]; empty unless the model asks for it
    """

    k: FloatArray
    charge: FloatArray
    total: FloatArray
    closed: FloatArray
    acid: IntArray
    size: FloatArray

    def take(self, keep: IntArray) -> Slot:
        return Slot(
            self.k[:, keep],
            self.charge[keep],
            self.total[keep],
            self.closed[keep],
            self.acid[keep],
            self.size[:, keep] if self.size.size else self.size,
        )


@dataclass
class Chunk:
    """m solutions in the padded layout: per row the strong ions and the solvent, and a list of slots of one acid each.

    charge : net charge of the strong ions [mol/kg]; square : their sum of molality times charge squared
    a, b : Debye-Hueckel coefficients; kw : ionization constant of water. All (m,).
    """

    charge: FloatArray
    square: FloatArray
    a: FloatArray
    b: FloatArray
    kw: FloatArray
    slots: list[Slot]

    def __len__(self) -> int:
        return len(self.charge)

    def take(self, keep: IntArray) -> Chunk:
        return Chunk(
            self.charge[keep],
            self.square[keep],
            self.a[keep],
            self.b[keep],
            self.kw[keep],
            [slot.take(keep) for slot in self.slots],
        )


@dataclass(frozen=True)
class Padding:
    """Where a chunk's cells came from, for the way back from slots to contributions.

    rows : IntArray (m,)        solutions of the chunk
    entry : IntArray (e,)       contributions of the chunk; row : IntArray (e,) its row in the chunk
    columns : IntArray (a,)     acids of the chunk; place : IntArray (number of acids,), acid -> column
    """

    rows: IntArray
    entry: IntArray
    row: IntArray
    columns: IntArray
    place: IntArray


CARBONIC = "carbonic acid"


def entries_at(start: IntArray, rows: IntArray) -> tuple[IntArray, IntArray]:
    """Entries of some rows of a list (row i runs from start[i] to start[i + 1]), and the place of each in `rows`."""
    counts = start[rows + 1] - start[rows]
    row = np.repeat(np.arange(len(rows)), counts)
    ends = np.cumsum(counts)
    entry = np.arange(ends[-1] if len(ends) else 0) + np.repeat(start[rows] - ends + counts, counts)
    return entry, row


def pad(
    contents: Contents, rows: IntArray, forms: FormTable, acids: AcidTable, water: Solvent, sized: bool
) -> tuple[Chunk, Padding]:
    """The padded layout of some solutions; `water` has one entry for each of the rows."""
    m = len(rows)
    entry, row = entries_at(contents.start, rows)
    form, amount = contents.form[entry], contents.amount[entry]
    charge = np.bincount(row, amount * forms.charge[form], m).astype(float)
    square = np.bincount(row, amount * forms.square[form], m).astype(float)
    brought = [(forms.acid[w][form], forms.units[w][form]) for w in range(len(forms.acid))]
    present = np.zeros(len(acids.names), bool)
    for acid, _ in brought:
        present[acid[acid >= 0]] = True
    opened = contents.open_co2[rows]
    carbonic = acids.index[CARBONIC]
    present[carbonic] |= bool(np.any(opened > 0.0))
    columns = np.flatnonzero(present)
    columns = columns[np.argsort(-acids.steps[columns], kind="stable")]  # the longest acids share the first slots
    place = np.zeros(len(acids.names), np.intp)
    place[columns] = np.arange(len(columns))
    totals = np.zeros((m, len(columns)))
    for acid, units in brought:
        has = acid >= 0 if np.any(acid < 0) else slice(None)
        cell = row[has] * len(columns) + place[acid[has]]
        totals += np.bincount(cell, amount[has] * units[has], totals.size).reshape(totals.shape)
    if np.any(opened > 0.0):
        totals[:, place[carbonic]] = np.where(opened > 0.0, opened, totals[:, place[carbonic]])
    slots = _slots(totals, columns, opened, carbonic, acids, water, sized)
    chunk = Chunk(charge, square, water.a, water.b, np.exp(-LN10 * water.pkw), slots)
    return chunk, Padding(rows, entry, row, columns, place)


def _slots(
    totals: FloatArray,
    columns: IntArray,
    opened: FloatArray,
    carbonic: int,
    acids: AcidTable,
    water: Solvent,
    sized: bool,
) -> list[Slot]:
    m = len(totals)
    row, column = np.nonzero(totals)
    counts = np.bincount(row, minlength=m)
    slot_of = np.arange(len(row)) - np.repeat(np.cumsum(counts) - counts, counts)
    kelvin = water.temperature_c + ZERO_CELSIUS
    same = bool(m) and bool(np.all(kelvin == kelvin[0]))
    if same:
        at = np.exp(-LN10 * (acids.p + acids.q / kelvin[0] + acids.r * np.log(kelvin[0])))
    inverse, log = 1.0 / kelvin, np.log(kelvin)
    slots = []
    for number in range(int(counts.max(initial=0))):
        here = slot_of == number
        rows = row[here]
        acid = np.full(m, -1, np.intp)
        acid[rows] = columns[column[here]]
        has = acid >= 0
        safe = np.where(has, acid, 0)
        steps = np.where(has, acids.steps[safe], 0)
        total = np.zeros(m)
        total[rows] = totals[rows, column[here]]
        k = np.zeros((int(steps.max(initial=0)), m))
        for j in range(len(k)):
            deep = np.flatnonzero(steps > j)
            q = acids.first[safe[deep]] + j
            if same:
                k[j, deep] = at[q]
            else:
                k[j, deep] = np.exp(-LN10 * (acids.p[q] + acids.q[q] * inverse[deep] + acids.r[q] * log[deep]))
        closed = np.where((opened > 0.0) & (acid == carbonic), 0.0, 1.0)
        size = np.zeros((0, m))
        if sized:
            states = np.minimum(np.arange(len(k) + 1)[:, None], steps)
            size = acids.size[acids.first[safe] + safe + states]
        slots.append(Slot(k, np.where(has, acids.charge[safe], 0.0), total, closed, acid, size))
    return slots
