"""The covariance of a long record under one set of variance components, factored once and used by many models."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from scipy import linalg, sparse

from reconcile.auditor.components import Components
from reconcile.auditor.grouped import Local, local
from reconcile.auditor.layout import Layout
from reconcile.records.arrays import BoolArray, FloatArray, IntArray

KEPT = 3
"""Factored covariances kept at a time for one record."""
FEW_ROWS = 12
"""Rows up to which a column is short: what meters and lots take up of it is a few per cent at most."""
CHUNK = 512


@dataclass
class Bound:
    """x' K x of columns: never less than the truth; equal to it where `exact`. (k,) each."""

    value: FloatArray
    exact: BoolArray


class BaseModel:
    """V = W^-1 + Z Z', with Z scaled by the prior standard deviations; K = V^-1 = W - W Z M^-1 Z' W.

    M = I + Z' W Z, of as many rows as there are effects with columns of their own (Henderson's equations, scaled).
    columns : IntArray, columns of layout.z that Z holds; place : IntArray, where each column of layout.z stands in Z,
    or -1; inside : sparse (n, s), columns of Z for sessions and batches; taken : degrees of freedom of the others
    """

    def __init__(self, layout: Layout, components: Components) -> None:
        self.layout, self.components = layout, components
        self.g = np.where(np.isnan(layout.prior), components.session, layout.prior)
        found: Local = local(layout, components)
        self.grouped = found.grouped
        kept = self.g > 0
        if not found.sessions:
            sessions = layout.effects["session"]
            kept[sessions.first : sessions.last] = False
        self.columns: IntArray = np.flatnonzero(kept)
        self.place: IntArray = np.full(len(kept), -1, np.intp)
        self.place[self.columns] = np.arange(len(self.columns))
        own = layout.z.tocsc()[:, self.columns] * np.sqrt(self.g[self.columns])
        self.z = sparse.csr_array(sparse.hstack([own, found.wide]))
        self.weighted = sparse.csr_array(sparse.diags_array(1.0 / self.grouped.d) @ self.z)
        self.shared = sparse.csr_array(self.grouped.block.T @ self.z)
        inner = sparse.csr_array(self.z.T @ self.weighted) - sparse.csr_array(self.shared.T @ self.shared)
        self.m = np.asarray(inner.toarray().T, float)  # symmetric: the transpose is as good, and in LAPACK's order
        self.m[np.diag_indices(len(self.m))] += 1.0
        self.factor = linalg.cholesky(self.m, lower=True, check_finite=True) if self.m.size else self.m
        inside = np.concatenate([np.isnan(layout.prior)[self.columns], np.ones(found.wide.shape[1], bool)])
        self.inside = sparse.csc_array(self.z[:, np.flatnonzero(inside)])
        self.taken = float((1.0 - 1.0 / np.diag(self.m)[~inside]).sum())
        self._bounds: dict[int, tuple[sparse.csc_array, Bound]] = {}

    @cached_property
    def inverse(self) -> FloatArray:
        """M^-1: the covariance of the scaled effects given the readings."""
        if not self.m.size:
            return np.asarray(self.m)
        half, _ = linalg.lapack.dpotri(self.factor, lower=1)
        for first in range(0, len(half), CHUNK):  # mirrored a strip at a time
            last = first + CHUNK
            corner = half[first:last, first:last]
            corner[:] = np.tril(corner) + np.tril(corner, -1).T
            half[first:last, last:] = half[last:, first:last].T
        return np.asarray(half, float)

    @cached_property
    def variance(self) -> FloatArray:
        """Diagonal of what the effects with a prior add to the spread of each residual, (n,) [pH^2]."""
        layout = self.layout
        return np.asarray(layout.z.multiply(layout.z) @ self.g, float)

    def weigh(self, y: FloatArray) -> FloatArray:
        """K y; y (n,) or (n, k)."""
        wy = self.grouped.weighed(y)
        if not self.factor.size:
            return wy
        return np.asarray(wy - self.carried(self.solved(self.z.T @ wy)))

    def solved(self, y: FloatArray) -> FloatArray:
        """M^-1 y; y (q,) or (q, k)."""
        return np.asarray(linalg.cho_solve((self.factor, True), y, check_finite=False))

    def carried(self, effects: FloatArray) -> FloatArray:
        """W Z u; u (q,) or (q, k)."""
        return self.grouped.weighed(np.asarray(self.z @ effects))

    def cross(self, x: sparse.csc_array) -> sparse.csc_array:
        """Z' W x of sparse columns, (q, k)."""
        shared = sparse.csc_array(self.grouped.block.T @ x)
        return sparse.csc_array(self.weighted.T @ x - self.shared.T @ shared)

    def taken_up(self, x: sparse.csc_array, own: IntArray | None) -> FloatArray:
        """Z' K x = M^-1 Z' W x, (q, k); for columns of the design itself it is read off the inverse."""
        at = np.full(x.shape[1], -1) if own is None else np.where(own >= 0, self.place[own], -1)
        found = np.empty((len(self.m), x.shape[1]))
        mine, others = np.flatnonzero(at >= 0), np.flatnonzero(at < 0)
        if len(mine):
            effects = -self.inverse[:, at[mine]]
            effects[at[mine], np.arange(len(mine))] += 1.0
            found[:, mine] = effects / np.sqrt(self.g[own[mine]] if own is not None else 1.0)
        if len(others):
            found[:, others] = self.solved(self.cross(sparse.csc_array(x[:, others])).toarray())
        return found

    def quadratic(self, x: sparse.csc_array, cross: sparse.csc_array | None = None) -> FloatArray:
        """x' K x of each sparse column, (k,)."""
        square = self.grouped.quadratic(x)
        if not self.factor.size or not x.shape[1]:
            return square
        c = self.cross(x) if cross is None else cross
        for first in range(0, x.shape[1], CHUNK):
            part = slice(first, min(first + CHUNK, x.shape[1]))
            half = linalg.solve_triangular(self.factor, c[:, part].toarray(), lower=True, check_finite=False)
            square[part] -= np.einsum("ij,ij->j", half, half)
        return square

    def bound(self, x: sparse.csc_array, own: IntArray | None, steady: bool) -> Bound:
        """x' K x at little cost: never less than the truth. A steady x is remembered, with what became exact."""
        if steady and id(x) in self._bounds:
            return self._bounds[id(x)][1]
        found = self._bound(x, own)
        if steady:
            self._bounds[id(x)] = (x, found)
        return found

    def _bound(self, x: sparse.csc_array, own: IntArray | None) -> Bound:
        """Leaving effects out of V can only make x' V^-1 x larger, so any few of them give a bound.

        A column of the design itself is read off the inverse: z' K z = 1 - (M^-1)_jj. For readings of one meter that
        meter's own offset and span are kept, for any other column the single effect that takes up most of it.
        """
        value = self.grouped.quadratic(x)
        exact = np.zeros(len(value), bool)
        rows = np.diff(x.indptr)
        rest = rows > FEW_ROWS
        if own is not None:
            at = np.where(own >= 0, self.place[own], -1)
            mine = np.flatnonzero(at >= 0)
            j = at[mine]
            with np.errstate(divide="ignore"):
                same = np.abs(value[mine] * self.g[self.columns[j]] - (self.m[j, j] - 1.0)) <= 1e-9 * self.m[j, j]
            mine, j = mine[same], j[same]
            value[mine] = (1.0 - self.inverse[j, j]) / self.g[self.columns[j]]
            exact[mine], rest[mine] = True, False
        single = np.flatnonzero(rest & self._one_meter(x))
        if len(single):
            value[single] -= self._of_meter(x if len(single) == x.shape[1] else sparse.csc_array(x[:, single]))
            rest[single] = False
        others = np.flatnonzero(rest)
        if len(others) and self.factor.size:
            c = self.cross(sparse.csc_array(x[:, others]))
            taken = c.multiply(c).T @ sparse.diags_array(1.0 / np.diag(self.m))
            value[others] -= np.asarray(taken.max(axis=1).todense()).ravel()
        return Bound(np.maximum(value, 0.0), exact)

    def _one_meter(self, x: sparse.csc_array) -> BoolArray:
        """Columns whose readings are all of one meter, (k,)."""
        found = np.zeros(x.shape[1], bool)
        filled = np.flatnonzero(np.diff(x.indptr) > 0)
        if len(filled):
            meter = self.layout.meter[x.indices]
            low, high = (f.reduceat(meter, x.indptr[filled]) for f in (np.minimum, np.maximum))
            found[filled] = (low == high) & (low >= 0)
        return found

    def _of_meter(self, x: sparse.csc_array) -> FloatArray:
        """What the own offset and span of the meter of each column take up of it, (k,)."""
        meter = self.layout.meter[x.indices[x.indptr[:-1]]]
        pair = [self.place[self.layout.effects[sort].first + meter] for sort in ("meter", "span")]
        weights = self._meter_weights
        a, b = (np.asarray(x.T @ w).ravel() for w in weights)
        p, q = pair
        m = self.m
        there = (p >= 0) & (q >= 0)
        p, q = np.where(there, p, 0), np.where(there, q, 0)
        determinant = m[p, p] * m[q, q] - m[p, q] ** 2
        taken = (a * a * m[q, q] - 2.0 * a * b * m[p, q] + b * b * m[p, p]) / determinant
        return np.where(there, taken, 0.0)

    @cached_property
    def _meter_weights(self) -> tuple[FloatArray, FloatArray]:
        """(W z)_i for the offset and the span column of the meter that reading i was taken on, (n,) each."""
        layout, found = self.layout, []
        known = np.flatnonzero(layout.meter >= 0)
        for sort in ("meter", "span"):
            at = self.place[layout.effects[sort].first + np.arange(len(layout.meters))]
            one = np.zeros(len(layout))
            if (at >= 0).all() and len(at):
                z = sparse.csc_array(self.z[:, at])
                w = sparse.csr_array(z / self.grouped.d[:, None] - self.grouped.block @ (self.grouped.block.T @ z))
                one[known] = np.asarray(w[known, layout.meter[known]]).ravel()
            found.append(one)
        return found[0], found[1]


def base_of(layout: Layout, components: Components) -> BaseModel:
    """The factored covariance of a record under given components; the latest few are kept."""
    kept: dict[object, BaseModel] = layout.kept.setdefault("bases", {})
    key = (components.noise, components.session, components.preparation, components.meter_ratio.tobytes())
    if key in kept:
        kept[key] = kept.pop(key)
        return kept[key]
    kept[key] = BaseModel(layout, components)
    while len(kept) > KEPT:
        kept.pop(next(iter(kept)))
    return kept[key]
