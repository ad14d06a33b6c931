"""Cases 27 to 42: numbers as they are typed."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from builders import records_from_rows
from wild_case import aside, book, change_part, csv_log, csv_pair, noted, read, reading, readings, refusal

CELL = ("Readings", "E2", "ph-not-a-number")


def ph_of(folder: Path, cell: Any, **keys: Any) -> float:
    """The pH read from one cell, beside nothing but ordinary readings."""
    records = read(book(folder, [reading(0, ph=cell), *readings(3)[1:]]), **keys)
    return float(records.readings["ph"][0]) if len(records.readings) == 3 else np.nan


def test_27_a_decimal_comma_is_read_and_noted(tmp_path: Path) -> None:
    records = read(book(tmp_path, [reading(0, ph="4,71"), *readings(3)[1:]]))
    assert records.readings["ph"][0] == 4.71
    assert ("Readings", "E2", "decimal-comma") in noted(records)


def test_27_contradicting_marks_in_one_column_are_not_settled(tmp_path: Path) -> None:
    rows = [reading(k, ph="4,71" if k % 2 else "4.71") for k in range(8)]
    assert refusal(csv_pair(tmp_path, rows, delimiter=";")) == {("", "3:pH", "too-many-alike")}


def test_28_one_comma_and_three_digits_is_a_question(tmp_path: Path) -> None:
    rows = [reading(k, ph="4,712") for k in range(4)]
    path = book(tmp_path, rows)
    assert refusal(path) == {("Readings", "E2", "too-many-alike")}
    assert read(path, decimal=",").readings["ph"].tolist() == [4.712] * 4
    assert aside(read(path, decimal=".")) == {("Readings", f"E{r}", "ph-not-a-number") for r in (2, 3, 4, 5)}


def test_28_an_unclear_comma_among_clear_ones_follows_them(tmp_path: Path) -> None:
    rows = [reading(0, ph="4,712"), reading(1, ph="4,71"), reading(2, ph="4,7")]
    assert read(book(tmp_path, rows)).readings["ph"].tolist() == [4.712, 4.71, 4.7]


def test_28_separators_are_never_stripped(tmp_path: Path) -> None:
    head = ("Batch", "pH", "Acetic acid (mM)", "Sodium acetate (mM)")
    records = read(book(tmp_path, [["B9", 4.7, 50.0, 50.0], ["B8", 4.7, "1,250", 50.0]], head=head))
    assert aside(records) == {("Readings", "C3", "decimal-unclear")}


def test_29_an_unquoted_decimal_comma_is_a_line_too_wide(tmp_path: Path) -> None:
    lines = ["Batch,Meter,pH", *["B1,M1,4.71"] * 50, "B1,M1,4,71"]
    records = read(csv_log(tmp_path, "\n".join(lines)))
    assert aside(records) == {("", "52", "row-width")}
    assert "decimal comma" in records.set_aside[0].advice


@pytest.mark.parametrize("text", ["7.02 (rpt)", "ca. 7", "7.02*", "7.0.2", "7,41o", "pH", "7 .1"])
def test_30_other_text_is_set_aside_with_the_cell(tmp_path: Path, text: str) -> None:
    records = read(book(tmp_path, [reading(0, ph=text), reading(1)]))
    assert aside(records) == {CELL}
    assert records.set_aside[0].read == text


def test_30_exact_units_are_converted_and_noted(tmp_path: Path) -> None:
    records = read(book(tmp_path, [reading(0, t="71.6 °F"), reading(1, t="22 °C"), reading(2, t="295.15 K")]))
    assert records.readings["temperature"].tolist() == pytest.approx([22.0, 22.0, 22.0])
    assert ("Readings", "D2", "number-with-unit") in noted(records)


@pytest.mark.parametrize("text", ["<2", ">12", "≥ 7", "2-3", "4.6 - 4.8", "7.0 +/- 0.1", "7.0 ± 0.1"])
def test_31_limits_and_ranges_are_no_numbers(tmp_path: Path, text: str) -> None:
    records = read(book(tmp_path, [reading(0, ph=text), reading(1)]))
    assert aside(records) == {("Readings", "E2", "number-censored")}


@pytest.mark.parametrize("mark", ["NA", "N/A", "n/a", "-", "—", "ND", "nan", "null", None])
def test_32_missing_marks_in_numbers_and_names_in_names(tmp_path: Path, mark: str | None) -> None:
    rows = [reading(0, t=mark), reading(1), reading(2, ph=mark), reading(3, meter=mark)]
    records = read(book(tmp_path, rows))
    assert np.isnan(records.readings["temperature"][0])
    assert aside(records) == {("Readings", "E4", "ph-missing")}
    assert records.readings["meter"][2] == (mark or "")
    if mark:
        assert ("Readings", "D2", "missing-mark") in noted(records)


def test_32_a_lot_called_na_stays(tmp_path: Path) -> None:
    head = ("Batch", "pH", "Acetic acid (mM)", "Acetic acid lot")
    records = read(book(tmp_path, [["NA", 4.7, 50.0, "NA"], ["None", 4.7, 50.0, "nan"]], head=head))
    assert records.readings["batch"].tolist() == ["NA", "None"]
    assert records.lots.name.tolist() == ["NA", "nan"]


@pytest.mark.parametrize("text", ["1_0", "Infinity", "1e400", "0x7", "٧", "7e", "--7", "1e1_0", "7.0f"])
def test_33_what_programming_languages_take_for_numbers_is_not_one(tmp_path: Path, text: str) -> None:
    assert aside(read(book(tmp_path, [reading(0, ph=text), reading(1)]))) == {CELL}


def test_33_full_width_digits_are_read_and_noted(tmp_path: Path) -> None:
    records = read(book(tmp_path, [reading(0, ph="４．７１"), reading(1, ph="\u00a04.70 ")]))
    assert records.readings["ph"].tolist() == [4.71, 4.70]
    assert ("Readings", "E2", "look-alike-characters") in noted(records)


@pytest.mark.parametrize("minus", ["\u2212", "\u2012", "\u2013", "-"])
def test_34_every_minus_is_a_minus(tmp_path: Path, minus: str) -> None:
    assert ph_of(tmp_path, f"{minus}0.12") == -0.12


@pytest.mark.parametrize(("unit", "factor"), [("µM", 1e-6), ("μM", 1e-6), ("uM", 1e-6), ("mM", 1e-3), ("M", 1.0)])
def test_35_both_micro_signs_and_the_case_of_m(unit: str, factor: float) -> None:
    records = records_from_rows(
        [("Batch", "pH"), ("B1", 7.0)], [("Batch", "Substance", "Amount", "Unit"), ("B1", "NaCl", 0.5, unit)]
    )
    assert records.solutions.amount.tolist() == pytest.approx([0.5 * factor])


@pytest.mark.parametrize(("unit", "code"), [(None, "unit-missing"), ("MM", "unit-unknown"), ("%", "percent-unclear")])
def test_36_units_are_never_guessed(unit: str | None, code: str) -> None:
    records = records_from_rows(
        [("Batch", "pH"), ("B1", 7.0)], [("Batch", "Substance", "Amount", "Unit"), ("B1", "NaCl", 0.5, unit)]
    )
    assert aside(records) == {("Recipes", "C2", code)}


def test_36_normal_counts_the_protons_of_the_formula() -> None:
    records = records_from_rows(
        [("Batch", "pH"), ("B1", 1.0)], [("Batch", "Substance", "Amount", "Unit"), ("B1", "H2SO4", 0.2, "N")]
    )
    assert records.solutions.amount.tolist() == pytest.approx([0.1])


def test_37_numbers_as_text_are_read_and_counted_and_booleans_are_not(tmp_path: Path) -> None:
    records = read(book(tmp_path, [reading(0, ph="4.71"), reading(1, ph="4.70"), reading(2, ph=True), reading(3)]))
    assert records.readings["ph"].tolist() == [4.71, 4.70, 4.71]
    assert aside(records) == {("Readings", "E4", "ph-not-a-number")}
    note = next(n for n in records.notes if n.code == "number-as-text")
    assert (note.place.cell, dict(note.words)["count"]) == ("E2", "2")


def test_38_a_percent_format_and_percent_text_mean_the_same(tmp_path: Path) -> None:
    from builders import workbook

    stocks = [("Lot", "Substance", "Assay (%)"), ("L1", "NaCl", 0.985), ("L2", "NaCl", 98.5), ("L3", "NaCl", "98.5 %")]
    stocks.append(("L4", "NaCl", 0.985))
    recipes = [("Batch", "Substance", "Lot", "Amount", "Unit", "Made up to")]
    recipes += [(f"B{k}", "NaCl", f"L{k}", 58.44, "g", "1 L") for k in (1, 2, 3, 4)]
    rows = [("Batch", "pH"), *((f"B{k}", 7.0) for k in (1, 2, 3, 4))]
    path = workbook(
        tmp_path / "r.xlsx", {"Readings": rows, "Recipes": recipes, "Stocks": stocks}, {"Stocks!C2": "0.0%"}
    )
    records = read(path)
    assert records.solutions.amount.tolist() == pytest.approx([0.985] * 3, rel=1e-4)
    assert aside(records) == {("Stocks", "C5", "number-out-of-range")}


def test_39_resolution_comes_from_format_or_text_or_the_grid(tmp_path: Path) -> None:
    rows = [reading(0, ph=7.0), reading(1, ph=7.0), reading(2, ph=7)]
    records = read(book(tmp_path, rows, formats={"Readings!E2": "0.00", "Readings!E3": "0.0"}))
    assert records.readings["resolution"].tolist() == pytest.approx([0.01, 0.1, np.nan], nan_ok=True)
    text = read(csv_log(tmp_path, "Batch,pH\nB1,7.00\nB1,7.0\nB1,7\n"))
    assert text.readings["resolution"].tolist() == pytest.approx([0.01, 0.1, 1.0])
    grid = read(book(tmp_path, [reading(k, ph=4.6 + k / 100) for k in range(12)]))
    assert grid.readings["resolution"].tolist() == pytest.approx([0.01] * 12)
    whole = read(book(tmp_path, [reading(k, ph=7.0) for k in range(12)]))
    assert np.isnan(whole.readings["resolution"]).all()


def test_40_float_noise_is_kept_as_it_is(tmp_path: Path) -> None:
    assert ph_of(tmp_path, 20.4 / 3) == 20.4 / 3


def test_41_a_format_that_rounds_is_noted_and_the_stored_value_is_read(tmp_path: Path) -> None:
    records = read(book(tmp_path, [reading(0, ph=7.049), *readings(2)], formats={"Readings!E2": "0.0"}))
    assert records.readings["ph"][0] == 7.049
    assert np.isnan(records.readings["resolution"][0])
    assert ("Readings", "E2", "display-rounded") in noted(records)


@pytest.mark.parametrize(("ph", "t", "cell", "code"), [
    (-3.0, 22.0, "E2", "ph-not-physical"), (70.2, 22.0, "E2", "ph-not-physical"), (702, 22.0, "E2", "ph-not-physical"),
    (4.7, 250.0, "D2", "number-out-of-range"), (4.7, -40.0, "D2", "number-out-of-range"),
])  # fmt: skip
def test_42_impossible_values_are_set_aside_and_not_mended(
    tmp_path: Path, ph: float, t: float, cell: str, code: str
) -> None:
    assert aside(read(book(tmp_path, [reading(0, ph=ph, t=t), reading(1)]))) == {("Readings", cell, code)}


def test_a_limit_that_cannot_be_read_costs_only_itself(tmp_path: Path) -> None:
    rows = [[*reading(0), "about 5"], [*reading(1), 5.0]]
    records = read(book(tmp_path, rows, head=("Read at", "Batch", "Meter", "Temperature (°C)", "pH", "High limit")))
    assert len(records.readings) == 2
    assert np.isnan(records.readings["high_limit"][0])
    assert ("Readings", "F2", "cell-not-used") in noted(records)


def test_numbers_in_a_wide_csv_with_inline_strings(tmp_path: Path) -> None:
    path = book(tmp_path, readings(3))
    inline = change_part(
        path,
        "xl/worksheets/sheet1.xml",
        lambda t: t.replace(
            '<c r="E2" t="n"><v>4.71</v></c>', '<c r="E2" t="inlineStr"><is><r><t>4.</t></r><r><t>72</t></r></is></c>'
        ),
    )
    assert read(inline).readings["ph"].tolist() == [4.72, 4.71, 4.71]
