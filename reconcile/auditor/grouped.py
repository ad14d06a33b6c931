"""Covariance of a long record that is left once the effects with columns of their own are set apart.

Readings of one batch share its preparation, readings of one calibration session share its error. The inverse of a
diagonal plus one such grouping is known in closed form; of the two together it is not. So one grouping is kept as it
is and the other's variance goes to the diagonal.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from scipy import sparse

from reconcile.auditor.components import Components, noise_of
from reconcile.auditor.layout import Layout
from reconcile.auditor.sparse_columns import column_sums, squared
from reconcile.records.arrays import BoolArray, FloatArray, IntArray

EXPLICIT = 1500
"""Calibration sessions up to which each has a column of its own: then nothing is put on the diagonal."""
WIDE = 8
"""Readings from which a batch (a known solution, read again and again) has a column of its own beside sessions."""


@dataclass(frozen=True)
class Grouped:
    """W^-1 = diag(d) + loading loading' within each group; W is applied analytically (Sherman and Morrison 1950).

    d, loading : FloatArray (n,) [pH^2], [pH]; group : IntArray (n,), 0 to groups - 1
    """

    d: FloatArray
    loading: FloatArray
    group: IntArray
    groups: int

    @cached_property
    def excess(self) -> FloatArray:
        """1 + the group's sum of loading^2 / d, (groups,)."""
        return np.asarray(1.0 + np.bincount(self.group, self.loading**2 / self.d, minlength=self.groups), float)

    @cached_property
    def scaled(self) -> FloatArray:
        """loading / d over the square root of the group's excess, (n,)."""
        return np.asarray(self.loading / self.d / np.sqrt(self.excess)[self.group], float)

    def log_det(self) -> float:
        """Log determinant of W^-1 (matrix determinant lemma)."""
        return float(np.log(self.d).sum() + np.log(self.excess).sum())

    @cached_property
    def block(self) -> sparse.csc_array:
        """W = 1/d - block block'; (n, groups)."""
        rows = np.arange(len(self.d))
        return sparse.csc_array((self.scaled, (rows, self.group)), shape=(len(self.d), self.groups))

    @cached_property
    def across(self) -> sparse.csr_array:
        """The same by rows: its transpose goes with sparse columns."""
        return sparse.csr_array(self.block)

    def weighed(self, y: FloatArray) -> FloatArray:
        """W y; y (n,) or (n, k)."""
        if y.ndim == 1:
            shared = np.bincount(self.group, self.scaled * y, minlength=self.groups)
            return np.asarray(y / self.d - self.scaled * shared[self.group], float)
        return np.asarray(y / self.d[:, None] - self.block @ (self.block.T @ y), float)

    def unweighed(self, y: FloatArray) -> FloatArray:
        """W^-1 y; y (n,)."""
        shared = np.bincount(self.group, self.loading * y, minlength=self.groups)
        return np.asarray(self.d * y + self.loading * shared[self.group], float)

    def diagonal(self) -> FloatArray:
        """Diagonal of W, (n,)."""
        return np.asarray(1.0 / self.d - self.scaled**2, float)

    def quadratic(self, x: sparse.csc_array) -> FloatArray:
        """x' W x of each sparse column, (k,)."""
        square = np.asarray(squared(x).T @ (1.0 / self.d)).ravel()
        return np.asarray(square - column_sums(squared(sparse.csc_array(self.across.T @ x))), float)


def repeated_sessions(layout: Layout) -> BoolArray:
    """True where a reading shares its calibration session with another, (n,)."""
    named = layout.session >= 0
    counts = np.bincount(layout.session[named], minlength=1)
    return np.asarray(named & (counts[layout.session] > 1), bool)


def by_batches(layout: Layout, components: Components) -> Grouped:
    """Batches kept; the variance of a session goes to the diagonal, as many times as it has readings."""
    d = noise_of(layout, components) + layout.other + _inflation(layout, components)
    return Grouped(d, batch_sd(layout, components), layout.batch, len(layout.batches))


def by_sessions(layout: Layout, components: Components, wide: BoolArray) -> Grouped:
    """Sessions kept; the variance of a batch goes to the diagonal, as many times as it has readings.

    wide : batches that have columns of their own, (batches,)
    """
    tau = np.where(wide[layout.batch], 0.0, batch_sd(layout, components))
    inflation = tau * np.bincount(layout.batch, tau, minlength=len(layout.batches))[layout.batch]
    shares = repeated_sessions(layout)
    group = np.where(shares, layout.session, 0)
    return Grouped(
        noise_of(layout, components) + layout.other + inflation,
        np.where(shares, components.session**0.5, 0.0),
        group.astype(np.intp),
        int(group.max(initial=0)) + 1,
    )


def batch_sd(layout: Layout, components: Components) -> FloatArray:
    """Standard deviation that a reading shares with its batch [pH], (n,)."""
    return np.asarray(np.sqrt(components.preparation * layout.preparation**2 + layout.shared), float)


def _inflation(layout: Layout, components: Components) -> FloatArray:
    shares = repeated_sessions(layout)
    counts = np.bincount(layout.session[shares], minlength=1)
    found = np.zeros(len(layout))
    found[shares] = components.session * counts[layout.session[shares]]
    return found


@dataclass(frozen=True)
class Local:
    """The grouping chosen, and what has columns of its own beside the effects with a prior.

    sessions : True where sessions have columns
    wide : sparse (n, w) columns of unit variance, one for each of `wide_batches`
    """

    grouped: Grouped
    sessions: bool
    wide: sparse.csc_array
    wide_batches: IntArray


def local(layout: Layout, components: Components) -> Local:
    """The grouping that loses least.

    The variance of a group of m readings that is put on the diagonal is multiplied by m: a block of ones is at most m
    times the unit matrix, so that the covariance taken is never smaller than the covariance meant (in the sense of
    quadratic forms). A score then varies no more in a clean record than it is taken to: tests are conservative and lose
    a little power, estimates stay unbiased.
    """
    n, batches = len(layout), len(layout.batches)
    none = sparse.csc_array((n, 0)), np.zeros(0, np.intp)
    sessions = layout.effects["session"]
    whole = by_batches(layout, replace(components, session=0.0))
    if len(sessions.subjects) <= EXPLICIT:
        return Local(whole, True, *none)
    counts = np.bincount(layout.batch, minlength=batches)
    wide = counts > WIDE
    if np.count_nonzero(wide) > EXPLICIT:
        wide[:] = False
    plain = by_batches(layout, components)
    other = by_sessions(layout, components, wide)
    lost_sessions = float(np.log(plain.d / whole.d).sum())
    lost_batches = float(np.log(other.d / whole.d).sum())
    if lost_sessions <= lost_batches:
        return Local(plain, False, *none)
    index = np.flatnonzero(wide).astype(np.intp)
    if not len(index):
        return Local(other, False, *none)
    place = np.full(batches, -1)
    place[index] = np.arange(len(index))
    rows = np.flatnonzero(wide[layout.batch])
    tau = batch_sd(layout, components)[rows]
    columns = sparse.csc_array((tau, (rows, place[layout.batch[rows]])), shape=(n, len(index)))
    return Local(other, False, columns, index)
