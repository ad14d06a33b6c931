"""The workbook for a new record: what its cells offer, and that it comes back without a notice when filled in."""

from __future__ import annotations

import io
import re
import shutil
import subprocess
from collections.abc import Mapping, Sequence
from datetime import date, datetime
from pathlib import Path
from typing import Any

import openpyxl
import pytest
from openpyxl.worksheet.worksheet import Worksheet

import reconcile
from reconcile.records.book import BatchRecords
from reconcile.records.columns import BY_SHEET, COLUMNS, NOT_READ, column
from reconcile.records.standards import standards
from reconcile.records.substances import catalogue
from reconcile.records.units import find_unit, unit_names
from reconcile.reporter.newbook import LONGEST_NOTE, LONGEST_TITLE, SHEETS, newbook, notes, write_newbook
from reconcile.reporter.newbook_example import EXAMPLE
from reconcile.reporter.newbook_lists import FROM_SHEET, OFFERS, lists

APART = ["Notes", "Example", "Lists"]


@pytest.fixture(scope="module")
def empty() -> openpyxl.Workbook:
    return openpyxl.load_workbook(io.BytesIO(newbook()))


def typed(path: Path, rows_of: Mapping[str, Sequence[Mapping[str, Any]]]) -> Path:
    """A new workbook with rows typed in: what is typed takes the number format of its column, as in any spreadsheet."""
    write_newbook(path)
    book = openpyxl.load_workbook(path)
    for kind, rows in rows_of.items():
        sheet = book[SHEETS[kind]]
        at = {c.value: c.column for c in sheet[1]}
        for r, row in enumerate(rows, 2):
            for name, value in row.items():
                if value is None:
                    continue
                cell = sheet.cell(r, at[column(kind, name).title], value)
                cell.number_format = next(
                    d.number_format for d in sheet.column_dimensions.values() if d.min <= cell.column <= d.max
                )
                if cell.number_format == "@":
                    cell.data_type = "s"  # what begins with = is no formula in a cell that holds text
    book.save(path)
    return path


def check_all_used(records: BatchRecords, readings: int) -> None:
    assert [n.message() for n in records.notes] == []
    assert records.set_aside == ()
    assert (records.rows_read, len(records.readings)) == (readings, readings)
    assert [p.sheet for p in records.not_read] == APART


def test_every_heading_is_one_of_the_table_and_is_recognised(empty: openpyxl.Workbook, tmp_path: Path) -> None:
    assert empty.sheetnames == ["Notes", *SHEETS.values(), "Example", "Lists"]
    assert set(SHEETS) == set(BY_SHEET)
    for kind, name in SHEETS.items():
        assert [c.value for c in empty[name][1]] == [c.title for c in BY_SHEET[kind]]
        assert empty[name].max_row == 1
    records = reconcile.read(write_newbook(tmp_path / "new.xlsx"))
    assert records.rows_read == 0
    assert records.notes == ()
    for source in records.sheets:
        assert source.sheet == SHEETS[source.kind]
        assert list(source.columns) == [c.name for c in BY_SHEET[source.kind]]
        assert source.ignored == ()


def test_the_same_bytes_each_time_and_another_when_filled(tmp_path: Path) -> None:
    one, two = write_newbook(tmp_path / "a.xlsx"), write_newbook(str(tmp_path / "b.xlsx"))
    assert one.read_bytes() == two.read_bytes() == newbook()
    assert newbook(filled=True) == newbook(filled=True) != newbook()
    assert sorted(p.name for p in tmp_path.iterdir()) == ["a.xlsx", "b.xlsx"]


def test_a_file_or_a_folder_is_never_written_over_unasked(tmp_path: Path) -> None:
    path = tmp_path / "log.xlsx"
    path.write_text("mine")
    with pytest.raises(FileExistsError, match="--replace"):
        write_newbook(path)
    assert path.read_text() == "mine"
    assert write_newbook(path, replace=True).read_bytes() == newbook()
    with pytest.raises(FileExistsError, match="folder"):
        write_newbook(tmp_path, replace=True)
    with pytest.raises(OSError) as refused:
        write_newbook(tmp_path / "nowhere" / "log.xlsx")
    assert refused.value.filename == str(tmp_path / "nowhere" / "log.xlsx")
    assert [p.name for p in tmp_path.iterdir()] == ["log.xlsx"]


@pytest.mark.parametrize("filled", [False, True])
def test_sheets_that_are_not_read_say_so(filled: bool) -> None:
    book = openpyxl.load_workbook(io.BytesIO(newbook(filled)))
    for name in book.sheetnames:
        assert (book[name]["A1"].value == NOT_READ) == (name in APART)


def offered(sheet: Worksheet, letters: str) -> Any:
    """The rule of the cells of a column below its heading."""
    (rule,) = [v for v in sheet.data_validations.dataValidation if f"{letters}2" in v.sqref]
    return rule


def cells_of(book: openpyxl.Workbook, formula: str) -> list[str]:
    name, cells = re.fullmatch(r"'(.+)'!(.+)", formula).groups()  # type: ignore[union-attr]
    return [c.value for (c,) in book[name][cells.replace("$", "")]]


def test_drop_down_lists_hold_what_the_importer_reads(empty: openpyxl.Workbook) -> None:
    for (kind, name), title in OFFERS.items():
        sheet = empty[SHEETS[kind]]
        letters = next(c.column_letter for c in sheet[1] if c.value == column(kind, name).title)
        rule = offered(sheet, letters)
        assert rule.type == "list"
        assert cells_of(empty, rule.formula1) == lists()[title]
    told = lists()
    assert [catalogue().look_up(n).form.name for n in told["Substance"]] == told["Substance"]  # type: ignore[union-attr]
    assert len(told["Substance"]) == len(catalogue().forms)
    for title in ("Unit of an amount", "Unit of a strength", "Unit made up to"):
        assert all(find_unit(u) is not None for u in told[title])
    assert set(unit_names()) - {"%"} == set(told["Unit of an amount"]) - {"M", "mM", "µM"}
    assert told["Known solution, built in"] == sorted(standards())
    assert told["Standing"] == ["original", "retest", "void"]


def test_lists_from_other_sheets_point_at_the_right_column(empty: openpyxl.Workbook) -> None:
    for (kind, name), (other, field) in FROM_SHEET.items():
        sheet = empty[SHEETS[kind]]
        letters = next(c.column_letter for c in sheet[1] if c.value == column(kind, name).title)
        at = re.match(r"OFFSET\('(.+?)'!\$([A-Z]+)\$2,0,0,MAX", offered(sheet, letters).formula1.lstrip("="))
        assert at
        assert empty[at.group(1)][f"{at.group(2)}1"].value == column(other, field).title


def test_notes_are_short_enough_and_stand_for_every_column(empty: openpyxl.Workbook) -> None:
    assert list(notes()) == [(c.sheet, c.name) for c in COLUMNS]
    for c in COLUMNS:
        assert 0 < len(notes()[c.sheet, c.name]) <= LONGEST_NOTE
        assert len(c.title) <= LONGEST_TITLE
        rule = offered(empty[SHEETS[c.sheet]], openpyxl.utils.get_column_letter(BY_SHEET[c.sheet].index(c) + 1))
        assert (rule.promptTitle, rule.prompt) == (c.title, notes()[c.sheet, c.name])
    said = [row[1].value for row in empty["Notes"].iter_rows(min_row=12)]
    assert [t for t in said if t in {c.title for c in COLUMNS}] == [c.title for c in COLUMNS]


def test_hazard_words_stand_beside_substances(empty: openpyxl.Workbook) -> None:
    rows = {row[0].value: row[3].value for row in empty["Lists"].iter_rows(min_row=5)}
    assert rows["acetic acid"] == "corrosive"
    assert "gives off" in rows["sodium azide"]
    assert rows["sodium acetate trihydrate"] == "no hazard word recorded here; see the safety data sheet"


def test_the_example_sheet_shows_the_rows_of_the_filled_workbook() -> None:
    book = openpyxl.load_workbook(io.BytesIO(newbook(filled=True)))
    shown = [[c.value for c in row] for row in book["Example"].iter_rows()]
    for kind, name in SHEETS.items():
        begin = next(i for i, row in enumerate(shown) if str(row[0]).startswith(f"{name}: "))
        width, count = len(BY_SHEET[kind]), len(EXAMPLE[kind])
        rows = [[c.value for c in row] for row in book[name].iter_rows(max_col=width)]
        assert rows == [row[:width] for row in shown[begin + 1 : begin + 2 + count]]
        assert len(rows) == count + 1


def test_the_filled_example_is_read_without_a_notice_and_nothing_is_found(tmp_path: Path) -> None:
    path = write_newbook(tmp_path / "example.xlsx", filled=True)
    records = reconcile.read(path)
    check_all_used(records, len(EXAMPLE["readings"]))
    assert {c for r in EXAMPLE["readings"] for c in r} | {"reference_temperature", "limits"} == {
        c.name for c in BY_SHEET["readings"]
    }
    for kind in BY_SHEET:
        assert len(getattr(records, kind)) == len(EXAMPLE[kind])
    audit = reconcile.audit(records)
    assert audit.findings == ()
    assert max(abs(audit.residuals["residual"])) < 0.03


PERSON: dict[str, list[dict[str, Any]]] = {
    "readings": [
        {"ph": 4.7 + 0.01 * k, "batch": "0012", "meter": "A", "read_at": datetime(2026, 4, 1 + k, 9, 30),
         "temperature": 21.5, "stage": "final", "analyst": "CD", "remark": "=?", "standing": "void" if k == 3 else None}
        for k in range(4)
    ] + [
        {"ph": 7, "known": "phosphate 1:3.5", "meter": "B", "read_at": datetime(2026, 4, 2, 10, 0), "temperature": 25},
        {"ph": 7.013, "batch": "12-B", "meter": "B", "read_at": datetime(2026, 4, 2, 11, 0), "temperature": 20},
    ],
    "recipes": [
        {"batch": "0012", "substance": "acetic acid", "lot": "7", "amount": 100, "unit": "mL", "made_up_to": 1,
         "made_up_to_unit": "L"},
        {"batch": "0012", "substance": "sodium acetate", "lot": "MAR1", "amount": 4.1, "unit": "g", "made_up_to": 1,
         "made_up_to_unit": "L"},
        {"batch": "12-B", "substance": "Tris", "lot": "NA", "amount": 50, "unit": "mM"},
        {"batch": "12-B", "substance": "hydrochloric acid", "amount": 46, "unit": "mM"},
    ],
    "stocks": [{"lot": "7", "substance": "acetic acid", "strength": 0.5, "unit": "M", "opened": date(2026, 3, 30)}],
    "calibrations": [{"meter": "A", "calibrated_at": datetime(2026, 4, 1, 8, 0), "slope": 99, "offset": -3}],
    "events": [{"meter": "A", "at": datetime(2026, 4, 2, 12, 0), "what": "cleaned"}],
    "meters": [{"meter": "A", "accuracy": 0.02}, {"meter": "B", "accuracy": 0.01, "resolution": 0.001}],
}  # fmt: skip


def test_filled_in_by_a_person_it_is_read_without_a_notice(tmp_path: Path) -> None:
    records = reconcile.read(typed(tmp_path / "log.xlsx", PERSON))
    check_all_used(records, len(PERSON["readings"]))
    for kind, rows in PERSON.items():
        table = getattr(records, kind)
        assert len(table) == len(rows)
        for name in {n for row in rows for n in row if n != "standing"}:
            read = table[name].tolist()
            wrote = [row.get(name) for row in rows]
            if column(kind, name).kind == "time":
                moments = [
                    w if isinstance(w, datetime) or w is None else datetime(w.year, w.month, w.day) for w in wrote
                ]
                assert read == moments
            elif column(kind, name).kind == "text":
                assert read == [w or "" for w in wrote]
            else:
                assert [r if r == r else None for r in read] == pytest.approx(wrote)
    assert records.readings["standing"].tolist() == ["original"] * 3 + ["void"] + ["original"] * 2


def test_the_example_typed_in_is_the_filled_workbook(tmp_path: Path) -> None:
    records = reconcile.read(typed(tmp_path / "log.xlsx", EXAMPLE))
    check_all_used(records, len(EXAMPLE["readings"]))
    other = reconcile.read(write_newbook(tmp_path / "filled.xlsx", filled=True))
    assert records.solutions.amount.tolist() == other.solutions.amount.tolist()
    assert records.readings["ph"].tolist() == other.readings["ph"].tolist()


@pytest.mark.skipif(shutil.which("soffice") is None, reason="LibreOffice (soffice) is not installed")
@pytest.mark.slow
def test_saved_by_another_spreadsheet_program_it_keeps_lists_and_is_read_without_a_notice(tmp_path: Path) -> None:
    source = write_newbook(tmp_path / "log.xlsx", filled=True)
    subprocess.run(
        ["soffice", f"-env:UserInstallation=file://{tmp_path}/profile", "--headless", "--convert-to", "xlsx",
         "--outdir", str(tmp_path / "saved"), str(source)],
        check=True, capture_output=True, timeout=180,
    )  # fmt: skip
    saved = tmp_path / "saved" / "log.xlsx"
    check_all_used(reconcile.read(saved), len(EXAMPLE["readings"]))
    sheet = openpyxl.load_workbook(saved)["Recipes"]
    kinds = [v.type for v in sheet.data_validations.dataValidation]
    assert kinds.count("list") == sum(1 for kind, _ in (*OFFERS, *FROM_SHEET) if kind == "recipes")
