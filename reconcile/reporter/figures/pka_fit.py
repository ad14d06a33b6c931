"""Readings of the acid with the fitted curve, and what is left of them beneath."""

from __future__ import annotations

from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.ticker import FuncFormatter, LogLocator, MaxNLocator, NullFormatter

from reconcile.records.arrays import BoolArray, FloatArray
from reconcile.records.pka_results import PkaFit
from reconcile.reporter.figures.marks import RASTER_FROM, beyond, legend_above, limit
from reconcile.reporter.figures.style import BLUE, GREY, INK, PALE, WIDTH, band, figure, label, whole_ticks, zero_line

SHAPES = ("o", "s", "^", "v", "D", "P", "X")
MOST_NAMED = 7
"""Series with a shape of their own; the rest share the last."""
LABELS = {
    "base_per_acid": "strong base per acid (mol/mol; negative: strong acid)",
    "concentration": "acid (mol/kg)",
}


def abscissa(fit: PkaFit) -> tuple[str, FloatArray]:
    """What the readings are drawn against: base per acid where it varies, else the acid's concentration."""
    used = fit.status == "used"
    base = fit.base[used]
    varied = bool(np.all(np.isfinite(base))) and float(np.ptp(base)) >= 0.05
    return ("base_per_acid", fit.base) if varied else ("concentration", fit.concentration)


def pka_fit(fit: PkaFit) -> Figure:
    """Two panels over one axis: observed and fitted pH, and their difference."""
    kind, x = abscissa(fit)
    series = np.asarray(fit.records.readings["series"], object)[fit.index]
    names = list(dict.fromkeys(series.tolist()))
    drawn = figure(WIDTH, 4.4)
    top, low = drawn.subplots(2, 1, sharex=True, height_ratios=[2.2, 1.0])
    for line in fit.curves:
        top.plot(line.x, line.y, color=BLUE, linewidth=0.9, zorder=2)
    half = limit(fit.residual[fit.status == "used"])
    band(low, float(np.nanmedian(fit.u_reading)))
    zero_line(low)
    entries = []
    for rank, name in enumerate(names):
        shape = SHAPES[min(rank, len(SHAPES) - 1)]
        mine = series == name
        _points(top, x, fit.observed, mine & (fit.status == "used"), shape)
        shown = np.where(np.abs(fit.residual) <= half, fit.residual, np.nan)
        _points(low, x, shown, mine & (fit.status == "used"), shape)
        if len(names) > 1 and rank < MOST_NAMED:
            entries.append(_handle(shape, "none", INK, label(str(name)) or "single solutions"))
    entries += _others(top, low, fit, x, half)
    beyond(low, x, np.where(fit.status == "used", fit.residual, np.nan), half)
    if fit.curves:
        entries.append(Line2D([], [], color=BLUE, linewidth=0.9, label="fitted"))
    if kind == "concentration":
        top.set_xscale("log")
        low.xaxis.set_major_locator(LogLocator(subs=(1.0, 2.0, 5.0)))
        low.xaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:.3g}"))
        low.xaxis.set_minor_formatter(NullFormatter())
    top.set(ylabel="pH")
    low.set(ylim=(-half, half), xlabel=LABELS[kind], ylabel="observed − fitted (pH)")
    top.yaxis.set_major_locator(MaxNLocator(6, steps=[1, 2, 5, 10]))
    whole_ticks(low)
    legend_above(drawn, entries)
    return drawn


def _points(axes: Axes, x: FloatArray, y: FloatArray, chosen: BoolArray, shape: str) -> None:
    style: dict[str, Any] = {"marker": shape, "s": 13, "facecolors": "none", "edgecolors": INK, "linewidths": 0.7}
    axes.scatter(x[chosen], y[chosen], zorder=4, rasterized=int(chosen.sum()) > RASTER_FROM, **style)


def _others(top: Axes, low: Axes, fit: PkaFit, x: FloatArray, half: float) -> list[Line2D]:
    """Readings that took no part: rejected ones filled, the others as crosses."""
    entries = []
    rejected = fit.status == "rejected"
    if rejected.any():
        for axes, y in ((top, fit.observed), (low, np.clip(fit.residual, -0.93 * half, 0.93 * half))):
            axes.scatter(x[rejected], y[rejected], marker="D", s=20, facecolors=INK, edgecolors="white", zorder=6)
        for i in np.flatnonzero(rejected)[:MOST_NAMED].tolist():
            text, edge = f"{fit.residual[i]:+.2f}".replace("-", "−"), float(np.clip(fit.residual[i], -half, half))
            low.annotate(
                text, (x[i], 0.93 * edge), xytext=(5, 0), textcoords="offset points", fontsize=6.5, va="center"
            )
        entries.append(_handle("D", INK, INK, f"rejected ({int(rejected.sum())})"))
    apart = (fit.status != "used") & ~rejected & np.isfinite(x)
    if apart.any():
        top.scatter(x[apart], fit.observed[apart], marker="x", s=13, color=PALE, linewidths=0.8, zorder=3)
        entries.append(_handle("x", PALE, PALE, f"took no part ({int(apart.sum())})"))
    return entries


def _handle(shape: str, face: str, edge: str, words: str) -> Line2D:
    return Line2D(
        [], [], linestyle="none", marker=shape, markersize=4.2, markerfacecolor=face, markeredgecolor=edge or GREY,
        markeredgewidth=0.7, label=words,
    )  # fmt: skip
