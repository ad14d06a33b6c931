"""Observed pH against predicted pH with the line of agreement, and the residual against predicted pH beside it."""

from __future__ import annotations

import numpy as np
from matplotlib.figure import Figure
from matplotlib.ticker import MaxNLocator

from reconcile.records.results import Audit
from reconcile.reporter.figures.marks import beyond, cloud, handles, legend_above, limit
from reconcile.reporter.figures.style import GREY, WIDTH, band, empty, figure, whole_ticks, zero_line
from reconcile.reporter.lookups import Lookups


def predicted_observed(audit: Audit, lookups: Lookups) -> Figure:
    """One mark a reading in each panel; the band is twice the median spread of a clean record."""
    x, y = audit.prediction.ph, np.asarray(audit.records.readings["ph"], float)
    both = np.isfinite(x) & np.isfinite(y)
    if not both.any():
        return empty("No reading has both an observed and a predicted pH.")
    total, status = int(both.sum()), audit.status[both]
    residual = audit.residual[both]
    x, y = x[both], y[both]
    drawn = figure(WIDTH, 3.55)
    left, right = drawn.subplots(1, 2)
    values = np.concatenate([x, y])
    air = max(0.25, 0.04 * float(np.ptp(values)))
    low, high = float(values.min()) - air, float(values.max()) + air
    left.plot([low, high], [low, high], color=GREY, linewidth=0.7, zorder=1)
    cloud(left, x, y, status, total)
    left.set(xlim=(low, high), ylim=(low, high), xlabel="pH predicted from the recipe", ylabel="pH observed")
    left.set_box_aspect(1.0)
    right.set_box_aspect(1.0)
    for axis in (left.xaxis, left.yaxis, right.xaxis):
        axis.set_major_locator(MaxNLocator(6, steps=[1, 2, 5, 10]))
    half = limit(residual)
    band(right, float(np.nanmedian(audit.u_residual)))
    zero_line(right)
    cloud(right, x, np.where(np.abs(residual) <= half, residual, np.nan), status, total)
    beyond(right, x, residual, half)
    right.set(
        xlim=(low, high), ylim=(-half, half), xlabel="pH predicted from the recipe", ylabel="observed − predicted (pH)"
    )
    whole_ticks(right, 7)
    legend_above(drawn, handles(status))
    return drawn
