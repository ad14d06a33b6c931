"""The door predict_ph: names, shapes, units, statuses, carbon dioxide, and a start that loads little."""

from __future__ import annotations

import subprocess
import sys

import numpy as np
import pytest

import reconcile
from reconcile.chemistry.predict import dissolved_co2, predict_ph
from reconcile.records.settings import Settings


def test_the_package_opens_this_door() -> None:
    assert reconcile.predict_ph is predict_ph


def test_names_synonyms_and_formulas_mean_the_same() -> None:
    one = predict_ph(["acetic acid", "sodium hydroxide"], [0.1, 0.03]).ph[0]
    assert predict_ph(["AcOH", "NaOH"], [0.1, 0.03]).ph[0] == one


@pytest.mark.parametrize(
    ("change", "says"),
    [
        ({"substances": ["acetik acid"]}, "acetic acid"),
        ({"unit": "mM"}, "mol/L, mol/kg"),
        ({"activity_model": "other"}, "davies, extended, ideal"),
        ({"amounts": [0.1, 0.2]}, "one column for each of the 1 substances"),
        ({"temperature_c": [20.0, 25.0]}, "temperature_c must be one number or 1"),
        ({"u_amounts": [0.1, 0.2]}, "u_amounts must be"),
    ],
)
def test_mistakes_of_the_caller(change: dict[str, object], says: str) -> None:
    asked: dict[str, object] = {"substances": ["acetic acid"], "amounts": [0.1], **change}
    with pytest.raises(ValueError, match=says):
        predict_ph(asked.pop("substances"), asked.pop("amounts"), **asked)


def test_an_ambiguous_name_lists_its_readings() -> None:
    with pytest.raises(ValueError, match=r"may mean .* or "):
        predict_ph(["EDTA"], [0.1])


def test_a_bad_row_has_a_status_and_harms_no_other() -> None:
    rows = [[0.1, 0.05], [np.nan, 0.05], [-0.1, 0.05], [0.1, np.inf], [0.1, 0.05]]
    found = predict_ph(["acetic acid", "NaOH"], rows, [25.0, 25.0, 25.0, 25.0, 130.0])
    assert found.status.tolist() == ["ok", "not_solved", "not_solved", "not_solved", "not_solved"]
    alone = predict_ph(["acetic acid", "NaOH"], rows[0])
    assert found.ph[0] == alone.ph[0]
    for values in (found.ph, found.u, found.ionic_strength, found.d_temperature):
        assert np.isnan(values[1:]).all()


def test_no_rows_and_no_substances() -> None:
    assert len(predict_ph(["NaCl"], np.zeros((0, 1)))) == 0
    water = predict_ph([], np.zeros((2, 0)))
    assert water.ph == pytest.approx([6.9976, 6.9976], abs=1e-3)  # half of pKw at 25 °C, IAPWS R11-07


def test_litres_are_of_20_c_whatever_the_temperature_read_at() -> None:
    # density of water at 20 °C, 0.998207 kg/L (IAPWS-95)
    by_volume = predict_ph(["acetic acid"], [0.1], 37.0)
    by_mass = predict_ph(["acetic acid"], [0.1 / 0.998207], 37.0, unit="mol/kg")
    assert by_volume.ph[0] == pytest.approx(by_mass.ph[0], abs=1e-6)


def test_statuses() -> None:
    found = predict_ph(
        ["HCl", "NaOH", "NaCl", "acetic acid", "sodium acetate"],
        [
            [0.0, 0.0, 0.0, 0.05, 0.05],
            [0.0, 0.0, 1.0, 0.05, 0.05],
            [0.2, 0.0, 0.0, 0.0, 0.0],
            [0.0, 0.05, 0.0, 0.0, 0.0],
            [0.0, 0.0, 0.05, 0.0, 0.0],
            [0.0, 0.0, 0.0, 3e-4, 3e-4],
            [0.0, 0.0, 0.0, 0.0, 0.0],
        ],
    )
    assert found.status.tolist() == [
        "ok",
        "outside_model",
        "outside_electrode_range",
        "outside_electrode_range",
        "unbuffered",
        "outside_electrode_range",
        "unbuffered",
    ]


def test_limits_of_the_statuses_are_settings() -> None:
    wide = Settings({"status.outside_model_ionic_strength": 2.0, "status.electrode_low_ph": 0.0})
    found = predict_ph(["HCl", "NaCl"], [[0.2, 0.0], [0.01, 1.0]], settings=wide)
    assert found.status.tolist() == ["ok", "ok"]


def test_water_open_to_air_reads_5_6() -> None:
    # common practice, no source: water in equilibrium with air reads about 5.6 at 25 °C
    open_air = Settings({"prediction.open_to_air": True})
    found = predict_ph([], np.zeros((1, 0)), settings=open_air)
    assert found.ph[0] == pytest.approx(5.6, abs=0.03)
    assert dissolved_co2(25.0)[()] == pytest.approx(0.034 * 4.2e-4, rel=0.01)  # 0.034 mol/(kg atm), common practice


def test_open_to_air_the_recipes_own_carbonate_settles_with_the_air() -> None:
    open_air = Settings({"prediction.open_to_air": True})
    carbonate = predict_ph(["Na2CO3"], [[0.01]], settings=open_air)
    hydroxide = predict_ph(["NaOH"], [[0.02]], settings=open_air)
    assert carbonate.ph[0] == pytest.approx(hydroxide.ph[0], abs=1e-9)
    assert carbonate.ph[0] < predict_ph(["Na2CO3"], [[0.01]]).ph[0] - 0.5
    assert carbonate.contributions.dense()[0, 0] == pytest.approx(hydroxide.contributions.dense()[0, 0], rel=1e-9)


def test_the_settings_choose_the_model_unless_the_caller_does() -> None:
    ideal = Settings({"prediction.activity_model": "ideal"})
    by_settings = predict_ph(["KH2PO4"], [0.05], settings=ideal)
    assert by_settings.ph[0] == predict_ph(["KH2PO4"], [0.05], activity_model="ideal").ph[0]
    assert predict_ph(["KH2PO4"], [0.05], settings=ideal, activity_model="davies").ph[0] != by_settings.ph[0]


def test_it_starts_with_numpy_alone() -> None:
    code = (
        "import sys; from reconcile import predict_ph; predict_ph(['acetic acid'], [0.1]);"
        "print([m for m in ('scipy', 'pandas', 'matplotlib', 'openpyxl', 'typer', 'rich') if m in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
