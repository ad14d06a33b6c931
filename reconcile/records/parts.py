"""Parts of a solution in words: "25 mL of 0.1 M sodium hydroxide", and what they come to once made up."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

from reconcile.records.places import Place
from reconcile.records.problems import InputProblems, Problem
from reconcile.records.substances import Catalogue, Form, catalogue
from reconcile.records.units import UNITS, Unit, find_unit

_NUMBER = re.compile(r"\s*(\d+(?:\.\d+)?(?:[eE][+-]?\d+)?)(?![.,]?\d)\s*")
_DENSITY = re.compile(r"\s*,\s*(\d+(?:\.\d+)?)\s*(?:g/mL|kg/L|g/cm3)\s*$")
_TAKEN = ("mass", "volume", "mol")
_STRENGTH = ("molar", "molal", "normal", "mass_volume", "mass_mass")
_TEMPERATURE = re.compile(r"([+-]?\d+(?:\.\d+)?)\s*(?:(?:°|º|deg)?\s*C)?")
_LONGEST_UNIT = max(len(spelling.split()) for spelling in UNITS)


@dataclass(frozen=True)
class Part:
    """One part of a solution, as stated.

    text : as written
    form : the form of the substance named
    amount, unit : a final concentration, or a quantity taken
    strength, strength_unit : of the stock solution the quantity was taken from; None for the substance itself
    density : of that stock solution [g/mL]; None when unsaid
    """

    text: str
    form: Form
    amount: float
    unit: Unit
    strength: float | None = None
    strength_unit: Unit | None = None
    density: float | None = None

    @property
    def taken(self) -> bool:
        """True for a quantity taken, which needs a total; False for a final concentration."""
        return self.unit.measures in _TAKEN


@dataclass(frozen=True)
class Composition:
    """Parts once made up: one amount a part.

    amounts : final concentration of each part's form, in `unit`
    unit : "mol/L" (litre of solution) or "mol/kg" (kilogram of water)
    total : what the quantities were made up to, as written; "" when every part is a final concentration
    """

    parts: tuple[Part, ...]
    amounts: tuple[float, ...]
    unit: str
    total: str = ""


def _refuse(code: str, read: str, where: str = "", **words: str) -> InputProblems:
    return InputProblems([Problem(code, Place(where), read, tuple(words.items()))])


def _leading_unit(text: str) -> tuple[Unit | None, str]:
    """The unit at the start of a text, the longest that fits, and what follows it."""
    ends = [m.end() for m in re.finditer(r"\S+", text)][:_LONGEST_UNIT]
    for end in reversed(ends):
        unit = find_unit(text[:end])
        if unit:
            return unit, text[end:].strip()
    return None, text


def _amount(text: str) -> tuple[float, Unit, str] | None:
    """Number and unit at the start of a text, and what follows them; None when it does not start so."""
    number = _NUMBER.match(text)
    if not number:
        return None
    unit, rest = _leading_unit(text[number.end() :])
    return (float(number.group(1)), unit, rest) if unit else None


def _without_of(text: str) -> str:
    return re.sub(r"^of\s+", "", text, flags=re.IGNORECASE)


def _form(name: str, text: str, known: Catalogue) -> Form:
    found = known.look_up(name)
    if found.form:
        return found.form
    if found.several:
        raise _refuse("substance-ambiguous", name, text, several=" or ".join(f.name for f in found.several))
    near = f"; the nearest names are {', '.join(found.near)}" if found.near else ""
    raise _refuse("substance-unknown", name, text, near=near)


def parse_part(text: str, known: Catalogue | None = None) -> Part:
    """One part of a solution, from its words.

    text : an amount, a unit and a substance ("0.1 M acetic acid", "2.05 g sodium acetate trihydrate"), or a quantity
        of a stock solution ("25 mL of 0.1 M sodium hydroxide"; "5 mL of 37 % w/w HCl, 1.18 g/mL")
    known : the substances known; the library when None

    Raises InputProblems when the text cannot be read so, or the substance is unknown or ambiguous.
    """
    density = _DENSITY.search(text)
    body = text[: density.start()] if density else text
    first = _amount(body)
    if not first:
        raise _refuse("part-unit" if _NUMBER.match(body) else "part-unreadable", text)
    amount, unit, rest = first
    rest, stock = _without_of(rest), None
    if unit.measures in ("mass", "volume"):
        stock = _amount(rest)
        if stock:
            rest = _without_of(stock[2])
    for one in (unit, stock[1] if stock else unit):
        if one.measures == "percent":
            raise _refuse("unit-percent", text)
    if not rest:
        raise _refuse("part-unreadable", text)
    if unit.measures not in (*_TAKEN, *_STRENGTH) or (stock and stock[1].measures not in _STRENGTH):
        raise _refuse("part-unreadable", text)
    form = _form(rest, text, known or catalogue())
    if unit.measures == "volume" and not stock:
        usual = f"It is usually sold as {form.usual_liquid}." if form.usual_liquid else ""
        raise _refuse("part-strength-missing", text, name=form.name, usual=usual)
    return Part(
        text.strip(),
        form,
        amount,
        unit,
        stock[0] if stock else None,
        stock[1] if stock else None,
        float(density.group(1)) if density else None,
    )


def parse_total(text: str) -> tuple[float, str]:
    """What parts are made up to: (litres, "volume") or (kilograms of solution, "mass"); raises InputProblems."""
    found = _amount(text)
    if not found or found[2] or found[1].measures not in ("volume", "mass") or not found[0]:
        raise _refuse("total-unreadable", text)
    return found[0] * found[1].factor / 1000.0, found[1].measures


def parse_temperature(text: str) -> float:
    """A temperature in words, "20" or "20 °C", as a number [°C]; raises InputProblems."""
    found = _TEMPERATURE.fullmatch(text.strip().replace("\u2212", "-"))
    if not found:
        raise _refuse("at-unreadable", text)
    return float(found.group(1))


def _solute(part: Part, number: float, unit: Unit) -> tuple[float, str]:
    """Amount of the form in one litre or kilogram: (mol, "litre" | "kilogram" | "kilogram water")."""
    value, form = number * unit.factor, part.form
    if unit.measures == "molar":
        return value, "litre"
    if unit.measures == "molal":
        return value, "kilogram water"
    if unit.measures == "mass_volume":
        return value / form.molar_mass, "litre"
    if unit.measures == "mass_mass":
        return value / form.molar_mass, "kilogram"
    if not form.equivalents:
        raise _refuse(
            "unit-needs", unit.name, part.text, name="a substance with protons, hydroxides or charge to count"
        )
    return value / form.equivalents, "litre"


def _mol_taken(part: Part) -> float:
    """Amount of the form in a quantity taken [mol]."""
    value = part.amount * part.unit.factor  # g, mL or mol
    if part.unit.measures == "mol":
        return value
    if part.strength is None or part.strength_unit is None:
        return value / part.form.molar_mass
    strength, basis = _solute(part, part.strength, part.strength_unit)
    if basis == "kilogram water":  # per kilogram of solution
        strength, basis = strength / (1.0 + strength * part.form.molar_mass / 1000.0), "kilogram"
    if (basis == "litre") == (part.unit.measures == "volume"):
        return strength * value / 1000.0
    if part.density is None:
        raise _refuse("part-density-missing", part.strength_unit.name, part.text)
    grams_or_ml = value * part.density if basis == "kilogram" else value / part.density
    return strength * grams_or_ml / 1000.0


def _dry_molar_mass(form: Form, known: Catalogue) -> float:
    dry = known.by_name.get(form.hydrate_of)
    return dry.molar_mass if dry else form.molar_mass


def compose(parts: Sequence[Part], to: str = "", known: Catalogue | None = None) -> Composition:
    """The composition that parts come to.

    parts : final concentrations stand as they are; quantities taken are divided by the total
    to : what the whole is made up to, such as "100 mL" or "1 kg" (of solution); "" when there are no quantities

    Raises InputProblems when a quantity has no total, more was taken than the total, or amounts are stated on
    different bases (per litre, per kilogram), which only a density of the solution could join.

    Notes
    -----
    Per kilogram of solution, the water is what the solutes leave: m = n / (1 - sum n M), with n in mol per kilogram of
    solution and M in kg/mol of the anhydrous form; the water of a hydrate counts as water.
    """
    known = known or catalogue()
    if not parts:
        raise _refuse("part-unreadable", "")
    untotalled = [p for p in parts if p.taken]
    total: tuple[float, str] | None = parse_total(to) if to else None
    if untotalled and total is None:
        raise InputProblems([Problem("part-without-total", Place(""), p.text) for p in untotalled])
    amounts, bases = [], []
    for part in parts:
        if part.taken and total:
            size, measure = total
            amounts.append(_mol_taken(part) / size)
            bases.append("litre" if measure == "volume" else "kilogram")
        else:
            amount, basis = _solute(part, part.amount, part.unit)
            amounts.append(amount)
            bases.append(basis)
    if total:
        same = [p for p in untotalled if p.unit.measures == total[1]]
        if sum(p.amount * p.unit.factor for p in same) > total[0] * 1000.0 * (1.0 + 1e-9):
            raise _refuse("parts-over-total", to)
    if len(set(bases)) > 1:
        raise _refuse("parts-mixed-bases", "; ".join(p.text for p in parts))
    if bases[0] == "kilogram":
        water = 1.0 - sum(a * _dry_molar_mass(p.form, known) / 1000.0 for a, p in zip(amounts, parts, strict=True))
        if water <= 0:
            raise _refuse("parts-over-total", to or "1 kg")
        amounts = [a / water for a in amounts]
    unit = "mol/L" if bases[0] == "litre" else "mol/kg"
    return Composition(tuple(parts), tuple(amounts), unit, to if untotalled else "")
