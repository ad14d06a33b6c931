"""From recipe lines to what each solution holds: every amount as mol per litre or mol per kilogram of water."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np

from reconcile.importer.amounts import amount_words
from reconcile.importer.cells import Fault
from reconcile.importer.lines import CONCENTRATIONS, QUANTITIES, Lines
from reconcile.importer.resolve import Resolver, Taken
from reconcile.importer.stocks import Stock
from reconcile.records.places import Place
from reconcile.records.problems import Problem
from reconcile.records.settings import Settings
from reconcile.records.substances import Form
from reconcile.records.units import UNITS

WATER_DENSITY_20 = 0.99821
"""g/mL at 20 °C, ordinary pressure (IAPWS-95 by way of IAPWS SR6-08, table of liquid water at 0.1 MPa)."""


@dataclass(frozen=True)
class Part:
    """One form that one recipe line brings.

    how : "taken" [mol], "molar" [mol/L], "molal" [mol/kg of water], "w" [g/kg of solution]
    solute : grams of anhydrous solute per unit of `amount`
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


@dataclass
class Mixture:
    """One solution composed: its parts as final amounts, or the problem that prevents it."""

    per_kg_water: bool = False
    parts: list[tuple[Part, float, float]] = field(default_factory=list)
    problem: Problem | None = None


class Composer:
    """Composes recipes; stocks made as batches are composed on the way, each once."""

    def __init__(self, lines: Lines, resolver: Resolver, settings: Settings, files: Sequence[tuple[str, str]]) -> None:
        self.lines, self.resolver, self.files = lines, resolver, files
        self.u_weighing = settings["uncertainty.weighing_percent"] / 100.0 / np.sqrt(3.0)
        self.u_volume = settings["uncertainty.volume_percent"] / 100.0 / np.sqrt(3.0)
        self.by_group: dict[int, list[int]] = {}
        for i, group in enumerate(lines.group.tolist()):
            self.by_group.setdefault(group, []).append(i)
        self.group_of_batch: dict[str, int] = {}
        self._stock: dict[tuple[str, str], tuple[list[tuple[Part, float]], Problem | None]] = {}
        self._open: list[str] = []
        self._units = {u: UNITS.get(u) for u in set(lines.unit.tolist())}

    def place(self, line: int, column: str) -> Place:
        """Place of one cell of a line."""
        file, sheet = self.files[int(self.lines.source[line])]
        return Place(file, sheet, int(self.lines.row[line]), column)

    def _problem(self, line: int, fault: Fault, column: str) -> Problem:
        words = dict(fault.words)
        words.setdefault("name", self.lines.substance[line])
        return Problem(fault.code, self.place(line, column), fault.read, tuple(words.items()))

    def stated(self, line: int) -> str:
        """The amount as written, with its unit and lot."""
        words = amount_words(float(self.lines.value[line]), self.lines.unit[line])
        return f"{words} of lot {self.lines.lot[line]}" if self.lines.lot[line] else words

    # -- one line -------------------------------------------------------------------------------------------------

    def parts_of(self, line: int) -> list[Part] | Problem:
        """What one line brings; a water line, or a substance without effect, brings nothing."""
        L = self.lines
        unit = self._units[L.unit[line]]
        measures = unit.measures if unit is not None else ""
        taken = self.resolver.taken(L.substance[line], L.lot[line], measures)
        if taken.water or taken.without_effect:
            return []
        if taken.fault is not None:
            if taken.fault_place is not None:
                return Problem(taken.fault.code, taken.fault_place, taken.fault.read, taken.fault.words)
            return self._problem(line, taken.fault, L.substance_column[line])
        if L.problem[line] is not None:
            return L.problem[line]  # type: ignore[no-any-return]
        if L.special[line] == "adjust":
            return self._problem(line, Fault("adjustment-unwritten", "as needed"), L.column[line])
        if L.special[line] == "fill":
            return self._problem(line, Fault("fill-not-water", L.substance[line]), L.substance_column[line])
        value = float(L.value[line])
        if np.isnan(value):
            return self._problem(line, Fault("amount-missing", ""), L.column[line])
        if unit is None:
            return self._problem(line, Fault("unit-missing", f"{value:g}"), L.column[line])
        if measures == "percent":
            return self._problem(line, Fault("percent-unclear", f"{value:g} %"), L.column[line])
        x = value * unit.factor
        if x == 0.0:
            return []
        if taken.form is None:
            return self._from_batch(line, taken, measures, x)
        found = self._simple(taken, taken.form, measures, x)
        if isinstance(found, Fault):
            return self._problem(line, found, L.column[line])
        how, amount, u = found
        solute = anhydrous_mass(taken.form, self.resolver.catalogue.by_name)
        if how == "w":
            solute /= taken.form.molar_mass
        weighed = measures in ("mass", "mass_volume", "mass_mass") and not (taken.stock and taken.stock.is_solution)
        chain = (taken.lot,) if taken.lot >= 0 else ()
        return [Part(line, taken.form, taken.lot, how, amount, solute, u, weighed, chain)]

    def _simple(self, taken: Taken, form: Form, measures: str, x: float) -> Fault | tuple[str, float, float]:
        """(how, amount, relative u without the final volume) of a single substance."""
        w, v = self.u_weighing, self.u_volume
        both = float(np.hypot(w, v))
        stock = taken.stock
        if measures == "molar":
            return "molar", x, both
        if measures == "molal":
            return "molal", x, both
        if measures == "normal":
            if not form.equivalents:
                return Fault("unit-needs", "N", (("name", "the equivalents of this substance"),))
            return "molar", x / form.equivalents, both
        if measures == "mass_volume":
            return "molar", x / form.molar_mass, both
        if measures == "mass_mass":
            return "w", x, both
        if measures == "mol":
            return "taken", x, w
        if measures == "mass":
            per_gram, missing = stock.mol_per_gram(form) if stock is not None else (1.0 / form.molar_mass, "")
            return ("taken", x * per_gram, w) if not missing else _needs("g", missing)
        if stock is None:
            return Fault("lot-unknown" if taken.lot >= 0 else "volume-of-what", self._lot_name(taken))
        molarity, missing = stock.molarity(form)
        if measures == "volume":
            if missing == "a strength":
                return Fault("lot-strength-missing", stock.lot)
            return ("taken", x / 1000.0 * molarity, v) if not missing else _needs("mL", missing)
        fraction = _fraction(stock, x)
        if fraction is None:
            return Fault("times-unclear", f"{x:g}x")
        if stock.unit is not None and stock.unit.measures == "times":
            return _needs("x", "what the stock was made as")
        return ("molar", molarity * fraction, float(np.hypot(v, v))) if not missing else _needs("x", missing)

    def _lot_name(self, taken: Taken) -> str:
        return self.resolver.lots.names()[taken.lot] if taken.lot >= 0 else ""

    # -- stocks made as batches -----------------------------------------------------------------------------------

    def _from_batch(self, line: int, taken: Taken, measures: str, x: float) -> list[Part] | Problem:
        """A stock that is itself a batch: its parts, diluted."""
        stock, L = taken.stock, self.lines
        assert stock is not None
        contents, problem = self._contents(stock)
        if problem is not None:
            return problem
        v = self.u_volume
        if measures == "volume":
            how, factor = "taken", x / 1000.0
        elif measures == "mass" and not np.isnan(stock.density):
            how, factor = "taken", x / stock.density / 1000.0
        elif measures == "times" and (fraction := _fraction(stock, x)) is not None:
            how, factor, v = "molar", fraction, float(np.hypot(v, v))
        else:
            form = self.resolver.catalogue.look_up(L.substance[line]).form
            inside = sum(c for p, c in contents if form is not None and p.form == form)
            if measures != "molar" or not inside:
                return self._problem(line, Fault("batch-stock-amount", self.stated(line)), L.column[line])
            how, factor, v = "molar", x / inside, float(np.hypot(v, v))
        names = self.resolver.catalogue.by_name
        parts = []
        for part, c in contents:
            own = self.resolver.lots.index(stock.lot, contents[0][0].form, stock)
            lot = part.lot if part.lot >= 0 or len(contents) > 1 else own
            chain = tuple(dict.fromkeys((*part.chain, own)))
            parts.append(
                Part(
                    line, part.form, lot, how, c * factor, anhydrous_mass(part.form, names), float(np.hypot(part.u, v)),
                    part.by_mass, chain,
                )
            )  # fmt: skip
        return parts

    def _contents(self, stock: Stock) -> tuple[list[tuple[Part, float]], Problem | None]:
        """Parts of a stock with their concentration [mol/L] in it."""
        key = (stock.lot, stock.batch)
        if key in self._stock:
            return self._stock[key]
        if stock.batch in self._open:
            cycle = " -> ".join([*self._open[self._open.index(stock.batch) :], stock.batch])
            return [], Problem("stock-cycle", stock.place, cycle)
        group = self.group_of_batch.get(stock.batch)
        if group is None:
            return [], Problem("stock-without-recipe", stock.place, stock.batch)
        self._open.append(stock.batch)
        mixture = self.mixture(self.by_group.get(group, []))
        self._open.pop()
        if mixture.problem is not None:
            return [], mixture.problem
        scale = 1.0
        if mixture.per_kg_water:
            if np.isnan(stock.density):
                words = (("name", "the density of the lot"),)
                return [], Problem("unit-needs", stock.place, "mol/kg", words)
            grams = sum(a * anhydrous_mass(p.form, self.resolver.catalogue.by_name) for p, a, _ in mixture.parts)
            scale = stock.density / (1.0 + grams / 1000.0)
        contents = [(Part(**{**p.__dict__, "u": u}), a * scale) for p, a, u in mixture.parts]
        self._stock[key] = contents, None
        return contents, None

    # -- one solution ---------------------------------------------------------------------------------------------

    def mixture(self, lines: Sequence[int]) -> Mixture:
        """All lines of one solution put together."""
        parts: list[Part] = []
        for line in lines:
            found = self.parts_of(line)
            if isinstance(found, Problem):
                return Mixture(problem=found)
            parts.extend(found)
        total, measure, problem = self._total(lines)
        if problem is not None:
            return Mixture(problem=problem)
        taken = [p for p in parts if p.how == "taken"]
        if taken and not measure:
            total, measure = self._added_up(lines, taken)
            if not measure:
                line = taken[0].line
                fault = Fault("made-up-to-missing", self.stated(line))
                return Mixture(problem=self._problem(line, fault, self.lines.column[line]))
        by_litre = any(p.how == "molar" for p in parts) or (bool(taken) and measure == "volume")
        by_mass = any(p.how in ("molal", "w") for p in parts) or (bool(taken) and measure == "mass")
        if by_litre and by_mass:
            line = next(p.line for p in parts if p.how in ("molal", "w") or p.how == "taken")
            return Mixture(
                problem=self._problem(line, Fault("litre-and-kilogram", self.stated(line)), self.lines.column[line])
            )
        if by_mass:
            return self._per_kilogram(parts, total)
        final = [
            (p, p.amount if p.how == "molar" else p.amount / (total / 1000.0), self._u(p, self.u_volume)) for p in parts
        ]
        return Mixture(False, final)

    def _u(self, part: Part, u_total: float) -> float:
        return float(np.hypot(part.u, u_total)) if part.how == "taken" else part.u

    def _per_kilogram(self, parts: list[Part], total: float) -> Mixture:
        """mol per kg of water: n / (mass of solution - mass of solutes); see the module for the symbols.

        Per kilogram of solution: solutes taken or stated by mass weigh s; solutes stated per kg of water weigh m per kg
        of water; water is then (1 - s) / (1 + m).
        """
        share = [p.amount / total * 1000.0 if p.how == "taken" else p.amount for p in parts]
        s = sum(a * p.solute for p, a in zip(parts, share, strict=True) if p.how in ("taken", "w")) / 1000.0
        m = sum(a * p.solute for p, a in zip(parts, share, strict=True) if p.how == "molal") / 1000.0
        water = (1.0 - s) / (1.0 + m)
        if water <= 0.0:
            line = parts[0].line
            return Mixture(
                problem=self._problem(line, Fault("no-water-left", self.stated(line)), self.lines.column[line])
            )
        final = []
        for part, a in zip(parts, share, strict=True):
            moles = a / part.form.molar_mass if part.how == "w" else a
            final.append((part, moles if part.how == "molal" else moles / water, self._u(part, self.u_weighing)))
        return Mixture(True, final)

    def _total(self, lines: Sequence[int]) -> tuple[float, str, Problem | None]:
        """What a solution is made up to, in mL or g: one value, from its lines or a water line q.s. to."""
        L = self.lines
        total, measure, where = np.nan, "", -1
        for line in lines:
            value, kind, column = float(L.total[line]), L.total_measure[line], L.total_column[line]
            if L.special[line] == "fill" and not np.isnan(L.value[line]):
                unit = self._units[L.unit[line]]
                if L.problem[line] is not None:
                    return np.nan, "", L.problem[line]
                if unit is None or unit.measures not in ("volume", "mass"):
                    code = "unit-unknown" if unit is not None else "unit-missing"
                    return (
                        np.nan,
                        "",
                        self._problem(line, Fault(code, f"{L.value[line]:g} {L.unit[line]}".strip()), L.column[line]),
                    )
                value, kind, column = float(L.value[line]) * unit.factor, unit.measures, L.column[line]
            if not kind:
                continue
            if measure and (kind != measure or abs(value - total) > 1e-9 * total) and self._same_step(line, where):
                names = [amount_words(x, "mL" if k == "volume" else "g") for x, k in ((total, measure), (value, kind))]
                return (
                    np.nan,
                    "",
                    self._problem(line, Fault("made-up-to-differs", names[0], (("name", names[1]),)), column),
                )
            total, measure, where = value, kind, line
        if measure and total <= 0.0:
            return np.nan, "", self._problem(where, Fault("made-up-to-missing", "0"), L.total_column[where])
        return total, measure, None

    def _same_step(self, one: int, other: int) -> bool:
        return bool(self.lines.step[one] == self.lines.step[other])

    def _added_up(self, lines: Sequence[int], taken: list[Part]) -> tuple[float, str]:
        """Mass of a solution whose every line is weighed and whose water is stated; (NaN, "") otherwise."""
        L, mass = self.lines, 0.0
        has_water = False
        for line in lines:
            unit = self._units[L.unit[line]]
            if np.isnan(L.value[line]) or unit is None:
                continue
            water = self.resolver.taken(L.substance[line], L.lot[line], unit.measures).water
            if unit.measures == "mass":
                mass += L.value[line] * unit.factor
            elif unit.measures == "volume" and water:
                mass += L.value[line] * unit.factor * WATER_DENSITY_20
            elif unit.measures in QUANTITIES:
                return np.nan, ""
            has_water |= water
        return (mass, "mass") if has_water else (np.nan, "")


def _needs(unit: str, missing: str) -> Fault:
    return Fault("unit-needs", unit, (("name", missing),))


def _fraction(stock: Stock, times: float) -> float | None:
    """Share of a stock in the final solution: "1x" of a stock of strength 10x, or "10x" of any other, is a tenth."""
    if stock.unit is not None and stock.unit.measures == "times":
        fraction = times / (stock.strength * stock.unit.factor)
    else:
        fraction = 1.0 / times
    return fraction if 0.0 < fraction <= 1.0 else None


def anhydrous_mass(form: Form, by_name: dict[str, Form]) -> float:
    """Grams of solute that a mole brings; the water of a hydrate joins the solvent [g/mol]."""
    base = by_name.get(form.hydrate_of)
    return base.molar_mass if base is not None and base.acid_units == form.acid_units else form.molar_mass


__all__ = ["CONCENTRATIONS", "Composer", "Mixture", "Part", "anhydrous_mass"]
