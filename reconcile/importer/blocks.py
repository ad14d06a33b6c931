"""Tables within a sheet: where each begins, which kind it is, and where it ends."""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import Any

import numpy as np

from reconcile.importer.cells import as_text, blanks
from reconcile.importer.headings import Block, ColumnMap, best_kind, heading_matches, known_heading, split_heading
from reconcile.importer.raw import RawSheet
from reconcile.records.substances import Catalogue
from reconcile.records.units import find_unit

_NUMBER = re.compile(r"[-+]?[\d.,]+")
_DIGIT = re.compile(r"\d")
_TOP = 60
_PLAIN_UNITS = {"°c", "ºc", "c", "degc", "ph", "-", "h", "min", "mv", "%", "dd/mm/yyyy", "yyyy-mm-dd", "g/ml"}


def find_blocks(sheet: RawSheet, column_map: ColumnMap, catalogue: Catalogue) -> list[Block]:
    """Every table of a sheet, from top to bottom; empty where no heading row is recognised."""
    if not len(sheet):
        return []
    blocks: list[Block] = []
    seen: dict[tuple[str, ...], list[Block]] = {}
    for row in _candidates(sheet, column_map):
        cells = sheet.row(row)
        if not _like_headings(cells):
            continue
        key = tuple(str(c) for c in cells)
        repeated = key in seen
        if not repeated:
            seen[key] = best_kind(cells, column_map, catalogue)
        if not seen[key] or (repeated and blocks and _text_row(sheet, blocks[-1].heading) == key):
            continue
        block = seen[key][0]
        new = Block(**{**block.__dict__, "heading": row, "first": row + 1, "last": len(sheet)})
        new.columns = dict(block.columns)
        if blocks:
            blocks[-1].last = _end_before(sheet, blocks[-1], row)
        blocks.append(new)
    for block in blocks:
        _units_row(sheet, block)
        _title(sheet, block, blocks)
    return blocks


def nearest_headings(sheet: RawSheet) -> list[str]:
    """The texts of the row that looks most like a heading row, for a refusal."""
    best: list[str] = []
    most = -1
    for row in range(min(len(sheet), _TOP)):
        cells = sheet.row(row)
        texts = [c.strip() for c in cells if isinstance(c, str) and c.strip()]
        score = heading_matches(cells) * 100 + len(texts)
        if texts and score > most and _like_headings(cells):
            best, most = texts, score
    return best


def _text_row(sheet: RawSheet, row: int) -> tuple[str, ...]:
    return tuple(str(c) for c in sheet.row(row))


def _candidates(sheet: RawSheet, column_map: ColumnMap) -> list[int]:
    """Rows in which two cells are known headings, and near the top rows in which one is."""
    mapped = {h for headings in column_map.values() for h in headings}
    hits = np.zeros(len(sheet), np.intp)
    for column in sheet.columns:
        texts = {v for v in set(column) if isinstance(v, str) and v and len(v) <= 80}
        known = [t for t in texts if t.strip() in mapped or (not _DIGIT.search(t) and known_heading(t))]
        for text in known:
            hits[_where(column, text)] += 1
    rows = np.flatnonzero((hits >= 2) | ((hits >= 1) & (np.arange(len(sheet)) < _TOP)))
    return rows.tolist()


def _where(column: Sequence[Any], text: str) -> list[int]:
    """Rows in which a column holds a text."""
    rows: list[int] = []
    for _ in range(column.count(text) if len(column) else 0):
        rows.append(column.index(text, rows[-1] + 1 if rows else 0))
    return rows


def _like_headings(cells: list[Any]) -> bool:
    """At least two texts, and no number among the cells."""
    texts = [c for c in cells if isinstance(c, str) and c.strip()]
    numbers = sum(1 for c in cells if type(c) in (float, int)) + sum(1 for t in texts if _NUMBER.fullmatch(t.strip()))
    return len(texts) >= 2 and numbers == 0


def _end_before(sheet: RawSheet, block: Block, heading: int) -> int:
    """Where a table ends that another follows: at the last blank row above the next headings, or right there."""
    for row in range(heading - 1, max(block.heading, heading - 12), -1):
        if all(isinstance(c, str) and not c.strip() for c in sheet.row(row)):
            return row
    return heading


def _units_row(sheet: RawSheet, block: Block) -> None:
    """A row of units right under the headings."""
    row = block.first
    if row >= block.last:
        return
    cells = sheet.row(row)
    said = {i: c.strip(" ()[]") for i, c in enumerate(cells) if isinstance(c, str) and c.strip()}
    filled = sum(1 for c in cells if as_text(c).strip())
    if not said or len(said) != filled:
        return
    if not all(find_unit(t) is not None or t.casefold() in _PLAIN_UNITS or t == "" for t in said.values()):
        return
    block.units_row = row
    for name, index in block.columns.items():
        if index in said and not block.units.get(name):
            block.units[name] = said[index]
    block.wide = [(i, n, u or said.get(i, ""), lot) for i, n, u, lot in block.wide]


def _title(sheet: RawSheet, block: Block, blocks: list[Block]) -> None:
    """Text above the headings, kept for the record."""
    above = max((b.last for b in blocks if b.last <= block.heading and b is not block), default=0)
    rows = range(max(above, block.heading - 10), block.heading)
    block.title = " | ".join(t for r in rows for c in sheet.row(r) if (t := as_text(c).strip()))[:500]


def label_of(sheet: RawSheet, block: Block, column: int) -> str:
    """Heading of a column as written, on one line."""
    text = str(sheet.columns[column][block.heading]).strip()
    return " ".join(text.split()) or f"column {sheet.names[column]}"


__all__ = ["blanks", "find_blocks", "label_of", "nearest_headings", "split_heading"]
