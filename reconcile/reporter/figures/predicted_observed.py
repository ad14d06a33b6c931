"""Observed pH against predicted pH, with the line of agreement."""

from __future__ import annotations

import numpy as np
from matplotlib.figure import Figure

from reconcile.records.results import Audit
from reconcile.reporter.figures.style import GREY, cloud, empty, figure, legend_above
from reconcile.reporter.lookups import Lookups


def predicted_observed(audit: Audit, lookups: Lookups) -> Figure:
    """One point a reading; the line is where observed and predicted agree."""
    x = audit.prediction.ph
    y = np.asarray(audit.records.readings["ph"], float)
    both = np.isfinite(x) & np.isfinite(y)
    if not both.any():
        return empty("No reading has both an observed and a predicted pH.")
    drawn = figure(5.0, 4.7)
    axes = drawn.subplots()
    values = np.concatenate([x[both], y[both]])
    air = max(0.25, 0.04 * float(np.ptp(values)))
    low, high = float(values.min()) - air, float(values.max()) + air
    axes.plot([low, high], [low, high], color=GREY, linewidth=0.8, zorder=1, label="agreement")
    cloud(axes, x[both], y[both], audit.status[both], int(both.sum()))
    axes.set(xlim=(low, high), ylim=(low, high), xlabel="pH predicted from the recipe", ylabel="pH observed")
    axes.set_aspect("equal")
    legend_above(axes, 2)
    return drawn
