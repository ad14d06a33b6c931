"""Limits in a finding's section: the readings that would change their place, or how many would stay outside."""

from __future__ import annotations

import numpy as np

from reconcile.records.book import Table as Records
from reconcile.records.results import Audit, Finding
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.page_tables import Cell, Row, View, row_id, text_cell
from reconcile.reporter.plain import plain
from reconcile.reporter.words import counted, half_up, minus, signed

MOST_IMPACT = 40


def unmoved(audit: Audit, finding: Finding) -> str:
    """What stands where no reading would change its place: how many lie outside limits as read, and stay there."""
    readings = audit.records.readings
    outside = [i for i in np.asarray(finding.readings).tolist() if _place(readings, int(i), 0.0) in ("below", "above")]
    if not outside:
        return "No reading would change its place inside or outside its limits."
    batches = len({str(readings["batch"][i]) for i in outside})
    which = f"{counted(len(outside), 'reading')} of {counted(batches, 'batch', 'batches')}"
    lies = "lies" if len(outside) == 1 else "lie"
    return f"{which} {lies} outside the limits as read and would stay there if this finding holds."


def moved(audit: Audit, lookups: Lookups, finding: Finding, name: str, on_page: set[int]) -> View | None:
    chosen = sorted(int(i) for i in finding.impact)
    if not chosen:
        return None
    readings = audit.records.readings
    shift = dict(zip(np.asarray(finding.readings).tolist(), finding.shift.tolist(), strict=False))

    def digits(value: float, i: int) -> str:
        return minus(half_up(float(value), int(max(lookups.decimals[i], 2))))

    rows = []
    for i in chosen[:MOST_IMPACT]:
        where = lookups.place_words(i)
        target = ((where, row_id(i)),) if i in on_page else ()
        share = shift.get(i, finding.estimate or np.nan)
        rows.append(
            Row(
                "",
                False,
                [
                    Cell(where, "", target),
                    text_cell(str(lookups.batch[i])),
                    text_cell(str(lookups.meter[i])),
                    Cell(minus(half_up(float(readings["ph"][i]), int(lookups.decimals[i]))), "n"),
                    Cell(digits(readings["low_limit"][i], i), "n"),
                    Cell(digits(readings["high_limit"][i], i), "n"),
                    Cell(signed(half_up(share, 3)), "n"),
                    Cell(_place(readings, i, 0.0), "s"),
                    Cell(_place(readings, i, share), "s"),
                ],
            )
        )
    headings = [
        ("Reading", ""),
        ("Batch", ""),
        ("Meter", ""),
        ("pH observed", "n"),
        ("Low limit (pH)", "n"),
        ("High limit (pH)", "n"),
        ("Share of the finding (pH)", "n"),
        ("As read", ""),
        ("Without that share", ""),
    ]
    more = len(chosen) - MOST_IMPACT
    note = f"and {counted(more, 'more reading')} in findings.json" if more > 0 else ""
    caption = f"Readings that would change their place in or out of limits if {plain(finding.id)} holds"
    return View(f"{name}-impact", caption, headings, rows, note, tool=False)


def _place(readings: Records, i: int, share: float) -> str:
    """Where a reading lies against its limits, less what a finding accounts for [pH]."""
    value = float(readings["ph"][i]) - share
    if not np.isfinite(value):
        return "–"
    if value < float(readings["low_limit"][i]):
        return "below"
    return "above" if value > float(readings["high_limit"][i]) else "inside"
