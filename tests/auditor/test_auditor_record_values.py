"""The record's own calculated pH: which are wrong, and which hand method they are.

Hand methods: common practice, no source, but for the constants, which are the library's.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

import reconcile
from reconcile.chemistry.predict import predict_records
from reconcile.chemistry.shortcuts import shortcut_values
from reconcile.records.book import BatchRecords
from reconcile.records.settings import Settings
from tests.simulated.matching import match
from tests.simulated.simulator import simulate


def with_recipes(recipes: list[list[tuple[str, float]]]) -> BatchRecords:
    """A simulated record whose first solutions hold other recipes [mol/L]."""
    records = simulate(1).records
    solutions = records.solutions
    kept = solutions.solution >= len(recipes)
    names = [f.name for f in records.forms]
    forms = list(records.forms)
    solution, form, amount = [], [], []
    from reconcile.records.substances import catalogue

    for index, recipe in enumerate(recipes):
        for name, molar in recipe:
            if name not in names:
                names.append(name)
                forms.append(catalogue().by_name[name])
            solution.append(index)
            form.append(names.index(name))
            amount.append(molar)
    k = len(solution)
    old = np.flatnonzero(kept)
    changed = replace(
        solutions,
        solution=np.r_[np.array(solution, np.intp), solutions.solution[old]],
        form=np.r_[np.array(form, np.intp), solutions.form[old]],
        lot=np.r_[np.full(k, -1, np.intp), solutions.lot[old]],
        amount=np.r_[np.array(amount), solutions.amount[old]],
        u_amount=np.r_[np.zeros(k), solutions.u_amount[old]],
        by_mass=np.r_[np.zeros(k, bool), solutions.by_mass[old]],
        recipe_row=np.r_[np.full(k, -1, np.intp), solutions.recipe_row[old]],
        place=tuple([solutions.place[0]] * k + [solutions.place[i] for i in old]),
        stated=np.r_[np.full(k, "", object), solutions.stated[old]],
        chain_contribution=np.zeros(0, np.intp),
        chain_lot=np.zeros(0, np.intp),
    )
    return replace(records, solutions=changed, forms=tuple(forms))


def test_hand_methods_by_hand() -> None:
    recipes = [
        [("acetic acid", 0.1)],  # sqrt: (4.756 + 1)/2
        [("acetic acid", 0.1), ("sodium acetate", 0.2)],  # ratio: 4.756 + log 2
        [("hydrochloric acid", 0.01)],  # strong: 2
        [("acetic acid", 0.1), ("sodium hydroxide", 0.025)],  # ratio after neutralisation: 4.756 + log(1/3)
        [("sodium acetate", 0.1)],  # base alone: (13.995 + 4.756 - 1)/2
    ]
    records = with_recipes(recipes)
    rows = np.array([int(np.flatnonzero(records.readings_solution == s)[0]) for s in range(len(recipes))], np.intp)
    values = shortcut_values(records, Settings(), rows)
    root, ratio, strong = (
        values[n] for n in ("square root of Ka C", "ratio of base to acid", "strong acid or base alone")
    )
    assert root[0] == pytest.approx(2.878, abs=5e-4)
    assert root[4] == pytest.approx(8.8755, abs=5e-4)
    assert ratio[1] == pytest.approx(4.756 + np.log10(2), abs=5e-4)
    assert ratio[3] == pytest.approx(4.756 - np.log10(3), abs=5e-4)
    assert strong[2] == pytest.approx(2.0, abs=1e-9)
    assert np.isnan(root[1])
    assert np.isnan(ratio[0])
    # the quadratic is the root of h^2 + Ka h - Ka C = 0: substitute it back
    h, ka = 10.0 ** -values["quadratic"][0], 10.0**-4.756
    assert h * h + ka * h == pytest.approx(ka * 0.1, rel=1e-9)
    # without activity coefficients the full balance of the acid alone is the quadratic but for water's own ions
    ideal = values["full balance without activity coefficients"]
    assert ideal[0] == pytest.approx(
        values["quadratic"][0], abs=0.002 + abs(records.readings["temperature"][rows[0]] - 25) * 1e-3
    )


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_a_wrong_hand_calculation_is_named_with_its_short_cut(seed: int) -> None:
    simulated = simulate(seed, ("record_value",))
    found = reconcile.audit(simulated.records, settings=simulated.settings)
    assert match(found.findings, simulated.truth).outcomes[0].outcome == "named"
    finding = next(f for f in found.findings if f.kind == "record_value")
    wanted = {"square root": "square root of Ka C", "ratio of salt to acid": "ratio of base to acid"}
    assert finding.would_explain is not None
    assert finding.would_explain["shortcut"] == wanted[simulated.truth[0].detail["shortcut"]]
    assert "off by" in finding.text


def test_right_hand_calculations_raise_nothing() -> None:
    simulated = simulate(4, hand_calculation=True)
    records = simulated.records
    prediction = predict_records(records, simulated.settings)
    columns = {**records.readings.columns, "ph_calculated": np.round(prediction.ph, 2)}
    right = replace(records, readings=replace(records.readings, columns=columns))
    found = reconcile.audit(right, settings=simulated.settings)
    assert [f for f in found.findings if f.kind == "record_value"] == []
