"""Which suppositions about a lot of a long record are worth computing on all of its readings."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from reconcile.auditor.long_model import LongModel
from reconcile.auditor.proposals import Context
from reconcile.auditor.retrial import Supposed

SAMPLE = 12
"""Readings on which a supposition is tried first."""
HOPELESS, BEST = -15.0, 6
"""Log-likelihood gain on those few under which the others are not worth computing; how many are tried in any case."""


def plausible(context: Context, supposed: Sequence[Supposed]) -> list[int]:
    """Suppositions that a few readings do not rule out; on a short record all of them.

    supposed : of the same contributions all. The predictions of the few are kept, the judgement is made anew: what is
    hopeless beside an unexplained fault may serve once that is explained.
    """
    if not isinstance(context.model, LongModel) or not supposed:
        return list(range(len(supposed)))
    rows = context.retrial.rows_of(supposed[0])
    order = rows[np.argsort(context.layout.ph[rows], kind="stable")]
    few = np.sort(order[np.linspace(0, len(order) - 1, min(SAMPLE, len(order))).round().astype(np.intp)])
    key = ("few", supposed[0].contributions)
    shifts = context.kept(key, lambda: context.retrial.shifts_at(supposed, few))
    weights = np.linalg.inv(context.model.marginal(few))
    gain = shifts @ weights @ context.model.r[few] - 0.5 * np.einsum("ki,ij,kj->k", shifts, weights, shifts)
    gain = np.where(np.isfinite(gain), gain, -np.inf)
    best = np.sort(gain)[-min(BEST, len(gain))]
    return [int(i) for i in np.flatnonzero((gain > HOPELESS) | ((gain >= best) & np.isfinite(gain)))]
