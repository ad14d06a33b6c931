"""The 64 ways in which real spreadsheets go wrong as one table: number, verdict, file, what is said and where.

Each row builds its file and says all that the importer must say of it. The tests by number in the other files go into
each case; this table keeps the count and the verdicts.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date, datetime, time
from pathlib import Path

import pytest
from openpyxl.comments import Comment
from openpyxl.styles import Font
from wild_builders import (
    OLE,
    Build,
    bomb,
    bytes_of,
    log,
    made_of,
    one,
    part,
    percents,
    raised,
    rows_of,
    sheets,
    styled,
    text,
    whole,
    zipped,
)  # fmt: skip
from wild_case import HEAD, aside, noted, read, reading, readings, refusal

from reconcile.records.problems import PROBLEMS, Effect

Said = set[tuple[str, str, str]]
ACC, NOTE, ASIDE, ASK, REFUSE = "accepted", "noted", "set aside", "asked", "refused"
EFFECT = {NOTE: Effect.NOTED, ASIDE: Effect.LEAVES_OUT, ASK: Effect.STOPS, REFUSE: Effect.STOPS}
NO_CASE = "temperature-missing"
"""Said of every log without temperatures, whatever else is wrong with it."""


@dataclass(frozen=True)
class Wild:
    """One case: its number, its verdict, what builds the file, and every (sheet, cell, code) that is said of it."""

    number: int
    verdict: str
    build: Build
    said: Said


def at(cell: str, code: str, sheet: str = "Readings") -> Said:
    return {(sheet, cell, code)}


def of_file(code: str) -> Said:
    return {("", "", code)}


NUMBER, LINE = "ph-not-a-number", "B1,M1,4.71"
WIDE = ("Batch", "pH", "KCl (mM)", "KCl lot")
COMMENT, STRUCK = Comment("read twice", "AB"), Font(strike=True)
ZONED = "2026-03-05 14:20Z"

# fmt: off
TABLE = [
    Wild(1, REFUSE, bytes_of("log.xlsx", OLE + "EncryptedPackage".encode("utf-16-le")), of_file("file-encrypted")),
    Wild(2, NOTE, whole("log.xls"), of_file("file-name-differs")),
    Wild(2, REFUSE, bytes_of("log.xls", b"<html><table></table></html>"), of_file("file-type")),
    Wild(3, REFUSE, whole("cut.xlsx", lambda b: b[:900]), of_file("file-damaged")),
    Wild(3, REFUSE, bytes_of("~$log.xlsx", b"\x07Someone"), of_file("file-lock")),
    Wild(4, REFUSE, bomb, of_file("file-too-large")),
    Wild(5, REFUSE, part(lambda t: '<!DOCTYPE x [<!ENTITY a "b">]>' + t), of_file("file-entities")),
    Wild(6, NOTE, text("Batch,Meter,pH", *[LINE] * 65535),
         of_file("file-maybe-cut") | at("3:pH", "duplicate-row", "")),
    Wild(7, NOTE, whole("log.xlsm"), of_file("file-macros")),
    Wild(7, REFUSE, bytes_of("log.xls", OLE + b"\x00" * 600), of_file("file-type")),
    Wild(8, REFUSE, zipped("log.ods", mimetype="application/vnd.oasis.opendocument.spreadsheet"), of_file("file-type")),
    Wild(9, ACC, part(lambda t: t.replace("<fonts", '<fonts bad="x"', 1), "xl/styles.xml"), set()),
    Wild(10, NOTE, styled(lambda s: setattr(s["E3"], "comment", COMMENT)),
         at("", "beside-the-cells") | at("E3", "cell-comment")),
    Wild(11, ACC, part(lambda t: t.replace('ref="A1:E4"', 'ref="A1:B2"')), set()),
    Wild(12, ACC, part(lambda t: t.replace('ref="A1:E4"', 'ref="A1:XFD1048576"')), set()),
    Wild(12, REFUSE, part(lambda t: t.replace('r="E3"', 'r="XFD1048576"')), at("", "sheet-too-wide")),
    Wild(13, ASIDE, sheets(Readings=[[], [], [None, *HEAD], [None, *reading(ph="x")], [None, *reading(1)]]),
         at("F4", NUMBER)),
    Wild(14, ASIDE, text("Batch,Remark,pH", 'B1,"two', 'lines",4.7', "", "B1,,x"), at("5:pH", NUMBER, "")),
    Wild(15, NOTE, styled(lambda s: setattr(s.row_dimensions[3], "hidden", True)), at("", "rows-hidden")),
    Wild(16, NOTE, sheets(Readings=[HEAD, *readings(2)], Notes=[["keep dry"]]), at("", "sheet-ignored", "Notes")),
    Wild(17, ASK, sheets(Readings=[("Batch", "M-01", "M-02"), ("B1", 4.7, 4.7)]), at("", "file-no-table")),
    Wild(17, NOTE, log([*reading(), 1.2], head=(*HEAD, "Conductivity")), at("F1", "column-ignored")),
    Wild(18, ASIDE, text("Batch,Meter,pH", *[LINE] * 60, LINE + ",more"), at("62", "row-width", "")),
    Wild(18, ASK, text("Batch,Meter,pH", *["B1,M1,4,71"] * 20), at("2", "too-many-alike", "")),
    Wild(19, ACC, sheets(Readings=[["pH log of the room"], [], HEAD, *readings(2)]), set()),
    Wild(19, ASK, sheets(Readings=[["Lot code", "acidity"], ["B1", 4.71]]), at("", "file-no-table")),
    Wild(20, ACC, sheets(Log=[["Batch", "pH", "KCl"], [None, "reading", "(mM)"], ["B9", 6.9, 50.0]]), set()),
    Wild(21, ACC, sheets(Log=[["Batch", "Temperature", "pH"], [None, "°C", None], ["B1", 21.0, 4.7]]), set()),
    Wild(21, ASIDE, sheets(Log=[WIDE, ("B9", 6.9, "0.1 M", "L"), ("B8", 6.9, 50.0, "L")]),
         at("C2", "unit-conflict", "Log")),
    Wild(22, ASK, log([*reading(), 4.8], head=(*HEAD, "pH reading")), at("F1", "column-twice")),
    Wild(22, NOTE, rows_of([*reading(5), "x"]), at("F1", "heading-blank")),
    Wild(23, ACC, rows_of(list(HEAD), reading(5)), set()),
    Wild(24, ACC, rows_of(head=("Date\u00a0/ time", "BATCH no.", "pH meter", "Temp (degC)", "p\u200bH")), set()),
    Wild(25, ASIDE, rows_of([None, "Mean", None, None, 4.71]), at("4", "summary-row")),
    Wild(26, NOTE, styled(lambda s: setattr(s["E3"], "font", STRUCK)), at("E3", "cells-struck")),
    Wild(27, NOTE, one(ph="4,71"), at("E4", "decimal-comma") | at("E4", "number-as-text")),
    Wild(28, ASK, log(*readings(4, ph="4,712")), at("E2", "too-many-alike")),
    Wild(28, ASIDE, sheets(Log=[WIDE, ("B8", 6.9, "1,250", "L"), ("B9", 6.9, 50.0, "L")]),
         at("C2", "decimal-unclear", "Log")),
    Wild(29, ASIDE, text("Batch,Meter,pH", *[LINE] * 60, "B1,M1,4,71"), at("62", "row-width", "")),
    Wild(30, NOTE, one(t="22 °C"), at("D4", "number-with-unit")),
    Wild(30, ASIDE, one(ph="7.02 (rpt)"), at("E4", NUMBER)),
    Wild(31, ASIDE, one(ph="<2"), at("E4", "number-censored")),
    Wild(32, NOTE, one(t="n/a", meter="NA"), at("D4", "missing-mark")),
    Wild(33, ASIDE, one(ph="1_0"), at("E4", NUMBER)),
    Wild(34, NOTE, one(t="\u22121.5"), at("D4", "look-alike-characters") | at("D4", "number-as-text")),
    Wild(35, ACC, made_of(50.0, "\u03bcM"), set()),
    Wild(36, ASIDE, made_of(50.0, None), at("C2", "unit-missing", "Recipes")),
    Wild(37, NOTE, one(ph="4.71"), at("E4", "number-as-text")),
    Wild(37, ASIDE, one(ph=True), at("E4", NUMBER)),
    Wild(38, NOTE, percents(0.985, "98.5 %"), at("C3", "number-with-unit", "Stocks")),
    Wild(38, ACC, percents(0.985, 98.5), set()),
    Wild(38, ASIDE, percents(0.985, 0.985), at("C3", "number-out-of-range", "Stocks")),
    Wild(39, ACC, text("Batch,pH", "B1,7.00", "B1,7.1"), set()),
    Wild(40, ACC, one(ph=4.710000000000001), set()),
    Wild(41, NOTE, rows_of(reading(5, ph=4.749), formats={"Readings!E4": "0.0"}), at("E4", "display-rounded")),
    Wild(42, ASIDE, one(ph=70.2), at("E4", "ph-not-physical")),
    Wild(43, NOTE, one(meter=12), at("C4", "id-number")),
    Wild(43, NOTE, rows_of(reading(5, meter=12), formats={"Readings!C4": "0000"}), at("C4", "id-padded")),
    Wild(43, ASK, rows_of(reading(5, meter=12), reading(6, meter="0012")), at("C4", "names-zeros")),
    Wild(44, ASIDE, one(meter=date(2026, 3, 1)), at("C4", "id-destroyed")),
    Wild(45, NOTE, rows_of(reading(5, meter="L0-1"), reading(6, meter="LO-1")), at("C5", "names-alike")),
    Wild(46, NOTE, rows_of(reading(5), reading(5), reading(5, ph=4.8)),
         at("E5", "duplicate-row") | at("E6", "same-moment")),
    Wild(47, ASK, log(*readings(3, at="03/04/2026")), at("A2", "too-many-alike")),
    Wild(48, NOTE, part(lambda t: t.replace("<workbookPr", '<workbookPr date1904="1"', 1), "xl/workbook.xml"),
         of_file("epoch-1904")),
    Wild(48, NOTE, one(at=datetime(2022, 3, 1)), at("A4", "date-far-off")),
    Wild(49, NOTE, one(at=46083.5), at("A4", "serial-date")),
    Wild(49, ASIDE, one(at=60), at("A4", "time-not-a-time")),
    Wild(50, ASIDE, one(at=time(9, 30)), at("A4", "time-without-date")),
    Wild(51, NOTE, one(at=46083.479166666664), at("A4", "serial-date")),
    Wild(52, ASK, log(*readings(3, at=ZONED)), at("A2", "too-many-alike")),
    Wild(52, ASK, log(*readings(3, at="25/03/26")), at("A2", "too-many-alike")),
    Wild(52, ASIDE, one(at="5 März 2026"), at("A4", "time-not-a-time")),
    Wild(53, ASIDE, one(ph="=4.7+0.01"), at("E4", "formula-uncalculated")),
    Wild(53, REFUSE, log(*readings(4, ph="=4.7+0.01")), at("E2", "formulas-uncalculated")),
    Wild(54, ASIDE, one(ph="#DIV/0!"), at("E4", "cell-error")),
    Wild(55, ACC, part(lambda t: t.replace('<c r="C3" t="inlineStr"><is><t>M1</t></is></c>', '<c r="C3" t="s"><v/></c>')
                       .replace('<c r="C3" t="s"><v>6</v></c>', '<c r="C3" t="s"><v></v></c>')), set()),
    Wild(56, NOTE, styled(lambda s: s.merge_cells("B2:B4")), at("B1", "cells-merged")),
    Wild(56, ASIDE, styled(lambda s: s.merge_cells("E2:E4")), at("E3", "ph-merged") | at("E4", "ph-merged")),
    Wild(57, ASK, rows_of(*(reading(k, batch=None) for k in (5, 6, 7))), at("B4", "too-many-alike")),
    Wild(58, ASIDE, raised, at("B3", "superscript-digits")),
    Wild(59, ASK, text("Batch,pH,Remark", "B1,4.71,25 µL more", encoding="cp1252"), at("2", "file-encoding", "")),
    Wild(59, REFUSE, text("Batch,pH", "B1,4.71", encoding="utf-16-le"), of_file("file-nul")),
    Wild(60, NOTE, text("sep=;", "Batch;pH", "B1;4.71"), at("1", "delimiter-declared", "")),
    Wild(60, ASK, text("a;x,b", "1;2,3", "4;5,6"), of_file("delimiter-unclear")),
    Wild(61, REFUSE, text("Batch,Meter,pH", LINE, 'B1,"M1,4.71', LINE), at("3", "csv-quote", "")),
    Wild(62, ACC, rows_of([*reading(5, meter="@SUM(1)"), "+1"], head=(*HEAD, "Remark")), set()),
    Wild(63, ASIDE, one(ph="see print"), at("E4", NUMBER)),
    Wild(64, REFUSE, lambda folder: folder / "none.xlsx", of_file("file-missing")),
]
# fmt: on


def test_all_64_are_there_and_every_verdict_is_what_its_codes_do() -> None:
    assert {case.number for case in TABLE} == set(range(1, 65))
    for case in TABLE:
        assert {PROBLEMS[code].effect for _, _, code in case.said} <= {EFFECT.get(case.verdict)}, case
        assert bool(case.said) == (case.verdict != ACC), case


@pytest.mark.parametrize("case", TABLE, ids=lambda c: f"{c.number:02d}-{c.verdict.replace(' ', '-')}")
def test_what_is_said_of_each_case(tmp_path: Path, case: Wild) -> None:
    paths = case.build(tmp_path)
    if case.verdict in (ASK, REFUSE):
        assert refusal(paths) == case.said
        return
    records = read(paths)
    notes = {said for said in noted(records) if said[2] != NO_CASE}
    assert aside(records) == (case.said if case.verdict == ASIDE else set())
    if case.verdict != ASIDE:
        assert notes == case.said
    assert records.rows_read > 0
