"""residuals.xlsx: the tables with a spreadsheet's own manners, the same bytes each time."""

from __future__ import annotations

import io
import math
from datetime import datetime
from typing import Any

import numpy as np
import xlsxwriter

from reconcile import __version__
from reconcile.records.results import Audit
from reconcile.reporter import method, summaries, tables
from reconcile.reporter.large import summary_of_batches
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.manifest import report_id
from reconcile.reporter.plain import acts_as_formula
from reconcile.reporter.tables import Column, Table
from reconcile.reporter.to_csv import six_digits

MOST_ROWS = 20_000
"""Readings up to which the workbook holds them all."""
MOST_BATCHES = 2_000
METHOD_WIDTHS = (40, 22, 22, 14, 60, 14, 60)
FILL, FONT = "#D9D9D9", "Calibri"
FIRST_DAY, LAST_DAY = np.datetime64("1900-03-01"), np.datetime64("9999-12-31")
"""Days that a spreadsheet counts as dates without fault."""
FIXED_DATE = datetime(2000, 1, 1)


class Book:
    """A workbook being written: its formats, and one sheet after another."""

    def __init__(self, title: str, footer: str) -> None:
        self.bytes = io.BytesIO()
        self.book = xlsxwriter.Workbook(
            self.bytes,
            {
                "in_memory": True,
                "strings_to_formulas": False,
                "strings_to_urls": False,
                "strings_to_numbers": False,
                "nan_inf_to_errors": False,
            },
        )
        self.book.set_properties({"title": title, "created": FIXED_DATE, "author": "", "comments": footer})
        self.footer = footer
        self.formats: dict[tuple[Any, ...], Any] = {}

    def format(self, **properties: Any) -> Any:
        """One format of each kind, made when first needed."""
        key = tuple(sorted(properties.items()))
        if key not in self.formats:
            self.formats[key] = self.book.add_format(
                {"font_name": FONT, "font_size": 10, "valign": "top", **properties}
            )
        return self.formats[key]

    def close(self) -> bytes:
        self.book.close()
        return self.bytes.getvalue()


def number_format(column: Column, decimals: int | None) -> str:
    """The spreadsheet's format of a number."""
    if column.kind == "integer":
        return "0"
    if decimals is None:
        return "General"
    plain = "0." + "0" * decimals if decimals else "0"
    return f"+{plain};-{plain};{plain}" if column.signed else plain


def _write(
    book: Book, sheet: Any, row: int, at: int, column: Column, value: Any, decimals: int | None, fill: bool
) -> None:
    marked = {"bg_color": FILL, "bold": True} if fill else {}
    if column.kind == "text":
        wrap = {"text_wrap": True} if column.width >= 40 else {}
        quoted = {"quote_prefix": True} if acts_as_formula(value) else {}
        sheet.write_string(row, at, value, book.format(**wrap, **quoted, **marked))
    elif column.kind == "time":
        moment = np.datetime64(value, "s")
        if np.isnat(moment):
            sheet.write_blank(row, at, None, book.format(**marked))
        elif FIRST_DAY <= moment <= LAST_DAY:
            sheet.write_datetime(row, at, moment.item(), book.format(num_format="yyyy-mm-dd hh:mm", **marked))
        else:
            sheet.write_string(row, at, str(moment), book.format(**marked))
    elif value is None or not math.isfinite(value):
        sheet.write_blank(row, at, None, book.format(**marked))
    else:
        number = int(value) if column.kind == "integer" else float(six_digits(float(value)))
        sheet.write_number(row, at, number, book.format(num_format=number_format(column, decimals), **marked))


def add_table(book: Book, name: str, table: Table, note: str = "") -> None:
    """One sheet: a note if there is one, headings that stay in sight, filters, a print area."""
    sheet = book.book.add_worksheet(name)
    top = 0
    if note:
        sheet.write_string(0, 0, note, book.format(italic=True))
        top = 1
    heading = {"bold": True, "text_wrap": True, "bottom": 1}
    for at, column in enumerate(table.columns):
        right = {"align": "right"} if column.kind in ("number", "integer") else {}
        sheet.write_string(top, at, column.heading, book.format(**heading, **right))
        sheet.set_column(at, at, column.characters)
    for at, column in enumerate(table.columns):
        values = table.data[column.key]
        values = values.tolist() if isinstance(values, np.ndarray) and column.kind != "time" else values
        for row in range(len(table)):
            _write(
                book, sheet, top + 1 + row, at, column, values[row], table.places(column, row), table.is_flagged(row)
            )
    last_row, last = top + max(len(table), 1), len(table.columns) - 1
    sheet.freeze_panes(top + 1, 0)
    sheet.autofilter(top, 0, last_row, last)
    _print(book, sheet, last_row, last, top)


def _print(book: Book, sheet: Any, last_row: int, last: int, heading: int | None) -> None:
    sheet.set_landscape()
    sheet.set_paper(9)
    sheet.fit_to_pages(1, 0)
    sheet.print_area(0, 0, last_row, last)
    if heading is not None:
        sheet.repeat_rows(heading)
    sheet.set_footer(f"&L&8{book.footer.replace('&', '&&')}&R&8&A, page &P of &N")


def add_method(book: Book, audit: Audit) -> None:
    """The sheet that says how the others came about."""
    sheet = book.book.add_worksheet("Method")
    for at, width in enumerate(METHOD_WIDTHS):
        sheet.set_column(at, at, width)
    row = 0
    wrap = book.format(text_wrap=True)
    for heading, lines in method.sections(audit):
        sheet.write_string(row, 0, heading, book.format(bold=True, bottom=1))
        row += 1
        for name, text in lines:
            if name:
                sheet.write_string(row, 0, name, wrap)
                sheet.merge_range(row, 1, row, 4, "", wrap)
                sheet.write_string(row, 1, text, wrap)
                sheet.set_row(row, 13.5 * max(1, math.ceil(len(text) / 125)))
            else:
                sheet.merge_range(row, 0, row, 4, "", wrap)
                sheet.write_string(row, 0, text, wrap)
                sheet.set_row(row, 13.5 * max(1, math.ceil(len(text) / 165)))
            row += 1
        row += 1
    for table in (summaries.settings(audit), summaries.spreads(audit), summaries.constants(audit)):
        if not len(table):
            continue
        for at, column in enumerate(table.columns):
            sheet.write_string(row, at, column.heading, book.format(bold=True, bottom=1, text_wrap=True))
        for one in range(len(table)):
            row += 1
            for at, column in enumerate(table.columns):
                _write(
                    book, sheet, row, at, column, table.data[column.key][one], column.decimals, table.is_flagged(one)
                )
        row += 2
    _print(book, sheet, row, 6, None)


def workbook(audit: Audit, lookups: Lookups, residuals: Table) -> bytes:
    """The whole workbook as bytes.

    residuals : the table that residuals.csv holds, so that it is made only once
    """
    book = Book("pH readings against batch recipes", f"Report {report_id(audit)}, reconcile {__version__}")
    add_table(book, "Findings", summaries.findings(audit))
    if len(residuals) <= MOST_ROWS:
        add_table(book, "Residuals", residuals)
    else:
        kept = np.flatnonzero(lookups.flagged)[:MOST_ROWS]
        add_table(
            book,
            "Residuals",
            residuals.rows(kept),
            f"The record has {len(residuals):,} used readings; here are {len(kept):,} of the "
            f"{int(lookups.flagged.sum()):,} that stand out or are explained by a finding. residuals.csv holds all.",
        )
        batches, total = summary_of_batches(audit, lookups, MOST_BATCHES)
        add_table(
            book,
            "Batches",
            batches,
            f"{len(batches):,} of {total:,} batches, those with the most readings that stand out first. "
            "residuals.csv holds every reading.",
        )
    add_table(book, "Meters", summaries.meters(audit, lookups))
    add_table(book, "Stocks", summaries.stock_table(audit, lookups))
    add_table(book, "Set aside", tables.set_aside(audit))
    add_method(book, audit)
    return book.close()
