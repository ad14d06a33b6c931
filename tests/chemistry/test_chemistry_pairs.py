"""Ion pairs and condensed species: an independent solution, slopes, choices, and what they do to published values."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from equilibrium_by_species import ph_by_species

from reconcile.chemistry import engine, pair_table
from reconcile.chemistry.acids import acid_table
from reconcile.chemistry.activity import ACTIVITY_MODELS
from reconcile.chemistry.composition import Contents, form_table
from reconcile.chemistry.pair_table import CHOICES, pairs
from reconcile.chemistry.predict import forms_named, predict_ph
from reconcile.records.settings import ION_PAIRS, Settings, SettingsError

RECIPES = {
    "borax": {"borax": 0.05},
    "borate and acid": {"borax": 0.0125, "HCl": 0.0205},
    "much borate": {"boric acid": 0.6, "NaOH": 0.2},
    "lime": {"Ca(OH)2": 0.0203},
    "magnesia": {"magnesium chloride hexahydrate": 0.001, "NaOH": 0.0005},
    "fluoride": {"HF": 0.2, "KF": 0.1},
    "phosphate": {"Na2HPO4": 0.05, "KH2PO4": 0.02, "NaCl": 0.1},
    "citrate": {"citric acid": 0.05, "NaOH": 0.12, "KCl": 0.05},
    "carbonate": {"NaHCO3": 0.025, "Na2CO3": 0.025},
}


def predicted(recipe: dict[str, float], celsius: float, choice: str, model: str = "bates-guggenheim"):
    return predict_ph(
        list(recipe),
        list(recipe.values()),
        celsius,
        unit="mol/kg",
        activity_model=model,
        settings=Settings({"prediction.ion_pairs": choice}),
    )


@pytest.mark.parametrize("choice", ["none", "complexes", "all"])
@pytest.mark.parametrize("name", sorted(RECIPES))
def test_an_independent_solution_agrees(name: str, choice: str) -> None:
    recipe = RECIPES[name]
    for celsius, model in ((25.0, "bates-guggenheim"), (50.0, "davies")):
        ph, strength = ph_by_species(forms_named(list(recipe)), list(recipe.values()), celsius, CHOICES[choice], model)
        found = predicted(recipe, celsius, choice, model)
        assert found.ph[0] == pytest.approx(ph, abs=1e-7)
        assert found.ionic_strength[0] == pytest.approx(strength, rel=1e-6)


@pytest.mark.parametrize("name", sorted(RECIPES))
def test_pairs_move_what_they_take_part_in(name: str) -> None:
    none, all_ = (predicted(RECIPES[name], 25.0, choice).ph[0] for choice in ("none", "all"))
    assert abs(none - all_) > 0.001


@pytest.mark.parametrize("model", sorted(ACTIVITY_MODELS))
def test_slopes_with_all_pairs(model: str) -> None:
    """Against differences: amounts, temperature, constants, strong base."""
    for recipe in (RECIPES["much borate"], RECIPES["citrate"], RECIPES["lime"], RECIPES["fluoride"]):
        names, amounts = list(recipe), np.array(list(recipe.values()))
        settings = Settings({"prediction.ion_pairs": "all"})

        def ph(a=amounts, t=25.0, names=names, settings=settings):
            return predict_ph(names, a, t, unit="mol/kg", activity_model=model, settings=settings).ph[0]

        found = predict_ph(names, amounts, 25.0, unit="mol/kg", activity_model=model, settings=settings)
        for j in range(len(names)):
            step = np.zeros(len(names))
            step[j] = 1e-5
            slope = (ph(amounts * np.exp(step)) - ph(amounts * np.exp(-step))) / 2e-5
            assert found.contributions.dense()[0, j] == pytest.approx(slope, rel=2e-4, abs=1e-6)
        assert found.d_temperature[0] == pytest.approx((ph(t=25.001) - ph(t=24.999)) / 2e-3, rel=1e-3, abs=1e-7)
        if "NaOH" in names:
            step = np.where(np.array(names) == "NaOH", 1e-7, 0.0)
            slope = (ph(amounts + step) - ph(amounts - step)) / 2e-7 / 0.998207  # density of water at 20 °C, IAPWS-95
            assert found.d_titrant[0] == pytest.approx(slope, rel=1e-3)


def test_slopes_in_the_constants_with_pairs() -> None:
    recipe = RECIPES["borate and acid"]
    settings = Settings({"prediction.ion_pairs": "all"})
    found = predict_ph(list(recipe), list(recipe.values()), 25.0, unit="mol/kg", settings=settings)
    moved = []
    for move in (1e-5, -1e-5):
        table = acid_table(ion_pairs="all")
        index = table.index["boric acid"]
        p = table.p.copy()
        p[table.first[index]] += move
        shifted = replace(table, p=p)
        moved.append(
            predict_ph(list(recipe), list(recipe.values()), 25.0, unit="mol/kg", settings=settings, acids=shifted).ph[0]
        )
    column = found.constant_names.index(("boric acid", 1))
    # beyond 1 for an acid alone in a buffer: the polyborates follow
    assert found.constants.dense()[0, column] == pytest.approx((moved[0] - moved[1]) / 2e-5, rel=1e-4)


def test_the_pairs_own_uncertainty_joins_the_constants(monkeypatch: pytest.MonkeyPatch) -> None:
    sure = tuple(replace(pair, u=0.0, u_dh=0.0) for pair in pairs("complexes"))
    unsure = tuple(replace(pair, u=0.2) if pair.name == "CaOH+" else pair for pair in sure)
    forms, acids = form_table(forms_named(["Ca(OH)2"]), acid_table()), acid_table()
    one = Contents(np.array([0, 1]), np.array([0]), np.array([0.02]), np.array([25.0]), np.zeros(1))
    model = ACTIVITY_MODELS["davies"]
    base, with_u = (engine.run(one, forms, replace(acids, pairs=p), model) for p in (sure, unsure))
    moved = []
    for move in (1e-4, -1e-4):
        shifted = tuple(replace(pair, constant=pair.constant + move) if pair.name == "CaOH+" else pair for pair in sure)
        moved.append(float(engine.run(one, forms, replace(acids, pairs=shifted), model).ph[0]))
    slope = (moved[0] - moved[1]) / 2e-4
    share = np.sqrt(with_u.u_constants[0] ** 2 - base.u_constants[0] ** 2)
    assert share == pytest.approx(abs(slope) * 0.2, rel=1e-5)


def test_rows_without_pairs_keep_their_values() -> None:
    rows = [[0.05, 0.0, 0.02], [0.0, 0.05, 0.02], [0.05, 0.05, 0.02]]
    names = ["boric acid", "acetic acid", "NaOH"]
    every, none = (
        predict_ph(names, rows, settings=Settings({"prediction.ion_pairs": choice})) for choice in ("all", "none")
    )
    assert every.ph[1] == none.ph[1]
    assert every.ph[0] != none.ph[0]
    assert every.u[1] == none.u[1]


def test_carbonate_open_to_air_with_pairs() -> None:
    """Dissolved carbon dioxide is held by the air; sodium carbonate pairs draw on it."""
    settings = Settings({"prediction.ion_pairs": "all", "prediction.open_to_air": True})
    found = predict_ph(["Na2CO3"], [[0.05]], 25.0, settings=settings)
    moved = [predict_ph(["Na2CO3"], [[0.05]], t, settings=settings).ph[0] for t in (25.001, 24.999)]
    assert found.d_temperature[0] == pytest.approx((moved[0] - moved[1]) / 2e-3, rel=1e-3)
    assert found.ph[0] < predict_ph(["Na2CO3"], [[0.05]], settings=Settings({"prediction.open_to_air": True})).ph[0]


def test_a_choice_that_does_not_exist_lists_the_choices() -> None:
    with pytest.raises(ValueError, match="none, complexes, all"):
        pairs("some")


def test_a_species_made_of_what_no_table_holds_is_refused() -> None:
    with pytest.raises(ValueError, match="no table of ions holds"):
        pair_table._pair({"pair": "X", "parts": "Zz+|OH-"})


def test_each_species_is_switched_by_its_name() -> None:
    """Alone, each moves what it takes part in; a list of all is "all", one of none is "none"."""
    assert {pair.name for pair in pairs("all")} == set(ION_PAIRS)
    for name in ION_PAIRS:
        (alone,) = pairs((name,))
        assert alone.name == name
        assert name not in {pair.name for pair in pairs(tuple(n for n in ION_PAIRS if n != name))}
    assert pairs(ION_PAIRS) == pairs("all")
    assert {n.name for n in pairs(("complexes", "NaHPO4-"))} == {n.name for n in pairs("complexes")} | {"NaHPO4-"}
    assert pairs(()) == pairs("none")
    recipe = RECIPES["phosphate"]
    forms, amounts = forms_named(list(recipe)), list(recipe.values())
    found = {
        names: predict_ph(forms, amounts, settings=Settings.from_sections({"prediction": {"ion_pairs": list(names)}}))
        for names in ((), ("NaHPO4-",), ("KHPO4-",), ("NaHPO4-", "KHPO4-"), ("NaCO3-",))
    }
    ph = {names: float(prediction.ph[0]) for names, prediction in found.items()}
    assert ph["NaCO3-",] == ph[()]
    assert ph["NaHPO4-", "KHPO4-"] < ph["NaHPO4-",] < ph["KHPO4-",] < ph[()]  # more sodium than potassium here


def test_a_species_that_does_not_exist_is_refused() -> None:
    with pytest.raises(ValueError, match=r"NaCl.*none, complexes, all"):
        pairs(("NaCl",))
    with pytest.raises(SettingsError, match=r"a list of these and of HF2-"):
        Settings.from_sections({"prediction": {"ion_pairs": ["NaCl"]}})
    with pytest.raises(SettingsError):
        Settings.from_sections({"prediction": {"activity_model": ["davies"]}})
    with pytest.raises(SettingsError):
        Settings.from_sections({"prediction": {"ion_pairs": [1]}})
