"""A lot of calibration buffer that differs from its certified pH: every session calibrated with it carries the error.

A meter is set so that a straight line through its calibration buffers reads as certified on the whole; a buffer that is
off tilts and shifts that line.
"""

from __future__ import annotations

import re

import numpy as np

from reconcile.auditor.layout import Layout
from reconcile.auditor.proposals import Context, Proposal, Told, linear, stack
from reconcile.auditor.through_time import calibrations_of, courses
from reconcile.records.arrays import FloatArray

USUAL = (4.0, 7.0, 10.0)
"""Nominal pH of the buffers of a calibration whose certified values the record does not give (common practice)."""
LEAST = 4


def lots_named(text: str) -> list[str]:
    """Buffer lots in one cell, however they are parted."""
    return [part for part in re.split(r"\s*[,;/+|]\s*|\s+and\s+", text.strip()) if part]


def certified(layout: Layout, lot: str) -> float:
    """Certified pH of a buffer lot from the known solutions; NaN where the record does not give it."""
    known = layout.records.known
    for name, number, ph in zip(known["name"], known["lot"], known["ph"], strict=True):
        if lot in (str(number), str(name)):
            return float(ph)
    return float("nan")


def reading_error(ph: FloatArray, at: float, buffers: list[float]) -> FloatArray:
    """Error of readings at `ph` for each pH that the buffer certified as `at` is really higher than certified."""
    points = np.array(sorted({at, *buffers}))
    wrong = np.where(points == at, -1.0, 0.0)
    if len(points) < 2:
        return np.full(len(ph), -1.0)
    tilt, level = np.polyfit(points, wrong, 1)
    return np.asarray(tilt * ph + level, float)


class CalibrationBuffer:
    steady = True
    name, alarm_class = "calibration_buffer", "meter"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        sessions: dict[str, list[tuple[np.ndarray, list[str]]]] = {}
        for course in courses(layout):
            days, texts = calibrations_of(layout, course.meter)
            which = np.searchsorted(days, course.day, side="right") - 1
            for session in range(len(days)):
                rows = course.rows[which == session]
                lots = lots_named(texts[session])
                for lot in lots if len(rows) else ():
                    sessions.setdefault(lot, []).append((rows, [x for x in lots if x != lot]))
        columns, subject, shift_of, log_prior = [], [], [], []
        for lot in sorted(sessions):
            rows = np.concatenate([r for r, _ in sessions[lot]])
            if len(rows) < LEAST:
                continue
            value = certified(layout, lot)
            choices = [value] if np.isfinite(value) else list(USUAL)
            for choice in choices:
                parts = []
                for session_rows, others in sessions[lot]:
                    values = [certified(layout, other) for other in others]
                    known = [v for v in values if np.isfinite(v)]
                    buffers = known if known and np.isfinite(value) else [u for u in USUAL if abs(u - choice) > 1.0]
                    parts.append(reading_error(layout.ph[session_rows], choice, buffers))
                columns.append((rows, np.concatenate(parts)))
                subject.append(lot)
                shift_of.append(choice)
                log_prior.append(-np.log(len(choices)))

        def tell(k: int, a: float) -> Told:
            return Told(a, "pH", {"pH_shift": a, "certified": shift_of[k]}, detail=f"nominal pH {shift_of[k]:g}")

        return linear(
            self.name,
            self.alarm_class,
            "buffer",
            stack(columns, len(layout)),
            subject,
            tell,
            prior_sd=0.1,
            log_prior=np.array(log_prior),
        )


KIND = CalibrationBuffer()
