"""Many simulated series of one design, fitted in one call; shared by the tests and the tables of tests/bench.

The readings are those of the model fitted, with noise of a known standard deviation: what is tested here is the fit,
not the chemistry, which has tests of its own.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from reconcile.chemistry.acids import acid_table
from reconcile.chemistry.activity import activity_model
from reconcile.chemistry.composition import CARBONIC, form_table
from reconcile.chemistry.predict import forms_named
from reconcile.chemistry.water import DENSITY_20C
from reconcile.fitter.cases import Cases, Medium
from reconcile.fitter.fitting import Fitted, Task, fit
from reconcile.fitter.further_acids import only
from reconcile.fitter.model import Shape, predict, without_uncertainty
from reconcile.fitter.profile import interval
from reconcile.fitter.rejection import fit_without
from reconcile.fitter.scatter import Scatter

NOISE = 0.02
"""Standard deviation of a simulated reading [pH]."""
FLOOR = 0.001
ACIDS = {1: "acetic acid", 2: "succinic acid", 3: "citric acid"}


@dataclass(frozen=True)
class Simulated:
    """P series of n readings: the task, the true parameters (k,), and the Cramér-Rao bound of the free ones (f,)."""

    task: Task
    truth: np.ndarray[Any, Any]
    bound: np.ndarray[Any, Any]
    free: np.ndarray[Any, Any]


def simulated(
    steps: int, strength: bool, count: int, readings: int, seed: int, noise: float = NOISE, blunder: float = 0.0
) -> Simulated:
    """Titrations of 50 mL of 0.05 mol/L acid with 0.05 mol/L sodium hydroxide, beyond the last equivalence.

    blunder : added to one reading of each series, in standard deviations, at a place and with a sign drawn by lot
    """
    rng = np.random.default_rng(seed)
    name = ACIDS[steps]
    acids = without_uncertainty(only(acid_table(), [name, CARBONIC]))
    medium = Medium(
        form_table(forms_named([name, "sodium hydroxide"]), acids), acids, acids.index[name], activity_model("davies")
    )
    added = 50.0 * np.linspace(0.05, steps + 0.15, readings)
    amount = np.column_stack([2.5 / (50.0 + added), 0.05 * added / (50.0 + added)]) / DENSITY_20C
    one = Cases(
        np.array([0, readings], np.intp),
        2 * np.arange(readings + 1),
        np.tile([0, 1], readings),
        amount.ravel(),
        np.full(readings, 25.0),
        np.zeros(readings),
    )
    shape = Shape(steps, 0, 298.15, np.zeros(steps))
    truth = np.concatenate([[row.pka for row in acid_table().of(name)], np.zeros(steps + 2)])
    ph, jacobian = predict(medium, one, shape, truth[None])
    free = np.array([True] * steps + [False] * steps + [strength, False])
    slopes = jacobian[:, free]
    bound = noise * np.sqrt(np.diag(np.linalg.inv(slopes.T @ slopes)))
    observed = ph[None] + noise * rng.standard_normal((count, readings))
    if blunder:
        place, sign = rng.integers(0, readings, count), rng.choice([-1.0, 1.0], count)
        observed[np.arange(count), place] += blunder * noise * sign
    n = count * readings
    scatter = Scatter(np.full(n, FLOOR), np.ones(n), np.zeros(n), np.full(n, np.nan))
    cases = one.take(np.zeros(count, np.intp))
    task = Task(medium, cases, shape, observed.ravel(), scatter, free, np.zeros(shape.size))
    return Simulated(task, truth, bound, np.flatnonzero(free))


@dataclass(frozen=True)
class Quality:
    """RMS error over the Cramér-Rao bound, and share of 95 % intervals that hold the truth, of each free parameter."""

    error: np.ndarray[Any, Any]
    coverage: np.ndarray[Any, Any]
    rejected: float


def quality(made: Simulated) -> Quality:
    """Fits all series and judges the estimates and the intervals."""
    fitted = fit_without(made.task, fit(made.task))
    error = np.sqrt(np.mean((fitted.theta - made.truth) ** 2, axis=0))[made.free] / made.bound
    coverage = []
    for index in made.free.tolist():
        found = interval(made.task, fitted, index)
        coverage.append(float(np.mean((found.low <= made.truth[index]) & (made.truth[index] <= found.high))))
    dropped = made.task.cases.sums((~fitted.data.kept).astype(float)) > 0
    return Quality(error, np.array(coverage), float(dropped.mean()))


def moves(made: Simulated, clean: Simulated) -> np.ndarray[Any, Any]:
    """How far the first constant moves by a blunder, in standard uncertainties of the clean fit, (P,)."""
    bad, good = fit_of(made), fit_of(clean)
    u = np.sqrt(good.covariance[:, 0, 0])
    return np.asarray(np.abs(bad.theta[:, 0] - good.theta[:, 0]) / u)


def fit_of(made: Simulated) -> Fitted:
    """The fit of every series without what is rejected."""
    return fit_without(made.task, fit(made.task))


def without_blunder(made: Simulated, clean: Simulated) -> Simulated:
    """The clean twin of a set with blunders: the same seed draws the same noise."""
    return replace(made, task=replace(made.task, observed=clean.task.observed))
