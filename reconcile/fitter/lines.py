"""The lines of the pictures: the fitted curve through the readings, likelihood profiles, shares of the species."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from reconcile.chemistry.water import ZERO_CELSIUS
from reconcile.fitter.apparent import apparent_shift, state_shares
from reconcile.fitter.cases import Cases
from reconcile.fitter.evidence import Evidence
from reconcile.fitter.fitting import Fitted, Task
from reconcile.fitter.gaps import composition
from reconcile.fitter.model import Shape, found_at
from reconcile.fitter.profile import Interval, curve
from reconcile.records.arrays import FloatArray, IntArray
from reconcile.records.pka_results import Curve

BETWEEN = 8
"""Points of the fitted curve between two readings."""
MOST_READINGS = 120
"""Readings of a series from which on its curve is drawn through the readings alone."""
MOST_SERIES = 12
ALIKE = 1.5
"""Largest ratio of concentrations of single solutions that one curve may join."""
BEYOND = 1.5
"""Reach of a profile's picture, in half-widths of the interval."""
SPECIES_POINTS = 201


def abscissa(evidence: Evidence) -> tuple[str, FloatArray]:
    """What the readings are drawn against: base per acid where it varies, else the acid's concentration."""
    acid, base = composition(evidence)
    if np.all(np.isfinite(base)) and float(np.ptp(base)) >= 0.05:
        return "base_per_acid", base
    return "concentration", acid


def fitted_curves(evidence: Evidence, shape: Shape, fitted: Fitted) -> tuple[Curve, ...]:
    """The fitted pH between neighbouring readings of a series, by mixing the two solutions in all proportions."""
    kind, x = abscissa(evidence)
    acid, _ = composition(evidence)
    out = []
    names = dict.fromkeys(evidence.series.tolist())
    for name in list(names)[:MOST_SERIES]:
        mine = np.flatnonzero(evidence.series == name)
        mine = mine[np.argsort(x[mine], kind="stable")]
        if len(mine) < 2 or (name == "" and kind == "base_per_acid" and acid[mine].max() > ALIKE * acid[mine].min()):
            continue
        if float(np.ptp(evidence.temperature[mine])) > 1.0:
            continue
        found = _mixed(evidence, shape, fitted, mine)
        order = np.argsort(found.x, kind="stable")
        out.append(Curve(name, found.x[order], found.y[order]))
    return tuple(out)


def _mixed(evidence: Evidence, shape: Shape, fitted: Fitted, order: IntArray) -> Curve:
    share = np.linspace(0.0, 1.0, BETWEEN + 1)[:-1] if len(order) <= MOST_READINGS else np.zeros(1)
    first = np.repeat(order[:-1], len(share))
    second = np.repeat(order[1:], len(share))
    part = np.tile(share, len(order) - 1)
    first, second, part = (np.append(a, b) for a, b in ((first, order[-1]), (second, order[-1]), (part, 0.0)))
    count = len(first)
    pairs = np.column_stack([first, second]).ravel()
    both = evidence.cases.of_readings(pairs, np.array([2 * count]))
    weight = np.column_stack([1.0 - part, part]).ravel()[both.reading]
    cases = Cases(
        np.array([0, count], np.intp),
        both.start[::2],
        both.form,
        both.amount * weight,
        (1.0 - part) * evidence.temperature[first] + part * evidence.temperature[second],
        evidence.cases.open_co2[first],
    )
    found = found_at(evidence.medium, cases, shape, fitted.theta)
    kind, x = abscissa(evidence)
    acid, _ = composition(evidence)
    mixed = (1.0 - part) * acid[first] + part * acid[second]
    if kind == "base_per_acid":
        along = ((1.0 - part) * acid[first] * x[first] + part * acid[second] * x[second]) / mixed
    else:
        along = mixed
    return Curve("", along, found.ph + float(fitted.theta[0, shape.offset]))


def profiles(task: Task, fitted: Fitted, intervals: Sequence[Interval]) -> tuple[Curve, ...]:
    """The likelihood profile of every constant found, labelled by its step."""
    out = []
    for step in np.flatnonzero(fitted.seen[0][task.shape.pka]).tolist():
        centre, u = float(fitted.theta[0, step]), float(np.sqrt(fitted.covariance[0, step, step]))
        ends = []
        for end, sign in ((float(intervals[step].low[0]), -1.0), (float(intervals[step].high[0]), 1.0)):
            reach = abs(end - centre) if np.isfinite(end) else min(4.0 * u, 3.0)
            ends.append(centre + sign * max(BEYOND * reach, 1e-4))
        x, y = curve(task, fitted, step, ends[0], ends[1])
        out.append(Curve(str(step + 1), x, y))
    return tuple(out)


def species(evidence: Evidence, shape: Shape, fitted: Fitted, strength: float) -> tuple[Curve, ...]:
    """Shares of the acid's protonation states against pH, labelled by charge, at one ionic strength [mol/kg]."""
    low, high = float(evidence.observed.min()), float(evidence.observed.max())
    ph = np.linspace(max(min(low - 1.5, 3.0), 0.0), min(max(high + 1.5, low + 6.0), 14.0), SPECIES_POINTS)
    mean, at = np.array([shape.kelvin - ZERO_CELSIUS]), np.array([strength])
    shift = apparent_shift(evidence.medium.model, shape.charge, shape.steps, mean, at)
    shares = state_shares(ph, np.broadcast_to(fitted.theta[0, shape.pka] + shift[0], (len(ph), shape.steps)))
    return tuple(Curve(f"{shape.charge - lost:d}", ph, shares[:, lost]) for lost in range(shape.steps + 1))
