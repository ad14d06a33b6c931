"""What a recipe line takes: the substance it names, the lot it comes from, and how much a litre or gram of it holds."""

from __future__ import annotations

import re
from dataclasses import dataclass, field

import numpy as np

from reconcile.importer.cells import Fault, decimal_mark, number_of
from reconcile.importer.stocks import Stock, StockRoom, substance_fault
from reconcile.importer.unpredictable import unpredictable
from reconcile.records.places import Place
from reconcile.records.substances import Catalogue, Form, name_key
from reconcile.records.units import find_unit

_STRENGTH_FIRST = re.compile(r"([\d.,]+)\s*(%\s*\(?w/[vw]\)?|[^\W\d_][\w/]*)\s+(?:of\s+)?(.+)", re.DOTALL)
_STRENGTH_LAST = re.compile(r"(.+?)[\s,(]+([\d.,]+)\s*(%\s*\(?w/[vw]\)?|[^\W\d_][\w/]*)\)?", re.DOTALL)
WATER = "water"
WATER_NAMES = {
    name_key(w)
    for w in (
        "water", "purified water", "deionised water", "deionized water", "distilled water", "ultrapure water",
        "water for injection", "wfi", "di water", "h2o", "dh2o", "ddh2o", "process water", "high purity water",
        "water blank", "blank water", "blank (water)",
    )
}  # fmt: skip


@dataclass(frozen=True)
class Taken:
    """One (substance, lot) pair of the recipes.

    form : None for water, for a declared substance without effect, and for a stock that is itself a batch
    lot : index of the lot, -1 when none is named; stock : its row of a Stocks sheet, or a strength written in the name
    fault, fault_place : why it cannot be used; the place is given where it is not the recipe's own cell
    """

    form: Form | None
    lot: int = -1
    stock: Stock | None = None
    water: bool = False
    without_effect: bool = False
    fault: Fault | None = None
    fault_place: Place | None = None


@dataclass
class LotList:
    """Lots in order of first use, each one bottle with one form."""

    keys: dict[tuple[str, str], int] = field(default_factory=dict)
    forms: list[Form] = field(default_factory=list)
    stocks: list[Stock | None] = field(default_factory=list)

    def index(self, lot: str, form: Form, stock: Stock | None) -> int:
        key = (lot, form.name)
        if key not in self.keys:
            self.keys[key] = len(self.forms)
            self.forms.append(form)
            self.stocks.append(stock)
        return self.keys[key]

    def names(self) -> list[str]:
        """Lot names; "name (substance)" where one lot name stands for two substances."""
        counts: dict[str, int] = {}
        for lot, _ in self.keys:
            counts[lot] = counts.get(lot, 0) + 1
        return [lot if counts[lot] == 1 else f"{lot} ({form})" for lot, form in self.keys]


class Resolver:
    """Answers for (substance, lot) pairs, each worked out once."""

    def __init__(self, catalogue: Catalogue, room: StockRoom, without_effect: tuple[str, ...]) -> None:
        self.catalogue, self.room = catalogue, room
        self.without_effect = {name_key(n) for n in without_effect}
        self.lots = LotList()
        self.used_without_effect: dict[str, None] = {}
        self._known: dict[tuple[str, str, str], Taken] = {}

    def taken(self, substance: str, lot: str, measures: str) -> Taken:
        """What a line takes; `measures` is the kind of unit in which it is stated."""
        key = (substance, lot, measures)
        if key not in self._known:
            self._known[key] = self._resolve(substance, lot, measures)
        return self._known[key]

    def _resolve(self, substance: str, lot: str, measures: str) -> Taken:
        if name_key(substance) in WATER_NAMES:
            return Taken(None, water=True)
        if substance and name_key(substance) in self.without_effect:
            self.used_without_effect[substance] = None
            return Taken(None, without_effect=True)
        stocks = self.room.by_lot.get(lot, []) if lot else []
        made = next((s for s in stocks if s.batch), None)
        if made is not None:
            if made.problem is not None:
                return Taken(None, fault=_rest(made), fault_place=made.problem.place)
            return Taken(None, stock=made)
        form, own, fault = self._substance(substance, lot)
        if form is None and stocks and substance:
            several = self.catalogue.look_up(substance).several
            form = next((s.form for s in stocks if s.form in several), None)  # "EDTA" of a lot whose label says more
        if not substance and len(stocks) == 1 and stocks[0].form is not None:
            form, fault = stocks[0].form, None
        if form is None:
            if not substance and lot and not stocks:
                return Taken(None, fault=Fault("lot-unknown", lot))
            if not substance and len(stocks) > 1:
                return Taken(None, fault=Fault("substance-missing", ""))
            return Taken(None, fault=fault)
        if form.name == WATER:
            return Taken(None, water=True)
        stock = next((s for s in stocks if s.form == form), None)
        if stock is None and stocks:
            other = next((s for s in stocks if s.form is not None), None)
            amount_is_fixed = measures in ("molar", "molal", "normal", "mol")
            if other is not None and amount_is_fixed and other.form is not None and other.form.acts_as == form.acts_as:
                stock, form = other, other.form
            elif other is not None and other.form is not None:
                return Taken(None, fault=Fault("lot-other-substance", lot, (("name", other.form.name),)))
            else:
                stock = stocks[0]
        if stock is not None and stock.problem is not None:
            return Taken(None, fault=_rest(stock), fault_place=stock.problem.place)
        index = self.lots.index(lot, form, stock) if lot else -1
        return Taken(form, index, stock if stock is not None else own)

    def _substance(self, text: str, lot: str) -> tuple[Form | None, Stock | None, Fault | None]:
        """Form of a name, with the strength that the name itself carries ("0.1 M NaOH")."""
        if not text:
            return None, None, Fault("substance-missing", "")
        found = self.catalogue.look_up(text)
        if found.form is not None:
            return found.form, None, None
        for pattern, order in ((_STRENGTH_FIRST, (1, 2, 3)), (_STRENGTH_LAST, (2, 3, 1))):
            match = pattern.fullmatch(text)
            if match is None:
                continue
            number, unit, name = (match.group(k).strip() for k in order)
            value, measured = number_of(number, decimal_mark([number], "auto")), find_unit(unit)
            inner = self.catalogue.look_up(name)
            if value is not None and measured is not None and inner.form is not None:
                nan = np.nan
                return (
                    inner.form,
                    Stock(lot, inner.form, "", value[0], measured, nan, nan, nan, nan, -1, Place("")),
                    None,
                )
        if not found.several and (code := unpredictable(text)):
            return None, None, Fault(code, text, (("bare", text),))
        return None, None, substance_fault(text, found.near, found.several)


def _rest(stock: Stock) -> Fault:
    """A bad stock row, as the fault of a line that rests on it."""
    assert stock.problem is not None
    return Fault(stock.problem.code, stock.problem.read, stock.problem.words)
