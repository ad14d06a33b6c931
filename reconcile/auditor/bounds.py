"""Informations of very many columns at little cost: never less than the truth, and exact where it matters.

Leaving effects out of a covariance can only make x' V^-1 x larger, so any few of them give a bound; a score with a
bounded information is smaller than the true one, and only those that come near significance are worked out.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import sparse

from reconcile.auditor.base_model import BaseModel
from reconcile.auditor.sparse_columns import column_maxima, same_group, squared
from reconcile.records.arrays import BoolArray, FloatArray, IntArray

FEW_ROWS = 12
"""Rows up to which a column is short: what meters and lots take up of it is a few per cent at most."""


@dataclass
class Bound:
    """x' K x of k columns: never less than the truth; equal to it where `exact`."""

    value: FloatArray
    exact: BoolArray

    def inexact(self) -> Bound:
        return Bound(self.value.copy(), np.zeros(len(self.value), bool))


def bound(base: BaseModel, x: sparse.csc_array, own: IntArray | None, steady: bool) -> Bound:
    """x' K x as bounded. A steady x is remembered, with what became exact of it."""
    key = ("bound", id(x))
    if steady and key in base.remembered:
        known: Bound = base.remembered[key][1]
        return known
    found = _bound(base, x, own)
    if steady:
        base.remembered[key] = (x, found)
    return found


def _bound(base: BaseModel, x: sparse.csc_array, own: IntArray | None) -> Bound:
    """A column of the design itself is read off the inverse, z' K z = 1 - (M^-1)_jj, or bounded by its own prior.

    For readings of one meter that meter's own offset and span are kept, for any other column the single effect that
    takes up most of it.
    """
    value = base.grouped.quadratic(x)
    exact = np.zeros(len(value), bool)
    rest = np.diff(x.indptr) > FEW_ROWS
    if own is not None:
        at = np.where(own >= 0, base.place[own], -1)
        mine = np.flatnonzero(at >= 0)
        j = at[mine]
        same = np.abs(value[mine] * base.g[own[mine]] - (base.m[j, j] - 1.0)) <= 1e-9 * base.m[j, j]
        mine, j = mine[same], j[same]
        rest[mine] = False
        if "inverse" in base.__dict__:
            value[mine] = (1.0 - base.inverse[j, j]) / base.g[own[mine]]
            exact[mine] = True
        else:
            value[mine] /= base.m[j, j]
    meter = np.where(rest, same_group(x, base.layout.meter), -1)
    single = np.flatnonzero(meter >= 0)
    if len(single):
        value[single] -= _of_meters(base, _some(x, single), meter[single])
        rest[single] = False
    others = np.flatnonzero(rest)
    if len(others) and base.factor.size:
        c = squared(base.cross(_some(x, others)))
        c.data /= np.diag(base.m)[c.indices]
        value[others] -= column_maxima(c)
    return Bound(np.maximum(value, 0.0), exact)


def _some(x: sparse.csc_array, which: IntArray) -> sparse.csc_array:
    return x if len(which) == x.shape[1] else sparse.csc_array(x[:, which])


def _of_meters(base: BaseModel, x: sparse.csc_array, meter: IntArray) -> FloatArray:
    """What the own offset and span of the meter of each column take up of it, (k,)."""
    p, q = (base.place[base.layout.effects[sort].first + meter] for sort in ("meter", "span"))
    there = (p >= 0) & (q >= 0)
    p, q = np.where(there, p, 0), np.where(there, q, 0)
    a, b = (np.asarray(x.T @ w).ravel() for w in _meter_weights(base))
    m = base.m
    determinant = m[p, p] * m[q, q] - m[p, q] ** 2
    taken = (a * a * m[q, q] - 2.0 * a * b * m[p, q] + b * b * m[p, p]) / determinant
    return np.where(there, taken, 0.0)


def _meter_weights(base: BaseModel) -> tuple[FloatArray, FloatArray]:
    """(W z)_i for the offset and the span column of the meter that reading i was taken on, (n,) each."""
    if "meter weights" not in base.remembered:
        layout, found = base.layout, []
        known = np.flatnonzero(layout.meter >= 0)
        block, across = base.grouped.block, base.grouped.across
        for sort in ("meter", "span"):
            at = base.place[layout.effects[sort].first + np.arange(len(layout.meters))]
            one = np.zeros(len(layout))
            if (at >= 0).all() and len(at):
                z = sparse.csc_array(base.z[:, at])
                w = sparse.csr_array(sparse.diags_array(1.0 / base.grouped.d) @ z - block @ (across.T @ z))
                one[known] = np.asarray(w[known, layout.meter[known]]).ravel()
            found.append(one)
        base.remembered["meter weights"] = (found[0], found[1])
    weights: tuple[FloatArray, FloatArray] = base.remembered["meter weights"]
    return weights
