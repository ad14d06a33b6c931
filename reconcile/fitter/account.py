"""What the fit says in words: the conclusion, and the cautions with their short names."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from reconcile.fitter.checks import bent, disagreement
from reconcile.fitter.common_errors import extended
from reconcile.fitter.evidence import Evidence
from reconcile.fitter.gaps import composition
from reconcile.fitter.meters import SuspectMeter
from reconcile.fitter.question import Studied
from reconcile.fitter.sought import Outcome
from reconcile.fitter.step_results import LIMIT_CORRELATION, Judged, correlation
from reconcile.fitter.wording import REASONS, constant_name, counted, figure, listed, say, uncertainty
from reconcile.records.arrays import FloatArray, IntArray
from reconcile.records.pka_results import Gap, Nuisance, PkaCandidate, PkaQuestion, PkaStep

FEW = 5
SPAN = 0.5
HALF = (45.0, 55.0)
"""Percent neutralised between which a reading counts as at half neutralisation."""
MOST_GAPS = 3
MOST_ALIKE = 3
ALONE = 0.9
"""Leverage from which a reading decides a parameter by itself."""
PLAIN = 0.05
"""Largest strong base per acid of a plain dilution [mol/mol]."""
Said = list[tuple[str, str]]
"""Short name and sentence."""


@dataclass(frozen=True)
class Account:
    """Sentences by what they are about, as in PkaFit."""

    values: tuple[str, ...]
    cautions: tuple[str, ...]
    gap_words: tuple[str, ...]
    ranking: tuple[str, ...]
    flags: tuple[str, ...]


def account(
    judged: Judged,
    best: Outcome,
    studied: Studied,
    question: PkaQuestion,
    steps: Sequence[PkaStep],
    strength: Nuisance,
    offset: Nuisance,
    aicc: dict[int, float],
    ranked: Sequence[PkaCandidate],
    gaps: Sequence[Gap],
    degrees: FloatArray,
    doubted: Sequence[SuspectMeter],
    every: Evidence,
) -> Account:
    """Everything that the fit says in words, and the short names of what was flagged."""
    warm = judged.evidence.temperature
    values = [_of_step(step, len(steps), (float(warm.min()), float(warm.max()))) for step in steps]
    values += [_of_nuisance(one) for one in (strength, offset) if one.sought]
    if aicc:
        listed_aicc = ", ".join(
            f"{n}: {figure(v, 1) if np.isfinite(v) else 'too few readings'}" for n, v in aicc.items()
        )
        number = len(steps)
        values.append(say("steps", count=f"{number} step{'s' if number > 1 else ''}", values=listed_aicc))
    said = [
        *_identifiability(judged, steps, degrees),
        *_of_readings(judged, best, every, doubted, steps),
        *_of_scatter(judged, best),
    ]
    ranking = _of_candidates(ranked, studied)
    told = [_of_gap(gap, len(steps)) for gap in gaps[:MOST_GAPS]]
    flags = [name for name, _ in said if name not in ("dilute", "left_out")]
    flags += ["not_identifiable"] * any(step.standing == "not_identifiable" for step in steps)
    flags += ["not_identifiable"] * any(one.sought and not one.identifiable for one in (strength, offset))
    own = next((one for one in ranked if one.acid == studied.acid), None)
    if studied.known and any(step.standing == "found" for step in steps) and (own is None or not own.explains):
        flags.append("differs_from_library")
    return Account(
        tuple(dict.fromkeys(values)),
        tuple(sentence for _, sentence in said),
        tuple(told),
        tuple(ranking),
        tuple(dict.fromkeys(flags)),
    )


def _of_step(step: PkaStep, count: int, temperatures: tuple[float, float]) -> str:
    name = constant_name(step.step, count)
    if step.pka is None or step.u is None or step.interval95 is None or step.pka_apparent is None:
        return step.relation
    parts = [
        say(
            "found", name=name, value=figure(step.pka), temperature=figure(step.temperature_c, 1),
            u=uncertainty(step.u), low=figure(step.interval95[0]), high=figure(step.interval95[1]),
            apparent=figure(step.pka_apparent), strength=f"{step.ionic_strength or 0.0:.3g}",
        )
    ]  # fmt: skip
    if step.dh_origin == "fitted" and step.dh_kj_mol is not None and step.u_dh is not None:
        of = "ionization" if count == 1 else f"step {step.step}"
        low, high = (f"{t:.3g}" for t in temperatures)
        parts.append(
            say("enthalpy", step=of, value=figure(step.dh_kj_mol, 1), u=f"{step.u_dh:.2g}", low=low, high=high)
        )
    if step.pka_25c is None:
        parts.append(say("no-25", temperature=figure(step.temperature_c, 1)))
    elif abs(step.temperature_c - 25.0) > 0.05 and step.u_25c is not None:
        origin = "the fitted enthalpy" if step.dh_origin == "fitted" else "the library's enthalpy"
        parts.append(say("at-25", name=name, value=figure(step.pka_25c), u=uncertainty(step.u_25c), origin=origin))
    return " ".join(parts)


def _of_nuisance(one: Nuisance) -> str:
    if one.value is None or one.u is None:
        return say(f"{one.name}-unknown")
    return say(f"{one.name}-found", value=figure(one.value), u=uncertainty(one.u))


def _identifiability(judged: Judged, steps: Sequence[PkaStep], degrees: FloatArray) -> Said:
    """What these readings cannot tell, beside what each step says itself."""
    shape, fitted = judged.shape, judged.fitted
    kept, out = fitted.data.kept, []
    observed = judged.evidence.observed[kept]
    also = np.zeros(shape.size, bool)
    also[shape.strength] = True
    _, base = composition(judged.evidence)
    plain = bool(np.all(np.abs(base[kept]) <= PLAIN))
    if not fitted.free[0, shape.strength]:
        covariance = extended(judged.evidence, fitted, also)
        for step in np.flatnonzero(fitted.seen[0, shape.pka]).tolist():
            if abs(correlation(covariance, step, shape.strength)) >= LIMIT_CORRELATION:
                slope = covariance[step, shape.strength] / covariance[shape.strength, shape.strength]
                name, key = constant_name(step + 1, shape.steps), "ka-times-c" if plain else "rests-on-strength"
                out.append((key.replace("-", "_"), say(key, name=name, move=f"{abs(slope) * 0.01:.4f}")))
    if not plain:
        for one in steps:
            percent = 100.0 * degrees[kept, one.step - 1]
            if one.standing != "held" and (percent.max() < HALF[0] or percent.min() > HALF[1]):
                name = constant_name(one.step, len(steps))
                low, high = f"{percent.min():.0f}", f"{percent.max():.0f}"
                out.append(("one_side", say("one-side", step=str(one.step), low=low, high=high, name=name)))
    if len(observed) > 1 and float(np.ptp(observed)) < SPAN:
        out.append(("span", say("span", span=f"{np.ptp(observed):.2f}")))
    return out


def _of_readings(
    judged: Judged, best: Outcome, every: Evidence, doubted: Sequence[SuspectMeter], steps: Sequence[PkaStep]
) -> Said:
    """Few readings, those rejected or left out, meters in doubt."""
    fitted, evidence, out = judged.fitted, judged.evidence, []
    kept = fitted.data.kept
    count = int(kept.sum())
    if count < FEW:
        out.append(("few", say("few", count=counted(count))))
    rejected = np.flatnonzero(~kept)
    if len(rejected):
        values = [
            f"{constant_name(s.step, len(steps))} would be {figure(s.with_all[0])} "
            f"(u of the readings {uncertainty(s.with_all[1])})"
            for s in steps
            if s.with_all is not None
        ]
        sentence = say(
            "rejected", count=counted(len(rejected)), places=_places(evidence, rejected),
            values=listed(values) or "no constant would be found either",
        )  # fmt: skip
        out.append(("rejected", sentence))
    alone = np.flatnonzero(kept & (np.nan_to_num(fitted.leverage) > ALONE))
    if len(alone) and count >= FEW:
        verb = "carries" if len(alone) == 1 else "each carry part of"
        sentence = say("leverage", places=_places(evidence, alone), verb=verb, limit=f"{ALONE:g}")
        out.append(("leverage", sentence))
    step = int(np.argmax(fitted.seen[0, judged.shape.pka]))
    weight = np.where(kept, 1.0 / fitted.data.variance, 0.0)
    spread = fitted.covariance[0] @ (fitted.jacobian * weight[:, None]).T
    for meter in doubted:
        mine = (evidence.records.readings["meter"][evidence.index] == meter.meter).astype(float)
        by = float(spread[step] @ mine)
        name = constant_name(step + 1, judged.shape.steps)
        free = bool(fitted.free[0, judged.shape.offset])
        how = "not at all, as it was set free" if free else f"{figure(by, 2)} times"
        out.append(("meter", say("meter", meter=meter.meter, reason=meter.reason, name=name, how=how)))
    left_out = Counter(s for s in every.status.tolist() if s != "used")
    if left_out:
        reasons = ", ".join(f"{n} {REASONS[s]}" for s, n in sorted(left_out.items()))
        out.append(("left_out", say("left-out", count=counted(sum(left_out.values())), reasons=reasons)))
    limit = float(evidence.settings["status.electrode_low_ionic_strength"])
    dilute = int(np.count_nonzero(judged.ionic_strength[kept] < limit))
    if dilute:
        out.append(("dilute", say("dilute", count=counted(dilute), limit=f"{limit:g}")))
    return out


def _places(evidence: Evidence, rows: IntArray) -> str:
    """Where some readings stand."""
    records = evidence.records
    return "; ".join(records.place(records.readings, int(i)).words() for i in evidence.index[rows].tolist())


def _of_scatter(judged: Judged, best: Outcome) -> Said:
    """What the residuals themselves say."""
    fitted, out = judged.fitted, []
    count = int(fitted.data.kept.sum())
    given = bool(best.task.scatter.known_in(best.task.cases)[0])
    if not given and not np.isfinite(fitted.freedom[0]):
        out.append(("no_scatter", say("no-scatter", noise=f"{fitted.sigma[0]:.2g}")))
    if not bool(fitted.converged[0]):
        out.append(("not_settled", say("not-settled")))
    if fitted.scale[0] > 1.0:
        out.append(("noise_larger", say("noise-larger", ratio=f"{fitted.scale[0]:.1f}")))
    if count > FEW and bent(judged.evidence, fitted):
        out.append(("bent", say("bent")))
    apart = disagreement(judged.evidence, fitted)
    if apart is not None:
        side = "above" if apart.apart > 0.0 else "below"
        out.append(("series", say("series", group=apart.group, apart=f"{abs(apart.apart):.3f}", side=side)))
    return out


def _of_candidates(ranked: Sequence[PkaCandidate], studied: Studied) -> list[str]:
    if not ranked:
        return []
    good = [one for one in ranked if one.explains]
    if not good:
        return [say("none-explains", acid=ranked[0].acid, ratio=figure(ranked[0].log_likelihood_ratio, 1))]
    rest = [one.acid for one in good[1 : 1 + MOST_ALIKE]]
    others = f"; so would {listed(rest)}" if rest else ""
    if len(good) > 1 + MOST_ALIKE:
        others = f"; so would {', '.join(rest)} and {len(good) - 1 - MOST_ALIKE} more"
    return [
        say(
            "explains", acids=good[0].acid, verb="explains", ratio=figure(good[0].log_likelihood_ratio, 1),
            others=others,
        )
    ]  # fmt: skip


def _of_gap(gap: Gap, count: int) -> str:
    name = constant_name(gap.step, count)
    if gap.before is None:
        change = say("gap-closes", name=name, after=f"{gap.after:.2g}")
    else:
        change = say("gap-shrinks", name=name, before=f"{gap.before:.2g}", after=f"{gap.after:.2g}")
    return say("gap", low=f"{gap.low:.0f}", high=f"{gap.high:.0f}", step=str(gap.step), change=change)
