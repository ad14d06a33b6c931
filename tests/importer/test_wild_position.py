"""Cases 11 to 26: where things stand on a sheet, and its headings."""

from __future__ import annotations

from pathlib import Path

import openpyxl
import pytest
from builders import csv_text, workbook
from openpyxl.styles import Font
from wild_case import (
    HEAD,
    RECIPES,
    aside,
    book,
    change_part,
    csv_log,
    csv_pair,
    noted,
    read,
    reading,
    readings,
    refusal,
)

from reconcile.importer.read import read_books
from reconcile.records.columns import NOT_READ

SHEET = "xl/worksheets/sheet1.xml"


def test_11_a_dimension_that_lies_low_loses_nothing(tmp_path: Path) -> None:
    path = change_part(book(tmp_path, readings(8)), SHEET, lambda t: t.replace('ref="A1:E9"', 'ref="A1:B2"'))
    assert read(path).rows_read == 8


def test_12_a_dimension_that_lies_high_costs_nothing(tmp_path: Path) -> None:
    path = change_part(book(tmp_path, readings(3)), SHEET, lambda t: t.replace('ref="A1:E4"', 'ref="A1:XFD1048576"'))
    assert read(path).rows_read == 3


def test_12_a_stray_cell_far_outside_is_refused_and_not_laid_out(tmp_path: Path) -> None:
    stray = '<row r="1048576"><c r="XFD1048576" t="n"><v>1</v></c></row></sheetData>'
    path = change_part(book(tmp_path, readings(3)), SHEET, lambda t: t.replace("</sheetData>", stray))
    assert refusal(path) == {("Readings", "", "sheet-too-wide")}


def test_12_rows_below_a_blank_block_are_read(tmp_path: Path) -> None:
    rows = [*readings(2), *[[None] * 5] * 300, reading(9, ph="x"), reading(10)]
    records = read(book(tmp_path, rows))
    assert records.rows_read == 4
    assert aside(records) == {("Readings", "E304", "ph-not-a-number")}


def test_13_findings_cite_the_real_cell_below_blank_rows_and_columns(tmp_path: Path) -> None:
    rows = [[None] * 7] * 6 + [[None, None, *r] for r in [HEAD, reading(0), reading(1, ph="seven")]]
    path = workbook(tmp_path / "record.xlsx", {"Readings": rows, "Recipes": RECIPES})
    assert aside(read(path)) == {("Readings", "G9", "ph-not-a-number")}


def test_14_csv_lines_are_counted_as_they_stand_in_the_file(tmp_path: Path) -> None:
    text = 'Batch,Remark,pH\r\nB1,"two\r\nlines",4.7\r\n\r\n,,\r\nB1,,seven\r\n'
    records = read(csv_log(tmp_path, text))
    assert aside(records) == {("", "6:pH", "ph-not-a-number")}
    assert records.rows_read == 2
    assert next(s for s in records.sheets if s.kind == "readings").rows["blank"] == 2


def test_15_hidden_rows_columns_and_sheets_are_read_and_noted(tmp_path: Path) -> None:
    path = book(tmp_path, readings(4))
    hidden = openpyxl.load_workbook(path)
    hidden["Readings"].row_dimensions[3].hidden = True
    hidden["Readings"].column_dimensions["D"].hidden = True
    hidden["Recipes"].sheet_state = "hidden"
    hidden.save(path)
    records = read(path)
    assert len(records.readings) == 4
    expected = {("Readings", "", "rows-hidden"), ("Readings", "D", "columns-hidden"), ("Recipes", "", "sheet-hidden")}
    assert expected <= noted(records)
    assert aside(read(path, hidden_rows="leave out")) == {("Readings", "3", "row-hidden")}


def test_16_a_workbook_may_hold_several_tables_and_each_is_shown(tmp_path: Path) -> None:
    sheets = {"March": [HEAD, *readings(2)], "April": [HEAD, *readings(3)], "Recipes": RECIPES, "Notes": [["keep dry"]]}
    records = read(workbook(tmp_path / "record.xlsx", sheets))
    assert [(s.sheet, s.kind) for s in records.sheets] == [
        ("March", "readings"),
        ("April", "readings"),
        ("Recipes", "recipes"),
    ]
    assert ("Notes", "", "sheet-ignored") in noted(records)
    assert records.rows_read == 5


def test_16_a_sheet_that_says_so_itself_is_not_read_and_is_named(tmp_path: Path) -> None:
    sheets = {"Readings": [HEAD, *readings(2)], "Recipes": RECIPES, "Example": [[NOT_READ], HEAD, *readings(3)]}
    records = read(workbook(tmp_path / "record.xlsx", sheets))
    assert (records.rows_read, [p.sheet for p in records.not_read], noted(records)) == (2, ["Example"], set())
    sheets["Example"][0] = [f"{NOT_READ} Or is it?"]
    assert read(workbook(tmp_path / "other.xlsx", sheets)).rows_read == 5
    only = workbook(tmp_path / "only.xlsx", {"Example": sheets["Example"], "Recipes": RECIPES})
    assert read(only).rows_read == 3


def test_16_tables_below_and_beside_each_other_are_told_apart(tmp_path: Path) -> None:
    rows = [[*HEAD, None, *RECIPES[0]]]
    rows += [[*reading(k), None, *(RECIPES[k + 1] if k < 2 else [None] * 5)] for k in range(4)]
    rows += [[None] * 11, ["Meters in use"], ["Meter", "Accuracy (pH)", "Resolution (pH)"], ["M1", 0.02, 0.01]]
    records = read(workbook(tmp_path / "record.xlsx", {"All": rows}))
    assert {s.kind: s.heading_row for s in records.sheets} == {"readings": 1, "recipes": 1, "meters": 8}
    assert (len(records.readings), len(records.recipes), len(records.meters)) == (4, 2, 1)
    assert aside(records) == set()


def test_17_a_column_for_each_meter_is_never_guessed_but_can_be_mapped(tmp_path: Path) -> None:
    rows = [["Batch", "M-01", "M-02"], ["B1", 4.71, 4.73], ["B1", 4.70, None]]
    path = workbook(tmp_path / "record.xlsx", {"Readings": rows, "Recipes": RECIPES})
    assert refusal(path) == {("Readings", "", "file-no-table")}
    column_map = {"readings": {name: {"field": "ph", "meter": name} for name in ("M-01", "M-02")}}
    records = read_books([path], column_map=column_map)
    assert list(zip(records.readings["meter"], records.readings["ph"], strict=True)) == [
        ("M-01", 4.71), ("M-02", 4.73), ("M-01", 4.70),
    ]  # fmt: skip
    assert records.rows_read == 3


def test_17_unmapped_columns_are_listed(tmp_path: Path) -> None:
    records = read(book(tmp_path, [[*r, 1.2] for r in readings(2)], head=(*HEAD, "Conductivity")))
    assert ("Readings", "F1", "column-ignored") in noted(records)


def test_18_a_line_of_another_width_is_set_aside(tmp_path: Path) -> None:
    text = csv_text([("Batch", "Meter", "pH")] + [("B1", "M1", 4.71)] * 60)
    lines = text.splitlines()
    lines[10] += ",extra"
    lines[20] = "B1,M1"
    records = read(csv_log(tmp_path, "\n".join(lines)))
    assert aside(records) == {("", "11", "row-width"), ("", "21", "row-width")}
    assert records.rows_read == 60


def test_18_many_lines_of_another_width_are_a_question(tmp_path: Path) -> None:
    lines = ["Batch,Meter,pH"] + ["B1,M1,4,71"] * 20
    assert refusal(csv_log(tmp_path, "\n".join(lines))) == {("", "2", "too-many-alike")}


def test_19_title_rows_above_the_headings(tmp_path: Path) -> None:
    rows = [["pH log of the solution room"], ["Meter", "M1"], [], list(HEAD), *readings(3)]
    records = read(workbook(tmp_path / "record.xlsx", {"Readings": rows, "Recipes": RECIPES}))
    sheet = records.sheets[0]
    assert (sheet.heading_row, sheet.rows["title"], sheet.rows["data"]) == (4, 2, 3)


def test_19_no_heading_row_is_refused_with_the_nearest(tmp_path: Path) -> None:
    rows = [["Lot code", "acidity"], ["B1", 4.71]]
    path = workbook(tmp_path / "record.xlsx", {"Sheet1": rows})
    assert refusal(path) == {("Sheet1", "", "file-no-table")}
    with pytest.raises(Exception, match=r"acidity.*--columns"):
        read(path)


def test_20_headings_that_span_two_rows_under_real_merges(tmp_path: Path) -> None:
    rows = [
        ["Batch", "Meter", "pH", None, "Acetic acid", None, "Sodium acetate (mM)"],
        [None, None, 1, 2, "(mM)", "lot", None],
        ["B9", "M1", 4.71, 4.72, 50.0, "L1", 50.0],
    ]
    path = workbook(tmp_path / "record.xlsx", {"Log": rows})
    merged = openpyxl.load_workbook(path)
    merged["Log"].merge_cells("C1:D1")
    merged["Log"].merge_cells("E1:F1")
    merged.save(path)
    records = read(path)
    assert records.readings["ph"].tolist() == [4.71, 4.72]
    assert records.readings["repeat"].tolist() == [1, 2]
    assert records.lots.name.tolist() == ["L1"]
    assert records.solutions.amount.tolist() == pytest.approx([0.05, 0.05])


def test_21_a_row_of_units_is_no_data_and_gives_the_units(tmp_path: Path) -> None:
    rows = [["Batch", "Meter", "Temperature", "pH", "Acetic acid"], [None, None, "°C", None, "mM"]]
    rows += [["B9", "M1", 21.0, 3.0, 50.0]]
    records = read(workbook(tmp_path / "record.xlsx", {"Log": rows, "Recipes": RECIPES}))
    sheet = records.sheets[0]
    assert sheet.rows["units"] == 1
    assert sheet.columns["temperature"][2] == "°C"


def test_21_a_unit_in_the_cell_against_the_heading_is_set_aside(tmp_path: Path) -> None:
    head = ("Batch", "pH", "Acetic acid (mM)", "Sodium acetate (mM)")
    records = read(book(tmp_path, [["B9", 4.7, 50.0, 50.0], ["B8", 4.7, "0.1 M", 50.0]], head=head))
    assert aside(records) == {("Readings", "C3", "unit-conflict")}


def test_22_a_needed_heading_that_stands_twice_is_a_question(tmp_path: Path) -> None:
    path = book(tmp_path, [[*r, 4.8] for r in readings(3)], head=(*HEAD, "pH reading"))
    assert refusal(path) == {("Readings", "F1", "column-twice")}


def test_22_cells_under_a_blank_heading_are_noted(tmp_path: Path) -> None:
    records = read(book(tmp_path, [[*r, "x"] for r in readings(3)]))
    assert ("Readings", "F1", "heading-blank") in noted(records)


def test_23_headings_said_again_are_counted_apart(tmp_path: Path) -> None:
    records = read(book(tmp_path, [*readings(2), HEAD, *readings(2), ["Read at", "Batch", "Meter", None, "pH!"]]))
    sheet = records.sheets[0]
    assert sheet.rows["heading repeat"] == 1
    assert records.rows_read == 5
    assert aside(records) == {("Readings", "E7", "ph-not-a-number")}


@pytest.mark.parametrize("heading", ["p\u00a0H", "PH", "\ufeffpH", "p\u200bH", "pH\n(observed)", "ｐＨ", "pH value"])
def test_24_spellings_of_a_heading(tmp_path: Path, heading: str) -> None:
    records = read(book(tmp_path, readings(2), head=(*HEAD[:4], heading)))
    assert len(records.readings) == 2


@pytest.mark.parametrize("heading", ["Temp (degC)", "TEMPERATURE", "T [°C]", "Temp. (ºC)", "Temperature, °C"])
def test_24_spellings_of_a_heading_with_a_unit(tmp_path: Path, heading: str) -> None:
    records = read(book(tmp_path, readings(2), head=(*HEAD[:3], heading, "pH")))
    assert records.readings["temperature"].tolist() == [22.0, 22.0]


def test_25_summary_rows_are_set_aside_as_such(tmp_path: Path) -> None:
    rows = [
        *readings(3),
        [None, "Mean", None, None, 4.71],
        [None, "n = 3", None, None, 3],
        reading(8, ph="=AVERAGE(E2:E4)"),
    ]
    path = book(tmp_path, rows)
    cached = change_part(
        path, SHEET, lambda t: t.replace("<f>AVERAGE(E2:E4)</f><v />", "<f>AVERAGE(E2:E4)</f><v>4.7</v>")
    )
    records = read(cached)
    assert {(s.place.row, s.code, s.summary) for s in records.set_aside} == {
        (5, "summary-row", True), (6, "summary-row", True), (7, "summary-row", True),
    }  # fmt: skip
    assert records.sheets[0].rows["summary"] == 3


def test_26_struck_through_cells_are_noted(tmp_path: Path) -> None:
    path = book(tmp_path, readings(3))
    struck = openpyxl.load_workbook(path)
    struck["Readings"]["E3"].font = Font(strike=True)
    struck.save(path)
    records = read(path)
    assert len(records.readings) == 3
    assert ("Readings", "E3", "cells-struck") in noted(records)


def test_csv_and_workbook_agree(tmp_path: Path) -> None:
    one, other = read(book(tmp_path, readings(5))), read(csv_pair(tmp_path, readings(5)))
    for name in ("ph", "batch", "meter", "read_at", "temperature"):
        assert one.readings[name].tolist() == other.readings[name].tolist()


@pytest.mark.parametrize("reference", ["E4000000000", "ABatch2", "AAAAA2", "e2"])
def test_12_a_cell_reference_that_no_sheet_has_is_damage(tmp_path: Path, reference: str) -> None:
    path = change_part(book(tmp_path, readings(3)), SHEET, lambda t: t.replace('<c r="E2"', f'<c r="{reference}"'))
    assert {code for _, _, code in refusal(path)} <= {"file-damaged", "sheet-too-wide"}


def test_12_a_row_far_below_its_place_is_not_laid_out(tmp_path: Path) -> None:
    path = change_part(book(tmp_path, readings(3)), SHEET, lambda t: t.replace('<c r="E2"', '<c r="E1048576"'))
    assert len(read(path).readings) == 2  # five columns of a million rows may still be laid out
    wide = change_part(path, SHEET, lambda t: t.replace('<c r="E3"', '<c r="ZE3"'), "wide.xlsx")
    assert refusal(wide) == {("Readings", "", "sheet-too-wide")}
