"""What a file of a site's substances may hold, and everything that can be wrong with it."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from reconcile.records.formulas import molar_mass
from reconcile.records.places import Place
from reconcile.records.problems import Problem
from reconcile.records.substances import Form, ions, name_key

MASS_OFF = 0.02  # g/mol, more than rounded atomic weights make
MOST_CHARGE = 8

_FORM_KEYS: Mapping[str, type | tuple[type, ...]] = {
    "name": str,
    "synonyms": list,
    "formula": str,
    "molar_mass": (int, float),
    "acid": str,
    "protons_removed": (int, float),
    "acid_units": (int, float),
    "ions": dict,
    "usual_liquid": str,
    "hazard": str,
    "gas_with_acid": str,
    "note": str,
    "source": str,
}
_ACID_KEYS: Mapping[str, type | tuple[type, ...]] = {
    "name": str,
    "formula": str,
    "CAS": str,
    "charge": int,
    "step": list,
}
_STEP_KEYS: Mapping[str, type | tuple[type, ...]] = {
    "pka": (int, float),
    "u": (int, float),
    "enthalpy": (int, float),
    "heat_capacity": (int, float),
    "source": str,
}


_WANTED: Mapping[object, str] = {str: "text", int: "a whole number", list: "a list", dict: "a table of keys"}


@dataclass(frozen=True)
class OwnStep:
    """One ionization step of a site's acid; enthalpy [kJ/mol] and heat capacity [J/(K mol)] NaN where unknown."""

    acid: str
    formula: str
    cas: str
    charge: int
    step: int
    pka: float
    u: float
    enthalpy: float
    heat_capacity: float
    source: str


class Checks:
    """Gathers what is wrong with one file."""

    def __init__(self, name: str) -> None:
        self.problems: list[Problem] = []
        self._place = Place(name)

    def say(self, code: str, read: object, of: str, **words: str) -> None:
        self.problems.append(Problem(code, self._place, str(read), (("name", of), *words.items())))

    def _keys(self, table: Any, allowed: Mapping[str, Any], needed: Sequence[str], of: str) -> bool:
        """Whether a table has the keys it needs and no others, each of its type."""
        if not isinstance(table, Mapping):
            self.say("own-value", table, of, wanted="a table of keys")
            return False
        before = len(self.problems)
        for key, value in table.items():
            if key not in allowed:
                self.say("own-key", key, of, known=", ".join(allowed))
            elif isinstance(value, bool) or not isinstance(value, allowed[key]):
                self.say("own-value", value, f"{key} of {of}", wanted=_WANTED.get(allowed[key], "a number"))
            elif isinstance(value, float) and not math.isfinite(value):
                self.say("own-value", value, f"{key} of {of}", wanted="a number")
            elif isinstance(value, str) and not value.isprintable():
                self.say("own-value", value, f"{key} of {of}", wanted="text of one line")
        for key in needed:
            if key not in table or not (table[key].strip() if isinstance(table[key], str) else table[key] != []):
                self.say("own-missing", key, of)
        return len(self.problems) == before

    def acids(self, tables: Any, known: Mapping[str, tuple[int, int]]) -> list[OwnStep]:
        steps: list[OwnStep] = []
        names = {name_key(name) for name in known}
        for table in tables if isinstance(tables, list) else [tables]:
            of = str(table.get("name", "an acid")) if isinstance(table, Mapping) else "an acid"
            if not self._keys(table, _ACID_KEYS, ("name", "charge", "step"), of):
                continue
            if name_key(of) in names:
                self.say("own-known", of, of)
                continue
            names.add(name_key(of))
            if abs(table["charge"]) > MOST_CHARGE:
                self.say("own-value", table["charge"], f"charge of {of}", wanted=f"-{MOST_CHARGE} to {MOST_CHARGE}")
            own = self._steps(table, of)
            if [s.pka for s in own] != sorted(s.pka for s in own):
                self.say("own-value", ", ".join(f"{s.pka:g}" for s in own), f"pka of {of}", wanted="ascending values")
            steps += own
        return steps

    def _steps(self, table: Mapping[str, Any], of: str) -> list[OwnStep]:
        out = []
        for number, step in enumerate(table["step"], start=1):
            name = f"step {number} of {of}"
            if not self._keys(step, _STEP_KEYS, ("pka", "u", "source"), name):
                continue
            if not (-5.0 <= step["pka"] <= 20.0):
                self.say("own-value", step["pka"], f"pka of {name}", wanted="a number from -5 to 20")
            if not (0.0 < step["u"] <= 2.0):
                self.say("own-value", step["u"], f"u of {name}", wanted="a standard uncertainty above 0, to 2")
            nan = float("nan")
            out.append(
                OwnStep(
                    of,
                    str(table.get("formula", "")),
                    str(table.get("CAS", "")),
                    int(table["charge"]),
                    number,
                    float(step["pka"]),
                    float(step["u"]),
                    float(step.get("enthalpy", nan)),
                    float(step.get("heat_capacity", nan)),
                    str(step["source"]),
                )
            )
        return out

    def forms(self, tables: Any, acids: Mapping[str, tuple[int, int]], known: Iterable[Form]) -> list[Form]:
        out: list[Form] = []
        names = {name_key(text) for form in known for text in (form.name, *form.synonyms)}
        for table in tables if isinstance(tables, list) else [tables]:
            of = str(table.get("name", "a substance")) if isinstance(table, Mapping) else "a substance"
            if not self._keys(table, _FORM_KEYS, ("name", "formula", "source"), of):
                continue
            before = len(self.problems)
            self._lists(table, of)
            for text in (of, *(str(s) for s in table.get("synonyms", []))):
                if name_key(text) in names:
                    self.say("own-known", text, of)
                names.add(name_key(text))
            mass = self._mass(table, of)
            form = self._form(table, of, mass)
            if len(self.problems) == before:
                self._charge(form, acids)
            if len(self.problems) == before:
                out.append(form)
        return out

    def _lists(self, table: Mapping[str, Any], of: str) -> None:
        """Synonyms are texts; ions are known, with how many of each; a share of an acid is a positive one."""
        for text in table.get("synonyms", []):
            if not isinstance(text, str) or not text.strip() or not text.isprintable():
                self.say("own-value", text, f"synonyms of {of}", wanted="texts of one line")
        for ion, number in table.get("ions", {}).items():
            if ion not in ions():
                self.say("own-value", ion, f"ions of {of}", wanted=f"one of {', '.join(ions())}")
            elif isinstance(number, bool) or not isinstance(number, (int, float)) or not 0.0 < number < math.inf:
                self.say("own-value", number, f"{ion} of {of}", wanted="a number above 0")
        if not table.get("acid") and ("protons_removed" in table or "acid_units" in table):
            self.say("own-missing", "acid", of)
        if not table.get("acid_units", 1.0) > 0.0:
            self.say("own-value", table["acid_units"], f"acid_units of {of}", wanted="a number above 0")

    def _mass(self, table: Mapping[str, Any], of: str) -> float:
        by_formula, stated = molar_mass(table["formula"]), table.get("molar_mass")
        if stated is None and by_formula is None:
            self.say(
                "own-value", table["formula"], f"formula of {of}", wanted="a formula such as C5H8O3, or molar_mass"
            )
        elif stated is not None and not stated > 0.0:
            self.say("own-value", stated, f"molar_mass of {of}", wanted="a number above 0 [g/mol]")
        elif stated is not None and by_formula is not None and abs(stated - by_formula) > MASS_OFF:
            wanted = f"{by_formula:.3f} g/mol, as its formula gives"
            self.say("own-value", stated, f"molar_mass of {of}", wanted=wanted)
        return float(stated if stated is not None else by_formula or 1.0)

    def _form(self, table: Mapping[str, Any], of: str, mass: float) -> Form:
        acid = str(table.get("acid", ""))
        return Form(
            name=of,
            synonyms=tuple(str(s) for s in table.get("synonyms", [])),
            formula=str(table["formula"]),
            molar_mass=mass,
            acid=acid,
            protons_removed=float(table.get("protons_removed", 0.0)),
            acid_units=float(table.get("acid_units", 1.0 if acid else 0.0)),
            ions=dict(table.get("ions", {})),
            hydrate_of="",
            usual_liquid=str(table.get("usual_liquid", "")),
            hazard=str(table.get("hazard", "")),
            gas_with_acid=str(table.get("gas_with_acid", "")),
            note=str(table.get("note", "")),
            source=str(table["source"]),
        )

    def _charge(self, form: Form, acids: Mapping[str, tuple[int, int]]) -> None:
        """The acid is known, and one formula unit is neutral."""
        of = form.name
        charge = sum(ions()[ion].charge * number for ion, number in form.ions.items())
        if form.acid:
            if form.acid not in acids:
                self.say("own-value", form.acid, f"acid of {of}", wanted="an [[acid]] of this file or of the library")
                return
            full, steps = acids[form.acid]
            if not 0.0 <= form.protons_removed <= steps:
                self.say(
                    "own-value", form.protons_removed, f"protons_removed of {of}", wanted=f"a number from 0 to {steps}"
                )
            charge += form.acid_units * (full - form.protons_removed)
        if abs(charge) > 1e-6:
            self.say("own-charge", f"{charge:+g}", of)
