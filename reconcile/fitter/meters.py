"""Meters that are themselves suspect: by their other readings in the record, and by their calibrations."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.composition import Contents, form_table
from reconcile.chemistry.engine import run
from reconcile.chemistry.uncertainty import ROOT3
from reconcile.fitter.cases import Cases
from reconcile.fitter.common_errors import meter_accuracy
from reconcile.fitter.evidence import Evidence, holds, layout
from reconcile.records.arrays import FloatArray, IntArray

LEAST = 2
"""Readings of other solutions from which on a meter is judged by them."""
U_CERTIFICATE = 0.01
SIGMAS = 3.0


@dataclass(frozen=True)
class SuspectMeter:
    """A meter and the reason to doubt it. offset : mean of its other residuals [pH], NaN where a calibration tells."""

    meter: str
    offset: float
    u: float
    readings: int
    reason: str


def suspects(evidence: Evidence, acids: AcidTable, noise: float) -> tuple[SuspectMeter, ...]:
    """Meters of the fitted readings that read other solutions, or calibrate, worse than their accuracy allows.

    acids : constants with their uncertainties; noise : standard deviation of a reading [pH]
    """
    used = dict.fromkeys(evidence.records.readings["meter"][evidence.index].tolist())
    found = [*_by_readings(evidence, acids, noise, [m for m in used if m]), *_by_calibration(evidence, list(used))]
    return tuple(found)


def _by_readings(evidence: Evidence, acids: AcidTable, noise: float, meters: list[str]) -> list[SuspectMeter]:
    records, record = evidence.records, evidence.record
    table = records.readings
    other = ~holds(records, acids.names[evidence.medium.studied])[np.asarray(records.readings_solution, np.intp)]
    other &= np.isin(table["meter"], meters) & (table["standing"] != "void") & np.isfinite(table["ph"])
    index = np.flatnonzero(other)
    if not len(index):
        return []
    cases, _ = layout(record, index, record.temperature_c[index])
    expected, u = _expected(evidence, acids, index, cases)
    residual = np.asarray(table["ph"], float)[index] - expected
    out = []
    for meter in meters:
        mine = (table["meter"][index] == meter) & np.isfinite(residual)
        count = int(mine.sum())
        if count < LEAST:
            continue
        weight = 1.0 / (u[mine] ** 2 + noise**2)
        mean = float(np.sum(weight * residual[mine]) / weight.sum())
        spread = float(np.sqrt(1.0 / weight.sum() + (0.5 * u[mine].min()) ** 2))  # predictions share their constants
        accuracy = meter_accuracy(evidence, meter)
        if abs(mean) > SIGMAS * np.hypot(spread, accuracy / ROOT3):
            reason = f"its {count} readings of other solutions lie {abs(mean):.2f} pH {_side(mean)} what is expected"
            out.append(SuspectMeter(meter, mean, spread, count, reason))
    return out


def _side(value: float) -> str:
    return "above" if value > 0.0 else "below"


def _expected(evidence: Evidence, acids: AcidTable, index: IntArray, cases: Cases) -> tuple[FloatArray, FloatArray]:
    """Certified or predicted pH of other readings, with u; NaN where the prediction is no evidence."""
    records, record, settings = evidence.records, evidence.record, evidence.settings
    solution = np.asarray(records.readings_solution, np.intp)[index]
    known, u_known = records.solutions.known_ph[solution], records.solutions.known_u[solution]
    contents = Contents(cases.start, cases.form, cases.amount, cases.temperature_c, cases.open_co2)
    answers = run(contents, form_table(records.forms, acids), acids, evidence.medium.model)
    lot = float(settings["uncertainty.lot_strength_percent"]) / 100.0 / ROOT3
    strength = np.sqrt(np.bincount(cases.reading, (np.nan_to_num(answers.entry) * lot) ** 2, cases.readings))
    u = np.sqrt(answers.u_constants**2 + strength**2 + (answers.d_temperature * record.u_temperature[index]) ** 2)
    with np.errstate(divide="ignore", invalid="ignore"):
        weak = 1000.0 / answers.d_titrant < settings["status.unbuffered_mmol_per_ph"]
    beyond = (answers.ph < settings["status.electrode_low_ph"]) | (answers.ph > settings["status.electrode_high_ph"])
    beyond |= answers.ionic_strength > settings["status.outside_model_ionic_strength"]
    ph = np.where(weak | beyond, np.nan, answers.ph)
    certified = np.isfinite(known)
    u_certified = np.where(np.isfinite(u_known), u_known, U_CERTIFICATE)
    return np.where(certified, known, ph), np.where(certified, u_certified, np.nan_to_num(u, nan=1.0))


def _by_calibration(evidence: Evidence, meters: list[str]) -> list[SuspectMeter]:
    """Calibrations with a slope or an offset beyond the settings' limits; of each meter the worst."""
    table, settings = evidence.records.calibrations, evidence.settings
    low, high = settings["meters.slope_low_percent"], settings["meters.slope_high_percent"]
    most = settings["meters.offset_limit_mv"]
    out: dict[str, SuspectMeter] = {}
    rows = zip(table["meter"].tolist(), table["slope"].tolist(), table["offset"].tolist(), strict=True)
    for meter, slope, offset in rows:
        if meter not in meters or not meter:
            continue
        if np.isfinite(slope) and not low <= slope <= high:
            reason = f"a calibration of it has a slope of {slope:g} %, outside {low:g} to {high:g} %"
            out.setdefault(meter, SuspectMeter(meter, float("nan"), float("nan"), 0, reason))
        elif np.isfinite(offset) and abs(offset) > most:
            reason = f"a calibration of it has an offset of {offset:g} mV, beyond {most:g} mV"
            out.setdefault(meter, SuspectMeter(meter, float("nan"), float("nan"), 0, reason))
    return list(out.values())
