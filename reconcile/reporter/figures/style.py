"""The one style of our pictures: quiet axes, marks that differ in shape as well as in shade, units on every axis."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from typing import Any

import matplotlib as mpl
import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from reconcile.reporter.plain import plain

INK = "#1a1a1a"
GREY = "#6b6b6b"
PALE = "#a8a8a8"
BAND = "#ececec"
OCHRE = "#b35f00"
BLUE = "#2b5c8a"
WIDTH = 6.9
"""Width of a full picture [in]."""

SETTINGS: Any = {
    "font.family": ["DejaVu Sans"],
    "font.size": 7.5,
    "axes.titlesize": 7.5,
    "axes.titlelocation": "left",
    "axes.titlepad": 4.0,
    "axes.labelsize": 7.5,
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
    "xtick.major.size": 2.5,
    "ytick.major.size": 2.5,
    "legend.fontsize": 7.0,
    "legend.frameon": False,
    "legend.handletextpad": 0.4,
    "legend.borderaxespad": 0.0,
    "legend.borderpad": 0.0,
    "text.color": INK,
    "text.parse_math": False,
    "figure.facecolor": "white",
    "figure.constrained_layout.h_pad": 0.06,
    "figure.constrained_layout.w_pad": 0.06,
    "savefig.facecolor": "white",
    "savefig.dpi": 180,
    "svg.hashsalt": "reconcile",
    "svg.fonttype": "path",
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


EMPTY = "empty"
"""Label of a figure that only says why there is no picture; a caption would say what is not there."""


def empty(text: str) -> Figure:
    """A picture that says why there is none."""
    drawn = figure(WIDTH, 0.6)
    drawn.set_label(EMPTY)
    drawn.text(0.01, 0.5, text, va="center", color=GREY)
    return drawn


def label(text: str, most: int = 22) -> str:
    """A name from the record as a label: plain, and cut when long."""
    text = plain(text)
    return text if len(text) <= most else f"{text[: most - 1]}…"


def zero_line(axes: Axes, across: bool = True) -> None:
    """Where observed and predicted agree."""
    line = axes.axhline if across else axes.axvline
    line(0.0, color=GREY, linewidth=0.7, zorder=1)


def band(axes: Axes, half: float) -> None:
    """Twice the spread of a clean record to either side of agreement."""
    if np.isfinite(half) and half > 0:
        axes.axhspan(-2 * half, 2 * half, color=BAND, linewidth=0, zorder=0)


def whole_ticks(axes: Axes, count: int = 5) -> None:
    """Few, round ticks up the side."""
    axes.yaxis.set_major_locator(mpl.ticker.MaxNLocator(count, steps=[1, 2, 5, 10]))
