"""Meters and probes through time, put together: calibrations alone, readings alone, or both."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from reconcile.auditor.agreement import agreement
from reconcile.auditor.calibration_courses import courses_of, crossings_of
from reconcile.auditor.calibration_runs import days_of, runs
from reconcile.auditor.mandel import LEAST_METERS
from reconcile.auditor.meter_readings import between_calibrations, days_since, meter_readings, noise
from reconcile.records.book import BatchRecords
from reconcile.records.meter_results import WHOLE_RECORD, Agreement, Limit, MeterHistory
from reconcile.records.results import Audit
from reconcile.records.settings import BY_NAME, Settings


def limits(settings: Settings) -> tuple[Limit, ...]:
    """Limits of slope and offset as the settings hold them, and the lower slope limit of another text beside them."""

    def of(name: str, quantity: str, side: str, sign: float = 1.0, judged: bool = True) -> Limit:
        setting = BY_NAME[f"meters.{name}"]
        changed = setting.name in settings.changed
        return Limit(
            quantity,
            side,
            sign * float(settings[setting.name]),
            "set by the site" if changed else setting.reason,
            judged,
        )

    found = [
        of("slope_low_percent", "slope", "low"),
        of("slope_high_percent", "slope", "high"),
        of("offset_limit_mv", "offset", "low", -1.0),
        of("offset_limit_mv", "offset", "high"),
    ]
    other = of("other_slope_low_percent", "slope", "low", judged=False)
    return (*found, other) if other.value and other.value != found[0].value else tuple(found)


def meter_history(
    records: BatchRecords, audit: Audit | None, settings: Settings, progress: Callable[[str], None] | None = None
) -> MeterHistory:
    """Everything that calibrations and readings show of each meter and probe through time.

    Parameters
    ----------
    records : the record; audit : the audit of its readings, None where it has none
    progress : told in words what is being done
    """
    say = progress or (lambda _: None)
    say("following calibrations")
    bounds = limits(settings)
    parted = runs(records)
    lines, jumps = courses_of(records, parted, bounds)
    since = days_since(audit) if audit is not None else np.zeros(0)
    seen = meter_readings(audit) if audit is not None else None
    table, readings = records.calibrations, records.readings
    meters = {str(m) for m in (*table["meter"].tolist(), *readings["meter"].tolist())} - {""}
    probes = {str(p) for p in (*table["probe"].tolist(), *readings["probe"].tolist())} - {""}
    say("comparing meters")
    noises = noise(seen) if seen is not None else ()
    compared = agreement(seen, noises) if seen is not None else ()
    return MeterHistory(
        records=records,
        settings=settings,
        audit=audit,
        meters=tuple(sorted(meters)),
        probes=tuple(sorted(probes)),
        limits=bounds,
        lines=lines,
        crossings=crossings_of(lines, records, bounds),
        calibration_steps=jumps,
        between=between_calibrations(audit, seen, since) if audit is not None and seen is not None else (),
        noise=noises,
        agreement=compared,
        days_since=since,
        not_shown=tuple(_not_shown(records, audit, seen is not None, len(meters), compared)),
    )


def _not_shown(
    records: BatchRecords, audit: Audit | None, evidence: bool, meters: int, compared: tuple[Agreement, ...]
) -> list[tuple[str, str]]:
    found = []
    table = records.calibrations
    if not len(table):
        found.append(("slope and offset", "the record holds no calibrations"))
    elif (undated := int(np.isnan(days_of(table["calibrated_at"])).sum())) > 0:
        found.append(("slope and offset", f"{undated} of {len(table)} calibrations have no date and are on no line"))
    if unnamed := sum(not str(m) for m in table["meter"]):
        found.append(("slope and offset", f"{unnamed} of {len(table)} calibrations name no meter"))
    what = "noise, agreement, and residuals between calibrations"
    if audit is None:
        found.append((what, "the record holds no used readings"))
    elif not evidence:
        found.append((what, "no reading on a named meter is evidence"))
    elif meters < LEAST_METERS:
        found.append(
            (
                "agreement of the meters",
                f"h and k are computed from {LEAST_METERS} meters on; of three, one is always about as far off as h "
                "can tell",
            )
        )
    elif all(a.solution == WHOLE_RECORD for a in compared):
        found.append(
            ("agreement on single solutions", f"no solution was read on {LEAST_METERS} meters or more in this record")
        )
    return found
