"""Slope and offset of one meter's calibrations through time: limits, events, lines, and when a line crosses a limit."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from matplotlib.axes import Axes
from matplotlib.dates import ConciseDateFormatter
from matplotlib.figure import Figure
from matplotlib.lines import Line2D

from reconcile.records.arrays import FloatArray
from reconcile.records.meter_results import QUANTITIES, Crossing, Line, MeterHistory
from reconcile.reporter.figures.marks import legend_above
from reconcile.reporter.figures.style import BLUE, GREY, INK, OCHRE, WIDTH, figure, label, whole_ticks
from reconcile.reporter.figures.timeline import Timeline, days

AHEAD = 1.0
"""Lines are drawn on beyond the last calibration by at most this many lengths of the calibrations."""
MOST_EVENTS = 8

ENTRIES = {
    "inside": Line2D([], [], linestyle="none", marker="o", markersize=4, markerfacecolor="none", markeredgecolor=INK,
                     markeredgewidth=0.7, label="calibration"),
    "outside": Line2D([], [], linestyle="none", marker="D", markersize=4, color=INK, label="outside the limits"),
    "line": Line2D([], [], color=OCHRE, linewidth=1.2, label="fitted line, dashed where drawn on"),
    "crossing": Line2D([], [], color=BLUE, linewidth=3.0, alpha=0.6, label="95 % interval of its crossing"),
    "limit": Line2D([], [], color=GREY, linewidth=0.8, label="limit in the settings"),
    "other": Line2D([], [], color=GREY, linewidth=0.8, linestyle=(0, (4, 3)), label="limit of another text"),
    "step": Line2D([], [], color=OCHRE, linewidth=5, alpha=0.25, label="unlogged step"),
    "event": Line2D([], [], color=INK, linewidth=0.8, linestyle=(0, (1, 2)), label="logged event"),
}  # fmt: skip


def calibration_course(history: MeterHistory, subject: str, subject_type: str) -> Figure:
    """Two strips, slope over offset, of one meter or probe."""
    lines = [x for x in history.lines if (x.subject, x.subject_type) == (subject, subject_type)]
    crossings = [x for x in history.crossings if (x.subject, x.subject_type) == (subject, subject_type)]
    shown = [q for q in QUANTITIES if any(x.quantity == q and len(x.calibration) for x in lines)]
    when = days(history.records.calibrations["calibrated_at"])
    own = np.concatenate([x.calibration for x in lines]) if lines else np.zeros(0, np.intp)
    first, last = float(when[own].min()), float(when[own].max())
    end = _end(crossings, first, last)
    drawn = figure(WIDTH, 0.75 + 1.45 * len(shown))
    strips: list[Axes] = list(drawn.subplots(len(shown), 1, sharex=True, squeeze=False)[:, 0])
    drew: set[str] = set()
    for axes, quantity in zip(strips, shown, strict=True):
        drew |= _strip(axes, history, quantity, [x for x in lines if x.quantity == quantity], when, end)
        for crossing in crossings:
            if crossing.quantity == quantity:
                drew |= _crossing(axes, crossing, first, end)
        drew |= _steps(axes, history, subject, subject_type, quantity)
    drew |= _events(strips, history, subject, sorted({x.probe for x in lines}), first, last)
    axis = Timeline(np.array([first, end]), True)
    axis.dress(strips[-1])
    formatter = strips[-1].xaxis.get_major_formatter()
    if isinstance(formatter, ConciseDateFormatter):
        formatter.zero_formats[1] = "%b\n%Y"  # lines run on into other years
    strips[-1].set_xlabel("calibrated at")
    legend_above(drawn, [ENTRIES[key] for key in ENTRIES if key in drew])
    return drawn


def _end(crossings: Sequence[Crossing], first: float, last: float) -> float:
    """Where the axis ends: the last calibration, or the crossing intervals that lie near enough."""
    far = last + AHEAD * max(last - first, 1.0)
    ends = [float(d) for x in crossings for d in days(np.array([x.at, x.latest], "datetime64[s]")) if d <= far]
    return max([last, *ends])


def _strip(
    axes: Axes, history: MeterHistory, quantity: str, lines: Sequence[Line], when: FloatArray, end: float
) -> set[str]:
    drew = {"inside"}
    values = history.records.calibrations[quantity]
    low, high = -np.inf, np.inf
    for limit in history.limits:
        if limit.quantity != quantity:
            continue
        axes.axhline(
            limit.value,
            color=GREY,
            linewidth=0.8,
            linestyle="-" if limit.judged else (0, (4, 3)),
            zorder=1,
        )
        drew.add("limit" if limit.judged else "other")
        if limit.judged and limit.side == "low":
            low = limit.value
        elif limit.judged:
            high = limit.value
    for line in lines:
        x, y = when[line.calibration], np.asarray(values[line.calibration], float)
        out = (y < low) | (y > high)
        axes.scatter(x[~out], y[~out], s=12, facecolors="none", edgecolors=INK, linewidths=0.7, zorder=4)
        if out.any():
            axes.scatter(x[out], y[out], s=14, marker="D", color=INK, linewidths=0, zorder=5)
            drew.add("outside")
        if line.reason:
            continue
        middle = float(days(np.array([line.middle]))[0])
        ends = np.array([x[0], x[-1]])
        course = line.level + line.rate / 30.0 * (ends - middle)
        axes.plot(ends, course, color=OCHRE, linewidth=1.2, zorder=6)
        if line.latest and end > x[-1]:
            on = np.array([x[-1], end])
            axes.plot(
                on, line.level + line.rate / 30.0 * (on - middle), color=OCHRE, linewidth=0.9, linestyle=(0, (4, 2)),
                zorder=6,
            )  # fmt: skip
        drew.add("line")
    known = np.concatenate([np.asarray(values[x.calibration], float) for x in lines] or [np.zeros(0)])
    _room(axes, quantity, known, low, high)
    return drew


def _room(axes: Axes, quantity: str, known: FloatArray, low: float, high: float) -> None:
    """Both limits in view, and the values, with a little air."""
    bottom, top = min([low, *known.tolist()]), max([high, *known.tolist()])
    air = 0.06 * (top - bottom)
    axes.set_ylim(bottom - air, top + air)
    axes.set_ylabel(f"{quantity} ({QUANTITIES[quantity]})")
    whole_ticks(axes, 5)


def _crossing(axes: Axes, crossing: Crossing, first: float, end: float) -> set[str]:
    """The interval of the crossing as a bar along its limit."""
    at, early, late = (float(d) for d in days(np.array([crossing.at, crossing.earliest, crossing.latest])))
    if not np.isfinite(at) or not np.isfinite(early) or early > end:
        return set()
    until = min(late, end) if np.isfinite(late) else end
    since = max(early, first)
    if until <= since:
        return set()
    value = crossing.limit.value
    axes.plot([since, until], [value, value], color=BLUE, linewidth=3.0, alpha=0.6, solid_capstyle="butt", zorder=3)
    if first <= at <= end:
        axes.plot([at], [value], marker="|", markersize=8, markeredgewidth=1.2, color=BLUE, zorder=7)
    return {"crossing"}


def _steps(axes: Axes, history: MeterHistory, subject: str, subject_type: str, quantity: str) -> set[str]:
    drew = set()
    for step in history.calibration_steps:
        if (step.subject, step.subject_type, step.quantity) == (subject, subject_type, quantity):
            low, high = (float(d) for d in days(np.array([step.earliest, step.latest])))
            axes.axvspan(low, high, color=OCHRE, alpha=0.25, linewidth=0, zorder=0.5)
            drew.add("step")
    return drew


def _events(
    strips: Sequence[Axes], history: MeterHistory, subject: str, probes: Sequence[str], first: float, last: float
) -> set[str]:
    """Logged events of the subject and its probes as dotted lines, the first few in words."""
    events = history.records.events
    at = days(events["at"])
    names = {subject, *probes} - {""}
    chosen = [
        i
        for i in range(len(events))
        if {str(events["meter"][i]), str(events["probe"][i])} & names and first <= at[i] <= last
    ]
    for rank, i in enumerate(chosen):
        for axes in strips:
            axes.axvline(float(at[i]), color=INK, linewidth=0.8, linestyle=(0, (1, 2)), zorder=2)
        if rank < MOST_EVENTS:
            late = at[i] > first + 0.75 * (last - first)
            strips[0].annotate(
                label(str(events["what"][i]), 30),
                (float(at[i]), 1.0),
                xycoords=("data", "axes fraction"),
                xytext=(-2 if late else 2, 1),
                textcoords="offset points",
                ha="right" if late else "left",
                va="bottom",
                fontsize=6.5,
                color=INK,
            )
    return {"event"} if chosen else set()
