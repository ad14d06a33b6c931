"""Readings of one meter in order of time, for the kinds that begin at a date."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from datetime import datetime

import numpy as np

from reconcile.auditor.layout import DAY, Layout
from reconcile.auditor.proposals import Context, Proposal, stack
from reconcile.records.arrays import FloatArray, IntArray

MOST_ONSETS, COARSE_ONSETS = 60, 12
"""Change dates tried for a meter; on a long record, the few that say whether more are worth trying."""
ROOM = 2.5
"""Score of a coarse change date from which a long record's meter is looked at date by date."""
Onset = tuple[int, float]
"""Readings before a change, and the day midway between its neighbours."""


@dataclass(frozen=True)
class Course:
    """One meter's dated readings: rows of the layout in order of time, and their days."""

    index: int
    meter: str
    rows: IntArray
    day: FloatArray

    def onsets(self, before: int, after: int, most: int = MOST_ONSETS) -> list[Onset]:
        """Every change date with enough readings on each side, thinned to `most` evenly spaced ones."""
        return self.between(max(before, 1), len(self.day) - after, most)

    def between(self, first: int, last: int, most: int = MOST_ONSETS) -> list[Onset]:
        """Change dates with `first` to `last` readings before them, both counted, thinned likewise."""
        inside = np.arange(first, min(last, len(self.day) - 1) + 1)
        cuts = inside[self.day[inside] > self.day[inside - 1]]
        if len(cuts) > most:
            cuts = cuts[np.linspace(0, len(cuts) - 1, most).round().astype(int)]
        return [(int(i), float(self.day[i - 1] + self.day[i]) / 2) for i in cuts]


def courses(layout: Layout) -> list[Course]:
    """Every meter with dated readings."""
    if "courses" not in layout.kept:
        found = []
        for index, meter in enumerate(layout.meters):
            rows = np.flatnonzero((layout.meter == index) & np.isfinite(layout.day))
            if len(rows):
                rows = rows[np.argsort(layout.day[rows], kind="stable")]
                found.append(Course(index, meter, rows, layout.day[rows]))
        layout.kept["courses"] = found
    result: list[Course] = layout.kept["courses"]
    return result


def refined(
    context: Context,
    coarse: Proposal,
    side: tuple[int, int],
    effect: Callable[[Course, int, float], FloatArray],
) -> list[tuple[Course, list[Onset]]]:
    """Meters of a long record on which a coarse change date comes near significance, with finer dates.

    side : readings needed before and after; effect : of a change after so many readings, from a day on, on the rows
    after it
    """
    layout = context.layout
    score = np.abs(context.screen(coarse.x, steady=True))
    room = context.room(ROOM, len(layout.meters))
    near = {str(coarse.subject[k]) for k in np.flatnonzero(score > room).tolist()}
    found = []
    for course in courses(layout):
        many = course.onsets(*side) if course.meter in near else []
        if not many:
            continue
        columns = stack([(course.rows[i:], effect(course, i, day)) for i, day in many], len(layout))
        best = int(np.argmax(np.abs(context.screen(columns))))
        ends = many[max(best - 1, 0)][0], many[min(best + 1, len(many) - 1)][0]
        found.append((course, sorted({*many, *course.between(*ends)})))
    return found


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
