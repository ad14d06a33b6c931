"""The joint search: add the best supported explanation, rescore all, drop what another explains, swap, start again."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from scipy import sparse

from reconcile.auditor.alarm import Alarm, single_p
from reconcile.auditor.components import Components, Model
from reconcile.auditor.layout import Layout
from reconcile.auditor.mixed import estimate, model_of
from reconcile.auditor.proposals import Context, FaultKind
from reconcile.auditor.retrial import Retrial
from reconcile.auditor.scoring import Candidate, Pool, Scores, pool_of, score
from reconcile.records.arrays import BoolArray, FloatArray
from reconcile.records.settings import Settings

MOST_FINDINGS = 40
SWAP_GAIN = 0.05
RESTART_GAP, RESTART_SHARE = 8.0, 0.1
"""How far below the chosen one, in log-likelihood or as a share of its gain, a rival may be to start anew from."""
AGAIN, AGAIN_FROM, AGAIN_READINGS = 3, 2.0, 3
"""How many candidates of a round are judged again, from which marginal gain and number of readings on."""
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


@dataclass(frozen=True)
class State:
    """One joint explanation: the chosen candidates, the variance components beside them."""

    chosen: tuple[Chosen, ...]
    components: Components


class Search:
    """The search over one record; holds the evidence and counts what it tried."""

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

    def model(self, components: Components, candidates: Sequence[Candidate], own: tuple[int, ...] = ()) -> Model:
        fixed, r = self.fixed_and_rest(candidates)
        return model_of(self.layout, components, fixed, own, r)

    def components(self, candidates: Sequence[Candidate], start: Components | None = None) -> Components:
        fixed, r = self.fixed_and_rest(candidates)
        return estimate(self.layout, self.settings, fixed, r, start)

    def scored(self, components: Components, candidates: Sequence[Candidate]) -> tuple[Pool, Model, Scores]:
        """All candidates beside the given ones."""
        model = self.model(components, candidates)
        pool = pool_of(Context(self.layout, self.settings, model, self.retrial), self.kinds)
        self.tried += len(pool)
        return pool, model, pool.scores(model)

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

    def grow(self, chosen: list[Chosen], components: Components) -> State:
        """Add, rescore, drop and swap until nothing changes."""
        seen: set[tuple[object, ...]] = set()
        for _ in range(MOST_FINDINGS):
            self.progress(f"explaining residuals: {len(chosen)} found")
            candidates = [c.candidate for c in chosen]
            pool, model, scores = self.scored(components, candidates)
            found = self.supported(pool, model, scores, candidates)
            if not found:
                break
            chosen = [*chosen, found[0]]
            components = self.components([c.candidate for c in chosen], components)
            chosen, components = self.settle(chosen, components)
            key = tuple(sorted(str((c.candidate.key, c.candidate.index)) for c in chosen))
            if key in seen:
                break
            seen.add(key)
        return State(tuple(chosen), components)

    @staticmethod
    def overlaps(candidate: Candidate, rows: BoolArray) -> bool:
        """True where a candidate touches any of the rows."""
        return bool(rows[candidate.x.indices].any())

    def settle(self, chosen: list[Chosen], components: Components) -> tuple[list[Chosen], Components]:
        """Rescore each chosen one beside the others: keep it, replace it by what serves better, or drop it.

        After the first round only those that share readings with what changed are looked at again; the last one was
        just chosen beside all the others.
        """
        touched = np.zeros(len(self.layout), bool)
        touched[chosen[-1].candidate.x.indices] = True
        for _ in range(4):
            changed = False
            moved = np.zeros(len(self.layout), bool)
            for j in range(len(chosen) - 1, -1, -1):
                if not self.overlaps(chosen[j].candidate, touched):
                    continue
                others = [c.candidate for i, c in enumerate(chosen) if i != j]
                pool, model, scores = self.scored(components, others)
                present = self.support(chosen[j].candidate, pool, model)
                found = self.supported(pool, model, scores, others)
                if found and found[0].marginal > present.marginal + SWAP_GAIN:
                    changed |= found[0].candidate.key != chosen[j].candidate.key
                    moved[[*chosen[j].candidate.x.indices, *found[0].candidate.x.indices]] = True
                    chosen[j] = found[0]
                elif present.p <= self.rate:
                    chosen[j] = present
                else:
                    moved[chosen[j].candidate.x.indices] = True
                    del chosen[j]
                    changed = True
            if not changed:
                break
            touched = moved
            components = self.components([c.candidate for c in chosen], components)
        return chosen, components

    def total(self, chosen: Sequence[Chosen], components: Components) -> float:
        """Log marginal likelihood of a joint explanation, up to a constant of the record and the components."""
        candidates = [c.candidate for c in chosen]
        _, r = self.fixed_and_rest([c for c in candidates if c.point])
        free = [c for c in candidates if not c.point]
        model = model_of(self.layout, components, None, (), r)
        value = -0.5 * float(r @ model.pr)
        if free:
            x = sparse.csc_array(sparse.hstack([c.x for c in free]))
            slope = np.asarray(x.T @ model.pr).ravel()
            inner = np.asarray(x.T @ model.project(x.toarray()))
            prior = np.diag([1.0 / c.prior_sd**2 for c in free])
            posterior = inner + prior
            value += 0.5 * float(slope @ np.linalg.solve(posterior, slope))
            value += 0.5 * float(np.linalg.slogdet(prior)[1] - np.linalg.slogdet(posterior)[1])
        return value + sum(c.log_prior for c in candidates)

    def run(self) -> State:
        """The best joint explanation found, restarted from the rivals of each finding against local optima."""
        best = self.grow([], self.components([]))
        tried: set[tuple[object, ...]] = set()
        improved = True
        while improved and best.chosen:
            improved = False
            for j in range(len(best.chosen)):
                for rival in self.restarts(best, j):
                    key = (best.chosen[j].candidate.key, rival.candidate.key)
                    if key in tried:
                        continue
                    tried.add(key)
                    start = [c for i, c in enumerate(best.chosen) if i != j]
                    start = [*start, rival]
                    other = self.grow(start, self.components([c.candidate for c in start], best.components))
                    if self.total(other.chosen, best.components) > self.total(best.chosen, best.components) + 1.0:
                        best, improved = other, True
                        break
                if improved:
                    break
        return self.ordered(best)

    def restarts(self, state: State, j: int) -> list[Chosen]:
        """Up to two supported rivals of another kind or subject than the chosen one."""
        others = [c.candidate for i, c in enumerate(state.chosen) if i != j]
        pool, model, scores = self.scored(state.components, others)
        mine = state.chosen[j].candidate
        rivals: list[Chosen] = []
        for found in self.supported(pool, model, scores, others):
            distinct = (found.candidate.kind, found.candidate.subject) != (mine.kind, mine.subject)
            near = found.marginal > state.chosen[j].marginal - max(RESTART_GAP, RESTART_SHARE * state.chosen[j].gain)
            if distinct and near and all(found.candidate.subject != r.candidate.subject for r in rivals):
                rivals.append(found)
        return rivals[:2]

    def ordered(self, state: State) -> State:
        """The findings by gain, each rescored beside the others."""
        chosen = []
        for j, one in enumerate(state.chosen):
            others = [c.candidate for i, c in enumerate(state.chosen) if i != j]
            pool, model, _ = self.scored(state.components, others)
            chosen.append(self.support(one.candidate, pool, model))
        return replace(state, chosen=tuple(sorted(chosen, key=lambda c: (-c.gain, str(c.candidate.key)))))
