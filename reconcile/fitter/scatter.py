"""The scatter of readings about a fit: what is known of it beforehand, and its estimate with a floor."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import special

from reconcile.fitter.cases import Cases
from reconcile.records.arrays import AnyArray, BoolArray, FloatArray

FIRST_SIGMA = 0.02
"""Noise assumed until there is an estimate [pH]."""
HALVINGS = 60
LEVEL = 0.95


@dataclass(frozen=True)
class Scatter:
    """What is known about the scatter of N readings before any fit; all FloatArray (N,).

    floor : least standard deviation of a reading [pH]: the display's share, the settings' floor
    averaged : readings averaged into the one recorded
    taking : variance from amounts taken anew for each reading [pH^2]
    given : standard deviation stated for the reading [pH]; NaN where it is to be estimated
    """

    floor: FloatArray
    averaged: FloatArray
    taking: FloatArray
    given: FloatArray

    def variance(self, sigma: FloatArray) -> FloatArray:
        """Variance of every reading at a noise of sigma (N,) [pH]."""
        own = np.where(np.isfinite(self.given), self.given, sigma / np.sqrt(self.averaged))
        return np.asarray(np.maximum(own, self.floor) ** 2 + self.taking)

    def take(self, rows: AnyArray) -> Scatter:
        return Scatter(self.floor[rows], self.averaged[rows], self.taking[rows], self.given[rows])

    def known_in(self, cases: Cases) -> BoolArray:
        """Cases in which no reading's noise is to be estimated, (P,)."""
        return np.asarray(cases.sums(np.where(np.isfinite(self.given), 0.0, 1.0)) == 0.0)


def estimated_sigma(
    cases: Cases, scatter: Scatter, residual: FloatArray, kept: BoolArray, freedom: FloatArray
) -> FloatArray:
    """Noise at which the weighted sum of squares equals the degrees of freedom, (P,) [pH]; 0 where the floor is enough.

    Notes
    -----
    Solves sum r^2 / v(sigma) = n - p, which is the usual s^2 = RSS / (n - p) where all weights are equal.

    References
    ----------
    Paule and Mandel 1982, J. Res. Natl. Bur. Stand. 87:377, doi:10.6028/jres.087.022 (the equation for the component
    of variance between sets).
    """

    def over(sigma: FloatArray) -> BoolArray:
        part = np.where(kept, residual**2 / scatter.variance(cases.spread(sigma)), 0.0)
        return np.asarray(cases.sums(part) > freedom)

    low, high = np.full(len(cases), -16.0), np.full(len(cases), 4.0)
    for _ in range(HALVINGS):
        middle = 0.5 * (low + high)
        more = over(np.exp(middle))
        low, high = np.where(more, middle, low), np.where(more, high, middle)
    found = np.exp(0.5 * (low + high))
    return np.where(over(np.zeros(len(cases))) & (freedom > 0.0), found, 0.0)


def quantile_t(freedom: FloatArray, level: float = LEVEL) -> FloatArray:
    """Two-sided quantile of Student's t; of the normal distribution where the freedom is infinite."""
    upper = 0.5 + 0.5 * level
    finite = np.isfinite(freedom)
    return np.where(finite, special.stdtrit(np.where(finite, freedom, 1.0), upper), special.ndtri(upper))


def quantile_f(count: int, freedom: FloatArray, level: float = LEVEL) -> FloatArray:
    """count times the quantile of F(count, freedom): a profile's reach; chi squared where the freedom is infinite."""
    finite = np.isfinite(freedom)
    by_f = count * special.fdtri(count, np.where(finite, freedom, 1.0), level)
    return np.where(finite, by_f, special.chdtri(count, 1.0 - level))


def tail_t(value: FloatArray, freedom: FloatArray) -> FloatArray:
    """Two-sided chance of a value of Student's t as large."""
    finite = np.isfinite(freedom)
    by_t = 2.0 * special.stdtr(np.where(finite, freedom, 1.0), -np.abs(value))
    return np.where(finite, by_t, 2.0 * special.ndtr(-np.abs(value)))
