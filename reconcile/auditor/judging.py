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
from reconcile.auditor.relinearised import relinearised
from reconcile.auditor.retrial import Retrial, Supposed
from reconcile.auditor.scoring import Candidate, Pool, Scores, pool_of, score, without
from reconcile.records.arrays import FloatArray
from reconcile.records.limits import beyond
from reconcile.records.settings import Settings

AGAIN, AGAIN_FROM, AGAIN_READINGS = 3, 1.0, 3
"""How many candidates of a round are judged again, from which marginal gain and number of readings on."""
RECOMPUTED_BLOCKS = 3
"""Subjects whose suppositions are recomputed in a round, best first: one of them is chosen."""
RECOMPUTED, RECOMPUTED_FROM, RECOMPUTED_GAP, RECOMPUTED_SHARE = 12, 1.0, 60.0, 0.3
"""Suppositions about one subject whose variance is recomputed: how many, from which marginal gain on, how far below the
best of the subject at first."""
MOST_LAYOUTS, MOST_LONG_LAYOUTS = 400, 12
ONE_EACH = ("lot", "batch")
"""Classes in which one subject has one explanation at a time: a bottle holds one thing, a batch was spoilt once."""
FIRST, FIRST_LONG = 400, 24
"""Candidates of each round whose single probability is worked out, best first."""
LATEST = 12
"""Rounds kept, with all that was tried in them."""
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
        self._layouts: dict[tuple[Supposed, ...], Layout] = {}
        self._latest: dict[tuple[int, ...], tuple[Components, list[Candidate], tuple[Pool, Model, Scores]]] = {}

    def fixed_and_rest(self, candidates: Sequence[Candidate]) -> tuple[sparse.csc_array | None, FloatArray]:
        """Columns of free amplitude, and the residuals after what has none is taken off."""
        free = [c.x for c in candidates if not c.point]
        r = self.layout.r
        for c in candidates:
            if c.point:
                r = r - c.x.toarray().ravel()
        return (sparse.csc_array(sparse.hstack(free)) if free else None), r

    def layout_with(self, candidates: Sequence[Candidate]) -> Layout:
        """The layout with sensitivities and variances recomputed under what candidates suppose of recipes.

        On a long record only under what is supposed of lots: one batch more or less changes nothing there.
        """
        long = len(self.layout) > SHORT
        told = [c for c in candidates if c.alarm_class == "lot" or not long]
        supposed = tuple(c.supposed for c in told if c.supposed is not None)
        if not supposed:
            return self.layout
        if supposed not in self._layouts:
            layout = self.layout
            for one in supposed:
                layout = relinearised(layout, *self.retrial.prediction(one))
            if len(self._layouts) > (MOST_LONG_LAYOUTS if long else MOST_LAYOUTS):
                self._layouts.clear()
            self._layouts[supposed] = layout
        return self._layouts[supposed]

    def model(self, components: Components, candidates: Sequence[Candidate], own: tuple[int, ...] = ()) -> Model:
        fixed, r = self.fixed_and_rest(candidates)
        return model_of(self.layout_with(candidates), components, fixed, own, r)

    def components(self, candidates: Sequence[Candidate], start: Components | None = None) -> Components:
        fixed, r = self.fixed_and_rest(candidates)
        return estimate(self.layout_with(candidates), self.settings, fixed, r, start)

    def scored(self, components: Components, candidates: Sequence[Candidate]) -> tuple[Pool, Model, Scores]:
        """All candidates beside the given ones; the latest few answers are kept."""
        key = (id(components), *(id(c) for c in candidates))
        if key not in self._latest:
            self._latest[key] = (components, list(candidates), self._scored(components, candidates))
        self._latest[key] = self._latest.pop(key)
        while len(self._latest) > LATEST:
            self._latest.pop(next(iter(self._latest)))
        return self._latest[key][2]

    def _scored(self, components: Components, candidates: Sequence[Candidate]) -> tuple[Pool, Model, Scores]:
        model = self.model(components, candidates)
        taken = {(c.alarm_class, c.subject) for c in candidates if c.alarm_class in ONE_EACH}
        pool = pool_of(Context(self.layout, self.settings, model, self.retrial), self.kinds)
        if len(pool) > (most := int(self.settings["limits.candidates"])):
            raise beyond("limit-candidates", len(pool), most)
        self.tried += len(pool)
        scores = self.recomputed(pool, model, pool.scores(model), candidates)
        return pool, model, without(scores, pool.concerning(taken)) if taken else scores

    def recomputed(self, pool: Pool, model: Model, scores: Scores, beside: Sequence[Candidate]) -> Scores:
        """Scores in which the best few suppositions about each lot and batch have their variance recomputed under them.

        Only those near the best of their subject are worth it; on a long record none is.
        """
        if model.long:
            return scores
        gain, marginal = scores.gain.copy(), scores.marginal.copy()
        blocks: dict[tuple[str, str], list[int]] = {}
        for p, offset in zip(pool.proposals, pool.offsets, strict=False):
            if p.supposed is not None:
                for i in np.flatnonzero(scores.marginal[offset : offset + len(p)] > RECOMPUTED_FROM).tolist():
                    blocks.setdefault((p.alarm_class, str(p.block[i])), []).append(int(offset + i))
        by_rank = [sorted(inside, key=lambda k: -scores.marginal[k]) for inside in blocks.values()]
        by_rank.sort(key=lambda ranked: -scores.marginal[ranked[0]])
        for ranked in by_rank[:RECOMPUTED_BLOCKS]:
            best = float(scores.marginal[ranked[0]])
            for k in ranked[:RECOMPUTED]:
                if scores.marginal[k] < best - RECOMPUTED_GAP - RECOMPUTED_SHARE * best:
                    break
                candidate = pool.candidate(k)
                if candidate.supposed is not None:
                    now = self.gain_recomputed(candidate, model, beside)
                    marginal[k] += now - gain[k]
                    gain[k] = max(now, 0.0)
        return replace(scores, gain=gain, marginal=marginal)

    def gain_recomputed(self, candidate: Candidate, model: Model, beside: Sequence[Candidate]) -> float:
        """Log-likelihood gain of a supposed truth with mean, sensitivities and variance recomputed under it."""
        fixed, r = self.fixed_and_rest(beside)
        layout = self.layout_with([*beside, candidate])
        under = model_of(layout, model.components, fixed, (), r)
        x = candidate.x.toarray().ravel()
        px = under.project(x)
        size = float(x @ px)
        amplitude = 1.0 if candidate.point or size <= 0 else float(x @ under.pr) / size
        left = float(r @ under.pr) - 2.0 * amplitude * float(x @ under.pr) + amplitude**2 * size
        return 0.5 * (float(r @ model.pr) + model.log_det - left - under.log_det)

    def supported(self, pool: Pool, model: Model, scores: Scores, beside: Sequence[Candidate]) -> list[Chosen]:
        """The best candidates with their family-wise probability at or under the alarm rate, best first.

        beside : what the model holds already. A fault that is not in the model yet swells the noise and its tails, so
        the best few that fall short are judged again with the spreads that would be found beside them.
        """
        floor = np.sqrt(2.0 * np.maximum(scores.gain, 0.0))
        order = np.argsort(-scores.marginal, kind="stable")
        first = FIRST_LONG if model.long else FIRST
        order = order[(floor[order] > 2.5) & np.isfinite(scores.marginal[order])][:first]
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
        return self.support(candidate, pool, self.model(components, beside), beside)

    def support(self, candidate: Candidate, pool: Pool, model: Model, beside: Sequence[Candidate]) -> Chosen:
        """Support of one candidate under a model that lacks it, charged as a member of the pool's block of its own."""
        s = score(
            model,
            candidate.x,
            np.array([candidate.point]),
            np.array([candidate.prior_sd]),
            np.array([candidate.log_prior]),
        )
        if candidate.supposed is not None and not model.long:
            now = self.gain_recomputed(candidate, model, beside)
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
