"""The one style of our pictures: quiet axes, marks that differ in shape as well as in shade, units on every axis."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from typing import Any

import matplotlib as mpl
import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from reconcile.reporter.plain import plain

INK = "#1a1a1a"
GREY = "#6f6f6f"
PALE = "#b9b9b9"
FAINT = "#e4e4e4"
BLUE = "#1f4e79"
OCHRE = "#b06a00"
RASTER_FROM = 2000
"""Number of points from which a cloud is drawn as a picture inside the SVG."""
WIDTH = 6.9
"""Width of a full picture [in]."""

SETTINGS: Any = {
    "font.family": ["DejaVu Sans"],
    "font.size": 8.0,
    "axes.titlesize": 8.0,
    "axes.titlelocation": "left",
    "axes.titlepad": 4.0,
    "axes.labelsize": 8.0,
    "axes.labelcolor": INK,
    "axes.edgecolor": GREY,
    "axes.linewidth": 0.6,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.unicode_minus": True,
    "xtick.labelsize": 7.0,
    "ytick.labelsize": 7.0,
    "xtick.color": GREY,
    "ytick.color": GREY,
    "xtick.labelcolor": INK,
    "ytick.labelcolor": INK,
    "xtick.major.width": 0.6,
    "ytick.major.width": 0.6,
    "xtick.major.size": 3.0,
    "ytick.major.size": 3.0,
    "legend.fontsize": 7.0,
    "legend.frameon": False,
    "legend.handletextpad": 0.4,
    "legend.borderaxespad": 0.0,
    "text.color": INK,
    "text.parse_math": False,
    "figure.facecolor": "white",
    "savefig.facecolor": "white",
    "savefig.dpi": 160,
    "svg.hashsalt": "reconcile",
    "svg.fonttype": "path",
    "path.simplify": True,
}


@contextmanager
def styled() -> Iterator[None]:
    """Our settings, over the library's own defaults, whatever the user's are."""
    with mpl.rc_context():
        mpl.rcdefaults()
        mpl.rcParams.update(SETTINGS)
        yield


def figure(width: float = WIDTH, height: float = 3.4) -> Figure:
    """An empty figure that keeps its labels inside."""
    return Figure(figsize=(width, height), layout="constrained")


MARKS: dict[str, dict[str, Any]] = {
    "as_predicted": {"marker": "o", "s": 11, "facecolors": "none", "edgecolors": GREY, "linewidths": 0.6},
    "stands_out": {"marker": "D", "s": 26, "facecolors": INK, "edgecolors": INK, "linewidths": 0.6},
    "explained": {"marker": "^", "s": 28, "facecolors": OCHRE, "edgecolors": INK, "linewidths": 0.5},
    "no_evidence": {"marker": "x", "s": 14, "color": PALE, "linewidths": 0.8},
}
"""How a reading is drawn, by what its status means here."""
MARK_WORDS = {
    "as_predicted": "as predicted",
    "stands_out": "stands out",
    "explained": "explained by a finding",
    "no_evidence": "no evidence (adjusted, void, out of range)",
}


def mark_of(status: np.ndarray[Any, Any]) -> np.ndarray[Any, Any]:
    """Which mark each status is drawn with."""
    known = np.isin(status, ("as_predicted", "stands_out", "explained"))
    return np.where(known, status, "no_evidence")


def cloud(axes: Axes, x: Any, y: Any, status: np.ndarray[Any, Any], total: int) -> None:
    """Points by status, the remarkable ones on top; a picture inside the SVG when `total` points are many."""
    marks = mark_of(status)
    for layer, name in enumerate(("no_evidence", "as_predicted", "explained", "stands_out")):
        chosen = (marks == name) & np.isfinite(y)
        if chosen.any():
            style = dict(MARKS[name])
            if total > RASTER_FROM:
                style["s"] = style["s"] * (0.35 if name in ("as_predicted", "no_evidence") else 0.6)
            label = f"{MARK_WORDS[name]} ({int(chosen.sum()):,})"
            axes.scatter(x[chosen], y[chosen], zorder=3 + layer, label=label, rasterized=total > RASTER_FROM, **style)


def label(text: str, most: int = 24) -> str:
    """A name from the record as a label: plain, and cut when long."""
    text = plain(text)
    return text if len(text) <= most else f"{text[: most - 1]}…"


def legend_above(axes: Axes, columns: int = 4) -> None:
    """The legend in one line over the axes, out of the way of the points."""
    handles, labels = axes.get_legend_handles_labels()
    if handles:
        axes.legend(handles, labels, loc="lower left", bbox_to_anchor=(0.0, 1.01), ncols=columns, columnspacing=1.4)


def symmetric_limit(values: Iterable[float], least: float = 0.05) -> float:
    """Half-height of an axis centred on zero that holds every finite value, with a little air."""
    finite = np.abs(np.asarray(list(values), float))
    finite = finite[np.isfinite(finite)]
    return max(least, float(finite.max()) * 1.08) if len(finite) else least


def empty(text: str, width: float = WIDTH) -> Figure:
    """A picture that says why there is none."""
    drawn = figure(width, 1.0)
    drawn.text(0.02, 0.5, text, va="center", color=GREY)
    return drawn
