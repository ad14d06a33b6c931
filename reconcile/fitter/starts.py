"""Where the search begins: the best of a grid of constants, for each case."""

from __future__ import annotations

from dataclasses import replace
from itertools import combinations_with_replacement

import numpy as np

from reconcile.fitter.cases import Cases, Medium
from reconcile.fitter.least_squares import Data, at, search
from reconcile.fitter.model import Shape
from reconcile.records.arrays import BoolArray, FloatArray, IntArray

MOST_READINGS = 40
"""Readings of a case that the grid is tried on."""
SPACING = {1: 0.5, 2: 1.0, 3: 1.5}
LOW, HIGH = 0.0, 14.0
BEST = 3
"""Grid points from which a search sets out, where there is more than one constant."""
AT_ONCE = 20_000
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
        found[which] = _best(medium, few.take(which), shape, some, _rows(few, which), trials, free, held)
    return found


def _counts(cases: Cases) -> IntArray:
    return np.asarray(np.minimum(np.diff(cases.first), MOST_READINGS), np.intp)


def _thinned(cases: Cases) -> IntArray:
    """Readings spread evenly over each case, by index."""
    counts, whole = _counts(cases), np.diff(cases.first)
    place = np.concatenate([np.arange(c) * w // c for c, w in zip(counts.tolist(), whole.tolist(), strict=True)])
    return np.repeat(cases.first[:-1], counts) + place.astype(np.intp)


def _rows(cases: Cases, which: IntArray) -> IntArray:
    return np.flatnonzero(np.isin(cases.case, which))


def _best(
    medium: Medium,
    cases: Cases,
    shape: Shape,
    data: Data,
    rows: IntArray,
    trials: FloatArray,
    free: BoolArray,
    held: FloatArray,
) -> FloatArray:
    count, own = len(cases), data.take(rows)
    theta = np.tile(held, (count * len(trials), 1))
    theta[:, shape.pka] = np.repeat(trials[None], count, axis=0).reshape(-1, shape.steps)
    many = cases.take(np.repeat(np.arange(count), len(trials)))
    where = _repeated(cases, len(trials))
    chi2 = at(medium, many, shape, own.take(where), theta).chi2.reshape(count, len(trials))
    best = min(BEST if shape.steps > 1 else 1, len(trials))
    order = np.argsort(chi2, axis=1, kind="stable")[:, :best]
    theta = np.tile(held, (count * best, 1))
    theta[:, shape.pka] = trials[order].reshape(-1, shape.steps)
    if best == 1:
        return theta
    many = cases.take(np.repeat(np.arange(count), best))
    tried = own.take(_repeated(cases, best))
    tried = replace(tried, kept=np.ones(len(tried.observed), bool))
    point = search(medium, many, shape, tried, theta, np.tile(free, (len(theta), 1)), steps=12)
    winner = point.chi2.reshape(count, best).argmin(axis=1)
    return np.asarray(point.theta.reshape(count, best, -1)[np.arange(count), winner])


def _repeated(cases: Cases, times: int) -> IntArray:
    """Readings of every case, each case `times` over, in the order of `take(repeat(...))`."""
    return np.concatenate(
        [
            np.tile(np.arange(a, b), times)
            for a, b in zip(cases.first[:-1].tolist(), cases.first[1:].tolist(), strict=True)
        ]
    )
