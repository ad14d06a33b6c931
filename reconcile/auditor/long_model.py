"""The model of a long record: sparse throughout, with fixed effects and dropped priors as changes of low rank."""

from __future__ import annotations

from collections.abc import Hashable

import numpy as np
from scipy import sparse

from reconcile.auditor.adjusted import contrast_variance
from reconcile.auditor.base_model import CHUNK, BaseModel, base_of
from reconcile.auditor.bounds import Bound, bound
from reconcile.auditor.components import Components, Model, Shares
from reconcile.auditor.layout import Layout
from reconcile.auditor.sparse_columns import column_sums, squared
from reconcile.records.arrays import FloatArray, IntArray

ANY_SIZE = 30.0
"""Standard deviation of an unknown amplitude where a prior is needed."""
NEAR = 2.5
"""Score from which an information that was only bounded is worked out exactly."""


class LongModel(Model):
    """P = K + U C U', with K = V^-1 factored once for the components (base_model.BaseModel).

    fixed : sparse (n, f) columns of unknown size; own_dropped : columns of Z whose prior is left out
    r : residuals, where they differ from the layout's (a supposed truth was taken off them)

    Between sessions or within batches, whichever matters less, V is taken a little too large (see grouped.local): tests
    are then conservative. Where neither is the case, all results are those of the short model.
    Raises numpy.linalg.LinAlgError only if the layout holds non-finite numbers.
    """

    long = True

    def __init__(
        self,
        layout: Layout,
        components: Components,
        fixed: sparse.csc_array | None = None,
        own_dropped: tuple[int, ...] = (),
        r: FloatArray | None = None,
    ) -> None:
        super().__init__(layout, components, own_dropped, r)
        self.base: BaseModel = base_of(layout, components)
        self.columns, self.dropped = self.base.columns, own_dropped
        self.log_det = self.base.log_det
        self.u, self.core = np.zeros((len(layout), 0)), np.zeros((0, 0))
        self.keys: list[Hashable] = []
        """What each column of U is known by in the base; None for one that is of this model alone."""
        at = self.base.place[list(own_dropped)] if own_dropped else np.zeros(0, np.intp)
        at = at[at >= 0]
        if len(at):
            # V - zz' has the inverse K + K z (1 - z'Kz)^-1 z'K, with K Z = W Z M^-1 and 1 - Z'KZ = M^-1
            left = self.base.inverse[np.ix_(at, at)]
            self.log_det += float(np.linalg.slogdet(left)[1])
            core = np.asarray(np.linalg.inv(left), float)
            self._join(self.base.carried(self.base.inverse[:, at]), core)
        self.fixed = sparse.csc_array((len(layout), 0)) if fixed is None else fixed
        if fixed is not None and fixed.shape[1]:
            column, keys = self._projected(fixed)
            inner = np.asarray(fixed.T @ column)
            self.log_det += float(np.linalg.slogdet(inner)[1])
            self._join(column, -np.linalg.pinv(inner, rcond=1e-10, hermitian=True), keys)
        self.pr = self.project(self.r)

    def _projected(self, x: sparse.csc_array) -> tuple[FloatArray, list[Hashable]]:
        """P x as far as P has come, and the keys of the columns where they are K x."""
        column, keys = self.base.weighed_columns(x)
        if not self.core.size:
            return column, keys
        return column + self.u @ (self.core @ np.asarray(self.u.T @ x)), [None] * len(keys)

    def _join(self, u: FloatArray, core: FloatArray, keys: list[Hashable] | None = None) -> None:
        size, width = len(self.core), u.shape[1]
        self.u = np.hstack([self.u, u]) if size else u
        whole = np.zeros((size + width, size + width))
        whole[:size, :size], whole[size:, size:] = self.core, core
        self.core = whole
        self.keys = [*self.keys, *(keys or [None] * width)]

    def project(self, y: FloatArray) -> FloatArray:
        found = self.base.weigh(y)
        return np.asarray(found + self.u @ (self.core @ (self.u.T @ y)), float) if self.core.size else found

    def quadratic(self, x: sparse.csc_array) -> FloatArray:
        return self.base.quadratic(x) + self._low_rank(x)

    def _low_rank(self, x: sparse.csc_array, steady: bool = False) -> FloatArray:
        if not self.core.size:
            return np.zeros(x.shape[1])
        if steady:
            half = np.stack([self._product(x, i) for i in range(len(self.core))], axis=1)
        else:
            half = np.asarray(x.T @ self.u)
        return np.asarray(((half @ self.core) * half).sum(axis=1), float)

    def _product(self, x: sparse.csc_array, i: int) -> FloatArray:
        """x' u of the i-th column of U for a steady x; remembered where u is the same another time."""
        if self.keys[i] is None:
            return np.asarray(x.T @ self.u[:, i]).ravel()
        key = ("product", id(x), self.keys[i])
        if key not in self.base.remembered:
            self.base.remembered[key] = (x, np.asarray(x.T @ self.u[:, i]).ravel())
        known: FloatArray = self.base.remembered[key][1]
        return known

    def bound(self, x: sparse.csc_array, own: IntArray | None = None, steady: bool = False) -> Bound:
        """x' K x as bounded by the base alone."""
        return bound(self.base, x, own, steady)

    def informed(
        self, x: sparse.csc_array, slope: FloatArray, known: Bound, least: float, most: float, steady: bool
    ) -> FloatArray:
        """x' P x, worked out exactly for columns whose score lies between `least` and `most`, else as bounded."""
        low = self._low_rank(x, steady)
        z2 = slope**2 / np.maximum(known.value + low, 1e-12)
        near = np.flatnonzero(~known.exact & (z2 > least**2) & (z2 <= most**2))
        if len(near):
            known.value[near] = self.base.quadratic(sparse.csc_array(x[:, near]))
            known.exact[near] = True
        return np.asarray(known.value + low, float)

    def information(
        self, x: sparse.csc_array, slope: FloatArray, own: IntArray | None = None, steady: bool = False
    ) -> FloatArray:
        return self.informed(x, slope, self.bound(x, own, steady), NEAR, np.inf, steady)

    def diagonal(self) -> FloatArray:
        """Diagonal of P as bounded from batches or sessions alone; meters and lots take up a few per cent of it."""
        low = ((self.u @ self.core) * self.u).sum(axis=1) if self.core.size else 0.0
        return np.asarray(np.maximum(self.base.grouped.diagonal() + low, 1e-12), float)

    def covariance(self, x: sparse.csc_array) -> FloatArray:
        rows = np.unique(x.indices).astype(np.intp)
        dense = x.tocsr()[rows].toarray()
        half = self.u[rows].T @ dense
        return np.asarray(self.base.covariance(dense, rows) + half.T @ self.core @ half, float)

    def shares(self, x: sparse.csc_array, own: IntArray | None = None) -> Shares:
        """As for a short model; of what is left beside meters, lots and constants, noise has its local share."""
        grouped, k = self.base.grouped, x.shape[1]
        local_px = sparse.diags_array(1.0 / grouped.d) @ x - grouped.block @ (grouped.across.T @ x)
        of_noise = squared(sparse.csc_array(local_px))
        of_noise.data *= self.noise[of_noise.indices]
        total, fourth = column_sums(of_noise), column_sums(squared(of_noise))
        known = np.zeros((len(self.columns), k))
        low = self._low_rank(x)
        size = np.zeros(k)
        carried = np.asarray(self.base.z.T @ self.u)
        for first in range(0, k, CHUNK):
            part = slice(first, min(first + CHUNK, k))
            some = x if k <= CHUNK else sparse.csc_array(x[:, part])
            effects = self.base.taken_up(some, None if own is None else own[part])
            size[part] = self._size(some, effects)
            if self.core.size:
                effects = effects + carried @ (self.core @ np.asarray(self.u.T @ some))
            known[:, part] = effects[: len(self.columns)] ** 2
        known /= np.maximum(size + low, 1e-12)
        known[self.base.place[list(self.dropped)]] = 0.0
        rest = np.clip(1.0 - known.sum(axis=0), 0.0, 1.0)
        share = rest * np.minimum(total / np.maximum(grouped.quadratic(x), 1e-12), 1.0)
        return Shares(share, fourth / np.maximum(total, 1e-12) ** 2, known)

    def _size(self, x: sparse.csc_array, effects: FloatArray) -> FloatArray:
        """x' K x = x' W x - c' M^-1 c, from c = Z' W x and M^-1 c."""
        c = self.base.cross(x)
        column = np.repeat(np.arange(x.shape[1]), np.diff(c.indptr))
        taken = np.bincount(column, c.data * effects[c.indices, column], minlength=x.shape[1])
        return np.asarray(self.base.grouped.quadratic(x) - taken, float)

    def marginal(self, rows: IntArray) -> FloatArray:
        """V of a few readings alone, with fixed columns of any size, (m, m) [pH^2]."""
        layout, tau = self.layout, self.batch_sd()[rows]
        z = layout.z[rows].toarray() * np.sqrt(self.g)
        f = self.fixed.tocsr()[rows].toarray() * ANY_SIZE
        same = layout.batch[rows][:, None] == layout.batch[rows]
        return np.asarray(np.diag(self.d[rows]) + same * np.outer(tau, tau) + z @ z.T + f @ f.T, float)

    def remainder(self) -> FloatArray:
        """Residuals less the estimated effects of meters, lots, constants and fixed columns, (n,) [pH]."""
        return self.base.remainder(self.pr)

    def kept_share(self) -> float:
        """Share of the readings' degrees of freedom that these effects leave."""
        return self.base.kept_share(self.fixed.shape[1])

    def variance(self) -> FloatArray:
        if self.dropped:
            return super().variance()
        whole = np.asarray(self.d + self.batch_sd() ** 2 + self.base.variance, float)
        return contrast_variance(self.layout, whole, self.d, self.g)
