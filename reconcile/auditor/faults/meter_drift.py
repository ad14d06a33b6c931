"""A meter that wanders off steadily from an unknown date on, and comes back at a recorded recalibration."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from reconcile.auditor.layout import Layout
from reconcile.auditor.proposals import Context, Proposal, Told, linear, stack
from reconcile.auditor.through_time import (
    COARSE_ONSETS,
    MOST_ONSETS,
    Course,
    Onset,
    calibration_days,
    courses,
    moment,
    refined,
)

AFTER = 5
"""Readings needed from the onset on."""
TOTAL_SD = 0.15
"""Drift over the whole record that is usual for a drifting probe [pH]; common practice, no source."""


class MeterDrift:
    steady = True
    name, alarm_class = "meter_drift", "meter"

    def propose(self, context: Context) -> Proposal | None:
        layout, most = context.layout, COARSE_ONSETS if context.model.long else MOST_ONSETS
        wide = [c for c in courses(layout) if len(c.rows) > AFTER and c.day[-1] - c.day[0] >= 1.0]
        return self.of(layout, [(c, [(0, float(c.day[0])), *c.onsets(1, AFTER, most)]) for c in wide])

    def refine(self, context: Context, coarse: Proposal) -> list[Proposal | None]:
        """Further dates for the meters of a long record that come near significance."""
        return refined(context, coarse, (1, AFTER), lambda course, dates: self.of(context.layout, [(course, dates)]))

    def of(self, layout: Layout, dates: Sequence[tuple[Course, list[Onset]]]) -> Proposal | None:
        """Drifts of some meters from some dates on; a drift is as likely to begin at any of the usual dates."""
        columns, subject, since, total, prior_sd, log_prior = [], [], [], [], [], []
        for course, onsets in dates:
            usual = len(course.onsets(1, AFTER)) + 1
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
                    log_prior.append(-np.log(usual * len(ways)))

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
