"""From the lines of one solution to what it holds: mol per litre, or mol per kilogram of water."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace

import numpy as np

from reconcile.importer.cells import Fault
from reconcile.importer.line_parts import Basis, LineReader, Part, anhydrous_mass, fraction_of
from reconcile.importer.open_amounts import (
    OpenList,
    adjusting_parts,
    counter_parts,
    is_open,
    of_adjusted_stock,
    settled_contents,
)
from reconcile.importer.stocks import Stock
from reconcile.importer.totals import added_up, total_of
from reconcile.importer.unpredictable import MOST_SOLVENT
from reconcile.records.problems import Problem
from reconcile.records.units import UNITS


@dataclass
class Mixture:
    """One solution composed: (part, final amount, its relative u), or the problem that prevents it."""

    per_kg_water: bool = False
    parts: list[tuple[Part, float, float]] = field(default_factory=list)
    problem: Problem | None = None
    without_effect: bool = False


class Composer:
    """Composes recipes; stocks made as batches are composed on the way, each once."""

    def __init__(self, reader: LineReader) -> None:
        self.reader = reader
        self.lines, self.resolver = reader.lines, reader.resolver
        self.by_group: dict[int, list[int]] = {}
        for i, group in enumerate(self.lines.group.tolist()):
            self.by_group.setdefault(group, []).append(i)
        self.group_of_batch: dict[str, int] = {}
        self.batch_names: Sequence[str] = ()
        self.open = OpenList()
        self._stocks: dict[tuple[str, str], list[tuple[Part, float]] | Problem] = {}
        self._open: list[str] = []
        self.per_kilo: set[str] = set()
        """Stocks that were weighed together and have no density: what a gram of them holds is known all the same."""

    def fault(self, line: int, code: str, **words: str) -> Problem:
        """A fault of a line's amount, quoting it as stated."""
        fault = Fault(code, self.reader.stated(line), tuple(words.items()))
        return self.reader.problem(line, fault, self.lines.column[line])

    def parts_of(self, line: int) -> list[Part] | Problem:
        """What one line brings."""
        found = self.reader.plain_part(line)
        if found is None:
            return []
        if isinstance(found, Part):
            return [found]
        if isinstance(found, Problem):
            return found
        stock = found.taken.stock
        if stock is not None and stock.batch:
            return self._from_batch(line, stock)
        if stock is not None and stock.adjusted and found.form is not None:
            return of_adjusted_stock(self, line, found)
        if found.form is not None:
            return [self.reader.part_of(line, found)]
        return self._multiple(line, found)

    def batch_of(self, line: int) -> str:
        """Batch whose recipe a line belongs to."""
        group = int(self.lines.group[line])
        return self.batch_names[group] if 0 <= group < len(self.batch_names) else ""

    def _multiple(self, line: int, basis: Basis) -> list[Part] | Problem:
        """A line such as "10x" of a stock of one substance."""
        taken, stock = basis.taken, basis.taken.stock
        fraction = fraction_of(stock, float(self.lines.value[line])) if stock is not None else None
        if stock is None or taken.form is None or fraction is None:
            return self.fault(line, "times-unclear")
        if stock.unit is not None and stock.unit.measures == "times":
            return self.fault(line, "unit-needs", name="what the stock was made as, with its recipe")
        molarity, missing = stock.molarity(taken.form)
        if missing:
            return self.fault(line, "unit-needs", name=missing)
        u = float(np.hypot(self.reader.u_volume, self.reader.u_volume))
        chain = (taken.lot,) if taken.lot >= 0 else ()
        solute = anhydrous_mass(taken.form, self.resolver.catalogue.by_name)
        part = Part(line, taken.form, taken.lot, "molar", molarity * fraction, solute, u, False, chain)
        return [part, *(counter_parts(self, part, stock, molarity) if stock.adjusted else ())]

    # -- stocks made as batches -----------------------------------------------------------------------------------

    def _from_batch(self, line: int, stock: Stock) -> list[Part] | Problem:
        """A stock that is itself a batch: its parts, diluted."""
        contents = self.contents(stock)
        if isinstance(contents, Problem):
            return contents
        L, u = self.lines, self.reader.u_volume
        unit = UNITS[L.unit[line]]
        if stock.lot in self.per_kilo and unit.measures != "mass":
            return Problem("unit-needs", stock.place, "mol/kg", (("name", "the density of the lot"),))
        x, twice = float(L.value[line]) * unit.factor, float(np.hypot(u, u))
        if unit.measures == "volume":
            how, factor = "taken", x / 1000.0
        elif unit.measures == "mass" and not (np.isnan(stock.density) and stock.lot not in self.per_kilo):
            how, factor = "taken", x / (1.0 if stock.lot in self.per_kilo else stock.density) / 1000.0
        elif unit.measures == "times" and (fraction := fraction_of(stock, x)) is not None:
            how, factor, u = "molar", fraction, twice
        else:
            form = self.resolver.catalogue.look_up(L.substance[line]).form
            inside = sum(c for p, c in contents if form is not None and p.form == form and p.open < 0)
            if unit.measures != "molar" or not inside:
                return self.fault(line, "batch-stock-amount")
            how, factor, u = "molar", x / inside, twice
        names, parts = self.resolver.catalogue.by_name, []
        for part, c in contents:
            own = self.resolver.lots.index(stock.lot, contents[0][0].form, stock)
            parts.append(
                replace(
                    part,
                    line=line,
                    lot=part.lot if part.lot >= 0 or len(contents) > 1 else own,
                    how=how,
                    amount=c * factor,
                    solute=anhydrous_mass(part.form, names),
                    u=float(np.hypot(part.u, u)),
                    chain=tuple(dict.fromkeys((*part.chain, own))),
                )
            )
        return parts

    def contents(self, stock: Stock) -> list[tuple[Part, float]] | Problem:
        """Parts of a stock with their concentration [mol/L] in it; [mol/kg] of it where its lot is in per_kilo."""
        key = (stock.lot, stock.batch)
        if key in self._stocks:
            return self._stocks[key]
        if stock.batch in self._open:
            cycle = " -> ".join([*self._open[self._open.index(stock.batch) :], stock.batch])
            return Problem("stock-cycle", stock.place, cycle)
        group = self.group_of_batch.get(stock.batch)
        if group is None:
            return Problem("stock-without-recipe", stock.place, stock.batch)
        self._open.append(stock.batch)
        mixture = self.mixture(self.by_group.get(group, []))
        self._open.pop()
        if mixture.problem is not None:
            return mixture.problem
        scale = 1.0
        if mixture.per_kg_water:
            grams = sum(a * anhydrous_mass(p.form, self.resolver.catalogue.by_name) for p, a, _ in mixture.parts)
            scale = (1.0 if np.isnan(stock.density) else stock.density) / (1.0 + grams / 1000.0)
            if np.isnan(stock.density):
                self.per_kilo.add(stock.lot)
        contents = settled_contents(self, stock, [(replace(p, u=u), a * scale) for p, a, u in mixture.parts])
        self._stocks[key] = contents
        return contents

    # -- one solution ---------------------------------------------------------------------------------------------

    def mixture(self, lines: Sequence[int]) -> Mixture:
        """All lines of one solution put together."""
        L = self.lines
        parts: list[Part] = []
        adjusting = [line for line in lines if self.leaves_open(line)]
        for line in lines:
            if line in adjusting:
                continue
            found = self.parts_of(line)
            if isinstance(found, Problem):
                return Mixture(problem=found)
            parts.extend(found)
        total, measure, problem = total_of(self, lines)
        if problem is not None:
            return Mixture(problem=problem)
        if not measure and any(p.how == "taken" for p in parts):
            total, measure = added_up(self, lines)
        by_mass = any(p.how in ("molal", "w") for p in parts) or measure == "mass"
        for line in adjusting:
            found = adjusting_parts(self, line, measure, by_mass)
            if isinstance(found, Problem):
                return Mixture(problem=found)
            parts.extend(found)
        declared = any(self.reader.basis(L.substance[i], L.lot[i], L.unit[i]).taken.without_effect for i in lines)
        taken = [p for p in parts if p.how == "taken"]
        if taken and not measure:
            return Mixture(problem=self.fault(taken[0].line, "made-up-to-missing"))
        by_litre = any(p.how == "molar" for p in parts) or (bool(taken) and measure == "volume")
        by_mass = any(p.how in ("molal", "w") for p in parts) or (bool(taken) and measure == "mass")
        if by_litre and by_mass:
            line = next(p.line for p in parts if p.how != "molar")
            return Mixture(problem=self.fault(line, "litre-and-kilogram"))
        if by_mass:
            return self._in_water(replace(self.per_kilogram(parts, total), without_effect=declared))
        u = self.reader.u_volume
        whole = Mixture(
            False,
            [
                (p, p.amount, p.u) if p.how == "molar" else (p, p.amount / (total / 1000.0), float(np.hypot(p.u, u)))
                for p in parts
            ],
            without_effect=declared,
        )
        return self._in_water(whole)

    def _in_water(self, mixture: Mixture) -> Mixture:
        """The mixture, or the problem that it holds more of another solvent than leaves it a solution in water."""
        for part, amount, _ in mixture.parts:
            grams = amount * part.form.molar_mass
            if grams > MOST_SOLVENT.get(part.form.name, np.inf):
                words = (("bare", part.form.name),)
                fault = Fault("solvent-mixed", f"{part.form.name}, {grams:.3g} g/L", words)
                return Mixture(problem=self.reader.problem(part.line, fault, self.lines.column[part.line]))
        return mixture

    def leaves_open(self, line: int) -> bool:
        """Whether a line adds something until a pH is reached."""
        L = self.lines
        if L.problem[line] is not None or not is_open(L.special[line], float(L.value[line])):
            return False
        return not self.reader.basis(L.substance[line], L.lot[line], L.unit[line]).nothing

    def per_kilogram(self, parts: list[Part], total: float) -> Mixture:
        """mol per kg of water.

        Per kilogram of solution: solutes taken or stated by mass weigh s [kg]; solutes stated per kg of water weigh m
        per kg of water; the water is then (1 - s) / (1 + m).
        """
        share = [p.amount / total * 1000.0 if p.how == "taken" else p.amount for p in parts]
        s = sum(a * p.solute for p, a in zip(parts, share, strict=True) if p.how != "molal") / 1000.0
        m = sum(a * p.solute for p, a in zip(parts, share, strict=True) if p.how == "molal") / 1000.0
        water = (1.0 - s) / (1.0 + m)
        if water <= 0.0:
            return Mixture(problem=self.fault(parts[0].line, "no-water-left"))
        final = []
        for part, a in zip(parts, share, strict=True):
            moles = a / part.form.molar_mass if part.how == "w" else a
            u = float(np.hypot(part.u, self.reader.u_weighing)) if part.how == "taken" else part.u
            final.append((part, moles if part.how == "molal" else moles / water, u))
        return Mixture(True, final)
