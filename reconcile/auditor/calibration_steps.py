"""Jumps in the slopes or offsets of calibrations that no logged event explains."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from reconcile.auditor import laws
from reconcile.auditor.calibration_lines import display_sd
from reconcile.records.arrays import FloatArray

SIDE = 4
"""Calibrations needed on each side, so that each side can have a line of its own."""
FAMILY_WISE = 0.05


@dataclass(frozen=True)
class Jump:
    """A step between two neighbouring calibrations, at `position` (the first one after it).

    size, interval95 : after minus before; earliest, latest : 95 % interval of its day; p : before the number of dates
    is counted in
    """

    position: int
    size: float
    interval95: tuple[float, float]
    earliest: float
    latest: float
    p: float


def places(day: FloatArray) -> list[int]:
    """Where a step may stand: before a calibration that has enough on both sides."""
    return [i for i in range(SIDE, len(day) - SIDE + 1) if day[i] > day[i - 1]]


def best_step(day: FloatArray, y: FloatArray) -> Jump | None:
    """The likeliest step in a line through n values, or None where there is no place for one.

    Parameters
    ----------
    day : FloatArray (n,)    time [d], ascending
    y : FloatArray (n,)      values

    Notes
    -----
    At every place the step of y = level + rate (day - middle) + step is estimated by least squares; the one with the
    largest |t| is returned. Its day lies between two calibrations; the interval joins all places whose sum of squares
    stays within the F quantile (1, n - 4) of the least.
    """
    positions = np.array(places(day), np.intp)
    n = len(y)
    if not len(positions) or n < 2 * SIDE:
        return None
    apart = day - day.mean()
    sxx = float(apart @ apart)
    left = y - y.mean() - (apart @ y) / sxx * apart
    after = n - positions
    tail = np.r_[np.cumsum(apart[::-1])[::-1], 0.0][positions]
    information = after - after**2 / n - tail**2 / sxx
    score = np.r_[np.cumsum(left[::-1])[::-1], 0.0][positions]
    good = information > 1e-9
    if not good.any():
        return None
    positions, information, score = positions[good], information[good], score[good]
    rss = np.maximum(float(left @ left) - score**2 / information, 0.0)
    variance = np.maximum(rss / (n - 3), display_sd(y) ** 2)
    ratio = np.abs(score) / np.sqrt(information * variance)
    best = int(np.argmax(ratio))
    size = float(score[best] / information[best])
    half = float(laws.t_isf(0.025, n - 3) * np.sqrt(variance[best] / information[best]))
    near = rss <= rss[best] + float(laws.f_isf(0.05, 1, n - 4)) * variance[best]
    return Jump(
        int(positions[best]),
        size,
        (size - half, size + half),
        float(day[positions[near].min() - 1]),
        float(day[positions[near].max()]),
        float(2.0 * laws.t_sf(ratio[best], n - 3)),
    )


def steps(day: FloatArray, y: FloatArray, trials: int) -> list[Jump]:
    """Every step that stands out among `trials` places looked at in the whole record, in order of time.

    The likeliest one parts the values; each part is then looked at in the same way.
    """
    found = best_step(day, y)
    if found is None or found.p * trials > FAMILY_WISE:
        return []
    cut = found.position
    later = [
        Jump(j.position + cut, j.size, j.interval95, j.earliest, j.latest, j.p)
        for j in steps(day[cut:], y[cut:], trials)
    ]
    return [*steps(day[:cut], y[:cut], trials), found, *later]
