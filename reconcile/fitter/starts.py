"""Where the search begins: the best of a grid of constants, for each case."""

from __future__ import annotations

from itertools import combinations_with_replacement

import numpy as np

from reconcile.fitter.cases import Cases, Medium
from reconcile.fitter.least_squares import Data, chi_squared, search
from reconcile.fitter.model import Shape, evaluate, table_with
from reconcile.records.arrays import BoolArray, FloatArray, IntArray

MOST_READINGS = 10
"""Readings of a case that the grid is tried on, spread evenly over it."""
SPACING = {1: 0.75, 2: 1.5, 3: 1.75}
LOW, HIGH = 0.0, 14.0
BEST = 3
"""Grid points from which a search sets out, where there is more than one constant."""
STEPS = 8
AT_ONCE = 40_000
SHIFTS = np.arange(-4.0, 4.1, 0.5)


def grid(steps: int) -> FloatArray:
    """Constants to try, (g, s), in ascending order within a row."""
    values = np.arange(LOW, HIGH + 0.1, SPACING[steps])
    return np.array(list(combinations_with_replacement(values.tolist(), steps)), float)


def starts(
    medium: Medium, cases: Cases, shape: Shape, data: Data, free: BoolArray, held: FloatArray, near: bool = False
) -> FloatArray:
    """Parameters (P, k) from which to search.

    free : ndarray of bool (k,); held : ndarray (k,), the values of what is not free, and the start of all but constants
    near : try only common shifts of the constants held
    """
    thin = _thinned(cases)
    few = cases.of_readings(thin, _counts(cases))
    some = data.take(thin)
    tried = held[shape.pka] + SHIFTS[:, None] if near else grid(shape.steps)
    trials = np.unique(np.where(free[shape.pka], tried, held[shape.pka]), axis=0)
    found = np.empty((len(cases), shape.size))
    each = max(1, AT_ONCE // max(len(trials) * MOST_READINGS, 1))
    for begin in range(0, len(cases), each):
        which = np.arange(begin, min(begin + each, len(cases)))
        part, own = few.take(which), some.take(np.arange(few.first[begin], few.first[which[-1] + 1]))
        found[which] = _best(medium, part, shape, own, trials, free, held)
    return found


def _counts(cases: Cases) -> IntArray:
    return np.asarray(np.minimum(np.diff(cases.first), MOST_READINGS), np.intp)


def _thinned(cases: Cases) -> IntArray:
    """Readings spread evenly over each case, first and last among them, by index."""
    counts, whole = _counts(cases), np.diff(cases.first)
    place = [np.linspace(0, w - 1, c).round() for c, w in zip(counts.tolist(), whole.tolist(), strict=True)]
    return np.repeat(cases.first[:-1], counts) + np.concatenate(place).astype(np.intp)


def _best(
    medium: Medium, cases: Cases, shape: Shape, data: Data, trials: FloatArray, free: BoolArray, held: FloatArray
) -> FloatArray:
    """The best start of every case; where there are several constants, after a few steps from the best few."""
    count, tries = len(cases), len(trials)
    chi2 = _tried(medium, cases, shape, data, trials, held)
    best = min(BEST if int(free[shape.pka].sum()) > 1 else 1, tries)
    order = np.argsort(chi2, axis=1, kind="stable")[:, :best]
    theta = np.tile(held, (count * best, 1))
    theta[:, shape.pka] = trials[order].reshape(-1, shape.steps)
    if best == 1:
        return theta
    many = cases.take(np.repeat(np.arange(count), best))
    tried = data.take(_repeated(cases, best))
    point = search(medium, many, shape, tried, theta, np.tile(free, (len(theta), 1)), STEPS)
    winner = point.chi2.reshape(count, best).argmin(axis=1)
    return np.asarray(point.theta.reshape(count, best, -1)[np.arange(count), winner])


def _tried(medium: Medium, cases: Cases, shape: Shape, data: Data, trials: FloatArray, held: FloatArray) -> FloatArray:
    """Weighted sum of squares of every case at every trial, (P, g); the cases share the acids of the trials."""
    count, tries = len(cases), len(trials)
    if medium.own_pairs and tries > 1:  # every pair is laid out for every row of a call
        return np.concatenate([_tried(medium, cases, shape, data, trial[None], held) for trial in trials], axis=1)
    acids, stands_in = table_with(medium, shape, trials, np.tile(held[shape.dh], (tries, 1)))
    many = cases.take(np.repeat(np.arange(count), tries))
    own = data.take(_repeated(cases, tries))
    factor = np.full(len(many), np.exp(held[shape.strength]))
    ph = evaluate(medium, many, acids, np.tile(stands_in, count), factor).ph + held[shape.offset]
    return chi_squared(many, own, own.observed - ph).reshape(count, tries)


def _repeated(cases: Cases, times: int) -> IntArray:
    """Readings of every case, each case `times` over, in the order of `take(repeat(...))`."""
    pairs = zip(cases.first[:-1].tolist(), cases.first[1:].tolist(), strict=True)
    return np.concatenate([np.tile(np.arange(a, b), times) for a, b in pairs])
