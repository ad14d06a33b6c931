"""Stocks and final volumes as people write them, each amount worked by hand.

Molar masses from IUPAC atomic weights: sodium acetate 82.034, acetic acid 60.052, Tris 121.136, citric acid 192.123,
its monohydrate 210.138 g/mol. Water at 20 °C: 0.99821 g/mL.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from worked import WAYS, at, audit_as, read_as

from reconcile.records.book import BatchRecords

RECIPE = ("Batch", "Substance", "Lot", "Amount", "Unit", "Made up to", "Made up to unit")
STOCK = ("Lot", "Substance", "Made as batch", "Strength", "Unit", "Assay (%)", "Water content (%)", "Adjusted to pH",
         "Adjusted at (°C)")  # fmt: skip


def held(records: BatchRecords) -> dict[tuple[str, str], float]:
    """Final amount of every form of every batch."""
    s = records.solutions
    return {
        (str(s.batch[k]), records.forms[f].name): float(a) for k, f, a in zip(s.solution, s.form, s.amount, strict=True)
    }


def sheets(batches: list[str], recipes: list[tuple[Any, ...]], stocks: list[tuple[Any, ...]]) -> dict[str, Any]:
    def filled(row: tuple[Any, ...], like: tuple[str, ...]) -> tuple[Any, ...]:
        return (*row, *[None] * (len(like) - len(row)))

    return {
        "Readings": [("Batch", "Meter", "Temperature (°C)", "pH"), *((b, "M-1", 25.0, 7.0) for b in batches)],
        "Recipes": [RECIPE, *(filled(row, RECIPE) for row in recipes)],
        "Stocks": [STOCK, *(filled(row, STOCK) for row in stocks)],
    }


@pytest.mark.parametrize("way", WAYS)
def test_added_to_is_not_made_up_to(way: str, tmp_path: Path) -> None:
    stocks = [("NA", "sodium acetate", None, 1.0, "M"), ("AA", "acetic acid", None, 1.0, "M")]
    recipes = [
        ("UP", "sodium acetate", "NA", 100.0, "mL", 1.0, "L"),
        ("UP", "acetic acid", "AA", 100.0, "mL"),
        ("TO", "sodium acetate", "NA", 100.0, "mL", "added to 1", "L"),
        ("TO", "acetic acid", "AA", 100.0, "mL"),
        ("WITH", "sodium acetate", "NA", 100.0, "mL"),
        ("WITH", "acetic acid", "AA", 100.0, "mL"),
        ("WITH", "purified water", None, 1000.0, "mL"),
        ("SALT", "sodium acetate", None, 8.2034, "g", "added to 1 L"),
        ("SALT", "acetic acid", None, 6.0052, "g"),
    ]
    found = held(read_as(way, tmp_path, sheets(["UP", "TO", "WITH", "SALT"], recipes, stocks)))
    assert found["UP", "sodium acetate"] == pytest.approx(0.1, rel=1e-6)
    # 1000 mL and twice 100 mL
    assert found["TO", "sodium acetate"] == pytest.approx(0.1 / 1.2, rel=1e-6)
    assert found["WITH", "acetic acid"] == pytest.approx(0.1 / 1.2, rel=1e-6)
    # solids in 1 L of water: 0.1 mol in 0.99821 kg
    assert found["SALT", "sodium acetate"] == pytest.approx(0.1 / 0.99821, rel=1e-4)


def test_what_is_added_to_one_thing_and_made_up_to_another_is_refused(tmp_path: Path) -> None:
    recipes = [
        ("B", "sodium acetate", None, 4.1, "g", "added to 1 L"),
        ("B", "acetic acid", None, 3.0, "g", 1.0, "L"),
        ("C", "sodium acetate", "NA", 25.0, "mL"),
    ]
    stocks = [("NA", "sodium acetate", None, 1.0, "M")]
    aside = read_as("workbook", tmp_path, sheets(["B", "C"], recipes, stocks)).set_aside
    assert [(row.code, row.cause.cell) for row in aside] == [("made-up-to-differs", "F3"), ("made-up-to-missing", "D4")]
    assert "added to 1000 mL" in aside[0].reason


@pytest.mark.parametrize(
    "fill",
    ["q.s. to 1 L", "qs ad 1000 mL", "ad 1 L", "make up to 1 L", "diluted to 1 L", "fill up to 1 L", "bring to 1 L"],
)
def test_water_lines_that_say_what_is_made_up_to(fill: str, tmp_path: Path) -> None:
    recipes = [("B", "sodium acetate", None, 8.2034, "g"), ("B", "water", None, fill, None)]
    found = held(read_as("workbook", tmp_path, sheets(["B"], recipes, [])))
    assert found["B", "sodium acetate"] == pytest.approx(0.1, rel=1e-4)


def test_an_assay_of_the_dried_substance_and_its_water(tmp_path: Path) -> None:
    stocks = [
        ("S", "sodium acetate", None, None, None, 99.0, 2.0),
        ("K", "citric acid monohydrate", None, None, None, 99.8, 8.6),
        ("M", "citric acid monohydrate", None, None, None, 99.8, 0.2),
        ("W", "Tris base", None, None, None, None, 0.5),
    ]
    recipes = [
        ("S", "sodium acetate", "S", 8.2034, "g", 1.0, "L"),
        ("K", "citric acid monohydrate", "K", 21.0138, "g", 1.0, "L"),
        ("M", "citric acid monohydrate", "M", 21.0138, "g", 1.0, "L"),
        ("W", "Tris base", "W", 12.1136, "g", 1.0, "L"),
    ]
    found = held(read_as("workbook", tmp_path, sheets(["S", "K", "M", "W"], recipes, stocks)))
    assert found["S", "sodium acetate"] == pytest.approx(0.1 * 0.99 * 0.98, rel=1e-4)
    # 8.6 % is all the water of the monohydrate (18.015 of 210.138): what is left is citric acid of 192.123 g/mol
    assert found["K", "citric acid monohydrate"] == pytest.approx(21.0138 * 0.914 * 0.998 / 192.123, rel=1e-4)
    # 0.2 % can only be beside it
    assert found["M", "citric acid monohydrate"] == pytest.approx(0.1 * 0.998 * 0.998, rel=1e-4)
    assert found["W", "Tris base"] == pytest.approx(0.1 * 0.995, rel=1e-4)


@pytest.mark.parametrize("way", WAYS)
def test_what_was_weighed_together_needs_no_density_to_be_weighed_out(way: str, tmp_path: Path) -> None:
    stocks = [("M", None, "MB"), ("G", None, "GONE")]
    recipes = [
        ("MB", "acetic acid", None, 30.026, "g"),
        ("MB", "sodium acetate", None, 41.017, "g"),
        ("MB", "water", None, "q.s. to 1 kg"),
        ("W", None, "M", 100.0, "g", 1.0, "kg"),
        ("V", None, "M", 100.0, "mL", 1.0, "L"),
        ("N", None, "X-404", 100.0, "mL", 1.0, "L"),
        ("A", "Tris base", None, 50.0, "mM"),
        ("A", None, "M", "to pH 7.4"),
    ]
    records = read_as(way, tmp_path, sheets(["W", "V", "N", "A"], recipes, stocks))
    # half a mole in a kilogram, a tenth of it: 0.05 mol in 1000 - 3.0026 - 4.1017 g of water
    assert held(records)["W", "acetic acid"] == pytest.approx(0.05 / 0.9928957, rel=1e-5)
    assert {row.batch: row.code for row in records.set_aside} == {
        "V": "unit-needs", "N": "lot-unknown", "A": "unit-needs",
    }  # fmt: skip


@pytest.mark.parametrize(("said", "share"), [("1 in 10", 0.1), ("1 + 9", 0.1), ("10x", 0.1), ("1 in 25", 0.04)])
def test_dilutions_in_words(said: str, share: float, tmp_path: Path) -> None:
    stocks = [("X10", None, "X")]
    recipes = [("B", None, "X10", said), ("X", "sodium acetate", None, 500.0, "mM")]
    found = held(read_as("workbook", tmp_path, sheets(["B"], recipes, stocks)))
    assert found["B", "sodium acetate"] == pytest.approx(0.5 * share, rel=1e-6)


def test_a_dilution_that_may_mean_two_things_is_not_guessed(tmp_path: Path) -> None:
    recipes = [("B", None, "X10", "1:10"), ("X", "sodium acetate", None, 500.0, "mM")]
    (aside,) = read_as("workbook", tmp_path, sheets(["B"], recipes, [("X10", None, "X")])).set_aside
    assert (aside.code, aside.cause.cell) == ("amount-not-a-number", "D2")


def test_a_bought_lot_needs_no_batch(tmp_path: Path) -> None:
    """A stock room in which one lot of many was made as a batch asks no question about the others."""
    stocks: list[tuple[Any, ...]] = [("X10", None, "X")]
    stocks += [(f"L{k}", "sodium acetate", None, 1.0, "M") for k in range(12)]
    recipes = [("B", None, "X10", "10x"), ("X", "sodium acetate", "L0", 500.0, "mL", 1.0, "L")]
    found = held(read_as("workbook", tmp_path, sheets(["B"], recipes, stocks)))
    assert found["B", "sodium acetate"] == pytest.approx(0.05, rel=1e-6)


@pytest.mark.parametrize("way", WAYS)
def test_a_name_that_leaves_the_salt_open_serves_where_the_stock_was_brought_to_a_ph(way: str, tmp_path: Path) -> None:
    """EDTA 0.5 M, pH 8.0 is one solution, whichever salt it was made of; EDTA alone is not."""
    stocks = [
        ("E1", "EDTA", None, 0.5, "M", None, None, 8.0, 25.0),
        ("E2", "EDTA disodium salt dihydrate", None, 0.5, "M", None, None, 8.0, 25.0),
        ("E3", "EDTA", None, 0.5, "M"),
        ("TS", "Tris-HCl", None, 1.0, "M", None, None, 8.0, 25.0),
    ]
    recipes = [
        *[(f"B{k}", "EDTA", f"E{k}", 20.0, "mL", 1.0, "L") for k in (1, 2, 3)],
        *[(f"B{k}", "Tris HCl", "TS", 50.0, "mL", 1.0, "L") for k in (1, 2)],
    ]
    audit = audit_as(way, tmp_path, sheets(["B1", "B2", "B3"], recipes, stocks))
    assert [(row.batch, row.code) for row in audit.records.set_aside] == [("B3", "substance-ambiguous")]
    one, other = audit.prediction.ph
    assert one == pytest.approx(other, abs=1e-6)
    # Tris at pH 8.0 and I = 0.6 diluted twentyfold falls by about 0.1
    assert one == pytest.approx(7.9, abs=0.05)


def test_names_of_hydrochlorides(tmp_path: Path) -> None:
    names = ["Tris HCl", "Tris-HCl", "TRIS·HCl", "tris hydrochloride", "imidazole HCl"]
    recipes = [(f"B{k}", name, None, 50.0, "mM") for k, name in enumerate(names)]
    found = held(read_as("workbook", tmp_path, sheets([f"B{k}" for k in range(5)], recipes, [])))
    assert {form for _, form in found} == {"Tris hydrochloride", "imidazole hydrochloride"}
    assert np.allclose(list(found.values()), 0.05)


def test_a_residual_of_an_adjusting_reading_is_nothing(tmp_path: Path) -> None:
    record = sheets(["B"], [("B", "Tris base", None, 50.0, "mM"), ("B", "HCl", None, "to pH 7.4")], [])
    record["Readings"] = [("Read at", "Batch", "Meter", "Temperature (°C)", "pH"), (at(0), "B", "M-1", 25.0, 7.40)]
    audit = audit_as("workbook", tmp_path, record)
    assert audit.residual.tolist() == [0.0]
    assert audit.residual_columns()["titrant_equivalent"].tolist() == [0.0]
