"""Amounts left to a pH: "as needed", "to pH 7.4", and the counter-ion of a stock that was adjusted to a stated pH."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING

import numpy as np

from reconcile.importer.cells import Fault
from reconcile.importer.line_parts import Basis, Part
from reconcile.importer.resolve import Taken
from reconcile.importer.stocks import Stock
from reconcile.records.adjusting import OpenAmounts
from reconcile.records.arrays import AnyArray, TextArray
from reconcile.records.places import Place
from reconcile.records.problems import Problem
from reconcile.records.substances import Form

if TYPE_CHECKING:
    from reconcile.importer.compose import Composer

_EITHER = re.compile(r"\s*/\s*|\s+(?:or|and/or)\s+", re.IGNORECASE)
ACID, BASES = "hydrochloric acid", {"K+": "potassium hydroxide", "Na+": "sodium hydroxide"}
"""Counter-ions inferred: chloride of a base, sodium of an acid, potassium where the label holds potassium."""
Content = tuple[Form, float, int]
"""Form, its concentration [mol/L], and the open amount that scales it (-1: none)."""


@dataclass
class OpenRow:
    """One open amount; fields as in OpenAmounts. parts: what the stock that it belongs to holds."""

    batch: str
    stock: str
    substance: str
    lot: str
    unit: str
    step: str
    choice: int
    stated_ph: float
    stated_at: float
    place: Place
    parts: list[Content] = field(default_factory=list)

    @property
    def stated(self) -> bool:
        return bool(self.parts) and not np.isnan(self.stated_ph)


@dataclass
class OpenList:
    """Open amounts in order of being met, those that others rest on first."""

    rows: list[OpenRow] = field(default_factory=list)
    _known: dict[tuple[object, ...], int] = field(default_factory=dict)

    def index(self, key: tuple[object, ...], row: OpenRow) -> int:
        """Number of an open amount, the same for the same key."""
        if key not in self._known:
            self._known[key] = len(self.rows)
            self.rows.append(row)
        return self._known[key]


def is_open(special: str, value: float) -> bool:
    """Whether an amount is left to a pH; "q.s." of something is, "q.s. to 1 L" of it is not."""
    return special == "adjust" or (special == "fill" and bool(np.isnan(value)))


def titrants(composer: Composer, line: int) -> list[tuple[str, Taken]] | Problem:
    """What an adjusting line may add: one substance, or an acid or a base ("HCl or NaOH")."""
    L, resolver = composer.lines, composer.resolver
    text, lot = L.substance[line], L.lot[line]
    taken = resolver.taken(text, lot, "volume")
    found = [(text, taken)]
    if taken.fault is not None and taken.fault.code == "substance-unknown":
        apart = [(name, resolver.taken(name, "", "volume")) for name in _EITHER.split(text) if name.strip()]
        if len(apart) > 1 and all(one.fault is None for _, one in apart):
            found = apart
    for _, one in found:
        if one.fault is not None:
            if one.fault_place is not None:
                return Problem(one.fault.code, one.fault_place, one.fault.read, one.fault.words)
            return composer.reader.problem(line, one.fault, L.substance_column[line])
    return [(text, one) for text, one in found if not one.water and not one.without_effect]


def adjusting_parts(composer: Composer, line: int, measure: str, by_mass: bool) -> list[Part] | Problem:
    """Parts of an adjusting line, each for one unit of its open amount.

    In mL where the titrant is a solution of known strength, in g where it is a solid and the solution is made up to a
    total; else as a final concentration.
    """
    L = composer.lines
    found = titrants(composer, line)
    if isinstance(found, Problem):
        return found
    parts: list[Part] = []
    for name, taken in found:
        one = _unit_parts(composer, line, taken, measure, by_mass)
        if isinstance(one, Problem):
            return one
        unit, some = one
        batch = composer.batch_of(line)
        stated = float(L.value[line]) if L.special[line] == "adjust" else np.nan
        place = composer.reader.place(line, L.column[line])
        row = OpenRow(batch, "", name, L.lot[line], unit, L.step[line], line, stated, np.nan, place)
        k = composer.open.index((line, name, unit), row)
        parts += [replace(part, open=k) for part in some]
    return parts


def _unit_parts(
    composer: Composer, line: int, taken: Taken, measure: str, by_mass: bool
) -> tuple[str, list[Part]] | Problem:
    """Unit of an open amount, and the parts that one unit of it brings."""
    chain = (taken.lot,) if taken.lot >= 0 else ()
    stock = taken.stock
    if stock is not None and stock.batch:
        contents = composer.contents(stock)
        if isinstance(contents, Problem):
            return contents
        if stock.lot in composer.per_kilo:
            return Problem("unit-needs", stock.place, "mol/kg", (("name", "the density of the lot"),))
        if any(part.open >= 0 for part, _ in contents):
            return _unwritten(composer, line)
        how, unit = ("taken", "mL") if measure else ("molar", "mL/L")
        return unit, [replace(p, line=line, how=how, amount=c / 1000.0, solute=0.0, u=0.0) for p, c in contents]
    assert taken.form is not None

    def part(how: str, amount: float) -> list[Part]:
        return [Part(line, taken.form, taken.lot, how, amount, 0.0, 0.0, False, chain)]  # type: ignore[arg-type]

    if stock is not None and stock.adjusted:
        return _unwritten(composer, line)
    molarity = stock.molarity(taken.form)[0] if stock is not None else np.nan
    if measure and not np.isnan(molarity):
        return "mL", part("taken", molarity / 1000.0)
    if measure and stock is None and not taken.form.usual_liquid:
        return "g", part("taken", 1.0 / taken.form.molar_mass)
    return ("mol/kg", part("molal", 1.0)) if by_mass else ("mol/L", part("molar", 1.0))


def _unwritten(composer: Composer, line: int) -> Problem:
    fault = Fault("adjustment-unwritten", "as needed")
    return composer.reader.problem(line, fault, composer.lines.column[line])


# -- stocks that were adjusted to a pH ------------------------------------------------------------------------------


def counter_ions(composer: Composer, stock: Stock, contents: Sequence[Content], unit: str) -> list[tuple[int, Form]]:
    """Open amounts of the counter-ion of an adjusted stock, and the form of each: an acid, a base, or either.

    A label with chloride holds as much chloride as its pH asks for, be it less than the label's own.
    """
    names = composer.resolver.catalogue.by_name
    ions = {ion for form, _, _ in contents for ion in form.strong_ions}
    choices = [ACID] if "Cl-" in ions else [BASES["K+"] if "K+" in ions else BASES["Na+"], ACID]
    first = len(composer.open.rows)
    found = []
    for name in choices:
        row = OpenRow("", stock.lot, name, "", unit, "", 0, stock.adjusted_to, stock.adjusted_at, stock.place)
        k = composer.open.index(("counter-ion", stock.lot, stock.batch, name), row)
        row = composer.open.rows[k]
        if k >= first:
            row.choice = -1 - first  # lines of recipes have numbers from 0 on
        per_unit = contents[0][1] if unit == "mol/mol" else 1.0
        row.parts = [*contents, (names[name], per_unit, k)]
        found.append((k, names[name]))
    return found


def of_adjusted_stock(composer: Composer, line: int, basis: Basis) -> list[Part] | Problem:
    """A line that takes a stock solution of one substance that was adjusted to a pH: the substance, its counter-ion."""
    form, stock = basis.form, basis.taken.stock
    assert form is not None
    assert stock is not None
    molarity, missing = stock.molarity(form)
    if missing:
        fault = Fault("unit-needs", composer.lines.unit[line], (("name", missing),))
        return composer.reader.problem(line, fault, composer.lines.column[line])
    main = composer.reader.part_of(line, basis)
    return [main, *counter_parts(composer, main, stock, molarity)]


def counter_parts(composer: Composer, main: Part, stock: Stock, molarity: float) -> list[Part]:
    """Parts of the counter-ion beside a part of an adjusted stock of one substance."""
    parts = []
    for k, form in counter_ions(composer, stock, [(main.form, molarity, -1)], "mol/mol"):
        scale = form.molar_mass / main.form.molar_mass if main.how == "w" else 1.0
        amount = main.amount * scale
        parts.append(replace(main, form=form, amount=amount, solute=0.0, u=0.0, by_mass=False, open=k))
    return parts


def settled_contents(composer: Composer, stock: Stock, parts: list[tuple[Part, float]]) -> list[tuple[Part, float]]:
    """Contents of a stock made as a batch, with what its pH says about the amounts that its recipe leaves open."""
    contents = [(part.form, c, part.open) for part, c in parts]
    own = {p.open for p, _ in parts if p.open >= 0 and composer.open.rows[p.open].batch == stock.batch}
    for k in sorted(own):
        row = composer.open.rows[k]
        row.stock, row.parts = stock.lot, contents
        if not np.isnan(stock.adjusted_to):
            row.stated_ph, row.stated_at = stock.adjusted_to, stock.adjusted_at
    titrated = any(not form.acids and ("H+" in form.ions or "OH-" in form.ions) for form, _, _ in contents)
    if own or titrated or np.isnan(stock.adjusted_to) or not parts:
        return parts
    extra = []
    for k, form in counter_ions(composer, stock, contents, "mol/L"):
        part = replace(parts[0][0], form=form, lot=-1, solute=0.0, u=0.0, by_mass=False, chain=(), open=k)
        extra.append((part, 1.0))
    return [*parts, *extra]


def unsettled(composer: Composer, opens: Sequence[int], read_batches: set[str]) -> Problem | None:
    """Why a solution cannot be known: it holds an open amount that no reading and no stated pH settles."""
    for k in opens:
        row = composer.open.rows[k]
        if not row.stated and row.batch not in read_batches:
            return Problem("adjustment-unwritten", row.place, "as needed")
    return None


def open_amounts(
    composer: Composer, contribution: AnyArray, owner: AnyArray, per_unit: AnyArray, forms: dict[Form, int]
) -> OpenAmounts:
    """The arrays of BatchRecords; forms that only a stock holds are added to `forms`."""
    rows = composer.open.rows
    parts = [(k, *part) for k, row in enumerate(rows) if row.stated for part in row.parts]

    def texts(name: str) -> TextArray:
        out: AnyArray = np.empty(len(rows), object)
        out[:] = [getattr(row, name) for row in rows]
        return out

    def numbers(name: str) -> AnyArray:
        return np.array([getattr(row, name) for row in rows], np.float64)

    return OpenAmounts(
        batch=texts("batch"), stock=texts("stock"), substance=texts("substance"), lot=texts("lot"),
        unit=texts("unit"), step=texts("step"), choice=np.array([row.choice for row in rows], np.intp),
        stated_ph=numbers("stated_ph"), stated_at=numbers("stated_at"), place=tuple(row.place for row in rows),
        contribution=contribution, owner=owner, per_unit=per_unit,
        part_owner=np.array([k for k, *_ in parts], np.intp),
        part_form=np.array([forms.setdefault(form, len(forms)) for _, form, _, _ in parts], np.intp),
        part_amount=np.array([c for *_, c, _ in parts], np.float64),
        part_open=np.array([k for *_, k in parts], np.intp),
    )  # fmt: skip
