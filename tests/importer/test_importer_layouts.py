"""The wide layout, stages, repeats, known solutions, and several files at once."""

from __future__ import annotations

from datetime import datetime
from pathlib import Path

import numpy as np
import pytest
from builders import csv_file, records_from_rows, workbook
from wild_case import HEAD, RECIPES, aside, noted, read, reading, readings

from reconcile.importer.read import read_books
from reconcile.records.problems import InputProblems
from reconcile.records.standards import standard_ph

WIDE = ("Batch", "Meter", "pH", "Acetic acid (mM)", "Acetic acid lot", "NaOAc [mM]", "NaOAc lot")


def test_wide_columns_make_one_solution_a_recipe() -> None:
    rows = [
        WIDE,
        ("B1", "M1", 4.71, 50.0, "L1", 50.0, "L2"),
        ("B1", "M2", 4.70, 50.0, "L1", 50.0, "L2"),
        ("B2", "M1", 2.99, 60.0, "L1", 0.0, None),
        ("B1", "M1", 4.60, 55.0, "L1", 50.0, "L2"),
        ("B1", "M1", 4.72, None, None, None, None),
    ]
    records = records_from_rows(rows)
    assert aside(records) == set()
    assert records.readings_solution.tolist() == [0, 0, 1, 2, 0]
    assert records.solutions.amount.tolist() == pytest.approx([0.05, 0.05, 0.06, 0.055, 0.05])
    assert records.solutions.place[2].cell == "D4"
    assert records.solutions.recipe_row.tolist() == [-1] * 5
    assert records.lots.name.tolist() == ["L1", "L2"]


def test_wide_quantities_with_a_final_volume_and_stock_lots() -> None:
    head = ("Batch", "pH", "HCl (mL)", "HCl lot", "Tris (g)", "Tris lot", "Made up to (L)")
    rows = [head, ("B1", 8.1, 25.0, "H1", 6.0568, "T1", 1.0)]
    stocks = [("Lot", "Substance", "Strength", "Unit"), ("H1", "HCl", 1.0, "M")]
    records = records_from_rows(rows, (), stocks)
    # 25 mL of 1 mol/L, and 6.0568 g over 121.136 g/mol, in 1 L
    assert records.solutions.amount.tolist() == pytest.approx([0.025, 0.05], rel=1e-5)
    assert records.solutions.by_mass.tolist() == [False, True]


def test_a_wide_sheet_of_recipes_without_readings() -> None:
    recipes = [("Batch", "Acetic acid (mM)", "Sodium acetate (mM)"), ("B1", 50.0, 40.0), ("B2", 50.0, None)]
    records = records_from_rows([HEAD, *readings(2), reading(3, batch="B2")], recipes)
    assert aside(records) == set()
    assert records.solutions.amount.tolist() == pytest.approx([0.05, 0.04, 0.05])


def test_an_unknown_substance_in_a_wide_heading_sets_aside_the_rows_that_hold_it() -> None:
    rows = [("Batch", "pH", "Acetik acid (mM)", "NaCl (mM)"), ("B1", 4.7, 50.0, 10.0), ("B2", 7.0, None, 10.0)]
    records = records_from_rows(rows)
    assert aside(records) == {("Readings", "C2", "substance-unknown")}
    assert "acetic acid" in records.set_aside[0].reason
    assert len(records.readings) == 1


def test_a_bad_amount_in_a_wide_column_is_that_rows_alone() -> None:
    rows = [("Batch", "pH", "Acetic acid (mM)"), ("B1", 3.0, "fifty"), ("B2", 3.0, 50.0), ("B3", 3.0, "#N/A")]
    records = records_from_rows(rows)
    assert aside(records) == {("Readings", "C2", "amount-not-a-number"), ("Readings", "C4", "cell-error")}


def test_repeat_readings_are_readings_of_their_own() -> None:
    rows = [("Batch", "Meter", "pH 1", "pH 2", "pH 3"), ("B1", "M1", 4.71, 4.72, None), ("B1", "M1", None, None, None),
            ("B1", "M2", 4.70, "x", 4.69)]  # fmt: skip
    records = records_from_rows(rows, RECIPES)
    assert records.rows_read == 6
    assert records.readings["ph"].tolist() == [4.71, 4.72, 4.70, 4.69]
    assert records.readings["repeat"].tolist() == [1, 2, 1, 3]
    assert [(s.place.cell, s.code) for s in records.set_aside] == [("C3", "ph-missing"), ("D4", "ph-not-a-number")]


def test_stages_are_solutions_of_their_own_and_steps_add_up() -> None:
    recipes = [
        ("Batch", "Step", "Substance", "Amount", "Unit", "Made up to"),
        ("B1", "In process", "acetic acid", 50.0, "mmol", "0.9 L"),
        ("B1", "Final", "sodium acetate", 50.0, "mmol", "1 L"),
    ]
    rows = [("Batch", "Stage", "pH"), ("B1", "in process", 2.9), ("B1", "final", 4.7), ("B1", None, 4.7)]
    records = records_from_rows(rows, recipes)
    s = records.solutions
    assert s.stage.tolist() == ["in process", "final", ""]
    assert [s.amount[s.solution == k].tolist() for k in range(3)] == [
        pytest.approx([0.05 / 0.9]), pytest.approx([0.05, 0.05]), pytest.approx([0.05, 0.05]),
    ]  # fmt: skip


def test_known_solutions_from_the_record_and_from_the_published_standards() -> None:
    rows = [
        ("Known solution", "Known solution lot", "Meter", "Temperature (°C)", "pH"),
        ("check 7", "C1", "M1", 22.5, 7.02),
        ("check 7", "C1", "M2", 22.5, 7.03),
        ("phthalate", None, "M1", 25.0, 4.01),
        ("check 7", "C1", "M1", 60.0, 7.02),
        ("mystery", None, "M1", 25.0, 7.02),
    ]
    known = [
        ("Known solution", "Lot", "Temperature (°C)", "Certified pH", "u"),
        ("Check 7", "C1", 20.0, 7.02, 0.005),
        ("Check 7", "C1", 25.0, 7.00, 0.005),
    ]
    records = records_from_rows(rows, (), more={"Known": known})
    assert aside(records) == {("Readings", "A5", "known-temperature"), ("Readings", "A6", "known-not-known")}
    assert records.readings_solution.tolist() == [0, 0, 1]
    published = standard_ph("phthalate", 25.0)
    assert published is not None
    assert records.solutions.known_ph.tolist() == pytest.approx([7.01, published[0]])
    assert records.solutions.known_u.tolist() == pytest.approx([0.005, published[1]])
    assert records.solutions.batch.tolist() == ["", ""]


def test_what_a_reading_was_judged_to_be_is_no_standing_of_its_own() -> None:
    said = ["Pass", "OOS", "Re-test", "Approved", "Excluded"]
    rows = [(*HEAD, "Status")] + [[*reading(k), s] for k, s in enumerate(said)]
    records = records_from_rows(rows, RECIPES)
    assert records.readings["standing"].tolist() == ["original", "original", "retest", "original", "void"]


def test_standing_is_normalised_and_unknown_ones_are_set_aside() -> None:
    rows = [(*HEAD, "Standing")] + [[*reading(k), s] for k, s in enumerate([None, "Retest", "VOIDED", "perhaps"])]
    records = records_from_rows(rows, RECIPES)
    assert records.readings["standing"].tolist() == ["original", "retest", "void"]
    assert aside(records) == {("Readings", "F5", "standing-unknown")}


def test_every_column_is_there_with_its_missing_value() -> None:
    records = records_from_rows([("Batch", "pH"), ("B1", 4.7)], RECIPES)
    columns = records.readings.columns
    assert np.isnan(columns["temperature"]).all()
    assert columns["meter"].tolist() == [""]
    assert np.isnat(columns["read_at"]).all()
    assert {"resolution", "repeat"} <= set(columns)


def test_no_batch_no_recipe_no_reading() -> None:
    rows = [HEAD, reading(0, batch=None), reading(1, batch="B7"), reading(2)]
    assert aside(records_from_rows(rows, RECIPES)) == {
        ("Readings", "B2", "nothing-read"), ("Readings", "B3", "batch-without-recipe"),
    }  # fmt: skip


def test_tables_of_one_record_may_stand_in_several_files(tmp_path: Path) -> None:
    one = workbook(tmp_path / "march.xlsx", {"Log": [HEAD, *readings(2)]})
    two = csv_file(tmp_path / "recipes.csv", RECIPES, ";")
    records = read_books([one, str(two)])
    assert [(s.file, s.kind) for s in records.sheets] == [("march.xlsx", "readings"), ("recipes.csv", "recipes")]
    assert len(records.readings) == 2
    assert records.solutions.place[0].words() == 'recipes.csv, line 2, column "Amount"'
    with pytest.raises(InputProblems, match="no sheet of readings"):
        read_books([two])


def test_meters_calibrations_events_and_series_are_kept() -> None:
    more = {
        "Meters": [("Meter", "Accuracy (pH)", "Resolution (pH)"), ("M1", 0.02, 0.01)],
        "Calibrations": [
            ("Meter", "Calibrated at", "Slope (%)", "Offset (mV)", "Buffer lots"),
            ("M1", datetime(2026, 3, 1, 8), 98.5, -3.0, "C4; C7"),
            ("M1", "yesterday", "good", 1.0, "C4; C7"),
        ],
        "Events": [("Meter", "Date", "What was done"), ("M1", datetime(2026, 3, 4), "probe replaced")],
        "Series": [
            ("Series", "Substance", "Amount", "Unit", "Start volume (mL)", "Titrant", "Titrant strength (mol/L)"),
            ("T1", "acetic acid", 50.0, "mM", "0.05 L", "NaOH", "100 mM"),
        ],
    }
    records = records_from_rows([HEAD, *readings(1)], RECIPES, more=more)
    assert records.meters["accuracy"].tolist() == [0.02]
    assert records.calibrations["slope"].tolist() == pytest.approx([98.5, np.nan], nan_ok=True)
    assert records.events["what"].tolist() == ["probe replaced"]
    assert records.series["start_volume"].tolist() == pytest.approx([50.0])
    assert records.series["titrant_strength"].tolist() == pytest.approx([0.1])
    expected = {("Calibrations", "B3", "cell-not-used"), ("Calibrations", "C3", "cell-not-used")}
    assert expected <= noted(records)


def test_the_ledger_names_batch_meter_and_lot() -> None:
    rows = [HEAD, reading(0), reading(1, ph="x", meter="M7")]
    records = records_from_rows(rows, [*RECIPES[:2], ("B1", "foo", "L9", 1.0, "mM")])
    assert [(s.batch, s.meter, s.lot) for s in records.set_aside] == [("B1", "M1", "L9"), ("B1", "M7", "L1; L9")]


def test_rows_of_one_csv_are_placed_by_line_and_heading(tmp_path: Path) -> None:
    paths = [csv_file(tmp_path / "log.csv", [HEAD[1:], *[r[1:] for r in readings(2)], reading(0, ph="?")[1:]])]
    paths.append(csv_file(tmp_path / "recipes.csv", RECIPES))
    assert aside(read(paths)) == {("", "4:pH", "ph-not-a-number")}


def test_recipe_rows_without_a_batch_are_noted() -> None:
    records = records_from_rows([HEAD, reading()], [*RECIPES, (None, "NaCl", None, 1.0, "mM")])
    assert ("Recipes", "A4", "row-nameless") in noted(records)
    alone = records_from_rows([HEAD, reading()], [RECIPES[0], (None, "NaCl", None, 1.0, "mM")])
    assert aside(alone) == {("Readings", "B2", "batch-without-recipe")}
