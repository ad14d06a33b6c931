"""Mandel's h and k of every meter, a mark a solution, with the values that are passed by chance."""

from __future__ import annotations

from collections import Counter

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D

from reconcile.records.meter_results import WHOLE_RECORD, Agreement, MeterHistory
from reconcile.reporter.figures.marks import legend_above
from reconcile.reporter.figures.style import BLUE, GREY, INK, WIDTH, empty, figure, label, whole_ticks

MOST_METERS = 24
ENTRIES = {
    "solution": Line2D([], [], linestyle="none", marker="o", markersize=3.8, markerfacecolor="none",
                       markeredgecolor=GREY, markeredgewidth=0.7, label="one solution"),
    "beyond": Line2D([], [], linestyle="none", marker="D", markersize=4, color=INK, label="beyond its 1 % value"),
    "whole": Line2D([], [], linestyle="none", marker="_", markersize=11, markeredgewidth=1.6, color=BLUE,
                    label="whole record"),
    "five": Line2D([], [], color=GREY, linewidth=0.7, linestyle=(0, (4, 3)), label="5 %"),
    "one": Line2D([], [], color=GREY, linewidth=0.9, label="1 %"),
}  # fmt: skip


def mandel(history: MeterHistory) -> Figure:
    """h over k; lines at the values that are passed by chance in 5 % and 1 %, where they are the same for all marks."""
    cells = history.agreement
    meters = sorted({c.meter for c in cells})[:MOST_METERS]
    if not meters:
        return empty("No agreement was computed for this record.")
    place = {name: i for i, name in enumerate(meters)}
    drawn = figure(WIDTH, 3.9)
    upper, lower = drawn.subplots(2, 1, sharex=True)
    drew = _marks(upper, cells, place, "h") | _marks(lower, cells, place, "k")
    p = Counter(c.meters for c in cells).most_common(1)[0][0]
    five, one = next((c.h_5, c.h_1) for c in cells if c.meters == p)
    upper.axhline(0.0, color=GREY, linewidth=0.7, zorder=1)
    for value, style, width in ((five, (0, (4, 3)), 0.7), (one, "-", 0.9)):
        for sign in (-1.0, 1.0):
            upper.axhline(sign * value, color=GREY, linewidth=width, linestyle=style, zorder=1)
    drew |= {"five", "one"}
    lower.axhline(1.0, color=GREY, linewidth=0.7, zorder=1)
    upper.set_ylabel("h (–)")
    lower.set_ylabel("k (–)")
    most = max([1.1 * one, *(abs(c.h) * 1.1 for c in cells if np.isfinite(c.h))])
    upper.set_ylim(-most, most)
    lower.set_ylim(bottom=0.0)
    for axes in (upper, lower):
        whole_ticks(axes, 5)
    lower.set_xlim(-0.6, len(meters) - 0.4)
    many = len(meters) > 10
    lower.set_xticks(
        range(len(meters)), [label(m, 14) for m in meters], rotation=60 if many else 0, ha="right" if many else "center"
    )
    lower.set_xlabel("meter")
    legend_above(drawn, [ENTRIES[key] for key in ENTRIES if key in drew])
    return drawn


def _marks(axes: Axes, cells: tuple[Agreement, ...], place: dict[str, int], name: str) -> set[str]:
    """Marks of one statistic; solutions spread sideways so that they do not hide one another."""
    drew: set[str] = set()
    solutions = sorted({c.solution for c in cells} - {WHOLE_RECORD})
    aside = {s: (i + 0.5) / len(solutions) - 0.5 for i, s in enumerate(solutions)}
    for cell in cells:
        if cell.meter not in place:
            continue
        value, most = (cell.h, cell.h_1) if name == "h" else (cell.k, cell.k_1)
        if not np.isfinite(value):
            continue
        x = place[cell.meter] + 0.6 * aside.get(cell.solution, 0.0)
        out = abs(value) > most
        if cell.solution == WHOLE_RECORD:
            axes.plot([x], [value], marker="_", markersize=16, markeredgewidth=1.6, color=BLUE, zorder=5)
            drew.add("whole")
            continue
        if out:
            axes.plot([x], [value], marker="D", markersize=4, color=INK, zorder=6)
        else:
            axes.plot(
                [x], [value], marker="o", markersize=3.8, markerfacecolor="none", markeredgecolor=GREY,
                markeredgewidth=0.7, zorder=4,
            )  # fmt: skip
        drew.add("beyond" if out else "solution")
    return drew
