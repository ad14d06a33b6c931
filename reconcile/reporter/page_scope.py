"""Scope and provenance for the page: what was read, how it was understood, what differs from the defaults."""

from __future__ import annotations

import numpy as np

from reconcile.records.completeness import shortfalls
from reconcile.records.results import Audit
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.manifest import Reported
from reconcile.reporter.page_tables import Cell, Row, View, text_cell
from reconcile.reporter.plain import plain
from reconcile.reporter.words import counted, half_up, listed, minus, moment

MOST_NOTES = 20


def scope(audit: Audit, lookups: Lookups) -> list[tuple[str, str]]:
    """Name and text of each fact about what was audited."""
    records = audit.records
    readings = records.readings
    period = lookups.period
    meters = sorted({m for m in lookups.meter.tolist() if m})
    probes = sorted({plain(str(p)) for p in readings["probe"].tolist() if p})
    batches = {b for b in readings["batch"].tolist() if b}
    known = {k for k, b in zip(readings["known"].tolist(), readings["batch"].tolist(), strict=True) if k and not b}
    rows = audit.rows
    facts = [
        ("Files", listed(list(dict.fromkeys(plain(s.file) for s in records.sheets)), 8)),
        ("Period", " to ".join(moment(t) for t in period) if period else "no reading has a time"),
        (
            "Readings",
            f"{rows['used']:,} of {counted(len(batches), 'batch', 'batches')}"
            + (f" and {counted(len(known), 'known solution')}" if known else "")
            + f"; {rows['set_aside']:,} more set aside",
        ),
        (
            "Meters",
            f"{len(meters):,}: {listed(meters, 12)}" if meters else "none named; no meter can be found at fault",
        ),
        ("Probes", f"{len(probes):,}: {listed(probes, 12)}" if probes else "none named"),
        ("Stock lots", _lots(lookups)),
    ]
    missing = int(np.isnan(readings["temperature"]).sum())
    if missing:
        facts.append(("Without temperature", f"{counted(missing, 'reading')}, taken at the settings' room temperature"))
    values = [(name, audit.settings[name]) for name in sorted(audit.settings.changed)]
    changed = [f"{name} = {', '.join(v) if isinstance(v, tuple) else v}" for name, v in values]
    facts.append(("Settings that differ", listed([plain(c) for c in changed], 20) or "none from the defaults"))
    if records.without_effect:
        facts.append(("Declared without effect on pH", listed([plain(w) for w in records.without_effect], 12)))
    facts += [("Incomplete", plain(text)) for text in shortfalls(records)]
    facts += _calculated(audit, lookups)
    return facts


def _lots(lookups: Lookups) -> str:
    names = sorted(str(n) for n in lookups.lot_names)
    return f"{len(names):,}: {listed(names, 12)}" if names else "none named; no lot can be found at fault"


def _calculated(audit: Audit, lookups: Lookups) -> list[tuple[str, str]]:
    """One line on the record's own calculated pH, where it has one."""
    difference = np.asarray(audit.records.readings["ph_calculated"], float) - audit.prediction.ph
    known = np.flatnonzero(np.isfinite(difference))
    if not len(known):
        return []
    most = known[np.argmax(np.abs(difference[known]))]
    row = int(audit.records.readings.row[most])
    wrong = len(lookups.calculations)
    judged = f"; of {counted(wrong, 'batch', 'batches')} it is off, see under the findings" if wrong else ""
    return [
        (
            "Calculated pH in the record",
            f"stands beside {counted(len(known), 'reading')}; it differs most from the prediction, by "
            f"{minus(half_up(float(difference[most]), 2))} pH, in row {row}{judged}",
        )
    ]


def sheets_view(result: Reported) -> View:
    """How each sheet was understood."""
    rows = []
    for sheet in result.records.sheets:
        found = ", ".join(f"{count:,} {plain(kind)}" for kind, count in sheet.rows.items())
        rows.append(
            Row(
                "",
                False,
                [
                    text_cell(plain(sheet.file)),
                    text_cell(plain(sheet.sheet) or "–"),
                    text_cell(plain(sheet.kind) or "not recognised, not read"),
                    Cell(str(sheet.heading_row) if sheet.heading_row else "–", "n"),
                    text_cell(found or "–"),
                    text_cell(listed([plain(h) for h in sheet.ignored], 8) or "–"),
                ],
            )
        )
    headings = [
        ("File", ""),
        ("Sheet", ""),
        ("Understood as", ""),
        ("Heading row", "n"),
        ("Rows", ""),
        ("Headings not read", ""),
    ]
    return View("sheets", "How the files were understood", headings, rows, tool=False, captioned=True)


def notes(result: Reported) -> tuple[list[str], int]:
    """Accepted repairs and notices, the first twenty, and how many more there are."""
    messages = [plain(p.message()) for p in result.records.notes]
    return messages[:MOST_NOTES], max(len(messages) - MOST_NOTES, 0)
