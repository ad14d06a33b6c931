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
from scipy import linalg, optimize

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
NOISE_FLOOR = 0.005
"""Least reading noise that the settings state [pH]."""
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


@dataclass(frozen=True)
class Parts:
    """What the covariance of a clean record is made of [pH²], (n, n) each.

    known : instruments, lots, constants, temperature and display, with the room's spreads
    alike : 1 where two readings share a meter and a day; prepared : slopes of a preparation error
    noise, day, preparation : the room's own variances of the three that a record must be asked for
    """

    known: FloatArray
    alike: FloatArray
    prepared: FloatArray
    noise: float
    day: float
    preparation: float

    def whole(self, noise: float, day: float, preparation: float) -> FloatArray:
        """The covariance with given variances of noise, meter-day and preparation."""
        return self.known + noise * np.eye(len(self.known)) + day * self.alike + preparation * self.prepared


def parts(seed: int, **room: Any) -> Parts:
    """The parts of the covariance of a clean record of this seed and room."""
    full = simulate(seed, **room).world.room
    world = simulate(seed, **{**room, **STILL}).world
    base, k = world.true_ph(), full.spread
    lots, prepared = _slope(world, base)
    n = len(base)
    v = np.eye(n) * full.resolution**2 / 12.0
    meter = (world.meter[:, None] == world.meter[None, :]).astype(float)
    v += meter * (full.accuracy * k / ROOT3) ** 2
    v += meter * np.outer(base - 7.0, base - 7.0) * (full.span_percent / 100.0 * k / ROOT3) ** 2
    v += meter * ((world.day // 7)[:, None] == (world.day // 7)[None, :]) * full.session_sd**2
    v += lots @ lots.T * (full.lot_percent / 100.0 * k / ROOT3) ** 2
    kept = world.celsius_true
    world.celsius_true = kept + 0.1
    v += np.diag((world.true_ph() - base) / 0.1 * full.temperature_k * k / ROOT3) ** 2
    world.celsius_true = kept
    for (acid, step), value in list(world.pka_shift.items()):
        world.pka_shift[acid, step] = value + STEP
        slope = (world.true_ph() - base) / STEP
        world.pka_shift[acid, step] = value
        v += np.outer(slope, slope) * (chemistry.acids()[acid].u[step - 1] * full.pka_u * k) ** 2
    alike = meter * (np.floor(world.day)[:, None] == np.floor(world.day)[None, :])
    preparation = (full.preparation_percent / 100.0 * k / ROOT3) ** 2
    return Parts(v, alike, prepared, (full.noise * k) ** 2, full.meter_day_sd**2, preparation)


def covariance(seed: int, **room: Any) -> FloatArray:
    """Covariance of the residuals of a clean record of this seed and room [pH²], (n, n)."""
    of = parts(seed, **room)
    return of.whole(of.noise, of.day, of.preparation)


@dataclass(frozen=True)
class Oracle:
    """The best test of one planted fault: its value in this record, its mean at this size, gain = value²/2."""

    value: float
    mean: float

    @property
    def gain(self) -> float:
        """Gain in log-likelihood of the true candidate over a clean record."""
        return 0.5 * self.value**2


@dataclass(frozen=True)
class Asked:
    """What the oracle is shown: shape of the fault and residuals (n,) [pH], and the parts of their covariance."""

    shape: FloatArray
    residuals: FloatArray
    parts: Parts

    def with_spreads(self) -> Oracle:
        """The test by one who knows all spreads."""
        of = self.parts
        weighted = np.linalg.solve(of.whole(of.noise, of.day, of.preparation), self.shape)
        mean = float(np.sqrt(self.shape @ weighted))
        return Oracle(float(weighted @ self.residuals) / mean, mean)

    def without_spreads(self) -> Oracle:
        """The same test by one who must ask the record for noise, meter-day and preparation.

        The three variances are those of greatest restricted likelihood beside the candidate (Patterson and Thompson
        1971, Biometrika 58:545), none below what the room's papers state; `mean` is the one under the variances found.
        """
        d, r, of = self.shape, self.residuals, self.parts

        def test(log_variances: FloatArray) -> tuple[float, float, float]:
            noise, day, preparation = np.exp(log_variances)
            root = linalg.cho_factor(of.whole(noise, day, preparation), lower=True)
            wd, wr = linalg.cho_solve(root, d), linalg.cho_solve(root, r)
            size = float(d @ wd)
            half_log_det = float(np.log(np.diag(root[0])).sum())
            likelihood = -half_log_det - 0.5 * np.log(size) - 0.5 * (float(r @ wr) - float(d @ wr) ** 2 / size)
            return likelihood, float(d @ wr) / size**0.5, size**0.5

        least = np.log([NOISE_FLOOR**2, 1e-8, of.preparation])
        start = np.log([max(of.noise, NOISE_FLOOR**2) * 1.2, 2e-5, of.preparation * 2.0])
        bounds = [(low, low + 12.0) for low in least]
        found = optimize.minimize(lambda v: -test(v)[0], start, method="L-BFGS-B", bounds=bounds)
        _, value, mean = test(found.x)
        return Oracle(value, mean)


def ask(seed: int, fault: str, size: float | None = None, **room: Any) -> Asked:
    """What `simulate(seed, [fault], ...)` shows the oracle."""
    simulated = simulate(seed, [fault], None if size is None else {fault: size}, **room)
    settings = {name: getattr(simulated.world.room, name) for name in simulated.world.room.__dataclass_fields__}
    return Asked(signature(seed, fault, size, **room), residuals(simulated), parts(seed, **settings))


def consult(seed: int, fault: str, size: float | None = None, **room: Any) -> Oracle:
    """The oracle's test of the fault that `simulate(seed, [fault], ...)` plants, all spreads known to it."""
    return ask(seed, fault, size, **room).with_spreads()
