"""Titration series: what the vessel holds after every addition, from its Series row and the titrant added."""

from __future__ import annotations

from dataclasses import dataclass, field, replace

import numpy as np

from reconcile.importer.compose import Composer, Mixture
from reconcile.importer.lines import Lines, Recipes, empty_lines, settle_units, text_column
from reconcile.importer.tables import TableCells
from reconcile.records.arrays import BoolArray
from reconcile.records.problems import Problem


@dataclass
class SeriesList:
    """Series by name: the recipe group of what was titrated, that of the titrant, and the start volume [mL]."""

    analyte: dict[str, int] = field(default_factory=dict)
    titrant: dict[str, int] = field(default_factory=dict)
    start: dict[str, float] = field(default_factory=dict)
    problem: dict[str, Problem] = field(default_factory=dict)

    def mixture(self, name: str, added: float, composer: Composer) -> Mixture:
        """What the vessel holds after an addition [mL]; volumes add up.

        An amount n in the start volume V0 is n / (V0 + V); a titrant of concentration c gives c V / (V0 + V).
        """
        if name in self.problem:
            return Mixture(problem=self.problem[name])
        vessel = composer.mixture(composer.by_group.get(self.analyte[name], []))
        burette = composer.mixture(composer.by_group.get(self.titrant[name], []))
        for one in (vessel, burette):
            if one.problem is not None:
                return one
            if one.per_kg_water:
                line = one.parts[0][0].line
                place = composer.reader.place(line, composer.lines.column[line])
                return Mixture(problem=Problem("litre-and-kilogram", place, composer.reader.stated(line)))
        whole = self.start[name] + added
        u = composer.reader.u_volume
        parts = [(p, a * self.start[name] / whole, float(np.hypot(x, u))) for p, a, x in vessel.parts]
        if added > 0.0:
            parts += [(p, a * added / whole, float(np.hypot(x, u))) for p, a, x in burette.parts]
        return Mixture(False, parts)


def read_series(table: TableCells, source: int, recipes: Recipes, series: SeriesList) -> None:
    """Take the rows of one Series sheet, one a substance titrated; the titrant is that of a series' first row."""
    n = len(table)
    names = text_column(table, "series")
    start = table.columns["start_volume"].values
    analyte, titrant = empty_lines(n), empty_lines(n)
    for lines, substance, lot in ((analyte, "substance", "lot"), (titrant, "titrant", "titrant_lot")):
        lines.substance, lines.lot = text_column(table, substance), text_column(table, lot)
        lines.source[:] = source
        lines.row = table.sheet.row_numbers[table.rows]
        lines.substance_column[:] = table.sheet.names[table.block.columns[substance]]
        for i, fault in table.columns[substance].bad.items():
            lines.problem[i] = table.problem(i, substance, fault)
    _amounts(table, analyte)
    analyte.total, analyte.total_measure[start > 0.0] = start.copy(), "volume"
    _strengths(table, titrant)
    for i, name in enumerate(names.tolist()):
        if table.summary[i] or not name:
            continue
        if name not in series.analyte:
            series.analyte[name], series.titrant[name] = recipes.side_group(name), recipes.side_group(name)
            series.start[name] = float(start[i])
            titrant.group[i] = series.titrant[name]
        analyte.group[i] = series.analyte[name]
        bad = table.columns["start_volume"].bad.get(i)
        if bad is not None:
            series.problem.setdefault(name, table.problem(i, "start_volume", bad))
        elif not start[i] > 0.0:
            series.problem.setdefault(name, Problem("start-volume-missing", table.place(i, "start_volume"), name))
    recipes.parts += [analyte, _only(titrant, titrant.group >= 0)]


def _amounts(table: TableCells, lines: Lines) -> None:
    column = table.block.columns.get("amount", table.block.columns["series"])
    lines.column[:] = table.sheet.names[column]
    if "amount" not in table.amounts:
        return
    amounts = table.amounts["amount"]
    units, faults = settle_units(amounts, text_column(table, "unit"), table.block.units.get("amount", ""))
    lines.value, lines.unit, lines.special = amounts.parsed.values, units, amounts.special
    for i, fault in {**faults, **amounts.parsed.bad}.items():
        lines.problem[i] = lines.problem[i] or table.problem(i, "amount", fault)


def _strengths(table: TableCells, lines: Lines) -> None:
    """The titrant's strength as a final concentration; where it is unstated, a litre of its lot made up to a litre."""
    lines.column[:] = table.sheet.names[table.block.columns.get("titrant_strength", table.block.columns["titrant"])]
    lines.value[:], lines.unit[:] = 1000.0, "mL"
    lines.total[:], lines.total_measure[:] = 1000.0, "volume"
    if "titrant_strength" not in table.columns:
        return
    parsed = table.columns["titrant_strength"]
    stated = ~np.isnan(parsed.values)
    lines.value = np.where(stated, parsed.values, lines.value)
    lines.unit = np.where(stated, "mol/L", lines.unit).astype(object)
    for i, fault in parsed.bad.items():
        lines.problem[i] = table.problem(i, "titrant_strength", fault)


def _only(lines: Lines, mask: BoolArray) -> Lines:
    return replace(lines, **{name: getattr(lines, name)[mask] for name in Lines.__dataclass_fields__})
