"""A meter that reads high or low by the same amount everywhere."""

from __future__ import annotations

import numpy as np

from reconcile.auditor.layout import Layout, one_hot
from reconcile.auditor.proposals import Context, Proposal, Told, linear
from reconcile.records.arrays import IntArray

LEAST = 2
"""Readings from which an offset of a meter may be told: one alone is a fault of that reading as well."""


def told_of(layout: Layout) -> IntArray:
    """Meters with enough readings, (k,)."""
    counts = np.bincount(layout.meter[layout.meter >= 0], minlength=len(layout.meters))
    return np.flatnonzero(counts >= LEAST).astype(np.intp)


class MeterOffset:
    steady = True
    name, alarm_class = "meter_offset", "meter"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        meters = told_of(layout)
        return linear(
            self.name,
            self.alarm_class,
            "meter",
            one_hot(layout.meter, len(layout.meters))[:, meters],
            [layout.meters[i] for i in meters],
            lambda k, a: Told(a, "pH", {"offset": a}),
            prior_sd=0.1,
            own=[layout.own("meter", i) for i in meters.tolist()],
            at=lambda k, site: 1.0,
        )


KIND = MeterOffset()
