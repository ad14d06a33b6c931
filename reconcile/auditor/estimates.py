"""Estimates and intervals of a deviation that was looked at because it was large."""

from __future__ import annotations

import numpy as np
from scipy import optimize, special

from reconcile.auditor import laws
from reconcile.auditor.alarm import Alarm, block_p, score_needed
from reconcile.records.arrays import BoolArray, FloatArray

NEAREST = 0.3
"""Least distance of an estimate above the size it had to reach, in spreads: that size rests on spreads known to about
8 % and on simulated probabilities, and an estimate taken to lie exactly on it would say nothing."""


def critical_z(
    correlation: FloatArray, root: FloatArray, one_sided: BoolArray, trials: int, rate: float, seed: int
) -> float:
    """Score at which a block's family-wise probability equals the alarm rate."""
    low, high = 1.5, 9.0

    def excess(z: float) -> float:
        return float(np.log(max(trials * block_p(correlation, root, one_sided, z, seed), 1e-300)) - np.log(rate))

    if excess(low) <= 0:
        return low
    return float(optimize.brentq(excess, low, high, xtol=1e-3))


def critical_score(alarm: Alarm, k: int, df: FloatArray, rate: float, seed: int) -> float:
    """Score that candidate k of the pool had to pass; df (laws,) as alarm.score_df gives it."""
    correlation, root, one_sided = alarm.block(int(alarm.pool.block[k]))
    trials = alarm.pool.trials(k)
    if len(correlation):
        normal = critical_z(correlation, root, one_sided, trials, rate, seed)
    else:
        normal = float(laws.norm_isf(rate / trials / 2.0))
    return score_needed(alarm.model, df, 2.0 * float(laws.norm_sf(normal)))


def _tail_beyond(x: float, mean: float, cut: float) -> float:
    """P(X > x given |X| >= cut) for X normal with unit spread, x beyond the cut on the positive side."""
    upper_x, upper, lower = special.log_ndtr(mean - x), special.log_ndtr(mean - cut), special.log_ndtr(-cut - mean)
    return float(np.exp(upper_x - np.logaddexp(upper, lower)))


def given_selected(estimate: float, u: float, cut: float, levels: tuple[float, ...]) -> list[float]:
    """True deviations at which the estimate lies at given levels of its law, given that |estimate| >= cut.

    With levels (0.025, 0.5, 0.975): the lower end, the median-unbiased estimate, the upper end (Lee, Sun, Sun and
    Taylor 2016, Ann. Stat. 44:907, for intervals of a normal mean given a selection; from memory).

    Parameters
    ----------
    estimate, u, cut : float    estimate, its standard uncertainty, and the size it had to reach, in one unit
    """
    sign = 1.0 if estimate >= 0 else -1.0
    x = abs(estimate) / u
    limit = min(cut / u, x - NEAREST)
    values = []
    for level in levels:

        def short(mean: float, want: float = level) -> float:
            return _tail_beyond(x, mean, limit) - want

        low, high = x - 12.0, x + 12.0
        while short(low) > 0 and low > x - 200.0:
            low -= 12.0
        values.append(float(optimize.brentq(short, low, high)) if short(low) < 0 < short(high) else x)
    return sorted(sign * v * u for v in values)
