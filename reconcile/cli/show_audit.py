"""The gist of an audit as terminal text."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from reconcile.cli.show import columns, heading, line
from reconcile.records.completeness import shortfalls
from reconcile.reporter.text import caution_lines, gist_rows, hazard_lines

if TYPE_CHECKING:
    from reconcile.records.results import Audit


def show(audit: Audit, folder: Path) -> None:
    """Gist with a line a finding, what is incomplete, hazard words, cautions, and where the report is."""
    columns(gist_rows(audit), indent=0)
    short = shortfalls(audit.records)
    if short:
        heading("Incomplete")
        columns([(text,) for text in short])
    hazards = [text.rsplit(": ", 1) for text in hazard_lines(audit)]
    if hazards:
        heading("Hazard words")
        columns(hazards)
    heading("Cautions")
    columns([(text,) for text in caution_lines()])
    line()
    line(f"Report: {folder / 'report.html'}", bold=True)
