"""A meter that wanders off steadily from an unknown date on, and comes back at a recorded recalibration."""

from __future__ import annotations

import numpy as np

from reconcile.auditor.proposals import Context, Proposal, Told, linear, stack
from reconcile.auditor.through_time import calibration_days, courses, moment

AFTER = 5
"""Readings needed from the onset on."""
TOTAL_SD = 0.15
"""Drift over the whole record that is usual for a drifting probe [pH]; common practice, no source."""


class MeterDrift:
    name, alarm_class = "meter_drift", "meter"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        columns, subject, since, total, prior_sd, log_prior = [], [], [], [], [], []
        for course in courses(layout):
            if len(course.rows) < AFTER + 1 or course.day[-1] - course.day[0] < 1.0:
                continue
            onsets = [(0, float(course.day[0])), *course.onsets(1, AFTER)]
            calibrations = calibration_days(layout, course.meter)
            inside = calibrations[(calibrations > course.day[0]) & (calibrations < course.day[-1])]
            ways = [np.zeros(0), inside] if len(inside) else [np.zeros(0)]
            for resets in ways:
                for position, onset in onsets:
                    rows, day = course.rows[position:], course.day[position:]
                    last = np.searchsorted(resets, day, side="right")
                    begin = np.maximum(onset, np.r_[-np.inf, resets][last])
                    ramp = np.maximum(day - begin, 0.0)
                    if np.count_nonzero(ramp > 0) < AFTER - 1:
                        continue
                    columns.append((rows, ramp))
                    subject.append(course.meter)
                    since.append(onset if position else np.nan)
                    total.append(float(ramp.max()))
                    prior_sd.append(TOTAL_SD / max(float(ramp.max()), 1e-6))
                    log_prior.append(-np.log(len(onsets) * len(ways)))

        def tell(k: int, a: float) -> Told:
            begun = moment(layout, since[k]) if np.isfinite(since[k]) else None
            return Told(a, "pH/day", {"total": a * total[k]}, since=begun)

        proposal = linear(
            self.name,
            self.alarm_class,
            "meter",
            stack(columns, len(layout)),
            subject,
            tell,
            prior_sd=1.0,
            log_prior=np.array(log_prior),
            at=lambda k, site: total[k],
        )
        if proposal is not None:
            proposal.prior_sd[:] = prior_sd
        return proposal


KIND = MeterDrift()
