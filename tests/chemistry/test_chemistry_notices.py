"""What a prediction says that it cannot see."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

import reconcile
from reconcile.chemistry.notices import SENTENCES, notices
from reconcile.chemistry.notices_of_record import noted, notices_of_record
from reconcile.chemistry.predict import forms_named, predict_ph, predict_records
from reconcile.pipeline import predict_parts
from reconcile.records.settings import Settings
from reconcile.records.substances import catalogue
from tests.simulated.simulator import simulate

RECIPES = {
    "concentrated": {"sodium chloride": 1.0, "Tris": 0.05, "HCl": 0.03},
    "mixed-solvent": {"ethanol": 1.1, "acetic acid": 0.05, "sodium acetate": 0.05},
    "metal-complexes": {"calcium chloride dihydrate": 0.002, "trisodium citrate": 0.02, "citric acid": 0.01},
    "polyol-borate": {"mannitol": 0.1, "boric acid": 0.05, "NaOH": 0.02},
    "saturated": {"benzoic acid": 0.1},
    "carbon-dioxide-uptake": {"NaOH": 1e-4},
    "carbon-dioxide-loss": {"sodium bicarbonate": 0.05},
    "electrode-glass": {"HF": 0.1, "KF": 0.05},
}
QUIET = {
    "acetate": {"acetic acid": 0.05, "sodium acetate": 0.05},
    "a little alcohol": {"ethanol": 0.1, "acetic acid": 0.05, "sodium acetate": 0.05},
    "traces of calcium": {"calcium chloride dihydrate": 1e-5, "trisodium citrate": 0.02, "citric acid": 0.02},
    "calcium without ligand": {"calcium chloride dihydrate": 0.02, "Tris": 0.05, "HCl": 0.03},
    "benzoate": {"benzoic acid": 0.1, "NaOH": 0.095},
    "lime as in the standard": {"Ca(OH)2": 0.0200},
}


def codes(recipe: dict[str, float], settings: Settings | None = None) -> list[str]:
    settings = settings or Settings()
    forms = forms_named(list(recipe))
    found = predict_ph(forms, list(recipe.values()), unit="mol/kg", settings=settings)
    return [n.code for n in notices(forms, list(recipe.values()), found, 0, settings)]


def test_every_code_has_a_recipe_here() -> None:
    assert set(RECIPES) == set(SENTENCES)


@pytest.mark.parametrize("code", sorted(RECIPES))
def test_each_notice_is_given_where_it_is_due(code: str) -> None:
    assert code in codes(RECIPES[code])


@pytest.mark.parametrize("name", sorted(QUIET))
def test_no_notice_where_none_is_due(name: str) -> None:
    assert codes(QUIET[name]) == []


def test_open_to_air_there_is_nothing_to_say_about_carbon_dioxide() -> None:
    open_air = Settings({"prediction.open_to_air": True})
    for code in ("carbon-dioxide-uptake", "carbon-dioxide-loss"):
        assert code not in codes(RECIPES[code], open_air)


def test_the_limit_of_concentration_is_the_settings() -> None:
    assert codes(RECIPES["concentrated"], Settings({"status.outside_model_ionic_strength": 2.0})) == []


def test_predicted_parts_carry_their_notices() -> None:
    said = predict_parts(["0.05 M borax", "0.3 M mannitol"]).notices
    assert [n.code for n in said] == ["polyol-borate"]
    assert said[0].text.startswith("Mannitol with borate")


def test_substances_named_in_the_tables_exist() -> None:
    from reconcile.chemistry import notices as module
    from reconcile.chemistry.acids import acid_table

    known = catalogue().by_name
    # fructose and xylitol may come with a site's own substances
    assert {name for name in module.POLYOLS if name not in known} <= {"fructose", "xylitol"}
    assert all(name in known for name in module.SOLVENTS)
    assert all(s.substance in (acid_table().index if s.of_acid else known) for s in module.solubilities())
    assert set(module.LIGANDS) - set(acid_table().names) <= {"EGTA", "NTA"}


def test_notices_of_a_record_name_its_solutions() -> None:
    simulated = simulate(1)
    prediction = predict_records(simulated.records, simulated.settings)
    assert notices_of_record(simulated.records, prediction, simulated.settings) == {}
    strict = Settings({**simulated.settings.changed, "status.outside_model_ionic_strength": 0.05})
    said = notices_of_record(simulated.records, prediction, strict)
    assert {n.code for some in said.values() for n in some} == {"concentrated"}


def test_beyond_the_range_u_grows_even_where_one_error_of_all_ions_cancels() -> None:
    """A weak acid alone in salt: hydrogen and its anion share one coefficient, which cancels; in 3 mol/kg of salt pH is
    not known to 0.01 (single ions differ by 0.1 in lg γ from 1 mol/kg on: Robinson and Stokes 1959, from memory)."""
    salt = np.array([0.3, 0.49, 0.51, 0.7, 1.0, 2.0, 3.0, 5.0])
    found = predict_ph(["acetic acid", "NaCl"], np.column_stack([np.full(len(salt), 0.1), salt]), unit="mol/kg")
    assert np.all(found.u[:2] < 0.01)
    assert found.u[2] - found.u[1] < 0.002
    assert np.all(np.diff(found.u[2:]) > 0.0)
    assert found.u[4] > 0.03
    assert found.u[6] > 0.1
    assert set(found.status[2:]) == {"outside_model"}
    assert found.u == pytest.approx(np.sqrt(sum(share**2 for share in found.budget.values())))


def test_a_record_has_one_note_for_each_sort_of_notice(tmp_path: Path) -> None:
    """Nothing is passed over by looking only at solutions that may call for a notice."""
    recipes, readings = ["Batch,Substance,Amount,Unit"], ["Batch,Temperature (°C),pH"]
    for i, name in enumerate([*RECIPES, *RECIPES]):
        recipes += [f"B{i},{substance},{amount},mol/kg" for substance, amount in RECIPES[name].items()]
        readings.append(f"B{i},25.0,7.00")
    for file, lines in (("recipes.csv", recipes), ("readings.csv", readings)):
        (tmp_path / file).write_text("\n".join(lines) + "\n", encoding="utf-8")
    records = reconcile.read(tmp_path / "readings.csv", tmp_path / "recipes.csv")
    settings = Settings()
    prediction = predict_records(records, settings)
    said = [note for note in noted(records, prediction, settings).notes if note.code == "solution-notice"]
    wanted = dict.fromkeys(SENTENCES, 0)
    for reading, solution in enumerate(records.readings_solution.tolist()):
        own = slice(*np.searchsorted(records.solutions.solution, [solution, solution + 1]))
        forms = [records.forms[f] for f in records.solutions.form[own]]
        for notice in notices(forms, records.solutions.amount[own].tolist(), prediction, reading, settings):
            wanted[notice.code] += 1
    assert [int(dict(note.words)["count"]) for note in said] == [n for n in wanted.values() if n]
    assert len(said) > 5
    assert all(note.place.file == "readings.csv" and note.message().endswith(".") for note in said)
    again = noted(noted(records, prediction, settings), prediction, settings)
    assert again.notes == noted(records, prediction, settings).notes
