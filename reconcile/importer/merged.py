"""Merged data cells: names and dates go down to every row; a reading merged over rows is the top row's alone."""

from __future__ import annotations

from reconcile.importer.headings import Block
from reconcile.importer.raw import Marker, RawSheet, mark
from reconcile.records.problems import Problem

_MEASURED = {"ph", "amount", "planned", "titrant_added", "slope", "offset", "as_found", "strength"}


def spread_merges(sheet: RawSheet, block: Block, notes: list[Problem]) -> set[int]:
    """Fill or mark the cells under merges of one block; returns the rows that are one wide merge, section titles."""
    titles: set[int] = set()
    if not sheet.merges:
        return titles
    name_of = {column: name for name, column in block.columns.items()}
    measured = {c for c, name in name_of.items() if name in _MEASURED}
    measured |= {c for c, _ in block.repeats} | {c for c, _, _, _ in block.wide}
    used = set(block.used())
    counts: dict[int, int] = {}
    for r0, c0, r1, c1 in sheet.merges:
        if r1 < block.first or r0 >= block.last or r0 >= len(sheet) or c0 >= len(sheet.columns):
            continue
        if r0 == r1 and c1 - c0 >= 2 and not _others_filled(sheet, r0, c0, c1, used):
            titles.add(r0)
        for column in range(c0, min(c1, len(sheet.columns) - 1) + 1):
            if column not in used or r1 == r0:
                continue
            top = sheet.columns[c0][r0]
            for row in range(r0 + 1, min(r1, len(sheet) - 1) + 1):
                if column in measured:
                    mark(sheet, row, column, Marker("covered", ""))
                elif column == c0 and sheet.columns[column][row] == "":
                    _set(sheet, row, column, top)
                    counts[column] = counts.get(column, 0) + 1
    for column, count in sorted(counts.items()):
        words = (("count", str(count)), ("name", str(sheet.columns[column][block.heading]).strip()))
        notes.append(Problem("cells-merged", sheet.place(block.heading, column), words=words))
    return titles


def _others_filled(sheet: RawSheet, row: int, c0: int, c1: int, used: set[int]) -> bool:
    return any(not c0 <= c <= c1 and str(sheet.columns[c][row]).strip() for c in used)


def _set(sheet: RawSheet, row: int, column: int, value: object) -> None:
    cells = sheet.columns[column]
    if not isinstance(cells, list):
        cells = sheet.columns[column] = list(cells)
    cells[row] = value
    sheet.forget(column)
