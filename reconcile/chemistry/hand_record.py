"""What hand methods would have given for one solution, and why each fails or serves there."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.activity import ActivityModel, activity_model
from reconcile.chemistry.composition import Contents, FormTable, form_table, pad
from reconcile.chemistry.engine import solved_ph
from reconcile.chemistry.pair_rows import laid_out
from reconcile.chemistry.pair_solve import solve_pairs
from reconcile.chemistry.shortcuts import HAND_METHODS, PKW_25, Recipe, recipe_of
from reconcile.chemistry.solve import solve
from reconcile.chemistry.temperature import solvent
from reconcile.chemistry.water import DENSITY_20C
from reconcile.records.substances import Form

LEAST_LG = 5e-4
"""lg below which a coefficient or a constant's change is not named: it would print as 0.000."""
NO_WATER = 1e-60
RATIO = "ratio of base to acid"
SERVES = 0.01
"""pH within which a hand method serves: the last digit of a usual display; common practice, no source."""


@dataclass(frozen=True)
class HandValue:
    """One hand method: its value (NaN where it does not apply), value minus prediction, and why."""

    method: str
    value: float
    difference: float
    why: str

    @property
    def applies(self) -> bool:
        return bool(np.isfinite(self.value))


@dataclass(frozen=True)
class Facts:
    """What the sentences need of the solution: pH, ionic strength, pKa of each step at 25 °C and I = 0, and as it acts.

    lg_gamma : of an ion of charge 1; temperature_c; free_h : molality of hydrogen ions, free_oh : of hydroxide
    pkw : of water at the temperature; paired : molality of ion pairs and condensed species
    """

    ph: float
    strength: float
    lg_gamma: float
    temperature_c: float
    free_h: float
    free_oh: float
    pka: tuple[float, ...]
    acting: tuple[float, ...]
    pkw: float
    paired: float


def _signed(value: float) -> str:
    return f"{value + 0.0:.3f}".replace("-0.000", "0.000").replace("-", "−")


def _not_simple(recipe: Recipe | None) -> str:
    return "the solution holds several acids, or an ion that is an acid itself" if recipe is None else ""


def _no_buffer(recipe: Recipe) -> str:
    return "" if recipe.total else "the solution holds no weak acid"


COUNTS = 1e-3
"""Share from which on something that a method leaves out is named; 0.1 % of hydrogen ions are 0.0004 pH."""


def _constant(facts: Facts, step: int) -> str:
    return f"pKa at 25 °C and ionic strength 0 ({facts.pka[step]:.3f}; it acts as {facts.acting[step]:.3f})"


def _left_out(facts: Facts, amount: float) -> str:
    """What else a method of one equilibrium leaves out here: water, ion pairs."""
    least, most = sorted((facts.free_h, facts.free_oh))
    out = ""
    if least > COUNTS * most:
        scarcer = "hydroxide" if facts.free_oh < facts.free_h else "hydrogen ions"
        out += f"; leaves out that water gives as much as {least:.2g} mol/kg of {scarcer} beside {most:.2g}"
    return out + _pairs_left_out(facts, amount)


def _pairs_left_out(facts: Facts, amount: float) -> str:
    if facts.paired <= COUNTS * amount:
        return ""
    return f"; leaves out ion pairs and condensed species, {facts.paired:.2g} mol/kg here"


def _why_square_root(recipe: Recipe, facts: Facts) -> str:
    left_out = _left_out(facts, recipe.total)
    if recipe.removed > 0.5:
        share = (facts.free_oh - facts.free_h) / recipe.total
        hardly = f"takes the base as hardly protonated (here {100 * share:.3g} % of it)"
        return f"{hardly} and {_constant(facts, -1)}{left_out}"
    share = (facts.free_h - facts.free_oh) / recipe.total
    over = recipe.total / 10.0 ** -facts.pka[0]
    hardly = f"takes the acid as hardly ionized (here about {100 * share:.3g} %, C/Ka {over:.3g})"
    return f"{hardly} and {_constant(facts, 0)}{_later(facts)}{left_out}"


def _later(facts: Facts) -> str:
    """The next step of an acid, where it is under way."""
    if len(facts.acting) < 2 or 10.0 ** (facts.ph - facts.acting[1]) < 10.0 * COUNTS:
        return ""
    return f"; leaves out the next step, pKa {facts.pka[1]:.3f}"


def _why_quadratic(recipe: Recipe, facts: Facts) -> str:
    what = f"counts the ionization, but takes {_constant(facts, 0)}"
    return what + _later(facts) + _left_out(facts, recipe.total)


def _step_of(recipe: Recipe, facts: Facts) -> int:
    """Step (from 0) between whose states a recipe stands."""
    return min(max(int(np.floor(recipe.removed + recipe.strong / recipe.total)), 0), len(facts.pka) - 1)


def _why_ratio(recipe: Recipe, facts: Facts) -> str:
    lost, step = recipe.removed + recipe.strong / recipe.total, _step_of(recipe, facts)
    least = min(lost - step, 1.0 - (lost - step)) * recipe.total
    free = max(facts.free_h, facts.free_oh)
    mixed = f"the amounts as mixed (free hydrogen or hydroxide ions are {100 * free / least:.2g} % of the smaller one)"
    others = _in_other_states(facts, step)
    out = f"takes {_constant(facts, step)} and {mixed}"
    if others > COUNTS:
        out += f"; counts this step alone, where {100 * others:.2g} % of the acid stands in states of another"
    return out + _pairs_left_out(facts, recipe.total)


def _in_other_states(facts: Facts, step: int) -> float:
    """Share of an acid in states that take no part in one of its steps (from 0)."""
    lg = np.concatenate([[0.0], np.cumsum(facts.ph - np.array(facts.acting))])
    weight = 10.0 ** (lg - lg.max())
    return float(1.0 - weight[step : step + 2].sum() / weight.sum())


def _why_strong(recipe: Recipe, facts: Facts) -> str:
    out = []
    if abs(facts.lg_gamma) >= LEAST_LG:
        out.append(f"takes activity as concentration: lg of the coefficient is {_signed(facts.lg_gamma)} here")
    if recipe.strong > 0.0 and abs(facts.pkw - PKW_25) >= 2.0 * LEAST_LG:
        out.append(f"takes pKw at 25 °C, {PKW_25:.3f}, which is {facts.pkw:.3f} at {facts.temperature_c:g} °C")
    left_out = _left_out(facts, abs(recipe.strong)).removeprefix("; ")
    if left_out:
        out.append(left_out)
    return "; ".join(out) or "takes activity as concentration and leaves out water, which matters little here"


_WHY = {
    "square root of Ka C": _why_square_root,
    "quadratic": _why_quadratic,
    RATIO: _why_ratio,
    "strong acid or base alone": _why_strong,
}


def hand_values(
    forms: Sequence[Form],
    molality: Sequence[float],
    temperature_c: float,
    open_co2: float,
    acids: AcidTable,
    model: ActivityModel,
    facts: Facts,
) -> tuple[HandValue, ...]:
    """Every hand method for one solution.

    Parameters
    ----------
    forms, molality : sequences (k,)
        What it holds [mol/kg].
    temperature_c : float
    open_co2 : float
        Molality of carbon dioxide that the air holds [mol/kg]; 0 for a closed vessel.
    acids, model
        As it was predicted with.
    facts : Facts

    Returns
    -------
    tuple of HandValue
    """
    recipe = recipe_of(forms, [m * DENSITY_20C for m in molality], acids)
    out = []
    for name, method in HAND_METHODS.items():
        value = method(recipe) if recipe is not None else float("nan")
        if recipe is None or not np.isfinite(value):
            reason = _not_simple(recipe) or (_no_buffer(recipe) if recipe else "") or "the solution is not of that kind"
            out.append(HandValue(name, float("nan"), float("nan"), f"does not apply: {reason}"))
            continue
        out.append(_judged(name, value, facts, _WHY[name](recipe, facts), name == RATIO and _cancels(recipe, facts)))
    contents = Contents(
        np.array([0, len(forms)]),
        np.arange(len(forms)),
        np.array(molality, float),
        np.array([temperature_c]),
        np.array([open_co2]),
    )
    table = form_table(list(forms), acids)
    ideal = float(solved_ph(contents, table, acids, activity_model("ideal"))[0])
    words = (
        f"takes activity as concentration: the ionic strength is {facts.strength:.3g} mol/kg, lg of the coefficient "
    )
    out.append(
        _judged(
            "full balance without activity coefficients",
            ideal,
            facts,
            words + f"of a single charge {_signed(facts.lg_gamma)}",
        )
    )
    at_25 = Contents(contents.start, contents.form, contents.amount, np.array([25.0]), contents.open_co2)
    cold = float(solved_ph(at_25, table, acids, model)[0])
    words = f"takes constants at 25 °C for a solution at {temperature_c:g} °C"
    out.append(_judged("full balance with 25 °C constants", cold, facts, words))
    out.append(_without_water(contents, table, acids, model, facts))
    return tuple(out)


def _judged(name: str, value: float, facts: Facts, why: str, cancels: bool = False) -> HandValue:
    difference = value - facts.ph
    serves = "comes near here because errors cancel: " if cancels else "serves here: "
    return HandValue(name, value, difference, serves + why if abs(difference) < SERVES else why)


def _cancels(recipe: Recipe, facts: Facts) -> bool:
    """Whether the constant that the ratio takes is off by more than would serve."""
    step = _step_of(recipe, facts)
    return abs(facts.pka[step] - facts.acting[step]) > SERVES


def _without_water(
    contents: Contents, table: FormTable, acids: AcidTable, model: ActivityModel, facts: Facts
) -> HandValue:
    name = "full balance without the ionization of water"
    water = solvent(contents.temperature_c)
    chunk, padding = pad(contents, np.arange(1), table, acids, water, model)
    _, lay, _ = laid_out(chunk, padding, contents, table, acids, water, np.ones(1, bool))
    chunk.kw = chunk.kw * NO_WATER  # the pairs keep their constants, also those that count hydroxide as a part
    ph, strength, solved = solve(chunk, model)
    if lay is not None and solved[0]:
        lay.rest.kw = lay.rest.kw * NO_WATER
        ph, _, _, solved = solve_pairs(lay, model, ph, strength)
    if not solved[0] or not 0.0 < ph[0] < 14.0:
        return HandValue(
            name, float("nan"), float("nan"), "does not apply: without hydroxide the charges cannot balance"
        )
    share = f"leaves out hydroxide, {facts.free_oh:.2g} mol/kg here beside {facts.free_h:.2g} of hydrogen ions"
    return _judged(name, float(ph[0]), facts, share)
