"""A display that stood still while the solutions changed."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from reconcile.auditor.proposals import Context, Proposal, Told, stack
from reconcile.auditor.through_time import courses, moment

LEAST_RUN = 3
MOVED = 6.0
"""The predictions must have moved by this many spreads of a residual: equal solutions give equal readings."""


class MeterStuck:
    name, alarm_class = "meter_stuck", "meter"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        spread = np.sqrt(context.model.variance())
        columns, subject, shown, span = [], [], [], []
        for course in courses(layout):
            read = layout.anchor[course.rows] != course.rows  # what was adjusted shows its target again and again
            course = replace(course, rows=course.rows[read], day=course.day[read])
            value = layout.observed[course.rows]
            step = np.nan_to_num(layout.resolution[course.rows], nan=0.0) / 2 + 1e-9
            same = np.abs(np.diff(value)) <= step[1:]
            cuts = np.flatnonzero(np.r_[True, ~same, True])
            runs = np.flatnonzero(np.diff(cuts) >= LEAST_RUN)
            for first, last in zip(cuts[runs].tolist(), cuts[runs + 1].tolist(), strict=True):
                rows = course.rows[first:last]
                if np.ptp(layout.ph[rows]) < MOVED * float(np.median(spread[rows])):
                    continue
                display = float(np.median(value[first:last]))
                columns.append((rows, display - layout.ph[rows]))
                subject.append(course.meter)
                shown.append(display)
                span.append((float(course.day[first]), float(course.day[last - 1])))
        if not subject:
            return None

        def tell(k: int, a: float) -> Told:
            begin, end = (moment(layout, d) for d in span[k])
            return Told(shown[k], "pH", {"pH": shown[k]}, since=begin, until=end)

        k = len(subject)
        return Proposal(
            self.name,
            self.alarm_class,
            "meter",
            stack(columns, len(layout)),
            subject,
            subject,
            np.ones(k),
            np.zeros(k),
            np.ones(k, bool),
            tell,
            at=lambda k, site: shown[k] - site.ph,
            df=np.array([len(rows) for rows, _ in columns], np.intp),
        )


KIND = MeterStuck()
