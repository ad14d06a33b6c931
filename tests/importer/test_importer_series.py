"""Titration series: what the vessel holds after each addition, by hand."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from builders import records_from_rows
from wild_case import aside

from reconcile.records.book import BatchRecords

SERIES_HEAD = (
    "Series",
    "Substance",
    "Lot",
    "Amount",
    "Unit",
    "Start volume (mL)",
    "Titrant",
    "Titrant lot",
    "Titrant strength (mol/L)",
)
ROWS = [("Series", "Titrant added (mL)", "pH"), ("T1", 0.0, 2.9), ("T1", 10.0, 4.1), ("T1", "0.025 L", 4.8)]


def titration(series: list[tuple[Any, ...]], rows: list[tuple[Any, ...]] = ROWS) -> BatchRecords:
    stocks = [("Lot", "Substance", "Strength", "Unit"), ("N1", "NaOH", 0.1, "M")]
    return records_from_rows(rows, (), stocks, more={"Series": [SERIES_HEAD, *series]})


def held(records: BatchRecords) -> list[dict[str, float]]:
    s = records.solutions
    return [
        {
            records.forms[f].name: float(a)
            for f, a in zip(s.form[s.solution == k], s.amount[s.solution == k], strict=True)
        }
        for k in range(len(s))
    ]


@pytest.mark.parametrize(("lot", "strength"), [("N1", None), (None, 0.1), ("N1", 0.1)])
def test_acid_and_titrant_are_diluted_by_every_addition(lot: str | None, strength: float | None) -> None:
    records = titration([("T1", "acetic acid", "A1", 50.0, "mM", 50.0, "NaOH", lot, strength)])
    assert aside(records) == set()
    first, second, third = held(records)
    assert first == {"acetic acid": pytest.approx(0.05)}
    # 2.5 mmol of acid; 10 mL and 25 mL of 0.1 mol/L; 60 and 75 mL in all
    assert second == {"acetic acid": pytest.approx(2.5 / 60), "sodium hydroxide": pytest.approx(1.0 / 60)}
    assert third == {"acetic acid": pytest.approx(2.5 / 75), "sodium hydroxide": pytest.approx(2.5 / 75)}
    assert records.solutions.batch.tolist() == ["T1"] * 3
    assert set(records.lots.name) == {"A1"} | ({"N1"} if lot else set())


def test_a_weighed_analyte_with_a_background_salt() -> None:
    series = [
        ("T1", "acetic acid", None, 150.13, "mg", 50.0, "NaOH", None, 0.1),
        ("T1", "KCl", None, 0.1, "M", 50.0, "NaOH", None, None),
    ]
    first = held(titration(series))[0]
    assert first == {"acetic acid": pytest.approx(0.05, rel=1e-4), "potassium chloride": pytest.approx(0.1)}


def test_what_is_missing_is_said() -> None:
    good = ("T1", "acetic acid", None, 50.0, "mM", 50.0, "NaOH", None, 0.1)
    rows = [ROWS[0], ("T1", None, 3.0), ("T9", 1.0, 3.0), ("T1", 1.0, 3.0)]
    assert aside(titration([good], rows)) == {
        ("Readings", "A2", "titrant-missing"),
        ("Readings", "A3", "series-unknown"),
    }
    assert aside(titration([(*good[:5], None, *good[6:])])) == {("Series", "F2", "start-volume-missing")}
    assert aside(titration([(*good[:7], "N9", None)])) == {("Series", "I2", "lot-unknown")}
    assert np.isfinite(titration([good]).readings["titrant_added"]).all()
