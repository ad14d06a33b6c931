"""The door of the room: the constants of one acid from the readings of a record."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np

from reconcile.chemistry.composition import CARBONIC
from reconcile.fitter.account import account
from reconcile.fitter.apparent import apparent_shift, neutralised
from reconcile.fitter.candidates import candidates
from reconcile.fitter.checks import series_alone
from reconcile.fitter.common_errors import budget, common_errors
from reconcile.fitter.evidence import Evidence, evidence
from reconcile.fitter.gaps import composition, gaps, may_be_told
from reconcile.fitter.lines import fitted_curves, profiles, species
from reconcile.fitter.meters import suspects
from reconcile.fitter.model import Found, found_at
from reconcile.fitter.profile import Interval, interval, reach
from reconcile.fitter.question import Studied, refusal, understood
from reconcile.fitter.sought import Outcome, compared, outcome, structure
from reconcile.fitter.step_results import Judged, nuisance, steps
from reconcile.fitter.wording import REASONS
from reconcile.records.arrays import FloatArray
from reconcile.records.book import BatchRecords
from reconcile.records.pka_results import PkaFit, PkaQuestion
from reconcile.records.results import Constant, Hazard
from reconcile.records.settings import Settings
from reconcile.records.substances import Form

Progress = Callable[[str, float | None], None]


ALIKE, DOUBTFUL = 2.0, 10.0
"""By how much a further step must lower AICc: differences to 2 leave the simpler model substantial support, beyond 10
none (Burnham and Anderson 2002, Model Selection and Multimodel Inference, section 2.6). The larger one is asked of a
step whose constant the readings do not tell."""


def fit_pka(
    records: BatchRecords, question: PkaQuestion, settings: Settings, progress: Progress | None = None
) -> PkaFit:
    """Ionization constants of one acid from the readings of every solution that holds it.

    Parameters
    ----------
    records : BatchRecords
        The record; read with the unfamiliar acid among its substances (`understood(question).names`), where it is one.
    question : PkaQuestion
    settings : Settings
    progress : callable, optional
        Told what is being done and the share of the whole that is done.

    Returns
    -------
    PkaFit

    Raises
    ------
    InputProblems
        The question contradicts itself or the library, or no reading bears on it.

    Notes
    -----
    Weighted nonlinear least squares on the prediction engine, all readings together, with slopes by implicit
    differentiation; noise estimated with a floor; intervals by profile likelihood; readings rejected only by a
    family-wise test at 1 %; number of steps by AICc where it is neither given nor known.

    References
    ----------
    Bates and Watts 1988, Nonlinear Regression Analysis and Its Applications; JCGM 100:2008; see each part for its own.
    """
    say = progress or (lambda doing, share: None)
    studied = understood(question, settings, records.own)
    say("gathering the readings", 0.3)
    every = evidence(records, settings, studied.table(studied.numbers[-1]), studied.acid, question.noise)
    _check(every, studied, question)
    say("fitting", 0.4)
    best, aicc = _chosen(every, studied, question)
    found = _found(every.only(every.status == "used"), best)
    beyond = found.ionic_strength > settings["status.outside_model_ionic_strength"]
    if beyond.any():
        status = every.status.copy()
        status[np.flatnonzero(every.status == "used")[beyond]] = "outside_model"
        every = replace(every, status=status)
        _check(every, studied, question)
        best, aicc = _chosen(every, studied, question)
    say("judging the fit", 0.6)
    return _told(every, studied, question, best, aicc, say)


def _check(every: Evidence, studied: Studied, question: PkaQuestion) -> None:
    """Refuses what holds no answer."""
    if studied.acid == CARBONIC and every.settings["prediction.open_to_air"]:
        raise refusal("pka-open-air", question.acid)
    if not len(every):
        alike = () if studied.known else studied.library_names.look_up(question.acid).near
        near = f" (near it in the library: {', '.join(alike)})" if alike else ""
        raise refusal("pka-not-in-record", question.acid, near=near)
    own = every.medium.place[every.cases.form] >= 0
    if studied.form is not None and question.molar_mass is None and np.any(~np.isfinite(every.cases.amount[own])):
        raise refusal("pka-molar-mass", question.acid)
    if not np.any(every.status == "used"):
        counts = Counter(every.status.tolist())
        why = ", ".join(f"{n} {REASONS[s]}" for s, n in sorted(counts.items()))
        raise refusal("pka-no-reading", question.acid, count=str(len(every)), why=why)


def _chosen(every: Evidence, studied: Studied, question: PkaQuestion) -> tuple[Outcome, dict[int, float]]:
    """The fit with the number of steps of least AICc, and AICc by number where there was a choice."""
    used = every.only(every.status == "used")
    tried: dict[int, Outcome] = {}
    for number in studied.numbers:
        plan = structure(used, studied, number, question.free)
        unknowns = int(plan.free.sum())
        if unknowns > len(used):
            if number == studied.numbers[0]:
                names = ["constants", *question.free] + (["enthalpies"] if plan.free[plan.shape.dh].any() else [])
                raise refusal("pka-too-few", count=str(len(used)), unknowns=str(unknowns), names=" and ".join(names))
            continue
        tried[number] = outcome(used, studied, plan)
    aicc = compared(tried)
    number = min(tried)
    for further, one in list(tried.items())[1:]:
        needed = ALIKE if _tells_all(one) else DOUBTFUL
        if not np.isfinite(aicc[number]) or aicc[further] < aicc[number] - needed:
            number = further if np.isfinite(aicc[further]) else number
    return tried[number], aicc if len(studied.numbers) > 1 else {}


def _tells_all(one: Outcome) -> bool:
    """Whether every constant of a fit has a closed interval about it."""
    pka = range(one.structure.shape.steps)
    if not all(bool(one.fitted.seen[0, j]) for j in pka):
        return False
    ends = [interval(one.task, one.fitted, j) for j in pka]
    return all(bool(np.isfinite(end.low[0]) and np.isfinite(end.high[0])) for end in ends)


def _found(used: Evidence, best: Outcome) -> Found:
    return found_at(used.medium, used.cases, best.structure.shape, best.fitted.theta)


def _told(
    every: Evidence,
    studied: Studied,
    question: PkaQuestion,
    best: Outcome,
    aicc: dict[int, float],
    say: Progress,
) -> PkaFit:
    used = every.only(every.status == "used")
    shape, fitted, task = best.structure.shape, best.fitted, best.task
    acids = used.acids
    found = _found(used, best)
    errors = common_errors(used, found, shape, acids, fitted.seen[0], studied.known)
    shares = budget(used, fitted, errors)
    intervals = tuple(interval(task, fitted, j) if fitted.free[0, j] else _none() for j in range(shape.steps))
    judged = Judged(used, shape, fitted, best.whole, shares, intervals, found.ionic_strength, acids, studied.known)
    results = steps(judged)
    strength, offset = nuisance(judged, "strength"), nuisance(judged, "offset")
    say("trying the acids of the library", 0.75)
    free = [fitted.jacobian[:, j] for j in (shape.strength, shape.offset) if fitted.free[0, j]]
    sought = sum(step.standing == "found" for step in results) or int(fitted.free[0, shape.pka].sum())
    ranked = candidates(used, fitted, errors, free, sought, studied.library)
    shift = apparent_shift(used.medium.model, shape.charge, shape.steps, used.temperature, found.ionic_strength)
    degrees = neutralised(found.ph, fitted.theta[0, shape.pka] + shift)
    forms = _forms(used)
    missing = gaps(used, fitted, shape, degrees, intervals) if may_be_told(forms) else ()
    doubted = suspects(used, acids, float(max(fitted.sigma[0], used.floor.min())))
    say("wording", 0.9)
    said = account(
        judged, best, studied, question, results, strength, offset, aicc, ranked, missing, degrees, doubted, every
    )
    return PkaFit(
        records=every.records,
        settings=every.settings,
        question=question,
        acid=studied.acid,
        in_library=studied.known,
        formula_words=studied.words,
        steps=results,
        strength=strength,
        offset=offset,
        steps_chosen=aicc,
        noise=float(np.sqrt(np.median(fitted.data.variance - task.scatter.taking))),
        noise_origin=_noise_origin(best),
        freedom=float(fitted.freedom[0]),
        **_arrays(every, best),
        candidates=ranked,
        gaps=missing,
        series=series_alone(used, task, fitted),
        values=said.values,
        cautions=said.cautions,
        gap_words=said.gap_words,
        ranking=said.ranking,
        flags=said.flags,
        hazards=_hazards(forms),
        constants=_constants(forms, studied),
        curves=fitted_curves(used, shape, fitted),
        profiles=profiles(task, fitted, intervals),
        species=species(used, shape, fitted, float(np.mean(found.ionic_strength[fitted.data.kept]))),
        reach95=float(reach(fitted)[0]),
    )


def _none() -> Interval:
    return Interval(np.array([-np.inf]), np.array([np.inf]))


def _noise_origin(best: Outcome) -> str:
    fitted, scatter = best.fitted, best.task.scatter
    if bool(scatter.known_in(best.task.cases)[0]):
        return "given"
    if not np.isfinite(fitted.freedom[0]):
        return "assumed"
    return "estimated" if float(fitted.sigma[0]) > float(np.min(scatter.floor)) else "floor"


def _arrays(every: Evidence, best: Outcome) -> dict[str, Any]:
    """The columns of the readings, those that took no part with their fitted value where there is one."""
    shape, fitted = best.structure.shape, best.fitted
    n = len(every)
    found = found_at(every.medium, every.cases, shape, fitted.theta)
    used = np.flatnonzero(every.status == "used")
    status = every.status.copy()
    status[used[~fitted.data.kept]] = "rejected"

    def spread(values: FloatArray) -> FloatArray:
        whole = np.full(n, np.nan)
        whole[used] = values
        return whole

    ph = found.ph + float(fitted.theta[0, shape.offset])
    shift = apparent_shift(every.medium.model, shape.charge, shape.steps, every.temperature, found.ionic_strength)
    acid, base = composition(every)
    return {
        "index": every.index,
        "status": status,
        "observed": every.observed,
        "fitted": ph,
        "residual": every.observed - ph,
        "u_reading": spread(np.sqrt(fitted.data.variance)),
        "leverage": spread(fitted.leverage),
        "studentised": spread(fitted.deleted),
        "temperature": every.temperature,
        "ionic_strength": found.ionic_strength,
        "neutralised": neutralised(found.ph, fitted.theta[0, shape.pka] + shift).mean(axis=1),
        "base": base,
        "concentration": acid,
    }


def _forms(used: Evidence) -> list[Form]:
    """Substances of the fitted solutions, in order of the record."""
    return [used.records.forms[f] for f in np.unique(used.cases.form).tolist()]


def _hazards(forms: list[Form]) -> tuple[Hazard, ...]:
    return tuple(Hazard("hazard", form.name, "substance", form.name, form.hazard, form.gas_with_acid) for form in forms)


def _constants(forms: list[Form], studied: Studied) -> tuple[Constant, ...]:
    """The library's constants that the fit met: those of the other acids, and of the studied one where it is known."""
    table = studied.table(studied.numbers[-1])
    names = dict.fromkeys(acid for form in forms for acid in form.acids)
    return tuple(
        Constant(row.acid, row.step, row.pka, row.u, row.dh_kj_mol, row.dcp_j_k_mol, row.source)
        for acid in names
        if acid != studied.acid or studied.known
        for row in table.of(acid)
    )
