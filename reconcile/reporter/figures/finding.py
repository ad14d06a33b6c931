"""A finding's own picture: its subject's residuals as recorded, and with what the finding explains taken out."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.ticker import MaxNLocator

from reconcile.records.arrays import BoolArray, FloatArray
from reconcile.records.results import Audit, Finding
from reconcile.reporter.figures.marks import MARKS, RASTER_FROM, legend_above, limit
from reconcile.reporter.figures.style import GREY, INK, OCHRE, WIDTH, band, empty, figure, label, whole_ticks, zero_line
from reconcile.reporter.figures.timeline import day, days, timeline
from reconcile.reporter.lookups import Lookups

AGAINST_PH = ("meter_span", "lot_identity", "acid_constant", "probe_matrix", "calibration_buffer")
DOTTED = (0, (1, 2))
AGAINST_TEMPERATURE = ("meter_temperature",)


def finding_picture(audit: Audit, lookups: Lookups, finding: Finding) -> Figure:
    """Two panels on one scale, other findings taken out of both: with this one left in, and with it taken out."""
    rows = lookups.of_subject(finding)
    rows = rows[np.isfinite(audit.residual[rows])]
    line = timeline(lookups)
    if finding.kind in AGAINST_PH:
        x, name, dress = audit.prediction.ph, "pH predicted from the recipe", None
    elif finding.kind in AGAINST_TEMPERATURE:
        x, name, dress = audit.prediction.temperature_c, "temperature (°C)", None
    else:
        x, name, dress = line.x, line.name(), line
    rows = rows[np.isfinite(x[rows])]
    if not len(rows):
        return empty("None of these readings has a residual and a place on the axis.")
    own = np.isin(rows, finding.readings)
    before = lookups.apart_from_others([finding])[rows]
    after = before - lookups.part(finding)[rows]
    others = not np.allclose(before, audit.residual[rows], equal_nan=True)
    left = "as recorded, other findings taken out" if others else "as recorded"
    half = limit(np.concatenate([before, after]))
    drawn = figure(WIDTH, 2.35)
    panels = drawn.subplots(1, 2, sharey=True, sharex=True)
    logged = False
    spread = float(np.nanmedian(audit.u_residual[rows]))
    without = f"{label(finding.id)} taken out too" if others else f"with {label(finding.id)} taken out"
    for axes, values, title in zip(panels, (before, after), (left, without), strict=True):
        band(axes, spread)
        zero_line(axes)
        _points(axes, x[rows], np.clip(values, -half, half), own)
        if dress is line and line.dated and finding.since is not None:
            axes.axvline(day(finding.since), color=OCHRE, linewidth=0.8, zorder=2)
            if finding.since_interval95 is not None:
                low, high = (day(t) for t in finding.since_interval95)
                axes.axvspan(low, high, color=OCHRE, alpha=0.14, linewidth=0, zorder=0.5)
        if dress is line and line.dated:
            logged |= _events(axes, audit, finding, x[rows])
        axes.set_title(title)
        axes.set(ylim=_ends(np.clip(np.concatenate([before, after]), -half, half), spread), xlabel=name)
    if dress is line:
        line.dress(panels[0], most=5, x=x[rows])
    else:
        panels[0].xaxis.set_major_locator(MaxNLocator(6, steps=[1, 2, 5, 10]))
        air = max(0.05 * float(np.ptp(x[rows])), 0.1)
        panels[0].set_xlim(float(x[rows].min()) - air, float(x[rows].max()) + air)
    panels[0].set_ylabel("observed − predicted (pH)")
    whole_ticks(panels[0])
    entries = [Line2D([], [], linestyle="none", marker="^", markersize=5, color=OCHRE,
                      label=f"reading the finding rests on ({int(own.sum()):,})")]  # fmt: skip
    if not own.all():
        entries.append(Line2D([], [], linestyle="none", marker="o", markersize=3.5, markerfacecolor="none", color=GREY,
                              label=f"other reading of the same subject ({int((~own).sum()):,})"))  # fmt: skip
    if logged:
        entries.append(Line2D([], [], color=INK, linewidth=0.8, linestyle=DOTTED, label="logged event"))
    legend_above(drawn, entries)
    return drawn


def _events(axes: Axes, audit: Audit, finding: Finding, x: FloatArray) -> bool:
    """What was done to the finding's meter or probe while it was read, as dotted lines; whether there was anything."""
    if finding.subject_type not in ("meter", "probe"):
        return False
    events = audit.records.events
    at = days(events["at"])
    inside = (events[finding.subject_type] == finding.subject) & (at >= x.min()) & (at <= x.max())
    for moment in at[inside]:
        axes.axvline(moment, color=INK, linewidth=0.8, linestyle=DOTTED, zorder=1.5)
    return bool(inside.any())


def _ends(values: FloatArray, spread: float) -> tuple[float, float]:
    """Ends of the axis: all values, and at least a little more than the band of a clean record."""
    least = 2.6 * spread if np.isfinite(spread) else 0.02
    return min(1.12 * float(values.min()), -least), max(1.12 * float(values.max()), least)


def _points(axes: Axes, x: FloatArray, y: FloatArray, own: BoolArray) -> None:
    many = len(x) > RASTER_FROM
    for chosen, style in ((~own, MARKS["as_predicted"]), (own, MARKS["explained"])):
        drawn = dict(style)
        if many:
            drawn |= {"s": drawn["s"] * 0.4, "linewidths": 0.3 if chosen is not own else 0.0}
        axes.scatter(x[chosen], y[chosen], zorder=3 if chosen is not own else 4, rasterized=many, **drawn)
