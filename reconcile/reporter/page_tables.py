"""Tables as the page shows them: cells already set, numbers with true minus signs, links between rows and findings."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from reconcile.records.arrays import IntArray
from reconcile.records.places import Place
from reconcile.records.results import Audit, Finding
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.manifest import Reported
from reconcile.reporter.plain import plain
from reconcile.reporter.tables import Column, Table
from reconcile.reporter.words import STATUSES, half_up, minus, moment, signed, significant

MOST_RESIDUALS = 2000
MOST_SET_ASIDE = 500
MOST_OTHER = 400
LONGEST_CELL = 400
SHORT = 18


@dataclass(frozen=True)
class Cell:
    """One cell: its text, how it is set, and links (text, target) that stand in place of the text."""

    text: str
    css: str = ""
    links: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True)
class Row:
    """One row, with the id that links lead to ("" for none)."""

    id: str
    flagged: bool
    cells: Sequence[Cell]


@dataclass(frozen=True)
class View:
    """A table of the page.

    note : says what is left out, "" when nothing is
    tool : worth sorting and filtering
    captioned : its caption is shown; otherwise the heading above says it, and the caption is for those who listen
    """

    id: str
    caption: str
    headings: Sequence[tuple[str, str]]
    rows: Sequence[Row]
    note: str = ""
    tool: bool = True
    captioned: bool = False


def anchor(finding: Finding, index: int) -> str:
    """Id of a finding's section, never anything that a cell held."""
    return finding.id if re.fullmatch(r"F[0-9]{1,6}", finding.id) else f"F{index + 1}"


def row_id(reading: int) -> str:
    """Id of a reading's row."""
    return f"r{reading + 1}"


def cell_text(column: Column, value: Any, decimals: int | None) -> str:
    """One value as the page sets it."""
    if column.kind == "text":
        return value if len(value) <= LONGEST_CELL else f"{value[:LONGEST_CELL]}…"
    if column.kind == "time":
        return moment(np.datetime64(value, "s"))
    if value is None:
        return ""
    if column.kind == "integer":
        return f"{int(value):,}" if column.key != "row" else str(int(value))
    text = significant(value, 4) if decimals is None else half_up(value, decimals)
    return signed(text) if column.signed else minus(text)


def css_of(column: Column) -> str:
    """How a column is set: numbers to the right, long prose in a wider cell, times unbroken."""
    if column.kind in ("number", "integer"):
        return "n"
    if column.kind == "time":
        return "t"
    if column.unbroken:
        return "s"
    return "long" if column.width >= 40 else ""


def short(text: str) -> str:
    """Class of a text cell: not broken over lines when short, never squeezed to a column of letters when long."""
    return "s" if len(text) <= SHORT else "w"


def text_cell(text: str) -> Cell:
    """A cell of text, set by its length."""
    return Cell(text, short(text))


def view(
    table: Table,
    table_id: str,
    caption: str,
    *,
    keys: Sequence[str] | None = None,
    ids: Callable[[int], str] = lambda _row: "",
    cells: Callable[[Column, int, str], Cell | None] = lambda _column, _row, _text: None,
    note: str = "",
    tool: bool = True,
) -> View:
    """A table as a view.

    keys : columns to show, in this order; all when None
    cells : called with column, row and text; may give another cell for it
    """
    by_key = {c.key: c for c in table.columns}
    columns, texts = [], []
    for column in (by_key[k] for k in (by_key if keys is None else keys)):
        values = table.data[column.key]
        found = [cell_text(column, values[i], table.places(column, i)) for i in range(len(table))]
        if any(found) or not found:  # a column without any entry says nothing
            columns.append(column)
            texts.append(found)
    rows = [
        Row(
            ids(i),
            table.is_flagged(i),
            [
                cells(column, i, found[i]) or Cell(found[i], css_of(column) or short(found[i]))
                for column, found in zip(columns, texts, strict=True)
            ],
        )
        for i in range(len(table))
    ]
    return View(table_id, caption, [(c.brief or c.heading, css_of(c)) for c in columns], rows, note, tool)


def capped(
    table: Table,
    table_id: str,
    caption: str,
    rest: str,
    most: int = MOST_OTHER,
    keys: Sequence[str] | None = None,
    cells: Callable[[Column, int, str], Cell | None] = lambda _column, _row, _text: None,
) -> View:
    """A table cut to its first rows; the note says where the rest is."""
    if len(table) <= most:
        return view(table, table_id, caption, keys=keys, cells=cells, tool=len(table) > 8)
    note = f"Shown are the first {most:,} of {len(table):,} rows; {rest}"
    return view(table.rows(np.arange(most)), table_id, caption, keys=keys, cells=cells, note=note)


ORDER = (
    "source", "sheet", "row", "batch", "status", "explained_by", "read_at", "meter", "probe", "stage", "temperature_C",
    "pH_observed", "pH_predicted", "residual", "z", "low_limit", "high_limit", "pH_calculated",
    "standing",
)  # fmt: skip
WHERE_SAID = ("source", "sheet", "probe", "stage", "low_limit", "high_limit", "pH_calculated", "standing")
"""Shown on the page only where they tell rows apart; residuals.csv holds every column."""


def shown_rows(lookups: Lookups) -> IntArray:
    """Readings on the page: those that stand out first; file order again when all fit."""
    n = len(lookups.audit.residual)
    return np.arange(n) if n <= MOST_RESIDUALS else lookups.shown_first[:MOST_RESIDUALS]


def residual_view(audit: Audit, lookups: Lookups, residuals: Table, targets: dict[str, str]) -> View:
    """The residual table, its rows reached from the findings, its finding ids leading back.

    targets : finding id as written -> anchor
    """
    order = shown_rows(lookups)
    table = residuals.rows(order)
    keys = [k for k in ORDER if k not in WHERE_SAID or _tells(table, k)]

    def cell(column: Column, _row: int, text: str) -> Cell | None:
        if column.key == "status":
            return Cell(STATUSES.get(text, text), "status")
        if column.key == "explained_by" and text:
            ids = [i for i in text.split() if i in targets]
            return Cell("" if ids else text, "", tuple((i, targets[i]) for i in ids))
        return None

    total = len(residuals)
    note = (
        f"Shown are {len(order):,} of {total:,} readings, those that stand out or are explained by a finding first. "
        "residuals.csv holds all readings and all columns."
        if total > len(order)
        else "residuals.csv holds the same readings with all columns."
    )
    return view(table, "residuals", "Residuals", keys=keys, ids=lambda i: row_id(int(order[i])), cells=cell, note=note)


def _tells(table: Table, key: str) -> bool:
    values = np.asarray(table.data[key])
    if values.dtype.kind == "f":
        return bool(np.isfinite(values).any())
    return len(set(values.tolist())) > 1


def set_aside_view(result: Reported) -> View:
    """Rows set aside: where, why, and what to do; the cell that caused it where that is another place."""
    aside = result.records.set_aside
    files = {sheet.file for sheet in result.records.sheets}
    rows = []

    def words(place: Place, cell: bool) -> str:
        if len(files) > 1 or not place.sheet:
            return place.words()
        where = f"cell {place.cell}" if cell and place.cell else f"row {place.row}"
        return f"{place.sheet}, {where}"

    for one in aside[:MOST_SET_ASIDE]:
        elsewhere = (one.cause.file, one.cause.sheet, one.cause.row) != (one.place.file, one.place.sheet, one.place.row)
        lots = "lots" if "; " in one.lot else "lot"
        names = [f"{what} {plain(n)}" for what, n in (("batch", one.batch), ("meter", one.meter), (lots, one.lot)) if n]
        rows.append(
            Row(
                "",
                False,
                [
                    text_cell(plain(words(one.place, False))),
                    text_cell(", ".join(names)),
                    text_cell(plain(words(one.cause, True) if elsewhere else f"cell {one.cause.cell}")),
                    text_cell(plain(one.read)[:LONGEST_CELL]),
                    Cell(plain(one.reason), "long"),
                    Cell(plain(one.advice), "long"),
                ],
            )
        )
    headings = [("Row", ""), ("Names", ""), ("Cause", ""), ("What was read", ""), ("Reason", "long"),
                ("What to do", "long")]  # fmt: skip
    left = len(aside) - len(rows)
    note = f"Shown are the first {len(rows):,} of {len(aside):,} rows; set_aside.csv holds all." if left else ""
    return View("set-aside", "Rows set aside", headings, rows, note, tool=len(rows) > 8)
