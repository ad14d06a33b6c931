"""How a record is understood, as terminal text and as JSON."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING, Any

from reconcile.cli.show import columns, heading, line
from reconcile.records.columns import BY_SHEET
from reconcile.records.completeness import shortfalls
from reconcile.reporter.words import counted

if TYPE_CHECKING:
    from reconcile.records.book import BatchRecords, SheetSource

SHOWN = 20
"""Rows set aside, and notes, that are shown before the rest is only counted."""


def _title(kind: str, name: str) -> str:
    """Heading of a field as the program writes it itself."""
    return next((column.title for column in BY_SHEET.get(kind, ()) if column.name == name), name)


def _first(texts: Sequence[Sequence[str]], what: str) -> None:
    columns(texts[:SHOWN])
    if len(texts) > SHOWN:
        line(f"and {len(texts) - SHOWN} more {what}; --json lists all of them", indent=2)


def _sheet(sheet: SheetSource) -> None:
    name = f'{sheet.file}, sheet "{sheet.sheet}"' if sheet.sheet else sheet.file
    heading(f"{name}: {sheet.kind}" if sheet.kind else f"{name}: not recognised, not read")
    if not sheet.kind:
        return
    rows = ", ".join(f"{number} {what}" for what, number in sheet.rows.items() if number)
    line(f"headings in row {sheet.heading_row}; rows: {rows or 'none'}", indent=2)
    columns(
        [(column, written, _title(sheet.kind, name), unit) for name, (column, written, unit) in sheet.columns.items()],
        headings=("column", "heading as written", "understood as", "unit"),
        indent=4,
    )
    if sheet.ignored:
        line(f"not read: {', '.join(sheet.ignored)}", indent=2)


def show(records: BatchRecords) -> None:
    """Sheets, columns and units; the rows that add up; what is set aside, and why."""
    used, aside = len(records.readings), len(records.set_aside)
    line(f"{records.rows_read} rows read = {used} used + {aside} set aside", bold=True)
    line(
        f"{counted(len(records.solutions), 'solution')} of {counted(len(records.forms), 'substance')} "
        f"from {counted(len(records.lots), 'stock lot')}"
    )
    for text in shortfalls(records):
        line(f"Incomplete: {text}")
    for sheet in records.sheets:
        _sheet(sheet)
    if records.not_read:
        line(f"Not read, as these sheets say themselves: {', '.join(p.sheet or p.file for p in records.not_read)}")
    if records.set_aside:
        heading("Set aside")
        _first([_aside(row.place.words(), row.cause.words(), row) for row in records.set_aside], "rows set aside")
    if records.notes:
        heading("Notes")
        _first([(note.message(),) for note in records.notes], "notes")


def _aside(place: str, cause: str, row: Any) -> tuple[str, str]:
    because = row.reason if cause == place or cause.startswith(place) else f"{cause}: {row.reason}"
    return place, f"{because} {row.advice}".strip()


def document(records: BatchRecords) -> dict[str, Any]:
    """All of it as --json prints it."""
    return {
        "rows": {
            "read": records.rows_read,
            "used": len(records.readings),
            "set_aside": len(records.set_aside),
        },
        "incomplete": list(shortfalls(records)),
        "sheets": [
            {
                "source": sheet.file,
                "sheet": sheet.sheet,
                "sha256": sheet.sha256,
                "kind": sheet.kind,
                "heading_row": sheet.heading_row,
                "rows": sheet.rows,
                "columns": [
                    {"field": name, "column": column, "heading": written, "unit": unit}
                    for name, (column, written, unit) in sheet.columns.items()
                ],
                "not_read": list(sheet.ignored),
            }
            for sheet in records.sheets
        ],
        "says_not_read": [{"source": place.file, "sheet": place.sheet} for place in records.not_read],
        "set_aside": list(_set_aside(records)),
        "notes": [{"code": note.code, "text": note.message()} for note in records.notes],
    }


def _set_aside(records: BatchRecords) -> Iterable[dict[str, Any]]:
    for row in records.set_aside:
        yield {
            "source": row.place.file,
            "sheet": row.place.sheet,
            "row": row.place.row,
            "batch": row.batch,
            "meter": row.meter,
            "lot": row.lot,
            "cause": {"source": row.cause.file, "sheet": row.cause.sheet, "cell": row.cause.cell},
            "code": row.code,
            "read": row.read,
            "reason": row.reason,
            "advice": row.advice,
            "summary": row.summary,
        }
