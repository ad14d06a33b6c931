"""Substances as they are bought: names, formulas, molar masses, and what each brings into a solution."""

from __future__ import annotations

import csv
import difflib
import re
import unicodedata
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cache, cached_property
from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from reconcile.records.own_substances import OwnSubstances

FOLDER = Path(__file__).parent


@dataclass(frozen=True)
class Form:
    """One form of a substance.

    molar_mass [g/mol] includes the water of a hydrate. acid, protons_removed, acid_units: the acid it brings, how many
    protons each acid unit has lost from the fully protonated form (may be fractional), and units per formula.
    ions: everything else, ion -> number per formula. hydrate_of: name of the anhydrous form. hazard: plain words, ""
    when none is recorded. gas_with_acid: gas given off with acid, "" when none is recorded.
    """

    name: str
    synonyms: tuple[str, ...]
    formula: str
    molar_mass: float
    acid: str
    protons_removed: float
    acid_units: float
    ions: Mapping[str, float]
    hydrate_of: str
    usual_liquid: str
    hazard: str
    gas_with_acid: str
    note: str
    source: str = "forms.csv: formula with IUPAC 2021 abridged atomic weights; hazard words from memory"

    def __hash__(self) -> int:
        return hash(self.name)

    @cached_property
    def acids(self) -> Mapping[str, float]:
        """Acid -> units per formula unit, with the ions that are acids themselves (ammonium, hydrogen sulfate)."""
        found: dict[str, float] = {self.acid: self.acid_units} if self.acid else {}
        for ion, number in self.ions.items():
            row = ions()[ion]
            if row.acid:
                found[row.acid] = found.get(row.acid, 0.0) + number * row.acid_units
        return found

    @cached_property
    def strong_ions(self) -> Mapping[str, float]:
        """Ion -> number per formula unit, of ions that never change; H+ and OH- are left to the balance."""
        return {i: n for i, n in self.ions.items() if not ions()[i].acid and i not in ("H+", "OH-")}

    @cached_property
    def acts_as(self) -> tuple[object, ...]:
        """What it does to pH, up to a factor: equal for hydrates and for sodium and potassium twins."""
        acids = tuple(sorted(self.acids.items()))
        charges: dict[int, float] = {}
        for ion, number in self.strong_ions.items():
            charge = ions()[ion].charge
            charges[charge] = charges.get(charge, 0.0) + number
        scale = (acids[0][1] if acids else 0.0) or max(charges.values(), default=1.0)
        return (
            tuple((acid, round(number / scale, 9)) for acid, number in acids),
            tuple((charge, round(number / scale, 9)) for charge, number in sorted(charges.items())),
        )

    @property
    def equivalents(self) -> float:
        """Protons, hydroxides or charge of the formula that a normality counts; 0 for a non-electrolyte."""
        for ion in ("H+", "OH-"):
            if ion in self.ions:
                return self.ions[ion]
        if self.acid and not self.strong_ions and len(self.acids) == 1:
            return self.acid_units * _acidic_protons(self)
        charge = sum(abs(ions()[i].charge) * n for i, n in self.ions.items() if ions()[i].charge > 0)
        return float(charge)


@dataclass(frozen=True)
class Ion:
    """One ion: its charge, and the acid it is a form of ("" for an ion that never changes)."""

    name: str
    charge: int
    acid: str
    acid_units: float


_PROTON_COUNT = {  # protons that a normality counts in a neutral free acid; from its carboxyl, sulfonic or oxo groups
    "sulfuric acid": 2,
    "phosphoric acid": 3,
    "citric acid": 3,
    "tartaric acid": 2,
    "malic acid": 2,
    "succinic acid": 2,
    "fumaric acid": 2,
    "maleic acid": 2,
    "oxalic acid": 2,
    "malonic acid": 2,
    "adipic acid": 2,
    "glutaric acid": 2,
    "3,3-dimethylglutaric acid": 2,
    "phthalic acid": 2,
    "carbonic acid": 2,
    "sulfurous acid": 2,
    "phosphorous acid": 2,
    "pyrophosphoric acid": 4,
    "hydrogen sulfide": 2,
    "arsenic acid": 3,
    "chromic acid": 2,
    "ethylenediamine": 2,
    "piperazine": 2,
}


def _acidic_protons(form: Form) -> float:
    return float(_PROTON_COUNT.get(form.acid, 1))


@cache
def ions() -> Mapping[str, Ion]:
    """The one table of ions."""
    with (FOLDER / "ions.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    return {r["ion"]: Ion(r["ion"], int(r["charge"]), r["acid"], float(r["acid_units"])) for r in rows}


def name_key(text: str) -> str:
    """A substance name as it is compared: NFKC, case folded, one space, no trailing bracketed unit."""
    text = unicodedata.normalize("NFKC", text).casefold().replace("\u2010", "-").replace("\u2011", "-")
    return " ".join(re.sub(r"[\s_\u200b\ufeff]+", " ", text).split()).replace("sulph", "sulf")


def formula_key(text: str) -> str:
    """A formula as it is compared: case kept; dots of a hydrate and subscripts made alike."""
    text = unicodedata.normalize("NFKC", text)
    text = re.sub(r"\s*[·•*\u2219\u22c5x×.]\s*(?=\d*\.?\d*\s*H2O)", ".", text)
    return text.replace(" ", "")


def read_forms(path: Path, source: str = "") -> list[Form]:
    """Forms of a table with the columns of forms.csv."""
    with path.open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    forms = []
    for r in rows:
        pairs = [item.rpartition(":") for item in r["other_ions"].split("|") if item]
        form = Form(
            name=r["name"],
            synonyms=tuple(s for s in r["synonyms"].split("|") if s),
            formula=r["formula"],
            molar_mass=float(r["molar_mass_g_mol"]),
            acid=r["acid"],
            protons_removed=float(r["protons_removed"] or 0),
            acid_units=float(r["acid_units"] or 0),
            ions={ion: float(n) for ion, _, n in pairs},
            hydrate_of=r["hydrate_of"],
            usual_liquid=r["usual_liquid"],
            hazard=r["hazard"],
            gas_with_acid=r["gas_with_acid"],
            note=r["note"],
        )
        forms.append(form if not source else Form(**{**form.__dict__, "source": source}))
    return forms


@dataclass(frozen=True)
class LookUp:
    """Answer to a name: the form, or why there is none.

    form : the one form meant, or None; several : forms that the text may mean; near : names that resemble it
    """

    form: Form | None
    several: tuple[Form, ...] = ()
    near: tuple[str, ...] = ()


def _of_base(key: str) -> str:
    """Name of the hydrochloride that "tris hcl", "tris-hcl" or "tris·hcl" means; "" for any other name."""
    match = re.fullmatch(r"(.+?)\s*[ \-·•.*]\s*hcl", key)
    return f"{match.group(1)} hydrochloride" if match else ""


class Catalogue:
    """All forms known to one run, looked up by name, synonym or unambiguous formula."""

    def __init__(self, forms: Iterable[Form]) -> None:
        self.forms: tuple[Form, ...] = tuple(forms)
        self.by_name: dict[str, Form] = {f.name: f for f in self.forms}
        names: dict[str, dict[str, Form]] = {}
        formulas: dict[str, dict[str, Form]] = {}
        for form in self.forms:
            for text in (form.name, *form.synonyms):
                names.setdefault(name_key(text), {})[form.name] = form
            for text in (form.formula, *form.synonyms):
                formulas.setdefault(formula_key(text), {})[form.name] = form
        for form in self.forms:  # a form's own name outranks another's synonym
            names[name_key(form.name)] = {form.name: form}
        self._names, self._formulas = names, formulas
        self._spelled = {key: form.name for key, found in names.items() for form in found.values()}

    def look_up(self, text: str) -> LookUp:
        """The form that a name, synonym or formula means."""
        key = name_key(text)
        found = self._names.get(key) or self._formulas.get(formula_key(text)) or self._names.get(_of_base(key), {})
        if not found:  # the bare name of an acid that is sold only in named forms, such as EDTA
            found = {f.name: f for f in self.forms if f.acid and name_key(f.acid) == name_key(text)}
        if len(found) == 1:
            return LookUp(next(iter(found.values())))
        if found:
            return LookUp(None, several=tuple(found.values()))
        return LookUp(None, near=self._near(name_key(text)))

    def _near(self, key: str) -> tuple[str, ...]:
        """Names that resemble a key as a whole, or else the names that hold the word most like it."""
        near = difflib.get_close_matches(key, list(self._spelled), n=3, cutoff=0.75)
        if not near:
            words = difflib.get_close_matches(key, {word for name in self._spelled for word in name.split()}, n=1)
            near = [name for name in self._spelled if words and words[0] in name.split()][:3]
        return tuple(dict.fromkeys(self._spelled[n] for n in near))


@cache
def package_forms() -> tuple[Form, ...]:
    """The forms that come with the package."""
    return tuple(read_forms(FOLDER / "forms.csv"))


_catalogues: dict[tuple[str, ...], Catalogue] = {}


def catalogue(own: OwnSubstances | None = None) -> Catalogue:
    """The library that comes with the package, with a site's own substances behind.

    own : by default those kept in the user's configuration; raises InputProblems where these are not in order
    """
    if own is None:
        from reconcile.records.own_substances import own_of_user

        own = own_of_user()
    if own.key not in _catalogues:
        _catalogues[own.key] = Catalogue([*package_forms(), *own.forms])
    return _catalogues[own.key]
