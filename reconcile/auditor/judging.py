"""Candidates judged beside what is chosen already: their scores, and how surprising they are in a clean record."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from scipy import sparse

from reconcile.auditor.alarm import Alarm, single_p
from reconcile.auditor.components import SHORT, Components, Model
from reconcile.auditor.layout import Layout
from reconcile.auditor.mixed import estimate, model_of
from reconcile.auditor.proposals import Context, FaultKind
from reconcile.auditor.retrial import Retrial
from reconcile.auditor.scoring import Candidate, Pool, Scores, gain_if_unsure, pool_of, score, without
from reconcile.records.arrays import FloatArray
from reconcile.records.settings import Settings

AGAIN, AGAIN_FROM, AGAIN_READINGS = 3, 2.0, 3
"""How many candidates of a round are judged again, from which marginal gain and number of readings on."""
UNSURE, UNSURE_GAP, UNSURE_SHARE = 40, 60.0, 0.3
"""Supposed substances of one lot whose own uncertainty is reckoned: how many, and how far below the best at first."""
ONE_EACH = ("lot", "batch")
"""Classes in which one subject has one explanation at a time: a bottle holds one thing, a batch was spoilt once."""
TRIED = 12
"""Candidates of each round whose family-wise probability is worked out, best first."""


@dataclass(frozen=True)
class Chosen:
    """A candidate in the present explanation, with its support given all the others."""

    candidate: Candidate
    gain: float
    marginal: float
    p: float
    amplitude: float


class Judge:
    """Holds the evidence of one record and judges candidates on it; counts what was tried."""

    def __init__(
        self,
        layout: Layout,
        settings: Settings,
        retrial: Retrial,
        kinds: Sequence[FaultKind],
        progress: Callable[[str], None] | None = None,
    ) -> None:
        self.layout, self.settings, self.retrial, self.kinds = layout, settings, retrial, kinds
        self.rate = float(settings["audit.alarm_rate"])
        self.progress = progress or (lambda _: None)
        self.tried = 0

    def fixed_and_rest(self, candidates: Sequence[Candidate]) -> tuple[sparse.csc_array | None, FloatArray]:
        """Columns of free amplitude, and the residuals after what has none is taken off."""
        free = [c.x for c in candidates if not c.point]
        r = self.layout.r
        for c in candidates:
            if c.point:
                r = r - c.x.toarray().ravel()
        return (sparse.csc_array(sparse.hstack(free)) if free else None), r

    def layout_with(self, candidates: Sequence[Candidate]) -> Layout:
        """The layout with what is unsure about supposed substances among its random effects.

        A long record keeps its factored covariance instead: there each substance's own score alone carries it.
        """
        if len(self.layout) > SHORT:
            return self.layout
        columns = [c.unsure for c in candidates if c.unsure is not None and c.unsure.shape[1]]
        if not columns:
            return self.layout
        z = sparse.csr_array(sparse.hstack([self.layout.z, *columns]))
        more = z.shape[1] - self.layout.z.shape[1]
        return replace(self.layout, z=z, prior=np.r_[self.layout.prior, np.ones(more)])

    def model(self, components: Components, candidates: Sequence[Candidate], own: tuple[int, ...] = ()) -> Model:
        fixed, r = self.fixed_and_rest(candidates)
        return model_of(self.layout_with(candidates), components, fixed, own, r)

    def components(self, candidates: Sequence[Candidate], start: Components | None = None) -> Components:
        fixed, r = self.fixed_and_rest(candidates)
        return estimate(self.layout_with(candidates), self.settings, fixed, r, start)

    def scored(self, components: Components, candidates: Sequence[Candidate]) -> tuple[Pool, Model, Scores]:
        """All candidates beside the given ones."""
        model = self.model(components, candidates)
        taken = {(c.alarm_class, c.subject) for c in candidates if c.alarm_class in ONE_EACH}
        pool = pool_of(Context(self.layout, self.settings, model, self.retrial), self.kinds)
        self.tried += len(pool)
        scores = self.made_unsure(pool, model, pool.scores(model))
        return pool, model, without(scores, pool.concerning(taken)) if taken else scores

    @staticmethod
    def made_unsure(pool: Pool, model: Model, scores: Scores) -> Scores:
        """Scores in which supposed substances that come near the best of their block carry their own uncertainty."""
        gain, marginal = scores.gain.copy(), scores.marginal.copy()
        for p, offset in zip(pool.proposals, pool.offsets, strict=False):
            if p.unsure is None or not len(p):
                continue
            own = scores.marginal[offset : offset + len(p)]
            blocks = np.array([str(b) for b in p.block], object)
            for block in np.unique(blocks.astype(str)):
                inside = np.flatnonzero(blocks == block)
                ranked = inside[np.argsort(-own[inside], kind="stable")]
                best = float(own[ranked[0]])
                for i in ranked[:UNSURE]:
                    if own[i] < 1.0 or own[i] < best - UNSURE_GAP - UNSURE_SHARE * abs(best):
                        break
                    k = int(offset + i)
                    now = gain_if_unsure(model, pool.columns(np.array([k], np.intp)), p.unsure(int(i)))
                    marginal[k] += now - gain[k]
                    gain[k] = max(now, 0.0)
        return replace(scores, gain=gain, marginal=marginal)

    def supported(self, pool: Pool, model: Model, scores: Scores, beside: Sequence[Candidate]) -> list[Chosen]:
        """The best candidates with their family-wise probability at or under the alarm rate, best first.

        beside : what the model holds already. A fault that is not in the model yet swells the noise and its tails, so
        the best few that fall short are judged again with the spreads that would be found beside them.
        """
        floor = np.sqrt(2.0 * np.maximum(scores.gain, 0.0))
        order = np.argsort(-scores.marginal, kind="stable")
        order = order[(floor[order] > 2.5) & np.isfinite(scores.marginal[order])][:400]
        found: list[Chosen] = []
        if not len(order):
            return found
        alarm = Alarm(pool, model)
        p_single = single_p(model, pool.columns(order), floor[order])
        again: set[tuple[object, ...]] = set()
        for k, p in zip(order.tolist(), p_single.tolist(), strict=True):
            candidate = pool.candidate(k)
            gain, marginal = float(scores.gain[k]), float(scores.marginal[k])
            one = Chosen(candidate, gain, marginal, 1.0, float(scores.amplitude[k]))
            one = replace(one, p=alarm.family_wise(candidate, k, gain, p, self.rate))
            subject = (candidate.kind, candidate.subject)
            promising = marginal > AGAIN_FROM and len(candidate.x.indices) >= AGAIN_READINGS
            # one fault swells the noise of a short record only
            falls_short = one.p > self.rate and promising and not model.long
            if falls_short and subject not in again and len(again) < AGAIN:
                again.add(subject)
                one = self.judged_again(candidate, pool, model, beside)
            if one.p <= self.rate:
                found.append(one)
                if len(found) >= TRIED:
                    break
        return sorted(found, key=lambda c: -c.marginal)

    def judged_again(self, candidate: Candidate, pool: Pool, model: Model, beside: Sequence[Candidate]) -> Chosen:
        """Support of a candidate with the variance components estimated beside it."""
        components = self.components([*beside, candidate], model.components)
        return self.support(candidate, pool, self.model(components, beside))

    def support(self, candidate: Candidate, pool: Pool, model: Model) -> Chosen:
        """Support of one candidate under a model that lacks it, charged as a member of the pool's block of its own."""
        s = score(
            model,
            candidate.x,
            np.array([candidate.point]),
            np.array([candidate.prior_sd]),
            np.array([candidate.log_prior]),
        )
        if candidate.unsure is not None:
            now = gain_if_unsure(model, candidate.x, candidate.unsure)
            s = replace(s, gain=np.array([max(now, 0.0)]), marginal=s.marginal + now - s.gain)
        gain = float(s.gain[0])
        p = float(single_p(model, candidate.x, np.array([np.sqrt(2.0 * gain)]))[0])
        alarm = Alarm(pool, model)
        k = self.member(candidate, pool)
        if k is None:
            p_all = min(1.0, p * pool.classes * max(pool.blocks_in_class[candidate.alarm_class], 1))
        else:
            p_all = alarm.family_wise(candidate, k, gain, p, self.rate)
        return Chosen(candidate, gain, float(s.marginal[0]), p_all, float(s.amplitude[0]))

    @staticmethod
    def member(candidate: Candidate, pool: Pool) -> int | None:
        """A column of the pool in the candidate's block."""
        offset = 0
        for proposal in pool.proposals:
            if proposal.alarm_class == candidate.alarm_class:
                for i, block in enumerate(proposal.block):
                    if str(block) == candidate.block:
                        return offset + i
            offset += len(proposal)
        return None
