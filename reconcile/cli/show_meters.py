"""The gist of meters through time as terminal text."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from reconcile.cli.show import columns, heading, line
from reconcile.records.completeness import shortfalls
from reconcile.reporter.meter_gist import NO_LEAVE, meter_gist
from reconcile.reporter.text import caution_lines

if TYPE_CHECKING:
    from reconcile.records.meter_results import MeterHistory

MOST_CROSSINGS = 24


def show(history: MeterHistory, folder: Path) -> None:
    """Gist, when lines cross limits, what is incomplete, cautions, and where the report is."""
    columns([(text.label, text.text) for text in meter_gist(history)], indent=0)
    if history.crossings:
        heading("When lines cross limits")
        line(NO_LEAVE, indent=2)
        columns([(x.text,) for x in history.crossings[:MOST_CROSSINGS]])
        more = len(history.crossings) - MOST_CROSSINGS
        if more > 0:
            line(f"and {more} more in crossings.csv", indent=2)
    short = shortfalls(history.records)
    if short:
        heading("Incomplete")
        columns([(text,) for text in short])
    heading("Cautions")
    columns([(text,) for text in caution_lines()])
    line()
    line(f"Report: {folder / 'meters.html'}", bold=True)
