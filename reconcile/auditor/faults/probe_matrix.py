"""One meter that is off in one kind of solution only (a junction or glass that a matrix upsets)."""

from __future__ import annotations

import numpy as np

from reconcile.auditor.proposals import Context, Proposal, Told, linear, stack

INSIDE, OUTSIDE = 3, 3
"""Readings needed on this meter in the kind of solution, and outside it."""


class ProbeMatrix:
    name, alarm_class = "probe_matrix", "meter"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        columns, subject, kinds = [], [], []
        for index, meter in enumerate(layout.meters):
            mine = layout.meter == index
            for family, name in enumerate(layout.families):
                rows = np.flatnonzero(mine & (layout.family == family))
                if len(rows) < INSIDE or mine.sum() - len(rows) < OUTSIDE or len(set(layout.batch[rows].tolist())) < 2:
                    continue
                columns.append((rows, np.ones(len(rows))))
                subject.append(meter)
                kinds.append(name)

        def tell(k: int, a: float) -> Told:
            return Told(a, "pH", {"offset": a, "solutions": kinds[k]}, detail=kinds[k])

        counts = {m: subject.count(m) for m in set(subject)}
        return linear(
            self.name,
            self.alarm_class,
            "meter",
            stack(columns, len(layout)),
            subject,
            tell,
            prior_sd=0.1,
            log_prior=np.array([-1.0 - np.log(counts[m]) for m in subject]),
            at=lambda k, site: float(site.family == kinds[k]),
        )


KIND = ProbeMatrix()
