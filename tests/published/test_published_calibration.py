"""The stated uncertainty of predictions against every published pH, the table's own uncertainty included."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

from reconcile.chemistry.predict import predict_ph
from reconcile.records.settings import Settings

FOLDER = Path(__file__).parent
STANDARD = 0.005
"""Half-width of the tables of standard buffers [pH]: Bates 1962, doi:10.6028/jres.066a.016 (from memory)."""
OFF = {"BORAX_NaOH": 0.12, "NaHCO3_NaOH": 0.12}
"""Half-width of series that the notes on the reference tables give as up to 0.12 off [pH]."""
TABLES = (
    ("primary_standards.csv", "standard_id"),
    ("round_value_buffers_25C.csv", "series"),
    ("other_buffers.csv", "series"),
)


def scores(settings: Settings) -> dict[str, np.ndarray]:
    """(predicted - published) / u of every published point, by series; amounts and temperatures of tables are exact."""
    found: dict[str, np.ndarray] = {}
    for name, column in TABLES:
        with (FOLDER / name).open(encoding="utf-8", newline="") as file:
            rows = list(csv.DictReader(file))
        for series in dict.fromkeys(r[column] for r in rows):
            own = [r for r in rows if r[column] == series]
            parts = [{n: float(v) for n, v in (p.split("=") for p in r["components"].split(";"))} for r in own]
            names = sorted({n for p in parts for n in p})
            prediction = predict_ph(
                names,
                [[p.get(n, 0.0) for n in names] for p in parts],
                [float(r["temperature_C"]) for r in own],
                unit=own[0]["unit"],
                settings=settings,
                u_amounts=0.0,
                u_temperature=0.0,
            )
            half = [OFF.get(series, float(r.get("tolerance") or STANDARD)) for r in own]
            u = np.hypot(prediction.u, np.array(half) / np.sqrt(3.0))
            found[series] = (prediction.ph - np.array([float(r["pH"]) for r in own])) / u
    return found


@pytest.fixture(scope="module")
def every() -> np.ndarray:
    return np.concatenate(list(scores(Settings()).values()))


def test_the_scores_spread_as_a_true_uncertainty_would_make_them(every: np.ndarray) -> None:
    assert len(every) > 600
    assert 0.8 <= np.sqrt(np.mean(every**2)) <= 1.2
    assert 0.93 <= np.mean(np.abs(every) <= 2.0) <= 0.98


def test_no_series_lies_outside_what_is_stated() -> None:
    """Points of a series share its constants: the mean square may reach a few times 1, no more."""
    for series, z in scores(Settings()).items():
        assert np.sqrt(np.mean(z**2)) < 2.5, series


def test_the_check_has_teeth(every: np.ndarray) -> None:
    """An uncertainty stated half or twice as large would be seen."""
    for factor in (0.5, 2.0):
        z = every / factor
        assert not (0.8 <= np.sqrt(np.mean(z**2)) <= 1.2 and 0.93 <= np.mean(np.abs(z) <= 2.0) <= 0.98)
