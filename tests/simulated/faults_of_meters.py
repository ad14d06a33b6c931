"""Faults of meters and of single readings to plant; each takes the world and a size, and returns the truth."""

from __future__ import annotations

from collections.abc import Callable
from datetime import timedelta
from itertools import pairwise

import numpy as np

from reconcile.records.arrays import FloatArray, IntArray
from tests.simulated.planted import Planted
from tests.simulated.record import FIRST_DAY, reading_row
from tests.simulated.world import World

Later = Callable[[], Planted]
"""A truth that is known only once the readings have been taken."""


def _meter(world: World, at_least: int = 6, usable: Callable[[int], int] | None = None) -> int:
    """A meter without a fault yet, with enough readings; its index."""
    count = usable or (lambda m: int((world.meter == m).sum()))
    free = [m for m in range(world.room.n_meters) if ("meter", m) not in world.taken]
    enough = [m for m in free if count(m) >= at_least] or sorted(free, key=count)[-1:]
    chosen = int(world.rng.choice(enough))
    world.taken.add(("meter", chosen))
    return chosen


def _sign(world: World) -> float:
    return float(world.rng.choice([-1.0, 1.0]))


def _of(world: World, meter: int) -> IntArray:
    return np.flatnonzero(world.meter == meter)


def _when(day: float) -> str:
    return (FIRST_DAY + timedelta(days=day)).isoformat(timespec="seconds")


def meter_offset(world: World, size: float = 0.07) -> Planted:
    """The meter reads high or low by `size` everywhere; its whole deviation, own tolerance included."""
    meter, total = _meter(world), _sign(world) * size
    world.offset[meter] = total
    rows = tuple(_of(world, meter).tolist())
    return Planted("meter_offset", world.meter_name(meter), "meter", total, "pH", "meter_offset", {}, rows)


def meter_span(world: World, size: float = 0.03) -> Planted:
    """The meter stretches or squeezes the scale by `size` about a pivot between pH 6 and 8."""
    meter, total, pivot = _meter(world), _sign(world) * size, float(world.rng.uniform(6.0, 8.0))
    world.span[meter] = total
    world.offset[meter] -= total * (pivot - 7.0)
    rows = tuple(_of(world, meter).tolist())
    return Planted("meter_span", world.meter_name(meter), "meter", total, "-", "meter_span", {"pivot": pivot}, rows)


def meter_drift(world: World, size: float = 0.14) -> Planted:
    """The meter runs away evenly over the second half of the record, by `size` in all."""
    meter, total = _meter(world), _sign(world) * size
    end = world.room.weeks * 7.0
    onset = end * float(world.rng.uniform(0.45, 0.55))
    shape = np.clip((world.day - onset) / (end - onset), 0.0, None) * (world.meter == meter)
    world.errors.append(lambda ph: total * shape)
    detail = {"since": _when(onset), "total": total}
    rows = tuple(np.flatnonzero(shape > 0).tolist())
    per_day = total / (end - onset)
    return Planted("meter_drift", world.meter_name(meter), "meter", per_day, "pH/day", "meter_drift", detail, rows)


def meter_step(world: World, size: float = 0.08) -> Planted:
    """The meter jumps by `size` at a date and stays there; four readings or more on either side, where it has eight."""
    meter, total = _meter(world), _sign(world) * size
    days = np.sort(world.day[world.meter == meter])
    side = min(4, len(days) // 2)
    date = float(world.rng.uniform(days[side - 1], days[len(days) - side]))
    after = (world.meter == meter) & (world.day >= date)
    world.errors.append(lambda ph: total * after)
    rows = tuple(np.flatnonzero(after).tolist())
    detail = {"since": _when(date)}
    return Planted("meter_step", world.meter_name(meter), "meter", total, "pH", "meter_step", detail, rows)


def meter_temperature(world: World, size: float = 25.0) -> Planted:
    """The compensation takes every sample to be at `size` °C: the reading's distance from 7 is out by T/(size in K)."""
    meter = _meter(world)
    here = world.meter == meter
    gain = (world.celsius_true + 273.15) / (size + 273.15) - 1.0
    world.errors.append(lambda ph: (ph - 7.0) * gain * here)
    rows = tuple(_of(world, meter).tolist())
    return Planted("meter_temperature", world.meter_name(meter), "meter", size, "°C", "meter_temperature", {}, rows)


def meter_stuck(world: World, size: float = 0.25) -> Later:
    """The display keeps one number for the share `size` of the record."""
    end = world.room.weeks * 7.0
    length = size * end

    def within(meter: int) -> int:
        days = world.day[world.meter == meter]
        return int((days[(days > start) & (days <= start + length)]).size)

    start = 0.0
    for _ in range(50):
        start = float(world.rng.uniform(0.0, end - length))
        if max(within(m) for m in range(world.room.n_meters) if ("meter", m) not in world.taken) >= 4:
            break
    meter = _meter(world, 4, within)
    rows = np.flatnonzero((world.meter == meter) & (world.day > start) & (world.day <= start + length))
    value: list[float] = []

    def freeze(shown: FloatArray) -> FloatArray:
        shown = shown.copy()
        shown[rows] = shown[rows[0]]
        value.append(float(shown[rows[0]]))
        return shown

    world.displays.append(freeze)
    detail = {"since": _when(float(world.day[rows[0]])), "until": _when(float(world.day[rows[-1]]))}
    name, found = world.meter_name(meter), tuple(rows.tolist())
    return lambda: Planted("meter_stuck", name, "meter", value[-1], "pH", "meter_stuck", detail, found)


def probe_matrix(world: World, size: float = 0.08, kind: str = "Tris") -> Planted:
    """The meter is off by `size` in one kind of solution only."""
    inside = np.array([k == kind for k in world.kind], bool)[world.read_solution] & np.isnan(world.known)
    meter, total = _meter(world, 4, lambda m: int((inside & (world.meter == m)).sum())), _sign(world) * size
    here = inside & (world.meter == meter)
    world.errors.append(lambda ph: total * here)
    rows = tuple(np.flatnonzero(here).tolist())
    return Planted("probe_matrix", world.meter_name(meter), "meter", total, "pH", "probe_matrix", {"acid": kind}, rows)


def calibration_buffer(world: World, size: float = 0.10) -> Planted:
    """One lot of calibration buffer differs from its certificate by `size`; every session calibrated with it errs.

    A meter is set so that a straight line through its three buffers (4, 7, 10) reads as certified on the whole.
    """
    rng, delta = world.rng, _sign(world) * size
    ph, half = int(rng.choice([4, 7, 10])), str(rng.choice(["A", "B"]))
    name = f"BUF{ph}-{half}"
    buffers = np.array([4.0, 7.0, 10.0])
    slope, level = np.polyfit(buffers, np.where(buffers == ph, -delta, 0.0), 1)
    session = np.full(len(world.meter), "", object)
    for meter, day, lots in world.sessions:
        session[(world.meter == meter) & (world.day >= day)] = lots
    here = np.array([name in lots.split(",") for lots in session], bool)
    world.errors.append(lambda true: (slope * true + level) * here)
    world.taken.update(("meter", m) for m in range(world.room.n_meters))
    rows = tuple(np.flatnonzero(here).tolist())
    return Planted("calibration_buffer", name, "buffer", delta, "pH", "calibration_buffer", {"certified": ph}, rows)


def _transposed(shown: float) -> list[float]:
    """The number with two neighbouring digits exchanged, each way that gives another number."""
    text = f"{shown:.2f}"
    digits = [i for i, c in enumerate(text) if c.isdigit()]
    swapped = []
    for a, b in pairwise(digits):
        letters = list(text)
        letters[a], letters[b] = letters[b], letters[a]
        swapped.append(float("".join(letters)))
    return [s for s in swapped if s != shown and 0.5 <= s <= 13.5]


def reading_slip(world: World, size: float = 0.3) -> Later:
    """One reading is written with two neighbouring digits exchanged, which changes it by `size` at least."""
    found: list[tuple[int, float, float]] = []

    def write(shown: FloatArray) -> FloatArray:
        free = [
            i
            for i in range(len(shown))
            if ("meter", int(world.meter[i])) not in world.taken
            and ("batch", int(world.read_solution[i])) not in world.taken
            and np.isnan(world.known[i])
        ]
        choices = [(i, s) for i in free for s in _transposed(shown[i]) if abs(s - shown[i]) >= size]
        index, wrong = choices[int(world.rng.integers(len(choices)))]
        found.append((index, wrong, float(shown[index])))
        shown = shown.copy()
        shown[index] = wrong
        return shown

    world.displays.append(write)

    def truth() -> Planted:
        index, wrong, right = found[-1]
        subject = (
            world.batch_name(int(world.read_solution[index])),
            world.meter_name(int(world.meter[index])),
            str(reading_row(index)),
        )
        size_written = round(wrong - right, 6)
        return Planted(
            "reading_slip", subject, "reading", size_written, "pH", "reading_slip", {"pH": right}, (int(index),)
        )

    return truth
