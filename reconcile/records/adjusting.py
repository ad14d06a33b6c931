"""Amounts that a record leaves open (as needed, to pH 7.4), and what they are once solved from a pH."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from reconcile.records.arrays import BoolArray, FloatArray, IntArray, TextArray, Triplets
from reconcile.records.places import Place


def _whole(n: int = 0) -> IntArray:
    return np.full(n, -1, np.intp)


def _numbers(n: int = 0) -> FloatArray:
    return np.full(n, np.nan)


def _texts(n: int = 0) -> TextArray:
    return np.full(n, "", object)


@dataclass(frozen=True)
class OpenAmounts:
    """Amounts that are written as "as needed" or "to pH 7.4", or not written at all (the counter-ion of a stock).

    Open amounts (k,), those that others rest on first:
    batch : TextArray      batch whose reading settles the amount; "" for a stock that is settled by its stated pH
    stock : TextArray      lot of the stock that the amount belongs to; "" for a batch that is no stock
    substance, lot : TextArray    the titrant as written and its lot, "" where none is named
    unit : TextArray       unit of the amount: mL, g, mol/L, mol/kg; "mol/mol" for the counter-ion of a stock
    step : TextArray       step of the recipe that the titrant was added in
    choice : IntArray      open amounts of one number are alternatives (an acid or a base as needed): one is used
    stated_ph : FloatArray [pH] that a stock is stated to have, or "to pH 7.4"; NaN when unstated
    stated_at : FloatArray [°C] at which it is stated; NaN when unstated
    place : tuple of Place cell that leaves the amount open

    Pairs (m,), contributions of Solutions that an open amount scales:
    contribution, owner : IntArray; per_unit : FloatArray, final amount for one unit of the open amount

    Stock solutions (t,), what the stock that an open amount belongs to holds, for those with a stated pH:
    part_owner : IntArray (t,), the open amount whose stock it is; sorted
    part_form : IntArray (t,), index into BatchRecords.forms; part_amount : FloatArray (t,), [mol/L]
    part_open : IntArray (t,), the open amount that scales part_amount; -1 for none
    """

    batch: TextArray = field(default_factory=_texts)
    stock: TextArray = field(default_factory=_texts)
    substance: TextArray = field(default_factory=_texts)
    lot: TextArray = field(default_factory=_texts)
    unit: TextArray = field(default_factory=_texts)
    step: TextArray = field(default_factory=_texts)
    choice: IntArray = field(default_factory=_whole)
    stated_ph: FloatArray = field(default_factory=_numbers)
    stated_at: FloatArray = field(default_factory=_numbers)
    place: tuple[Place, ...] = ()
    contribution: IntArray = field(default_factory=_whole)
    owner: IntArray = field(default_factory=_whole)
    per_unit: FloatArray = field(default_factory=_numbers)
    part_owner: IntArray = field(default_factory=_whole)
    part_form: IntArray = field(default_factory=_whole)
    part_amount: FloatArray = field(default_factory=_numbers)
    part_open: IntArray = field(default_factory=_whole)

    def __len__(self) -> int:
        return len(self.batch)


@dataclass(frozen=True)
class Solved:
    """What became of the open amounts (k,), and what each adjusted reading (n,) was adjusted by.

    amount : FloatArray (k,)    in the unit of the open amount; NaN where no pH settles it; 0 for one not used
    u : FloatArray (k,)         its standard uncertainty, reading and prediction together
    ph, u_ph : FloatArray (k,)  the pH that settled it and its standard uncertainty [pH]
    temperature_c : FloatArray (k,)
    reading : IntArray (k,)     reading that settled it; -1 for a stated pH
    usual, usual_low, usual_high : FloatArray (k,), median, least and greatest amount of the other like batches; NaN
    like : IntArray (k,)        how many like batches there are; odd : BoolArray (k,), far from what they took

    anchor : IntArray (n,)      reading that the solution of a reading was adjusted by; -1 where it was not adjusted
    adjusted : BoolArray (n,)   readings that only say what was adjusted to: the anchor, and others on its meter and day

    How pH of a solution follows what settled it; a contribution x of open amount j moves by d ln x = weight[j] d(pH):
    weight : FloatArray (k,)    d ln x / d(pH) where it was settled [1/pH]
    constants : Triplets (k, q) dpH/dpKa there, of constant_names; contributions : Triplets (k, c)
    d_model, d_temperature : FloatArray (k,)
    """

    amount: FloatArray = field(default_factory=_numbers)
    u: FloatArray = field(default_factory=_numbers)
    ph: FloatArray = field(default_factory=_numbers)
    u_ph: FloatArray = field(default_factory=_numbers)
    temperature_c: FloatArray = field(default_factory=_numbers)
    reading: IntArray = field(default_factory=_whole)
    usual: FloatArray = field(default_factory=_numbers)
    usual_low: FloatArray = field(default_factory=_numbers)
    usual_high: FloatArray = field(default_factory=_numbers)
    like: IntArray = field(default_factory=_whole)
    odd: BoolArray = field(default_factory=lambda: np.zeros(0, bool))
    anchor: IntArray = field(default_factory=_whole)
    adjusted: BoolArray = field(default_factory=lambda: np.zeros(0, bool))
    weight: FloatArray = field(default_factory=_numbers)
    constants: Triplets = field(default_factory=lambda: no_triplets((0, 0)))
    constant_names: tuple[tuple[str, int], ...] = ()
    contributions: Triplets = field(default_factory=lambda: no_triplets((0, 0)))
    d_model: FloatArray = field(default_factory=_numbers)
    d_temperature: FloatArray = field(default_factory=_numbers)

    def __len__(self) -> int:
        return len(self.amount)


def no_triplets(shape: tuple[int, int]) -> Triplets:
    """A sparse matrix without entries."""
    return Triplets(_whole(), _whole(), _numbers(), shape)
