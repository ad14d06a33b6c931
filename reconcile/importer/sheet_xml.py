"""What plain values hide, found by byte searches of a sheet's XML: errors, formulas, merges, formats, hidden rows."""

from __future__ import annotations

import re

import numpy as np

from reconcile.importer.raw import Marker, RawSheet, mark
from reconcile.importer.styles import Styles
from reconcile.records.places import column_letters
from reconcile.records.problems import Problem

_CELL = rb'<(?:\w+:)?c r="([A-Z]+)(\d+)"'


def column_index(letters: str | bytes) -> int:
    """Index from 0 of a column's letters: A is 0, AA is 26."""
    index = 0
    for letter in letters.encode() if isinstance(letters, str) else letters:
        index = index * 26 + letter - 64
    return index - 1


def bounds(data: bytes) -> tuple[int, int]:
    """Last row and last column that hold a cell, from the cells themselves and never from the declared dimension."""
    rows = re.findall(rb'<(?:\w+:)?row [^>]*?\br="(\d+)"', data[data.rfind(b"<row ", 0, len(data)) :] or data)
    last_row = max(map(int, rows), default=0)
    last_column = 0
    for width in (3, 2, 1):
        letters = set(re.findall(rb'<(?:\w+:)?c r="([A-Z]{%d})\d' % width, data))
        if letters:
            last_column = max(column_index(x) for x in letters) + 1
            break
    return last_row, last_column


def add_what_values_hide(sheet: RawSheet, data: bytes, styles: Styles, strings: bytes) -> None:
    """Put markers in the cells, and formats, merges and notes on the sheet."""
    if b't="e"' in data:
        for letters, row, text in re.findall(_CELL + rb'[^>]*\bt="e"[^>]*>.*?<(?:\w+:)?v>([^<]*)</', data, re.DOTALL):
            mark(sheet, int(row) - 1, column_index(letters), Marker("error", text.decode("utf-8", "replace")))
    if b"<f" in data:
        _formulas(sheet, data)
    _formats(sheet, data, styles)
    _merges(sheet, data)
    hidden = len(re.findall(rb'<(?:\w+:)?row [^>]*\bhidden="(?:1|true)"', data)) if b"hidden=" in data else 0
    if hidden:
        sheet.notes.append(Problem("rows-hidden", sheet.place(), words=(("count", str(hidden)),)))
    if sheet.hidden:
        sheet.notes.append(Problem("sheet-hidden", sheet.place(), sheet.sheet))


def _formulas(sheet: RawSheet, data: bytes) -> None:
    """Mark formulas with no saved value; note how many cells were computed by the spreadsheet."""
    computed = 0
    for match in re.finditer(_CELL + rb"([^>]*)>(<(?:\w+:)?f\b.*?)</(?:\w+:)?c>", data, re.DOTALL):
        letters, row, attributes, inside = match.groups()
        if b"</c>" in inside:
            continue
        value = re.search(rb"<(?:\w+:)?v>([^<]*)</", inside)
        if value is None or (not value.group(1) and b't="str"' not in attributes):
            formula = re.search(rb"<(?:\w+:)?f\b[^>]*>([^<]*)<", inside)
            text = "=" + formula.group(1).decode("utf-8", "replace") if formula else "a formula"
            mark(sheet, int(row) - 1, column_index(letters), Marker("uncalculated", text))
        else:
            computed += 1
    if computed:
        sheet.notes.append(Problem("cells-computed", sheet.place(), words=(("count", str(computed)),)))


def _formats(sheet: RawSheet, data: bytes, styles: Styles) -> None:
    """Decimals by column, and markers for percent, padded numbers and durations."""
    telling = (
        {i for i, d in enumerate(styles.decimals) if d >= 0} | styles.percent | set(styles.padded) | styles.duration
    )
    telling = {i for i in telling if b's="%d"' % i in data}
    if not telling:
        return
    wanted = b"|".join(b"%d" % i for i in sorted(telling))
    decimals = np.array([*styles.decimals, -1])
    found = re.findall(_CELL + rb'(?: t="n")? s="(' + wanted + rb')"', data)
    by_letters: dict[bytes, list[tuple[int, int]]] = {}
    for letters, row, style in found:
        by_letters.setdefault(letters, []).append((int(row), int(style)))
    for letters, cells in by_letters.items():
        column = column_index(letters)
        if column >= len(sheet.columns):
            continue
        table = np.array(cells)
        rows, kinds = table[:, 0] - 1, table[:, 1]
        inside = rows < len(sheet)
        rows, kinds = rows[inside], kinds[inside]
        shown = np.full(len(sheet), -1, np.intp)
        shown[rows] = decimals[kinds]
        sheet.decimals[column] = shown
        odd = np.isin(kinds, [*styles.percent, *styles.padded, *styles.duration])
        for row, kind in zip(rows[odd].tolist(), kinds[odd].tolist(), strict=True):
            value = sheet.columns[column][row]
            if isinstance(value, Marker) or value == "" or isinstance(value, str):
                continue
            if kind in styles.percent:
                mark(sheet, row, column, Marker("percent", f"{value * 100:.12g}%", float(value) * 100))
            elif kind in styles.padded and float(value) == int(value):
                mark(sheet, row, column, Marker("padded", f"{int(value):0{styles.padded[kind]}d}", value))
            elif kind in styles.duration:
                mark(sheet, row, column, Marker("duration", str(value), value))


def _merges(sheet: RawSheet, data: bytes) -> None:
    at = data.find(b"mergeCell ")
    if at < 0:
        return
    for a, b, c, d in re.findall(rb'<(?:\w+:)?mergeCell [^>]*ref="([A-Z]+)(\d+):([A-Z]+)(\d+)"', data[at - 20 :]):
        first, last = (int(b) - 1, column_index(a)), (int(d) - 1, column_index(c))
        sheet.merges.append((*first, *last))


def cell_name(row: int, column: int) -> str:
    """A1 name of a cell counted from 0."""
    return f"{column_letters(column)}{row + 1}"
