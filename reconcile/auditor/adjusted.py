"""Solutions that were adjusted to a pH: what the reading that they were adjusted by, and an adjusted stock, leave.

The reading that a solution was adjusted by fits its prediction by construction and says nothing alone. It stays in the
model beside later readings of that solution, with an error of unknown size shared by all of them (the amount of
titrant): what is left is the difference of the readings, so that later ones carry the terms of the meter that the
solution was adjusted on with the opposite sign.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from scipy import sparse

from reconcile.records.arrays import BoolArray, FloatArray, IntArray
from reconcile.records.book import BatchRecords
from reconcile.records.results import Prediction

if TYPE_CHECKING:
    from reconcile.auditor.layout import Layout

UNKNOWN_SD = 1.0
"""Spread of the error that all readings of an adjusted solution share [pH]: far above every other."""


def anchor_of(records: BatchRecords) -> IntArray:
    """Reading that the solution of each reading was adjusted by, (n,); -1 where it was not adjusted."""
    anchor = records.solved.anchor
    return anchor if len(anchor) == len(records.readings) else np.full(len(records.readings), -1, np.intp)


def only_adjusted(records: BatchRecords) -> BoolArray:
    """Readings that only say what was adjusted to, (n,)."""
    adjusted = records.solved.adjusted
    return adjusted if len(adjusted) == len(records.readings) else np.zeros(len(records.readings), bool)


def speaking(records: BatchRecords, usable: BoolArray) -> BoolArray:
    """Usable readings that say something: not of the adjusting itself, nor adjusted by a reading that is not usable."""
    anchor = anchor_of(records)
    return np.asarray(usable & ~only_adjusted(records) & ((anchor < 0) | usable[anchor]), bool)


def with_anchors(records: BatchRecords, speaks: BoolArray) -> BoolArray:
    """The same readings, and those that their solutions were adjusted by."""
    anchor = anchor_of(records)[speaks]
    whole = speaks.copy()
    whole[anchor[anchor >= 0]] = True
    return whole


def felt_shift(layout: Layout, x: sparse.csc_array, amplitude: float) -> tuple[IntArray, FloatArray]:
    """Evidence rows (k,) that an effect moves, and how far [pH] (k,), each against its own prediction.

    x : (n, 1), effect at amplitude 1. A solution that was adjusted on one meter has a prediction that follows the
    reading it was adjusted by: that reading moves nowhere, later ones by what the effect does to them less what it
    did to it.
    """
    whole = np.asarray(x.toarray(), float).ravel() * amplitude
    adjusted = np.flatnonzero(layout.anchor >= 0)
    if len(adjusted):
        whole[adjusted] = whole[adjusted] - whole[layout.anchor[adjusted]]
    rows = np.flatnonzero(whole != 0.0).astype(np.intp)
    return rows, whole[rows]


def contrast_variance(layout: Layout, variance: FloatArray, own: FloatArray, g: FloatArray) -> FloatArray:
    """Variance of every residual (n,) [pH^2], that of adjusted solutions against the reading they were adjusted by.

    variance : as the model has it; own : what a reading shares with no other; g : prior variances of the columns of z
    """
    rows = np.flatnonzero(layout.anchor >= 0)
    if not len(rows):
        return variance
    at = layout.anchor[rows]
    z = sparse.csr_array(layout.z)
    away = z[rows] - z[at]
    found = variance.copy()
    found[rows] = away.multiply(away) @ g + own[rows] + own[at]
    itself = rows[at == rows]
    found[itself] = own[itself] + z[itself].multiply(z[itself]) @ g
    return found


def stock_columns(records: BatchRecords, prediction: Prediction) -> tuple[list[str], sparse.csc_array, FloatArray]:
    """Adjusted stocks, dpH over the pH that each was adjusted to (readings, stocks), and the variance of that pH.

    A batch follows its own adjusting reading otherwise (see above); here stand the stocks that it was made from.
    """
    opens, solved, solutions = records.open_amounts, records.solved, records.solutions
    n, k = len(records.readings), len(solved)
    if not k:
        return [], sparse.csc_array((n, 0)), np.zeros(0)
    owner = np.full(len(solutions.solution), -1, np.intp)
    owner[opens.contribution] = opens.owner
    same = opens.batch[owner] == solutions.batch[solutions.solution]
    owner[same & (opens.batch[owner] != "")] = -1
    t = prediction.contributions
    hit = np.flatnonzero(owner[t.column] >= 0)
    j = owner[t.column[hit]]
    finite = np.isfinite(solved.weight[j])
    hit, j = hit[finite], j[finite]
    used = np.unique(j)
    place = np.zeros(k, np.intp)
    place[used] = np.arange(len(used))
    block = sparse.csc_array((t.value[hit] * solved.weight[j], (t.row[hit], place[j])), shape=(n, len(used)))
    names = [str(opens.stock[i] or opens.batch[i]) for i in used]
    return names, block, np.asarray(solved.u_ph[used] ** 2, float)
