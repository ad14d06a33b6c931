"""What a reader who knew the true spreads and the true candidate could tell: the yardstick for the auditor's power.

The residuals of a clean record are normal with covariance V, built here from the room's own settings by finite
differences of the simulator's chemistry. A fault of known shape d (one number an unknown amplitude) is tested best by
t = d'V⁻¹r / sqrt(d'V⁻¹d): its square is chi-square with one degree of freedom in a clean record, and half of it is the
gain in log-likelihood. With the fault at its planted size its mean is sqrt(d'V⁻¹d).
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from reconcile.records.arrays import FloatArray
from tests.simulated import chemistry_of_truth as chemistry
from tests.simulated.simulator import Simulated, simulate
from tests.simulated.world import ROOT3, World

STILL: Mapping[str, Any] = {
    "accuracy": 0.0,
    "span_percent": 0.0,
    "lot_percent": 0.0,
    "preparation_percent": 0.0,
    "temperature_k": 0.0,
    "pka_u": 0.0,
    "noise": 0.0,
    "meter_day_sd": 0.0,
    "session_sd": 0.0,
    "resolution": 1e-6,
}
"""A room without any spread: what is left of a record is chemistry and the planted fault."""
STEP = 1e-3
DECIDED_BY_DISPLAY = frozenset({"reading_slip", "meter_stuck"})
"""Faults whose shape depends on the numbers shown, so that a room without spread does not have the same one."""


def residuals(simulated: Simulated) -> FloatArray:
    """Reading minus prediction from the labels, by the simulator's chemistry [pH], (n,)."""
    return np.asarray(simulated.records.readings["ph"] - simulated.world.true_ph(nominal=True))


def signature(seed: int, fault: str, size: float | None = None, **room: Any) -> FloatArray:
    """Shift of every residual that the fault of this seed causes by itself [pH], (n,)."""
    if fault in DECIDED_BY_DISPLAY:
        raise ValueError(f"the shape of {fault} depends on the readings shown")
    sizes = None if size is None else {fault: size}
    return residuals(simulate(seed, [fault], sizes, **{**room, **STILL}))


def _slope(world: World, base: FloatArray) -> tuple[FloatArray, FloatArray]:
    """DpH/d ln amount by lot (n, l), and the sum of squares of the slopes by component within a solution (n, n)."""
    lots = np.zeros((len(base), len(world.lot_label)))
    same = world.read_solution[:, None] == world.read_solution[None, :]
    squares = np.zeros((len(base), len(base)))
    place = np.arange(len(world.solution)) - np.searchsorted(world.solution, world.solution)
    kept = world.factor.copy()
    for position in range(int(place.max()) + 1):
        here = place == position
        world.factor = np.where(here, kept * np.exp(STEP), kept)
        slope = (world.true_ph() - base) / STEP
        squares += same * np.outer(slope, slope)
        lot_of = np.full(len(world.made), -1)
        lot_of[world.solution[here]] = world.lot[here]
        touched = lot_of[world.read_solution]
        rows = np.flatnonzero(touched >= 0)
        lots[rows, touched[rows]] += slope[rows]
    world.factor = kept
    return lots, squares


def covariance(seed: int, **room: Any) -> FloatArray:
    """Covariance of the residuals of a clean record of this seed and room [pH²], (n, n)."""
    full = simulate(seed, **room).world.room
    world = simulate(seed, **{**room, **STILL}).world
    base, k = world.true_ph(), full.spread
    lots, prepared = _slope(world, base)
    n = len(base)
    v = np.eye(n) * ((full.noise * k) ** 2 + full.resolution**2 / 12.0)
    meter = (world.meter[:, None] == world.meter[None, :]).astype(float)
    v += meter * (full.accuracy * k / ROOT3) ** 2
    v += meter * np.outer(base - 7.0, base - 7.0) * (full.span_percent / 100.0 * k / ROOT3) ** 2
    v += meter * (np.floor(world.day)[:, None] == np.floor(world.day)[None, :]) * full.meter_day_sd**2
    v += meter * ((world.day // 7)[:, None] == (world.day // 7)[None, :]) * full.session_sd**2
    v += lots @ lots.T * (full.lot_percent / 100.0 * k / ROOT3) ** 2
    v += prepared * (full.preparation_percent / 100.0 * k / ROOT3) ** 2
    kept = world.celsius_true
    world.celsius_true = kept + 0.1
    v += np.diag((world.true_ph() - base) / 0.1 * full.temperature_k * k / ROOT3) ** 2
    world.celsius_true = kept
    for (acid, step), value in list(world.pka_shift.items()):
        world.pka_shift[acid, step] = value + STEP
        slope = (world.true_ph() - base) / STEP
        world.pka_shift[acid, step] = value
        v += np.outer(slope, slope) * (chemistry.acids()[acid].u[step - 1] * full.pka_u * k) ** 2
    return v


@dataclass(frozen=True)
class Oracle:
    """The best test of one planted fault: its value in this record, its mean at this size, gain = value²/2."""

    value: float
    mean: float

    @property
    def gain(self) -> float:
        """Gain in log-likelihood of the true candidate over a clean record."""
        return 0.5 * self.value**2


def consult(seed: int, fault: str, size: float | None = None, **room: Any) -> Oracle:
    """The oracle's test of the fault that `simulate(seed, [fault], ...)` plants."""
    simulated = simulate(seed, [fault], None if size is None else {fault: size}, **room)
    settings = {name: getattr(simulated.world.room, name) for name in simulated.world.room.__dataclass_fields__}
    d = signature(seed, fault, size, **room)
    weighted = np.linalg.solve(covariance(seed, **settings), d)
    mean = float(np.sqrt(d @ weighted))
    return Oracle(float(weighted @ residuals(simulated)) / mean, mean)
