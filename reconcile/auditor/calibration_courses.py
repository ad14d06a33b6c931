"""Lines, unlogged steps and crossing dates of every run of calibrations, in the order of the report."""

from __future__ import annotations

import itertools
from collections.abc import Sequence

import numpy as np

from reconcile.auditor.calibration_lines import Dates, Fit, crossing, fit_line
from reconcile.auditor.calibration_runs import Run, days_of, time_of
from reconcile.auditor.calibration_steps import Jump, places, steps
from reconcile.records.arrays import BoolArray, FloatArray, IntArray
from reconcile.records.book import BatchRecords
from reconcile.records.meter_results import QUANTITIES, CalibrationStep, Crossing, Limit, Line

MONTH = 30.0
"""Rates are told per 30 days."""
UNLOGGED = "a step that no logged event explains"
HORIZON = 2.0
"""Lines are followed beyond the last calibration by this many lengths of their calibrations, and no further."""
NAN = float("nan")


def _values(records: BatchRecords, run: Run, quantity: str) -> tuple[IntArray, FloatArray, FloatArray]:
    """Rows, days and values of a run's calibrations that state a quantity."""
    y = np.asarray(records.calibrations[quantity][run.rows], float)
    known = np.isfinite(y)
    return run.rows[known], run.day[known], y[known]


def courses_of(
    records: BatchRecords, parted: Sequence[Run], limits: Sequence[Limit]
) -> tuple[tuple[Line, ...], tuple[CalibrationStep, ...]]:
    """The lines of every run, parted further at unlogged steps, and those steps."""
    trials = sum(len(places(_values(records, run, q)[1])) for run in parted for q in QUANTITIES)
    lines: list[Line] = []
    jumps: list[CalibrationStep] = []
    for run in parted:
        for quantity in QUANTITIES:
            rows, day, y = _values(records, run, quantity)
            found = steps(day, y, trials)
            cuts = [0, *(j.position for j in found), len(rows)]
            for part, (first, last) in enumerate(itertools.pairwise(cuts)):
                begun = run.begun_by if part == 0 else UNLOGGED
                latest = run.latest and last == len(rows)
                own = slice(first, last)
                lines.append(_line(run, quantity, begun, rows[own], day[own], y[own], latest, limits))
            jumps += [_step(run, quantity, j, trials) for j in found]
    return tuple(lines), tuple(jumps)


def _line(
    run: Run,
    quantity: str,
    begun: str,
    rows: IntArray,
    day: FloatArray,
    y: FloatArray,
    latest: bool,
    limits: Sequence[Limit],
) -> Line:
    fit = fit_line(day, y)
    ends = (time_of(float(day[0])), time_of(float(day[-1]))) if len(day) else (time_of(NAN), time_of(NAN))
    beyond = int(np.count_nonzero(outside(quantity, y, limits)))
    if isinstance(fit, str):
        return Line(
            run.subject, run.subject_type, run.probe, quantity, begun, rows, *ends, time_of(NAN),
            NAN, NAN, (NAN, NAN), NAN, (NAN, NAN), NAN, NAN, beyond, latest, fit,
        )  # fmt: skip
    return Line(
        run.subject,
        run.subject_type,
        run.probe,
        quantity,
        begun,
        rows,
        *ends,
        time_of(fit.middle),
        fit.level,
        fit.rate * MONTH,
        (fit.rate95[0] * MONTH, fit.rate95[1] * MONTH),
        fit.robust * MONTH,
        (fit.robust95[0] * MONTH, fit.robust95[1] * MONTH),
        fit.sd,
        fit.at(float(day[-1])),
        beyond,
        latest,
    )


def outside(quantity: str, y: FloatArray, limits: Sequence[Limit]) -> BoolArray:
    """Which values lie beyond a limit of the settings, (n,)."""
    beyond = np.zeros(len(y), bool)
    for limit in limits:
        if limit.judged and limit.quantity == quantity:
            beyond |= y < limit.value if limit.side == "low" else y > limit.value
    return beyond


def _step(run: Run, quantity: str, jump: Jump, trials: int) -> CalibrationStep:
    return CalibrationStep(
        run.subject,
        run.subject_type,
        run.probe,
        quantity,
        jump.size,
        jump.interval95,
        time_of(jump.earliest),
        time_of(jump.latest),
        min(jump.p * trials, 1.0),
    )


def crossings_of(lines: Sequence[Line], records: BatchRecords, limits: Sequence[Limit]) -> tuple[Crossing, ...]:
    """When the latest line of each subject crosses the limits that it moves towards."""
    found = []
    for line in lines:
        if not line.latest or line.reason:
            continue
        y = np.asarray(records.calibrations[line.quantity][line.calibration], float)
        fit = fit_line(days_of(records.calibrations["calibrated_at"][line.calibration]), y)
        if not isinstance(fit, Fit) or fit.rate == 0:
            continue
        side = "low" if fit.rate < 0 else "high"
        found += [_cross(line, fit, x) for x in limits if x.quantity == line.quantity and x.side == side]
    return tuple(found)


def _cross(line: Line, fit: Fit, limit: Limit) -> Crossing:
    first, last = (float(d) for d in days_of(np.array([line.first, line.last])))
    dates = crossing(fit, limit.value)
    end = last + HORIZON * (last - first)
    beyond = fit.at(last) < limit.value if limit.side == "low" else fit.at(last) > limit.value
    ahead = dates.at > last if dates.told else not beyond
    at = dates.at if first <= dates.at <= end else NAN
    early = max(dates.earliest, first) if dates.earliest <= end else NAN
    late = dates.latest if dates.latest <= end else NAN
    return Crossing(
        line.subject,
        line.subject_type,
        line.probe,
        line.quantity,
        limit,
        time_of(np.floor(at)),
        time_of(np.floor(early)),
        time_of(np.ceil(late)),
        bool(ahead),
        f"{line.subject_type.capitalize()} {line.subject}: its {line.quantity} "
        + _in_words(line, limit, dates, (first, end), bool(beyond)),
    )


def _in_words(line: Line, limit: Limit, dates: Dates, drawn: tuple[float, float], beyond: bool) -> str:
    """The course of a line and when it crosses a limit, in words."""
    first, end = drawn
    unit = QUANTITIES[line.quantity]
    course = f"goes by {_number(line.rate, '+.3g')} {unit} in 30 days"
    bound = f"{_number(limit.value, 'g')} {unit}"
    now = f" The line lies beyond {bound} at the last calibration." if beyond else ""
    if not dates.told:
        early = f", but not before {_day(dates.earliest)} at 95 % confidence" if dates.earliest <= end else ""
        return f"{course}, with an interval that holds zero: no date of crossing {bound} is given{early}.{now}"
    if dates.earliest > end:
        return f"{course}; the line does not reach {bound} before {_day(end)}, the last date that is looked at."
    if dates.latest < first:
        return f"{course}; the line lies beyond {bound} from the first calibration on."
    low = _day(dates.earliest) if dates.earliest >= first else f"before {_day(first)}"
    high = _day(np.ceil(dates.latest)) if dates.latest <= end else f"after {_day(end)}"
    when = f"about {_day(dates.at)}" if first <= dates.at <= end else ("after " if dates.at > end else "before ")
    if when.endswith(" "):
        when += _day(end if dates.at > end else first)
    return f"{course}; the line {'crossed' if beyond else 'crosses'} {bound} {when} (95 % interval {low} to {high})."


def _number(value: float, form: str) -> str:
    return format(value, form).replace("-", "−")


def _day(day: float) -> str:
    return str(time_of(day))[:10]
