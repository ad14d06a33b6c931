"""One meter that is off in one kind of solution only (a junction or glass that a matrix upsets)."""

from __future__ import annotations

import numpy as np

from reconcile.auditor.proposals import Context, Proposal, Told, linear, stack

INSIDE, OUTSIDE = 2, 3
"""Readings needed on this meter in the kind of solution (of as many batches), and outside it."""


def kinds_of_solution(families: tuple[str, ...]) -> list[str]:
    """Kinds worth asking about: every acid, whatever else is there, and every combination that was read."""
    acids = {acid for family in families for acid in family.split(" + ")}
    return sorted(acids | set(families))


def holds(family: str, kind: str) -> bool:
    """True where solutions of a family are of a kind."""
    return family == kind or kind in family.split(" + ")


class ProbeMatrix:
    steady = True
    name, alarm_class = "probe_matrix", "meter"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        columns, subject, kinds = [], [], []
        asked = [(k, np.array([holds(f, k) for f in layout.families])) for k in kinds_of_solution(layout.families)]
        for index, meter in enumerate(layout.meters):
            mine = np.flatnonzero(layout.meter == index)
            seen: set[bytes] = set()
            for kind, member in asked:
                rows = mine[member[layout.family[mine]]]
                outside = len(mine) - len(rows)
                if len(rows) < INSIDE or outside < OUTSIDE or len(np.unique(layout.batch[rows])) < INSIDE:
                    continue
                if rows.tobytes() in seen:
                    continue
                seen.add(rows.tobytes())
                columns.append((rows, np.ones(len(rows))))
                subject.append(meter)
                kinds.append(kind)

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
            at=lambda k, site: float(holds(site.family, kinds[k])),
        )


KIND = ProbeMatrix()
