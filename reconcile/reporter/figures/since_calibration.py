"""Residual against days since calibration, one strip a meter, with the rate that the model gives."""

from __future__ import annotations

import numpy as np
from matplotlib.figure import Figure
from matplotlib.lines import Line2D

from reconcile.records.meter_results import BetweenCalibrations, MeterHistory
from reconcile.reporter.figures.marks import beyond, cloud, handles, legend_above, limit
from reconcile.reporter.figures.style import OCHRE, WIDTH, empty, figure, label, whole_ticks, zero_line
from reconcile.reporter.lookups import METER_TYPES, Lookups

MOST_METERS = 12
ENTRY = Line2D([], [], color=OCHRE, linewidth=1.3, label="rate between calibrations, with its 95 % interval")


def strips_shown(history: MeterHistory) -> list[BetweenCalibrations]:
    """Meters with a rate, the most read first; at most twelve, in order of name."""
    found = sorted((b for b in history.between if not b.reason), key=lambda b: (-b.readings, b.meter))[:MOST_METERS]
    return sorted(found, key=lambda b: b.meter)


def since_calibration(history: MeterHistory, lookups: Lookups) -> Figure:
    """One strip a meter, all on one scale; what findings about other subjects account for is taken out."""
    audit, shown = lookups.audit, strips_shown(history)
    if not shown:
        return empty("No meter has enough dated readings after a recorded calibration.")
    x, meter = history.days_since, audit.records.readings["meter"]
    placed = np.isfinite(x) & np.isfinite(audit.residual)
    values = {b.meter: lookups.apart_from_others(lookups.about(b.meter, METER_TYPES)) for b in shown}
    rows = {b.meter: placed & (meter == b.meter) for b in shown}
    half = limit(np.concatenate([values[b.meter][rows[b.meter]] for b in shown]))
    across = 2 if len(shown) > 1 else 1
    down = (len(shown) + across - 1) // across
    drawn = figure(WIDTH, 0.8 + 1.35 * down)
    grid = drawn.subplots(down, across, sharex=True, sharey=True, squeeze=False).ravel()
    for axes, between in zip(grid, shown, strict=False):
        own, y = rows[between.meter], values[between.meter]
        zero_line(axes)
        cloud(axes, x[own], np.where(np.abs(y) <= half, y, np.nan)[own], audit.status[own], int(placed.sum()))
        beyond(axes, x[own], y[own], half, most=2)
        usable = own & audit.evidence
        days = np.linspace(0.0, float(x[own].max()), 30)
        centre, middle = float(x[usable].mean()), float(np.median(y[usable]))
        axes.plot(days, middle + between.rate * (days - centre), color=OCHRE, linewidth=1.3, zorder=8)
        low, high = (middle + rate * (days - centre) for rate in between.interval95)
        axes.fill_between(days, low, high, color=OCHRE, alpha=0.16, linewidth=0, zorder=2)
        axes.set_title(f"{label(between.meter)}   n = {int(own.sum()):,}")
        axes.set_ylim(-half, half)
        whole_ticks(axes, 4)
    for axes in grid[len(shown) :]:
        axes.set_visible(False)
    for axes in grid[max(len(shown) - across, 0) : len(shown)]:
        axes.tick_params(labelbottom=True)
        axes.set_xlabel("days since the meter’s calibration")
    drawn.supylabel("observed − predicted (pH)", fontsize=7.5)
    legend_above(drawn, [*handles(audit.status[placed]), ENTRY])
    return drawn
