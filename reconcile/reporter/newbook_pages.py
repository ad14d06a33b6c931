"""The sheets of a new workbook that are not read: notes, lists, and the filled example."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

from reconcile.records.columns import BY_SHEET, NOT_READ
from reconcile.records.places import column_letters
from reconcile.reporter.cautions import NO_HAZARD_WORD, SHORT_CAUTION, gas_words
from reconcile.reporter.newbook_example import EXAMPLE
from reconcile.reporter.newbook_lists import lists, substances
from reconcile.reporter.to_xlsx import FILL, Book

ROWS_OF = {
    "readings": "a row a reading",
    "recipes": "a row a component of a batch",
    "stocks": "a row a lot",
    "known": "a row a certified buffer and temperature",
    "meters": "a row a meter",
    "calibrations": "a row a calibration",
    "events": "a row a thing done to a meter or probe",
    "series": "a row a substance in the vessel of a titration",
}
NOTES = (
    "Needed are readings, with a pH and what was read, and the recipes of the batches read. What else is missing costs "
    "only what needs it: no meters, no findings about meters. A sheet or column without use stays empty.",
    "Shaded headings are needed on their sheet. Columns may stand in any order, sheets may be renamed or deleted; the "
    "headings are what is recognised. The Example sheet shows rows that are filled in.",
    "Amounts are final concentrations, or quantities taken with what they were made up to. Each has its unit beside "
    "it: units are never guessed, and capitals count.",
    "Names of batches, lots and meters are read as they stand: 12 and 0012 are two names. Numbers stand alone in their "
    "cells; words belong in the remark.",
    "A reading that does not count is marked void, not deleted. The original reading stands.",
    "Hazard words stand beside the substances on the Lists sheet; they are reminders and incomplete. Follow site "
    "procedure, safety data sheets, local rules and licensed practice.",
    "reconcile read FILE.xlsx shows how the workbook is understood; reconcile audit FILE.xlsx audits it. "
    + SHORT_CAUTION,
)
TABLE = (("Sheet", 16), ("Column", 26), ("Unit", 9), ("From", 8), ("To", 8), ("What goes in", 96))
TOP = 3
"""Row, from 0, of the headings on the Lists sheet."""


def _begin(book: Book, sheet: Any, said: str) -> None:
    sheet.write_string(0, 0, NOT_READ, book.format(italic=True))
    sheet.write_string(1, 0, said, book.format(bold=True))


def add_notes(book: Book, sheet: Any, names: Mapping[str, str], notes: Mapping[tuple[str, str], str]) -> None:
    """How the workbook is filled in, and every column with what goes in."""
    _begin(book, sheet, "A record of pH readings: how this workbook is filled in")
    last = len(TABLE) - 1
    wrap = book.format(text_wrap=True)
    row = 2
    for text in NOTES:
        sheet.merge_range(row, 0, row, last, text, wrap)
        sheet.set_row(row, 14 if len(text) < 190 else 27)
        row += 1
    row += 1
    for at, (title, characters) in enumerate(TABLE):
        sheet.set_column(at, at, characters)
        sheet.write_string(row, at, title, book.format(bold=True, bottom=1))
    for kind, name in names.items():
        row += 1
        sheet.write_string(row, 0, name, book.format(bold=True))
        sheet.write_string(row, 1, ROWS_OF[kind], book.format(italic=True))
        for column in BY_SHEET[kind]:
            row += 1
            strong = {"bold": True, "bg_color": FILL} if column.needed else {}
            sheet.write_string(row, 1, column.title, book.format(**strong))
            sheet.write_string(row, 2, column.unit, book.format())
            for at, bound in ((3, column.low), (4, column.high)):
                if abs(bound) < float("inf"):
                    sheet.write_number(row, at, bound, book.format(align="left"))
            sheet.write_string(row, 5, notes.get((kind, column.name), ""), wrap)


def add_lists(book: Book, sheet: Any) -> dict[str, str]:
    """The lists that cells offer, substances with formula, molar mass and hazard words; list -> its range of cells."""
    _begin(book, sheet, "What the cells of the other sheets offer")
    ranges, at = {}, 0
    for title, entries in lists().items():
        sheet.write_string(TOP, at, title, book.format(bold=True, bottom=1, text_wrap=True))
        sheet.set_column(at, at, 34 if title == "Substance" else 16)
        for row, text in enumerate(entries, TOP + 1):
            sheet.write_string(row, at, text, book.format(num_format="@"))
        letters = column_letters(at)
        ranges[title] = f"'Lists'!${letters}${TOP + 2}:${letters}${TOP + 1 + len(entries)}"
        at += 1
        if title == "Substance":
            at = _about_substances(book, sheet, at)
    sheet.set_row(TOP, 27)
    sheet.freeze_panes(TOP + 1, 1)
    sheet.repeat_rows(TOP)
    return ranges


def _about_substances(book: Book, sheet: Any, at: int) -> int:
    """Formula, molar mass and hazard words beside the names; returns the next free column."""
    for offset, (title, characters) in enumerate((("Formula", 18), ("Molar mass (g/mol)", 11), ("Hazard words", 72))):
        beside = {"align": "right"} if offset == 1 else {"align": "left", "indent": 1} if offset == 2 else {}
        sheet.write_string(TOP, at + offset, title, book.format(bold=True, bottom=1, text_wrap=True, **beside))
        sheet.set_column(at + offset, at + offset, characters)
    for row, form in enumerate(substances(), TOP + 1):
        words = "; ".join(w for w in (form.hazard or NO_HAZARD_WORD, gas_words(form.gas_with_acid)) if w)
        sheet.write_string(row, at, form.formula, book.format())
        sheet.write_number(row, at + 1, form.molar_mass, book.format(num_format="0.000"))
        sheet.write_string(row, at + 2, words, book.format(align="left", indent=1))
    return at + 3


def add_example(
    book: Book,
    sheet: Any,
    names: Mapping[str, str],
    write_headings: Callable[[Book, Any, int, str], None],
    write_rows: Callable[[Book, Any, int, str, Any], None],
) -> None:
    """The filled example: every sheet of the record below the other."""
    _begin(book, sheet, "An example, filled in: an invented solution room; no row of it is part of the record")
    sheet.set_column(0, max(len(columns) for columns in BY_SHEET.values()) - 1, 17)
    sheet.set_column(1, 1, 30)
    row = 3
    for kind, name in names.items():
        sheet.write_string(row, 0, f"{name}: {ROWS_OF[kind]}", book.format(bold=True))
        write_headings(book, sheet, row + 1, kind)
        write_rows(book, sheet, row + 2, kind, EXAMPLE[kind])
        row += len(EXAMPLE[kind]) + 4
