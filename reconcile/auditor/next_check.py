"""The one reading of what already stands that would best tell a finding from its rivals."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from scipy import sparse, special

from reconcile.auditor.check_plan import Check, Plan
from reconcile.auditor.foresight import ahead, foreseen, most_read_meters, most_recent
from reconcile.auditor.layout import Layout
from reconcile.auditor.long_model import LongModel
from reconcile.auditor.probes import latest_probe
from reconcile.auditor.proposals import Site
from reconcile.auditor.scoring import Candidate
from reconcile.auditor.search import Search, State
from reconcile.auditor.wording import name_of
from reconcile.records.arrays import FloatArray
from reconcile.records.standards import standard_ph

MOST_BATCHES, MOST_METERS, MOST_EXPLANATIONS = 25, 12, 4
LONG_BATCHES, LONG_METERS = 12, 4
"""On a long record: standing solutions of those concerned and as many others, the meters concerned and a few more."""
STANDARDS = ("phthalate", "phosphate 1:1", "borax")
STANDARD_TEMPERATURE = 25.0
ENOUGH = 2.0
"""Separation from which one reading decides with less than a one in six chance of a wrong choice, Phi(-1)."""
MOST_REPEATS = 9


def practicable(
    layout: Layout,
    noise: FloatArray,
    batch_sd: FloatArray,
    also: Sequence[int] = (),
    on: Sequence[int] | None = None,
    most: int = MOST_BATCHES,
    session: float = 0.0,
) -> list[Check]:
    """Every standing solution and standard buffer on every meter, the most recently read solutions first.

    also : evidence rows whose batches count even if they were not read recently (a suspect entry); on : meters
    session : variance between days or calibrations of one meter [pH^2]; a reading to come is of a new one
    """
    recent = most_recent(layout, np.arange(len(layout)), most)
    meters, spans, sessions = (layout.effects[name] for name in ("meter", "span", "session"))
    probes = layout.effects.get("probe")
    z = layout.z
    checks = []
    for index in range(len(layout.meters[:MOST_METERS])) if on is None else on:
        meter = layout.meters[index]
        mine = np.flatnonzero(layout.meter == index)
        own_noise = float(np.median(noise[mine]))
        probe = latest_probe(layout, meter)

        def on_meter(row: FloatArray, ph: float, index: int = index, probe: str = probe) -> FloatArray:
            row = row.copy()
            for effects in (meters, spans, sessions, *([probes] if probes is not None else [])):
                row[effects.first : effects.last] = 0.0
            if probes is not None and probe in probes.subjects:
                row[probes.column(probes.subjects.index(probe))] = 1.0
            row[meters.column(index)], row[spans.column(index)] = 1.0, ph - 7.0
            return row

        for name in STANDARDS:
            certified = standard_ph(name, STANDARD_TEMPERATURE)
            if certified is not None:
                ph, u = certified
                site = Site(ph, STANDARD_TEMPERATURE, "known solution")
                row = on_meter(np.zeros(z.shape[1]), ph)
                label = f"the {name} standard buffer (pH {ph:.3f} at 25 °C)"
                checks.append(Check(label, "", meter, ph, site, -1, row, 0.0, u**2 + session, own_noise, probe))
        for template in dict.fromkeys([*also, *recent]):
            ph = float(layout.ph[template])
            family = layout.families[layout.family[template]]
            site = Site(ph, float(layout.temperature[template]), family)
            row = on_meter(z[[template]].toarray().ravel(), ph)
            batch = layout.batches[layout.batch[template]]
            sd, other = float(batch_sd[template]), float(layout.other[template]) + session
            label = f"the known solution {batch}" if family == "known solution" else f"batch {batch}"
            checks.append(Check(label, batch, meter, ph, site, template, row, sd, other, own_noise, probe))
    return checks


def effect_on(candidate: Candidate, check: Check) -> float:
    """Effect at amplitude 1 of an explanation on a reading still to be taken."""
    if candidate.alarm_class == "meter":
        at = candidate.proposal.at
        read_with = check.probe if candidate.subject_type == "probe" else check.meter
        return at(candidate.index, check.site) if at is not None and candidate.subject == read_with else 0.0
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
    prior = (z_new**2) @ model.g + np.array([check.batch_sd**2 + check.other for check in checks])
    free = [candidate for candidate in candidates if not candidate.point]
    if isinstance(model, LongModel):
        mean, variance = _expected_long(model, candidates, free, fixed, r, checks, z_new)
        return mean, np.maximum(prior + variance, 0.0)
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
    variance = prior - np.einsum("ij,ij->j", c, weighted)
    if fixed is None:
        return np.asarray(mean + weighted.T @ r), np.maximum(variance, 0.0)
    x_new = np.array([[effect_on(candidate, check) for candidate in free] for check in checks])
    px = model.project(fixed.toarray())
    inverse = np.linalg.pinv(np.asarray(fixed.T @ px), rcond=1e-10, hermitian=True)
    beta = inverse @ (px.T @ r)
    gap = x_new - np.asarray(fixed.T @ weighted).T
    mean = mean + x_new @ beta + weighted.T @ (r - fixed @ beta)
    variance = variance + np.einsum("ji,ik,jk->j", gap, inverse, gap)
    return np.asarray(mean), np.maximum(variance, 0.0)


def _expected_long(
    model: LongModel,
    candidates: Sequence[Candidate],
    free: Sequence[Candidate],
    fixed: sparse.csc_array | None,
    r: FloatArray,
    checks: Sequence[Check],
    z_new: FloatArray,
) -> tuple[FloatArray, FloatArray]:
    """The same mean, and what is added to the prior variance, from the factored covariance."""
    templates = np.array([check.template for check in checks], np.intp)
    sd_new = np.array([check.batch_sd for check in checks])
    seen = ahead(model.base, z_new, templates, model.batch_sd(), sd_new)
    x_new = np.array([[effect_on(candidate, check) for candidate in free] for check in checks]).reshape(len(checks), -1)
    moved, variance = foreseen(seen, r, fixed, x_new)
    mean = np.array([check.ph for check in checks]) + moved
    for candidate in candidates:
        if candidate.point:
            mean = mean + np.array([effect_on(candidate, check) for check in checks])
    return mean, variance


def absent(
    mean: FloatArray, variance: FloatArray, candidate: Candidate, amplitude: float, checks: Sequence[Check]
) -> tuple[FloatArray, FloatArray]:
    """The same predictions without the fault: for a slip of the pen, what the entry would be if it were right."""
    effect = np.array([effect_on(candidate, check) for check in checks])
    if candidate.alarm_class == "reading":
        batch, meter = candidate.subject[0], candidate.subject[1]
        size = float(candidate.x.data[0])  # 1 where the amplitude is the size, the slip itself where a slip is named
        effect = np.array([-size * float(check.batch_of == batch and check.meter == meter) for check in checks])
    return mean - amplitude * effect, variance


def separation(means: FloatArray, variances: FloatArray) -> FloatArray:
    """Smallest pairwise d = |difference| / sqrt((s1^2 + s2^2)/2) over explanations (e, checks)."""
    smallest = np.full(means.shape[1], np.inf)
    for a in range(len(means)):
        for b in range(a + 1, len(means)):
            spread = np.sqrt((variances[a] + variances[b]) / 2.0)
            smallest = np.minimum(smallest, np.abs(means[a] - means[b]) / spread)
    return smallest


def plan(search: Search, state: State, j: int, candidates: Sequence[tuple[Candidate, float]]) -> Plan | None:
    """The most telling check for the j-th finding; None where the record names no meter.

    candidates : with their amplitudes, its own first, then its rivals.

    Where a finding has no rival, the check tells it from its absence: the same reading without the fault's effect.
    """
    layout = search.layout
    others = [c.candidate for i, c in enumerate(state.chosen) if i != j]
    model = search.model(state.components, [])
    session = model.components.session
    suspect = int(candidates[0][0].x.indices[0]) if candidates[0][0].alarm_class == "reading" else -1
    tried = candidates[:MOST_EXPLANATIONS]
    also = [suspect] if suspect >= 0 else []
    if model.long:
        touched = np.unique(np.concatenate([c.x.indices for c, _ in tried])).astype(np.intp)
        also += most_recent(layout, touched, LONG_BATCHES)
        on = most_read_meters(layout, [str(c.subject) for c, _ in tried], LONG_METERS)
        checks = practicable(layout, model.noise, model.batch_sd(), also, on, LONG_BATCHES, session)
    else:
        checks = practicable(layout, model.noise, model.batch_sd(), also, session=session)
    if not checks:
        return None
    names = [name_of(c, amplitude) for c, amplitude in tried]
    predicted = [expected(search, state, [*others, c], checks) for c, _ in tried]
    if len(tried) == 1:
        names.append("")
        predicted.append(absent(*predicted[0], *tried[0], checks))
    means, fixed_part = np.array([m for m, _ in predicted]), np.array([v for _, v in predicted])
    noise = np.array([check.noise for check in checks])
    d = separation(means, fixed_part + noise)
    best = int(np.nanargmax(np.where(np.isfinite(d), d, -1.0)))
    enough = d[best] >= ENOUGH
    return Plan(
        check=checks[best],
        names=tuple(names),
        means=means[:, best],
        spreads=np.asarray(np.sqrt(fixed_part[:, best] + noise[best])),
        d=float(d[best]),
        wrong=float(special.ndtr(-d[best] / 2.0)),
        repeats=1 if enough else repeats(means[:, [best]], fixed_part[:, [best]], float(noise[best])),
    )


def next_check(search: Search, state: State, j: int, candidates: Sequence[tuple[Candidate, float]]) -> str:
    """The sentence that names the next check for the j-th finding; candidates as `plan` takes them."""
    found = plan(search, state, j, candidates)
    return "No check can be named: the record names no meter." if found is None else found.words()


def repeats(means: FloatArray, fixed_part: FloatArray, noise: float) -> int:
    """How many repeats of a check would decide; 0 when none would."""
    for n in range(2, MOST_REPEATS + 1):
        if float(separation(means, fixed_part + noise / n)[0]) >= ENOUGH:
            return n
    return 0
