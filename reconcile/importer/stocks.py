"""Stock lots: what a bottle holds per litre or per gram, from strength, density, assay and factor."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from reconcile.importer.cells import Fault
from reconcile.importer.lines import CONCENTRATIONS, known_units, settle_units, text_column
from reconcile.importer.tables import TableCells
from reconcile.records.places import Place
from reconcile.records.problems import Problem
from reconcile.records.substances import Catalogue, Form
from reconcile.records.units import UNITS, Unit

_TRUSTED = (
    "lot", "strength", "density", "assay", "water", "factor", "tolerance", "substance", "batch", "adjusted_to",
    "adjusted_at",
)  # fmt: skip
"""Columns whose bad cells leave the lot unusable."""


@dataclass
class Stock:
    """One row of a Stocks sheet, understood.

    form : what the label says, None for a lot that is named by the batch it was made as
    strength : as written, in `unit`. density [g/mL], assay [%], factor, tolerance [%]; NaN when unstated
    assay : content by mass of the lot as it is weighed: an assay of the dried substance less its water content
    row : row of the stocks table; problem : why the lot cannot be used, or None
    adjusted_to, adjusted_at : pH that it was adjusted to, and at which temperature [°C]; NaN when unstated
    """

    lot: str
    form: Form | None
    batch: str
    strength: float
    unit: Unit | None
    density: float
    assay: float
    factor: float
    tolerance: float
    row: int
    place: Place
    problem: Problem | None = None
    adjusted_to: float = np.nan
    adjusted_at: float = np.nan

    @property
    def is_solution(self) -> bool:
        return self.unit is not None and not np.isnan(self.strength)

    @property
    def adjusted(self) -> bool:
        """Whether it holds a counter-ion that its pH alone tells."""
        return self.is_solution and not self.batch and not np.isnan(self.adjusted_to)

    def molarity(self, form: Form) -> tuple[float, str]:
        """Amount of substance in a litre of the stock [mol/L], or NaN and the name of what is missing.

        molar c; normal N/equivalents; g/L over M; g/kg times density over M; mol/kg of water b: c = b rho / (1 + b M)
        with rho in kg/L and M in kg/mol; a neat liquid: density times assay over M.
        """
        factor = 1.0 if np.isnan(self.factor) else self.factor
        if not self.is_solution:
            if np.isnan(self.density):
                return np.nan, "a strength"
            assay = 100.0 if np.isnan(self.assay) else self.assay
            return self.density * 10.0 * assay / form.molar_mass * factor, ""
        assert self.unit is not None
        x = self.strength * self.unit.factor * factor
        measures = self.unit.measures
        if measures == "molar":
            return x, ""
        if measures == "normal":
            return (x / form.equivalents, "") if form.equivalents else (np.nan, "the equivalents of this substance")
        if measures == "mass_volume":
            return x / form.molar_mass, ""
        if np.isnan(self.density):
            return np.nan, "the density of the lot"
        if measures == "mass_mass":
            return x * self.density / form.molar_mass, ""
        return x * self.density / (1.0 + x * form.molar_mass / 1000.0), ""

    def mol_per_gram(self, form: Form) -> tuple[float, str]:
        """Amount of substance in a gram of the lot [mol/g], or NaN and the name of what is missing."""
        factor = 1.0 if np.isnan(self.factor) else self.factor
        if not self.is_solution:
            assay = 100.0 if np.isnan(self.assay) else self.assay
            return assay / 100.0 * factor / form.molar_mass, ""
        assert self.unit is not None
        x = self.strength * self.unit.factor * factor
        if self.unit.measures == "mass_mass":
            return x / 1000.0 / form.molar_mass, ""
        if self.unit.measures == "molal":
            return x / 1000.0 / (1.0 + x * form.molar_mass / 1000.0), ""
        molarity, missing = self.molarity(form)
        if missing or np.isnan(self.density):
            return np.nan, missing or "the density of the lot"
        return molarity / self.density / 1000.0, ""


@dataclass
class StockRoom:
    """Every stock, by lot name; `alike` keeps the spelling of each lot."""

    by_lot: dict[str, list[Stock]] = field(default_factory=dict)

    def add(self, stock: Stock) -> None:
        """Add one; the same lot again with other content is that lot's problem."""
        rows = self.by_lot.setdefault(stock.lot, [])
        for other in rows:
            if other.form == stock.form and other.batch == stock.batch:
                if _content(other) != _content(stock) and stock.problem is None:
                    other.problem = Problem("lot-twice", stock.place, stock.lot)
                return
        rows.append(stock)


def _content(stock: Stock) -> tuple[object, ...]:
    numbers = (
        stock.strength, stock.density, stock.assay, stock.factor, stock.adjusted_to, stock.adjusted_at
    )  # fmt: skip
    return (stock.unit, *(None if np.isnan(x) else x for x in numbers))


def read_stocks(table: TableCells, first_table_row: int, catalogue: Catalogue, room: StockRoom) -> None:
    """Add every lot of one Stocks sheet."""
    n = len(table)
    lot, substance, batch = (text_column(table, name) for name in ("lot", "substance", "batch"))
    strength, units = np.full(n, np.nan), np.full(n, "", object)
    faults: dict[int, Fault] = {}
    if "strength" in table.amounts:
        amounts = table.amounts["strength"]
        strength = amounts.parsed.values
        units, faults = settle_units(amounts, text_column(table, "unit"), table.block.units.get("strength", ""))
    found = {text: catalogue.look_up(text) for text in set(substance.tolist()) if text}

    def number(name: str, i: int) -> float:
        return float(table.columns[name].values[i]) if name in table.columns else np.nan

    known_units(units.tolist())
    for i in range(n):
        if table.summary[i] or not lot[i]:
            continue
        problem: Problem | None = None
        for name in _TRUSTED:
            if name in table.columns and i in table.columns[name].bad:
                problem = problem or table.problem(i, name, table.columns[name].bad[i])
        if i in faults and problem is None:
            problem = table.problem(i, "strength", faults[i])
        unit = UNITS.get(units[i])
        if not np.isnan(strength[i]) and problem is None:
            if unit is None:
                problem = table.problem(i, "strength", Fault("unit-missing", f"{strength[i]:g}"))
            elif unit.measures not in (*CONCENTRATIONS, "times"):
                problem = table.problem(i, "strength", Fault("strength-unit", f"{strength[i]:g} {unit.name}"))
        look_up = found.get(substance[i])
        form = look_up.form if look_up else None
        if form is None and look_up is not None and not np.isnan(number("adjusted_to", i)):
            form = _whichever(look_up.several, unit)
        if substance[i] and form is None and not batch[i] and problem is None and look_up is not None:
            problem = table.problem(i, "substance", substance_fault(substance[i], look_up.near, look_up.several))
        room.add(
            Stock(
                lot[i],
                form,
                batch[i],
                float(strength[i]),
                unit if not np.isnan(strength[i]) else None,
                number("density", i),
                _as_is(number("assay", i), number("water", i), form, catalogue),
                number("factor", i),
                number("tolerance", i),
                first_table_row + i,
                table.place(i, "lot"),
                problem,
                number("adjusted_to", i),
                number("adjusted_at", i),
            )
        )


def _whichever(several: tuple[Form, ...], unit: Unit | None) -> Form | None:
    """Of the forms that a name may mean, the one without counter-ions, where its solution is brought to a pH anyway.

    "EDTA 0.5 M, pH 8.0": the counter-ion is inferred from that pH, whichever salt it was made of. None where the forms
    differ in more than their counter-ions, or where the strength is not by amount of substance.
    """
    if unit is None or unit.measures not in ("molar", "molal") or len({(f.acid, f.acid_units) for f in several}) != 1:
        return None
    return next((f for f in several if not f.ions), None)


def _as_is(assay: float, water: float, form: Form | None, catalogue: Catalogue) -> float:
    """Content by mass [%] of a lot as it is weighed, from its assay on the dried substance and its water content.

    A hydrate with at least half of its crystal water in that content has all its water in it (Karl Fischer, loss on
    drying), else only what is there beside the crystal water.
    """
    if np.isnan(water):
        return assay
    content = (100.0 if np.isnan(assay) else assay) * (1.0 - water / 100.0)
    dry = catalogue.by_name.get(form.hydrate_of) if form is not None else None
    if form is None or dry is None or water / 100.0 < (1.0 - dry.molar_mass / form.molar_mass) / 2.0:
        return content
    return content * form.molar_mass / dry.molar_mass


def substance_fault(text: str, near: tuple[str, ...], several: tuple[Form, ...]) -> Fault:
    """Why a name means no substance: unknown, with names that resemble it, or several."""
    if several:
        names = [f.name for f in several]
        listed = ", ".join(names[:6]) + (f" and {len(names) - 6} more" if len(names) > 6 else "")
        return Fault("substance-ambiguous", text, (("several", listed),))
    suggestion = f"; did you mean {' or '.join(near)}?" if near else ""
    return Fault("substance-unknown", text, (("near", suggestion), ("bare", text)))
