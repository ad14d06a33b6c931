"""Recipe lines, from long recipe sheets and from wide substance columns, in one set of columns."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from reconcile.importer.amounts import Amounts, parse_amounts
from reconcile.importer.cells import Fault, blanks, parse_names
from reconcile.importer.tables import TableCells
from reconcile.records.arrays import AnyArray, FloatArray, IntArray, TextArray
from reconcile.records.columns import heading_key
from reconcile.records.places import Place
from reconcile.records.problems import Problem
from reconcile.records.settings import Settings
from reconcile.records.units import UNITS, Unit, find_unit

CONCENTRATIONS = ("molar", "molal", "normal", "mass_volume", "mass_mass")
QUANTITIES = ("mass", "volume", "mol")


@dataclass
class Lines:
    """Recipe lines of all files.

    group : recipe a line belongs to, index into `Recipes.batch`
    value : amount in `unit` (canonical name, "" for water without one); total : what it is made up to, mL or g, NaN
    total_measure : "volume", "mass", "added volume" or "added mass" (what it is added to), ""
    special : "adjust", "fill" or ""
    source, row : as in Table; column, substance_column, total_column : names as in Place
    table_row : row of the recipes table, -1 for a wide column
    problem : why the line cannot be used, or None
    """

    group: IntArray
    substance: TextArray
    lot: TextArray
    step: TextArray
    value: FloatArray
    unit: TextArray
    special: TextArray
    total: FloatArray
    total_measure: TextArray
    source: IntArray
    row: IntArray
    column: TextArray
    substance_column: TextArray
    total_column: TextArray
    table_row: IntArray
    stated: TextArray
    problem: TextArray

    def __len__(self) -> int:
        return len(self.value)


@dataclass
class Recipes:
    """Recipes by group: `batch` names them; `by_batch` gives the groups of a batch, long ones under a batch once."""

    batch: list[str] = field(default_factory=list)
    by_batch: dict[str, list[int]] = field(default_factory=dict)
    parts: list[Lines] = field(default_factory=list)

    def new_group(self, batch: str) -> int:
        self.batch.append(batch)
        self.by_batch.setdefault(batch, []).append(len(self.batch) - 1)
        return len(self.batch) - 1

    def side_group(self, name: str) -> int:
        """A group that no batch refers to."""
        self.batch.append(name)
        return len(self.batch) - 1

    def lines(self) -> Lines:
        """All lines, in file order."""
        if not self.parts:
            return empty_lines()
        names = list(Lines.__dataclass_fields__)
        return Lines(**{n: np.concatenate([getattr(p, n) for p in self.parts]) for n in names})


def empty_lines(n: int = 0) -> Lines:
    """Lines with nothing in them."""

    def text() -> TextArray:
        return np.full(n, "", object)

    def whole() -> IntArray:
        return np.full(n, -1, np.intp)

    return Lines(
        whole(), text(), text(), text(), np.full(n, np.nan), text(), text(), np.full(n, np.nan), text(), whole(),
        whole(), text(), text(), text(), whole(), text(), np.full(n, None, object),
    )  # fmt: skip


def known_units(texts: Sequence[Any]) -> dict[str, Unit | None]:
    """Every distinct unit text -> Unit, None where it spells none."""
    return {t: find_unit(t) for t in set(texts)}


def text_column(table: TableCells, name: str) -> TextArray:
    """A text column of a table; "" everywhere where the table has none."""
    parsed = table.columns.get(name)
    return parsed.values if parsed is not None else np.full(len(table), "", object)


def settle_units(amounts: Amounts, column_units: TextArray, heading_unit: str) -> tuple[TextArray, dict[int, Fault]]:
    """Canonical unit of every amount from the cell, the unit column and the heading, and what is wrong with it."""
    faults: dict[int, Fault] = {}
    heading = find_unit(heading_unit) if heading_unit else None
    found = known_units(column_units.tolist())
    names = {t: ("" if not t else u.name if u else "?") for t, u in found.items()}
    outer = np.array([names[t] for t in column_units.tolist()], object) if len(column_units) else column_units
    if heading is not None:
        outer = np.where(outer == "", heading.name, outer)
    for i in np.flatnonzero(outer == "?").tolist():
        faults[i] = Fault("unit-unknown", column_units[i])
    inner = amounts.units
    clash = (inner != "") & (outer != "") & (inner != outer)
    for i in np.flatnonzero(clash).tolist():
        if i not in faults and amounts.special[i] != "fill":
            read = f"{amounts.parsed.values[i]:g} {inner[i]}"
            faults[i] = Fault("unit-conflict", read, (("name", outer[i]),))
    return np.where(inner != "", inner, outer), faults


def long_lines(
    table: TableCells, source: int, first_table_row: int, recipes: Recipes, long_groups: dict[str, int]
) -> Lines:
    """Lines of a long recipe sheet, one a row; the groups of its batches are made on the way."""
    n = len(table)
    lines = empty_lines(n)
    batch = text_column(table, "batch")
    for b in dict.fromkeys(batch.tolist()):
        if b and b not in long_groups:
            long_groups[b] = recipes.new_group(b)
    lines.group = np.array([long_groups.get(b, -1) for b in batch.tolist()], np.intp)
    lines.group[table.summary] = -1
    lines.substance, lines.lot = text_column(table, "substance"), text_column(table, "lot")
    lines.step = text_column(table, "step")
    lines.source[:] = source
    lines.row = table.sheet.row_numbers[table.rows]
    lines.table_row = np.arange(first_table_row, first_table_row + n)
    names, block = table.sheet.names, table.block
    lines.substance_column[:] = names[block.columns["substance"]]
    units = text_column(table, "unit")
    for name in ("planned", "amount"):  # actual amounts go before planned ones
        if name not in table.amounts:
            continue
        amounts = table.amounts[name]
        settled, faults = settle_units(amounts, units, block.units.get(name, ""))
        said = ~np.isnan(amounts.parsed.values) | (amounts.special != "")
        said[list(amounts.parsed.bad)] = True
        lines.value = np.where(said, amounts.parsed.values, lines.value)
        lines.unit = np.where(said, settled, lines.unit)
        lines.special = np.where(said, amounts.special, lines.special)
        lines.column = np.where(said | (lines.column == ""), names[block.columns[name]], lines.column)
        for i in np.flatnonzero(said).tolist():
            lines.problem[i] = None
        for i, fault in {**faults, **amounts.parsed.bad}.items():
            if said[i]:
                lines.problem[i] = table.problem(i, name, fault)
    _totals(table, lines)
    for name in ("batch", "substance", "lot", "unit"):
        if name in table.columns:
            for i, fault in table.columns[name].bad.items():
                lines.problem[i] = table.problem(i, name, fault)
    for i, why in table.whole_row.items():
        lines.problem[i] = why
    return lines


def _totals(table: TableCells, lines: Lines) -> None:
    """What each line says it is made up to, in mL or g."""
    if "made_up_to" not in table.amounts:
        return
    amounts = table.amounts["made_up_to"]
    units, faults = settle_units(
        amounts, text_column(table, "made_up_to_unit"), table.block.units.get("made_up_to", "")
    )
    lines.total_column[:] = table.sheet.names[table.block.columns["made_up_to"]]
    have = ~np.isnan(amounts.parsed.values)
    for i, fault in {**faults, **amounts.parsed.bad}.items():
        lines.problem[i] = lines.problem[i] or table.problem(i, "made_up_to", fault)
    set_totals(lines, amounts.parsed.values, units, amounts.special, have, table)


def set_totals(
    lines: Lines, values: FloatArray, units: TextArray, special: TextArray, have: AnyArray, table: TableCells
) -> None:
    """Totals in base units; a total without a unit, or in a unit of another kind, is the line's problem."""
    for name in set(units[have].tolist()):
        rows = have & (units == name)
        unit = UNITS.get(name)
        if unit is not None and unit.measures in ("volume", "mass"):
            lines.total = np.where(rows, values * unit.factor, lines.total)
            measures = np.where(np.equal(special, "added"), f"added {unit.measures}", unit.measures)
            lines.total_measure = np.where(rows, measures, lines.total_measure)
            continue
        for i in np.flatnonzero(rows).tolist():
            code = "unit-unknown" if name else "unit-missing"
            fault = Fault(code, name if name and name != "?" else f"{values[i]:g}")
            lines.problem[i] = lines.problem[i] or table.problem(i, "made_up_to", fault)


def wide_lines(table: TableCells, source: int, recipes: Recipes, settings: Settings) -> tuple[Lines, IntArray]:
    """Lines of the substance columns of a sheet, and the recipe group of every row (-1: no amount in the row)."""
    n = len(table)
    batch = text_column(table, "batch")
    stage = text_column(table, "stage")
    pieces: list[tuple[int, str, str, int, Amounts, TextArray, AnyArray]] = []
    contents: list[list[Any]] = [batch.tolist(), stage.tolist()]
    any_amount = np.zeros(n, bool)
    for column, name, unit, lot_column in table.block.wide:
        cells = table.cells(column)
        amounts = parse_amounts(cells, settings["reading.decimal"], table.sheet.text_cells)
        table.note(amounts.parsed, column)
        said = ~blanks(cells) & ~((amounts.parsed.values == 0) | _missing(amounts))
        lots = parse_names(table.cells(lot_column)).values if lot_column >= 0 else np.full(n, "", object)
        pieces.append((column, name, unit, lot_column, amounts, lots, said))
        any_amount |= said
        contents += [list(cells), lots.tolist()]
    total_cells = [table.block.columns[c] for c in ("made_up_to", "made_up_to_unit") if c in table.block.columns]
    contents += [list(table.cells(c)) for c in total_cells]
    groups = np.full(n, -1, np.intp)
    seen: dict[tuple[Any, ...], int] = {}
    first_rows: list[int] = []
    names, some, of_row = batch.tolist(), any_amount.tolist(), groups.tolist()
    for i, content in enumerate(zip(*contents, strict=True)):
        if not some[i]:
            continue
        group = seen.get(content)
        if group is None:
            group = seen[content] = recipes.new_group(names[i])
            first_rows.append(i)
        of_row[i] = group
    groups = np.array(of_row, np.intp)
    first = np.array(first_rows, np.intp)
    parts = [_wide_part(table, source, piece, first, groups) for piece in pieces]
    parts = [p for p in parts if len(p)]
    if not parts:
        return empty_lines(), groups
    names = list(Lines.__dataclass_fields__)
    whole = {k: np.concatenate([getattr(p, k) for p in parts]) for k in names}
    order = np.argsort(whole["group"], kind="stable")
    return Lines(**{k: v[order] for k, v in whole.items()}), groups


def _missing(amounts: Amounts) -> AnyArray:
    missing = np.isnan(amounts.parsed.values) & (amounts.special == "")
    missing[list(amounts.parsed.bad)] = False
    return np.asarray(missing, bool)


def _wide_part(
    table: TableCells,
    source: int,
    piece: tuple[int, str, str, int, Amounts, TextArray, AnyArray],
    first: IntArray,
    groups: IntArray,
) -> Lines:
    """Lines of one substance column, one for each distinct recipe."""
    column, name, unit, _, amounts, lots, said = piece
    rows = first[said[first]]
    lines = empty_lines(len(rows))
    settled, faults = settle_units(amounts, np.full(len(said), "", object), unit)
    lines.group, lines.lot = groups[rows], lots[rows]
    lines.substance[:] = name
    lines.value, lines.unit, lines.special = amounts.parsed.values[rows], settled[rows], amounts.special[rows]
    lines.source[:] = source
    lines.row = table.sheet.row_numbers[table.rows[rows]]
    lines.column[:] = table.sheet.names[column]
    lines.substance_column[:] = table.sheet.names[column]
    bad = {**faults, **amounts.parsed.bad}
    for k, i in enumerate(rows.tolist()):
        if i in bad:
            lines.problem[k] = Problem(
                bad[i].code, Place(table.sheet.file, table.sheet.sheet, int(lines.row[k]), table.sheet.names[column]),
                bad[i].read, (*bad[i].words, ("name", heading_key(name))),
            )  # fmt: skip
    if "made_up_to" in table.block.columns:
        totals = parse_amounts(table.cells(table.block.columns["made_up_to"]), "auto", table.sheet.text_cells, True)
        unit_cells = (
            parse_names(table.cells(table.block.columns["made_up_to_unit"])).values
            if "made_up_to_unit" in table.block.columns
            else np.full(len(said), "", object)
        )
        units, _ = settle_units(totals, unit_cells, table.block.units.get("made_up_to", ""))
        values, have = totals.parsed.values[rows], ~np.isnan(totals.parsed.values[rows])
        lines.total_column[:] = table.sheet.names[table.block.columns["made_up_to"]]
        sub = TableCells(table.sheet, table.block, table.rows[rows])
        set_totals(lines, values, units[rows], totals.special[rows], have, sub)
    return lines
