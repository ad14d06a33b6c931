"""Uncertainty by draws (JCGM 101:2008), where it replaces first order, and carbon dioxide taken up unrecorded."""

from __future__ import annotations

import numpy as np
import pytest

from reconcile.chemistry.acids import acid_table
from reconcile.chemistry.activity import activity_model
from reconcile.chemistry.composition import Contents, form_table
from reconcile.chemistry.drawn import BEND
from reconcile.chemistry.engine import run
from reconcile.chemistry.monte_carlo import Errors, column, draw_ph, spread
from reconcile.chemistry.predict import forms_named, predict_ph
from reconcile.records.settings import Settings

SUBSTANCES = (
    *("acetic acid", "NaOH", "hydrochloric acid", "KH2PO4", "Na2HPO4", "Tris", "citric acid", "NaCl", "borax", "HEPES"),
    *("glycine", "NaHCO3", "imidazole", "potassium hydrogen phthalate", "ammonium chloride"),
)
U_AMOUNT, U_TEMPERATURE = 0.006, 0.3
NO_GAS = Settings({"uncertainty.carbon_dioxide_umol_kg": 0.0})


def random_recipes(count: int, seed: int) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    amounts = np.zeros((count, len(SUBSTANCES)))
    for row in amounts:
        row[rng.choice(len(SUBSTANCES), 3, replace=False)] = 10.0 ** rng.uniform(-3.0, -0.8, 3)
    return amounts, rng.uniform(5.0, 50.0, count)


def by_draws(amounts: np.ndarray, temperature: np.ndarray, draws: int) -> tuple[np.ndarray, np.ndarray]:
    """Root mean square of the draws about the prediction by plain averaging, and by `spread` with a few hundred."""
    count = len(amounts)
    acids, model = acid_table(), activity_model(Settings()["prediction.activity_model"])
    forms = form_table(forms_named(SUBSTANCES), acids)
    row, form = np.nonzero(amounts)
    start = np.concatenate([[0], np.cumsum(np.bincount(row, minlength=count))])
    contents = Contents(start, form, amounts[row, form], temperature, np.zeros(count))
    answers = run(contents, forms, acids, model)
    name = model.u_coefficient
    u_model = Settings()[name] if isinstance(name, str) else name
    errors = Errors(
        np.arange(len(form)), form, np.full(len(form), U_AMOUNT), np.full(count, U_TEMPERATURE), float(u_model)
    )
    ph = draw_ph(contents, np.arange(count), forms, acids, model, errors, answers.ionic_strength, draws)
    plain = np.sqrt(np.mean((ph - answers.ph[:, None]) ** 2, axis=1))
    return plain, spread(contents, np.arange(count), forms, acids, model, errors, answers, 512)


def test_the_budget_agrees_with_draws_within_5_percent() -> None:
    """40 random recipes, 4000 draws each; tests/bench/budget_drawn.py does 200 with 100000."""
    amounts, temperature = random_recipes(40, 5)
    found = predict_ph(
        SUBSTANCES,
        amounts,
        temperature,
        unit="mol/kg",
        settings=NO_GAS,
        u_amounts=U_AMOUNT,
        u_temperature=U_TEMPERATURE,
    )
    plain, _ = by_draws(amounts, temperature, 4000)
    # the draws themselves are good to about 1.1 % (4000 normal draws)
    assert found.u == pytest.approx(plain, rel=0.05 + 0.02)
    assert np.mean(np.abs(found.u / plain - 1.0) < 0.05) > 0.94


def test_few_draws_with_first_order_subtracted_agree_with_many() -> None:
    amounts, temperature = random_recipes(30, 6)
    plain, few = by_draws(amounts, temperature, 20_000)
    assert few == pytest.approx(plain, rel=0.06)


def test_near_equivalence_draws_take_the_place_of_first_order() -> None:
    """Strong acid against strong base: first order gives hundreds of pH, where the curve spans ten at most."""
    recipe = ["hydrochloric acid", "NaOH"]
    found = predict_ph(recipe, [0.02, 0.02], settings=NO_GAS, u_amounts=0.005)
    first_order = 0.005 * np.hypot(*found.contributions.dense()[0])
    assert first_order > 100.0
    assert 1.0 < found.u[0] < 5.0
    # all but the pH range between the two excesses is nearly uniform: pH of +-1e-4 mol/L of excess, 4 and 10
    assert found.u[0] == pytest.approx(3.0, abs=0.6)
    assert found.u[0] ** 2 == pytest.approx(sum(share[0] ** 2 for share in found.budget.values()))


def test_first_order_stays_where_the_curve_is_straight() -> None:
    found = predict_ph(["acetic acid", "sodium acetate"], [0.05, 0.05], settings=NO_GAS, u_amounts=0.005)
    shares = found.contributions.dense()[0] * 0.005
    assert found.budget["strength"][0] == pytest.approx(np.hypot(*shares), rel=1e-12)
    assert found.budget["strength"][0] < BEND


def test_draws_fill_every_slice_of_a_normal_distribution() -> None:
    for number in (0, 7, 1234567):
        z = column(number, 1000)
        assert np.all(np.diff(np.sort(z)) > 0.0)
        # quantiles of the normal distribution: Abramowitz and Stegun 1964, table 26.1 (P(1.96) = 0.975002)
        assert np.count_nonzero(z < 1.96) in (974, 975, 976)
        assert z.std() == pytest.approx(1.0, abs=0.01)
    assert not np.array_equal(column(0, 100), column(1, 100))


def test_carbon_dioxide_makes_dilute_alkaline_and_unbuffered_solutions_uncertain() -> None:
    found = predict_ph(
        ["NaOH", "NaCl", "Tris", "HCl"], [[1e-4, 0, 0, 0], [1e-2, 0, 0, 0], [0, 0.1, 0, 0], [0, 0, 0.05, 0.025]]
    )
    share = found.budget["carbon dioxide"]
    # by hand: at pH 10 a molecule loses 1.3 protons (pK2 10.33), so that 14 µmol/kg take 18 of 100 of hydroxide,
    # lg(0.82) = -0.087; at pH 12 it loses 2, so that they take 28 of 10,000, lg(0.9972) = -0.0012; over sqrt 3
    assert share[0] == pytest.approx(0.087 / np.sqrt(3.0), rel=0.05)
    assert share[1] == pytest.approx(0.0012 / np.sqrt(3.0), rel=0.05)
    # water in air reads 5.6 instead of 7.0 (practice of the trade; common practice, no source)
    assert share[2] == pytest.approx(1.4 / np.sqrt(3.0), rel=0.06)
    assert share[3] < 0.001


def test_the_slope_and_solving_again_agree_where_they_meet() -> None:
    """Hydroxide from dilute to less dilute: the share falls steadily over the border between the two ways."""
    lg = np.linspace(-3.2, -2.2, 60)
    share = predict_ph(["NaOH"], 10.0 ** lg[:, None]).budget["carbon dioxide"]
    assert np.all(np.diff(share) < 0.0)
    assert np.abs(np.diff(np.log(share))).max() < 0.08


def test_open_to_air_leaves_no_share() -> None:
    open_air = Settings({"prediction.open_to_air": True})
    assert predict_ph(["NaOH"], [1e-3], settings=open_air).budget["carbon dioxide"][0] == 0.0


def test_a_given_amount_of_carbon_dioxide_makes_carbonate_of_its_base() -> None:
    """CO2 + 2 NaOH is Na2CO3 and water: the same solution, weighed in another way."""
    names = ["NaOH", "carbon dioxide", "sodium carbonate"]
    found = predict_ph(names, [[0.010, 0.001, 0.0], [0.008, 0.0, 0.001], [0.010, 0.0, 0.0]])
    assert found.ph[0] == pytest.approx(found.ph[1], abs=1e-9)
    assert found.ph[0] < found.ph[2] - 0.05
