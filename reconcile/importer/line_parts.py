"""What one recipe line brings: a form, how it is stated, and how much of it a unit of the written amount is."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from reconcile.importer.amounts import amount_words
from reconcile.importer.cells import Fault
from reconcile.importer.lines import Lines
from reconcile.importer.resolve import Resolver, Taken
from reconcile.importer.stocks import Stock
from reconcile.importer.unpredictable import MOST_SOLVENT
from reconcile.records.places import Place
from reconcile.records.problems import Problem
from reconcile.records.settings import Settings
from reconcile.records.substances import Form
from reconcile.records.units import UNITS

HOWS = ("taken", "molar", "molal", "w")
"""taken [mol], molar [mol/L of solution], molal [mol/kg of water], w [g/kg of solution]."""


@dataclass(frozen=True)
class Basis:
    """What every line of one substance, lot and unit has in common.

    amount = k * written value, stated as `how`; solute: grams of anhydrous solute per unit of amount
    u : relative standard uncertainty, without the final volume or mass of a quantity taken
    nothing : brings nothing (water, or declared without effect); plain : the fields above say all there is
    """

    taken: Taken
    form: Form | None = None
    how: str = ""
    k: float = 0.0
    solute: float = 0.0
    u: float = 0.0
    by_mass: bool = False
    nothing: bool = False
    fault: Fault | None = None

    @property
    def plain(self) -> bool:
        adjusted = self.taken.stock is not None and self.taken.stock.adjusted
        solvent = self.form is not None and self.form.name in MOST_SOLVENT
        return self.form is not None and self.fault is None and not adjusted and not solvent


@dataclass(frozen=True, slots=True)
class Part:
    """One form that one recipe line brings; fields as in Basis. chain: every lot that it came through.

    open : the open amount (a number of OpenList) for one unit of which `amount` stands; -1 where the amount is written
    """

    line: int
    form: Form
    lot: int
    how: str
    amount: float
    solute: float
    u: float
    by_mass: bool
    chain: tuple[int, ...]
    open: int = -1


class LineReader:
    """Answers for recipe lines; what lines have in common is worked out once."""

    def __init__(self, lines: Lines, resolver: Resolver, settings: Settings, files: Sequence[tuple[str, str]]) -> None:
        self.lines, self.resolver, self.files = lines, resolver, files
        self.u_weighing = settings["uncertainty.weighing_percent"] / 100.0 / float(np.sqrt(3.0))
        self.u_volume = settings["uncertainty.volume_percent"] / 100.0 / float(np.sqrt(3.0))
        self._bases: dict[tuple[str, str, str], Basis] = {}

    def place(self, line: int, column: str) -> Place:
        """Place of one cell of a line."""
        file, sheet = self.files[int(self.lines.source[line])]
        return Place(file, sheet, int(self.lines.row[line]), column)

    def problem(self, line: int, fault: Fault, column: str) -> Problem:
        """A fault of one line, at one of its cells."""
        words = dict(fault.words)
        words.setdefault("name", self.lines.substance[line])
        return Problem(fault.code, self.place(line, column), fault.read, tuple(words.items()))

    def stated(self, line: int) -> str:
        """The amount as written, with its unit and lot."""
        return stated_words(float(self.lines.value[line]), self.lines.unit[line], self.lines.lot[line])

    def basis(self, substance: str, lot: str, unit_name: str) -> Basis:
        """What lines of one substance, lot and unit have in common."""
        key = (substance, lot, unit_name)
        if key not in self._bases:
            self._bases[key] = self._basis(substance, lot, unit_name)
        return self._bases[key]

    def _basis(self, substance: str, lot: str, unit_name: str) -> Basis:
        unit = UNITS.get(unit_name)
        taken = self.resolver.taken(substance, lot, unit.measures if unit is not None else "")
        if taken.water or taken.without_effect:
            return Basis(taken, nothing=True)
        if taken.fault is not None or taken.form is None or unit is None or unit.measures == "times":
            return Basis(taken, fault=taken.fault)
        if unit.measures == "percent":
            return Basis(taken, fault=Fault("percent-unclear", unit_name))
        found = self._one(taken, taken.form, unit.measures)
        if isinstance(found, Fault):
            return Basis(taken, fault=found)
        how, per_unit, u = found
        solute = anhydrous_mass(taken.form, self.resolver.catalogue.by_name)
        if how == "w":
            solute /= taken.form.molar_mass
        is_solution = taken.stock is not None and taken.stock.is_solution
        by_mass = unit.measures in ("mass", "mass_volume", "mass_mass") and not is_solution
        return Basis(taken, taken.form, how, per_unit * unit.factor, solute, u, by_mass)

    def _one(self, taken: Taken, form: Form, measures: str) -> Fault | tuple[str, float, float]:
        """(how, amount per base unit, relative u) of a single substance."""
        w, v = self.u_weighing, self.u_volume
        both = float(np.hypot(w, v))
        stock = taken.stock
        if measures in ("molar", "molal"):
            return measures, 1.0, both
        if measures == "normal":
            if not form.equivalents:
                return _needs("N", "the equivalents of this substance")
            return "molar", 1.0 / form.equivalents, both
        if measures == "mass_volume":
            return "molar", 1.0 / form.molar_mass, both
        if measures == "mass_mass":
            return "w", 1.0, both
        if measures == "mol":
            return "taken", 1.0, w
        if measures == "mass":
            per_gram, missing = stock.mol_per_gram(form) if stock is not None else (1.0 / form.molar_mass, "")
            return ("taken", per_gram, w) if not missing else _needs("g", missing)
        if stock is None:
            name = self.resolver.lots.names()[taken.lot] if taken.lot >= 0 else ""
            return Fault("lot-unknown" if taken.lot >= 0 else "volume-of-what", name)
        molarity, missing = stock.molarity(form)
        if missing == "a strength":
            return Fault("lot-strength-missing", stock.lot)
        return ("taken", molarity / 1000.0, v) if not missing else _needs("mL", missing)

    def plain_part(self, line: int) -> Part | Problem | Basis | None:
        """The part of an ordinary line; None where it brings nothing, a Basis where the stock must be opened."""
        L = self.lines
        basis = self.basis(L.substance[line], L.lot[line], L.unit[line])
        taken = basis.taken
        if basis.nothing:
            return None
        if taken.fault is not None:
            if taken.fault_place is not None:
                return Problem(taken.fault.code, taken.fault_place, taken.fault.read, taken.fault.words)
            return self.problem(line, taken.fault, L.substance_column[line])
        fault = None if L.problem[line] is not None else self._line_fault(line, basis)
        code = L.problem[line].code if L.problem[line] is not None else fault.code if fault is not None else ""
        if taken.form is not None and taken.form.name in MOST_SOLVENT and code in ("unit-unknown", "volume-of-what"):
            # its volume in the solution is what nothing more could be made of
            mixed = Fault("solvent-mixed", L.substance[line], (("bare", L.substance[line]),))
            return self.problem(line, mixed, L.substance_column[line])
        if L.problem[line] is not None:
            return L.problem[line]  # type: ignore[no-any-return]
        if fault is not None:
            return self.problem(line, fault, L.column[line])
        value = float(L.value[line])
        if value == 0.0:
            return None
        return self.part_of(line, basis) if basis.plain else basis

    def part_of(self, line: int, basis: Basis) -> Part:
        """The part of a line whose basis has a form."""
        assert basis.form is not None
        lot = basis.taken.lot
        chain = (lot,) if lot >= 0 else ()
        amount = float(self.lines.value[line]) * basis.k
        return Part(line, basis.form, lot, basis.how, amount, basis.solute, basis.u, basis.by_mass, chain)

    def _line_fault(self, line: int, basis: Basis) -> Fault | None:
        L = self.lines
        value = float(L.value[line])
        if L.special[line] == "fill":
            return Fault("fill-not-water", L.substance[line])
        if np.isnan(value):
            return Fault("amount-missing", "")
        if not L.unit[line]:
            return Fault("unit-missing", f"{value:g}")
        if basis.fault is not None and basis.fault.code == "percent-unclear":
            return Fault("percent-unclear", f"{value:g} %")
        return basis.fault


def stated_words(value: float, unit: str, lot: str) -> str:
    """An amount as written, with its unit and lot: 25 mL of lot X."""
    words = "as needed" if np.isnan(value) else amount_words(value, unit)
    return f"{words} of lot {lot}" if lot else words


def _needs(unit: str, missing: str) -> Fault:
    return Fault("unit-needs", unit, (("name", missing),))


def fraction_of(stock: Stock, times: float) -> float | None:
    """Share of a stock in the final solution: "1x" of a stock of strength 10x, or "10x" of any other, is a tenth."""
    if stock.unit is not None and stock.unit.measures == "times":
        fraction = times / (stock.strength * stock.unit.factor)
    else:
        fraction = 1.0 / times
    return fraction if 0.0 < fraction <= 1.0 else None


def anhydrous_mass(form: Form, by_name: Mapping[str, Form]) -> float:
    """Grams of solute that a mole brings; the water of a hydrate joins the solvent [g/mol]."""
    base = by_name.get(form.hydrate_of)
    return base.molar_mass if base is not None and base.acid_units == form.acid_units else form.molar_mass
