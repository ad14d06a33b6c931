"""Temperature compensation that is stuck, or off by a constant: the electrode's slope is taken at a wrong temperature.

A meter that assumes T' instead of T shows 7 + (pH - 7) T/T' (Nernst slope proportional to absolute temperature).
"""

from __future__ import annotations

import numpy as np

from reconcile.auditor.proposals import Context, Proposal, Told, stack

ZERO_CELSIUS = 273.15
ASSUMED = {
    25.0: 0.4,
    20.0: 0.2,
    **{float(t): 0.4 / 14 for t in (5, 10, 12, 15, 18, 22, 23, 24, 26, 27, 28, 30, 35, 40)},
}
"""Temperatures at which a compensation sticks, with prior shares (25 and 20 °C are the usual manual settings)."""
LEAST_SPREAD_K = 4.0


class MeterTemperature:
    steady = True
    name, alarm_class = "meter_temperature", "meter"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        columns, subject, assumed, log_prior = [], [], [], []
        for index, meter in enumerate(layout.meters):
            rows = np.flatnonzero(layout.meter == index)
            if len(rows) < 4 or np.ptp(layout.temperature[rows]) < LEAST_SPREAD_K:
                continue
            kelvin = layout.temperature[rows] + ZERO_CELSIUS
            for temperature, share in sorted(ASSUMED.items()):
                columns.append((rows, (layout.ph[rows] - 7.0) * (kelvin / (temperature + ZERO_CELSIUS) - 1.0)))
                subject.append(meter)
                assumed.append(temperature)
                log_prior.append(float(np.log(share)))
        if not subject:
            return None

        def tell(k: int, a: float) -> Told:
            return Told(assumed[k], "°C", {"temperature": assumed[k]}, detail=f"stuck at {assumed[k]:g} °C")

        k = len(subject)
        return Proposal(
            self.name,
            self.alarm_class,
            "meter",
            stack(columns, len(layout)),
            subject,
            subject,
            np.ones(k),
            np.array(log_prior),
            np.ones(k, bool),
            tell,
            at=lambda k, site: (
                (site.ph - 7.0) * ((site.temperature + ZERO_CELSIUS) / (assumed[k] + ZERO_CELSIUS) - 1.0)
            ),
        )


KIND = MeterTemperature()
