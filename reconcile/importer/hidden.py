"""Markers for the cells that their plain value does not describe, and notices about what a sheet hides."""

from __future__ import annotations

import re
from typing import Any

import numpy as np

from reconcile.importer.raw import Marker, RawSheet, mark
from reconcile.importer.sheet_xml import SheetXml
from reconcile.importer.styles import Styles
from reconcile.records.arrays import IntArray
from reconcile.records.places import Place, column_letters
from reconcile.records.problems import Problem

_SUMMARY_FORMULA = re.compile(r"=\s*(?:SUM|AVERAGE|MEDIAN|MIN|MAX|COUNTA?|STDEV(?:\.[SP])?|SUBTOTAL)\(", re.IGNORECASE)
_NUMBER_LIKE = re.compile(r"[\d.,\s×x·*eE+-]+")


class Formats:
    """Number formats of one sheet's cells, looked up a column at a time when a column is needed."""

    def __init__(self, xml: SheetXml, styles: Styles) -> None:
        self._xml, self._styles = xml, styles
        telling = styles.percent | set(styles.padded) | styles.duration
        self._telling = np.array(sorted(i for i in telling if xml.uses_style(i)), np.intp)
        self._struck = np.array([i for i, s in enumerate(styles.struck) if s and xml.uses_style(i)], np.intp)
        self._shows = any(d >= 0 for d in styles.decimals)

    def decimals(self, sheet: RawSheet, column: int) -> IntArray | None:
        """Decimals shown by each cell of a column, -1 where its format does not say; None where none does."""
        if not self._shows:
            return None
        rows, kinds = self._cells(sheet, column)
        shown = np.full(len(sheet), -1, np.intp)
        shown[rows] = np.array([*self._styles.decimals, -1])[np.minimum(kinds, len(self._styles.decimals))]
        return shown if (shown >= 0).any() else None

    def prepare(self, sheet: RawSheet, column: int) -> None:
        """Mark the cells of a column whose number format changes what they say."""
        if not len(self._telling):
            return
        rows, kinds = self._cells(sheet, column)
        odd = np.isin(kinds, self._telling)
        for row, kind in zip(rows[odd].tolist(), kinds[odd].tolist(), strict=True):
            marker = self._marker(sheet.columns[column][row], kind)
            if marker is not None:
                mark(sheet, row, column, marker)

    def struck(self, sheet: RawSheet, column: int) -> list[int]:
        """Rows of struck-through cells of a column."""
        if not len(self._struck):
            return []
        rows, kinds = self._cells(sheet, column)
        return [r for r in rows[np.isin(kinds, self._struck)].tolist() if sheet.columns[column][r] != ""]

    def _cells(self, sheet: RawSheet, column: int) -> tuple[IntArray, IntArray]:
        rows, kinds = self._xml.styles_of(column)
        inside = rows < len(sheet)
        return rows[inside], kinds[inside]

    def _marker(self, value: Any, kind: int) -> Marker | None:
        if isinstance(value, (Marker, str)):
            return None
        styles = self._styles
        if type(value) in (float, int):
            if kind in styles.percent:
                return Marker("percent", f"{value * 100:.12g}%", float(value) * 100)
            if kind in styles.padded and float(value).is_integer():
                return Marker("padded", f"{int(value):0{styles.padded[kind]}d}", value)
        return Marker("duration", str(value), value) if kind in styles.duration else None


def add_what_values_hide(sheet: RawSheet, xml: SheetXml, styles: Styles, raised: list[int]) -> None:
    """Markers for errors, formulas without a value and cells under a merge; notices about the rest."""
    for row, column, text in xml.errors():
        if xml.holds(row, column):
            mark(sheet, row, column, Marker("error", text))
    computed = 0
    for formula in xml.formulas():
        if not xml.holds(formula.row, formula.column):
            continue
        if not formula.saved:
            mark(sheet, formula.row, formula.column, Marker("uncalculated", formula.text))
        else:
            computed += 1
            if _SUMMARY_FORMULA.match(formula.text):
                sheet.summary_formulas.add((formula.row, formula.column))
    if computed:
        sheet.notes.append(Problem("cells-computed", sheet.place(), words=(("count", str(computed)),)))
    for row, column in xml.cells_of_strings(raised):
        text = sheet.text(row, column)
        if _NUMBER_LIKE.fullmatch(text):  # in a name or a remark a raised digit does no harm
            mark(sheet, row, column, Marker("raised", text))
    last_row, last_column = len(sheet) - 1, len(sheet.columns) - 1
    sheet.merges = [
        (r0, c0, min(r1, last_row), min(c1, last_column))
        for r0, c0, r1, c1 in xml.merges()
        if 0 <= r0 <= min(r1, last_row) and 0 <= c0 <= min(c1, last_column)
    ]
    sheet.hidden_rows = {r for r in xml.hidden_rows() if r < len(sheet)}
    if sheet.hidden_rows:
        sheet.notes.append(Problem("rows-hidden", sheet.place(), words=(("count", str(len(sheet.hidden_rows))),)))
    for first, last in xml.hidden_columns():
        if first < len(sheet.columns):
            letters = column_letters(first) if first == last else f"{column_letters(first)} to {column_letters(last)}"
            place = Place(sheet.file, sheet.sheet, 0, column_letters(first))
            sheet.notes.append(Problem("columns-hidden", place, letters))
    if sheet.hidden:
        sheet.notes.append(Problem("sheet-hidden", sheet.place(), sheet.sheet))
    sheet.formats = Formats(xml, styles)


__all__ = ["Formats", "add_what_values_hide"]
