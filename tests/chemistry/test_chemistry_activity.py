"""Activity models against measured mean activity coefficients, and their slopes against differences."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

from reconcile.chemistry.activity import ACTIVITY_MODELS, DAVIES_RANGE, activity_model
from reconcile.chemistry.temperature import debye_hueckel

PUBLISHED = Path(__file__).parents[1] / "published" / "activity_reference.csv"
# Kielland 1937, J. Am. Chem. Soc. 59:1675, table I, from memory
SIZES = {"HCl": (9.0, 3.0), "NaCl": (4.25, 3.0), "KCl": (3.0, 3.0)}


def measured() -> list[dict[str, str]]:
    with PUBLISHED.open(encoding="utf-8", newline="") as file:
        return [
            r
            for r in csv.DictReader(file)
            if r["quantity"] == "mean_activity_coefficient" and r["substance"] in SIZES and float(r["molality"]) <= 0.1
        ]


@pytest.mark.parametrize("model", ["davies", "extended"])
@pytest.mark.parametrize("row", measured(), ids=lambda r: f"{r['substance']}-{r['molality']}-{r['source'][:8]}")
def test_mean_activity_coefficients_to_0_1_molal_within_3_percent(row: dict[str, str], model: str) -> None:
    """Measured values, sources in the csv (Kaye and Laby seen; Hamer and Wu, Robinson and Stokes from memory)."""
    a, _, b, _ = debye_hueckel(np.array([float(row["temperature_C"])]))
    strength = np.array([float(row["molality"])])
    d = [ACTIVITY_MODELS[model].exponent(a, b, strength, np.array(s))[0] for s in SIZES[row["substance"]]]
    assert 10.0 ** -np.mean(d) == pytest.approx(float(row["value"]), rel=0.03)


@pytest.mark.parametrize("name", sorted(ACTIVITY_MODELS))
def test_slopes_are_those_of_the_values(name: str) -> None:
    model = ACTIVITY_MODELS[name]
    a, b, size = np.full(6, 0.51), np.full(6, 0.33), np.full(6, 4.5)
    strength = np.array([1e-7, 1e-4, 0.01, 0.1, 0.4, 1.5])
    _, d_i, d_a, d_b, _ = model.exponent(a, b, strength, size)

    def slope(move: str, step: np.ndarray) -> np.ndarray:
        up = {"a": a, "b": b, "strength": strength, move: {"a": a, "b": b, "strength": strength}[move] + step}
        down = {**up, move: {"a": a, "b": b, "strength": strength}[move] - step}
        high = model.exponent(up["a"], up["b"], up["strength"], size)[0]
        low = model.exponent(down["a"], down["b"], down["strength"], size)[0]
        return (high - low) / (2.0 * step)

    assert d_i == pytest.approx(slope("strength", 1e-5 * strength), rel=1e-6, abs=1e-9)
    assert d_a == pytest.approx(slope("a", np.full(6, 1e-6)), rel=1e-6, abs=1e-9)
    assert d_b == pytest.approx(slope("b", np.full(6, 1e-6)), rel=1e-6, abs=1e-9)


def test_beyond_its_range_davies_stays_between_0_and_its_largest_value() -> None:
    strength = np.linspace(DAVIES_RANGE, 12.0, 40)
    d, *_, d_c = ACTIVITY_MODELS["davies"].exponent(np.full(40, 0.51), np.full(40, 0.33), strength, np.array(0.0))
    assert np.all(d > 0.0)
    assert np.all(np.diff(np.abs(d_c)) > 0.0)  # what it is worth goes on falling


def test_an_unknown_model_names_those_allowed() -> None:
    with pytest.raises(ValueError, match="davies, extended, ideal"):
        activity_model("pitzer")
