"""What the usual hand methods give for a solution: for naming the one a record used, never for predicting.

Common practice, no source, for the methods themselves; each neglects what its name says.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from reconcile.chemistry.acids import AcidTable, acid_table
from reconcile.chemistry.predict import predict_records
from reconcile.records.arrays import FloatArray, IntArray
from reconcile.records.book import BatchRecords
from reconcile.records.settings import Settings
from reconcile.records.substances import Form, ions

PKW_25 = 13.995
"""Ionization constant of water at 25 °C (IAPWS R11-07)."""


@dataclass(frozen=True)
class Recipe:
    """One solution as hand methods see it [mol/L]: one acid at most, and the strong acid or base beside it.

    acid : name, "" for none; charge_full : charge of its fully protonated form
    total : of the acid; removed : mean number of protons its forms have lost as weighed
    strong : strong base less strong acid
    """

    acid: str
    charge_full: int
    pka: tuple[float, ...]
    total: float
    removed: float
    strong: float


def _recipe(records: BatchRecords, solution: int, acids: AcidTable) -> Recipe | None:
    """A solution of a record in these terms."""
    inside = np.flatnonzero(records.solutions.solution == solution)
    forms = [records.forms[int(f)] for f in records.solutions.form[inside]]
    return recipe_of(forms, records.solutions.amount[inside].tolist(), acids)


def recipe_of(forms: Sequence[Form], amounts: Sequence[float], acids: AcidTable) -> Recipe | None:
    """Forms and their amounts [mol/L] in these terms; None where they bring several acids or one that is not simple."""
    found: set[str] = set()
    total = lost = strong = 0.0
    for form, amount in zip(forms, amounts, strict=True):
        strong += amount * (form.ions.get("OH-", 0.0) - form.ions.get("H+", 0.0))
        if any(ions()[ion].acid for ion in form.ions):
            return None
        if form.acid:
            found.add(form.acid)
            total += amount * form.acid_units
            lost += amount * form.acid_units * form.protons_removed
    if len(found) > 1:
        return None
    if not found:
        return Recipe("", 0, (), 0.0, 0.0, strong)
    name = found.pop()
    which = acids.index[name]
    begin = int(acids.first[which])
    pka = tuple(float(v) for v in acids.pka[begin : begin + int(acids.steps[which])])
    return Recipe(name, int(acids.charge[which]), pka, total, lost / total if total else 0.0, strong)


def _step(recipe: Recipe) -> tuple[int, float, float] | None:
    """(step, acid, base) [mol/L]: between which protonation states a recipe stands, and how much of each."""
    if not recipe.total:
        return None
    lost = recipe.removed + recipe.strong / recipe.total
    step = int(np.floor(lost))
    if not 0 <= step < len(recipe.pka) or lost < 0:
        return None
    base = (lost - step) * recipe.total
    return step, recipe.total - base, base


def square_root(recipe: Recipe) -> float:
    """Square root of Ka C for an acid alone, of Kw C / Ka for a base alone."""
    place = _step(recipe)
    if recipe.strong or not recipe.total:
        return float("nan")
    if place is not None and place[2] <= 1e-12 * recipe.total and place[0] == 0:
        return 0.5 * (recipe.pka[0] - float(np.log10(recipe.total)))
    if abs(recipe.removed - len(recipe.pka)) < 1e-9:
        return 0.5 * (PKW_25 + recipe.pka[-1] + float(np.log10(recipe.total)))
    return float("nan")


def quadratic(recipe: Recipe) -> float:
    """Positive root of h^2 + Ka h - Ka C = 0 for an acid alone: its ionization counted, water's not."""
    if recipe.strong or not recipe.total or recipe.removed > 1e-9:
        return float("nan")
    ka = 10.0 ** -recipe.pka[0]
    return -float(np.log10((-ka + np.sqrt(ka * ka + 4.0 * ka * recipe.total)) / 2.0))


def ratio(recipe: Recipe) -> float:
    """Henderson-Hasselbalch: pKa + log(base/acid) from the amounts as mixed."""
    place = _step(recipe)
    if place is None or min(place[1], place[2]) <= 1e-9 * recipe.total:
        return float("nan")
    step, acid, base = place
    return recipe.pka[step] + float(np.log10(base / acid))


def strong_only(recipe: Recipe) -> float:
    """-log of a strong acid's concentration, or pKw + log of a strong base's."""
    if recipe.total or not recipe.strong:
        return float("nan")
    size = float(np.log10(abs(recipe.strong)))
    return -size if recipe.strong < 0 else PKW_25 + size


HAND_METHODS: Mapping[str, Callable[[Recipe], float]] = {
    "square root of Ka C": square_root,
    "quadratic": quadratic,
    "ratio of base to acid": ratio,
    "strong acid or base alone": strong_only,
}


def shortcut_values(
    records: BatchRecords, settings: Settings, rows: IntArray, acids: AcidTable | None = None
) -> dict[str, FloatArray]:
    """Value of every hand method for some readings, method -> FloatArray (m,); NaN where a method does not apply.

    Parameters
    ----------
    rows : ndarray (m,)    readings
    """
    table = acids if acids is not None else acid_table(own=records.own)
    solutions = records.readings_solution[rows]
    recipes = {int(s): _recipe(records, int(s), table) for s in np.unique(solutions)}
    found: dict[str, FloatArray] = {}
    for name, method in HAND_METHODS.items():
        value = {s: method(r) if r is not None else float("nan") for s, r in recipes.items()}
        found[name] = np.array([value[int(s)] for s in solutions], float)
    ideal = Settings({**settings.changed, "prediction.activity_model": "ideal"})
    found["full balance without activity coefficients"] = predict_records(records, ideal).ph[rows]
    at_25 = dict(records.readings.columns)
    at_25["temperature"] = np.full(len(records.readings), 25.0)
    at_25["reference_temperature"] = np.full(len(records.readings), np.nan)
    warm = replace(records, readings=replace(records.readings, columns=at_25))
    found["full balance with 25 °C constants"] = predict_records(warm, settings).ph[rows]
    return found
