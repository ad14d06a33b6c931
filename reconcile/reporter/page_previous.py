"""The part of the page that compares with an earlier report."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from reconcile.records.over_time import GONE, NEW, PERSISTS
from reconcile.records.results import Audit
from reconcile.reporter.page_tables import MOST_OTHER, Cell, View, view
from reconcile.reporter.plain import plain
from reconcile.reporter.previous import table
from reconcile.reporter.tables import Column
from reconcile.reporter.words import counted


@dataclass(frozen=True)
class PreviousPart:
    """How many findings are new, persist and are gone, in a sentence; and each of them as a row."""

    text: str
    view: View


def previous_part(audit: Audit, targets: Mapping[str, str]) -> PreviousPart | None:
    """None where the audit is not compared with an earlier report.

    targets : finding id as written -> anchor
    """
    before = audit.before
    if before is None:
        return None
    numbers = [len(before.of(what)) for what in (NEW, PERSISTS, GONE)]
    rows = table(before)

    def cell(column: Column, _row: int, text: str) -> Cell | None:
        if column.key == "id" and text in targets:
            return Cell(text, "", ((text, targets[text]),))
        return Cell(text, "s") if column.key == "standing" else None

    shown = rows if len(rows) <= MOST_OTHER else rows.rows(np.arange(MOST_OTHER))
    note = (
        "" if shown is rows else f"Shown are the first {MOST_OTHER:,} of {len(rows):,} rows; findings.json holds all."
    )
    return PreviousPart(
        f"Compared with report {plain(before.report_id)}: {numbers[0]:,} new, {numbers[1]:,} persisting, "
        f"{counted(numbers[2], 'finding')} gone.",
        view(shown, "previous-table", "Since the previous report", cells=cell, note=note, tool=len(rows) > 8),
    )
