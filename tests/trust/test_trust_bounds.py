"""Every bound is a setting; over it the input is refused in words, and at it nothing is cut short."""

from __future__ import annotations

import csv
from pathlib import Path
from typing import Any

import openpyxl
import pytest
from small_record import write_record
from typer.testing import CliRunner

import reconcile
from reconcile.cli.app import app
from reconcile.records.problems import InputProblems
from reconcile.records.settings import SETTINGS, Settings

LIMITS = {s.key for s in SETTINGS if s.section == "limits"}


def refused(files: list[Path], **limits: Any) -> set[str]:
    with pytest.raises(InputProblems) as raised:
        reconcile.audit(*files, settings={"limits": limits})
    return {problem.code for problem in raised.value.problems}


@pytest.fixture(params=["csv", "xlsx"])
def files(request: pytest.FixtureRequest, tmp_path: Path) -> list[Path]:
    """A record of 48 readings in 6 columns, in either form; its longest cell is a remark of 300 characters."""
    written = [tmp_path / name for name in write_record(tmp_path, remark="x" * 300)]
    if request.param == "csv":
        return written
    book = openpyxl.Workbook()
    book.remove(book.worksheets[0])
    for path in written:
        sheet = book.create_sheet(path.stem)
        with path.open(encoding="utf-8", newline="") as file:
            for r, row in enumerate(csv.reader(file), 1):
                for c, text in enumerate(row, 1):
                    number = r > 1 and text.replace(".", "", 1).isdigit()
                    sheet.cell(r, c, float(text) if number else text)
    book.save(tmp_path / "record.xlsx")
    return [tmp_path / "record.xlsx"]


@pytest.mark.parametrize(
    ("limit", "code", "most"),
    [("rows", "limit-rows", 97), ("columns", "limit-columns", 6), ("cell_chars", "limit-cell", 300)],
)
def test_at_a_limit_all_is_read_and_over_it_nothing(files: list[Path], limit: str, code: str, most: int) -> None:
    """97 lines of recipes with their heading, 6 columns of readings, 300 characters of a remark."""
    record = reconcile.read(*files, settings={"limits": {limit: most}})
    assert (record.rows_read, len(record.readings)) == (48, 48)
    assert len(record.recipes) == 96
    assert set(record.readings["remark"].tolist()) == {"x" * 300}
    assert refused(files, **{limit: most - 1}) == {code}


def test_the_rectangle_of_a_sheet(tmp_path: Path) -> None:
    book = openpyxl.Workbook()
    sheet = book.worksheets[0]
    sheet["A1"], sheet["J100"] = "pH", "far"
    book.save(tmp_path / "wide.xlsx")
    assert refused([tmp_path / "wide.xlsx"], sheet_cells=999) == {"sheet-too-wide"}
    assert "sheet-too-wide" not in refused([tmp_path / "wide.xlsx"], sheet_cells=1000)


@pytest.mark.parametrize("suffix", [".csv", ".xlsx"])
def test_the_size_of_a_file(tmp_path: Path, suffix: str) -> None:
    """Refused before it is read into memory: the bytes are there, but on no disk."""
    path = tmp_path / f"large{suffix}"
    with path.open("wb") as file:
        file.write(b"PK\x03\x04" if suffix == ".xlsx" else b"Batch,pH\n")
        file.truncate((1 << 20) + 1)
    assert refused([path], inflated_mib=1) == {"file-too-large"}


def test_the_number_of_candidates(files: list[Path]) -> None:
    assert refused(files, candidates=3) == {"limit-candidates"}


def test_the_time(files: list[Path]) -> None:
    assert refused(files, minutes=0.0) == {"limit-minutes"}
    with pytest.raises(InputProblems, match="limit in the settings"):
        reconcile.meters(*files, settings={"limits": {"minutes": 0.0}})
    with pytest.raises(InputProblems, match="limit in the settings"):
        reconcile.fit_pka(*files, acid="acetic acid", settings={"limits": {"minutes": 0.0}})


def test_a_refusal_names_the_setting_and_leaves_nothing(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    names = write_record(tmp_path, {"M-2": 0.12})
    for key, value in (("rows", 10), ("columns", 3), ("cell_chars", 5), ("candidates", 2), ("minutes", 0)):
        (tmp_path / "site.toml").write_text(f"[limits]\n{key} = {value}\n", encoding="utf-8")
        done = CliRunner().invoke(app, ["audit", *names, "--settings", "site.toml", "--out", "room"])
        assert (done.exit_code, done.stdout) == (1, "")
        assert f"[limits] {key}" in done.stderr
        assert done.stderr.splitlines()[-1] == "Nothing was written."
        assert not (tmp_path / "room").exists()


def test_every_limit_is_tested_here() -> None:
    assert {"inflated_mib", "rows", "columns", "sheet_cells", "cell_chars", "candidates", "minutes"} == LIMITS
    assert all(Settings()[f"limits.{key}"] > 0 for key in LIMITS)
