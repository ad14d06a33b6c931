"""A meter whose readings jumped at an unknown date."""

from __future__ import annotations

import numpy as np

from reconcile.auditor.proposals import Context, Proposal, Told, linear, stack
from reconcile.auditor.through_time import courses, moment

SIDE = 3
"""Readings needed before and after (practice asks for five; three with a clear jump are told, with their interval)."""


class MeterStep:
    name, alarm_class = "meter_step", "meter"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        columns, subject, since, log_prior = [], [], [], []
        for course in courses(layout):
            onsets = course.onsets(SIDE, SIDE)
            for position, day in onsets:
                rows = course.rows[position:]
                columns.append((rows, np.ones(len(rows))))
                subject.append(course.meter)
                since.append(day)
                log_prior.append(-np.log(len(onsets)))

        def tell(k: int, a: float) -> Told:
            return Told(a, "pH", {"step": a}, since=moment(layout, since[k]))

        return linear(
            self.name,
            self.alarm_class,
            "meter",
            stack(columns, len(layout)),
            subject,
            tell,
            prior_sd=0.1,
            log_prior=np.array(log_prior),
            at=lambda k, site: 1.0,
        )


KIND = MeterStep()
