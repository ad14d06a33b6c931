"""Residual through time, one strip a meter, with calibrations, events and what the findings say of the meter."""

from __future__ import annotations

from collections import Counter

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D

from reconcile.records.arrays import BoolArray, FloatArray
from reconcile.records.book import Table
from reconcile.records.results import Audit, Finding
from reconcile.reporter.figures.marks import beyond, cloud, handles, legend_above, limit
from reconcile.reporter.figures.style import (
    BLUE,
    INK,
    OCHRE,
    WIDTH,
    band,
    empty,
    figure,
    label,
    whole_ticks,
    zero_line,
)
from reconcile.reporter.figures.timeline import Timeline, day, days, timeline
from reconcile.reporter.lookups import METER_TYPES, Lookups

MOST_METERS = 12
MOST_EVENTS = 6


def meters_shown(audit: Audit, lookups: Lookups) -> list[str]:
    """Meters with findings first, then the most used; at most twelve, in order of name."""
    used = Counter(audit.records.readings["meter"].tolist())
    by_use = sorted(used, key=lambda m: (str(m) not in lookups.findings_of_meter, -used[m], str(m)))
    return sorted(by_use[:MOST_METERS], key=lambda m: (m == "", m))


def residuals_time(audit: Audit, lookups: Lookups) -> Figure:
    """One strip a meter, all on the same scale."""
    line = timeline(lookups)
    shown = meters_shown(audit, lookups)
    finite = np.isfinite(audit.residual) & line.placed
    residual = {name: lookups.apart_from_others(lookups.about(name, METER_TYPES)) for name in shown}
    if not shown or not finite.any():
        return empty("No reading has both a residual and a place in time.")
    meter = audit.records.readings["meter"]
    drawn = figure(WIDTH, 0.85 + (2.0 if len(shown) == 1 else (0.95 if len(shown) <= 6 else 0.8) * len(shown)))
    strips = drawn.subplots(len(shown), 1, sharex=True, sharey=True, squeeze=False)[:, 0]
    own_rows = {name: finite & (meter == name) for name in shown}
    half = limit(np.concatenate([residual[name][own_rows[name]] for name in shown]))
    total = int(finite.sum())
    entries = handles(audit.status[finite])
    drew: set[str] = set()
    for axes, name in zip(strips, shown, strict=True):
        own, values = own_rows[name], residual[name]
        band(axes, float(np.nanmedian(audit.u_residual)))
        zero_line(axes)
        inside = np.where(np.abs(values) <= half, values, np.nan)
        cloud(axes, line.x[own], inside[own], audit.status[own], total)
        beyond(axes, line.x[own], values[own], half, most=2)
        for finding in lookups.about(name, METER_TYPES):
            _course(axes, finding, line, values, own)
            drew.add("fit")
        drew |= _dated_marks(axes, name, audit, line, half)
        axes.set_title(f"{label(name) or 'meter not named'}   n = {int(own.sum()):,}")
        axes.set_ylim(-half, half)
        whole_ticks(axes, 4)
    line.dress(strips[-1])
    drawn.supylabel("observed − predicted (pH)", fontsize=7.5)
    strips[-1].set_xlabel(line.name())
    legend_above(drawn, entries + [ENTRIES[key] for key in ENTRIES if key in drew])
    return drawn


ENTRIES = {
    "fit": Line2D([], [], color=OCHRE, linewidth=1.3, label="course a finding gives"),
    "calibration": Line2D(
        [], [], linestyle="none", marker="|", markersize=6, markeredgewidth=1.0, color=BLUE, label="calibration"
    ),
    "event": Line2D([], [], color=INK, linewidth=0.8, linestyle=(0, (1, 2)), label="logged event"),
}


FROM_BEFORE = ("meter_step", "meter_drift")
"""Kinds whose size counts from where the meter stood before, not from agreement."""


def _course(axes: Axes, finding: Finding, line: Timeline, values: FloatArray, rows: BoolArray) -> None:
    """The part of the residual that a finding about this meter accounts for, and when it began.

    values : (n,) residuals as the strip shows them; rows : (n,) the strip's readings
    """
    own = np.asarray(finding.readings, np.intp)
    if len(finding.shift) == len(own):
        part = np.full(len(values), np.nan)
        part[own] = finding.shift
        if finding.kind in FROM_BEFORE:
            before = rows & np.isnan(part)
            if line.dated and finding.since is not None:  # a later one that it does not rest on was adjusted by
                before &= line.x < day(finding.since)
            part[before] = 0.0
            part += float(np.nanmedian((values - part)[rows]))
        placed = np.flatnonzero(np.isfinite(part) & line.placed & rows)
        inside = np.isin(placed, own)
        for chosen in (placed[inside], placed[~inside]):
            order = chosen[np.argsort(line.x[chosen], kind="stable")]
            if len(order):
                axes.plot(line.x[order], part[order], color=OCHRE, linewidth=1.3, zorder=8)
    if line.dated and finding.since is not None:
        axes.axvline(day(finding.since), color=OCHRE, linewidth=0.8, zorder=2)
        if finding.since_interval95 is not None:
            low, high = (day(t) for t in finding.since_interval95)
            axes.axvspan(low, high, color=OCHRE, alpha=0.14, linewidth=0, zorder=0.5)


def _dated_marks(axes: Axes, meter: str, audit: Audit, line: Timeline, half: float) -> set[str]:
    """Calibrations as ticks along the bottom, events as dotted lines; returns what was drawn."""
    drew: set[str] = set()
    if not line.dated or not meter:
        return drew
    low, high = float(np.nanmin(line.x)), float(np.nanmax(line.x))
    at = _when(audit.records.calibrations, "calibrated_at", meter)
    at = at[(at >= low) & (at <= high)]
    if len(at):
        axes.plot(at, np.full(len(at), -half * 0.92), linestyle="none", marker="|", markersize=5, color=BLUE, zorder=7)
        drew.add("calibration")
    events = audit.records.events
    at = days(events["at"])
    used = audit.records.readings["probe"][audit.records.readings["meter"] == meter]
    own = (events["meter"] == meter) | ((events["meter"] == "") & np.isin(events["probe"], sorted({*used} - {""})))
    chosen = np.flatnonzero(own & (at >= low) & (at <= high))
    for i in chosen[:MOST_EVENTS].tolist():
        axes.axvline(float(at[i]), color=INK, linewidth=0.8, linestyle=(0, (1, 2)), zorder=2)
        drew.add("event")
        early = at[i] < low + 0.2 * (high - low)  # the strip's own title stands above: inside the strip then
        late = at[i] > low + 0.8 * (high - low)
        axes.annotate(
            label(str(events["what"][i]), 30),
            (float(at[i]), half),
            xytext=(2, -1) if early else (0, 1),
            textcoords="offset points",
            ha="right" if late else "left",
            va="top" if early else "bottom",
            fontsize=6.5,
        )
    return drew


def _when(table: Table, name: str, meter: str) -> FloatArray:
    when = days(table[name])
    chosen: BoolArray = (table["meter"] == meter) & np.isfinite(when)
    return when[chosen]
