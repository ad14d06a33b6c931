"""Readings of one meter in order of time, for the kinds that begin at a date."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from datetime import datetime

import numpy as np

from reconcile.auditor.layout import DAY, Layout
from reconcile.auditor.proposals import Context, Proposal, steadied
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


Make = Callable[[Course, list[Onset]], Proposal | None]
"""Candidates of one meter that begin at given dates, each touching all its readings from there on."""


def refined(context: Context, coarse: Proposal, side: tuple[int, int], make: Make) -> list[Proposal | None]:
    """For meters of a long record on which a coarse change date comes near significance: all usual dates, and the
    dates about the best of these.

    side : readings needed before and after
    """
    promising = context.promising(coarse.x, ROOM, steady=True)
    near = {str(coarse.subject[k]) for k in promising.tolist()}
    found = []
    for course in courses(context.layout):
        if course.meter not in near:
            continue
        many = _kept(context, coarse.kind, course, course.onsets(*side), make)
        if many is None:
            continue
        best = int(np.argmax(np.abs(context.screen(many.x, steady=True))))
        before = len(course.rows) - np.diff(many.x.indptr)  # readings before each candidate's onset
        places = np.unique(before)
        at = int(np.searchsorted(places, before[best]))
        ends = int(places[max(at - 1, 0)]), int(places[min(at + 1, len(places) - 1)])
        found += [many, _kept(context, coarse.kind, course, course.between(max(ends[0], 1), ends[1]), make)]
    return found


def _kept(context: Context, kind: str, course: Course, onsets: list[Onset], make: Make) -> Proposal | None:
    """The proposal for some dates, made once a record."""
    if not onsets:
        return None
    key = (kind, course.meter, onsets[0][0], onsets[-1][0], len(onsets))
    return context.kept(key, lambda: steadied(make(course, onsets)))


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
