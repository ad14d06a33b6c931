"""Slopes by implicit differentiation against differences of the solved pH."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from reconcile.chemistry import activity
from reconcile.chemistry.acids import acid_table, build
from reconcile.chemistry.predict import predict_ph
from reconcile.chemistry.water import DENSITY_20C
from reconcile.records.settings import Settings

SUBSTANCES = ["acetic acid", "NaOH", "Na2HPO4", "citric acid", "Tris", "ammonium acetate", "MgCl2 hexahydrate", "borax"]
SUBSTANCES[6] = "magnesium chloride hexahydrate"
MODELS = tuple(activity.ACTIVITY_MODELS)


def cases(count: int = 25, seed: int = 4) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    amounts = 10.0 ** rng.uniform(-3.5, -1.3, (count, len(SUBSTANCES)))
    amounts[rng.random(amounts.shape) < 0.5] = 0.0
    amounts[:, 0] += 0.002  # none empty
    return amounts, rng.uniform(5.0, 55.0, count)


@pytest.mark.parametrize("model", MODELS)
def test_amounts(model: str) -> None:
    amounts, t = cases()
    slopes = predict_ph(SUBSTANCES, amounts, t, activity_model=model).contributions.dense()
    for j in range(len(SUBSTANCES)):
        up, down = amounts.copy(), amounts.copy()
        up[:, j] *= np.exp(1e-5)
        down[:, j] *= np.exp(-1e-5)
        change = (
            predict_ph(SUBSTANCES, up, t, activity_model=model).ph
            - predict_ph(SUBSTANCES, down, t, activity_model=model).ph
        )
        assert slopes[:, j] == pytest.approx(change / 2e-5, rel=1e-4, abs=1e-6)


@pytest.mark.parametrize("open_to_air", [False, True])
@pytest.mark.parametrize("model", MODELS)
def test_temperature(model: str, open_to_air: bool) -> None:
    amounts, t = cases()
    settings = Settings({"prediction.open_to_air": open_to_air})
    found = predict_ph(SUBSTANCES, amounts, t, activity_model=model, settings=settings)
    change = (
        predict_ph(SUBSTANCES, amounts, t + 1e-3, activity_model=model, settings=settings).ph
        - predict_ph(SUBSTANCES, amounts, t - 1e-3, activity_model=model, settings=settings).ph
    )
    assert found.d_temperature == pytest.approx(change / 2e-3, rel=1e-4, abs=1e-7)


@pytest.mark.parametrize("model", MODELS)
def test_constants(model: str) -> None:
    amounts, _ = cases()
    found = predict_ph(SUBSTANCES, amounts, 25.0, activity_model=model)
    slopes = found.constants.dense()
    for column, (acid, step) in enumerate(found.constant_names):
        moved = []
        for move in (1e-5, -1e-5):
            rows = [replace(r, pka=r.pka + move) if (r.acid, r.step) == (acid, step) else r for r in acid_table().rows]
            table = replace(build(rows, use_equations=True, pairs=acid_table().pairs), size=acid_table().size)
            moved.append(predict_ph(SUBSTANCES, amounts, 25.0, activity_model=model, acids=table).ph)
        assert slopes[:, column] == pytest.approx((moved[0] - moved[1]) / 2e-5, rel=1e-4, abs=1e-6), (acid, step)


def test_activity_coefficient_of_davies(monkeypatch: pytest.MonkeyPatch) -> None:
    amounts, t = cases()
    found = predict_ph(SUBSTANCES, amounts, t, activity_model="davies")
    assert np.all(found.ionic_strength < activity.DAVIES_RANGE)
    moved = []
    for coefficient in (0.3 + 1e-5, 0.3 - 1e-5):
        monkeypatch.setattr(activity, "DAVIES_COEFFICIENT", coefficient)
        moved.append(predict_ph(SUBSTANCES, amounts, t, activity_model="davies").ph)
    assert found.d_model == pytest.approx((moved[0] - moved[1]) / 2e-5, rel=1e-4, abs=1e-6)


@pytest.mark.parametrize("model", MODELS)
def test_strong_base_and_buffer_capacity(model: str) -> None:
    amounts, t = cases()
    found = predict_ph(SUBSTANCES, amounts, t, activity_model=model)
    step = 1e-7
    moved = []
    for sign in (1.0, -1.0):
        changed = amounts.copy()
        changed[:, 1] += 1e-5 + sign * step
        moved.append(predict_ph(SUBSTANCES, changed, t, activity_model=model).ph)
    middle = amounts.copy()
    middle[:, 1] += 1e-5
    there = predict_ph(SUBSTANCES, middle, t, activity_model=model)
    assert there.d_titrant == pytest.approx((moved[0] - moved[1]) / (2.0 * step), rel=1e-3)
    assert found.buffer_capacity == pytest.approx(1.0 / found.d_titrant)
    assert np.all(found.buffer_capacity > 0.0)


def test_buffer_capacity_of_an_ideal_buffer_at_its_pka() -> None:
    # Van Slyke 1922, J. Biol. Chem. 52:525: ln 10 * c / 4 at pH = pKa, in the ideal model; water's share is far below
    found = predict_ph(["acetic acid", "sodium acetate"], [0.05, 0.05], unit="mol/kg", activity_model="ideal")
    assert found.ph[0] == pytest.approx(4.756, abs=1e-3)
    assert found.buffer_capacity[0] == pytest.approx(np.log(10.0) * 0.1 / 4.0 * DENSITY_20C, rel=2e-3)


def test_degree_of_ionization() -> None:
    found = predict_ph(["acetic acid"], [[0.1], [0.001]], unit="mol/kg", activity_model="ideal")
    h = 10.0**-found.ph
    assert found.degree.dense()[:, 0] == pytest.approx(10.0**-4.756 / (10.0**-4.756 + h), rel=1e-9)
    assert found.acid_names == ("acetic acid",)
