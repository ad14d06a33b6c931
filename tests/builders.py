"""Workbooks, CSV texts and records for tests, built from plain rows."""

from __future__ import annotations

import csv
import io
import tempfile
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import openpyxl

from reconcile.importer.read import read_books
from reconcile.records.book import BatchRecords
from reconcile.records.settings import Settings

Row = Sequence[Any]

READINGS_HEAD: tuple[str, ...] = ("Read at", "Batch", "Meter", "Temperature (°C)", "pH")
RECIPES_HEAD: tuple[str, ...] = ("Batch", "Substance", "Lot", "Amount", "Unit", "Made up to", "Made up to unit")
STOCKS_HEAD: tuple[str, ...] = ("Lot", "Substance", "Strength", "Unit", "Density (g/mL)", "Assay (%)", "Tolerance (%)")


def workbook(path: Path, sheets: Mapping[str, Sequence[Row]], formats: Mapping[str, str] | None = None) -> Path:
    """Write a workbook of sheets from rows; None is an empty cell. `formats` gives number formats by "Sheet!A1"."""
    book = openpyxl.Workbook()
    book.remove(book.active)  # type: ignore[arg-type]
    for name, rows in sheets.items():
        sheet = book.create_sheet(name)
        for r, row in enumerate(rows, 1):
            for c, value in enumerate(row, 1):
                if value is not None:
                    sheet.cell(r, c, value)
    for where, code in (formats or {}).items():
        name, _, cell = where.partition("!")
        book[name][cell].number_format = code
    book.save(path)
    return path


def csv_text(rows: Sequence[Row], delimiter: str = ",", decimal: str = ".") -> str:
    """Rows as CSV text; None is an empty field, floats are written with the given decimal mark."""
    out = io.StringIO()
    writer = csv.writer(out, delimiter=delimiter, lineterminator="\r\n")
    for row in rows:
        writer.writerow(
            ["" if v is None else str(v).replace(".", decimal) if isinstance(v, float) else str(v) for v in row]
        )
    return out.getvalue()


def csv_file(path: Path, rows: Sequence[Row], delimiter: str = ",", decimal: str = ".") -> Path:
    """Write rows as a UTF-8 CSV file."""
    path.write_text(csv_text(rows, delimiter, decimal), encoding="utf-8", newline="")
    return path


def records_from_rows(
    readings: Sequence[Row],
    recipes: Sequence[Row] = (),
    stocks: Sequence[Row] = (),
    *,
    more: Mapping[str, Sequence[Row]] | None = None,
    settings: Settings | None = None,
) -> BatchRecords:
    """Write one temporary workbook, each table with its heading row first, and import it."""
    sheets: dict[str, Sequence[Row]] = {"Readings": readings}
    if recipes:
        sheets["Recipes"] = recipes
    if stocks:
        sheets["Stocks"] = stocks
    sheets.update(more or {})
    with tempfile.TemporaryDirectory() as folder:
        path = workbook(Path(folder) / "record.xlsx", sheets)
        return read_books([path], settings if settings is not None else Settings())
