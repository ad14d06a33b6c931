"""residuals.xlsx opened again: the values of residuals.csv, in a spreadsheet's own manners."""

from __future__ import annotations

import csv
import io
import shutil
import subprocess
from datetime import datetime
from pathlib import Path

import openpyxl
import pytest
from invented_audit import HOSTILE_BATCH, METERS, build
from openpyxl.workbook import Workbook

from reconcile.reporter import tables, to_xlsx
from reconcile.reporter.lookups import Lookups


@pytest.fixture(scope="module")
def book(folder: Path) -> Workbook:
    return openpyxl.load_workbook(folder / "residuals.xlsx")


def csv_rows(folder: Path, name: str) -> list[dict[str, str]]:
    with (folder / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def test_sheets(book: Workbook) -> None:
    assert book.sheetnames == ["Findings", "Residuals", "Meters", "Stocks", "Set aside", "Method"]


def test_values_are_those_of_the_csv(book: Workbook, folder: Path) -> None:
    sheet = book["Residuals"]
    expected = csv_rows(folder, "residuals.csv")
    assert sheet.max_row == len(expected) + 1
    for column, described in enumerate(tables.RESIDUALS, 1):
        assert sheet.cell(1, column).value == described.heading
        for row, line in enumerate(expected, 2):
            value, text = sheet.cell(row, column).value, line[described.key]
            if described.kind == "text":
                assert (value or "") == text.removeprefix("'")
            elif described.kind == "time":
                assert value == datetime.fromisoformat(text)
            else:
                assert value == (float(text) if text else None)


def test_nothing_is_a_formula_or_a_link(book: Workbook) -> None:
    for sheet in book:
        for row in sheet.iter_rows():
            for cell in row:
                assert cell.data_type != "f", (sheet.title, cell.coordinate)
                assert cell.hyperlink is None
    batches = [c.value for c in book["Residuals"]["D"]]
    assert HOSTILE_BATCH in batches
    risky = next(c for c in book["Residuals"]["D"] if c.value == HOSTILE_BATCH)
    assert risky.quotePrefix


def test_observed_ph_shows_the_decimals_of_its_display(book: Workbook) -> None:
    sheet = book["Residuals"]
    formats = {(sheet.cell(r, 6).value, sheet.cell(r, 10).number_format) for r in range(2, sheet.max_row + 1)}
    assert formats == {(METERS[0], "0.00"), (METERS[1], "0.00"), (METERS[2], "0.0")}


def test_headings_stay_in_sight_and_filter(book: Workbook) -> None:
    for name in book.sheetnames[:-1]:
        sheet = book[name]
        assert sheet.freeze_panes == "A2"
        assert sheet.auto_filter.ref
        assert sheet.print_area
        assert sheet.print_title_rows == "$1:$1"


def test_rows_that_stand_out_are_marked_by_word_and_fill(book: Workbook) -> None:
    sheet = book["Residuals"]
    for row in range(2, sheet.max_row + 1):
        status, fill = sheet.cell(row, 23).value, sheet.cell(row, 14).fill.fgColor.rgb
        assert (fill == "FFD9D9D9") == (status in ("stands_out", "explained"))


def test_method_says_what_made_it(book: Workbook) -> None:
    text = "\n".join(str(c.value) for row in book["Method"].iter_rows() for c in row if c.value is not None)
    for words in (
        "Report id",
        "a" * 64,
        "Davies",
        "apostrophe",
        "lead for the quality unit",
        "prediction.activity_model",
    ):
        assert words in text


def test_a_long_record_keeps_what_stands_out_and_a_summary(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(to_xlsx, "MOST_ROWS", 30)
    monkeypatch.setattr(to_xlsx, "MOST_BATCHES", 7)
    audit = build()
    lookups = Lookups(audit)
    content = to_xlsx.workbook(audit, lookups, tables.residuals(audit, lookups))
    book = openpyxl.load_workbook(io.BytesIO(content))
    sheet = book["Residuals"]
    assert "residuals.csv holds all" in sheet["A1"].value
    statuses = [sheet.cell(r, 23).value for r in range(3, sheet.max_row + 1)]
    assert len(statuses) == int(lookups.flagged.sum())
    assert set(statuses) <= {"stands_out", "explained"}
    assert sheet.freeze_panes == "A3"
    batches = book["Batches"]
    assert batches.max_row == 2 + 7
    assert "7 of 21 batches" in batches["A1"].value


@pytest.mark.skipif(shutil.which("soffice") is None, reason="LibreOffice (soffice) is not installed")
@pytest.mark.slow
def test_libreoffice_reads_the_same_values(folder: Path, tmp_path: Path) -> None:
    """Sheet 2 (Residuals) as CSV by LibreOffice's own filter, values as stored, compared with residuals.csv."""
    options = "csv:Text - txt - csv (StarCalc):44,34,76,1,,0,false,false,false,false,false,2"
    subprocess.run(
        ["soffice", f"-env:UserInstallation=file://{tmp_path}/profile", "--headless", "--convert-to", options,
         "--outdir", str(tmp_path), str(folder / "residuals.xlsx")],
        check=True, capture_output=True, timeout=180,
    )  # fmt: skip
    written = next(tmp_path.glob("*.csv"))
    with written.open(encoding="utf-8", newline="") as file:
        found = list(csv.reader(file))[1:]
    expected = csv_rows(folder, "residuals.csv")
    assert len(found) == len(expected)
    for line, row in zip(found, expected, strict=True):
        for described, text in zip(tables.RESIDUALS, line, strict=True):
            if described.kind in ("number", "integer"):
                assert text == row[described.key] or float(text) == pytest.approx(float(row[described.key]), rel=1e-12)
            elif described.kind == "text":
                assert text == row[described.key].removeprefix("'")
