"""A seeded simulator of laboratory records with known faults: `simulate(seed, faults, **room)`."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from reconcile.records.arrays import FloatArray
from reconcile.records.book import BatchRecords
from reconcile.records.settings import Settings
from tests.simulated import faults_of_meters as meters
from tests.simulated import faults_of_solutions as solutions
from tests.simulated.planted import Planted
from tests.simulated.record import to_records
from tests.simulated.world import Room, World, build

Plant = Callable[..., Planted | Callable[[], Planted]]
FAULTS: Mapping[str, Plant] = {
    "meter_offset": meters.meter_offset,
    "meter_span": meters.meter_span,
    "meter_drift": meters.meter_drift,
    "meter_step": meters.meter_step,
    "meter_temperature": meters.meter_temperature,
    "meter_stuck": meters.meter_stuck,
    "probe_matrix": meters.probe_matrix,
    "calibration_buffer": meters.calibration_buffer,
    "reading_slip": meters.reading_slip,
    "lot_strength": solutions.lot_strength,
    "lot_used_once": solutions.lot_used_once,
    "lot_identity": solutions.lot_identity,
    "lot_hydrate": solutions.lot_hydrate,
    "batch_preparation": solutions.batch_preparation,
    "recipe_hydrate": solutions.recipe_hydrate,
    "recipe_slip": solutions.recipe_slip,
    "acid_constant": solutions.acid_constant,
    "carbon_dioxide": solutions.carbon_dioxide,
    "record_value": solutions.record_value,
}
"""Every fault by name; its own size is the default of its second argument."""
NEEDS: Mapping[str, Mapping[str, Any]] = {
    "lot_used_once": {"single_use_lots": 8},
    "meter_temperature": {"temperature_low": 15.0, "temperature_high": 37.0},
    "probe_matrix": {"shares": (("Tris", 3.0),)},
    "calibration_buffer": {"calibrations": True},
    "carbon_dioxide": {"dilute_bases": 2},
    "record_value": {"hand_calculation": True},
}
"""What the room must have for a fault to be possible; a room setting given by name goes before it."""

LIKE_THE_TRUTH: Mapping[str, Any] = {"prediction.ion_pairs": "none", "prediction.activity_model": "davies"}
"""Settings under which the engine knows what the simulator's chemistry knows: the Davies equation, no polyborates."""


@dataclass(frozen=True)
class Simulated:
    """A record, what was planted in it, the settings to audit it with, and the world behind it."""

    records: BatchRecords
    truth: tuple[Planted, ...]
    settings: Settings
    world: World
    ph_true: FloatArray
    """True pH of what each reading read, before meter and noise."""


def simulate(
    seed: int,
    faults: Sequence[str] = (),
    sizes: Mapping[str, float] | None = None,
    **world: Any,
) -> Simulated:
    """One record of an imaginary room; the same seed, faults, sizes and room give the same record.

    faults : names of FAULTS, planted in that order on different subjects
    sizes : size of a fault by name, where it is not the default
    world : settings of `Room` by name
    Raises KeyError for a fault, TypeError for a room setting that does not exist.
    """
    needed: dict[str, Any] = {}
    for name in faults:
        needed.update(NEEDS.get(name, {}))
    room = Room(**{**needed, **world})
    draw, plant = (np.random.default_rng([seed, stream]) for stream in (0, 1))
    built = build(room, draw)
    built.rng = plant
    planted = []
    for name in faults:
        size = (sizes or {}).get(name)
        planted.append(FAULTS[name](built) if size is None else FAULTS[name](built, size))
    ph_true = built.true_ph()
    built.rng = np.random.default_rng([seed, 2])
    shown = built.read(ph_true)
    truth = tuple(p() if callable(p) else p for p in planted)
    return Simulated(to_records(built, shown), truth, Settings(dict(LIKE_THE_TRUTH)), built, ph_true)
