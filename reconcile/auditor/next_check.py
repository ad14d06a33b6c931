"""The one reading of what already stands that would best tell a finding from its rivals."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy import special

from reconcile.auditor.layout import Layout
from reconcile.auditor.proposals import Site
from reconcile.auditor.scoring import Candidate
from reconcile.auditor.search import Search, State
from reconcile.auditor.wording import name_of
from reconcile.records.arrays import FloatArray
from reconcile.records.standards import standard_ph

MOST_BATCHES, MOST_METERS, MOST_EXPLANATIONS = 25, 12, 4
STANDARDS = ("phthalate", "phosphate 1:1", "borax")
STANDARD_TEMPERATURE = 25.0
ENOUGH = 2.0
"""Separation from which one reading decides with less than a one in six chance of a wrong choice, Phi(-1)."""
MOST_REPEATS = 9
CAUTION = "Only where the quality unit authorises it."


@dataclass(frozen=True)
class Check:
    """A practicable reading: which solution on which meter, and the rows of the model that it would follow.

    template : evidence row of the same solution, -1 for a known solution; z : (q,) its random-effect columns
    """

    solution: str
    batch_of: str
    meter: str
    ph: float
    site: Site
    template: int
    z: FloatArray
    batch_sd: float
    other: float
    noise: float


def practicable(layout: Layout, noise: FloatArray, batch_sd: FloatArray, also: int = -1) -> list[Check]:
    """Every standing solution and standard buffer on every meter, the most recently read solutions first.

    also : evidence row whose batch counts even if it was not read recently (a suspect entry)
    """
    last: dict[int, int] = {}
    for row in np.argsort(np.nan_to_num(layout.day, nan=-1.0), kind="stable").tolist():
        last[int(layout.batch[row])] = row
    recent = sorted(last.values(), key=lambda row: (-np.nan_to_num(layout.day[row], nan=-1.0), int(layout.batch[row])))
    meters, spans, sessions = (layout.effects[name] for name in ("meter", "span", "session"))
    z = layout.z
    checks = []
    for index, meter in enumerate(layout.meters[:MOST_METERS]):
        mine = np.flatnonzero(layout.meter == index)
        own_noise = float(np.median(noise[mine]))

        def on_meter(row: FloatArray, ph: float, index: int = index) -> FloatArray:
            row = row.copy()
            for effects in (meters, spans, sessions):
                row[effects.first : effects.last] = 0.0
            row[meters.column(index)], row[spans.column(index)] = 1.0, ph - 7.0
            return row

        for name in STANDARDS:
            certified = standard_ph(name, STANDARD_TEMPERATURE)
            if certified is not None:
                ph, u = certified
                site = Site(ph, STANDARD_TEMPERATURE, "known solution")
                row = on_meter(np.zeros(z.shape[1]), ph)
                label = f"the {name} standard buffer (pH {ph:.3f} at 25 °C)"
                checks.append(Check(label, "", meter, ph, site, -1, row, 0.0, u**2, own_noise))
        for template in dict.fromkeys([*([also] if also >= 0 else []), *recent[:MOST_BATCHES]]):
            ph = float(layout.ph[template])
            family = layout.families[layout.family[template]]
            site = Site(ph, float(layout.temperature[template]), family)
            row = on_meter(z[[template]].toarray().ravel(), ph)
            batch = layout.batches[layout.batch[template]]
            sd, other = float(batch_sd[template]), float(layout.other[template])
            checks.append(Check(f"batch {batch}", batch, meter, ph, site, template, row, sd, other, own_noise))
    return checks


def effect_on(candidate: Candidate, check: Check) -> float:
    """Effect at amplitude 1 of an explanation on a reading still to be taken."""
    if candidate.alarm_class == "meter":
        at = candidate.proposal.at
        return at(candidate.index, check.site) if at is not None and candidate.subject == check.meter else 0.0
    if candidate.alarm_class == "reading" or check.template < 0:
        return 0.0
    return float(candidate.x[[check.template]].toarray()[0, 0])


def expected(
    search: Search, state: State, candidates: Sequence[Candidate], checks: Sequence[Check]
) -> tuple[FloatArray, FloatArray]:
    """Predictive mean pH of each check under a joint explanation given all data; its variance without reading noise.

    Best linear unbiased prediction with unknown fixed effects (universal kriging): Searle, Casella and McCulloch 1992,
    Variance Components, ch. 7 (from memory).
    """
    layout = search.layout
    fixed, r = search.fixed_and_rest(candidates)
    model = search.model(state.components, [])
    z_new = np.array([c.z for c in checks])
    shared = np.zeros((len(layout), len(checks)))
    batch_sd = model.batch_sd()
    for j, check in enumerate(checks):
        if check.template >= 0:
            rows = layout.batch == layout.batch[check.template]
            shared[rows, j] = batch_sd[rows] * check.batch_sd
    c = np.asarray(layout.z @ (z_new * model.g).T) + shared
    weighted = model.project(c)
    at_point = np.zeros(len(checks))
    for candidate in candidates:
        if candidate.point:
            at_point += [effect_on(candidate, check) for check in checks]
    mean = np.array([check.ph for check in checks]) + at_point
    variance = (z_new**2) @ model.g + np.array([check.batch_sd**2 + check.other for check in checks])
    variance -= np.einsum("ij,ij->j", c, weighted)
    if fixed is None:
        return np.asarray(mean + weighted.T @ r), np.maximum(variance, 0.0)
    free = [candidate for candidate in candidates if not candidate.point]
    x_new = np.array([[effect_on(candidate, check) for candidate in free] for check in checks])
    px = model.project(fixed.toarray())
    inverse = np.linalg.pinv(np.asarray(fixed.T @ px), rcond=1e-10, hermitian=True)
    beta = inverse @ (px.T @ r)
    gap = x_new - np.asarray(fixed.T @ weighted).T
    mean = mean + x_new @ beta + weighted.T @ (r - fixed @ beta)
    variance = variance + np.einsum("ji,ik,jk->j", gap, inverse, gap)
    return np.asarray(mean), np.maximum(variance, 0.0)


def absent(
    mean: FloatArray, variance: FloatArray, candidate: Candidate, amplitude: float, checks: Sequence[Check]
) -> tuple[FloatArray, FloatArray]:
    """The same predictions without the fault: for a slip of the pen, what the entry would be if it were right."""
    effect = np.array([effect_on(candidate, check) for check in checks])
    if candidate.alarm_class == "reading":
        batch, meter = candidate.subject[0], candidate.subject[1]
        effect = np.array([-float(check.batch_of == batch and check.meter == meter) for check in checks])
    return mean - amplitude * effect, variance


def separation(means: FloatArray, variances: FloatArray) -> FloatArray:
    """Smallest pairwise d = |difference| / sqrt((s1^2 + s2^2)/2) over explanations (e, checks)."""
    smallest = np.full(means.shape[1], np.inf)
    for a in range(len(means)):
        for b in range(a + 1, len(means)):
            spread = np.sqrt((variances[a] + variances[b]) / 2.0)
            smallest = np.minimum(smallest, np.abs(means[a] - means[b]) / spread)
    return smallest


def next_check(search: Search, state: State, j: int, candidates: Sequence[tuple[Candidate, float]]) -> str:
    """The sentence that names the next check for the j-th finding.

    candidates : with their amplitudes, its own first, then its rivals.

    Where a finding has no rival, the check tells it from its absence: the same reading without the fault's effect.
    """
    layout = search.layout
    others = [c.candidate for i, c in enumerate(state.chosen) if i != j]
    model = search.model(state.components, [])
    suspect = int(candidates[0][0].x.indices[0]) if candidates[0][0].alarm_class == "reading" else -1
    checks = practicable(layout, model.noise, model.batch_sd(), suspect)
    if not checks:
        return "No check can be named: the record names no meter."
    tried = candidates[:MOST_EXPLANATIONS]
    names = [name_of(c, amplitude) for c, amplitude in tried]
    predicted = [expected(search, state, [*others, c], checks) for c, _ in tried]
    if len(tried) == 1:
        names.append("not")
        predicted.append(absent(*predicted[0], *tried[0], checks))
    means, fixed_part = np.array([m for m, _ in predicted]), np.array([v for _, v in predicted])
    noise = np.array([check.noise for check in checks])
    d = separation(means, fixed_part + noise)
    best = int(np.nanargmax(np.where(np.isfinite(d), d, -1.0)))
    check = checks[best]
    outcomes = "; ".join(
        f"{name}: pH {m:.2f} ± {s:.2f}"
        for name, m, s in zip(names, means[:, best], np.sqrt(fixed_part[:, best] + noise[best]), strict=True)
    )
    words = f"Read {check.solution} on meter {check.meter}. Expected if {outcomes}."
    wrong = float(special.ndtr(-d[best] / 2.0))
    words += f" Separation d = {d[best]:.1f}, chance of a wrong choice {wrong:.2g}."
    if d[best] < ENOUGH:
        words += " " + repeats_words(means[:, [best]], fixed_part[:, [best]], float(noise[best]))
    return f"{words} {CAUTION}"


def repeats_words(means: FloatArray, fixed_part: FloatArray, noise: float) -> str:
    """How many repeats of a check would decide, or that none would."""
    for n in range(2, MOST_REPEATS + 1):
        if float(separation(means, fixed_part + noise / n)[0]) >= ENOUGH:
            return f"One such reading would not settle it; the mean of {n} would."
    return "No practicable number of such readings would settle it."
