"""A meter whose error grows in proportion to pH minus a pivot (not the electrode slope that a calibration reports)."""

from __future__ import annotations

import numpy as np
from scipy import sparse

from reconcile.auditor.proposals import Context, Proposal, Told, linear, stack

PIVOTS = np.arange(2.0, 12.5, 1.0)
LEAST_SPREAD = 1.0
"""pH between the lowest and highest reading under which span and offset are one and the same."""


class MeterSpan:
    steady = True
    name, alarm_class = "meter_span", "meter"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        columns, subject, pivots, own, log_prior = [], [], [], [], []
        for index, meter in enumerate(layout.meters):
            rows = np.flatnonzero(layout.meter == index)
            if len(rows) < 4 or np.ptp(layout.ph[rows]) < LEAST_SPREAD:
                continue
            for pivot in PIVOTS:
                columns.append((rows, layout.ph[rows] - pivot))
                subject.append(meter)
                pivots.append(float(pivot))
                # the meter's own offset stays: the true pivot lies between those tried
                own.append(layout.own("span", index))
                # half of the prior on the isopotential point of glass electrodes, pH 7 (common practice, no source)
                log_prior.append(np.log(0.5 if pivot == 7.0 else 0.5 / (len(PIVOTS) - 1)))

        def tell(k: int, a: float) -> Told:
            return Told(a, "pH per pH", {"span": a, "pivot": pivots[k]}, detail=f"pivot pH {pivots[k]:g}")

        x: sparse.csc_array = stack(columns, len(layout))
        return linear(
            self.name,
            self.alarm_class,
            "meter",
            x,
            subject,
            tell,
            prior_sd=0.03,
            own=own,
            log_prior=np.array(log_prior),
            at=lambda k, site: site.ph - pivots[k],
        )


KIND = MeterSpan()
