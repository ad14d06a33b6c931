"""The linear mixed model of all residuals: its covariance, projections, and robust variance components.

residual = meter, span and session terms + lots (sensitivity x ln strength error) + constants + activity model
           + preparation of the batch + reading noise

Batch effects are eliminated analytically, the others through one Cholesky factor (Woodbury identity); fixed effects
enter as random effects of a variance so large that it no longer matters.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from scipy import linalg, sparse, stats

from reconcile.auditor.layout import ROOT3, Layout
from reconcile.records.arrays import FloatArray, IntArray
from reconcile.records.settings import Settings

FLAT_SD = 100.0
"""Standard deviation standing for "unknown" [in units of a fixed effect]: pH errors are at most a few units."""
HUBER = 2.5
HUBER_MEAN = float(stats.chi2.cdf(HUBER**2, 3) + HUBER**2 * stats.chi2.sf(HUBER**2, 1))
"""Mean of min(z^2, HUBER^2) for standard normal z, so that the bounded squares stay consistent."""
OWN_NOISE_FROM = 20
DENSE_WORK = 4e9


@dataclass(frozen=True)
class Components:
    """Variance components [pH^2; preparation relative^2].

    noise : common reading variance; meter_ratio : FloatArray (meters,) a meter's own noise variance over it
    session, preparation : variances; tail : degrees of freedom of the noise's tails (inf: normal)
    noise_df : effective degrees of freedom behind `noise`
    """

    noise: float
    meter_ratio: FloatArray
    session: float
    preparation: float
    tail: float = np.inf
    noise_df: float = np.inf


class Model:
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
        self.layout, self.components = layout, components
        self.r = layout.r if r is None else r
        n = len(layout)
        self.noise = noise_of(layout, components)
        self.d = self.noise + layout.other
        tau = np.sqrt(components.preparation * layout.preparation**2 + layout.shared)
        self.t = tau / self.d
        self.s = 1.0 + (np.add.reduceat(tau * self.t, layout.first_of_batch) if n else np.zeros(0))
        # rows of one batch share an effect: T = batch indicator times tau/d, over the square root of s
        self.batch_block = sparse.csc_array(
            (self.t / np.sqrt(self.s)[layout.batch], (np.arange(n), layout.batch)), shape=(n, len(self.s))
        )
        g = np.where(np.isnan(layout.prior), components.session, layout.prior)
        if own_dropped:
            g[list(own_dropped)] = 0.0
        self.g = g
        self.live = np.flatnonzero(g > 0)
        parts = [sparse.csc_array(layout.z.tocsc()[:, self.live] * np.sqrt(g[self.live]))]
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

    def variance(self) -> FloatArray:
        """Diagonal of V [pH^2]: the full spread of each residual in a clean record."""
        tau2 = self.components.preparation * self.layout.preparation**2 + self.layout.shared
        z2 = self.layout.z.multiply(self.layout.z)
        return np.asarray(self.d + tau2 + z2 @ self.g, float)

    def log_likelihood(self) -> float:
        """Restricted log-likelihood, up to a constant of the layout."""
        logs = np.log(self.d).sum() + np.log(self.s).sum()
        if self.factor.size:
            logs += 2.0 * np.log(np.diag(self.factor)).sum()
        return float(-0.5 * (logs + self.r @ self.pr))


def noise_of(layout: Layout, components: Components) -> FloatArray:
    """Reading variance of each row [pH^2]."""
    ratio = np.ones(len(layout))
    known = layout.meter >= 0
    ratio[known] = components.meter_ratio[layout.meter[known]]
    return np.asarray(components.noise * ratio, float)


def stated(layout: Layout, settings: Settings) -> Components:
    """The components as stated, which are also the floors of the estimates."""
    return Components(
        noise=float(settings["uncertainty.noise_floor"]) ** 2,
        meter_ratio=np.ones(len(layout.meters)),
        session=float(settings["uncertainty.session"]) ** 2,
        preparation=(float(settings["uncertainty.preparation_percent"]) / 100 / ROOT3) ** 2,
    )


def _bounded(score: FloatArray, information: FloatArray) -> tuple[float, float]:
    """Bounded sum of squared scores and its expectation: their ratio is one where a component fits."""
    good = information > 1e-12
    z2 = np.minimum(score[good] ** 2 / information[good], HUBER**2)
    return float((information[good] * z2).sum() / HUBER_MEAN), float(information[good].sum())


def estimate(
    layout: Layout,
    settings: Settings,
    fixed: sparse.csc_array | None = None,
    r: FloatArray | None = None,
    start: Components | None = None,
) -> Components:
    """Variance components by restricted maximum likelihood with bounded scores (Huber), floors as stated.

    Each step multiplies a component by its ratio of bounded squared scores to their expectation, to the power 0.9; at
    the fixed point the REML equations hold (Patterson and Thompson 1971, Biometrika 58:545; Zhou, Hu, Qian and Cho
    2019, J. Comput. Graph. Stat. 28:350, for multiplicative steps; both from memory). A meter's own noise from 20
    readings on, shrunk to the common value with the weight of 20 readings.
    """
    floor = stated(layout, settings)
    n = len(layout)
    if n < 4:
        return floor
    now = start or replace(floor, noise=max(floor.noise, 1e-4), session=max(floor.session, 2.5e-5))
    unit = sparse.csc_array(sparse.eye_array(n))
    sessions = layout.effects["session"]
    session_columns = layout.z.tocsc()[:, sessions.first : sessions.last]
    batch_columns = sparse.csc_array(
        (layout.preparation, (np.arange(n), layout.batch)), shape=(n, len(layout.first_of_batch))
    )
    counts = np.bincount(layout.meter[layout.meter >= 0], minlength=len(layout.meters))
    df = float(n)
    for _ in range(40):
        model = Model(layout, now, fixed, r=r)
        p = model.quadratic(unit)
        share = model.noise * p
        z2 = np.minimum(model.pr**2 / np.maximum(p, 1e-12), HUBER**2)
        noise_ratio = float((share * z2).sum() / HUBER_MEAN / max(share.sum(), 1e-12))
        df = float(share.sum())
        ratio = now.meter_ratio * _meter_ratios(layout.meter, counts, share, z2) ** 0.5
        ratio = np.where(counts >= OWN_NOISE_FROM, ratio / noise_ratio**0.5, 1.0)
        session = now.session
        if session_columns.shape[1]:
            num, den = _bounded(np.asarray(session_columns.T @ model.pr), model.quadratic(session_columns))
            session *= (num / den) ** 0.9 if den > 0 else 1.0
        num, den = _bounded(np.asarray(batch_columns.T @ model.pr), model.quadratic(batch_columns))
        preparation = now.preparation * ((num / den) ** 0.9 if den > 0 else 1.0)
        new = Components(
            noise=max(now.noise * noise_ratio**0.9, floor.noise),
            meter_ratio=np.clip(ratio, 0.2, 25.0),
            session=max(session, floor.session, 1e-9),
            preparation=max(preparation, floor.preparation),
        )
        moved = max(
            abs(np.log(new.noise / now.noise)),
            abs(new.session - now.session) / new.noise,
            abs(np.log(new.preparation / now.preparation)),
            float(np.abs(np.log(new.meter_ratio / now.meter_ratio)).max(initial=0.0)),
        )
        now = new
        if moved < 2e-3:
            break
    return replace(now, noise_df=max(df * 0.92, 3.0), tail=_tail(Model(layout, now, fixed, r=r)))


def _meter_ratios(meter: IntArray, counts: IntArray, share: FloatArray, z2: FloatArray) -> FloatArray:
    """Noise variance of each meter over the present one, pulled towards one with the weight of 20 readings."""
    known = meter >= 0
    num = np.bincount(meter[known], (share * z2 / HUBER_MEAN)[known], minlength=len(counts))
    den = np.bincount(meter[known], share[known], minlength=len(counts))
    return np.asarray((num + OWN_NOISE_FROM) / (den + OWN_NOISE_FROM))


TAILS = (4.5, 5.0, 6.0, 8.0, 12.0, 24.0, np.inf)


def _tail(model: Model) -> float:
    """Degrees of freedom of the noise's tails, from standardized residuals without the largest one.

    The largest is left out because it is what a reading's own test asks about; normal tails are kept unless another
    choice is better by 1.5 in log-likelihood.
    """
    n = len(model.layout)
    if n < 20:
        return 8.0
    p = model.quadratic(sparse.csc_array(sparse.eye_array(n)))
    z = model.pr / np.sqrt(np.maximum(p, 1e-12))
    z = z[np.argsort(np.abs(z), kind="stable")][: n - max(1, n // 200)]
    bound = float(np.abs(z).max())
    fits = []
    for nu in TAILS:
        law = stats.norm() if np.isinf(nu) else stats.t(nu)
        # both laws are cut where the largest was, and brought to the spread of the sample by its own scale
        scale = float(np.median(np.abs(z)) / law.ppf(0.75))
        scale = max(scale, 1e-6)
        inside = law.cdf(bound / scale) - law.cdf(-bound / scale)
        fits.append(float((law.logpdf(z / scale) - np.log(scale) - np.log(inside)).sum()))
    best = int(np.argmax(fits))
    return float(TAILS[best]) if fits[best] > fits[-1] + 1.5 else np.inf
