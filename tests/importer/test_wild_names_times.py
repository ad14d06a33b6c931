"""Cases 43 to 52: identifiers, dates and times."""

from __future__ import annotations

from datetime import date, datetime, time, timedelta
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from builders import workbook
from wild_case import RECIPES, aside, book, change_part, csv_log, noted, read, reading, readings, refusal

from reconcile.importer.read import read_books

ZEROS = ("Batch", "Meter", "pH", "Acetic acid (mM)", "Acetic acid lot")


def zeros(folder: Path, rows: list[tuple[Any, ...]], **more: Any) -> Path:
    return workbook(folder / "record.xlsx", {"Readings": [ZEROS, *rows]}, **more)


def dated(folder: Path, texts: list[Any], **more: Any) -> Path:
    return book(folder, [reading(0, at=t) for t in texts], **more)


def moments(folder: Path, texts: list[Any], **keys: Any) -> list[str]:
    return [str(t) for t in read(dated(folder, texts), **keys).readings["read_at"]]


def test_43_a_padded_number_is_the_name_that_is_shown(tmp_path: Path) -> None:
    records = read(zeros(tmp_path, [(12, "M1", 3.0, 50.0, 7)], formats={"Readings!A2": "0000", "Readings!E2": "000"}))
    assert records.readings["batch"].tolist() == ["0012"]
    assert ("Readings", "A2", "id-padded") in noted(records)


def test_43_a_whole_number_as_a_name_is_noted_and_zeros_in_text_stay(tmp_path: Path) -> None:
    records = read(zeros(tmp_path, [(12.0, "M1", 3.0, 50.0, "L"), ("0013", "M1", 3.0, 50.0, "L")]))
    assert records.readings["batch"].tolist() == ["12", "0013"]
    assert ("Readings", "A2", "id-number") in noted(records)


def test_43_a_number_beside_a_text_with_leading_zeros_is_a_question(tmp_path: Path) -> None:
    path = zeros(tmp_path, [(12, "M1", 3.0, 50.0, "L"), ("0012", "M1", 3.0, 50.0, "L")])
    assert refusal(path) == {("Readings", "A2", "names-zeros")}
    assert read(path, leading_zeros="apart").readings["batch"].tolist() == ["12", "0012"]


@pytest.mark.parametrize("destroyed", [date(2026, 3, 1), datetime(2026, 9, 2), 2.310009e19, 1.5, True])
def test_44_a_name_that_the_spreadsheet_destroyed_is_set_aside(tmp_path: Path, destroyed: Any) -> None:
    records = read(zeros(tmp_path, [(destroyed, "M1", 3.0, 50.0, "L"), ("B2", "M1", 3.0, 50.0, "L")]))
    assert aside(records) == {("Readings", "A2", "id-destroyed")}


def test_45_names_that_look_the_same_are_noted_and_kept_apart(tmp_path: Path) -> None:
    lots = ["L0-1", "LO-1", "L0 1", "А7", "A7"]  # a digit, a letter O, a space; a Cyrillic A and a Latin one
    records = read(zeros(tmp_path, [(f"B{k}", "M1", 3.0, 50.0, lot) for k, lot in enumerate(lots)]))
    assert sorted(records.lots.name) == sorted(lots)
    alike = [n for n in records.notes if n.code == "names-alike"]
    assert len(alike) == 3


def test_45_meters_named_by_their_columns_are_compared_too(tmp_path: Path) -> None:
    path = workbook(
        tmp_path / "r.xlsx", {"Readings": [("Batch", "M-O1", "M-01"), ("B1", 4.7, 4.7)], "Recipes": RECIPES}
    )
    column_map = {"readings": {name: {"field": "ph", "meter": name} for name in ("M-O1", "M-01")}}
    records = read_books([path], column_map=column_map)
    assert ("Readings", "B2", "names-alike") in noted(records)


def test_45_a_trailing_space_makes_no_second_meter(tmp_path: Path) -> None:
    records = read(book(tmp_path, [reading(0, meter="M1 "), reading(1, meter="\u00a0M1")]))
    assert set(records.readings["meter"]) == {"M1"}


def test_46_identical_rows_and_clashing_rows_are_kept_and_noted(tmp_path: Path) -> None:
    rows = [reading(0), reading(0), reading(0, ph=4.8), reading(3)]
    records = read(book(tmp_path, rows))
    assert len(records.readings) == 4
    assert {("Readings", "E3", "duplicate-row"), ("Readings", "E4", "same-moment")} <= noted(records)


def test_47_the_order_of_day_and_month_is_settled_by_the_whole_column(tmp_path: Path) -> None:
    assert moments(tmp_path, ["03/04/2026", "25/03/2026", "01/04/2026"])[0] == "2026-04-03T00:00:00"
    assert moments(tmp_path, ["03/04/2026", "03/25/2026", "01/04/2026"])[0] == "2026-03-04T00:00:00"


def test_47_where_no_day_tells_it_is_a_question(tmp_path: Path) -> None:
    path = dated(tmp_path, ["03/04/2026", "05/03/2026", "01/04/2026"])
    assert refusal(path) == {("Readings", "A2", "too-many-alike")}
    assert moments(tmp_path, ["03/04/2026"] * 3, date_order="day-month")[0] == "2026-04-03T00:00:00"
    assert moments(tmp_path, ["03/04/2026"] * 3, date_order="month-day")[0] == "2026-03-04T00:00:00"


def test_47_text_among_real_dates_is_a_question(tmp_path: Path) -> None:
    half = [datetime(2026, 4, 3), datetime(2026, 5, 3), "25/03/2026", "26/03/2026", "27/03/2026"]
    assert refusal(dated(tmp_path, half)) == {("Readings", "A4", "too-many-alike")}
    assert len(read(dated(tmp_path, half), date_order="day-month").readings) == 5


SAME_MOMENT = [
    "2026-03-05 14:20",
    "2026/03/05 14:20:00",
    "5 March 2026 14:20",
    "05-Mar-2026 2:20 pm",
    "March 5, 2026 14:20",
    "2026-03-05T14:20",
]


@pytest.mark.parametrize("text", SAME_MOMENT)
def test_47_dates_that_say_their_order(tmp_path: Path, text: str) -> None:
    assert moments(tmp_path, [text]) == ["2026-03-05T14:20:00"]


def test_48_dates_counted_from_1904_are_read_so_and_noted(tmp_path: Path) -> None:
    path = dated(tmp_path, [45000.5, 45001, 45002])
    flagged = change_part(path, "xl/workbook.xml", lambda t: t.replace("<workbookPr", '<workbookPr date1904="1"', 1))
    plain, mac = read(path), read(flagged)
    assert (mac.readings["read_at"] - plain.readings["read_at"])[0] == np.timedelta64(1462, "D")
    assert ("", "", "epoch-1904") in noted(mac)


def test_48_a_date_far_from_the_rest_is_noted(tmp_path: Path) -> None:
    rows = [reading(k) for k in range(5)] + [reading(0, at=datetime(2022, 3, 1))]
    assert ("Readings", "A7", "date-far-off") in noted(read(book(tmp_path, rows)))


def test_49_serial_numbers_in_a_date_column(tmp_path: Path) -> None:
    records = read(dated(tmp_path, [45000.5, 45001.25, 60, 12.0]))
    # 45000 is 2023-03-15: days from 1899-12-30, counted by hand
    assert str(records.readings["read_at"][0]) == "2023-03-15T12:00:00"
    assert ("Readings", "A2", "serial-date") in noted(records)
    assert aside(records) == {("Readings", "A4", "time-not-a-time"), ("Readings", "A5", "time-not-a-time")}


def test_50_a_duration_or_a_time_alone_is_no_date(tmp_path: Path) -> None:
    rows = [timedelta(hours=30, minutes=5), time(9, 30), "09:30", *[r[0] for r in readings(2)]]
    records = read(dated(tmp_path, rows))
    assert aside(records) == {("Readings", f"A{r}", "time-without-date") for r in (2, 3, 4)}


def test_50_date_and_time_in_two_columns_are_one_time(tmp_path: Path) -> None:
    head = ("Date", "Time", "Batch", "pH")
    rows = [
        head,
        (date(2026, 3, 5), time(9, 30), "B1", 4.7),
        (date(2026, 3, 5), "10:15", "B1", 4.7),
        ("2026-03-06", "1:05 pm", "B1", 4.7),
    ]
    records = read(workbook(tmp_path / "record.xlsx", {"Readings": rows, "Recipes": RECIPES}))
    expected = ["2026-03-05T09:30:00", "2026-03-05T10:15:00", "2026-03-06T13:05:00"]
    assert [str(t) for t in records.readings["read_at"]] == expected


def test_51_seconds_are_rounded_and_not_cut(tmp_path: Path) -> None:
    # 11:30 on day 45000 as the spreadsheet stores it is 45000.479166666664, a hair before
    assert moments(tmp_path, [45000.479166666664]) == ["2023-03-15T11:30:00"]


def test_52_zones_and_short_years_are_questions(tmp_path: Path) -> None:
    zoned = dated(tmp_path, ["2026-03-05 14:20Z", "2026-03-05 14:20+02:00", "2026-03-05T14:20Z"])
    assert refusal(zoned) == {("Readings", "A2", "too-many-alike")}
    assert str(read(zoned, time_zone="ignore").readings["read_at"][1]) == "2026-03-05T14:20:00"
    short = dated(tmp_path, ["25/03/26", "26/03/26", "27/03/26 10:15"])
    assert refusal(short) == {("Readings", "A2", "too-many-alike")}
    assert str(read(short, two_digit_years="2000").readings["read_at"][2]) == "2026-03-27T10:15:00"


def test_52_a_month_in_another_language_is_set_aside(tmp_path: Path) -> None:
    assert aside(read(dated(tmp_path, ["5 März 2026", "2026-03-05"]))) == {("Readings", "A2", "time-not-a-time")}


def test_52_a_repeated_hour_keeps_the_order_of_the_rows(tmp_path: Path) -> None:
    records = read(dated(tmp_path, ["2026-10-25 02:30", "2026-10-25 02:10", "2026-10-25 02:30"]))
    assert [str(t)[11:16] for t in records.readings["read_at"]] == ["02:30", "02:10", "02:30"]


def test_52_impossible_dates_are_set_aside(tmp_path: Path) -> None:
    records = read(csv_log(tmp_path, "Date,Batch,pH\n2026-02-30,B1,4.7\n2026-03-01 25:00,B1,4.7\n2026-03-01,B1,4.7\n"))
    assert aside(records) == {("", "2:Date", "time-not-a-time"), ("", "3:Date", "time-not-a-time")}
