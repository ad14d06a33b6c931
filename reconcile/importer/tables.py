"""One table of a sheet, column by column: what every cell of a known column says."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np

from reconcile.importer.amounts import Amounts, parse_amounts
from reconcile.importer.blocks import label_of
from reconcile.importer.cells import MISSING, ROOM, Fault, Parsed, blanks, parse_names, parse_numbers
from reconcile.importer.headings import Block
from reconcile.importer.merged import spread_merges
from reconcile.importer.raw import Marker, RawSheet
from reconcile.importer.rows import data_rows, summary_rows, width_problems
from reconcile.importer.times import parse_clocks, parse_times
from reconcile.records.arrays import AnyArray, IntArray
from reconcile.records.columns import BY_SHEET, Column
from reconcile.records.places import Place
from reconcile.records.problems import Problem, shown
from reconcile.records.settings import Settings
from reconcile.records.units import UNITS, find_unit

IDENTIFIERS = {"batch", "known", "known_lot", "meter", "probe", "lot", "series", "substance", "name", "titrant_lot"}


@dataclass
class TableCells:
    """The data rows of one block, parsed.

    rows : IntArray (n,), indices into the sheet; columns : field -> Parsed over those rows
    amounts : field -> Amounts, of the columns of kind amount; counts : rows by kind, for SheetSource
    summary : BoolArray (n,), mean and total rows
    whole_row : row -> Problem, lines with too many or too few fields, and hidden rows that are to be left out
    """

    sheet: RawSheet
    block: Block
    rows: IntArray
    columns: dict[str, Parsed] = field(default_factory=dict)
    amounts: dict[str, Amounts] = field(default_factory=dict)
    counts: dict[str, int] = field(default_factory=dict)
    summary: AnyArray = field(default_factory=lambda: np.zeros(0, bool))
    whole_row: dict[int, Problem] = field(default_factory=dict)
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
            name = shown(label_of(self.sheet, self.block, column))
            self.notes.append(Problem(code, place, read, (*words, ("name", name))))


def read_cells(sheet: RawSheet, block: Block, settings: Settings) -> TableCells:
    """Parse every known column of a block; wide and repeat columns are left to their own readers."""
    if sheet.text_cells:  # a CSV file names its columns by their headings, which differ from table to table
        sheet = replace(sheet, names=[label_of(sheet, block, i) for i in range(len(sheet.columns))])
    counts: dict[str, int] = {}
    notes: list[Problem] = []
    titles = spread_merges(sheet, block, notes)
    table = TableCells(sheet, block, data_rows(sheet, block, titles, counts), counts=counts, notes=notes)
    raw: dict[str, Any] = {}
    for index in block.used():
        if sheet.formats is not None:
            sheet.formats.prepare(sheet, index)
    for column in BY_SHEET[block.kind]:
        if column.name not in block.columns:
            continue
        index = block.columns[column.name]
        cells = raw[column.name] = table.cells(index)
        parsed = _parse(table, column, cells, settings)
        table.columns[column.name] = parsed
        table.note(parsed, index)
    _struck(table)
    table.whole_row = width_problems(sheet, block, table.rows)
    if sheet.hidden_rows and settings["reading.hidden_rows"] == "leave out":
        for i in np.flatnonzero(np.isin(table.rows, list(sheet.hidden_rows))).tolist():
            table.whole_row[i] = Problem("row-hidden", table.place(i))
    table.summary = summary_rows(sheet, block, table.rows, raw)
    table.counts["summary"] = int(table.summary.sum())
    table.counts["data"] = len(table) - table.counts["summary"]
    return table


def _parse(table: TableCells, column: Column, cells: Sequence[Any], settings: Settings) -> Parsed:
    sheet, block = table.sheet, table.block
    if column.kind == "text":
        parsed = parse_names(cells, column.name in IDENTIFIERS)
        if column.name == "batch" and settings["reading.blank_batch"] != "missing":
            _blank_batches(table, parsed, cells, settings["reading.blank_batch"])
        return parsed
    if column.kind == "time":
        parsed = parse_times(cells, settings, sheet.epoch_1904)
        if column.name == "read_at" and block.time_of_day >= 0:
            clocks = parse_clocks(table.cells(block.time_of_day))
            have = ~np.isnat(clocks.values)
            parsed.values[have] = parsed.values[have].astype("datetime64[D]") + clocks.values[have]
            parsed.bad.update(clocks.bad)
        return parsed
    decimal = settings["reading.decimal"]
    if column.kind == "amount":
        amounts = parse_amounts(cells, decimal, sheet.text_cells, added=column.name == "made_up_to")
        table.amounts[column.name] = amounts
        parsed = amounts.parsed
        if column.unit:
            _in_unit(amounts, column, block.units.get(column.name, ""))
    else:
        missing = MISSING | ROOM if column.unit == "°C" else MISSING
        parsed = parse_numbers(cells, decimal, sheet.text_cells, _change_of_unit(column), missing=missing)
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


def _blank_batches(table: TableCells, parsed: Parsed, cells: Sequence[Any], meaning: str) -> None:
    """Blank batches below a named one: "as above" where the settings say so, else a question if there are many."""
    if table.block.kind == "stocks" or {"known", "series"} & table.block.columns.keys():
        return  # a bought lot was made as no batch, and such rows name something else
    blank = blanks(cells)
    named = np.flatnonzero(~blank)
    if not blank.any() or not len(named):
        return
    below = [i for i in np.flatnonzero(blank).tolist() if i > named[0]]
    if meaning == "above":
        last = np.maximum.accumulate(np.where(blank, 0, np.arange(len(cells))))
        parsed.values[below] = parsed.values[last[below]]
        if below:
            parsed.notes.append(("batch-as-above", below[0], "", (("count", str(len(below))),)))
        return
    parsed.open_choice["blank_batch"] = below


def _change_of_unit(column: Column) -> Any:
    """Function text -> (factor, offset) for a number written with its own unit, such as "21 °C"."""
    kelvin = {"°c": (1.0, 0.0), "c": (1.0, 0.0), "degc": (1.0, 0.0), "°f": (5 / 9, -160 / 9), "k": (1.0, -273.15)}

    def change(text: str) -> tuple[float, float] | None:
        key = text.casefold().replace("º", "°").replace("˚", "°").replace(" ", "")
        if column.unit == "°C":
            return kelvin.get(key)
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


def _in_unit(amounts: Amounts, column: Column, heading_unit: str) -> None:
    """Amounts of a column that has one unit once read, such as titrant added in mL."""
    wanted = UNITS[column.unit]
    heading = find_unit(heading_unit) or wanted
    names = np.where(amounts.units == "", heading.name, amounts.units)
    for name in set(names.tolist()):
        mine = names == name
        if UNITS[name].measures != wanted.measures:
            for i in np.flatnonzero(mine & ~np.isnan(amounts.parsed.values)).tolist():
                read = f"{amounts.parsed.values[i]:g} {name}"
                amounts.parsed.bad.setdefault(i, Fault("unit-conflict", read, (("name", wanted.name),)))
        amounts.parsed.values[mine] *= UNITS[name].factor / wanted.factor


def _struck(table: TableCells) -> None:
    """Notice struck-through cells in the columns that matter; colours are not read at all."""
    if table.sheet.formats is None:
        return
    columns = [table.block.columns[n] for n in ("ph", "amount", "batch") if n in table.block.columns]
    inside = set(table.rows.tolist())
    struck = [(r, c) for c in columns for r in table.sheet.formats.struck(table.sheet, c) if r in inside]
    if struck:
        place = table.sheet.place(*min(struck))
        table.notes.append(Problem("cells-struck", place, words=(("count", str(len(struck))),)))


def covered(cells: Sequence[Any]) -> AnyArray:
    """BoolArray (n,): cells that lie under a merge."""
    if Marker not in set(map(type, cells)):
        return np.zeros(len(cells), bool)
    return np.fromiter((isinstance(v, Marker) and v.kind == "covered" for v in cells), bool, len(cells))
