"""All candidates of all kinds side by side, scored under one model."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Any

import numpy as np
from scipy import sparse

from reconcile.auditor.components import Model
from reconcile.auditor.long_model import LongModel
from reconcile.auditor.long_scores import informations
from reconcile.auditor.proposals import CLASSES, Context, FaultKind, Proposal, Told, steadied
from reconcile.auditor.retrial import Supposed
from reconcile.records.arrays import BoolArray, FloatArray, IntArray

LEAST_INFORMATION = 1e-6


@dataclass(frozen=True)
class Candidate:
    """One explanation, taken out of the pool: its effect, and how to tell it.

    x : sparse (n, 1), effect at amplitude 1
    supposed : the truth it supposes of recipes, None where it supposes none
    """

    kind: str
    alarm_class: str
    block: str
    subject: str | tuple[str, ...]
    subject_type: str
    same: object
    x: sparse.csc_array
    prior_sd: float
    log_prior: float
    point: bool
    df: int
    own: tuple[int, ...]
    proposal: Proposal
    index: int
    supposed: Supposed | None = None

    @property
    def key(self) -> tuple[object, ...]:
        """What makes it the same explanation as another: kind, subject, and the substance or component."""
        return (self.kind, self.subject, self.same)

    def tell(self, amplitude: float) -> Told:
        return self.proposal.tell(self.index, amplitude)


class Pool:
    """Candidates of several proposals, with arrays over all k of them."""

    def __init__(self, proposals: Sequence[Proposal], n: int) -> None:
        self.proposals, self.n = [p for p in proposals if len(p)], n
        self.offsets = np.cumsum([0, *(len(p) for p in self.proposals)])
        self.prior_sd = self._joined([p.prior_sd for p in self.proposals])
        self.log_prior = self._joined([p.log_prior for p in self.proposals])
        self.point: BoolArray = self._joined([p.point.astype(float) for p in self.proposals]) > 0
        self.df: IntArray = self._joined(
            [np.ones(len(p)) if p.df is None else p.df.astype(float) for p in self.proposals]
        ).astype(np.intp)
        names = [(p.alarm_class, str(b)) for p in self.proposals for b in p.block]
        distinct = sorted(set(names))
        place = {name: i for i, name in enumerate(distinct)}
        self.block: IntArray = np.array([place[name] for name in names], np.intp)
        self.block_class = [c for c, _ in distinct]
        looked_at = {c: max((p.blocks for p in proposals if p.alarm_class == c), default=0) for c in CLASSES}
        self.blocks_in_class = {c: max(self.block_class.count(c), looked_at[c]) for c in CLASSES}
        self.kept: dict[object, Any] = {}
        """What was worked out about its blocks, by model."""

    @staticmethod
    def _joined(parts: Sequence[FloatArray]) -> FloatArray:
        return np.concatenate(parts) if parts else np.zeros(0)

    def __len__(self) -> int:
        return int(self.offsets[-1])

    @cached_property
    def x(self) -> sparse.csc_array:
        """All columns side by side, (n, k)."""
        if not self.proposals:
            return sparse.csc_array((self.n, 0))
        return sparse.csc_array(sparse.hstack([p.x for p in self.proposals]))

    def columns(self, ks: IntArray) -> sparse.csc_array:
        """Some of the columns, in the order asked for."""
        if "x" in self.__dict__ or not len(ks):
            return sparse.csc_array(self.x[:, ks])
        which = np.searchsorted(self.offsets, ks, side="right") - 1
        order = np.argsort(which, kind="stable")
        parts = [self.proposals[w].x[:, ks[which == w] - self.offsets[w]] for w in np.unique(which).tolist()]
        back = np.argsort(order, kind="stable")
        return sparse.csc_array(sparse.csc_array(sparse.hstack(parts))[:, back])

    def scores(self, model: Model) -> Scores:
        """Scores of all candidates; on a long record a proposal at a time, steady ones from what is known of them."""
        if not isinstance(model, LongModel):
            return score(model, self.x, self.point, self.prior_sd, self.log_prior)
        slopes = [np.asarray(p.x.T @ model.pr).ravel() for p in self.proposals]
        known = informations(model, self.proposals, slopes)
        return _scores(self._joined(known), self._joined(slopes), self.point, self.prior_sd, self.log_prior)

    @property
    def classes(self) -> int:
        """Classes with any candidate: one that cannot be tested returns its share of the alarm rate."""
        return max(1, sum(count > 0 for count in self.blocks_in_class.values()))

    def trials(self, k: int) -> int:
        """Number of blocks times classes by which a candidate's block probability is charged."""
        return self.classes * self.blocks_in_class[self.block_class[int(self.block[k])]]

    def concerning(self, subjects: set[tuple[str, str | tuple[str, ...]]]) -> BoolArray:
        """True for candidates of any of these (alarm class, subject)."""
        return np.array([(p.alarm_class, s) in subjects for p in self.proposals for s in p.subject], bool)

    def candidate(self, k: int) -> Candidate:
        which = int(np.searchsorted(self.offsets, k, side="right")) - 1
        p, i = self.proposals[which], int(k - self.offsets[which])
        return Candidate(
            kind=p.kind,
            alarm_class=p.alarm_class,
            block=str(p.block[i]),
            subject=p.subject[i],
            subject_type=p.subject_type,
            same=p.same[i] if len(p.same) else None,
            x=self.columns(np.array([k], np.intp)),
            prior_sd=float(p.prior_sd[i]),
            log_prior=float(p.log_prior[i]),
            point=bool(p.point[i]),
            df=int(self.df[k]),
            own=p.own[i] if len(p.own) else (),
            proposal=p,
            index=i,
            supposed=None if p.supposed is None else p.supposed(i),
        )


def pool_of(context: Context, kinds: Sequence[FaultKind]) -> Pool:
    """Candidates of all kinds under the present model."""
    found = [p for kind in kinds for p in proposed(context, kind) if p is not None]
    return Pool(found, len(context.layout))


def proposed(context: Context, kind: FaultKind) -> list[Proposal | None]:
    """What one kind hands in."""
    if not getattr(kind, "steady", False):
        return [kind.propose(context)]
    key = ("proposal", kind.name, kind.alarm_class)
    first = context.kept(key, lambda: steadied(kind.propose(context)))
    refine = getattr(kind, "refine", None)
    if refine is None or first is None or not context.model.long:
        return [first]
    return [first, *refine(context, first)]


@dataclass(frozen=True)
class Scores:
    """Scores of k candidates.

    information : x'Px; amplitude : its estimate (1 for a point); z : score over its standard deviation
    gain : log-likelihood gain at the best amplitude (at 1 for a point), never negative
    marginal : gain averaged over the prior of the amplitude, with the prior odds: what candidates are ranked by
    """

    information: FloatArray
    amplitude: FloatArray
    z: FloatArray
    gain: FloatArray
    marginal: FloatArray


def score(model: Model, x: sparse.csc_array, point: BoolArray, prior_sd: FloatArray, log_prior: FloatArray) -> Scores:
    """Scores of sparse columns under a model; columns that say nothing score nothing."""
    slope = np.asarray(x.T @ model.pr).ravel()
    return _scores(model.quadratic(x), slope, point, prior_sd, log_prior)


def _scores(
    information: FloatArray, slope: FloatArray, point: BoolArray, prior_sd: FloatArray, log_prior: FloatArray
) -> Scores:
    good = information > LEAST_INFORMATION
    safe = np.where(good, information, 1.0)
    z = np.where(good, slope / np.sqrt(safe), 0.0)
    at_one = np.where(good, slope - 0.5 * information, 0.0)
    ratio = prior_sd**2 * safe
    gain = np.where(point, np.maximum(at_one, 0.0), 0.5 * z**2)
    free = 0.5 * z**2 * ratio / (1.0 + ratio) - 0.5 * np.log1p(ratio)
    marginal = np.where(point, at_one, free) + log_prior
    return Scores(
        information,
        np.where(point, 1.0, np.where(good, slope / safe, 0.0)),
        z,
        gain,
        np.where(good, marginal, -np.inf),
    )


def without(scores: Scores, ruled_out: BoolArray) -> Scores:
    """Scores in which some candidates score nothing."""
    return replace(
        scores,
        z=np.where(ruled_out, 0.0, scores.z),
        gain=np.where(ruled_out, 0.0, scores.gain),
        marginal=np.where(ruled_out, -np.inf, scores.marginal),
    )
