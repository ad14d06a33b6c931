"""A straight line through slopes or offsets of calibrations, and when it crosses a limit."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from reconcile.auditor import laws
from reconcile.records.arrays import FloatArray

LEAST_POINTS = 4
"""Calibrations for a line: two to place it, two to tell how far they scatter."""
STEPS = (1.0, 0.1, 0.01, 0.001)


@dataclass(frozen=True)
class Fit:
    """y = level + rate (day - middle), by least squares.

    n, sxx : number of points and sum of squared distances from the middle [d^2]
    sd : standard deviation about the line, never under the display's share; t : two-sided 95 % quantile, n - 2 degrees
    robust, robust95 : rate after Theil and Sen with its 95 % interval
    """

    n: int
    middle: float
    sxx: float
    level: float
    rate: float
    sd: float
    t: float
    robust: float
    robust95: tuple[float, float]

    def at(self, day: float) -> float:
        """Value of the line on a day."""
        return float(self.level + self.rate * (day - self.middle))

    @property
    def rate95(self) -> tuple[float, float]:
        """95 % interval of the rate."""
        half = self.t * self.sd / float(np.sqrt(self.sxx))
        return self.rate - half, self.rate + half


def display_sd(values: FloatArray) -> float:
    """Standard deviation of rounding to the coarsest decimal step that all values keep to: step over sqrt 12."""
    for step in STEPS:
        if np.all(np.abs(values - np.round(values / step) * step) < 1e-6):
            return step / float(np.sqrt(12.0))
    return 0.0


def fit_line(day: FloatArray, y: FloatArray) -> Fit | str:
    """The line through values of some days, or why there is none.

    Parameters
    ----------
    day : FloatArray (n,)    time [d]; finite
    y : FloatArray (n,)      values; finite

    Returns
    -------
    Fit or str
        Rates are per day.

    Notes
    -----
    Least squares with the interval of Student's law, n - 2 degrees of freedom: it takes the scatter of successive
    calibrations as independent. Beside it the median of all pairwise rates with its rank interval, which a few wild
    calibrations do not move.

    References
    ----------
    Theil 1950, Indag. Math. 12:85; Sen 1968, J. Am. Stat. Assoc. 63:1379, doi:10.1080/01621459.1968.10480934.
    """
    n = len(y)
    if n < LEAST_POINTS:
        return f"only {n} of the {LEAST_POINTS} calibrations that a line needs" if n else "no value is recorded"
    middle = float(day.mean())
    apart = day - middle
    sxx = float(apart @ apart)
    if np.ptp(day) < 1.0:
        return "all calibrations lie within a day"
    level, rate = float(y.mean()), float(apart @ y) / sxx
    left = y - level - rate * apart
    sd = max(float(np.sqrt(left @ left / (n - 2))), display_sd(y))
    from scipy import stats  # takes long to load, and few records need it

    robust = stats.theilslopes(y, day, 0.95)
    between = (float(robust.low_slope), float(robust.high_slope))
    return Fit(
        n, middle, sxx, level, rate, sd, float(laws.t_isf(0.025, n - 2)), float(robust.slope), (between[0], between[1])
    )


@dataclass(frozen=True)
class Dates:
    """When a line crosses a limit [d]; NaN for a date that the points do not give.

    at : the fitted line; earliest, latest : 95 % interval of the true line's crossing
    told : the sign of the rate is known, so that the interval has two ends
    """

    at: float
    earliest: float
    latest: float
    told: bool


def crossing(fit: Fit, limit: float) -> Dates:
    """When the line has a value, with the 95 % interval of the day on which the true line has it.

    Notes
    -----
    All days u (from the middle) on which the limit lies inside the 95 % band of the line,
    (level + rate u - limit)^2 <= t^2 sd^2 (1/n + u^2/sxx). Where the interval of the rate holds zero these days have no
    last one; then only the first is given.

    References
    ----------
    Fieller 1954, J. R. Stat. Soc. B 16:175; Draper and Smith, Applied Regression Analysis, 3rd ed., section 3.2
    (inverse regression; from memory).
    """
    wide = (fit.t * fit.sd) ** 2
    away = fit.level - limit
    a = fit.rate**2 - wide / fit.sxx
    b = 2.0 * fit.rate * away
    c = away**2 - wide / fit.n
    told = a > 0
    root = max(b * b - 4.0 * a * c, 0.0) ** 0.5
    if told:
        low, high = sorted(((-b - root) / (2.0 * a), (-b + root) / (2.0 * a)))
        return Dates(fit.middle - away / fit.rate, fit.middle + low, fit.middle + high, True)
    if c <= 0 or a == 0 or b * b - 4.0 * a * c < 0:
        return Dates(np.nan, np.nan, np.nan, False)
    return Dates(np.nan, fit.middle + max((-b - root) / (2.0 * a), (-b + root) / (2.0 * a)), np.nan, False)
