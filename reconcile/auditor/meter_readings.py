"""What the readings say of each meter: how they go with the days since calibration, their noise, their means.

All three come from the auditor's mixed model, so that lots, batches and constants are allowed for.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy import sparse

from reconcile.auditor import laws
from reconcile.auditor.calibration_runs import days_of
from reconcile.auditor.components import Components
from reconcile.auditor.layout import Layout, build_layout, one_hot
from reconcile.auditor.mixed import estimate, model_of
from reconcile.auditor.robust import HUBER, HUBER_MEAN
from reconcile.records.arrays import FloatArray
from reconcile.records.meter_results import BetweenCalibrations, MeterNoise
from reconcile.records.results import Audit, Finding

LEAST_READINGS = 5
LEAST_DAYS = 0.5
"""Spread of days since calibration from which on a rate between calibrations is asked for."""
LEAST_DF = 3.0
OF_METERS = ("meter", "probe", "calibration", "buffer")


@dataclass(frozen=True)
class MeterReadings:
    """The evidence of a record and its variance components.

    quiet : FloatArray (n,) residuals of the layout's rows with all findings taken out [pH]
    of_meters : FloatArray (n,) with the findings about meters left in
    """

    layout: Layout
    components: Components
    quiet: FloatArray
    of_meters: FloatArray


def without(audit: Audit, taken_out: Callable[[Finding], bool]) -> FloatArray:
    """Residuals of all readings without what some findings account for, (n,) [pH]."""
    left: FloatArray = audit.residual.copy()
    for finding in audit.findings:
        if taken_out(finding) and len(finding.shift) == len(finding.readings):
            left[finding.readings] -= np.where(np.isfinite(finding.shift), finding.shift, 0.0)
    return left


def meter_readings(audit: Audit) -> MeterReadings | None:
    """The evidence of an audited record as the model sees it; None where no reading is evidence."""
    layout = build_layout(audit.records, audit.prediction, audit.settings, audit.evidence)
    if not len(layout) or not layout.meters:
        return None
    quiet = without(audit, lambda f: True)[layout.reading]
    components = estimate(layout, audit.settings, r=quiet)
    return MeterReadings(
        layout, components, quiet, without(audit, lambda f: f.subject_type not in OF_METERS)[layout.reading]
    )


def days_since(audit: Audit) -> FloatArray:
    """Days from the meter's last calibration to each reading, (n,); NaN where either is not known."""
    readings, table = audit.records.readings, audit.records.calibrations
    since = np.full(len(readings), np.nan)
    if not len(table):
        return since
    at, day = days_of(readings["read_at"]), days_of(table["calibrated_at"])
    named = np.array([str(m) for m in table["meter"]], object)
    meter = np.array([str(m) for m in readings["meter"]], object)
    for name in sorted(set(named.tolist()) - {""}):
        calibrated = np.sort(day[(named == name) & np.isfinite(day)])
        mine = np.flatnonzero((meter == name) & np.isfinite(at))
        before = np.searchsorted(calibrated, at[mine], side="right") - 1
        mine, before = mine[before >= 0], before[before >= 0]
        since[mine] = at[mine] - calibrated[before]
    return since


def between_calibrations(audit: Audit, seen: MeterReadings, since: FloatArray) -> tuple[BetweenCalibrations, ...]:
    """Rate of every meter's residuals against the days since its calibration [pH/day].

    Notes
    -----
    Generalised least squares with the record's covariance: session, lot, constant, preparation and noise, the level of
    each meter free. Findings about anything but this are taken out first; a drift finding is left in.
    """
    layout = seen.layout
    r = without(audit, lambda f: f.kind != "meter_drift")[layout.reading]
    x = since[layout.reading]
    model = model_of(layout, seen.components, fixed=one_hot(layout.meter, len(layout.meters)), r=r)
    found = []
    for index, name in enumerate(layout.meters):
        rows = np.flatnonzero((layout.meter == index) & np.isfinite(x))
        sessions = len(set(layout.session[rows].tolist()))
        longest = float(x[rows].max()) if len(rows) else float("nan")
        reason = _why_no_rate(audit, name, x[rows])
        if reason:
            nothing = (float("nan"), float("nan"))
            found.append(BetweenCalibrations(name, len(rows), sessions, longest, float("nan"), nothing, reason))
            continue
        column = sparse.csc_array((x[rows], (rows, np.zeros(len(rows), np.intp))), shape=(len(layout), 1))
        information = float(model.quadratic(column)[0])
        rate = float(x[rows] @ model.pr[rows]) / information
        df = max(len(rows) - sessions - 1, 1)
        half = float(laws.t_isf(0.025, df) / np.sqrt(information))
        found.append(BetweenCalibrations(name, len(rows), sessions, longest, rate, (rate - half, rate + half)))
    return tuple(found)


def _why_no_rate(audit: Audit, meter: str, x: FloatArray) -> str:
    if not any(str(m) == meter for m in audit.records.calibrations["meter"]):
        return "no calibration of it is recorded"
    if len(x) < LEAST_READINGS:
        return f"only {len(x)} dated readings after a calibration"
    if float(np.ptp(x)) < LEAST_DAYS:
        return "its readings all lie equally long after a calibration"
    return ""


def noise(seen: MeterReadings) -> tuple[MeterNoise, ...]:
    """Standard deviation of every meter's own reading noise [pH], with its 95 % interval.

    Notes
    -----
    From the residuals that the model leaves, bounded (Huber) so that single wild readings do not make a meter noisy;
    the interval is that of chi-squared with the meter's effective degrees of freedom (readings less what sessions,
    batches and lots take up).
    """
    layout = seen.layout
    model = model_of(layout, seen.components, r=seen.quiet)
    p = model.diagonal()
    share = model.noise * p
    z2 = np.minimum(model.pr**2 / np.maximum(p, 1e-12), HUBER**2) / HUBER_MEAN
    found = []
    for index, name in enumerate(layout.meters):
        rows = np.flatnonzero(layout.meter == index)
        df = float(share[rows].sum())
        if df < LEAST_DF:
            nothing = (float("nan"), float("nan"))
            reason = "its readings leave too little to tell noise from batch and session"
            found.append(MeterNoise(name, len(rows), float("nan"), nothing, df, reason))
            continue
        variance = float(model.noise[rows[0]] * layout.averaged[rows[0]] * (share[rows] * z2[rows]).sum() / df)
        low, high = (variance * df / float(laws.chi2_isf(tail, df)) for tail in (0.025, 0.975))
        found.append(MeterNoise(name, len(rows), variance**0.5, (low**0.5, high**0.5), df))
    return tuple(found)


def meter_means(seen: MeterReadings) -> FloatArray:
    """Mean deviation of every meter from the predictions, (meters,) [pH], everything else allowed for.

    Notes
    -----
    Generalised least squares with the meters' own priors dropped, findings about other subjects taken out.
    """
    layout = seen.layout
    effects = layout.effects["meter"]
    model = model_of(layout, seen.components, own_dropped=tuple(range(effects.first, effects.last)), r=seen.of_meters)
    x = one_hot(layout.meter, len(layout.meters))
    inner = np.asarray(x.T @ model.project(x.toarray()), float)
    return np.asarray(np.linalg.solve(inner, x.T @ model.pr), float)
