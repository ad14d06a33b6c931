"""Residuals of the readings that rest on each stock lot, sorted by their mean."""

from __future__ import annotations

import numpy as np
from matplotlib.figure import Figure
from matplotlib.lines import Line2D

from reconcile.records.arrays import IntArray
from reconcile.records.results import Audit
from reconcile.reporter.figures.marks import RASTER_FROM, legend_above, limit
from reconcile.reporter.figures.style import GREY, INK, OCHRE, WIDTH, empty, figure, label, zero_line
from reconcile.reporter.lookups import Lookups

MOST_LOTS = 40


def lots_shown(lookups: Lookups) -> IntArray:
    """Lots with findings first, then the most used; at most forty."""
    _, lot = _pairs(lookups)
    number = len(lookups.lot_names)
    count = np.bincount(lot, minlength=number)
    used = np.flatnonzero(count)
    accused = np.array([str(n) in lookups.findings_of_lot for n in lookups.lot_names[used]], bool)
    order = np.lexsort((lookups.lot_names[used].astype(str), -count[used], ~accused))
    return used[order][:MOST_LOTS].astype(np.intp)


def _pairs(lookups: Lookups) -> tuple[IntArray, IntArray]:
    reading, lot = lookups.reading_lots
    usable = lookups.usable[reading]
    return reading[usable], lot[usable]


def residuals_lots(audit: Audit, lookups: Lookups) -> Figure:
    """One line a lot: its readings, the middle nine tenths where there are many, the mean."""
    reading, lot = _pairs(lookups)
    shown = lots_shown(lookups)
    if not len(shown):
        return empty("No stock lot is named in the record, so residuals cannot be shown by lot.")
    drawn = figure(WIDTH, 0.75 + 0.17 * max(len(shown), 3))
    axes = drawn.subplots()
    kept = np.isin(lot, shown)
    reading, lot = reading[kept], lot[kept]
    drawn_values = []
    for one in shown.tolist():
        about = lookups.about(str(audit.records.lots.name[one]), ("lot",))
        drawn_values.append(lookups.apart_from_others(about)[reading[lot == one]])
    order = sorted(range(len(shown)), key=lambda k: (float(drawn_values[k].mean()), k))
    shown, drawn_values = shown[order], [drawn_values[k] for k in order]
    half = limit(np.concatenate(drawn_values))
    many = len(reading) > RASTER_FROM
    zero_line(axes, across=False)
    names = []
    for height, one in enumerate(shown.tolist()):
        values = drawn_values[height]
        accused = str(lookups.lot_names[one]) in lookups.findings_of_lot
        level = np.full(len(values), height)
        axes.plot(
            np.clip(values, -half, half),
            level,
            linestyle="none",
            marker="o",
            markersize=1.6 if many else 2.6,
            markerfacecolor="none",
            markeredgecolor=GREY,
            markeredgewidth=0.5,
            zorder=3,
            rasterized=many,
        )
        if len(values) >= 20:
            axes.plot(np.quantile(values, [0.05, 0.95]), [height] * 2, color=GREY, linewidth=1.0, zorder=2)
        axes.plot(
            [np.clip(values.mean(), -half, half)],
            [height],
            marker="^" if accused else "|",
            color=OCHRE if accused else INK,
            markersize=5.5 if accused else 7,
            markeredgewidth=1.4,
            zorder=5,
        )
        found = " ".join(lookups.findings_of_lot.get(str(lookups.lot_names[one]), []))
        names.append(f"{label(lookups.lot_names[one])}{f'  {found}' if found else ''}   n = {len(values):,}")
    axes.set_yticks(range(len(shown)), names)
    axes.tick_params(axis="y", length=0)
    axes.spines["left"].set_visible(False)
    axes.set(xlim=(-half * 1.02, half * 1.02), ylim=(-0.6, len(shown) - 0.4), xlabel="observed − predicted (pH)")
    axes.grid(axis="y", color="#efefef", linewidth=0.5)
    axes.set_axisbelow(True)
    entries = [
        Line2D([], [], linestyle="none", marker="o", markersize=3, markerfacecolor="none", color=GREY, label="reading"),
        Line2D([], [], linestyle="none", marker="|", markersize=7, markeredgewidth=1.4, color=INK, label="mean"),
    ]
    if any(str(n) in lookups.findings_of_lot for n in lookups.lot_names[shown]):
        entries.append(
            Line2D([], [], linestyle="none", marker="^", markersize=5, color=OCHRE, label="mean, lot with a finding")
        )
    legend_above(drawn, entries)
    return drawn
