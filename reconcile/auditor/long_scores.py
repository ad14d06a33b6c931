"""Informations of all candidates of a long record, exact for those that count."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from reconcile.auditor.long_model import NEAR, LongModel
from reconcile.auditor.proposals import Proposal
from reconcile.records.arrays import FloatArray, IntArray

NEAR_TOP = 0.4
"""Share of the largest score from which a candidate may be the best, or a rival of the best, once it is exact."""


def informations(model: LongModel, proposals: Sequence[Proposal], slopes: Sequence[FloatArray]) -> list[FloatArray]:
    """x' P x of every candidate, exact where its score comes near significance and near the largest of all.

    Elsewhere it is a bound, and the score a little too small; such a candidate is looked at again once the largest is
    explained.
    """
    bounds = [model.bound(p.x, own_columns(p), p.steady) for p in proposals]
    largest = 0.0
    for p, slope, known in zip(proposals, slopes, bounds, strict=True):
        information = model.informed(p.x, slope, known, np.inf, np.inf, p.steady)
        good = information > 1e-6
        largest = max(largest, float((np.abs(slope[good]) / np.sqrt(information[good])).max(initial=0.0)))
    least = max(NEAR, NEAR_TOP * largest)
    return [
        model.informed(p.x, slope, known, least, np.inf, p.steady)
        for p, slope, known in zip(proposals, slopes, bounds, strict=True)
    ]


def own_columns(proposal: Proposal) -> IntArray | None:
    """The column of the design that each candidate may be, -1 where it has none or several of its own."""
    if not len(proposal.own):
        return None
    return np.array([own[0] if len(own) == 1 else -1 for own in proposal.own], np.intp)
