"""Activity models against measured mean activity coefficients, and their slopes against differences."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

from reconcile.chemistry.activity import ACTIVITY_MODELS, DAVIES_RANGE, activity_model, bates_guggenheim
from reconcile.chemistry.ion_data import interaction
from reconcile.chemistry.predict import predict_ph
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


@pytest.mark.parametrize("model", ["davies", "extended", "bates-guggenheim"])
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


def mean_lg(substance: str) -> list[tuple[float, float]]:
    """Molality and measured lg of the mean coefficient at 25 °C, to 1 mol/kg."""
    with PUBLISHED.open(encoding="utf-8", newline="") as file:
        return [
            (float(r["molality"]), float(np.log10(float(r["value"]))))
            for r in csv.DictReader(file)
            if r["quantity"] == "mean_activity_coefficient"
            and r["substance"] == substance
            and r["temperature_C"] == "25"
            and float(r["molality"]) <= 1.0
        ]


@pytest.mark.parametrize(
    ("salt", "cation", "anion"),
    [("HCl", "H+", "Cl-"), ("NaCl", "Na+", "Cl-"), ("KCl", "K+", "Cl-"), ("LiCl", "Li+", "Cl-")],
)
def test_specific_interaction_holds_to_1_molal(salt: str, cation: str, anion: str) -> None:
    """Measured mean coefficients, sources in the csv; the equation with one coefficient is good to 0.02 in lg there."""
    a = debye_hueckel(np.array([25.0]))[0]
    for molality, lg in mean_lg(salt):
        d = bates_guggenheim(a, a, np.array([molality]), np.array(0.0))[0][0]
        coefficient = interaction(cation, 1, anion) if cation == "H+" else interaction(anion, -1, cation)
        assert -d + coefficient * molality == pytest.approx(lg, abs=0.02), molality


def test_specific_interaction_in_the_engine_is_the_formula_by_hand() -> None:
    """Trace of acetic acid half neutralised in 0.5 mol/kg NaCl, pH on the scale on which chloride has -D alone.

    pH + lg gamma(H) is lg of 1/[H+]; with e the coefficients, pKa' = pKa - 2 D + e(Na, Ac) m + e(H, Cl) m on the scale
    without convention, and pH there less e(Na, Cl) m for the convention: written out, all but e(Na, Ac) falls to the
    measured product of HCl.
    """
    m = 0.5
    names = ["acetic acid", "sodium acetate", "NaCl"]
    found = predict_ph(names, [1e-4, 1e-4, m - 1e-4], unit="mol/kg", activity_model="specific")
    a = float(debye_hueckel(np.array([25.0]))[0][0])
    root = np.sqrt(float(found.ionic_strength[0]))
    d = a * root / (1.0 + 1.5 * root)
    sodium_acetate, sodium_chloride = 0.08, 0.03  # Lemire et al. 2013, NEA, appendix B
    ph = 4.756 - d + sodium_acetate * m - sodium_chloride * m
    # free hydrogen ions, 2e-5 of 1e-4 mol/kg, shift the ratio
    h = 10.0 ** -(found.ph[0] - d + (0.12 + sodium_chloride) * m)
    assert found.ph[0] == pytest.approx(ph + np.log10((1e-4 + h) / (1e-4 - h)), abs=2e-3)


def test_truesdell_jones_in_the_engine_is_the_formula_by_hand() -> None:
    """Bicarbonate with carbonate in NaCl: both of size 5.4 without a linear term (Truesdell and Jones 1974)."""
    found = predict_ph(["NaHCO3", "Na2CO3", "NaCl"], [0.01, 0.01, 0.2], unit="mol/kg", activity_model="truesdell-jones")
    a, _, b, _ = (float(v[0]) for v in debye_hueckel(np.array([25.0])))
    root = np.sqrt(float(found.ionic_strength[0]))
    d = a * root / (1.0 + b * 5.4 * root)
    # pK2 10.329: Harned and Scholes 1941, doi:10.1021/ja01851a058; hydroxide moves the ratio by 2 oh / 0.01
    oh = 10.0 ** (found.ph[0] - 13.995 + 0.1)
    assert found.ph[0] == pytest.approx(10.329 - 3.0 * d + np.log10((0.01 - oh) / (0.01 + oh)), abs=0.01)


def test_an_unknown_model_names_those_allowed() -> None:
    with pytest.raises(ValueError, match="davies, extended, ideal"):
        activity_model("pitzer")
