"""Which rows of a table are data: blank, title, units, repeated heading and hidden rows told apart and counted."""

from __future__ import annotations

import re

import numpy as np

from reconcile.importer.cells import as_text
from reconcile.importer.headings import Block
from reconcile.importer.raw import RawSheet
from reconcile.records.arrays import AnyArray, IntArray
from reconcile.records.columns import heading_key
from reconcile.records.problems import Problem

_SUMMARY = re.compile(
    r"(?:mean|average|avg|total|totals|sum|min|max|minimum|maximum|median|sd|std|st\.? ?dev\.?|std\.? dev\.?|rsd|cv|"
    r"count|n\s*=\s*\d+)(?:\s*(?:of|\(|:|ph).*)?:?",
    re.IGNORECASE,
)
_STARTS = set("mMaAtTsSnNcCrR ")


def data_rows(sheet: RawSheet, block: Block, titles: set[int], counts: dict[str, int]) -> IntArray:
    """Rows with anything in a known column, without units rows, section titles and repeated headings."""
    filled = np.zeros(block.last - block.first, bool)
    for column in block.used():
        filled |= ~sheet.blanks(column, block.first, block.last)
    rows = np.flatnonzero(filled) + block.first
    if block.units_row >= 0:
        rows = rows[rows != block.units_row]
    if titles:
        rows = rows[~np.isin(rows, sorted(titles))]
    repeats = _heading_repeats(sheet, block, rows)
    counts["title"] = len(titles) + sum(
        1 for r in range(max(0, block.heading - 10), block.heading) if any(as_text(c).strip() for c in sheet.row(r))
    )
    counts["units"] = int(block.units_row >= 0)
    counts["heading repeat"] = len(repeats)
    counts["blank"] = int((~filled).sum())
    return rows[~np.isin(rows, repeats)] if len(repeats) else rows


def _heading_repeats(sheet: RawSheet, block: Block, rows: IntArray) -> IntArray:
    """Rows that say the headings again: every filled known cell equals its heading."""
    used = block.used()
    headings = {c: heading_key(as_text(sheet.columns[c][block.heading])) for c in used}
    probe = next((c for c in used if headings[c]), -1)
    if probe < 0:
        return np.zeros(0, np.intp)
    raw, first = sheet.columns[probe], headings[probe][:1]
    texts = {v for v in sheet.texts(probe) if v.strip()[:1].casefold() == first}
    same = {v for v in texts if heading_key(v) == headings[probe]}
    if raw.count(raw[block.heading]) == 1 and len(same) == 1:
        return np.zeros(0, np.intp)  # the headings themselves
    found = []
    for row in (r for r in rows.tolist() if same and raw[r] in same):
        cells = [(sheet.columns[c][row], headings[c]) for c in used]
        said = [(v, h) for v, h in cells if not (isinstance(v, str) and not v.strip())]
        if len(said) > 1 and all(isinstance(v, str) and heading_key(v) == h for v, h in said):
            found.append(row)
    return np.array(found, np.intp)


def summary_rows(sheet: RawSheet, block: Block, rows: IntArray, cells_of: dict[str, AnyArray]) -> AnyArray:
    """Mean, total and like rows: the word stands in a name column, or a formula reckons over other rows."""
    summary = np.zeros(len(rows), bool)
    for name in ("batch", "known", "lot", "meter", "read_at", "substance", "series"):
        cells = cells_of.get(name)
        if cells is None:
            continue
        texts = sheet.texts(block.columns[name])
        labels = {v for v in texts if v[:1] in _STARTS and _SUMMARY.fullmatch(v.strip())}
        if labels:
            summary |= np.fromiter((isinstance(v, str) and v in labels for v in cells), bool, len(rows))
    if sheet.summary_formulas:
        measured = {block.columns.get(n, -1) for n in ("ph", "amount", "strength")} | {c for c, _ in block.repeats}
        marked = [row for row, column in sheet.summary_formulas if column in measured]
        summary |= np.isin(rows, marked)
    return summary


def width_problems(sheet: RawSheet, block: Block, rows: IntArray) -> dict[int, Problem]:
    """Lines of a CSV file with more or fewer fields than the headings; empty fields at the end do not count."""
    if sheet.widths is None:
        return {}
    heading = int(sheet.widths[block.heading])
    named = max((i + 1 for i, c in enumerate(sheet.row(block.heading)) if str(c).strip()), default=0)
    found = {}
    for i in np.flatnonzero(sheet.widths[rows] != heading).tolist():
        row = int(rows[i])
        width = int(sheet.widths[row])
        extra = any(str(c).strip() for c in sheet.row(row)[named:width])
        if extra or width < named:
            found[i] = Problem("row-width", sheet.place(row), str(width), (("count", str(heading)),))
    return found
