"""The covariance of a long record under one set of variance components, factored once and used by many models."""

from __future__ import annotations

from collections.abc import Hashable
from functools import cached_property
from typing import Any

import numpy as np
from scipy import linalg, sparse
from scipy.sparse.linalg import cg

from reconcile.auditor.components import Components
from reconcile.auditor.grouped import Local, local
from reconcile.auditor.layout import Layout
from reconcile.auditor.sparse_columns import column_keys, squared
from reconcile.records.arrays import FloatArray, IntArray

KEPT = 3
"""Factored covariances kept at a time for one record."""
KEPT_COLUMNS = 60
ROUGH = 1e-10
"""Relative error of what is solved without a factor."""
CHUNK = 512


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
        self.grouped, self.wide = found.grouped, found.wide_batches
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
        self.shared = sparse.csr_array(self.grouped.across.T @ self.z)
        inner = sparse.csr_array(self.z.T @ self.weighted) - sparse.csr_array(self.shared.T @ self.shared)
        self.normal = sparse.csr_array(inner + sparse.eye_array(inner.shape[0]))
        inside = np.concatenate([np.isnan(layout.prior)[self.columns], np.ones(found.wide.shape[1], bool)])
        self.inside = sparse.csc_array(self.z[:, np.flatnonzero(inside)])
        self.taken = float((1.0 - 1.0 / self.normal.diagonal()[~inside]).sum())
        self.remembered: dict[Hashable, Any] = {}
        """What was worked out for columns that are asked for again, beside the columns themselves."""
        self._weighed: dict[Hashable, FloatArray] = {}

    @cached_property
    def m(self) -> FloatArray:
        """M written out."""
        return np.asarray(self.normal.toarray().T, float)  # symmetric: the transpose is as good, and in LAPACK's order

    @cached_property
    def factor(self) -> FloatArray:
        """Cholesky factor of M."""
        return np.asarray(linalg.cholesky(self.m, lower=True, check_finite=True) if self.m.size else self.m)

    def weighed_once(self, y: FloatArray) -> FloatArray:
        """K y, y (n,), by conjugate gradients, without a factor."""
        wy = self.grouped.weighed(y)
        if not self.normal.shape[0]:
            return wy
        scale = sparse.diags_array(1.0 / self.normal.diagonal())
        effects, _ = cg(self.normal, self.z.T @ wy, rtol=ROUGH, maxiter=500, M=scale)
        return np.asarray(wy - self.carried(effects))

    def remainder(self, pr: FloatArray) -> FloatArray:
        """What P r leaves of residuals once effects with columns of their own are taken off, (n,) [pH]."""
        shared = self.inside @ (self.inside.T @ pr) if self.inside.shape[1] else 0.0
        return np.asarray(self.grouped.unweighed(pr) + shared, float)

    def kept_share(self, fixed: int) -> float:
        """Share of the readings' degrees of freedom that these effects leave; about, each taken by itself."""
        return float(max(1.0 - (self.taken + fixed) / max(len(self.layout), 1), 0.2))

    def inherit(self, other: BaseModel) -> None:
        """Take over bounds from a layout that differs in few rows: they are as good to begin with, none is exact."""
        for key, (x, found) in [
            (k, v) for k, v in other.remembered.items() if isinstance(k, tuple) and k[0] == "bound"
        ]:
            self.remembered[key] = (x, found.inexact())

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
        return np.asarray(squared(self.layout.z) @ self.g, float)

    @cached_property
    def log_det(self) -> float:
        """Log determinant of V."""
        own = 2.0 * float(np.log(np.diag(self.factor)).sum()) if self.factor.size else 0.0
        return self.grouped.log_det() + own

    def weigh(self, y: FloatArray) -> FloatArray:
        """K y; y (n,) or (n, k)."""
        wy = self.grouped.weighed(y)
        return np.asarray(wy - self.carried(self.solved(self.z.T @ wy))) if self.factor.size else wy

    def weighed_columns(self, x: sparse.csc_array) -> tuple[FloatArray, list[Hashable]]:
        """K x of sparse columns, (n, k), and a key for each by which it is known again."""
        keys = column_keys(x)
        for k, key in enumerate(keys):
            if key not in self._weighed:
                self._weighed[key] = self.weigh(x[:, [k]].toarray().ravel())
        found = np.stack([self._weighed[key] for key in keys], axis=1)
        while len(self._weighed) > KEPT_COLUMNS:
            self._weighed.pop(next(iter(self._weighed)))
        return found, keys

    def solved(self, y: FloatArray) -> FloatArray:
        """M^-1 y; y (q,) or (q, k)."""
        return np.asarray(linalg.cho_solve((self.factor, True), y, check_finite=False))

    def carried(self, effects: FloatArray) -> FloatArray:
        """W Z u; u (q,) or (q, k)."""
        return self.grouped.weighed(np.asarray(self.z @ effects))

    def cross(self, x: sparse.csc_array) -> sparse.csc_array:
        """Z' W x of sparse columns, (q, k)."""
        shared = self.grouped.across.T @ x
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

    def quadratic(self, x: sparse.csc_array) -> FloatArray:
        """x' K x of each sparse column, (k,)."""
        square = self.grouped.quadratic(x)
        if not self.factor.size or not x.shape[1]:
            return square
        c = self.cross(x)
        for first in range(0, x.shape[1], CHUNK):
            part = slice(first, min(first + CHUNK, x.shape[1]))
            half = linalg.solve_triangular(self.factor, c[:, part].toarray(), lower=True, check_finite=False)
            square[part] -= np.einsum("ij,ij->j", half, half)
        return square

    def covariance(self, dense: FloatArray, rows: IntArray) -> FloatArray:
        """X' K X for columns that are zero outside some rows, (k, k); dense (rows, k)."""
        groups, group = np.unique(self.grouped.group[rows], return_inverse=True)
        block = sparse.csr_array((self.grouped.scaled[rows], (group, np.arange(len(rows)))), (len(groups), len(rows)))
        shared = np.asarray(block @ dense)
        found = dense.T @ (dense / self.grouped.d[rows][:, None]) - shared.T @ shared
        if self.factor.size:
            c = self.weighted[rows].T @ dense - self.shared[groups].T @ shared
            half = linalg.solve_triangular(self.factor, c, lower=True, check_finite=False)
            found = found - half.T @ half
        return np.asarray(found, float)


def base_of(layout: Layout, components: Components) -> BaseModel:
    """The factored covariance of a record under given components; the latest few are kept."""
    kept: dict[tuple[Hashable, ...], BaseModel] = layout.kept.setdefault("bases", {})
    spreads = (components.noise, components.session, components.preparation, components.meter_ratio.tobytes())
    key = (*spreads, id(layout))
    if key in kept:
        kept[key] = kept.pop(key)
        return kept[key]
    like = [base for (*known, _), base in kept.items() if tuple(known) == spreads]
    kept[key] = BaseModel(layout, components)
    if like:
        kept[key].inherit(like[-1])
    while len(kept) > KEPT:
        kept.pop(next(iter(kept)))
    return kept[key]
