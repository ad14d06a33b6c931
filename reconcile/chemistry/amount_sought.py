"""The amount of a titrant for which a solution has a given pH."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.activity import ActivityModel
from reconcile.chemistry.composition import Contents, FormTable
from reconcile.chemistry.engine import Answers, run
from reconcile.records.arrays import BoolArray, FloatArray, IntArray

CLOSE = 1e-9
"""Difference from the pH sought at which an amount is taken [pH]."""
MOST_STEPS, MOST_DOUBLINGS = 80, 9
Entry = tuple[int, float, float]
"""Form, amount that stands whatever the titrant [mol/kg], and amount for one unit of titrant [mol/kg]."""


@dataclass(frozen=True)
class Sought:
    """v solutions, each with one titrant of unknown amount.

    start : IntArray (v + 1,); form : IntArray (e,); fixed, per_unit : FloatArray (e,) [mol/kg]
    ph, temperature_c, open_co2 : FloatArray (v,); signed : BoolArray (v,), True where the titrant brings strong ions
    alone: less than nothing of it is as much of its opposite
    """

    start: IntArray
    form: IntArray
    fixed: FloatArray
    per_unit: FloatArray
    ph: FloatArray
    temperature_c: FloatArray
    open_co2: FloatArray
    signed: BoolArray

    def __len__(self) -> int:
        return len(self.ph)

    def contents(self, amount: FloatArray) -> Contents:
        """The solutions with some amounts of titrant."""
        each = np.repeat(amount, np.diff(self.start))
        return Contents(self.start, self.form, self.fixed + self.per_unit * each, self.temperature_c, self.open_co2)

    def scale(self) -> FloatArray:
        """Amount of titrant that equals all that stands otherwise (v,)."""
        row = np.repeat(np.arange(len(self)), np.diff(self.start))
        whole = np.bincount(row, np.abs(self.fixed), len(self))
        unit = np.bincount(row, np.abs(self.per_unit), len(self))
        return np.asarray(np.maximum(whole, 1e-6) / np.maximum(unit, 1e-300), float)


def sought(
    entries: Sequence[Sequence[Entry]],
    ph: FloatArray,
    temperature_c: FloatArray,
    open_co2: FloatArray,
    signed: BoolArray,
) -> Sought:
    """Solutions given as lists of entries, side by side."""
    counts = np.array([len(some) for some in entries], np.intp)
    flat = [entry for some in entries for entry in some]
    return Sought(
        np.concatenate([[0], np.cumsum(counts)]).astype(np.intp),
        np.array([form for form, _, _ in flat], np.intp),
        np.array([fixed for _, fixed, _ in flat], np.float64),
        np.array([unit for _, _, unit in flat], np.float64),
        ph,
        temperature_c,
        open_co2,
        signed,
    )


def answers_at(wanted: Sought, amount: FloatArray, forms: FormTable, acids: AcidTable, model: ActivityModel) -> Answers:
    """What the engine says of the solutions with some amounts of titrant."""
    return run(wanted.contents(amount), forms, acids, model)


def find_amounts(wanted: Sought, forms: FormTable, acids: AcidTable, model: ActivityModel) -> FloatArray:
    """Amount of titrant at which each solution has the pH sought (v,); NaN where none gives it.

    Notes
    -----
    The amount is enclosed by doubling from nothing, then narrowed by the Illinois rule (Dowell and Jarratt 1971, BIT
    11:168), every third step by halving. Below nothing is looked only for titrants of strong ions.
    """

    def off(amount: FloatArray) -> FloatArray:
        return np.asarray(answers_at(wanted, amount, forms, acids, model).ph - wanted.ph)

    v = len(wanted)
    scale = wanted.scale()
    low, high = np.zeros(v), np.full(v, np.nan)
    f_low, f_high = off(low), np.full(v, np.nan)
    for sign in (1.0, -1.0):
        step = 2.0**-3 * scale
        looking = np.isnan(high) & np.isfinite(f_low) & (wanted.signed | (sign > 0))
        best, f_best = np.zeros(v), f_low.copy()
        for _ in range(MOST_DOUBLINGS):
            if not looking.any():
                break
            f = off(sign * step)
            with np.errstate(invalid="ignore"):
                crossed = looking & (f * f_best <= 0.0)
                away = looking & ~crossed & ~(np.abs(f) <= np.abs(f_best) + 1e-12)
            low, f_low = np.where(crossed, best, low), np.where(crossed, f_best, f_low)
            high, f_high = np.where(crossed, sign * step, high), np.where(crossed, f, f_high)
            looking &= ~crossed & ~away
            best, f_best = np.where(looking, sign * step, best), np.where(looking, f, f_best)
            step = step * 2.0
    found = np.isfinite(high)
    x = np.where(found, high, np.nan)
    done = ~found
    for turn in range(MOST_STEPS):
        if done.all():
            break
        with np.errstate(invalid="ignore", divide="ignore"):
            next_x = high - f_high * (high - low) / (f_high - f_low)
        if turn % 3 == 2:
            next_x = (low + high) / 2.0
        inside = np.isfinite(next_x) & ((next_x - low) * (next_x - high) <= 0.0)
        next_x = np.where(inside, next_x, (low + high) / 2.0)
        x = np.where(done, x, next_x)
        f = off(np.where(np.isfinite(x), x, 0.0))
        with np.errstate(invalid="ignore"):
            same = f * f_high > 0.0
        f_low = np.where(same, f_low / 2.0, f_high)
        low = np.where(same, low, high)
        high, f_high = x.copy(), f
        width = np.abs(high - low) <= 1e-14 * np.maximum(np.abs(high), scale)
        done |= (np.abs(f) <= CLOSE) | width | ~np.isfinite(f)
    return np.where(found & (np.abs(f_high) < 1e-4), x, np.nan)
