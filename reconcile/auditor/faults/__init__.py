"""The table of fault kinds: one small file each. To add one, write its file and name it here."""

from __future__ import annotations

from reconcile.auditor.faults import (
    acid_constant,
    batch_preparation,
    calibration_buffer,
    carbon_dioxide,
    lot_identity,
    lot_strength,
    meter_drift,
    meter_offset,
    meter_span,
    meter_step,
    meter_stuck,
    meter_temperature,
    moved_probe,
    probe_matrix,
    reading_slip,
    recipe_slip,
)
from reconcile.auditor.proposals import FaultKind

KINDS: tuple[FaultKind, ...] = (
    meter_offset.KIND,
    meter_span.KIND,
    meter_drift.KIND,
    meter_step.KIND,
    meter_temperature.KIND,
    meter_stuck.KIND,
    *moved_probe.KINDS,
    probe_matrix.KIND,
    calibration_buffer.KIND,
    lot_strength.KIND,
    lot_identity.KIND,
    batch_preparation.KIND,
    recipe_slip.KIND,
    reading_slip.KIND,
    reading_slip.KIND_OF_VALUES,
    acid_constant.KIND,
    carbon_dioxide.KIND,
    carbon_dioxide.KIND_OF_LOTS,
)
