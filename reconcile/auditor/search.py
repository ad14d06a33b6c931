"""The joint search: add the best supported explanation, rescore all, drop what another explains, swap, start again."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from scipy import sparse

from reconcile.auditor.components import Components
from reconcile.auditor.judging import Chosen, Judge
from reconcile.auditor.mixed import model_of
from reconcile.auditor.scoring import Candidate
from reconcile.records.arrays import BoolArray

MOST_FINDINGS = 40
SWAP_GAIN = 0.05
RESTART_GAP, RESTART_SHARE = 8.0, 0.1
"""How far below the chosen one, in log-likelihood or as a share of its gain, a rival may be to start anew from."""


@dataclass(frozen=True)
class State:
    """One joint explanation: the chosen candidates, the variance components beside them."""

    chosen: tuple[Chosen, ...]
    components: Components


class Search(Judge):
    """The search over one record."""

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
                present = self.support(chosen[j].candidate, pool, model, others)
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
        model = model_of(self.layout_with(candidates), components, None, (), r)
        value = -0.5 * (float(r @ model.pr) + model.log_det)
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
            chosen.append(self.support(one.candidate, pool, model, others))
        return replace(state, chosen=tuple(sorted(chosen, key=lambda c: (-c.gain, str(c.candidate.key)))))
