"""Faults of meters that went with a probe when it was moved to another meter."""

from __future__ import annotations

from dataclasses import replace

from reconcile.auditor.faults import meter_drift, meter_offset, meter_span, meter_step, meter_temperature
from reconcile.auditor.probes import by_probe
from reconcile.auditor.proposals import Context, FaultKind, Proposal


class OfProbe:
    """A kind of meter fault, with the moved probes in place of the meters."""

    steady = True
    alarm_class = "meter"

    def __init__(self, kind: FaultKind) -> None:
        self.kind, self.name = kind, f"{kind.name} of a probe"

    def propose(self, context: Context) -> Proposal | None:
        view = by_probe(context.layout)
        if view is None:
            return None
        found = self.kind.propose(replace(context, layout=view))
        if found is None or not len(found):
            return None
        return replace(found, subject_type="probe", block=[f"probe {name}" for name in found.block])


KINDS: tuple[FaultKind, ...] = tuple(
    OfProbe(kind)
    for kind in (meter_offset.KIND, meter_span.KIND, meter_drift.KIND, meter_step.KIND, meter_temperature.KIND)
)
