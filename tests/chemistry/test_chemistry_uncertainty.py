"""The uncertainty budget against Monte Carlo (JCGM 101:2008): draws of every input, solved again."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from reconcile.chemistry import activity
from reconcile.chemistry.acids import acid_table, build
from reconcile.chemistry.predict import predict_ph
from reconcile.chemistry.temperature import u_at
from reconcile.chemistry.uncertainty import combined, of_lots
from reconcile.records.settings import Settings

DRAWS = 4000
RECIPES = {
    "acetate": (["acetic acid", "sodium acetate"], [0.06, 0.04], 25.0),
    "phosphate": (["KH2PO4", "Na2HPO4"], [0.025, 0.025], 37.0),
    "Tris": (["Tris", "HCl"], [0.05, 0.03], 20.0),
    "weak acid alone": (["lactic acid"], [0.01], 25.0),
    "strong acid": (["HCl", "NaCl"], [0.02, 0.05], 25.0),
}
# 4000 draws of a normal spread give its standard deviation to 1.1 %; 5 % leaves four of those, and some curvature
CLOSE = 0.05


def drawn(rng: np.random.Generator, u: float) -> np.ndarray:
    return rng.normal(0.0, u, DRAWS)


@pytest.mark.parametrize("name", sorted(RECIPES))
def test_shares_of_amounts_and_temperature(name: str) -> None:
    substances, amounts, temperature = RECIPES[name]
    rng = np.random.default_rng(7)
    u_amounts, u_t = 0.004, 0.3
    found = predict_ph(substances, amounts, temperature, u_amounts=u_amounts, u_temperature=u_t)
    factors = 1.0 + rng.normal(0.0, u_amounts, (DRAWS, len(amounts)))
    many = predict_ph(substances, np.array(amounts) * factors, temperature).ph
    assert found.budget["strength"][0] == pytest.approx(many.std(), rel=CLOSE)
    many = predict_ph(substances, np.tile(amounts, (DRAWS, 1)), temperature + drawn(rng, u_t)).ph
    assert found.budget["temperature"][0] == pytest.approx(many.std(), rel=CLOSE, abs=2e-5)


@pytest.mark.parametrize("name", ["acetate", "phosphate", "Tris", "weak acid alone"])
def test_share_of_the_constants(name: str) -> None:
    """Every constant of the recipe drawn from its u at the recipe's temperature, 400 tables; pKw from its own u."""
    substances, amounts, temperature = RECIPES[name]
    rng = np.random.default_rng(8)
    table = acid_table()
    found = predict_ph(substances, amounts, temperature)
    met = [table.constant_names.index(c) for c in found.constant_names]
    u = u_at(table.u[met], table.u_dh[met], table.u_dcp[met], np.full(len(met), temperature))
    ph = []
    for _ in range(400):
        rows = list(table.rows)
        for q, move in zip(met, rng.normal(0.0, u), strict=True):
            rows[q] = replace(rows[q], pka=rows[q].pka + move)
        ph.append(float(predict_ph(substances, amounts, temperature, acids=build(rows)).ph[0]))
    assert found.budget["pKa"][0] == pytest.approx(np.std(ph), rel=0.15)  # 400 draws: 3.5 % times four


def test_share_of_the_activity_model(monkeypatch: pytest.MonkeyPatch) -> None:
    substances, amounts, temperature = RECIPES["phosphate"]
    found = predict_ph(substances, amounts, temperature, activity_model="davies")
    moved = []
    for coefficient in (0.2, 0.4):  # the range in which Davies' coefficient is quoted
        monkeypatch.setattr(activity, "DAVIES_COEFFICIENT", coefficient)
        moved.append(float(predict_ph(substances, amounts, temperature, activity_model="davies").ph[0]))
    assert found.budget["activity model"][0] == pytest.approx(abs(moved[1] - moved[0]) / 2.0, rel=0.02)


def test_everything_at_once() -> None:
    substances, amounts, temperature = RECIPES["acetate"]
    rng = np.random.default_rng(9)
    settings = Settings({"uncertainty.linear_coefficient": 0.0})
    found = predict_ph(substances, amounts, temperature, settings=settings, u_amounts=0.005, u_temperature=0.5)
    factors = 1.0 + rng.normal(0.0, 0.005, (DRAWS, 2))
    many = predict_ph(substances, np.array(amounts) * factors, temperature + drawn(rng, 0.5)).ph
    many = many + found.constants.dense()[0, 0] * drawn(rng, 0.01)
    assert found.u[0] == pytest.approx(many.std(), rel=CLOSE)


def test_shares_combine_to_the_whole() -> None:
    for substances, amounts, temperature in RECIPES.values():
        found = predict_ph(substances, amounts, temperature)
        assert found.u[0] ** 2 == pytest.approx(sum(float(share[0]) ** 2 for share in found.budget.values()))
    assert combined({"one": np.array([3.0]), "other": np.array([4.0])})[0] == 5.0


def test_beyond_the_models_range_the_uncertainty_grows() -> None:
    found = predict_ph(["KH2PO4", "Na2HPO4"], [[0.02, 0.02], [0.1, 0.1], [0.3, 0.3], [0.8, 0.8]])
    assert np.all(np.diff(found.budget["activity model"]) > 0.0)
    assert found.budget["activity model"][3] > 5.0 * found.budget["activity model"][0]
    assert found.status.tolist() == ["ok", "ok", "outside_model", "outside_model"]


def test_a_missing_heat_of_ionization_costs_more_per_kelvin() -> None:
    found = predict_ph(["sorbic acid", "NaOH"], [[0.01, 0.005]] * 2, [25.0, 45.0])  # no enthalpy in the table
    known = predict_ph(["acetic acid", "NaOH"], [[0.01, 0.005]] * 2, [25.0, 45.0])
    assert found.budget["pKa"][1] > 5.0 * found.budget["pKa"][0]
    assert known.budget["pKa"][1] < 2.0 * known.budget["pKa"][0]


def test_effects_of_one_lot_add_before_they_are_squared() -> None:
    row, lot = np.array([0, 0, 1, 1]), np.array([0, 0, 0, 1])
    share = of_lots(row, lot, np.array([0.5, -0.5, 0.5, -0.5]), np.array([0.01, 0.02]), 2)
    assert share == pytest.approx([0.0, np.hypot(0.005, 0.01)])
