"""What a question about an acid means: one of the library, or an unfamiliar one made from what is said about it."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np

from reconcile.chemistry.acids import AcidTable, acid_table
from reconcile.fitter.further_acids import with_further
from reconcile.records.own_substances import OwnSubstances
from reconcile.records.pka_results import PkaQuestion
from reconcile.records.places import Place
from reconcile.records.problems import InputProblems, Problem
from reconcile.records.settings import Settings
from reconcile.records.substances import Catalogue, Form, Ion, catalogue, ions, name_key

MOST_STEPS = 3
FREE = ("strength", "offset")
ION_NAMES: Mapping[str, str] = {
    "lithium": "Li+",
    "sodium": "Na+",
    "potassium": "K+",
    "magnesium": "Mg2+",
    "calcium": "Ca2+",
    "barium": "Ba2+",
    "ammonium": "NH4+",
    "tetramethylammonium": "N(CH3)4+",
    "tetrabutylammonium": "N(C4H9)4+",
    "fluoride": "F-",
    "chloride": "Cl-",
    "bromide": "Br-",
    "iodide": "I-",
    "nitrate": "NO3-",
    "perchlorate": "ClO4-",
    "thiocyanate": "SCN-",
    "methanesulfonate": "CH3SO3-",
    "mesylate": "CH3SO3-",
    "p-toluenesulfonate": "C7H7SO3-",
    "tosylate": "C7H7SO3-",
    "hydrogen sulfate": "HSO4-",
}
"""Usual names of the ions of the one table of ions; other counter-ions are named by their acid."""


@dataclass(frozen=True)
class UnfamiliarForm(Form):
    """A form of an acid that the library does not hold. beside : acids of the library that are its counter-ion."""

    beside: Mapping[str, float] = field(default_factory=dict)

    def __hash__(self) -> int:
        return hash(self.name)

    @cached_property
    def acids(self) -> Mapping[str, float]:
        return {**Form.acids.func(self), **self.beside}  # type: ignore[attr-defined]


@dataclass(frozen=True)
class Studied:
    """The acid under study.

    acid : its name in the table of acids; known : whether the library holds it
    charge : of the fully protonated form; numbers : numbers of steps to try, ascending
    form : what was weighed, None for an acid of the library (its forms are those of the catalogue)
    words : what was weighed, in words
    library : the library's acids and the site's own, as the settings have them; library_names : their forms by name
    """

    acid: str
    known: bool
    charge: int
    numbers: tuple[int, ...]
    form: UnfamiliarForm | None
    words: str
    library: AcidTable
    library_names: Catalogue

    @property
    def names(self) -> Catalogue:
        """The substances known when the record is read."""
        return self.library_names if self.form is None else Catalogue([*self.library_names.forms, self.form])

    def table(self, steps: int) -> AcidTable:
        """The library's acids, with the unfamiliar one behind; its constants stand at 7 until they are found."""
        if self.known:
            return self.library
        pka = np.full((1, steps), 7.0)
        columns = {"pka": pka, "p": pka, "u": np.ones((1, steps))}
        return with_further(self.library, (self.acid,), self.charge, columns)


def refusal(code: str, read: str = "", **words: str) -> InputProblems:
    """One reason why the question cannot be answered."""
    return InputProblems([Problem(code, Place(""), read, tuple(words.items()))])


def understood(question: PkaQuestion, settings: Settings | None = None, own: OwnSubstances | None = None) -> Studied:
    """What the question means; raises InputProblems where it contradicts itself or the library.

    own : the site's own substances, by default those in the user's configuration
    """
    chosen = settings or Settings()
    library = acid_table(chosen["prediction.pk_equations"], chosen["prediction.ion_pairs"], own)
    names = catalogue(own)
    _check_numbers(question)
    name = question.acid.strip()
    if not name:
        raise refusal("pka-option", name="the acid", wanted="the name of a substance, such as acetic acid")
    known = _in_library(name, library, names)
    if known:
        return _of_library(question, known, library, names)
    return _unfamiliar(question, name, library, names)


def _check_numbers(question: PkaQuestion) -> None:
    def bad(name: str, value: object, wanted: str) -> InputProblems:
        return refusal("pka-option", str(value), name=name, wanted=wanted)

    if question.steps is not None and question.steps not in (1, 2, 3):
        raise bad("the number of steps", question.steps, "1, 2 or 3")
    if question.charge is not None and question.charge not in (0, 1, 2):
        raise bad("the charge of the fully protonated form", question.charge, "0, 1 or 2")
    removed = question.protons_removed
    if removed is not None and not (math.isfinite(removed) and 0.0 <= removed <= MOST_STEPS):
        raise bad("the number of protons removed", removed, "a number from 0 to 3")
    if question.molar_mass is not None and not (math.isfinite(question.molar_mass) and question.molar_mass > 0.0):
        raise bad("the molar mass", question.molar_mass, "a positive number [g/mol]")
    if question.noise is not None and not (math.isfinite(question.noise) and 0.0 < question.noise <= 1.0):
        raise bad("the noise of a reading", question.noise, "a standard deviation up to 1 pH")
    for one in question.free:
        if one not in FREE:
            raise bad("what is set free", one, "strength or offset")


def _in_library(name: str, table: AcidTable, names: Catalogue) -> str:
    """The acid of the library that a name means; "" when it means none."""
    exact = {name_key(acid): acid for acid in table.names}
    if name_key(name) in exact:
        return exact[name_key(name)]
    found = names.look_up(name)
    if found.form is None:
        if found.several:
            raise refusal("pka-several", name, several=", ".join(f.name for f in found.several[:6]))
        return ""
    own = found.form.acid or next(iter(found.form.acids), "")
    if not own:
        raise refusal("pka-no-acid", found.form.name)
    return own


def _of_library(question: PkaQuestion, acid: str, library: AcidTable, names: Catalogue) -> Studied:
    i = library.index[acid]
    charge, steps = int(library.charge[i]), int(library.steps[i])
    said = {
        "--steps": question.steps if question.steps != steps else None,
        "--charge": question.charge if question.charge != charge else None,
        "--protons-removed": question.protons_removed,
        "--counter-ion": question.counter_ion or None,
        "--molar-mass": question.molar_mass,
    }
    against = [option for option, value in said.items() if value is not None]
    if against:
        raise refusal(
            "pka-library-option",
            question.acid,
            options=", ".join(against),
            steps=f"{steps} step{'s' if steps > 1 else ''}",
            charge=f"{charge:+d}" if charge else "0",
        )
    return Studied(acid, True, charge, (steps,), None, f"{acid}, of the library", library, names)


def _unfamiliar(question: PkaQuestion, name: str, library: AcidTable, names: Catalogue) -> Studied:
    charge = question.charge or 0
    removed = question.protons_removed or 0.0
    fewest = max(1, math.ceil(removed - 1e-9))
    if question.steps is not None and question.steps < fewest:
        raise refusal(
            "pka-option",
            f"{removed:g}",
            name="the number of protons removed",
            wanted=f"at most the {question.steps} of the ionization steps",
        )
    numbers = (question.steps,) if question.steps is not None else tuple(range(fewest, MOST_STEPS + 1))
    ion, number, beside = _counter_ion(question.counter_ion, charge - removed, library, names)
    form = UnfamiliarForm(
        name=name,
        synonyms=(),
        formula="",
        molar_mass=math.nan if question.molar_mass is None else question.molar_mass,
        acid=name,
        protons_removed=removed,
        acid_units=1.0,
        ions={ion: number} if ion else {},
        hydrate_of="",
        usual_liquid="",
        hazard="",
        gas_with_acid="",
        note="",
        source="as described in the question",
        beside=beside,
    )
    lost = f"{removed:g} proton{'' if removed == 1 else 's'} removed" if removed else "fully protonated"
    beside_words = f", with {question.counter_ion}" if question.counter_ion else ""
    sign = f"{charge:+d}" if charge else "0"
    words = f"{name}, not in the library: charge of the fully protonated form {sign}, weighed {lost}{beside_words}"
    return Studied(name, False, charge, numbers, form, words, library, names)


def _counter_ion(text: str, charge: float, table: AcidTable, names: Catalogue) -> tuple[str, float, dict[str, float]]:
    """Ion and number per formula, or acids that stand in as counter-ion; raises where the formula is not neutral."""
    if not text.strip():
        if abs(charge) > 1e-9:
            raise refusal("pka-counter-ion-missing", charge=f"{charge:+g}")
        return "", 0.0, {}
    name, colon, count = text.rpartition(":")
    try:
        number = float(count) if colon else 1.0
    except ValueError:
        number = math.nan
    name = name.strip() if colon else text.strip()
    if not (math.isfinite(number) and number > 0.0) or not name:
        raise refusal("pka-option", text, name="the counter-ion", wanted="name:number, such as sodium:1 or chloride:2")
    ion = _ion(name)
    if ion is not None and (not ion.acid or abs(charge + number * ion.charge) < 1e-6):
        if abs(charge + number * ion.charge) > 1e-6:
            raise refusal("pka-counter-ion-charge", text, charge=f"{charge:+g}", ions=f"{number * ion.charge:+g}")
        return ion.name, number, {}
    acid = ion.acid if ion is not None else _acid_of(name, table, names)
    if not acid:
        near = ", ".join(ION_NAMES)
        raise refusal("pka-option", text, name="the counter-ion", wanted=f"an ion ({near}) or an acid of the library")
    i = table.index[acid]
    own = -charge / number
    if not table.charge[i] - table.steps[i] - 1e-9 <= own <= table.charge[i] + 1e-9:
        raise refusal("pka-counter-ion-charge", text, charge=f"{charge:+g}", ions="no charge that it can have")
    return "", 0.0, {acid: number}


def _ion(name: str) -> Ion | None:
    exact = {key.casefold(): key for key in ions() if key not in ("H+", "OH-")}
    found = exact.get(name.casefold()) or ION_NAMES.get(name_key(name))
    return ions()[found] if found else None


def _acid_of(name: str, table: AcidTable, names: Catalogue) -> str:
    """The acid that a counter-ion is the anion of: named itself, or by its sodium salt ("maleate")."""
    exact = {name_key(acid): acid for acid in table.names}
    if name_key(name) in exact:
        return exact[name_key(name)]
    for text in (name, f"sodium {name}", f"disodium {name}"):
        form = names.look_up(text).form
        if form is not None and form.acid:
            return form.acid
    return ""
