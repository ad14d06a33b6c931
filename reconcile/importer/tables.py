"""One table of a sheet, column by column: which rows hold data, and what every cell of a known column says."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from reconcile.importer.amounts import Amounts, parse_amounts
from reconcile.importer.cells import Fault, Parsed, blanks, parse_names, parse_numbers
from reconcile.importer.headings import Block
from reconcile.importer.raw import Marker, RawSheet
from reconcile.importer.times import parse_clocks, parse_times
from reconcile.records.arrays import AnyArray, IntArray
from reconcile.records.columns import BY_SHEET, Column, heading_key
from reconcile.records.places import Place
from reconcile.records.problems import Problem, shown
from reconcile.records.settings import Settings

IDENTIFIERS = {"batch", "known", "known_lot", "meter", "probe", "lot", "series", "substance", "name", "titrant_lot"}
_SUMMARY = re.compile(
    r"(?:mean|average|avg|total|totals|sum|min|max|minimum|maximum|median|sd|std|st\.? ?dev\.?|std\.? dev\.?|rsd|cv|"
    r"count|n\s*=\s*\d+)(?:\s*(?:of|\(|:|ph).*)?:?",
    re.IGNORECASE,
)


@dataclass
class TableCells:
    """The data rows of one block, parsed.

    rows : IntArray (n,), indices into the sheet; columns : field -> Parsed over those rows
    amounts : field -> Amounts, of the columns of kind amount; counts : rows by kind, for SheetSource
    summary : BoolArray (n,), mean and total rows
    """

    sheet: RawSheet
    block: Block
    rows: IntArray
    columns: dict[str, Parsed] = field(default_factory=dict)
    amounts: dict[str, Amounts] = field(default_factory=dict)
    counts: dict[str, int] = field(default_factory=dict)
    summary: AnyArray = field(default_factory=lambda: np.zeros(0, bool))
    notes: list[Problem] = field(default_factory=list)

    def __len__(self) -> int:
        return len(self.rows)

    def place(self, index: int, name: str = "") -> Place:
        """Place of a data row, or of one field in it."""
        column = self.block.columns.get(name, -1) if name else -1
        return self.sheet.place(int(self.rows[index]), column)

    def cells(self, column: int) -> Sequence[Any]:
        """Raw cells of one column over the data rows."""
        whole = self.sheet.columns[column]
        n = len(self.rows)
        if n and self.rows[-1] - self.rows[0] == n - 1:
            return whole[int(self.rows[0]) : int(self.rows[-1]) + 1]
        return [whole[i] for i in self.rows.tolist()]

    def problem(self, index: int, name: str, fault: Fault, column: int = -1) -> Problem:
        """A bad cell as a problem with its place."""
        place = self.place(index, name) if column < 0 else self.sheet.place(int(self.rows[index]), column)
        title = next((c.title for c in BY_SHEET[self.block.kind] if c.name == name), name)
        return Problem(fault.code, place, fault.read, (*fault.words, ("name", title)))

    def note(self, parsed: Parsed, column: int) -> None:
        """Carry a column's notices over, with the place of the first cell."""
        for code, row, read, words in parsed.notes:
            place = self.sheet.place(int(self.rows[row]), column)
            heading = str(self.sheet.columns[column][self.block.heading])
            self.notes.append(Problem(code, place, read, (*words, ("name", shown(heading.strip())))))


def read_cells(sheet: RawSheet, block: Block, settings: Settings) -> TableCells:
    """Parse every known column of a block; wide and repeat columns are left to their own readers."""
    counts: dict[str, int] = {}
    table = TableCells(sheet, block, _data_rows(sheet, block, counts), counts=counts)
    decimal = settings["reading.decimal"]
    for column in BY_SHEET[block.kind]:
        if column.name not in block.columns:
            continue
        index = block.columns[column.name]
        if sheet.formats is not None and column.kind != "time":
            sheet.formats.prepare(sheet, index)
        cells = table.cells(index)
        parsed = _parse(table, column, cells, decimal, settings)
        table.columns[column.name] = parsed
        table.note(parsed, index)
    table.summary = _summaries(table)
    table.counts["summary"] = int(table.summary.sum())
    table.counts["data"] = len(table) - table.counts["summary"]
    return table


def _parse(table: TableCells, column: Column, cells: Sequence[Any], decimal: str, settings: Settings) -> Parsed:
    sheet, block = table.sheet, table.block
    if column.kind == "text":
        return parse_names(cells, column.name in IDENTIFIERS)
    if column.kind == "time":
        parsed = parse_times(cells, settings["reading.date_order"], sheet.epoch_1904)
        if column.name == "read_at" and block.time_of_day >= 0:
            clocks = parse_clocks(table.cells(block.time_of_day))
            have = ~np.isnat(clocks.values)
            parsed.values[have] = parsed.values[have].astype("datetime64[D]") + clocks.values[have]
            parsed.bad.update(clocks.bad)
        return parsed
    if column.kind == "amount":
        amounts = parse_amounts(cells, decimal, sheet.text_cells)
        table.amounts[column.name] = amounts
        parsed = amounts.parsed
    else:
        parsed = parse_numbers(cells, decimal, sheet.text_cells, _change_of_unit(column))
        _heading_unit(parsed, column, block.units.get(column.name, ""))
    with np.errstate(invalid="ignore"):
        outside = (parsed.values < column.low) | (parsed.values > column.high)
    for i in np.flatnonzero(outside).tolist():
        words = (("low", f"{column.low:g}"), ("high", f"{column.high:g}"))
        code = "ph-not-physical" if column.name == "ph" else "number-out-of-range"
        parsed.bad.setdefault(i, Fault(code, f"{parsed.values[i]:g}", words))
    if parsed.bad:
        parsed.values[list(parsed.bad)] = np.nan
    return parsed


def _change_of_unit(column: Column) -> Any:
    """Function text -> (factor, offset) for a number written with its own unit, such as "21 °C"."""

    def change(text: str) -> tuple[float, float] | None:
        key = text.casefold().replace("º", "°").replace("˚", "°").replace(" ", "")
        if column.unit == "°C":
            return {
                "°c": (1.0, 0.0),
                "c": (1.0, 0.0),
                "degc": (1.0, 0.0),
                "°f": (5 / 9, -160 / 9),
                "k": (1.0, -273.15),
            }.get(key)
        if column.unit and key == column.unit.casefold().replace(" ", ""):
            return 1.0, 0.0
        return (1.0, 0.0) if key == "ph" and column.name in ("ph", "target", "low_limit", "high_limit") else None

    return change


def _heading_unit(parsed: Parsed, column: Column, unit: str) -> None:
    """A heading in °F or K changes the whole column."""
    if column.unit == "°C" and unit:
        change = _change_of_unit(column)(unit)
        if change is not None and change != (1.0, 0.0):
            parsed.values[:] = parsed.values * change[0] + change[1]


def _used_columns(block: Block) -> list[int]:
    own = [*block.columns.values(), *(c for c, _ in block.repeats)]
    own += [c for c, _, _, _ in block.wide] + [lot for _, _, _, lot in block.wide if lot >= 0]
    return own + ([block.time_of_day] if block.time_of_day >= 0 else [])


def _data_rows(sheet: RawSheet, block: Block, counts: dict[str, int]) -> IntArray:
    """Rows with anything in a known column, without units rows and repeated headings."""
    filled = np.zeros(block.last - block.first, bool)
    for column in _used_columns(block):
        filled |= ~blanks(sheet.columns[column][block.first : block.last])
    rows = np.flatnonzero(filled) + block.first
    repeats = _heading_repeats(sheet, block, rows)
    if block.units_row >= 0:
        rows = rows[rows != block.units_row]
    counts["title"] = (
        sum(1 for r in range(block.heading) if any(str(c).strip() for c in sheet.row(r))) if block.heading < 200 else 0
    )
    counts["units"] = int(block.units_row >= 0)
    counts["heading repeat"] = len(repeats)
    counts["blank"] = int((~filled).sum())
    return rows[~np.isin(rows, repeats)] if len(repeats) else rows


def _heading_repeats(sheet: RawSheet, block: Block, rows: IntArray) -> IntArray:
    """Rows that say the headings again: every filled known cell equals its heading."""
    used = _used_columns(block)
    headings = {c: heading_key(str(sheet.columns[c][block.heading])) for c in used}
    probe = used[0]
    raw = sheet.columns[probe]
    first = headings[probe][:1]
    same = (
        {
            v
            for v in set(raw[block.first : block.last])
            if isinstance(v, str) and v.strip()[:1].casefold() == first and heading_key(v) == headings[probe]
        }
        if headings[probe]
        else set()
    )
    found = []
    for row in (r for r in rows.tolist() if same and raw[r] in same):
        cells = [(sheet.columns[c][row], headings[c]) for c in used]
        said = [(v, h) for v, h in cells if not (isinstance(v, str) and not v.strip())]
        if len(said) > 1 and all(isinstance(v, str) and heading_key(v) == h for v, h in said):
            found.append(row)
    return np.array(found, np.intp)


def _summaries(table: TableCells) -> AnyArray:
    """Mean, total and like rows, known by the word in a name column."""
    summary = np.zeros(len(table), bool)
    for name in ("batch", "known", "lot", "meter", "read_at", "substance", "series", "analyst", "stage"):
        if name not in table.columns:
            continue
        cells = table.cells(table.block.columns[name])
        labels = {v for v in set(cells) if isinstance(v, str) and len(v) < 40 and _SUMMARY.fullmatch(v.strip())}
        if labels:
            summary |= np.fromiter((isinstance(v, str) and v in labels for v in cells), bool, len(cells))
    return summary


def covered(cells: Sequence[Any]) -> AnyArray:
    """BoolArray (n,): cells that lie under a merge."""
    if Marker not in set(map(type, cells)):
        return np.zeros(len(cells), bool)
    return np.fromiter((isinstance(v, Marker) and v.kind == "covered" for v in cells), bool, len(cells))
