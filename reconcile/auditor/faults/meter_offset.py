"""A meter that reads high or low by the same amount everywhere."""

from __future__ import annotations

from reconcile.auditor.layout import one_hot
from reconcile.auditor.proposals import Context, Proposal, Told, linear


class MeterOffset:
    steady = True
    name, alarm_class = "meter_offset", "meter"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        return linear(
            self.name,
            self.alarm_class,
            "meter",
            one_hot(layout.meter, len(layout.meters)),
            layout.meters,
            lambda k, a: Told(a, "pH", {"offset": a}),
            prior_sd=0.1,
            own=[layout.own("meter", i) for i in range(len(layout.meters))],
            at=lambda k, site: 1.0,
        )


KIND = MeterOffset()
