"""The axis along which a record runs: time where it is logged, else the order of the rows."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import datetime

import numpy as np
from matplotlib.axes import Axes
from matplotlib.dates import AutoDateLocator, ConciseDateFormatter
from matplotlib.ticker import MaxNLocator

from reconcile.records.arrays import AnyArray, BoolArray, FloatArray
from reconcile.reporter.lookups import Lookups


def days(times: AnyArray) -> FloatArray:
    """Times as the axis counts them: days since 1970, NaN where missing."""
    seconds = times.astype("datetime64[s]")
    return np.where(np.isnat(seconds), np.nan, seconds.astype(np.int64) / 86400.0)


def day(when: datetime) -> float:
    """One time as the axis counts it."""
    return float(days(np.array([when], "datetime64[s]"))[0])


@dataclass(frozen=True)
class Timeline:
    """Where each reading stands along the axis.

    x : (n,) days, or the number of the reading in the record; NaN where it has no place
    dated : whether x is time
    """

    x: FloatArray
    dated: bool

    @property
    def placed(self) -> BoolArray:
        return np.isfinite(self.x)

    def name(self) -> str:
        return "read at" if self.dated else "reading, in order of the record"

    def dress(self, axes: Axes, most: int = 9, x: FloatArray | None = None) -> None:
        """Ticks and limits of the axis; of the whole record, or of these places on it."""
        air = 0.0
        known = self.x[self.placed] if x is None else x[np.isfinite(x)]
        if len(known):
            low, high = float(known.min()), float(known.max())
            air = max(0.02 * (high - low), 0.02 if x is None and self.dated else 0.6)
            axes.set_xlim(low - air, high + air)
        if not self.dated:
            axes.xaxis.set_major_locator(MaxNLocator(most - 1, integer=True))
            return
        # a midnight, labelled with its day, lies in view of any longer stretch
        within = "%Y" if len(known) and float(np.ptp(known)) + 2 * air >= 1.0 else "%d %b %Y"
        locator = AutoDateLocator(minticks=min(most, 4) - 1, maxticks=most)  # type: ignore[no-untyped-call]
        axes.xaxis.set_major_locator(locator)
        axes.xaxis.set_major_formatter(
            ConciseDateFormatter(  # type: ignore[no-untyped-call]
                locator,
                formats=["%Y", "%b", "%d %b", "%H:%M", "%H:%M", "%S"],
                zero_formats=["", "%b", "%d %b", "%d %b", "%H:%M", "%H:%M"],
                offset_formats=["", "%Y", "%Y", within, within, "%d %b %Y %H:%M"],
            )
        )


def timeline(lookups: Lookups) -> Timeline:
    """Time when at least half of the readings have one, else the order of the record."""
    missing = np.isnat(lookups.times)
    n = len(missing)
    if n and missing.mean() <= 0.5:
        return Timeline(days(lookups.times), True)
    return Timeline(np.arange(1, n + 1, dtype=float), False)
