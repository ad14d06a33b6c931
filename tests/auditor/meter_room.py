"""An invented room of meters for tests: calibrations with known courses, and readings of published buffers.

M-1 loses 0.02 % of slope a day from 99.0 %; M-2 reads 0.03 pH high; M-3 jumps by 12 mV between two calibrations,
nothing logged; M-4 drifts by 0.006 pH a day between calibrations; M-5 gets a new probe, logged; M-6 is 2.5 times as
noisy.
"""

from __future__ import annotations

from collections.abc import Sequence
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import numpy as np
from builders import workbook

Rows = list[Sequence[Any]]
START = datetime(2025, 1, 6, 8)
WEEKS = 24
CALIBRATIONS_HEAD = ("Meter", "Probe", "Calibrated at", "Slope (%)", "Offset (mV)")
CHECKS_HEAD = ("Read at", "Known solution", "Meter", "Temperature (°C)", "pH")
BUFFERS = {"phthalate": 4.005, "phosphate": 6.865, "borax": 9.180}
"""pH at 25 °C of the primary standards: Buck et al. 2002, Pure Appl. Chem. 74, 2169, doi:10.1351/pac200274112169."""
NOISE, DRIFT, OFFSET, STEP_MV, DECLINE, STEP_WEEK, PROBE_WEEK = 0.012, 0.006, 0.03, 12.0, 0.02, 14, 12


def calibrations(rng: np.random.Generator, meters: int = 6) -> Rows:
    """One calibration of each meter a week."""
    rows: Rows = [CALIBRATIONS_HEAD]
    for m in range(1, meters + 1):
        for week in range(WEEKS):
            slope = 99.0 - (DECLINE * 7 * week if m == 1 else 0.0) + rng.normal(0, 0.3)
            offset = 2.0 + rng.normal(0, 1.0) + (STEP_MV if m == 3 and week >= STEP_WEEK else 0.0)
            probe = "E-15" if m == 5 and week >= PROBE_WEEK else f"E-{m}"
            at = START + timedelta(days=7 * week, minutes=m)
            rows.append((f"M-{m}", probe, at, round(slope, 1), round(offset, 1)))
    return rows


def events() -> Rows:
    return [("Meter", "Date", "What was done"), ("M-5", START.date() + timedelta(days=7 * PROBE_WEEK), "new probe")]


def checks(rng: np.random.Generator, meters: int = 6, days: Sequence[float] = (0.2, 3.0, 6.0)) -> Rows:
    """Readings of three buffers on every meter, some days after each calibration."""
    rows: Rows = [CHECKS_HEAD]
    for m in range(1, meters + 1):
        for week in range(WEEKS):
            for i, (name, ph) in enumerate(BUFFERS.items()):
                since = days[(i + week) % len(days)]
                bias = (OFFSET if m == 2 else 0.0) + (DRIFT * since if m == 4 else 0.0)
                value = ph + bias + rng.normal(0, NOISE * (2.5 if m == 6 else 1.0))
                at = START + timedelta(days=7 * week + since, minutes=m + i)
                rows.append((at, name, f"M-{m}", 25.0, round(float(value), 2)))
    return rows


def meter_room(folder: Path, *sheets: str, seed: int = 3, meters: int = 6) -> Path:
    """A workbook of the sheets named: Calibrations, Events, Readings."""
    rng = np.random.default_rng(seed)
    made = {"Calibrations": calibrations(rng, meters), "Events": events(), "Readings": checks(rng, meters)}
    return workbook(folder / "meter_room.xlsx", {name: made[name] for name in sheets})
