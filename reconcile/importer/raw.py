"""What a file holds before anything is understood: columns of raw cells with their places in the spreadsheet."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from datetime import date, datetime, time, timedelta
from typing import Any, Protocol

import numpy as np

from reconcile.records.arrays import BoolArray, IntArray
from reconcile.records.places import Place, column_letters
from reconcile.records.problems import Problem


@dataclass(frozen=True, slots=True)
class Marker:
    """A cell that its plain value does not describe.

    kind : "error" (#DIV/0! and the like), "uncalculated" (a formula with no saved value), "covered" (lies under a
        merge), "percent" (stored as a fraction, shown as %), "padded" (a number shown with leading zeros), "raised"
        (digits written as a superscript), "overlong" (more text than a cell can hold), "duration"
    text : what the spreadsheet shows
    value : the stored value, where there is one
    """

    kind: str
    text: str
    value: Any = None


class ColumnFormats(Protocol):
    """What the number formats of a workbook say, a column at a time."""

    def decimals(self, sheet: RawSheet, column: int) -> IntArray | None:
        """Decimals shown by each cell, -1 where its format does not say."""

    def prepare(self, sheet: RawSheet, column: int) -> None:
        """Mark the cells whose format changes what they say."""

    def struck(self, sheet: RawSheet, column: int) -> list[int]:
        """Rows of struck-through cells."""


@dataclass
class RawSheet:
    """One sheet, column by column; an empty cell is "".

    columns : each of equal length n; cells are str, float, int, bool, datetime, date, time, timedelta or Marker
    row_numbers : IntArray (n,), as the spreadsheet counts (line numbers of a CSV file)
    names : names of the columns for a Place: letters in a workbook; filled in from the heading row in a CSV file
    text_cells : True for a CSV file, where every cell is text
    widths : fields of every line of a CSV file, None for a workbook
    formats : what number formats say of a column's cells, None for a CSV file
    summary_formulas : cells, (row, column) from 0, that hold a SUM, an AVERAGE and the like
    merges : (first row, first column, last row, last column), counted from 0 in `columns`
    hidden_rows : indices of hidden rows, filtered ones among them
    epoch_1904 : serial numbers of dates count from 1904
    """

    file: str
    sheet: str
    columns: list[Sequence[Any]]
    row_numbers: IntArray
    names: list[str]
    sha256: str = ""
    text_cells: bool = False
    widths: IntArray | None = None
    formats: ColumnFormats | None = None
    summary_formulas: set[tuple[int, int]] = field(default_factory=set)
    merges: list[tuple[int, int, int, int]] = field(default_factory=list)
    hidden_rows: set[int] = field(default_factory=set)
    epoch_1904: bool = False
    hidden: bool = False
    notes: list[Problem] = field(default_factory=list)
    _texts: dict[int, set[str]] = field(default_factory=dict)

    def __len__(self) -> int:
        return len(self.row_numbers)

    def texts(self, column: int) -> set[str]:
        """The different texts of one column; kept, because most questions about a column are about these."""
        if column not in self._texts:
            cells = self.columns[column]
            slow = {datetime, date, time, timedelta} & set(map(type, cells))  # moments are slow to compare
            self._texts[column] = {v for v in (cells if slow else set(cells)) if type(v) is str}
        return self._texts[column]

    def forget(self, column: int) -> None:
        """Forget what was kept of a column that is changed."""
        self._texts.pop(column, None)

    def blanks(self, column: int, first: int, last: int) -> BoolArray:
        """BoolArray (last - first,): cells of a column that hold nothing but spaces."""
        empty = {v for v in self.texts(column) if is_blank(v)}
        if not empty:
            return np.zeros(last - first, bool)
        cells = self.columns[column][first:last]
        return np.fromiter(map(empty.__contains__, cells), bool, last - first)

    def place(self, row: int = -1, column: int = -1) -> Place:
        """Place of a cell, a row (no column) or the sheet, from indices counted from 0."""
        return Place(
            self.file,
            self.sheet,
            int(self.row_numbers[row]) if row >= 0 else 0,
            self.names[column] if column >= 0 else "",
        )

    def text(self, row: int, column: int) -> str:
        """Text of one cell; "" for any other kind of cell, and outside the sheet."""
        inside = 0 <= row < len(self) and 0 <= column < len(self.columns)
        cell = self.columns[column][row] if inside else ""
        return cell if isinstance(cell, str) else ""

    def row(self, index: int) -> list[Any]:
        """All cells of one row."""
        return [column[index] for column in self.columns]


def sheet_of_rows(file: str, sheet: str, rows: Sequence[Sequence[Any]], sha256: str = "") -> RawSheet:
    """A sheet from rows of equal width, the first of which is row 1."""
    columns: list[Sequence[Any]] = list(zip(*rows, strict=True)) if rows else []
    return RawSheet(
        file, sheet, columns, np.arange(1, len(rows) + 1), [column_letters(i) for i in range(len(columns))], sha256
    )


SPACES = "\u00a0\u2007\u202f\u2009\u200b\ufeff \t\r\n"
"""Characters that count as space at the ends of a cell."""


def is_blank(text: str) -> bool:
    """Whether a text holds nothing but spaces."""
    return not text.strip(SPACES)


def mark(sheet: RawSheet, row: int, column: int, marker: Marker) -> None:
    """Put a marker in the place of a cell; widens the sheet where the cell lies outside what was read."""
    if row >= len(sheet):
        extra = row + 1 - len(sheet)
        sheet.columns = [[*c, *[""] * extra] for c in sheet.columns]
        sheet.row_numbers = np.arange(1, row + 2)
    while column >= len(sheet.columns):
        sheet.names.append(column_letters(len(sheet.columns)))
        sheet.columns.append([""] * len(sheet))
    cells = sheet.columns[column]
    if not isinstance(cells, list):
        cells = sheet.columns[column] = list(cells)
    cells[row] = marker
    sheet.forget(column)
