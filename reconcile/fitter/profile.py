"""Likelihood profiles: the interval of one parameter when all others follow it, and the curve for a picture."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from reconcile.fitter.fitting import Fitted, Task
from reconcile.fitter.least_squares import bounds, search
from reconcile.fitter.scatter import LEVEL, quantile_f
from reconcile.records.arrays import FloatArray, IntArray

TRIES, SECANTS = 40, 6
"""Tries in all for the ends of an interval; after so many by secants, every other one halves the bracket."""
PRECISION = 1e-4
"""Of an interval's end: part of the half-width."""
POINTS = 41


@dataclass(frozen=True)
class Interval:
    """Ends of an interval, (P,) each; infinite where the profile stays below its reach up to the parameter's bound."""

    low: FloatArray
    high: FloatArray


def reach(fitted: Fitted, level: float = LEVEL) -> FloatArray:
    """Rise of the weighted sum of squares at the ends of an interval, (P,): F(1, n - p), or chi squared."""
    return quantile_f(1, fitted.freedom, level)


def interval(task: Task, fitted: Fitted, index: int, level: float = LEVEL) -> Interval:
    """The profile-likelihood interval of one parameter.

    Parameters
    ----------
    task, fitted
        P cases and their fit.
    index : int
        Parameter; where it is not free, or at a bound, the interval reaches from the estimate to whatever is found.

    Returns
    -------
    Interval

    Notes
    -----
    The ends are where the least sum of squares at a fixed parameter exceeds the minimum by F(1, n - p) in units of the
    noise. They are found by the secant method on the signed root of the excess, which is nearly straight.

    References
    ----------
    Bates and Watts 1988, Nonlinear Regression Analysis and Its Applications, section 6.1.2 (profile t).
    """
    count = len(task.cases)
    twice = replace(task, cases=task.cases.take(np.tile(np.arange(count), 2)))
    both = replace(
        fitted,
        data=fitted.data.take(np.tile(np.arange(task.cases.readings), 2)),
        theta=np.tile(fitted.theta, (2, 1)),
        free=np.tile(fitted.free, (2, 1)),
    )
    sign = np.repeat([-1.0, 1.0], count)
    wanted = np.sqrt(np.tile(reach(fitted, level), 2))
    centre, least = np.tile(fitted.theta[:, index], 2), np.tile(fitted.chi2, 2)
    u = np.sqrt(np.tile(fitted.covariance[:, index, index], 2))
    low, high, _ = (float(b[index]) for b in bounds(task.shape))
    edge = np.where(sign < 0.0, low, high)
    room = np.abs(edge - centre)
    step = np.minimum(np.where(u > 0.0, wanted * u, 0.1), room)
    inner, inner_rise = np.zeros(2 * count), np.zeros(2 * count)
    outer, outer_rise = np.full(2 * count, np.nan), np.full(2 * count, np.nan)
    found = np.full(2 * count, np.nan)
    found[room <= 0.0] = np.inf
    theta = both.theta.copy()
    for turn in range(TRIES):
        left = np.flatnonzero(np.isnan(found))
        if not len(left):
            break
        theta[left], chi2 = _held(twice, both, left, index, centre + sign * step, theta)
        rise = np.sqrt(np.maximum(chi2 - least[left], 0.0))
        enough = np.abs(rise - wanted[left]) <= PRECISION * wanted[left]
        beyond = rise >= wanted[left]
        at_edge = ~beyond & (step[left] >= room[left])
        found[left[enough]] = step[left[enough]]
        found[left[at_edge & ~enough]] = np.inf
        outer[left[beyond]], outer_rise[left[beyond]] = step[left[beyond]], rise[beyond]
        inner[left[~beyond]], inner_rise[left[~beyond]] = step[left[~beyond]], rise[~beyond]
        halve = turn >= SECANTS and turn % 2 == 0
        step[left] = _next(inner, inner_rise, outer, outer_rise, wanted, room, halve)[left]
    found = np.where(np.isnan(found), outer, found)
    ends = centre + sign * found
    return Interval(ends[:count], ends[count:])


def _next(
    inner: FloatArray,
    inner_rise: FloatArray,
    outer: FloatArray,
    outer_rise: FloatArray,
    wanted: FloatArray,
    room: FloatArray,
    halve: bool,
) -> FloatArray:
    """The next distance to try: between the two that bracket the end, or further out where there is no outer one."""
    slope = np.where(inner_rise > 0.0, inner / np.maximum(inner_rise, 1e-300), 2.0 * np.maximum(inner, 1e-6))
    further = np.clip(slope * wanted, 1.05 * inner, 3.0 * np.maximum(inner, 1e-6))
    share = (wanted - inner_rise) / np.maximum(outer_rise - inner_rise, 1e-300)
    between = inner + (outer - inner) * (0.5 if halve else np.clip(share, 0.02, 0.98))
    return np.minimum(np.where(np.isnan(outer), further, between), room)


def _held(
    task: Task, fitted: Fitted, left: IntArray, index: int, value: FloatArray, theta: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Parameters and least sum of squares of some cases with one parameter held."""
    rows = np.flatnonzero(np.isin(task.cases.case, left))
    start, free = theta[left].copy(), fitted.free[left].copy()
    start[:, index], free[:, index] = value[left], False
    point = search(task.medium, task.cases.take(left), task.shape, fitted.data.take(rows), start, free)
    return point.theta, point.chi2


def curve(task: Task, fitted: Fitted, index: int, low: float, high: float) -> tuple[FloatArray, FloatArray]:
    """The profile of one case: values of the parameter (m,), and how far the sum of squares then rises at least."""
    values = np.unique(np.append(np.linspace(low, high, POINTS), fitted.theta[0, index]))
    many = replace(task, cases=task.cases.take(np.zeros(len(values), np.intp)))
    all_ = replace(
        fitted,
        data=fitted.data.take(np.tile(np.arange(task.cases.readings), len(values))),
        theta=np.tile(fitted.theta, (len(values), 1)),
        free=np.tile(fitted.free, (len(values), 1)),
    )
    _, chi2 = _held(many, all_, np.arange(len(values)), index, values, all_.theta)
    return values, np.maximum(chi2 - float(fitted.chi2[0]), 0.0)
