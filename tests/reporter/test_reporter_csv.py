"""residuals.csv and set_aside.csv: columns, figures and texts."""

from __future__ import annotations

import csv
import io
import re
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from invented_audit import HOSTILE_BATCH, METERS, N

from reconcile.records.results import Audit
from reconcile.reporter import tables
from reconcile.reporter.to_csv import six_digits, table_csv

RESIDUAL_COLUMNS = [
    "source",
    "sheet",
    "row",
    "batch",
    "read_at",
    "meter",
    "probe",
    "stage",
    "temperature_C",
    "pH_observed",
    "pH_predicted",
    "u_predicted",
    "u_residual",
    "residual",
    "z",
    "ionic_strength",
    "buffer_capacity",
    "titrant_equivalent",
    "low_limit",
    "high_limit",
    "pH_calculated",
    "standing",
    "status",
    "explained_by",
]  # the design's list of columns
SET_ASIDE_COLUMNS = [
    "source",
    "sheet",
    "row",
    "batch",
    "meter",
    "lot",
    "cause_source",
    "cause_sheet",
    "cell",
    "read",
    "reason",
    "advice",
]
NUMBERS = RESIDUAL_COLUMNS[8:21]


def rows(content: bytes) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(content.decode("utf-8"), newline="")))


def test_columns_are_those_of_the_design(folder: Path) -> None:
    for name, columns in (("residuals", RESIDUAL_COLUMNS), ("set_aside", SET_ASIDE_COLUMNS)):
        first = (folder / f"{name}.csv").read_text(encoding="utf-8").split("\n")[0]
        assert first == ",".join(columns)


def test_bytes_are_utf8_without_mark_and_with_plain_line_ends(folder: Path) -> None:
    content = (folder / "residuals.csv").read_bytes()
    assert not content.startswith(b"\xef\xbb\xbf")
    assert b"\r" not in content
    assert content.endswith(b"\n")
    assert content.count(b"\n") == N + 1


def test_values_are_those_of_the_audit(invented: Audit, folder: Path) -> None:
    frame = pd.read_csv(folder / "residuals.csv", keep_default_na=False, na_values={c: [""] for c in NUMBERS})
    for name, values in invented.residual_columns().items():
        if name in NUMBERS:
            expected = np.where(np.isfinite(values), values, np.nan).astype(float)
            np.testing.assert_allclose(frame[name].to_numpy(float), expected, rtol=5e-6, atol=0)
    assert frame["status"].tolist() == invented.status.tolist()
    assert frame["row"].tolist() == list(range(2, N + 2))


def test_numbers_have_at_most_six_digits_and_no_plus_sign(folder: Path) -> None:
    for row in rows((folder / "residuals.csv").read_bytes()):
        for name in NUMBERS:
            text = row[name]
            assert "+" not in text
            digits = re.sub(r"e.*$", "", text).replace("-", "").replace(".", "").lstrip("0")
            assert len(digits) <= 6, (name, text)


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (7.41, "7.41"),
        (1234567.0, "1.23457e06"),
        (-0.0, "0"),
        (1e-5, "1e-05"),
        (float("nan"), ""),
        (float("inf"), ""),
        (-0.1234567, "-0.123457"),
    ],
)
def test_six_digits(value: float, text: str) -> None:
    assert six_digits(value) == text


def test_times_are_iso(folder: Path) -> None:
    assert rows((folder / "residuals.csv").read_bytes())[0]["read_at"] == "2026-03-02T08:30:00"


def test_text_that_acts_as_a_formula_is_neutralised_and_nothing_else_is(folder: Path) -> None:
    found = rows((folder / "residuals.csv").read_bytes())
    batches = {r["batch"] for r in found}
    assert f"'{HOSTILE_BATCH}" in batches
    assert HOSTILE_BATCH not in batches
    assert {r["meter"] for r in found} == {METERS[0], METERS[1], f"'{METERS[2]}"}
    assert "../../x" in batches
    aside = rows((folder / "set_aside.csv").read_bytes())
    assert [r["read"] for r in aside] == ["7,41o", "'@SUM(1)", "Mean\\u0000"]
    assert aside[1]["cell"] == "D60"
    for r in (*found, *aside):
        assert all(text.isprintable() for text in r.values())


def test_negative_numbers_keep_their_sign_without_apostrophe(folder: Path) -> None:
    assert any(r["residual"].startswith("-") for r in rows((folder / "residuals.csv").read_bytes()))


def test_a_table_whose_data_do_not_match_its_description_is_refused() -> None:
    with pytest.raises(ValueError, match="are described"):
        tables.Table("t", "T", (tables.Column("a", "A"),), {"b": []})
    with pytest.raises(ValueError, match="unequal"):
        tables.Table("t", "T", (tables.Column("a", "A"), tables.Column("b", "B")), {"a": ["x"], "b": []})


def test_an_empty_table_is_its_headings(invented: Audit) -> None:
    table = tables.residuals(invented).rows(np.arange(0))
    assert table_csv(table).decode() == ",".join(RESIDUAL_COLUMNS) + "\n"
