"""How a reading is drawn by what its status means: shape first, shade second, so that grey paper keeps it."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D

from reconcile.records.arrays import AnyArray, FloatArray, TextArray
from reconcile.reporter.figures.style import GREY, INK, OCHRE, PALE

RASTER_FROM = 2000
"""Number of points from which a cloud is drawn as a picture inside the SVG."""
MARKS: Mapping[str, Mapping[str, Any]] = {
    "no_evidence": {"marker": "x", "s": 11, "color": PALE, "linewidths": 0.7},
    "as_predicted": {"marker": "o", "s": 10, "facecolors": "none", "edgecolors": GREY, "linewidths": 0.6},
    "explained": {"marker": "^", "s": 22, "facecolors": OCHRE, "edgecolors": "white", "linewidths": 0.4},
    "stands_out": {"marker": "D", "s": 17, "facecolors": INK, "edgecolors": "white", "linewidths": 0.4},
}
"""In drawing order: the remarkable ones on top."""
CLEAR = (1.0, 1.0, 1.0, 0.0)
"""No fill, as a colour: points of one fill and one edge are drawn from one stamped mark, which is many times faster."""
WORDS: Mapping[str, str] = {
    "as_predicted": "as predicted",
    "stands_out": "stands out",
    "explained": "explained by a finding",
    "no_evidence": "no evidence",
}


def mark_of(status: TextArray) -> TextArray:
    """Which mark each status is drawn with."""
    known = np.isin(status, ("as_predicted", "stands_out", "explained"))
    return np.where(known, status, "no_evidence").astype(object)


def cloud(axes: Axes, x: AnyArray, y: FloatArray, status: TextArray, total: int) -> None:
    """Points by status; drawn as a picture inside the SVG, and smaller, when `total` points of the figure are many."""
    marks, many = mark_of(status), total > RASTER_FROM
    for layer, (name, style) in enumerate(MARKS.items()):
        chosen = (marks == name) & np.isfinite(y)
        if chosen.any():
            drawn = dict(style)
            if many:
                drawn["s"] = drawn["s"] * (0.3 if layer < 2 else 0.5)
                drawn["linewidths"] = drawn["linewidths"] * 0.6 if layer < 2 else 0.0
                if drawn.get("facecolors") == "none":
                    drawn["facecolors"] = CLEAR
            axes.scatter(x[chosen], y[chosen], zorder=3 + layer, rasterized=many, **drawn)


def handles(status: TextArray) -> list[Line2D]:
    """Legend entries, with counts, for the statuses that occur."""
    marks = mark_of(status)
    found = []
    for name in ("stands_out", "explained", "as_predicted", "no_evidence"):
        count = int((marks == name).sum())
        if count:
            style = MARKS[name]
            face = style.get("facecolors", "none")
            edge = style.get("color") or (GREY if name == "as_predicted" else face)
            found.append(
                Line2D(
                    [],
                    [],
                    linestyle="none",
                    marker=style["marker"],
                    markersize=4.2,
                    markerfacecolor=face,
                    markeredgecolor=edge,
                    markeredgewidth=0.7,
                    label=f"{WORDS[name]} ({count:,})",
                )
            )
    return found


def legend_above(drawn: Figure, entries: list[Line2D]) -> None:
    """The legend over the whole picture, in one line or two."""
    if entries:
        columns = len(entries) if len(entries) <= 4 else (len(entries) + 1) // 2
        drawn.legend(
            handles=entries,
            loc="outside upper left",
            ncols=columns,
            columnspacing=1.6,
            handlelength=1.2,
            borderaxespad=0.5,
        )


def limit(values: FloatArray, least: float = 0.05) -> float:
    """Half-height of an axis of residuals [pH]: all of them, unless a few lie far beyond the others."""
    size = np.abs(values[np.isfinite(values)])
    if not len(size):
        return least
    most, usual = float(size.max()), float(np.quantile(size, 0.95))
    return max(least, 1.12 * (most if most <= 4 * max(usual, least) else 2 * max(usual, least)))


def beyond(axes: Axes, x: AnyArray, y: FloatArray, half: float, most: int = 4) -> None:
    """Residuals that the axis does not reach: a caret at the edge, the first few with their value."""
    far = np.flatnonzero(np.abs(np.where(np.isfinite(y), y, 0.0)) > half)
    order = far[np.argsort(-np.abs(y[far]), kind="stable")]
    for rank, i in enumerate(order.tolist()):
        edge = np.sign(y[i]) * half * 0.93
        axes.plot([x[i]], [edge], marker="^" if y[i] > 0 else "v", color=INK, markersize=3.5, zorder=9, clip_on=False)
        if rank < most:
            text = f"{y[i]:+.2f}".replace("-", "−")
            axes.annotate(
                text, (x[i], edge), xytext=(4, 0), textcoords="offset points", fontsize=6.5, va="center", zorder=9
            )
