"""Solutions and stocks adjusted to a pH.

Hand calculation: pKa' of Tris at 25 °C is 8.07 plus Davies' 0.5 (sqrt I / (1 + sqrt I) - 0.3 I) (constants from
memory of general handbooks); at I = 0.042 that is 8.07 + 0.08 = 8.15, and the share neutralised at pH 7.40 is
1 / (1 + 10^(7.40 - 8.15)) = 0.849.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from worked import WAYS, at, audit_as, near, read_as, table

from reconcile.chemistry.adjusted import with_adjustments
from reconcile.chemistry.predict import predict_ph
from reconcile.records.settings import Settings
from reconcile.reporter.adjusted import adjusted_table

READ = ("Read at", "Batch", "Meter", "Temperature (°C)", "pH", "Stage")
RECIPE = ("Batch", "Substance", "Lot", "Amount", "Unit", "Made up to", "Made up to unit", "Step")
STOCK = ("Lot", "Substance", "Made as batch", "Strength", "Unit", "Adjusted to pH", "Adjusted at (°C)")
RECORD = {
    "Readings": [
        READ,
        (at(0, 9), "T-1", "M-1", 25.0, 7.61, None),
        (at(0, 9, 20), "T-1", "M-1", 25.0, 7.40, None),
        (at(1), "T-1", "M-2", 25.0, 7.43, None),
        (at(1), "T-2", "M-2", 25.0, 7.41, None),
        (at(1), "A-1", "M-2", 25.0, 4.80, None),
        (at(2), "W-1", "M-1", 25.0, 8.10, None),
    ],
    "Recipes": [
        RECIPE,
        ("T-1", "Tris base", "TB", 6.057, "g", 1.0, "L", None),
        ("T-1", "hydrochloric acid", "HC", "to pH 7.4", None, None, None, None),
        ("T-2", "Tris base", "TB", 50.0, "mM", None, None, None),
        ("T-2", "hydrochloric acid", "HC", "as needed", None, None, None, None),
        ("A-1", "acetic acid", "AA", 50.0, "mM", None, None, None),
        ("A-1", "HCl or NaOH", None, "q.s.", None, None, None, None),
        ("W-1", "Tris base", "TB", 6.057, "g", 1.0, "L", None),
        ("W-1", "hydrochloric acid", "HC", 25.0, "mL", 1.0, "L", None),
    ],
    "Stocks": [STOCK, ("HC", "hydrochloric acid", None, 1.0, "M", None, None)],
}


@pytest.mark.parametrize("way", WAYS)
def test_unwritten_amounts_are_solved_from_the_reading(way: str, tmp_path: Path) -> None:
    audit = audit_as(way, tmp_path, RECORD)
    near(
        table(audit),
        [
            ("T-1", "", "adjusted", 7.40),
            ("T-1", "", "adjusted", 7.40),  # the last of the sitting is what it was adjusted to
            ("T-1", "", "as_predicted", 7.40),  # another meter on another day is evidence again
            ("T-2", "", "adjusted", 7.41),
            ("A-1", "", "adjusted", 4.80),
            ("W-1", "", "as_predicted", 8.14),  # half neutralised: pKa' at I = 0.025 is 8.07 + 0.07
        ],
        0.02,
    )
    assert audit.evidence.tolist() == [False, False, True, False, False, True]
    solved, opens = audit.records.solved, audit.records.open_amounts
    by_batch = {(b, s): (x, u, n) for b, s, x, u, n in zip(opens.batch, opens.substance, solved.amount, solved.u,
                                                           opens.unit, strict=True)}  # fmt: skip
    # 0.849 x 50 mmol of 1 mol/L; a pH of u 0.015 over its slope, here 2.303 x 50 x 0.849 x 0.151 = 14.8 mL per pH,
    # and what else is uncertain (weighing, strengths of 0.6 %, pKa): about 0.5 mL in all
    amount, u, unit = by_batch["T-1", "hydrochloric acid"]
    assert (amount, unit) == (pytest.approx(42.5, abs=0.6), "mL")
    assert 0.3 < u < 0.7
    assert by_batch["T-2", "hydrochloric acid"][::2] == (pytest.approx(0.0425, abs=0.0006), "mol/L")
    # acetic acid at pH 4.80, pKa' 4.756 - 0.07: 0.05 / (1 + 10^(4.69 - 4.80)); of the two alternatives the base
    assert by_batch["A-1", "NaOH"][0] == pytest.approx(0.0282, abs=0.0006)
    assert by_batch["A-1", "HCl"][0] == 0.0
    # a written amount: the residual as titrant, dpH / (dpH per mol/L of base); 1/d = 2.303 x 0.0125 mol/L per pH
    written = audit.residual_columns()["titrant_equivalent"][5]
    assert written == pytest.approx(audit.residual[5] * 2.303 * 0.0125, rel=0.03)


def test_an_adjusted_reading_takes_no_uncertainty_from_the_recipe(tmp_path: Path) -> None:
    prediction = audit_as("workbook", tmp_path, RECORD).prediction
    # accuracy 0.02 over root 3, the noise floor of 0.005, and 0.5 K over root 3 at 0.028 pH/K (settings)
    warm = 0.5 / 3**0.5 * 0.028
    assert prediction.u[1] == pytest.approx(np.linalg.norm([0.02 / 3**0.5, 0.005, warm]), rel=0.02)
    # the later one: that, and its own temperature
    assert prediction.u[2] == pytest.approx(np.hypot(prediction.u[1], warm), rel=0.02)
    assert max(prediction.budget[name][2] for name in ("strength", "taking", "pKa")) < 1e-6


def test_amounts_solved_are_those_that_give_the_reading(tmp_path: Path) -> None:
    records = with_adjustments(read_as("workbook", tmp_path, RECORD), Settings())
    amount = records.solved.amount[0] / 1000.0
    found = predict_ph(["Tris base", "HCl"], [[6.057 / 121.136, amount]], 25.0)
    assert found.ph[0] == pytest.approx(7.40, abs=1e-6)


@pytest.mark.parametrize("way", WAYS)
def test_a_titrant_of_a_later_step_is_solved_from_that_stage(way: str, tmp_path: Path) -> None:
    sheets = {
        "Readings": [
            READ,
            (at(0, 9), "P-1", "M-1", 25.0, 4.54, "buffer"),
            (at(0, 10), "P-1", "M-1", 25.0, 6.00, "first adjustment"),
            (at(0, 11), "P-1", "M-1", 25.0, 7.00, "final"),
            (at(1, 11), "P-1", "M-2", 25.0, 7.02, "final"),
        ],
        "Recipes": [
            RECIPE,
            ("P-1", "sodium dihydrogen phosphate", None, 50.0, "mM", None, None, "buffer"),
            ("P-1", "sodium hydroxide", None, "as needed", None, None, None, "first adjustment"),
            ("P-1", "potassium hydroxide", None, "as needed", None, None, None, "final"),
        ],
    }
    audit = audit_as(way, tmp_path, sheets)
    # at half neutralisation pH is 7.20 - 3 x 0.11 (I = 0.1); at 6.00 the share is 1/(1 + 10^(6.9 - 6.0)) = 0.11 or so
    assert [row[2] for row in table(audit)] == ["as_predicted", "adjusted", "adjusted", "as_predicted"]
    first, second = audit.records.solved.amount
    assert first == pytest.approx(0.05 * 0.11, abs=0.0012)
    assert first + second == pytest.approx(0.05 * 0.57, abs=0.002)


@pytest.mark.parametrize("way", WAYS)
def test_the_counter_ion_of_an_adjusted_stock_is_inferred(way: str, tmp_path: Path) -> None:
    sheets = {
        "Readings": [
            READ,
            (at(0), "D-1", "M-1", 25.0, 7.93, None),
            (at(0), "D-2", "M-1", 25.0, 7.93, None),
            (at(0), "D-3", "M-1", 25.0, 7.95, None),
        ],
        "Recipes": [
            RECIPE,
            ("D-1", "Tris hydrochloride", "TS", 50.0, "mL", 1.0, "L", None),
            ("D-2", "Tris base", "TS-2", 50.0, "mM", None, None, None),
            ("D-3", None, "TS-3", "10x", None, None, None, None),
            ("S-3", "Tris base", None, 60.57, "g", 1.0, "L", None),
            ("S-3", "hydrochloric acid", None, "as needed", None, None, None, None),
        ],
        "Stocks": [
            STOCK,
            ("TS", "Tris hydrochloride", None, 1.0, "M", 8.0, 25.0),
            ("TS-2", "Tris base", None, 1.0, "M", 8.0, None),
            ("TS-3", None, "S-3", None, None, 8.0, 25.0),
        ],
    }
    audit = audit_as(way, tmp_path, sheets)
    # diluted twenty and ten times: pKa' falls from that at I of 0.6 or 0.3 (0.1 higher) towards that at 0.03
    near(table(audit), [("D-1", "", "as_predicted", 7.90), ("D-2", "", "as_predicted", 7.90),
                        ("D-3", "", "as_predicted", 7.92)], 0.04)  # fmt: skip
    s = audit.records.solutions
    chloride = [
        sum(
            a * audit.records.forms[f].strong_ions.get("Cl-", 0.0)
            for a, f in zip(s.amount[s.solution == k], s.form[s.solution == k], strict=True)
        )
        for k in range(2)
    ]
    # the same stock, labelled as the salt or as the base: 1/(1 + 10^(8.00 - 8.25)) = 0.64 mol of chloride a mol
    assert chloride == pytest.approx([0.05 * 0.64] * 2, rel=0.03)
    assert chloride[0] == pytest.approx(chloride[1], rel=1e-6)
    prediction = audit.prediction
    # a half-width of 0.05 (settings); where the temperature is not stated, 2 K over root 3 at 0.028 pH/K beside it
    stated, unstated = 0.05 / 3**0.5, np.hypot(0.05, 2.0 * 0.028) / 3**0.5
    assert prediction.budget["adjustment"] == pytest.approx(np.array([stated, unstated, stated]), rel=0.08)
    assert np.all(prediction.u < 0.08)


def test_a_stock_adjusted_by_an_amount_that_nothing_settles_sets_its_readings_aside(tmp_path: Path) -> None:
    sheets = {
        "Readings": [READ, (at(0), "D-1", "M-1", 25.0, 8.0, None)],
        "Recipes": [
            RECIPE,
            ("D-1", None, "TS", "10x", None, None, None, None),
            ("S", "Tris base", None, 60.57, "g", 1.0, "L", None),
            ("S", "hydrochloric acid", None, "as needed", None, None, None, None),
        ],
        "Stocks": [STOCK, ("TS", None, "S", None, None, None, None)],
    }
    (aside,) = read_as("workbook", tmp_path, sheets).set_aside
    assert (aside.code, aside.cause.sheet, aside.cause.cell) == ("adjustment-unwritten", "Recipes", "D4")


def test_an_odd_amount_is_noticed_beside_like_batches(tmp_path: Path) -> None:
    rng = np.random.default_rng(5)
    readings, recipes = [READ], [RECIPE]
    for i in range(8):
        name = f"T-{i}"
        # one batch was left at pH 7.49, the others at 7.40
        readings.append((at(i), name, "M-1", 25.0, round(7.40 + rng.normal(0, 0.003), 3) if i != 5 else 7.49, None))
        recipes.append((name, "Tris base", "TB", 6.057, "g", 1.0, "L", None))
        recipes.append((name, "hydrochloric acid", "HC", "to pH 7.4", None, None, None, None))
    records = read_as("workbook", tmp_path, {**RECORD, "Readings": readings, "Recipes": recipes})
    records = with_adjustments(records, Settings())
    solved = records.solved
    # 14.8 mL per pH (see above): T-5 took 1.3 mL less, six times what u of its reading, 0.015, makes of an amount
    assert solved.like.tolist() == [7] * 8
    assert solved.usual == pytest.approx(np.full(8, 42.5), abs=0.7)
    assert solved.amount[5] == pytest.approx(solved.usual[5] - 14.8 * 0.09, abs=0.3)
    assert np.flatnonzero(solved.odd).tolist() == [5]
    assert [note.place.cell for note in records.notes if note.code == "amount-odd"] == ["D13"]


def test_a_target_that_was_missed_is_odd_beside_batches_of_the_same_target(tmp_path: Path) -> None:
    readings, recipes = [READ], [RECIPE]
    for i in range(5):
        readings.append((at(i), f"T-{i}", "M-1", 25.0, 7.05 if i == 3 else 7.40, None))
        recipes.append((f"T-{i}", "Tris base", "TB", 6.057, "g", 1.0, "L", None))
        recipes.append((f"T-{i}", "hydrochloric acid", "HC", "to pH 7.4", None, None, None, None))
    records = read_as("workbook", tmp_path, {**RECORD, "Readings": readings, "Recipes": recipes})
    records = with_adjustments(records, Settings())
    solved = records.solved
    # at 7.05 the share neutralised is 1 / (1 + 10^(7.05 - 8.15)) = 0.927
    assert solved.amount[3] == pytest.approx(50 * 0.927, abs=0.6)
    assert solved.usual[3] == pytest.approx(42.5, abs=0.6)
    assert np.flatnonzero(solved.odd).tolist() == [3]
    assert [note.place.cell for note in records.notes if note.code == "amount-odd"] == ["D9"]


def test_less_than_nothing_of_a_titrant_is_a_lead(tmp_path: Path) -> None:
    """Base cannot have brought Tris base from pH 10.4 to 7.40: another titrant, another substance, or another batch."""
    readings = [READ, (at(0), "T-1", "M-1", 25.0, 7.40, None)]
    recipes = [RECIPE, ("T-1", "Tris base", None, 50.0, "mM", None, None, None),
               ("T-1", "sodium hydroxide", None, "as needed", None, None, None, None)]  # fmt: skip
    audit = audit_as("workbook", tmp_path, {"Readings": readings, "Recipes": recipes})
    # Tris alone, without another ion for it: pKa' is 8.07, and 1 / (1 + 10^(7.40 - 8.07)) = 0.824
    assert audit.records.solved.amount[0] == pytest.approx(-0.05 * 0.824, abs=0.0006)
    (note,) = [n for n in audit.records.notes if n.code == "amount-none"]
    assert 'no amount of sodium hydroxide gives T-1 its pH of "7.40"' in note.message()
    assert "A lead" in note.message()
    assert adjusted_table(audit).data["odd"][0] == "less than nothing; a lead"


@pytest.mark.parametrize("way", WAYS)
@pytest.mark.parametrize("step", [None, "trim", "final"])
def test_a_reading_before_the_adjustment_holds_no_titrant(way: str, step: str | None, tmp_path: Path) -> None:
    before, after = ("in process", "final") if step == "final" else ("before adjustment", step or "after adjustment")
    readings = [
        READ,
        (at(0, 9), "W-1", "M-1", 25.0, 8.14, before),
        (at(0, 10), "W-1", "M-1", 25.0, 7.40, after),
        (at(1, 10), "W-1", "M-2", 25.0, 7.41, after),
    ]
    recipes = [
        RECIPE,
        ("W-1", "Tris base", "TB", 50.0, "mM", None, None, None),
        ("W-1", "hydrochloric acid", "HC", 25.0, "mM", None, None, None),
        ("W-1", "hydrochloric acid", "HC", "as needed", None, None, None, step),
    ]
    audit = audit_as(way, tmp_path, {**RECORD, "Readings": readings, "Recipes": recipes})
    # half neutralised 8.07 + 0.07; then 0.849 of 50 mmol/L, of which 25 stand written
    near(table(audit), [("W-1", before, "as_predicted", 8.14), ("W-1", after, "adjusted", 7.40),
                        ("W-1", after, "as_predicted", 7.40)], 0.015)  # fmt: skip
    assert audit.records.solved.amount[0] == pytest.approx(0.0425 - 0.025, abs=0.0006)


def test_a_stock_labelled_as_its_salt_holds_less_counter_ion_without_a_lead(tmp_path: Path) -> None:
    stocks = [STOCK, ("TS", "Tris hydrochloride", None, 1.0, "M", 8.0, 25.0)]
    recipes = [RECIPE, ("D-1", "Tris hydrochloride", "TS", 50.0, "mL", 1.0, "L", None)]
    sheets = {"Readings": [READ, (at(0), "D-1", "M-1", 25.0, 7.9, None)], "Recipes": recipes, "Stocks": stocks}
    records = with_adjustments(read_as("workbook", tmp_path, sheets), Settings())
    assert records.solved.amount[0] < -0.3
    assert not records.solved.odd.any()
    assert [note.code for note in records.notes if note.code.startswith("amount")] == []


@pytest.mark.parametrize("way", WAYS)
def test_the_final_reading_settles_what_was_read_in_process_and_after_sterilising_too(way: str, tmp_path: Path) -> None:
    readings = [
        READ,
        (at(0, 9), "T-1", "M-1", 25.0, 7.61, "in process"),
        (at(0, 10), "T-1", "M-1", 25.0, 7.40, "final"),
        (at(0, 15), "T-1", "M-1", 25.0, 7.43, "after sterilising"),
        (at(1, 10), "T-1", "M-2", 25.0, 7.41, "final"),
    ]
    recipes = [RECIPE, *[row for row in RECORD["Recipes"] if row[0] == "T-1"]]
    audit = audit_as(way, tmp_path, {**RECORD, "Readings": readings, "Recipes": recipes})
    near(table(audit), [("T-1", "in process", "adjusted", 7.40), ("T-1", "final", "adjusted", 7.40),
                        ("T-1", "after sterilising", "as_predicted", 7.40), ("T-1", "final", "as_predicted", 7.40)],
         0.005)  # fmt: skip
    assert audit.records.solved.ph[0] == 7.40
