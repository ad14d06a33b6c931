"""Which rows of a chunk hold ion pairs that matter, and their answers and slopes with them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.activity import ActivityModel
from reconcile.chemistry.composition import Chunk, Contents, FormTable, Padding
from reconcile.chemistry.ion_data import strong_ions
from reconcile.chemistry.pair_slopes import Solution
from reconcile.chemistry.pair_solve import at_start, solve_pairs
from reconcile.chemistry.pair_table import Pair
from reconcile.chemistry.pairs import Layout, layout, metal_molalities
from reconcile.chemistry.sensitivities import Slopes, slopes
from reconcile.chemistry.temperature import Solvent, water_at
from reconcile.chemistry.water import DENSITY_20C, ZERO_CELSIUS
from reconcile.records.arrays import BoolArray, FloatArray, IntArray

MATTERS = 1e-9
"""pH that the pairs of a row must be able to move before they are taken into account."""


def possible(pairs: Sequence[Pair], padding: Padding, forms: FormTable, acids: AcidTable) -> list[Pair]:
    """The pairs whose parts some row of a chunk may hold."""
    acids_here = {acids.names[a] for a in padding.columns}
    return [p for p in pairs if all(acid in acids_here for acid, _ in p.states) and _has_metals(p, forms)]


def _has_metals(pair: Pair, forms: FormTable) -> bool:
    return all(forms.brings[:, strong_ions().index(metal)].any() for metal in pair.metals)


def _cut(padding: Padding, rows: IntArray) -> Padding:
    """The padding of some rows of its chunk."""
    place = np.full(len(padding.rows), -1, np.intp)
    place[rows] = np.arange(len(rows))
    kept = place[padding.row] >= 0
    return replace(padding, rows=padding.rows[rows], entry=padding.entry[kept], row=place[padding.row[kept]])


def with_pairs(
    chunk: Chunk,
    padding: Padding,
    contents: Contents,
    forms: FormTable,
    acids: AcidTable,
    water: Solvent,
    model: ActivityModel,
    answer: tuple[FloatArray, FloatArray, BoolArray],
    without: Slopes,
) -> None:
    """Put the answers and slopes of rows with pairs in the place of those without.

    Parameters
    ----------
    chunk, padding, contents, forms, acids, water, model
        As they were solved without pairs.
    answer : tuple of ndarray (m,)
        pH, ionic strength and whether solved; changed in place.
    without : Slopes
        Of the rows without pairs; changed in place.
    """
    ph, strength, solved = answer
    rows, lay, some = laid_out(chunk, padding, contents, forms, acids, water, solved)
    if lay is None:
        return
    bound = at_start(lay, model, ph[rows], strength[rows])
    moved = 9.0 * bound * without.d_titrant[rows] * DENSITY_20C  # no species has a charge beyond 3
    matter = np.flatnonzero(moved > MATTERS)
    if not len(matter):
        return
    rows, lay = rows[matter], lay.take(matter)
    cut, here = _cut(padding, rows), water_at(water, rows)
    x, i, y, done = solve_pairs(lay, model, ph[rows], strength[rows])
    ph[rows], strength[rows], solved[rows] = x, i, done
    found = slopes(lay.rest, cut, contents, forms, acids, here, model, x, i, Solution(lay, some, acids, y))
    for name in ("d_temperature", "d_model", "d_pkw", "d_titrant", "constant_value", "degree", "of_pairs"):
        getattr(without, name)[rows] = getattr(found, name)
    own = np.zeros(len(chunk), bool)
    own[rows] = True
    without.entry[own[padding.row]] = found.entry


def laid_out(
    chunk: Chunk,
    padding: Padding,
    contents: Contents,
    forms: FormTable,
    acids: AcidTable,
    water: Solvent,
    solved: BoolArray,
) -> tuple[IntArray, Layout | None, tuple[Pair, ...]]:
    """Rows of a chunk that hold every part of some pair, their layout (None for no rows), and the pairs in it."""
    some = tuple(possible(acids.pairs, padding, forms, acids))
    rows = np.zeros(0, np.intp)
    if some:
        entries = contents.amount[padding.entry], contents.form[padding.entry], padding.row
        metals = metal_molalities(some, *entries, forms.brings, len(chunk))
        rows = np.flatnonzero(solved & _complete(chunk, some, metals, acids))
    if not len(rows):
        return rows, None, some
    kelvin = water.temperature_c[rows] + ZERO_CELSIUS
    return rows, layout(chunk.take(rows), {m: v[rows] for m, v in metals.items()}, some, acids, kelvin), some


def _complete(chunk: Chunk, pairs: Sequence[Pair], metals: dict[str, FloatArray], acids: AcidTable) -> BoolArray:
    """Rows that hold every part of some pair (m,)."""
    held: dict[str, BoolArray] = {}
    for acid in {acid for pair in pairs for acid, _ in pair.states}:
        own = np.zeros(len(chunk), bool)
        for slot in chunk.slots:
            own |= (slot.acid == acids.index[acid]) & (slot.total > 0.0)
        held[acid] = own
    out = np.zeros(len(chunk), bool)
    for pair in pairs:
        own = np.ones(len(chunk), bool)
        for acid, _ in pair.states:
            own &= held[acid]
        for metal in pair.metals:
            own &= metals[metal] > 0.0
        out |= own
    return out
