"""What else could have been in a bottle: every form of the library, those that act alike taken as one."""

from __future__ import annotations

import difflib
from collections.abc import Iterable
from dataclasses import dataclass
from functools import cache

from reconcile.records.own_substances import OwnSubstances
from reconcile.records.substances import Form, catalogue, ions


@dataclass(frozen=True)
class Alternative:
    """One candidate content: the form nearest the label, the others that act exactly alike, and its prior weight.

    relation : "hydrate" (same substance, other water), "form" (other salt or acid form of the same acid),
        "acid" (another acid already in the record), "other"
    """

    form: Form
    also: tuple[str, ...]
    relation: str
    weight: float


def effect(form: Form, label: Form, at_equal_mass: bool) -> tuple[object, ...]:
    """What a form brings per mol of the label: acids and charges, so that sodium and potassium twins are equal."""
    scale = label.molar_mass / form.molar_mass if at_equal_mass else 1.0
    charges: dict[int, float] = {}
    for ion, number in form.strong_ions.items():
        charge = ions()[ion].charge
        charges[charge] = charges.get(charge, 0.0) + number
    return (
        tuple((acid, float(f"{units * scale:.3g}")) for acid, units in sorted(form.acids.items())),
        tuple((charge, float(f"{number * scale:.3g}")) for charge, number in sorted(charges.items())),
    )


def _likeness(form: Form, label: Form) -> tuple[float, ...]:
    shared = len(set(form.ions) & set(label.ions)) - len(set(form.ions) ^ set(label.ions))
    return (shared, -len(form.hydrate_of), difflib.SequenceMatcher(None, form.name, label.name).ratio())


@cache
def alternatives(
    label: Form, at_equal_mass: bool, known_acids: frozenset[str], odds: float, site: OwnSubstances
) -> tuple[Alternative, ...]:
    """Every other content of a bottle labelled `label`, acting differently from it.

    known_acids : acids that the record already holds; they, and other forms of the label's own acid, weigh `odds`
    site : the site's own substances, which may stand in a bottle as the library's do
    """
    own = effect(label, label, False)
    classes: dict[tuple[object, ...], list[Form]] = {}
    for form in candidates(catalogue(site).forms):
        key = effect(form, label, at_equal_mass)
        if form.name != label.name and key != own:
            classes.setdefault(key, []).append(form)
    result = []
    for forms in classes.values():
        ranked = sorted(forms, key=lambda f: (_likeness(f, label), f.name), reverse=True) if len(forms) > 1 else forms
        best = ranked[0]
        if best.acts_as == label.acts_as and (best.hydrate_of or label.hydrate_of):
            relation = "hydrate"
        elif best.acid and best.acid == label.acid:
            relation = "form"
        elif best.acids and set(best.acids) <= known_acids:
            relation = "acid"
        else:
            relation = "other"
        weight = 1.0 if relation == "other" else odds
        result.append(Alternative(best, tuple(f.name for f in ranked[1:]), relation, weight))
    return tuple(sorted(result, key=lambda a: a.form.name))


def candidates(forms: Iterable[Form]) -> list[Form]:
    """Forms that can stand in a bottle at all: everything but water itself, and carbon dioxide."""
    return [f for f in forms if f.name not in ("water", "carbon dioxide")]
