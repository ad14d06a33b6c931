"""The linear mixed model of all residuals, and robust estimates of its variance components.

residual = meter, span and session terms + lots (sensitivity x ln strength error) + constants + activity model
           + preparation of the batch + reading noise
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from scipy import linalg, sparse

from reconcile.auditor.components import SHORT, Components, Model
from reconcile.auditor.layout import Layout
from reconcile.auditor.long_components import estimate_long
from reconcile.auditor.long_model import LongModel
from reconcile.auditor.robust import HUBER as HUBER
from reconcile.auditor.robust import HUBER_MEAN as HUBER_MEAN
from reconcile.auditor.robust import OWN_NOISE_FROM, bounded, meter_ratios, stated
from reconcile.auditor.tails import tail_weights
from reconcile.records.arrays import FloatArray
from reconcile.records.settings import Settings


class ShortModel(Model):
    """The model of a short record, with its covariance written out."""

    def __init__(
        self,
        layout: Layout,
        components: Components,
        fixed: sparse.csc_array | None = None,
        own_dropped: tuple[int, ...] = (),
        r: FloatArray | None = None,
    ) -> None:
        super().__init__(layout, components, own_dropped, r)
        tau = self.batch_sd()
        scaled = layout.dense * np.sqrt(self.g)
        v = scaled @ scaled.T + np.where(layout.same_batch, np.outer(tau, tau), 0.0)
        v[np.diag_indices(len(tau))] += self.d
        root = linalg.cho_factor(v, lower=True) if len(tau) else (v, True)
        p = linalg.cho_solve(root, np.eye(len(tau))) if len(tau) else v
        self.log_det = 2.0 * float(np.log(np.diag(root[0])).sum())
        if fixed is not None and fixed.shape[1]:
            px = p @ fixed.toarray()
            inner = fixed.T @ px
            self.log_det += float(np.linalg.slogdet(inner)[1])
            p = p - px @ np.linalg.pinv(inner, rcond=1e-10, hermitian=True) @ px.T
        self.p = (p + p.T) / 2
        self.pr = self.p @ self.r

    def project(self, y: FloatArray) -> FloatArray:
        return np.asarray(self.p @ y, float)

    def quadratic(self, x: sparse.csc_array) -> FloatArray:
        column = np.repeat(np.arange(x.shape[1]), np.diff(x.indptr))
        px = x.T @ self.p
        found = np.bincount(column, x.data * px[column, x.indices], minlength=x.shape[1])
        return np.asarray(found, float)

    def diagonal(self) -> FloatArray:
        return np.asarray(np.diag(self.p), float)


def model_of(
    layout: Layout,
    components: Components,
    fixed: sparse.csc_array | None = None,
    own_dropped: tuple[int, ...] = (),
    r: FloatArray | None = None,
) -> Model:
    """The model of a record, written out or sparse as its length asks.

    fixed : sparse (n, f) columns of unknown size; own_dropped : columns of Z whose prior is left out
    r : residuals, where they differ from the layout's (a supposed truth was taken off them)
    Raises numpy.linalg.LinAlgError only if the layout holds non-finite numbers.
    """
    sort = ShortModel if len(layout) <= SHORT else LongModel
    return sort(layout, components, fixed, own_dropped, r)


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
    n = len(layout)
    if n > SHORT:
        return estimate_long(layout, settings, fixed, r, start)
    floor = stated(layout, settings)
    if n < 4:
        return floor
    now = start or replace(floor, noise=max(floor.noise, 1e-4), session=max(floor.session, 2.5e-5))
    sessions = layout.effects["session"]
    session_columns = layout.z.tocsc()[:, sessions.first : sessions.last]
    batch_columns = sparse.csc_array(
        (layout.preparation, (np.arange(n), layout.batch)), shape=(n, len(layout.first_of_batch))
    )
    counts = np.bincount(layout.meter[layout.meter >= 0], minlength=len(layout.meters))
    df = float(n)
    for _ in range(40):
        model = model_of(layout, now, fixed, r=r)
        p = model.diagonal()
        share = model.noise * p
        z2 = np.minimum(model.pr**2 / np.maximum(p, 1e-12), HUBER**2)
        noise_ratio = float((share * z2).sum() / HUBER_MEAN / max(share.sum(), 1e-12))
        df = float(share.sum())
        ratio = now.meter_ratio * meter_ratios(layout.meter, counts, share, z2) ** 0.5
        ratio = np.where(counts >= OWN_NOISE_FROM, ratio / noise_ratio**0.5, 1.0)
        session = now.session
        if session_columns.shape[1]:
            num, den = bounded(np.asarray(session_columns.T @ model.pr), model.quadratic(session_columns))
            session *= (num / den) ** 0.9 if den > 0 else 1.0
        num, den = bounded(np.asarray(batch_columns.T @ model.pr), model.quadratic(batch_columns))
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
    return replace(now, noise_df=max(df * 0.92, 3.0), tails=tail_weights(model_of(layout, now, fixed, r=r)))
