"""Mean residual of each meter on each lot: where a fault follows the meter, a row shows it; where the lot, a column."""

from __future__ import annotations

import numpy as np
from matplotlib.figure import Figure
from matplotlib.lines import Line2D

from reconcile.records.results import Audit
from reconcile.reporter.figures.marks import legend_above
from reconcile.reporter.figures.style import BLUE, GREY, OCHRE, WIDTH, empty, figure, label
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.words import half_up, signed

MOST = 30
WITH_FIGURES = 12
"""Up to so many lots, means and counts are written in the cells."""


def meter_lot(audit: Audit, lookups: Lookups) -> Figure:
    """A square a cell, its area the mean residual: filled above the prediction, open below it."""
    reading, lot = lookups.reading_lots
    usable = lookups.usable[reading] & (audit.records.readings["meter"][reading] != "")
    reading, lot = reading[usable], lot[usable]
    if not len(reading):
        return empty("No reading names both a meter and a stock lot.")
    meters, meter = np.unique(audit.records.readings["meter"][reading].astype(str), return_inverse=True)
    shape = (len(meters), len(lookups.lot_names))
    count, total = np.zeros(shape), np.zeros(shape)
    np.add.at(count, (meter, lot), 1.0)
    np.add.at(total, (meter, lot), audit.residual[reading])
    rows = _most_used(count.sum(axis=1), meters)
    columns = _most_used(count.sum(axis=0), lookups.lot_names.astype(str))
    count, total = count[np.ix_(rows, columns)], total[np.ix_(rows, columns)]
    with np.errstate(invalid="ignore"):
        mean = total / count
    most = max(float(np.nanmax(np.abs(mean))), 0.02)
    written = len(columns) <= WITH_FIGURES
    tall = 0.36 if written else min(max(WIDTH * 0.84 / len(columns), 0.2), 0.32)
    drawn = figure(WIDTH, (0.75 if written else 1.5) + tall * len(rows))
    axes = drawn.subplots()
    i, j = np.nonzero(count)
    value = mean[i, j]
    side = (
        (0.8 if written else 0.62) * tall * 72.0 * np.sqrt(np.minimum(np.abs(value) / most, 1.0))
    )  # points; the area follows the mean
    above = value > 0
    start = 0.7 * tall * len(columns) / (WIDTH * 0.88) - 0.5 if written else 0.0
    for chosen, face, edge in ((above, BLUE, BLUE), (~above, "white", OCHRE)):
        axes.scatter(
            j[chosen] + start,
            i[chosen],
            s=np.maximum(side[chosen], 1.0) ** 2,
            marker="s",
            facecolors=face,
            edgecolors=edge,
            linewidths=0.9,
            zorder=3,
        )
    if written:
        for row, column, one in zip(i.tolist(), j.tolist(), value.tolist(), strict=True):
            axes.annotate(
                f"{signed(half_up(one, 3))}\nn = {int(count[row, column]):,}",
                (column + start, row),
                xytext=(tall * 40, 0),
                textcoords="offset points",
                va="center",
                fontsize=6.2,
                linespacing=1.25,
            )
    else:
        for row, column in zip(i.tolist(), j.tolist(), strict=True):
            axes.text(
                column + 0.46, row + 0.46, f"{int(count[row, column]):,}", ha="right", va="bottom",
                fontsize=4.6, color=GREY, zorder=4, in_layout=False,
            )  # fmt: skip
    axes.set_xticks(
        range(len(columns)),
        [label(lookups.lot_names[c], 12 if written else 18) for c in columns],
        rotation=0 if written else 60,
        ha="center" if written else "left",
        rotation_mode="anchor",
    )
    axes.xaxis.tick_top()
    axes.set_yticks(range(len(rows)), [label(meters[r], 18) for r in rows])
    axes.tick_params(length=0)
    axes.set_xticks(np.arange(-0.5, len(columns)), minor=True)
    axes.set_yticks(np.arange(-0.5, len(rows)), minor=True)
    axes.grid(which="minor", color="#e2e2e2", linewidth=0.5)
    axes.tick_params(which="minor", length=0)
    axes.set(xlim=(-0.5, max(len(columns), 1) - 0.5), ylim=(len(rows) - 0.5, -0.5), ylabel="meter")
    axes.set_xlabel("stock lot", loc="left")
    axes.xaxis.set_label_position("top")
    for spine in axes.spines.values():
        spine.set_visible(False)
    scale = half_up(most, 3)
    legend_above(
        drawn,
        [
            Line2D([], [], linestyle="none", marker="s", color=BLUE, markersize=5, label="mean above prediction"),
            Line2D([], [], linestyle="none", marker="s", markerfacecolor="white", color=OCHRE, markersize=5,
                   label=f"below; area is size, largest {scale} pH"),
            *([] if written else [Line2D([], [], linestyle="none", label="small figure: number of readings")]),
        ],
    )  # fmt: skip
    return drawn


def _most_used(
    count: np.ndarray[tuple[int, ...], np.dtype[np.float64]], names: np.ndarray[tuple[int, ...], np.dtype[np.str_]]
) -> list[int]:
    used = [int(i) for i in np.flatnonzero(count)]
    chosen = sorted(used, key=lambda i: (-count[i], names[i]))[:MOST]
    return sorted(chosen, key=lambda i: names[i])
