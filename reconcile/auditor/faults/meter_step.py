"""A meter whose readings jumped at an unknown date."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from reconcile.auditor.layout import Layout
from reconcile.auditor.proposals import Context, Proposal, Told, linear, stack
from reconcile.auditor.through_time import COARSE_ONSETS, MOST_ONSETS, Course, Onset, courses, moment, refined

SIDE = 3
"""Readings needed before and after (practice asks for five; three with a clear jump are told, with their interval)."""


class MeterStep:
    steady = True
    name, alarm_class = "meter_step", "meter"

    def propose(self, context: Context) -> Proposal | None:
        layout, most = context.layout, COARSE_ONSETS if context.model.long else MOST_ONSETS
        return self.of(layout, [(course, course.onsets(SIDE, SIDE, most)) for course in courses(layout)])

    def refine(self, context: Context, coarse: Proposal) -> list[Proposal | None]:
        """Further dates for the meters of a long record that come near significance."""
        return refined(context, coarse, (SIDE, SIDE), lambda course, dates: self.of(context.layout, [(course, dates)]))

    def of(self, layout: Layout, dates: Sequence[tuple[Course, list[Onset]]]) -> Proposal | None:
        """Steps of some meters at some dates; a step is as likely at any of the usual dates."""
        columns, subject, since, log_prior = [], [], [], []
        for course, onsets in dates:
            usual = len(course.onsets(SIDE, SIDE))
            for position, day in onsets:
                rows = course.rows[position:]
                columns.append((rows, np.ones(len(rows))))
                subject.append(course.meter)
                since.append(day)
                log_prior.append(-np.log(usual))

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
