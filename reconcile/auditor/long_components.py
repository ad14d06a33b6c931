"""Variance components of a long record, at a cost proportional to its readings.

Meters, lots and constants are taken off by the mixed model; what remains of the residuals is looked at twice, batch by
batch and session by session. In either view the other grouping only adds to the variance of single readings, so that
every block has the covariance it should have, and blocks are small enough to be inverted in closed form (a composite
likelihood: Lindsay 1988, Contemp. Math. 80:221, from memory).
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from scipy import sparse

from reconcile.auditor.base_model import BaseModel
from reconcile.auditor.components import Components, noise_of
from reconcile.auditor.grouped import Grouped, batch_sd, repeated_sessions
from reconcile.auditor.layout import Layout
from reconcile.auditor.long_model import LongModel
from reconcile.auditor.robust import HUBER, HUBER_MEAN, OWN_NOISE_FROM, bounded, meter_ratios, stated
from reconcile.auditor.tails import tail_weights
from reconcile.records.arrays import FloatArray
from reconcile.records.settings import Settings

ROUNDS, STEPS = 4, 60
SETTLED = 2e-3
SAME, SAME_METER = 0.03, 0.2
"""Components whose effect on the variance of a reading changes by less than this share are left as they were; the same
of one meter's own noise."""


def estimate_long(
    layout: Layout,
    settings: Settings,
    fixed: sparse.csc_array | None = None,
    r: FloatArray | None = None,
    start: Components | None = None,
) -> Components:
    """Variance components beside fixed columns; `start` itself where they are the same within SAME."""
    floor = stated(layout, settings)
    now = start or replace(floor, noise=max(floor.noise, 1e-4))
    if start is None and fixed is None:
        base = BaseModel(layout, now)
        rest = base.remainder(base.weighed_once(layout.r if r is None else r))
        now = _fitted(layout, now, floor, rest, base.kept_share(0))
    for _ in range(ROUNDS):
        model = LongModel(layout, now, fixed, r=r)
        new = _fitted(layout, now, floor, model.remainder(), model.kept_share())
        if _moved(layout, new, now) < SAME:
            break
        now = new
    if now is start:
        return now
    model = LongModel(layout, now, fixed, r=r)
    df = float((model.noise * model.diagonal()).sum()) * model.kept_share()
    return replace(now, noise_df=max(0.92 * df, 3.0), tails=tail_weights(model))


def _moved(layout: Layout, new: Components, now: Components) -> float:
    """Largest change of a reading's variance by any of the components, as a share of its noise."""
    preparation = float(np.mean(layout.preparation**2))
    meters = float(np.abs(np.log(new.meter_ratio / now.meter_ratio)).max(initial=0.0))
    return max(
        abs(float(np.log(new.noise / now.noise))),
        abs(new.session - now.session) / new.noise,
        abs(new.preparation - now.preparation) * preparation / new.noise,
        meters * SAME / SAME_METER,
    )


@dataclass(frozen=True)
class _View:
    """One grouping's view of the remainders: P r, and the diagonal of P, (n,) each."""

    grouped: Grouped
    y: FloatArray
    p: FloatArray

    def bounded_noise(self, noise: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Share of each reading's noise in its score, and that share times the bounded square of the score."""
        share = noise * self.p
        return share, share * np.minimum(self.y**2 / np.maximum(self.p, 1e-12), HUBER**2)


def _view(d: FloatArray, loading: FloatArray, like: Grouped, rest: FloatArray, kept: float) -> _View:
    grouped = Grouped(d, loading, like.group, like.groups)
    return _View(grouped, grouped.weighed(rest), grouped.diagonal() * kept)


def _fitted(layout: Layout, start: Components, floor: Components, rest: FloatArray, kept: float) -> Components:
    """Components at which the bounded scores of both views meet their expectations; steps as for a short record."""
    n, batches = len(layout), len(layout.batches)
    shares = repeated_sessions(layout)
    session_of = np.where(shares, layout.session, 0).astype(np.intp)
    sessions = int(session_of.max(initial=0)) + 1
    zeros = np.zeros(n)
    of_batches = Grouped(zeros, zeros, layout.batch, batches)
    of_sessions = Grouped(zeros, zeros, session_of, sessions)
    counts = np.bincount(layout.meter[layout.meter >= 0], minlength=len(layout.meters))
    now = replace(start, session=max(start.session, 2.5e-5 if shares.any() else 0.0))
    for _ in range(STEPS):
        noise, tau = noise_of(layout, now), batch_sd(layout, now)
        single = noise + layout.other
        view = _view(single + now.session * shares, tau, of_batches, rest, kept)
        share, weighted = view.bounded_noise(noise)
        preparation = now.preparation * _ratio(view, layout.preparation, kept) ** 0.9
        session = 0.0
        if shares.any():
            other = _view(single + tau**2, now.session**0.5 * shares, of_sessions, rest, kept)
            share_too, weighted_too = other.bounded_noise(noise)
            share, weighted = (share + share_too) / 2.0, (weighted + weighted_too) / 2.0
            session = now.session * _ratio(other, shares.astype(float), kept) ** 0.9
        noise_ratio = float(weighted.sum() / HUBER_MEAN / max(share.sum(), 1e-12))
        ratio = now.meter_ratio * meter_ratios(layout.meter, counts, share, weighted / np.maximum(share, 1e-12)) ** 0.5
        ratio = np.where(counts >= OWN_NOISE_FROM, ratio / noise_ratio**0.5, 1.0)
        new = Components(
            noise=max(now.noise * noise_ratio**0.9, floor.noise),
            meter_ratio=np.clip(ratio, 0.2, 25.0),
            session=max(session, floor.session, 1e-9),
            preparation=max(preparation, floor.preparation),
        )
        moved = _moved(layout, new, now)
        now = new
        if moved < SETTLED:
            break
    return now


def _ratio(view: _View, loading: FloatArray, kept: float) -> float:
    """Bounded squared scores of one component over their expectation."""
    grouped = view.grouped
    group, groups = grouped.group, grouped.groups
    score = np.asarray(np.bincount(group, loading * view.y, minlength=groups), float)
    square = np.bincount(group, loading**2 / grouped.d, minlength=groups)
    shared = np.bincount(group, loading * grouped.scaled, minlength=groups)
    num, den = bounded(score, np.asarray((square - shared**2) * kept, float))
    return num / den if den > 0 else 1.0
