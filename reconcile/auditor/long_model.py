"""The model of a long record: sparse throughout, with fixed effects and dropped priors as changes of low rank."""

from __future__ import annotations

import numpy as np
from scipy import sparse

from reconcile.auditor.base_model import CHUNK, BaseModel, base_of
from reconcile.auditor.components import Components, Model, Shares
from reconcile.auditor.layout import Layout
from reconcile.records.arrays import FloatArray, IntArray

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
        n = len(layout)
        parts: list[FloatArray] = []
        cores: list[FloatArray] = []
        at = self.base.place[list(own_dropped)] if own_dropped else np.zeros(0, np.intp)
        at = at[at >= 0]
        if len(at):
            # V - zz' has the inverse K + K z (1 - z'Kz)^-1 z'K, with K Z = W Z M^-1 and 1 - Z'KZ = M^-1
            parts.append(self.base.carried(self.base.inverse[:, at]))
            cores.append(np.asarray(np.linalg.inv(self.base.inverse[np.ix_(at, at)]), float))
        if fixed is not None and fixed.shape[1]:
            column = fixed.toarray()
            vf = self.base.weigh(column)
            if parts:
                vf = vf + parts[0] @ (cores[0] @ (parts[0].T @ column))
            parts.append(vf)
            cores.append(-np.linalg.pinv(np.asarray(fixed.T @ vf), rcond=1e-10, hermitian=True))
        self.u = np.hstack(parts) if parts else np.zeros((n, 0))
        self.core = np.zeros((self.u.shape[1],) * 2)
        begin = 0
        for core in cores:
            end = begin + len(core)
            self.core[begin:end, begin:end] = core
            begin = end
        self.pr = self.project(self.r)

    def project(self, y: FloatArray) -> FloatArray:
        found = self.base.weigh(y)
        return np.asarray(found + self.u @ (self.core @ (self.u.T @ y)), float) if self.core.size else found

    def quadratic(self, x: sparse.csc_array) -> FloatArray:
        return self.base.quadratic(x) + self._low_rank(x)

    def _low_rank(self, x: sparse.csc_array) -> FloatArray:
        if not self.core.size:
            return np.zeros(x.shape[1])
        half = np.asarray(x.T @ self.u)
        return np.asarray(np.einsum("ij,jk,ik->i", half, self.core, half), float)

    def information(
        self, x: sparse.csc_array, slope: FloatArray, own: IntArray | None = None, steady: bool = False
    ) -> FloatArray:
        """x' P x, worked out exactly for every column that comes near significance, never less than it for the others.

        A score of which the information is only bounded is smaller than the true one.
        """
        bound = self.base.bound(x, own, steady)
        low = self._low_rank(x)
        near = np.flatnonzero(~bound.exact & (slope**2 > NEAR**2 * np.maximum(bound.value + low, 1e-12)))
        if len(near):
            bound.value[near] = self.base.quadratic(sparse.csc_array(x[:, near]))
            bound.exact[near] = True
        return np.asarray(bound.value + low, float)

    def diagonal(self) -> FloatArray:
        """Diagonal of P as bounded from batches or sessions alone; meters and lots take up a few per cent of it."""
        low = np.einsum("ij,jk,ik->i", self.u, self.core, self.u) if self.core.size else 0.0
        return np.asarray(np.maximum(self.base.grouped.diagonal() + low, 1e-12), float)

    def covariance(self, x: sparse.csc_array) -> FloatArray:
        rows = np.unique(x.indices)
        grouped = self.base.grouped
        dense = x.tocsr()[rows].toarray()
        shared = np.asarray(sparse.csr_array(grouped.block.tocsr()[rows]).T @ dense)
        found = dense.T @ (dense / grouped.d[rows][:, None]) - shared.T @ shared
        if self.base.factor.size:
            c = self.base.weighted[rows].T @ dense - self.base.shared.T @ shared
            found = found - c.T @ self.base.solved(c)
        half = self.u[rows].T @ dense
        return np.asarray(found + half.T @ self.core @ half, float)

    def shares(self, x: sparse.csc_array, own: IntArray | None = None) -> Shares:
        """As for a short model; of what is left beside meters, lots and constants, noise has its local share."""
        grouped, k = self.base.grouped, x.shape[1]
        px = sparse.csc_array(sparse.diags_array(1.0 / grouped.d) @ x - grouped.block @ (grouped.block.T @ x))
        square = sparse.csc_array(px.multiply(px))
        of_noise = sparse.csc_array(sparse.diags_array(self.noise) @ square)
        total = np.asarray(of_noise.sum(axis=0)).ravel()
        fourth = np.asarray(of_noise.multiply(of_noise).sum(axis=0)).ravel()
        local = np.maximum(grouped.quadratic(x), 1e-12)
        size = np.maximum(self.information(x, np.full(k, np.inf), own), 1e-12)
        known = np.zeros((len(self.columns), k))
        carried = np.asarray(self.base.z.T @ self.u)
        for first in range(0, k if self.base.factor.size else 0, CHUNK):
            part = slice(first, min(first + CHUNK, k))
            effects = self.base.taken_up(sparse.csc_array(x[:, part]), None if own is None else own[part])
            if self.core.size:
                effects += carried @ (self.core @ np.asarray(self.u.T @ x[:, part]))
            known[:, part] = effects[: len(self.columns)] ** 2 / size[part]
        rest = np.clip(1.0 - known.sum(axis=0), 0.0, 1.0)
        return Shares(rest * np.minimum(total / local, 1.0), fourth / np.maximum(total, 1e-12) ** 2, known)

    def remainder(self) -> FloatArray:
        """Residuals less the estimated effects of meters, lots, constants and fixed columns, (n,) [pH]."""
        inside = self.base.inside
        shared = inside @ (inside.T @ self.pr) if inside.shape[1] else 0.0
        return np.asarray(self.base.grouped.unweighed(self.pr) + shared, float)

    def kept_share(self) -> float:
        """Share of the readings' degrees of freedom that these effects leave; about, each taken by itself."""
        taken = self.base.taken + self.core.shape[0] - len(self.dropped)
        return float(max(1.0 - taken / max(len(self.layout), 1), 0.2))

    def variance(self) -> FloatArray:
        if self.dropped:
            return super().variance()
        return np.asarray(self.d + self.batch_sd() ** 2 + self.base.variance, float)
