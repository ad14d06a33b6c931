"""Any mixture of rows leads to the constants that the simulator was given, within the uncertainty stated."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from made_records import Made, Truth

import reconcile
from reconcile.records.pka_results import PkaFit

NAME = "acid K"
HALF_WAY = [(0.05, 0.05 * share) for share in (0.1, 0.3, 0.5, 0.7, 0.9)]
DILUTIONS = [(0.1, 0.0), (0.05, 0.0), (0.02, 0.0)]
ONE, TWO, THREE = Truth(), Truth("succinic acid"), Truth("citric acid")
AMINE = Truth("Tris")
Make = Callable[[], Made]

CASES: list[tuple[str, Make, Truth, dict[str, Any]]] = [
    ("dilutions and partly neutralised", lambda: Made(2).solutions(ONE, NAME, DILUTIONS + HALF_WAY), ONE, {}),
    (
        "dilutions, neutralised and titrated",
        lambda: Made(3).solutions(ONE, NAME, DILUTIONS + HALF_WAY).titration(ONE, NAME),
        ONE,
        {"free": ("strength",)},
    ),
    ("two steps, number by AICc", lambda: Made(4).titration(TWO, NAME, added=range(2, 50, 3)), TWO, {}),
    ("three steps, number by AICc", lambda: Made(5).titration(THREE, NAME, added=range(2, 74, 3)), THREE, {}),
    (
        "an amine weighed as hydrochloride",
        lambda: Made(6).titration(Truth("Tris", ion=-1.0), NAME),
        AMINE,
        {"charge": 1, "counter_ion": "chloride:1"},
    ),
    (
        "an amine weighed as base, with acid",
        lambda: Made(7).titration(AMINE, NAME, titrant="hydrochloric acid"),
        AMINE,
        {"charge": 1, "protons_removed": 1.0},
    ),
    (
        "a sodium salt with acid",
        lambda: Made(8).titration(Truth(ion=1.0), NAME, titrant="hydrochloric acid"),
        ONE,
        {"protons_removed": 1.0, "counter_ion": "sodium:1"},
    ),
    (
        "beside a known buffer",
        lambda: Made(9).solutions(
            ONE, NAME, [(0.02, 0.01 + 0.02 * s) for s in np.linspace(0.1, 1.2, 9)], also={"phosphoric acid": 0.01},
        ),
        ONE,
        {"steps": 1},
    ),
]  # fmt: skip


def fit(folder: Path, made: Made, **about: Any) -> PkaFit:
    return reconcile.fit_pka(made.write(folder), acid=NAME, **about)


@pytest.mark.parametrize(("make", "truth", "about"), [c[1:] for c in CASES], ids=[c[0] for c in CASES])
def test_the_constants_come_back(tmp_path: Path, make: Make, truth: Truth, about: dict[str, Any]) -> None:
    found = fit(tmp_path, make(), **about)
    assert len(found.steps) == len(truth.pka)
    for step, pka in zip(found.steps, truth.pka, strict=True):
        assert step.standing == "found"
        assert step.pka is not None
        assert step.u is not None
        assert abs(step.pka - pka) < 3.0 * step.u
        assert step.u < 0.1


def test_a_counter_ion_that_is_an_acid_itself(tmp_path: Path) -> None:
    """An amine as its maleate: the maleate's own steps take part in the balance."""
    made = Made(12)
    conc, base = 0.04, np.linspace(0.002, 0.07, 12)
    # as weighed BH+ and hydrogen maleate: no unchanging ion, both acids in full
    ph = AMINE.ph(conc, base, also={"maleic acid": conc})
    for i, shown in enumerate(AMINE.read(ph, made.rng)):
        made.reading(batch=f"B{i}", celsius=25.0, meter="M-1", ph=shown)
        made.recipes.append((f"B{i}", NAME, "A-1", conc, "mol/L", None, None))
        made.recipes.append((f"B{i}", "sodium hydroxide", "N-1", float(base[i]), "mol/L", None, None))
    found = fit(tmp_path, made, charge=1, counter_ion="maleate:1", steps=1)
    assert found.steps[0].pka == pytest.approx(AMINE.pka[0], abs=3.0 * (found.steps[0].u or 0.0))


def test_the_enthalpy_comes_back_from_several_temperatures(tmp_path: Path) -> None:
    made = Made(13)
    for i, celsius in enumerate((10.0, 20.0, 30.0, 40.0)):
        made.titration(AMINE, NAME, f"T{i}", titrant="hydrochloric acid", celsius=celsius)
    found = fit(tmp_path, made, charge=1, protons_removed=1.0, steps=1)
    one = found.steps[0]
    assert one.dh_origin == "fitted"
    # the simulator follows acids.csv: Tris 47.45 kJ/mol (Goldberg, Kishore and Lennen 2002)
    assert one.dh_kj_mol == pytest.approx(47.45, abs=3.0 * (one.u_dh or 0.0))
    assert one.pka_25c == pytest.approx(AMINE.pka[0], abs=3.0 * (one.u_25c or 0.0))
    assert "Van 't Hoff enthalpy of ionization" in found.conclusion


def test_a_strength_that_is_wrong_comes_out_when_it_is_set_free(tmp_path: Path) -> None:
    wrong = Truth(factor=1.05)
    made = Made(14).titration(wrong, NAME, added=range(2, 32, 2))
    found = fit(tmp_path, made, steps=1, free=("strength",))
    assert found.strength.value == pytest.approx(1.05, abs=3.0 * (found.strength.u or 0.0))
    assert found.steps[0].pka == pytest.approx(wrong.pka[0], abs=3.0 * (found.steps[0].u or 0.0))
    assert "Strength factor (actual over stated) 1.0" in found.conclusion


def test_apparent_minus_thermodynamic_at_the_ionic_strength_of_the_series(tmp_path: Path) -> None:
    """Davies' equation by hand, I = 0.05: -0.085 for HA/A-, -0.256 for the second step (25 °C, A = 0.509)."""
    made = Made(15).titration(TWO, NAME, conc=0.05, added=range(10, 48, 2))
    found = fit(tmp_path, made, steps=2)
    for step, charge in zip(found.steps, (0, -1), strict=True):
        strength = step.ionic_strength or 0.0
        d = 0.509 * (strength**0.5 / (1 + strength**0.5) - 0.3 * strength)
        expected = d * (charge**2 - (charge - 1) ** 2)
        assert (step.pka_apparent or 0) - (step.pka or 0) == pytest.approx(expected, abs=0.003)


def test_a_rejected_reading_is_named_and_the_result_stands_with_and_without(tmp_path: Path) -> None:
    clean, spoilt = Made(16).titration(ONE, NAME), Made(16).titration(ONE, NAME)
    row = list(spoilt.readings[6])
    row[6] = round(row[6] + 0.3, 3)
    spoilt.readings[6] = tuple(row)
    whole, found = fit(tmp_path, clean, steps=1), fit(tmp_path, spoilt, steps=1)
    assert found.rejected.tolist() == [5]
    assert 'rejected by a test at a family-wise 1 % (record.xlsx, sheet "Readings", row 7)' in found.conclusion
    assert found.steps[0].with_all is not None
    assert found.steps[0].pka == pytest.approx(whole.steps[0].pka, abs=whole.steps[0].u or 0.0)
    assert abs(found.steps[0].with_all[0] - (found.steps[0].pka or 0.0)) > 0.01


def test_void_and_averaged_readings(tmp_path: Path) -> None:
    made = Made(17).titration(ONE, NAME)
    head = (*made.readings[0], "Standing", "Readings averaged")
    rows = [(*row, "void" if i == 3 else None, 4 if i == 4 else 1) for i, row in enumerate(made.readings[1:])]
    rows[3] = (*rows[3][:6], 9.0, *rows[3][7:])
    made.readings = [head, *rows]
    found = fit(tmp_path, made, steps=1)
    assert found.status.tolist().count("void") == 1
    assert found.steps[0].pka == pytest.approx(ONE.pka[0], abs=0.05)
    assert found.u_reading[4] < 0.75 * np.nanmedian(found.u_reading)


def test_the_budget_adds_up_and_the_reading_is_a_small_part_of_a_good_titration(tmp_path: Path) -> None:
    found = fit(tmp_path, Made(18).titration(ONE, NAME), steps=1)
    one = found.steps[0]
    assert sum(share.u**2 for share in one.budget) == pytest.approx((one.u or 0.0) ** 2)
    sources = {share.source for share in one.budget}
    assert {"reading", "strength", "titrant", "temperature", "activity model"} <= sources


def test_order_of_rows_changes_nothing(tmp_path: Path) -> None:
    made = Made(19).solutions(ONE, NAME, DILUTIONS + HALF_WAY)
    forward = fit(tmp_path, made, steps=1)
    made.readings[1:] = made.readings[:0:-1]
    made.recipes[1:] = made.recipes[:0:-1]
    backward = fit(tmp_path, made, steps=1)
    assert backward.steps[0].pka == pytest.approx(forward.steps[0].pka, abs=1e-7)
    assert backward.steps[0].u == pytest.approx(forward.steps[0].u, rel=1e-6)
