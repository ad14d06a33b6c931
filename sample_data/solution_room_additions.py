"""What the invented solution room keeps beside its batches: check readings, adjusting lines, a log of events."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime, timedelta
from typing import Any

import numpy as np

from reconcile.records.standards import standard_ph
from sample_data.solution_room_sheets import FIRST_DAY
from sample_data.solution_room_stock import BASE, STRONG

CHECK_BUFFERS = ("phthalate", "phosphate", "borax")
WEEKS, ADJUSTED = 8, 12
WORDS = ("as needed", "to pH {target:.1f}", "q.s.")
EVENTS: tuple[tuple[datetime, str, str], ...] = (
    (datetime(2025, 3, 10, 7, 30), "Bench 4", "probe cleaned and refilled"),
    (datetime(2025, 3, 24, 7, 40), "Hatch", "cable replaced"),
    (datetime(2025, 3, 31, 7, 45), "Bench 2", "probe stored dry over the weekend"),
    (datetime(2025, 4, 2, 11, 50), "Bench 3", "probe replaced"),
    (datetime(2025, 4, 14, 8, 5), "Bench 1", "probe cleaned"),
)


@dataclass(frozen=True)
class Check:
    """One reading of a certified buffer."""

    at: datetime
    buffer: str
    meter: int
    celsius: float
    ph: float


def check_readings(
    meters: int, error: Callable[[int, datetime, float], float], rng: np.random.Generator
) -> list[Check]:
    """One certified buffer a week on every meter, before the day's batches."""
    checks = []
    for week in range(WEEKS):
        for meter in range(meters):
            at = FIRST_DAY + timedelta(days=7 * week, hours=7, minutes=15 + 5 * meter)
            celsius = round(float(rng.uniform(20.0, 24.5)), 1)
            buffer = CHECK_BUFFERS[(week + meter) % len(CHECK_BUFFERS)]
            certified = standard_ph(buffer, celsius)
            assert certified is not None
            shown = certified[0] + error(meter, at, certified[0]) + rng.normal(0.0, 0.011)
            checks.append(Check(at, buffer, meter, celsius, round(float(shown), 2)))
    return checks


def adjusted_batches(
    batches: Sequence[Any], targets: Mapping[int, float], barred: set[int], sound: set[str]
) -> dict[int, str]:
    """Batches whose strong acid or base was added until the pH was reached, with what the recipe says instead."""
    able = [
        i
        for i, batch in enumerate(batches)
        if i in targets
        and i not in barred
        and {part.lot.name for part in batch.parts} <= sound
        and len(batch.parts) == 2
        and batch.parts[1].lot.label in (BASE, STRONG)
    ]
    chosen = able[:: max(1, len(able) // ADJUSTED)][:ADJUSTED]
    return {i: WORDS[n % len(WORDS)].format(target=targets[i]) for n, i in enumerate(chosen)}
