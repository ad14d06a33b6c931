"""What solutions hold, from forms and amounts, and the padded layout in which a chunk of them is solved."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.activity import ActivityModel
from reconcile.chemistry.ion_data import strong_ions
from reconcile.chemistry.specific import interact
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
    strong : FloatArray (f, i)   number of each strong ion, in the order of ion_data.strong_ions; where it is left out,
                                 ions of a form do not interact
    """

    charge: FloatArray
    square: FloatArray
    acid: IntArray
    units: FloatArray
    strong: FloatArray | None = None

    @property
    def brings(self) -> FloatArray:
        """Number of each strong ion in each form (f, i); 0 where that is not known."""
        return np.zeros((len(self.charge), len(strong_ions()))) if self.strong is None else self.strong


def form_table(forms: Sequence[Form], acids: AcidTable) -> FormTable:
    """The table of some forms; raises ValueError when a form brings an acid that the acid table does not hold."""
    charges = {name: float(ion.charge) for name, ion in ions().items()}
    index = acids.index
    width = max((len(f.acids) for f in forms), default=0) or 1
    charge, square = np.zeros(len(forms)), np.zeros(len(forms))
    acid, units = np.full((width, len(forms)), -1, np.intp), np.zeros((width, len(forms)))
    place = {name: i for i, name in enumerate(strong_ions())}
    strong = np.zeros((len(forms), len(place)))
    for i, form in enumerate(forms):
        for ion, number in form.strong_ions.items():
            strong[i, place[ion]] += number
            charge[i] += number * charges[ion]
            square[i] += number * charges[ion] ** 2
        for slot, (name, number) in enumerate(form.acids.items()):
            if name not in index:
                raise ValueError(f"{form.name} brings {name}, which the table of acids does not hold")
            acid[slot, i] = index[name]
            units[slot, i] = number
    return FormTable(charge, square, acid, units, strong)


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
    neutral : bool               True where that charge is 0 in every row
    total : FloatArray (m,)      molality [mol/kg]; of an open row, that of its neutral first state
    closed : FloatArray (m,)     1; 0 where the air holds the first state's molality. None where all are closed
    acid : IntArray (m,)         index of the acid; the number of acids where the row has none here
    size : FloatArray (s + 1, m) ion size of each state [angstrom]; empty unless the model asks for it
    linear : FloatArray (s + 1, m) linear coefficient over charge squared [kg/mol]; empty unless the model asks for it
    """

    k: FloatArray
    charge: FloatArray
    neutral: bool
    total: FloatArray
    closed: FloatArray | None
    acid: IntArray
    size: FloatArray
    linear: FloatArray

    def take(self, keep: IntArray) -> Slot:
        return Slot(
            self.k.take(keep, axis=1),
            self.charge.take(keep),
            self.neutral,
            self.total.take(keep),
            None if self.closed is None else self.closed.take(keep),
            self.acid.take(keep),
            self.size.take(keep, axis=1) if self.size.size else self.size,
            self.linear.take(keep, axis=1) if self.linear.size else self.linear,
        )


@dataclass
class Chunk:
    """m solutions in the padded layout: per row the strong ions and the solvent, and a list of slots of one acid each.

    charge : net charge of the strong ions and of every acid if fully protonated [mol/kg]
    strong : net charge of the strong ions alone; square : their sum of molality times charge squared
    a, b : Debye-Hueckel coefficients; kw : ionization constant of water. All (m,).
    hydrogen : what multiplies the molality of hydrogen ions beside D; None for 1
    """

    charge: FloatArray
    strong: FloatArray
    square: FloatArray
    a: FloatArray
    b: FloatArray
    kw: FloatArray
    slots: list[Slot]
    hydrogen: FloatArray | None = None

    def __len__(self) -> int:
        return len(self.charge)

    def take(self, keep: IntArray) -> Chunk:
        return Chunk(
            self.charge.take(keep),
            self.strong.take(keep),
            self.square.take(keep),
            self.a.take(keep),
            self.b.take(keep),
            self.kw.take(keep),
            [slot.take(keep) for slot in self.slots],
            None if self.hydrogen is None else self.hydrogen.take(keep),
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
ROUNDING = 1e-15  # mol/kg; what subtracting two equal molalities may leave


def entries_at(start: IntArray, rows: IntArray) -> tuple[IntArray, IntArray]:
    """Entries of some rows of a list (row i runs from start[i] to start[i + 1]), and the place of each in `rows`."""
    counts = start[rows + 1] - start[rows]
    row = np.repeat(np.arange(len(rows)), counts)
    ends = np.cumsum(counts)
    entry = np.arange(ends[-1] if len(ends) else 0) + np.repeat(start[rows] - ends + counts, counts)
    return entry, row


def pad(
    contents: Contents, rows: IntArray, forms: FormTable, acids: AcidTable, water: Solvent, model: ActivityModel
) -> tuple[Chunk, Padding]:
    """The padded layout of some solutions; `water` has one entry for each of the rows."""
    m = len(rows)
    entry, row = entries_at(contents.start, rows)
    form, amount = contents.form.take(entry), contents.amount.take(entry)
    strong = np.bincount(row, amount * forms.charge.take(form), m).astype(float)
    square = np.bincount(row, amount * forms.square.take(form), m).astype(float)
    brought = [(forms.acid[w].take(form), forms.units[w].take(form)) for w in range(len(forms.acid))]
    present = np.zeros(len(acids.names) + 1, bool)
    for acid, _ in brought:
        present[acid] = True
    opened = contents.open_co2.take(rows)
    air = bool(np.any(opened > 0.0))
    carbonic = acids.index[CARBONIC]
    present[carbonic] |= air
    columns = np.flatnonzero(present[:-1])
    # the longest acids share the first slots, those of one charge stand together
    columns = columns[np.lexsort([columns, acids.charge[columns], -acids.steps[columns]])]
    count = len(columns)
    place = np.full(len(acids.names) + 1, count, np.intp)
    place[columns] = np.arange(count)
    cells = np.zeros(m * (count + 1))
    for acid, units in brought:
        if np.any(units):
            cells += np.bincount(row * (count + 1) + place[acid], amount * units, len(cells))
    if air:
        column = cells.reshape(m, count + 1)[:, place[carbonic]]
        column[:] = np.where(opened > 0.0, opened, column)
    if cells.min(initial=0.0) < 0.0:  # carbon dioxide supposed lost: more than there is cannot be solved
        short = np.any(cells.reshape(m, count + 1) < -ROUNDING, axis=1)
        strong = np.where(short, np.nan, strong)
        np.maximum(cells, 0.0, out=cells)
    slots = _slots(cells, m, columns, opened if air else None, carbonic, acids, water, model)
    charge = strong
    for slot in slots:
        if not slot.neutral:
            charge = charge + slot.total * slot.charge
    chunk = Chunk(charge, strong, square, water.a, water.b, np.exp(-LN10 * water.pkw), slots)
    if model.pairwise:
        brings = forms.brings
        molality = np.zeros((m, brings.shape[1]))
        for ion in np.flatnonzero(brings.any(axis=0)):
            molality[:, ion] = np.bincount(row, amount * brings[form, ion], m)
        interact(chunk, molality, acids)
    return chunk, Padding(rows, entry, row, columns, place)


def _slots(
    totals: FloatArray,
    m: int,
    columns: IntArray,
    opened: FloatArray | None,
    carbonic: int,
    acids: AcidTable,
    water: Solvent,
    model: ActivityModel,
) -> list[Slot]:
    width = len(columns) + 1
    held = np.flatnonzero(totals != 0.0)  # over one axis and as truth values: several times faster
    row = held // max(width, 1)
    column = held - row * width
    has = column < len(columns)
    if not has.all():
        held, row, column = held[has], row[has], column[has]
    counts = np.bincount(row, minlength=m)
    number = np.arange(len(row)) - np.repeat(np.cumsum(counts) - counts, counts)
    most = int(counts.max(initial=0))
    acid, total = np.full((most, m), len(acids.names), np.intp), np.zeros((most, m))
    cell = number * m + row
    acid.ravel()[cell] = columns.take(column)
    total.ravel()[cell] = totals.take(held)
    kelvin = water.temperature_c + ZERO_CELSIUS
    same = m > 0 and bool(np.all(kelvin == kelvin[0]))
    terms, edge, _ = acids.by_step
    beyond = len(acids.names) + 1  # how far behind an acid's terms within the range of an equation stand the others
    if same:
        at = np.exp(-LN10 * terms.value(kelvin[0], water.pkw[0]))
    inverse, log = 1.0 / kelvin, np.log(kelvin)
    # the entry for no acid is the last of each of these, and of the columns of by_step
    charges, counted = np.append(acids.charge, 0.0), np.append(acids.steps, 0)
    slots = []
    for which, amount in zip(acid, total, strict=True):
        steps = counted.take(which)
        k = np.empty((int(steps.max(initial=0)), m))
        column = which + beyond * (water.temperature_c > edge.take(which))
        for j in range(len(k)):
            if same:
                k[j] = at[j].take(column)
                continue
            pka = terms.q[j].take(column)
            pka *= inverse
            pka += terms.p[j].take(column)
            pka += terms.r[j].take(column) * log
            pka += terms.t[j].take(column) * kelvin
            pka += terms.w[j].take(column) * water.pkw
            pka *= -LN10
            np.exp(pka, out=k[j])
        size = linear = np.zeros((0, m))
        if model.sized:
            state = np.stack([acids.state_of(which, lost) for lost in range(len(k) + 1)])
            size = acids.size[state]
            if model.linear:
                own, over_square = acids.sizes_and_linear
                size, linear = own[state], over_square[state]
        charge = charges.take(which)
        closed = None
        if opened is not None:
            closed = np.where((opened > 0.0) & (which == carbonic), 0.0, 1.0)
        slots.append(Slot(k, charge, not charge.any(), amount, closed, which, size, linear))
    return slots
