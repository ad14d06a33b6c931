"""Cases 53 to 64: formulas, errors, merges, CSV files, and the ledger."""

from __future__ import annotations

import re
from pathlib import Path
from typing import Any

import numpy as np
import openpyxl
import pytest
import xlsxwriter
from builders import csv_file, workbook
from wild_case import (
    HEAD,
    RECIPES,
    aside,
    book,
    change_part,
    change_parts,
    csv_log,
    noted,
    read,
    reading,
    readings,
    refusal,
)

from reconcile.importer.read import read_books
from reconcile.importer.toml_files import write_column_map
from reconcile.records.completeness import shortfalls
from reconcile.records.problems import InputProblems

SHEET = "xl/worksheets/sheet1.xml"


def merged(path: Path, *ranges: str, sheet: str = "Readings") -> Path:
    book_ = openpyxl.load_workbook(path)
    for one in ranges:
        book_[sheet].merge_cells(one)
    book_.save(path)
    return path


def test_53_a_formula_that_was_never_calculated_is_set_aside(tmp_path: Path) -> None:
    records = read(book(tmp_path, [reading(0, ph="=4.7+0.01"), *readings(3)]))
    assert aside(records) == {("Readings", "E2", "formula-uncalculated")}
    assert records.set_aside[0].read == "=4.7+0.01"


def test_53_a_column_that_was_never_calculated_is_refused(tmp_path: Path) -> None:
    path = book(tmp_path, [reading(k, ph="=4.7+0.01") for k in range(4)])
    assert refusal(path) == {("Readings", "E2", "formulas-uncalculated")}


def test_53_saved_values_of_formulas_are_read_and_noted(tmp_path: Path) -> None:
    path = book(tmp_path, [reading(0, ph="=4.7+0.01"), *readings(3)])
    saved = change_part(
        path, SHEET, lambda t: t.replace("</f><v />", "</f><v>4.71</v>").replace("</f><v></v>", "</f><v>4.71</v>")
    )
    records = read(saved)
    assert records.readings["ph"].tolist() == [4.71] * 4
    assert ("Readings", "", "cells-computed") in noted(records)


@pytest.mark.parametrize("error", ["#DIV/0!", "#N/A", "#REF!", "#VALUE!", "#NAME?"])
def test_54_error_cells_are_told_from_blank_ones(tmp_path: Path, error: str) -> None:
    records = read(book(tmp_path, [reading(0, ph=error), reading(1, ph=None), reading(2), reading(3, meter=error)]))
    assert aside(records) == {
        ("Readings", "E2", "cell-error"),
        ("Readings", "E3", "ph-missing"),
        ("Readings", "C5", "cell-error"),
    }
    assert records.set_aside[0].read == error


def shared_strings_book(path: Path, rows: list[list[Any]]) -> Path:
    """A workbook whose texts stand in the table of shared strings, as spreadsheet programs write them."""
    book_ = xlsxwriter.Workbook(path, {"default_date_format": "yyyy-mm-dd hh:mm"})
    for name, content in (("Readings", [HEAD, *rows]), ("Recipes", RECIPES)):
        sheet = book_.add_worksheet(name)
        for r, row in enumerate(content):
            for c, value in enumerate(row):
                if value is not None:
                    sheet.write(r, c, value)
    book_.close()
    return path


def test_55_two_readers_agree_on_a_cell_without_its_string(tmp_path: Path) -> None:
    path = shared_strings_book(tmp_path / "record.xlsx", readings(3))
    odd = change_part(path, SHEET, lambda t: re.sub(r'(<c r="C3" t="s"><v>)\d+', r"\1", t), "odd.xlsx")
    assert read(odd).readings["meter"].tolist() == ["M1", "", "M1"]
    for row in openpyxl.load_workbook(path, data_only=True)["Readings"].iter_rows(min_row=2):
        values = [cell.value for cell in row]
        k = row[0].row - 2
        records = read(path)
        assert [records.readings[c][k] for c in ("batch", "meter", "temperature", "ph")] == values[1:]


def test_56_names_and_dates_under_a_merge_go_down_and_a_reading_does_not(tmp_path: Path) -> None:
    path = merged(book(tmp_path, readings(6)), "A2:A3", "B2:B7", "C2:C4", "E5:E7")
    records = read(path)
    assert records.readings["batch"].tolist() == ["B1"] * 4
    assert records.readings["meter"].tolist() == ["M1"] * 4
    assert records.readings["read_at"][1] == records.readings["read_at"][0]
    assert aside(records) == {("Readings", "E6", "ph-merged"), ("Readings", "E7", "ph-merged")}
    assert ("Readings", "B1", "cells-merged") in noted(records)


def test_56_a_section_title_merged_over_the_table_is_no_row(tmp_path: Path) -> None:
    rows = [*readings(2), ["March, second week"], *readings(2)]
    records = read(merged(book(tmp_path, rows), "A4:E4"))
    assert (records.rows_read, records.sheets[0].rows["title"]) == (4, 1)


def test_57_a_blank_batch_is_a_question(tmp_path: Path) -> None:
    path = book(tmp_path, [reading(0), *[reading(k, batch=None) for k in (1, 2, 3)]])
    assert refusal(path) == {("Readings", "B3", "too-many-alike")}
    assert read(path, blank_batch="above").readings["batch"].tolist() == ["B1"] * 4
    assert aside(read(path, blank_batch="missing")) == {("Readings", f"B{r}", "nothing-read") for r in (3, 4, 5)}


def test_57_recipes_that_name_their_batch_once(tmp_path: Path) -> None:
    recipes = [RECIPES[0], *RECIPES[1:2], *[(None, "sodium chloride", "L3", 1.0, "mM")] * 3]
    path = workbook(tmp_path / "record.xlsx", {"Readings": [HEAD, *readings(2)], "Recipes": recipes})
    assert refusal(path) == {("Recipes", "A3", "too-many-alike")}
    assert len(read(path, blank_batch="above").solutions.amount) == 4


def test_58_runs_of_rich_text_are_joined_and_raised_digits_are_not_numbers(tmp_path: Path) -> None:
    path = tmp_path / "rich.xlsx"
    rich = xlsxwriter.Workbook(path)
    bold, raised = rich.add_format({"bold": True}), rich.add_format({"font_script": 1})
    sheet = rich.add_worksheet("Readings")
    for c, heading in enumerate(("Batch", "Meter", "pH")):
        sheet.write(0, c, heading)
    for r in (1, 2, 3):
        sheet.write(r, 0, "B1")
        sheet.write(r, 2, 4.71)
    sheet.write_rich_string(1, 1, bold, "M", "1")
    sheet.write_rich_string(2, 2, "10", raised, "3", " ")
    recipes = rich.add_worksheet("Recipes")
    for r, row in enumerate(RECIPES):
        recipes.write_row(r, 0, row)
    rich.close()
    records = read(path)
    assert records.readings["meter"].tolist() == ["M1", ""]
    assert aside(records) == {("Readings", "C3", "superscript-digits")}


TEXT = "Batch,Meter,pH,Remark\nB1,M1,4.71,25 µL more\nB1,M2,4.70,\n"


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "utf-16-le"])
def test_59_encodings_that_declare_themselves_or_are_named(tmp_path: Path, encoding: str) -> None:
    paths = csv_log(tmp_path, TEXT.encode(encoding))
    if encoding == "utf-16-le":
        assert refusal(paths) == {("", "", "file-nul")}
        paths = [paths[0]]
        csv_file(tmp_path / "recipes16.csv", RECIPES)
        recipes = tmp_path / "recipes16.csv"
        recipes.write_bytes(recipes.read_text().encode("utf-16"))
        paths = [tmp_path / "log.csv", recipes]
        records = read(paths, encoding="utf-16")
    else:
        records = read(paths)
    assert records.readings["remark"].tolist() == ["25 µL more", ""]


def test_59_another_encoding_is_a_question_that_shows_the_line(tmp_path: Path) -> None:
    paths = csv_log(tmp_path, TEXT.encode("cp1252"))
    with pytest.raises(InputProblems) as refused:
        read(paths)
    problem = refused.value.problems[0]
    assert (problem.place.row, problem.code, problem.read) == (2, "file-encoding", "B1,M1,4.71,25 µL more")
    assert 'encoding = "cp1252"' in problem.advice
    assert read(paths, encoding="cp1252").readings["remark"][0] == "25 µL more"


@pytest.mark.parametrize("text", [
    'Batch;Meter;Remark;pH\nB1;M1;"a, b, c";4,71\nB1;M2;"d, e, f";4,70\n',
    "sep=;\nBatch;Meter;Remark;pH\nB1;M1;x;4.71\nB1;M2;y;4.70\n",
    "Batch\tMeter\tRemark\tpH\nB1\tM1\ta, b\t4.71\nB1\tM2\tc; d\t4.70\n",
    "Log of the room\n\nBatch,Meter,Remark,pH\nB1,M1,a;b,4.71\nB1,M2,c;d,4.70\n",
    'Batch|Meter|Remark|pH\nB1|M1|a, b; c|4.71\nB1|M2|"d|e"|4.70\n',
    "sep=|\nBatch|Meter|Remark|pH\nB1|M1|a,b|4,71\nB1|M2|c,d|4,70\n",
])  # fmt: skip
def test_60_the_delimiter_that_gives_the_headings(tmp_path: Path, text: str) -> None:
    records = read(csv_log(tmp_path, text))
    assert records.readings["ph"].tolist() == [4.71, 4.70]
    assert (("", "1", "delimiter-declared") in noted(records)) == text.startswith("sep=")


def test_60_two_delimiters_that_fit_are_a_question(tmp_path: Path) -> None:
    paths = csv_log(tmp_path, "a;x,b\n1;2,3\n4;5,6\n")
    assert refusal(paths) == {("", "", "delimiter-unclear")}


def test_60_a_delimiter_that_the_settings_name_goes_before_all_others(tmp_path: Path) -> None:
    paths = csv_log(tmp_path, "Batch|Meter|pH\nB1|a,b,c|4.71\nB1|d,e,f|4.70\n")[:1]
    recipes = tmp_path / "bars.csv"
    recipes.write_bytes((tmp_path / "recipes.csv").read_bytes().replace(b",", b"|"))
    assert read([*paths, recipes], delimiter="|").readings["meter"].tolist() == ["a,b,c", "d,e,f"]


@pytest.mark.parametrize("line", ['B1,"M1,4.71', 'B1,"M"1,4.71'])
def test_61_an_unbalanced_quotation_mark_is_refused_with_its_line(tmp_path: Path, line: str) -> None:
    paths = csv_log(tmp_path, f"Batch,Meter,pH\nB1,M1,4.71\n{line}\nB1,M1,4.71\n")
    assert refusal(paths) == {("", "3", "csv-quote")}


def test_61_line_ends_of_every_kind_and_an_empty_last_column(tmp_path: Path) -> None:
    records = read(csv_log(tmp_path, "Batch,Meter,pH,\r\nB1,M1,4.71,\nB1,M1,4.70,\r\n"))
    assert records.readings["ph"].tolist() == [4.71, 4.70]


def test_62_a_map_of_columns_holds_odd_headings_as_text_only(tmp_path: Path) -> None:
    records = read(book(tmp_path, [[*r, 1] for r in readings(2)], head=(*HEAD, "@SUM(A1)")))
    out = tmp_path / "columns.toml"
    write_column_map(records, out)
    assert '# "@SUM(A1)" = ' in out.read_text()
    with pytest.raises(FileExistsError):
        write_column_map(records, out)


def test_63_the_ledger_adds_up_and_says_what_is_incomplete(tmp_path: Path) -> None:
    rows = [reading(k, ph="x" if k % 3 == 0 else 4.71, meter="M9" if k % 3 == 0 else "M1") for k in range(30)]
    records = read(book(tmp_path, rows))
    assert (records.rows_read, len(records.readings), len(records.set_aside)) == (30, 20, 10)
    said = " ".join(shortfalls(records))
    assert "10 of 30 rows" in said
    assert "M9" in said
    assert all(len(s.sha256) == 64 for s in records.sheets)


def test_64_a_refusal_says_what_where_and_what_to_do(tmp_path: Path) -> None:
    with pytest.raises(InputProblems) as refused:
        read(tmp_path / "none.xlsx")
    assert str(refused.value) == (
        "none.xlsx: there is no such file. Expected the name of an existing file. Check the name and the folder."
    )


def same(one: Any, other: Any) -> bool:
    return bool(np.array_equal(one, other, equal_nan=one.dtype.kind in "fM"))


def test_64_the_same_input_gives_the_same_record_and_inputs_are_not_written(tmp_path: Path) -> None:
    path = book(tmp_path, [*readings(4), reading(9, ph="x")])
    before = path.read_bytes()
    one, two = read(path), read_books([str(path)])
    assert path.read_bytes() == before
    assert one.set_aside == two.set_aside
    assert one.notes == two.notes
    assert all(same(one.readings[c], two.readings[c]) for c in one.readings.columns)


def test_unusual_xml_is_read_like_the_usual(tmp_path: Path) -> None:
    """Cells without references, attributes in another order, a namespace prefix: all allowed by the format."""
    path = book(tmp_path, [reading(0, ph="#N/A"), reading(1, ph="=1+1"), *readings(3)])
    plain = read(path)

    def unreferenced(text: str) -> str:
        return re.sub(r'<c r="[A-Z]+\d+"', "<c", text)

    def prefixed(text: str) -> str:
        text = re.sub(r"<(/?)(\w)", r"<\1x:\2", text)
        return text.replace("xmlns=", "xmlns:x=")

    for change in (unreferenced, prefixed):
        other = read(change_parts(path, {SHEET: change}))
        assert aside(other) == aside(plain)
        assert same(other.readings["ph"], plain.readings["ph"])
