"""Tables within a sheet: where each begins, which kind it is, and where it ends."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import replace
from typing import Any

import numpy as np

from reconcile.importer.cells import as_text
from reconcile.importer.headings import Block, ColumnMap, best_kind, heading_matches, known_heading
from reconcile.importer.raw import RawSheet
from reconcile.records.substances import Catalogue
from reconcile.records.units import find_unit

_NUMBER = re.compile(r"[-+]?[\d.,]+")
_DIGITS = set("0123456789")
_DIGIT = re.compile(r"\d")
_TOP = 60
_PLAIN_UNITS = {"°c", "ºc", "c", "degc", "ph", "-", "h", "min", "mv", "%", "dd/mm/yyyy", "yyyy-mm-dd", "g/ml"}


def find_blocks(sheet: RawSheet, column_map: ColumnMap, catalogue: Catalogue) -> list[Block]:
    """Every table of a sheet, from top to bottom; empty where no heading row is recognised."""
    blocks: list[Block] = []
    seen: dict[tuple[str, ...], list[Block]] = {}
    for row in _candidates(sheet, column_map) if len(sheet) else []:
        if any(row <= b.heading for b in blocks):
            continue  # the second row of headings that span two rows
        cells = sheet.row(row)
        if not _like_headings(cells):
            continue
        key = tuple(str(c) for c in cells)
        if any(_text_row(sheet, b.heading) == key for b in blocks if b.last == len(sheet)):
            continue  # the headings said again
        if key not in seen:
            seen[key] = _tables_in(cells, column_map, catalogue)
        found, heading = seen[key], row
        joined = _joined_with_next(sheet, row)
        if joined is not None and not (found and _is_units_row(sheet, row + 1)):
            both = _tables_in(joined, column_map, catalogue)
            if both and _size(both) > _size(found):
                found, heading = both, row + 1
        new = [_placed(block, sheet, heading, joined if heading > row else None) for block in found]
        for block in blocks:
            if any(_overlap(block, n) for n in new) and block.last == len(sheet):
                block.last = _end_before(sheet, block, row)
        blocks.extend(new)
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


def label_of(sheet: RawSheet, block: Block, column: int) -> str:
    """Heading of a column as written, on one line."""
    text = block.labels.get(column) or str(sheet.columns[column][block.heading])
    return " ".join(text.split()) or f"column {sheet.names[column]}"


def _tables_in(cells: Sequence[Any], column_map: ColumnMap, catalogue: Catalogue) -> list[Block]:
    """The table that a row heads; two or more where blank columns part it into complete headings side by side."""
    parts: list[list[int]] = []
    for i, cell in enumerate(cells):
        if isinstance(cell, str) and cell.strip():
            if parts and parts[-1][-1] == i - 1:
                parts[-1].append(i)
            else:
                parts.append([i])
    if len(parts) > 1:
        alone = []
        for part in parts:
            masked = [c if i in set(part) else "" for i, c in enumerate(cells)]
            alone.append(best_kind(masked, column_map, catalogue))
        complete = [blocks[0] for blocks in alone if blocks]
        if len(complete) > 1:
            others = [i for part, blocks in zip(parts, alone, strict=True) if not blocks for i in part]
            complete[0].ignored = sorted([*complete[0].ignored, *others])
            return complete
    return best_kind(cells, column_map, catalogue)[:1]


def _placed(block: Block, sheet: RawSheet, heading: int, labels: list[str] | None) -> Block:
    return replace(
        block,
        heading=heading,
        first=heading + 1,
        last=len(sheet),
        columns=dict(block.columns),
        units=dict(block.units),
        labels=dict(enumerate(labels)) if labels is not None else {},
    )


def _size(blocks: list[Block]) -> int:
    return sum(len(b.columns) + len(b.wide) + len(b.repeats) for b in blocks)


def _overlap(one: Block, other: Block) -> bool:
    a, b = one.used(), other.used()
    return min(a) <= max(b) and min(b) <= max(a)


def _text_row(sheet: RawSheet, row: int) -> tuple[str, ...]:
    return tuple(str(c) for c in sheet.row(row))


def _candidates(sheet: RawSheet, column_map: ColumnMap) -> list[int]:
    """Rows in which two cells are known headings, and near the top rows in which one is or that could be headings."""
    mapped = {h for headings in column_map.values() for h in headings}
    hits = np.zeros(len(sheet), np.intp)
    for i, column in enumerate(sheet.columns):
        texts = {v for v in sheet.texts(i) if v and (v[-1] not in _DIGITS or mapped)}
        known = [t for t in texts if t.strip() in mapped or (not _DIGIT.search(t) and known_heading(t))]
        for text in known:
            hits[_where(column, text)] += 1
    rows = np.flatnonzero((hits >= 2) | ((hits >= 1) & (np.arange(len(sheet)) < _TOP)))
    return sorted({*rows.tolist(), *(r - 1 for r in rows.tolist() if 0 < r < _TOP)})


def _where(column: Sequence[Any], text: str) -> list[int]:
    """Rows in which a column holds a text."""
    rows: list[int] = []
    for _ in range(column.count(text)):
        rows.append(column.index(text, rows[-1] + 1 if rows else 0))
    return rows


def _like_headings(cells: Sequence[Any]) -> bool:
    """At least two texts, and no number among the cells."""
    texts = [c for c in cells if isinstance(c, str) and c.strip()]
    numbers = sum(1 for c in cells if type(c) in (float, int)) + sum(1 for t in texts if _NUMBER.fullmatch(t.strip()))
    return len(texts) >= 2 and numbers == 0


def _joined_with_next(sheet: RawSheet, row: int) -> list[str] | None:
    """Headings that span two rows, read as one: the upper row is filled across real merges only."""
    if row + 1 >= len(sheet):
        return None
    upper, lower = sheet.row(row), sheet.row(row + 1)
    if not all(isinstance(c, str) or (type(c) in (float, int) and float(c).is_integer()) for c in lower):
        return None
    texts = sum(1 for c in lower if isinstance(c, str) and c.strip())
    if not texts or not all(isinstance(c, str) for c in upper):
        return None
    for r0, c0, r1, c1 in sheet.merges:
        if r0 <= row <= r1 and c1 > c0 and r1 == r0:
            upper[c0 : c1 + 1] = [upper[c0]] * (c1 - c0 + 1)
    return [" ".join(f"{u} {as_text(v)}".split()) for u, v in zip(upper, lower, strict=True)]


def _end_before(sheet: RawSheet, block: Block, heading: int) -> int:
    """Where a table ends that another follows: at the last blank row above the next headings, or right there."""
    for row in range(heading - 1, max(block.heading, heading - 12), -1):
        if all(isinstance(c, str) and not c.strip() for c in sheet.row(row)):
            return row
    return heading


def _said_units(sheet: RawSheet, row: int) -> dict[int, str]:
    """The cells of a row of units; empty where the row is anything else."""
    if row >= len(sheet):
        return {}
    cells = sheet.row(row)
    said = {i: c.strip(" ()[]") for i, c in enumerate(cells) if isinstance(c, str) and c.strip()}
    if not said or len(said) != sum(1 for c in cells if as_text(c).strip()):
        return {}
    known = all(t == "" or find_unit(t) is not None or t.casefold() in _PLAIN_UNITS for t in said.values())
    return said if known else {}


def _is_units_row(sheet: RawSheet, row: int) -> bool:
    return bool(_said_units(sheet, row))


def _units_row(sheet: RawSheet, block: Block) -> None:
    """A row of units right under the headings."""
    said = _said_units(sheet, block.first) if block.first < block.last else {}
    if not said:
        return
    block.units_row = block.first
    for name, index in block.columns.items():
        if index in said and not block.units.get(name):
            block.units[name] = said[index]
    block.wide = [(i, n, u or said.get(i, ""), lot) for i, n, u, lot in block.wide]


def _title(sheet: RawSheet, block: Block, blocks: list[Block]) -> None:
    """Text above the headings, kept for the record."""
    above = max((b.last for b in blocks if b.last <= block.heading and b is not block), default=0)
    rows = range(max(above, block.heading - 10), block.heading)
    block.title = " | ".join(t for r in rows for c in sheet.row(r) if (t := as_text(c).strip()))[:500]
