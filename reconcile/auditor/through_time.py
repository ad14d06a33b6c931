"""Readings of one meter in order of time, for the kinds that begin at a date."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from datetime import datetime

import numpy as np

from reconcile.auditor.layout import DAY, Layout
from reconcile.records.arrays import FloatArray, IntArray

MOST_ONSETS = 60


@dataclass(frozen=True)
class Course:
    """One meter's dated readings: rows of the layout in order of time, and their days."""

    index: int
    meter: str
    rows: IntArray
    day: FloatArray

    def onsets(self, before: int, after: int) -> list[tuple[int, float]]:
        """(readings before, day midway between neighbours) for every change date with enough readings on each side.

        Thinned to MOST_ONSETS evenly spaced ones on a long record.
        """
        cuts = [i for i in range(max(before, 1), len(self.day) - after + 1) if self.day[i] > self.day[i - 1]]
        if len(cuts) > MOST_ONSETS:
            cuts = [cuts[i] for i in np.linspace(0, len(cuts) - 1, MOST_ONSETS).round().astype(int)]
        return [(i, float(self.day[i - 1] + self.day[i]) / 2) for i in cuts]


def courses(layout: Layout) -> Iterator[Course]:
    """Every meter with dated readings."""
    for index, meter in enumerate(layout.meters):
        rows = np.flatnonzero((layout.meter == index) & np.isfinite(layout.day))
        if len(rows):
            rows = rows[np.argsort(layout.day[rows], kind="stable")]
            yield Course(index, meter, rows, layout.day[rows])


def moment(layout: Layout, day: float) -> datetime:
    """Calendar time of a day counted from the first reading, to the minute."""
    start: datetime = layout.start.astype("datetime64[s]").astype(datetime)
    return datetime.fromtimestamp(round((start.timestamp() + day * DAY) / 60) * 60)


def calibrations_of(layout: Layout, meter: str) -> tuple[FloatArray, list[str]]:
    """Days of a meter's calibrations, in order, and the buffer lots of each; empty where none is recorded."""
    table = layout.records.calibrations
    mine = np.flatnonzero([str(m) == meter for m in table["meter"]]) if len(table) else np.zeros(0, np.intp)
    at = table["calibrated_at"][mine] if len(mine) else np.zeros(0, "datetime64[s]")
    dated = ~np.isnat(at)
    day = (at[dated] - layout.start) / np.timedelta64(1, "s") / DAY
    order = np.argsort(day, kind="stable")
    return day[order], [str(table["buffer_lots"][i]) for i in mine[dated][order]]


def calibration_days(layout: Layout, meter: str) -> FloatArray:
    """Days of a meter's calibrations, in order; empty where none is recorded."""
    return calibrations_of(layout, meter)[0]
