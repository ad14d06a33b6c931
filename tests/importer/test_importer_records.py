"""Well-formed records: long recipes, stocks and readings, from workbooks and from CSV files."""

from __future__ import annotations

from datetime import datetime
from pathlib import Path

import numpy as np
import pytest
from builders import READINGS_HEAD, RECIPES_HEAD, STOCKS_HEAD, csv_file, records_from_rows

from reconcile.importer.read import read_books
from reconcile.records.book import BatchRecords

READINGS = [
    READINGS_HEAD,
    (datetime(2026, 3, 1, 9, 0), "B1", "M1", 22.0, 4.71),
    (datetime(2026, 3, 1, 9, 5), "B2", "M1", 22.5, 7.2),
    (datetime(2026, 3, 1, 9, 9), "B1", "M2", 21.0, 4.7),
]
RECIPES = [
    RECIPES_HEAD,
    ("B1", "acetic acid", "L1", 50.0, "mM", None, None),
    ("B1", "NaOAc", "L2", 50.0, "mM", None, None),
    ("B2", "Na2HPO4", "P1", 25.0, "mL", 1.0, "L"),
    ("B2", "KH2PO4", "P2", 3.4, "g", None, None),
]
STOCKS = [STOCKS_HEAD, ("P1", "Na2HPO4", 1.0, "M", None, None, 2.0)]


def amounts(records: BatchRecords, batch: str) -> dict[str, float]:
    """Form name -> final amount in the solution of a batch."""
    s = records.solutions
    k = s.batch.tolist().index(batch)
    return {records.forms[f].name: a for f, a in zip(s.form[s.solution == k], s.amount[s.solution == k], strict=True)}


def test_a_long_recipe_becomes_final_concentrations() -> None:
    records = records_from_rows(READINGS, RECIPES, STOCKS)
    assert records.rows_read == 3 == len(records.readings)
    assert amounts(records, "B1") == {"acetic acid": pytest.approx(0.05), "sodium acetate": pytest.approx(0.05)}
    # 25 mL of 1 mol/L in 1 L; 3.4 g over 136.086 g/mol (IUPAC 2021 abridged atomic weights, by hand)
    second = amounts(records, "B2")
    assert sorted(second.values()) == pytest.approx([3.4 / 136.086, 0.025], rel=1e-4)
    lots = dict(zip(records.lots.name, records.lots.u_strength, strict=True))
    assert lots["P1"] == pytest.approx(0.02 / np.sqrt(3))
    assert lots["L1"] == pytest.approx(0.01 / np.sqrt(3))
    assert records.readings_solution.tolist() == [0, 1, 0]


@pytest.mark.parametrize(("delimiter", "decimal"), [(",", "."), (";", "."), (";", ","), ("\t", "."), ("\t", ",")])
def test_csv_files_give_the_same_record_as_the_workbook(tmp_path: Path, delimiter: str, decimal: str) -> None:
    whole = records_from_rows(READINGS, RECIPES, STOCKS)
    paths = [
        csv_file(tmp_path / f"{name}.csv", rows, delimiter, decimal)
        for name, rows in (("readings", READINGS), ("recipes", RECIPES), ("stocks", STOCKS))
    ]
    records = read_books(paths)
    assert amounts(records, "B2") == pytest.approx(amounts(whole, "B2"))
    for name in ("ph", "temperature", "read_at", "batch", "meter"):
        assert records.readings[name].tolist() == whole.readings[name].tolist()
