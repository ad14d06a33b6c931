"""The likelihood profile of every constant: how much worse the fit becomes when the constant is held elsewhere."""

from __future__ import annotations

import numpy as np
from matplotlib.figure import Figure
from matplotlib.ticker import MaxNLocator

from reconcile.records.pka_results import PkaFit
from reconcile.reporter.figures.style import BLUE, GREY, INK, WIDTH, empty, figure

HEADROOM = 2.2


def pka_profile(fit: PkaFit) -> Figure:
    """One panel a constant, with the rise that bounds its 95 % interval and a parabola of the same curvature."""
    if not fit.profiles:
        return empty("No constant is told by these readings, so that there is no profile.")
    drawn = figure(WIDTH, 2.7)
    panels = drawn.subplots(1, len(fit.profiles), squeeze=False, sharey=True)[0]
    by_step = {str(step.step): step for step in fit.steps}
    for axes, line in zip(panels, fit.profiles, strict=True):
        step = by_step[line.label]
        axes.axhline(fit.reach95, color=GREY, linewidth=0.7)
        axes.plot(line.x, line.y, color=BLUE, linewidth=1.1)
        centre = float(line.x[int(np.argmin(line.y))])
        axes.plot([centre], [0.0], marker="o", markersize=3.5, color=INK, clip_on=False, zorder=5)
        for end in step.bounds:
            if end is not None and line.x.min() <= end <= line.x.max():
                axes.vlines(end, 0.0, fit.reach95, color=INK, linewidth=0.7, linestyles=(0, (3, 2)))
        axes.set(ylim=(0.0, HEADROOM * fit.reach95), xlim=(line.x.min(), line.x.max()))
        axes.set_xlabel("pKa at I = 0" if len(fit.steps) == 1 else f"pKa of step {line.label} at I = 0")
        axes.xaxis.set_major_locator(MaxNLocator(5, steps=[1, 2, 5, 10]))
    panels[0].set_ylabel("rise of the weighted sum of squares (–)")
    panels[0].annotate(
        "95 %", (0.01, fit.reach95), xycoords=("axes fraction", "data"), xytext=(0, 2), textcoords="offset points",
        fontsize=6.5, color=GREY,
    )  # fmt: skip
    return drawn
