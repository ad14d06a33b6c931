"""The model of a long record: batch effects eliminated analytically, the others by the Woodbury identity.

V = diag(d) + batch terms + Z G Z', all sparse. Fixed effects enter as random effects of a variance so large that it no
longer matters.
"""

from __future__ import annotations

import numpy as np
from scipy import linalg, sparse

from reconcile.auditor.components import Components, Model
from reconcile.auditor.layout import Layout
from reconcile.records.arrays import FloatArray

FLAT_SD = 100.0
"""Standard deviation standing for "unknown" [in units of a fixed effect]: pH errors are at most a few units."""
DENSE_WORK = 4e9


class LongModel(Model):
    """One fitted covariance: V = diag(d) + batch terms + Z G Z', with fixed effects projected out.

    fixed : sparse (n, f) columns of unknown size; own_dropped : columns of Z whose prior is left out
    r : residuals, where they differ from the layout's (a supposed truth was taken off them)
    Raises numpy.linalg.LinAlgError only if the layout holds non-finite numbers.
    """

    def __init__(
        self,
        layout: Layout,
        components: Components,
        fixed: sparse.csc_array | None = None,
        own_dropped: tuple[int, ...] = (),
        r: FloatArray | None = None,
    ) -> None:
        super().__init__(layout, components, own_dropped, r)
        n = len(layout)
        tau = self.batch_sd()
        self.t = tau / self.d
        self.s = 1.0 + (np.add.reduceat(tau * self.t, layout.first_of_batch) if n else np.zeros(0))
        # rows of one batch share an effect: T = batch indicator times tau/d, over the square root of s
        self.batch_block = sparse.csc_array(
            (self.t / np.sqrt(self.s)[layout.batch], (np.arange(n), layout.batch)), shape=(n, len(self.s))
        )
        live = np.flatnonzero(self.g > 0)
        parts = [sparse.csc_array(layout.z.tocsc()[:, live] * np.sqrt(self.g[live]))]
        if fixed is not None and fixed.shape[1]:
            parts.append(sparse.csc_array(fixed * FLAT_SD))
        self.design = sparse.csc_array(sparse.hstack(parts)) if len(parts) > 1 else sparse.csc_array(parts[0])
        self.weighted = self.whiten(self.design)
        inner = np.asarray((self.design.T @ self.weighted).todense()) + np.eye(self.design.shape[1])
        self.factor = linalg.cholesky(inner, lower=True, check_finite=True) if inner.size else inner
        self._inverse: FloatArray | None = None
        self.pr = self.project(self.r)

    def whiten(self, x: sparse.csc_array) -> sparse.csc_array:
        """Inverse of the batch-diagonal part of V, applied to sparse columns."""
        scaled = sparse.csc_array(sparse.diags_array(1.0 / self.d) @ x)
        return sparse.csc_array(scaled - self.batch_block @ (self.batch_block.T @ x))

    def project(self, y: FloatArray) -> FloatArray:
        """P y, with P the inverse covariance after the fixed effects are taken out; y (n,) or (n, k)."""
        column = y.reshape(len(y), -1)
        w = column / self.d[:, None] - self.batch_block @ (self.batch_block.T @ column)
        if self.factor.size:
            w = w - self.weighted @ linalg.cho_solve((self.factor, True), self.design.T @ w)
        return np.asarray(w.reshape(y.shape), float)

    def quadratic(self, x: sparse.csc_array) -> FloatArray:
        """x' P x of each sparse column, FloatArray (k,)."""
        square = np.asarray(x.multiply(x).T @ (1.0 / self.d)).ravel()
        shared = self.batch_block.T @ x
        square -= np.asarray(shared.multiply(shared).sum(axis=0)).ravel()
        if not self.factor.size or not x.shape[1]:
            return square
        cross = sparse.csc_array(self.weighted.T @ x)
        size = len(self.factor)
        if size * size * x.shape[1] <= DENSE_WORK:
            half = linalg.solve_triangular(self.factor, cross.toarray(), lower=True, check_finite=False)
            return np.asarray(square - np.einsum("ij,ij->j", half, half))
        return np.asarray(square - self._gathered(cross))

    def _gathered(self, cross: sparse.csc_array) -> FloatArray:
        """c' M^-1 c of sparse columns by looking up the few entries of the inverse that each needs."""
        if self._inverse is None:
            self._inverse = linalg.cho_solve((self.factor, True), np.eye(len(self.factor)), check_finite=False)
        count = np.diff(cross.indptr)
        result = np.zeros(cross.shape[1])
        few = count <= 64
        for width in np.unique(count[few]):
            columns = np.flatnonzero(count == width)
            for part in np.array_split(columns, max(1, len(columns) * int(width) ** 2 // 4_000_000)):
                place = cross.indptr[part][:, None] + np.arange(width)
                index, value = cross.indices[place], cross.data[place]
                inner = self._inverse[index[:, :, None], index[:, None, :]]
                result[part] = np.einsum("ki,kij,kj->k", value, inner, value)
        many = np.flatnonzero(~few)
        for part in np.array_split(many, max(1, len(many) // 512)):
            block = cross[:, part].toarray()
            result[part] = np.einsum("ij,ij->j", block, self._inverse @ block)
        return result
