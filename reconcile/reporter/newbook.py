"""A new workbook for a record: empty sheets with headings, drop-down lists and notes, and a filled example beside."""

from __future__ import annotations

import csv
import os
from collections.abc import Sequence
from datetime import datetime
from functools import cache
from pathlib import Path
from typing import Any

from reconcile import __version__
from reconcile.records.columns import BY_SHEET, Column
from reconcile.records.places import column_letters
from reconcile.reporter.folder import sync_folder, write_file
from reconcile.reporter.newbook_example import EXAMPLE, Row
from reconcile.reporter.newbook_lists import CHECKED, FROM_SHEET, OFFERS
from reconcile.reporter.newbook_pages import add_example, add_lists, add_notes
from reconcile.reporter.to_xlsx import FILL, Book
from reconcile.reporter.working_place import settle, working_place

SHEETS = {
    "readings": "Readings",
    "recipes": "Recipes",
    "stocks": "Stocks",
    "known": "Known solutions",
    "meters": "Meters",
    "calibrations": "Calibrations",
    "events": "Events",
    "series": "Series",
}
"""Kind of sheet -> its name, in the order of the workbook."""
LAST_ROW = 10_000
"""Row down to which cells offer lists and notes; rows below are read like any other."""
LISTED = 2_000
"""Rows of another sheet that a list looks through."""
PH_RANGE = (-2.0, 16.0)
"""Range of a column that holds a pH, in the table of columns."""
DAYS = ("opened", "expiry")
"""Times that are dates without a time of day."""
FINE = "0.00##"
"""Number format of a pH: keeps trailing zeros, hides no digit, and so claims no resolution that was not there."""
LONGEST_TITLE, LONGEST_NOTE = 32, 255
"""Characters of the note that a cell shows when it is chosen; a limit of the file format."""


def write_newbook(path: Path | str, *, filled: bool = False, replace: bool = False) -> Path:
    """Write a new workbook and return its path.

    Parameters
    ----------
    path : file to make; its folder must exist
    filled : with the rows of the example on the sheets of the record
    replace : a file that is already there is replaced

    Raises
    ------
    FileExistsError : there is a file and `replace` is False, or there is a folder
    OSError : the file cannot be written; then nothing is left behind
    """
    path = Path(path)
    check_newbook(path, replace)
    content = newbook(filled)
    settle(path.parent)
    try:
        with working_place(path.parent) as place:
            write_file(place / path.name, content)
            check_newbook(path, replace)  # the place may have been filled while we worked
            os.replace(place / path.name, path)
            sync_folder(path.parent)
    except OSError as error:
        if isinstance(error, FileExistsError) or error.errno is None:
            raise
        raise OSError(error.errno, error.strerror, str(path)) from error  # the file asked for, not the one beside it
    return path


def check_newbook(path: Path, replace: bool) -> None:
    """Refuse a place that may not be written to; raises FileExistsError."""
    if path.is_dir():
        raise FileExistsError(f"{path} is a folder; name a file")
    if os.path.lexists(path) and not replace:
        raise FileExistsError(f"{path} already exists; replace it with --replace, or name another file")


def newbook(filled: bool = False) -> bytes:
    """The workbook as bytes, the same each time."""
    book = Book("A record of pH readings", f"reconcile {__version__}")
    notes_of = notes()
    pages = [book.book.add_worksheet(name) for name in ("Notes", *SHEETS.values(), "Example", "Lists")]
    for sheet in pages:
        sheet.set_landscape()
        sheet.set_paper(9)
        sheet.fit_to_pages(1, 0)
    ranges = add_lists(book, pages[-1])
    add_notes(book, pages[0], SHEETS, notes_of)
    add_example(book, pages[-2], SHEETS, write_headings, write_rows)
    for kind, sheet in zip(SHEETS, pages[1:-2], strict=True):
        write_headings(book, sheet, 0, kind)
        for at, column in enumerate(BY_SHEET[kind]):
            sheet.set_column(at, at, width(column), book.format(**cell_format(column)))
            sheet.data_validation(1, at, LAST_ROW - 1, at, validation(column, notes_of, ranges))
        sheet.freeze_panes(1, 0)
        sheet.repeat_rows(0)
        if filled:
            write_rows(book, sheet, 1, kind, EXAMPLE[kind])
    return book.close()


@cache
def notes() -> dict[tuple[str, str], str]:
    """(sheet, column) -> what goes in."""
    with (Path(__file__).parent / "newbook_columns.csv").open(encoding="utf-8", newline="") as file:
        return {(row["sheet"], row["name"]): row["note"] for row in csv.DictReader(file)}


def width(column: Column) -> float:
    """Width of a column, in characters of its sheet."""
    least = {"text": 14, "time": 17, "number": 11, "amount": 11}[column.kind]
    wide = {"substance": 30, "remark": 34, "what": 30, "titrant": 24, "name": 22, "known": 22, "buffer_lots": 20}
    return max(float(wide.get(column.name, least)), 0.62 * len(column.title))  # titles wrap once


def cell_format(column: Column) -> dict[str, Any]:
    """Number format of a column's cells: names are text, dates are dates."""
    if column.kind == "text":
        return {"num_format": "@", "align": "left", "indent": 1}
    if column.kind == "time":
        return {"num_format": "yyyy-mm-dd" if column.name in DAYS else "yyyy-mm-dd hh:mm", "align": "left", "indent": 1}
    return {"num_format": FINE} if (column.low, column.high) == PH_RANGE else {}


def write_headings(book: Book, sheet: Any, row: int, kind: str) -> None:
    """One row of headings; what a row needs stands out."""
    for at, column in enumerate(BY_SHEET[kind]):
        strong = {"bold": True, "bg_color": FILL} if column.needed else {}
        beside = {"align": "right"} if column.kind in ("number", "amount") else {"align": "left", "indent": 1}
        form = book.format(text_wrap=True, bottom=1, num_format="@", **strong, **beside)
        sheet.write_string(row, at, column.title, form)
    sheet.set_row(row, 27)


def write_rows(book: Book, sheet: Any, row: int, kind: str, rows: Sequence[Row]) -> None:
    """Rows of an example, as a person would type them."""
    for number, values in enumerate(rows, row):
        for at, column in enumerate(BY_SHEET[kind]):
            value = values.get(column.name)
            form = book.format(**cell_format(column))
            if isinstance(value, str):
                sheet.write_string(number, at, value, form)
            elif isinstance(value, datetime):
                sheet.write_datetime(number, at, value, form)
            elif value is not None:
                sheet.write_number(number, at, value, form)


def validation(column: Column, notes_of: dict[tuple[str, str], str], ranges: dict[str, str]) -> dict[str, Any]:
    """What the cells of a column offer, ask about, and say when chosen."""
    key = (column.sheet, column.name)
    rule: dict[str, Any] = {"validate": "any"}
    if key in OFFERS:
        asked = OFFERS[key] in CHECKED
        rule = {"validate": "list", "source": f"={ranges[OFFERS[key]]}", "show_error": asked}
        rule |= _question(
            "This is not in the list. Synonyms and usual spellings are read too; capitals of units count."
        )
    elif key in FROM_SHEET:
        rule = {"validate": "list", "source": _entries(*FROM_SHEET[key]), "show_error": False}
    elif column.kind == "time":
        rule = {"validate": "date", "criteria": ">", "value": datetime(2000, 1, 1)}
        rule |= _question("This is not a date such as 2026-03-05 09:30.")
    elif column.kind == "number" and column.high < float("inf"):
        rule = {"validate": "decimal", "criteria": "between", "minimum": column.low, "maximum": column.high}
        rule |= _question(f"This is not a number from {column.low:g} to {column.high:g}.")
    if key in notes_of:
        rule |= {"input_title": column.title, "input_message": notes_of[key]}
    return rule


def _question(said: str) -> dict[str, str]:
    return {"error_type": "warning", "error_title": "Please look again", "error_message": said}


def _entries(kind: str, name: str) -> str:
    """The filled cells of a column of another sheet, as a formula."""
    at = next(i for i, column in enumerate(BY_SHEET[kind]) if column.name == name)
    letters, sheet = column_letters(at), SHEETS[kind]
    column = f"'{sheet}'!${letters}$2:${letters}${LISTED}"
    return f"=OFFSET('{sheet}'!${letters}$2,0,0,MAX(1,COUNTA({column})),1)"
