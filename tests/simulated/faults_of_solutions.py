"""Faults of lots, batches, constants and record values that can be planted; each returns the truth."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np

from reconcile.records.arrays import FloatArray, IntArray
from reconcile.records.substances import Form, catalogue
from tests.simulated import chemistry_of_truth as chemistry
from tests.simulated.planted import Planted
from tests.simulated.recipes import PRIMARY, SECONDARY, USES
from tests.simulated.world import World


def _sign(world: World) -> float:
    return float(world.rng.choice([-1.0, 1.0]))


def _lot(world: World, usable: Iterable[int] | None = None) -> int:
    """A lot without a fault yet that goes into at least three batches."""
    uses = np.bincount(world.lot, minlength=len(world.lot_label))
    pool = range(len(uses)) if usable is None else usable
    free = [i for i in pool if ("lot", i) not in world.taken]
    enough = [i for i in free if uses[i] >= USES] or free
    chosen = int(world.rng.choice(enough))
    world.taken.add(("lot", chosen))
    return chosen


def _batch(world: World, usable: IntArray) -> int:
    free = [int(b) for b in usable if ("batch", int(b)) not in world.taken]
    chosen = int(world.rng.choice(free))
    world.taken.add(("batch", chosen))
    return chosen


def _rows(world: World, contributions: IntArray) -> tuple[int, ...]:
    return tuple(np.flatnonzero(np.isin(world.read_solution, np.unique(world.solution[contributions]))).tolist())


def lot_strength(world: World, size: float = 1.2) -> Planted:
    """The bottle holds `size` times what its label says, or 1/size; the whole factor, tolerance included."""
    lot, factor = _lot(world), float(size ** _sign(world))
    world.lot_factor[lot] = factor
    rows = _rows(world, np.flatnonzero(world.lot == lot))
    return Planted("lot_strength", world.lot_name[lot], "lot", factor, "-", "lot_strength", {}, rows)


def lot_used_once(world: World, size: float = 1.5) -> Planted:
    """The strength of a bottle used in one batch only: pH cannot tell it from a fault of that preparation."""
    before = world.true_ph()
    for index in world.rng.permutation(np.flatnonzero(np.bincount(world.lot) == 1)).tolist():
        kept = world.lot_factor.copy()
        factor = float(size ** _sign(world))
        world.lot_factor[index] = factor
        rows = _rows(world, np.flatnonzero(world.lot == index))
        if np.abs(world.true_ph() - before)[list(rows)].min() > 0.1:
            batch = world.batch_name(int(world.solution[world.lot == index][0]))
            detail = {"batch": batch}
            return Planted("lot_strength", world.lot_name[index], "lot", factor, "-", "lot_used_once", detail, rows)
        world.lot_factor = kept
    raise LookupError("no bottle used once shows in any reading")


def _near(one: str, other: str, within: float = 0.1) -> bool:
    """Two acids whose pKa between 1.5 and 12.5 agree within a tolerance, step by step."""
    a, b = (chemistry.acids()[name].pka for name in (one, other))
    a, b = (p[(p > 1.5) & (p < 12.5)] for p in (a, b))
    return len(a) == len(b) and bool(np.all(np.abs(a - b) <= within))


def could_be_in_bottle(label: Form) -> list[Form]:
    """Forms that a bottle so labelled may hold by mistake: like form of another acid, or another salt of the same."""
    found: list[Form] = []
    if not label.acid:
        return found
    for form in catalogue().forms:
        if not form.acid or len(form.acids) != 1 or form.gas_with_acid or form.acid_units != 1:
            continue
        acid, mine = chemistry.acids()[form.acid], chemistry.acids()[label.acid]
        if form.acid == label.acid:
            if form.acts_as != label.acts_as and set(form.ions) <= {"Na+", "Cl-"}:
                found.append(form)
        elif (
            not acid.weak_data
            and acid.u[0] <= 0.02
            and 2.0 < acid.pka[0] < 10.5
            and form.ions == label.ions
            and form.protons_removed == label.protons_removed
            and acid.charge == mine.charge
            and (mine.charge == 0 or len(acid.pka) == 1)
            and not _near(form.acid, label.acid)
        ):
            found.append(form)
    return found


def _swap(world: World, contributions: IntArray, form: Form) -> float:
    """Put another form in place of the label, and return the factor of moles: by mass where it was weighed."""
    label = world.form(world.label[contributions[0]])
    weighed = bool(world.weighed[contributions[0]])
    factor = label.molar_mass / form.molar_mass if weighed else 1.0
    for c in contributions:
        world.actual[c] = form.name
    world.factor[contributions] *= factor
    return factor


def lot_identity(world: World, size: float = 0.05) -> Planted:
    """The bottle holds another acid, or another salt form; the mean change of its readings is `size` pH at least."""
    with_acid = [i for i, label in enumerate(world.lot_label) if could_be_in_bottle(world.form(label))]
    lot = _lot(world, with_acid)
    inside = np.flatnonzero(world.lot == lot)
    rows = _rows(world, inside)
    before, kept = world.true_ph(), world.factor.copy()
    forms = could_be_in_bottle(world.form(world.lot_label[lot]))
    for index in world.rng.permutation(len(forms)):
        factor = _swap(world, inside, forms[index])
        if np.abs(world.true_ph() - before)[list(rows)].mean() >= size:
            detail = {"substance": forms[index].name, "factor": factor}
            return Planted("lot_identity", world.lot_name[lot], "lot", None, "", "lot_identity", detail, rows)
        world.factor = kept.copy()
    raise LookupError(f"no other substance shows in lot {world.lot_name[lot]}")


def _hydrates(label: str) -> list[Form]:
    return [f for f in catalogue().forms if f.hydrate_of == label]


def lot_hydrate(world: World, size: float = 1.1) -> Planted:
    """A bottle labelled anhydrous holds a hydrate: every weighing of it brings fewer moles (by `size` or more)."""
    label = world.lot_label
    lot = _lot(world, [i for i in range(len(label)) if world.weighed[world.lot == i].any() and _hydrates(label[i])])
    forms = [f for f in _hydrates(label[lot]) if f.molar_mass / world.form(label[lot]).molar_mass >= size]
    form = (forms or _hydrates(label[lot]))[int(world.rng.integers(len(forms or _hydrates(label[lot]))))]
    inside = np.flatnonzero(world.lot == lot)
    detail = {"substance": form.name, "factor": _swap(world, inside, form)}
    return Planted("lot_identity", world.lot_name[lot], "lot", None, "", "lot_hydrate", detail, _rows(world, inside))


def batch_preparation(world: World, size: float = 1.35) -> Planted:
    """One component of one batch was taken `size` times over, or 1/size; the whole factor, tolerance included."""
    batch = _batch(world, np.arange(len(world.made)))
    inside = np.flatnonzero(world.solution == batch)
    component, factor = int(world.rng.choice(inside)), float(size ** _sign(world))
    world.factor[component] = factor
    detail = {"component": world.label[component]}
    name = world.batch_name(batch)
    rows = _rows(world, inside)
    return Planted("batch_preparation", name, "batch", factor, "-", "batch_preparation", detail, rows)


def recipe_hydrate(world: World, size: float = 1.1) -> Planted:
    """In one batch a hydrate was weighed as if it were anhydrous; it changes the moles by `size` or more."""
    mass = world.form
    usable = [
        c
        for c in np.flatnonzero(world.weighed)
        if any(f.molar_mass / mass(world.label[c]).molar_mass >= size for f in _hydrates(world.label[c]))
    ]
    batch = _batch(world, np.unique(world.solution[usable]))
    component = next(c for c in usable if world.solution[c] == batch)
    label = world.label[component]
    forms = [f for f in _hydrates(label) if f.molar_mass / mass(label).molar_mass >= size]
    form = forms[int(world.rng.integers(len(forms)))]
    factor = _swap(world, np.array([component]), form)
    detail = {"substance": form.name, "factor": factor, "component": label, "variant": "hydrate"}
    rows = _rows(world, np.array([component]))
    return Planted("recipe_slip", world.batch_name(batch), "batch", factor, "-", "recipe_hydrate", detail, rows)


def recipe_slip(world: World, size: float = 10.0) -> Planted:
    """In one batch a component is out by a decimal place, or was taken in normality for molarity (citric acid, 1/3)."""
    batch = _batch(world, np.arange(len(world.made)))
    inside = np.flatnonzero(world.solution == batch)
    component = int(world.rng.choice(inside))
    if world.label[component] == "citric acid" and world.rng.random() < 0.5:
        factor, variant = 1.0 / 3.0, "normality"
    else:
        factor, variant = float(size ** _sign(world)), "decimal point"
    world.factor[component] *= factor
    detail = {"factor": factor, "component": world.label[component], "variant": variant}
    rows = _rows(world, inside)
    return Planted("recipe_slip", world.batch_name(batch), "batch", factor, "-", "recipe_slip", detail, rows)


def acid_constant(world: World, size: float = 0.08) -> Planted:
    """One constant of one acid differs from the table by `size`, in every lot and on every meter."""
    candidates: list[tuple[str, int, IntArray]] = []
    before = world.true_ph()
    for acid, step in sorted(world.pka_shift):
        if ("acid", acid) in world.taken:
            continue
        world.pka_shift[acid, step] += size
        moved = np.flatnonzero(np.abs(world.true_ph() - before) > 0.5 * size)
        world.pka_shift[acid, step] -= size
        candidates.append((acid, step, moved))
    often = [c for c in candidates if len(c[2]) >= 8] or [max(candidates, key=lambda c: len(c[2]))]
    acid, step, moved = often[int(world.rng.integers(len(often)))]
    world.taken.add(("acid", acid))
    total = _sign(world) * size
    world.pka_shift[acid, step] = total
    rows = tuple(moved.tolist())
    return Planted("acid_constant", acid, "acid", total, "-", "acid_constant", {"step": step}, rows)


def carbon_dioxide(world: World, size: float = 0.35) -> Planted:
    """A batch of dilute hydroxide took up carbon dioxide, `size` moles of it for each mole of hydroxide."""
    batch = _batch(world, np.flatnonzero([k == "dilute base" for k in world.kind]))
    inside = np.flatnonzero(world.solution == batch)
    total = size * float(world.amount[inside].sum())
    world.co2[batch] += total / chemistry.KG_WATER_PER_LITRE
    rows = _rows(world, inside)
    return Planted("carbon_dioxide", world.batch_name(batch), "batch", total, "mol/L", "carbon_dioxide", {}, rows)


def record_value(world: World, size: float = 0.05) -> Planted:
    """The record's own calculated pH of one batch is a hand shortcut that errs by `size` at least."""
    nominal = world.true_ph(nominal=True)
    found: list[tuple[int, float, str]] = []
    for batch in range(len(world.made)):
        inside = np.flatnonzero(world.solution == batch)
        names, amounts = [world.label[c] for c in inside], world.amount[inside]
        if len(inside) == 1 and names[0] in chemistry.acids():
            value = 0.5 * float(chemistry.acids()[names[0]].pka[0] - np.log10(amounts[0]))
            shortcut = "square root"
        elif names in (["acetic acid", "sodium acetate"], [PRIMARY, SECONDARY]):
            acid, step = ("acetic acid", 0) if names[0] == "acetic acid" else ("phosphoric acid", 1)
            value = float(chemistry.acids()[acid].pka[step] + np.log10(amounts[1] / amounts[0]))
            shortcut = "ratio of salt to acid"
        else:
            continue
        if abs(value - nominal[world.read_solution == batch].mean()) >= size:
            found.append((batch, value, shortcut))
    batch = _batch(world, np.array([f[0] for f in found]))
    value, shortcut = next((v, s) for b, v, s in found if b == batch)
    here = world.read_solution == batch

    def write(calculated: FloatArray) -> FloatArray:
        return np.where(here, round(value, 2), calculated)

    world.calculated.append(write)
    error = round(value, 2) - float(nominal[here].mean())
    rows = tuple(np.flatnonzero(here).tolist())
    detail = {"shortcut": shortcut}
    return Planted("record_value", world.batch_name(batch), "batch", error, "pH", "record_value", detail, rows)
