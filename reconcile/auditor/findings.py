"""From the search's choice to findings: estimate, interval, onset, rivals, and the words."""

from __future__ import annotations

import zlib
from collections.abc import Sequence
from dataclasses import replace
from datetime import datetime

import numpy as np
from scipy import sparse

from reconcile.auditor import laws
from reconcile.auditor.adjusted import felt_shift
from reconcile.auditor.alarm import Alarm, score_df
from reconcile.auditor.components import Model
from reconcile.auditor.estimates import critical_score, given_selected
from reconcile.auditor.judging import Chosen
from reconcile.auditor.layout import Layout
from reconcile.auditor.scoring import Candidate, Pool, Scores
from reconcile.auditor.search import Search, State
from reconcile.auditor.through_time import courses, moment
from reconcile.auditor.wording import as_probe, detail_of, name_of, sentence, since_words, support_words
from reconcile.records.arrays import FloatArray, IntArray
from reconcile.records.results import COULD_ALSO_BE, Finding

MOST_RIVALS = 8
INSEPARABLE = 1.0
"""Squared distance of two supposed effects in spreads of the readings: half a unit of log-likelihood is expected."""
ONSET_DROP = 1.92
"""Half the 95 % point of chi-squared with one degree of freedom: dates closer than this to the best."""


def distinct(
    pool: Pool, model: Model, scores: Scores, best: Chosen, reach: float
) -> tuple[list[tuple[int, Candidate]], dict[int, list[str]]]:
    """Other explanations within reach of the best, one for each kind, subject and substance, best first.

    Substances in one lot that no reading separates are one: the dict holds, by pool index (-1 for the best itself), the
    names of those that go with it.
    """
    near = np.flatnonzero((scores.gain > best.gain - reach) & (scores.gain > 1.0) & np.isfinite(scores.marginal))
    near = near[np.argsort(-scores.marginal[near], kind="stable")]
    mine = best.candidate
    taken = {(mine.kind, mine.subject)}
    heads: list[tuple[int, Candidate]] = [(-1, mine)] if mine.kind == "lot_identity" else []
    with_it: dict[int, list[str]] = {}
    found: list[tuple[int, Candidate]] = []
    for k in near.tolist():
        other = pool.candidate(k)
        if other.kind == "lot_identity":
            head = next((h for h in heads if inseparable(model, h[1], other)), None)
            if head is not None:
                if other.same != head[1].same:
                    with_it.setdefault(head[0], []).append(detail_of(other.tell(1.0)))
                continue
            heads.append((k, other))
        elif (other.kind, other.subject) in taken:
            continue
        taken.add((other.kind, other.subject))
        if len(found) < MOST_RIVALS:
            found.append((k, other))
    return found, with_it


def inseparable(model: Model, one: Candidate, other: Candidate) -> bool:
    """True where two substances in one lot move the readings alike, within what the readings can tell."""
    if one.subject != other.subject:
        return False
    gap = sparse.csc_array(one.x - other.x)
    return float(model.quadratic(gap)[0]) < INSEPARABLE if gap.nnz else True


def onset_interval(
    layout: Layout, pool: Pool, scores: Scores, best: Candidate, gain: float
) -> tuple[datetime, datetime] | None:
    """Earliest and latest onset nearly as good as the best, among candidates of the same kind and subject."""
    times: list[datetime] = []
    for k in np.flatnonzero(scores.gain > gain - ONSET_DROP).tolist():
        other = pool.candidate(k)
        if (other.kind, other.subject) == (best.kind, best.subject):
            times += around(layout, other, float(scores.amplitude[k]))
    return (min(times), max(times)) if times else None


def around(layout: Layout, candidate: Candidate, amplitude: float) -> list[datetime]:
    """Onset of a candidate; of a step, the readings between which it lies, since any moment between them fits alike."""
    since = candidate.tell(amplitude).since
    if since is None or candidate.kind != "meter_step":
        return [] if since is None else [since]
    course = next(course for course in courses(layout) if course.meter == candidate.subject)
    first = len(course.day) - len(candidate.x.indices)
    return [moment(layout, float(day)) for day in course.day[first - 1 : first + 1]]


def error_of(layout: Layout, candidate: Candidate, amplitude: float) -> tuple[IntArray, FloatArray]:
    """Readings (of the record) that a candidate touches, and by how much each is moved [pH]."""
    rows = np.sort(candidate.x.indices.astype(np.intp))
    return layout.reading[rows], np.asarray(candidate.x[rows].toarray(), float).ravel() * amplitude


def described(
    search: Search,
    layout: Layout,
    candidate: Candidate,
    amplitude: float,
    interval: tuple[float, float] | None,
    gain: float,
    p: float,
    between: tuple[datetime, datetime] | None = None,
) -> Finding:
    """A candidate as a finding, without rivals yet."""
    told = candidate.tell(amplitude)
    ends: tuple[float, float] | None = None
    if interval is not None and told.estimate is not None and not candidate.point:
        scale = told.scale or float
        low, high = sorted((scale(interval[0]), scale(interval[1])))
        ends = (low, high)
    rows, shift = felt_shift(layout, candidate.x, amplitude)
    total = told.would_explain.get("total") if told.would_explain else None
    detail = told.detail
    if candidate.kind == "lot_identity" and told.would_explain:
        detail = str(told.would_explain["substance"])
    words = sentence(
        candidate.kind,
        candidate.subject,
        told.estimate,
        ends,
        since_words(told.since, told.until, between) if candidate.alarm_class == "meter" else "",
        detail,
        float(total) if total is not None else None,
    )
    text = as_probe(words, candidate.subject) if candidate.subject_type == "probe" else words
    return Finding(
        kind=candidate.kind,
        subject=candidate.subject,
        subject_type=candidate.subject_type,
        estimate=told.estimate,
        unit=told.unit,
        interval95=ends,
        log_likelihood_gain=gain,
        family_wise_p=p,
        readings=layout.reading[rows],
        text=text,
        since=told.since,
        until=told.until,
        since_interval95=between if told.since is not None else None,
        would_explain=told.would_explain,
        also=told.also,
        shift=shift,
    )


def interval_of(
    search: Search, candidate: Candidate, pool: Pool, model: Model, bare: Model, k: int | None
) -> tuple[float, tuple[float, float]] | None:
    """Estimate of the total deviation and its 95 % interval, given that it was selected; None for a point.

    `model` lacks the candidate, `bare` lacks the subject's own prior too: the estimate is of the whole deviation, so
    its uncertainty is that of `bare`, while the selection was made by the score under `model`.
    """
    if candidate.point:
        return None
    info_bare = float(bare.quadratic(candidate.x)[0])
    info = float(model.quadratic(candidate.x)[0])
    if info_bare <= 0 or info <= 0:
        return None
    amplitude = float((candidate.x.T @ bare.pr)[0] / info_bare)
    u = info_bare**-0.5
    u *= float(-laws.t_isf(0.975, max(bare.components.noise_df, 3.0)) / laws.norm_ppf(0.975))
    cut = 0.0
    if k is not None:
        seed = zlib.crc32(candidate.alarm_class.encode())
        df = score_df(model, candidate.x)[:, 0]
        cut = critical_score(Alarm(pool, model), k, df, search.rate, seed) * info**-0.5
    low, middle, high = given_selected(amplitude, u, cut, (0.025, 0.5, 0.975))
    return middle, (low, high)


def build(
    search: Search, state: State, layout: Layout, reach: float
) -> list[tuple[Finding, list[tuple[Candidate, float]]]]:
    """Findings with their rivals, best first, and beside each the candidates with amplitudes, its own first."""
    result = []
    for j, one in enumerate(state.chosen):
        others = [c.candidate for i, c in enumerate(state.chosen) if i != j]
        pool, model, scores = search.scored(state.components, others)
        bare = search.model(state.components, others, one.candidate.own)
        member = search.member(one.candidate, pool)
        estimated = interval_of(search, one.candidate, pool, model, bare, member)
        amplitude, interval = (one.amplitude, None) if estimated is None else estimated
        between = onset_interval(layout, pool, scores, one.candidate, one.gain)
        finding = described(search, layout, one.candidate, amplitude, interval, one.gain, one.p, between)
        rivals, with_it = distinct(pool, model, scores, one, reach)
        told: list[Finding] = []
        tried = [(one.candidate, amplitude)]
        for k, other in rivals:
            support = search.support(other, pool, model, others)
            own = search.model(state.components, others, other.own)
            own_estimate = interval_of(search, other, pool, model, own, None)
            size, ends = (float(scores.amplitude[k]), None) if own_estimate is None else own_estimate
            tried.append((other, size))
            between = onset_interval(layout, pool, scores, other, float(scores.gain[k]))
            rival = described(search, layout, other, size, ends, support.gain, support.p, between)
            told.append(also_with(rival, with_it.get(k, [])))
        batches = len(np.unique(layout.batch[np.isin(layout.reading, finding.readings)]))
        words = [finding.text, support_words(one.p, len(finding.readings), batches, len(told))]
        if told:
            names = "; ".join(name_of(c, a) for c, a in tried[1:4])
            words.append(f"{COULD_ALSO_BE}{names}.")
        result.append(
            (
                replace(
                    also_with(finding, with_it.get(-1, [])), id=f"F{j + 1}", rivals=tuple(told), text=" ".join(words)
                ),
                tried,
            )
        )
    return result


def also_with(finding: Finding, names: Sequence[str]) -> Finding:
    """A finding with further substances that act alike in its place."""
    return replace(finding, also=tuple(dict.fromkeys([*finding.also, *names])))
