"""Writes the invented solution room as a workbook, with a few untidy rows, and the truth beside it."""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import xlsxwriter

FIRST_DAY = datetime(2025, 3, 3)
HEADINGS = {
    "Readings": (
        ("Read at", 17),
        ("Batch", 10),
        ("Meter", 10),
        ("Temperature (°C)", 16),
        ("pH", 13),
        ("Target pH", 10),
        ("Low limit (pH)", 14),
        ("High limit (pH)", 14),
        ("Analyst", 8),
        ("Remark", 30),
    ),
    "Recipes": (
        ("Batch", 10),
        ("Substance", 42),
        ("Lot", 10),
        ("Amount", 10),
        ("Unit", 8),
        ("Made up to", 11),
        ("Made up to unit", 16),
    ),
    "Stocks": (("Lot", 10), ("Substance", 42), ("Strength", 10), ("Unit", 8), ("Tolerance (%)", 14), ("Opened", 12)),
    "Meters": (("Meter", 10), ("Accuracy (pH)", 14), ("Resolution (pH)", 15)),
    "Checks": (("Read at", 17), ("Known solution", 15), ("Meter", 10), ("Temperature (°C)", 16), ("pH", 10)),
    "Events": (("Date", 17), ("Meter", 10), ("What was done", 40)),
}
UNKNOWN = "buffer salt blend"
ABOUT = (
    "An invented solution room: eight weeks of buffer preparation, six meters. Nobody and nothing in it exists.",
    "Readings: one row a reading. Recipes: one row a component. Stocks: one row a bottle. Meters: one row a meter.",
    "Checks: readings of certified buffers. Events: what was done to meters.",
    "Some batches were adjusted to their pH: the recipe says as needed, to pH or q.s., and the amount stands nowhere.",
)


@dataclass(frozen=True)
class Untidy:
    """One row that a record keeper left untidy: index of the reading, what stands in its pH cell, its remark."""

    index: int
    written: str | None
    remark: str


def untidy_rows(rows: Sequence[dict[str, Any]], sound: Callable[[dict[str, Any]], bool]) -> list[Untidy]:
    """A missing pH, a text for a pH, and a number kept as text, each on a sound row."""
    found: list[Untidy] = []
    for start, written, remark in ((40, None, "not entered"), (130, "see print", ""), (210, "number", "")):
        index = next(i for i in range(start, len(rows)) if sound(rows[i]))
        found.append(Untidy(index, f"{rows[index]['ph']:.2f}" if written == "number" else written, remark))
    return found


def write_workbook(
    path: Path,
    lots: Sequence[Any],
    meters: Sequence[str],
    batches: Sequence[Any],
    rows: Sequence[dict[str, Any]],
    untidy: Sequence[Untidy],
    unknown_in: int,
    checks: Sequence[Any],
    adjusted: Mapping[int, str],
    events: Sequence[tuple[datetime, str, str]],
) -> None:
    """The workbook, sheet by sheet.

    unknown_in : the batch with a substance nobody knows; adjusted : batches with an adjusting line, and its words
    """
    book = xlsxwriter.Workbook(str(path))
    book.set_properties({"created": FIRST_DAY, "title": "An invented solution room"})
    bold = book.add_format({"bold": True, "text_wrap": True, "valign": "top", "bottom": 1})
    formats = {
        "time": book.add_format({"num_format": "yyyy-mm-dd hh:mm"}),
        "date": book.add_format({"num_format": "yyyy-mm-dd"}),
        "0.0": book.add_format({"num_format": "0.0"}),
        "0.00": book.add_format({"num_format": "0.00"}),
        "": book.add_format(),
    }
    sheets = {}
    for name, headings in HEADINGS.items():
        sheets[name] = sheet = book.add_worksheet(name)
        sheet.freeze_panes(1, 0)
        for column, (heading, width) in enumerate(headings):
            sheet.set_column(column, column, width)
            sheet.write_string(0, column, heading, bold)
    mended = {u.index: u for u in untidy}
    sheet = sheets["Readings"]
    for i, row in enumerate(rows):
        at, here = i + 1, mended.get(i)
        sheet.write_datetime(at, 0, row["at"], formats["time"])
        sheet.write_string(at, 1, batches[row["batch"]].name)
        sheet.write_string(at, 2, meters[row["meter"]])
        sheet.write_number(at, 3, row["celsius"], formats["0.0"])
        if here is None:
            sheet.write_number(at, 4, row["ph"], formats["0.00"])
        elif here.written is not None:
            sheet.write_string(at, 4, here.written)
        width = 0.1 if batches[row["batch"]].kind in ("acetate", "phosphate", "Tris") else 0.15
        sheet.write_number(at, 5, row["target"], formats["0.00"])
        sheet.write_number(at, 6, round(row["target"] - width, 2), formats["0.00"])
        sheet.write_number(at, 7, round(row["target"] + width, 2), formats["0.00"])
        sheet.write_string(at, 8, f"op {1 + (i * 7) % 4}")
        remark = (here.remark if here else "") or row["remark"]
        if remark:
            sheet.write_string(at, 9, remark)
    sheet, at = sheets["Recipes"], 0
    for number, batch in enumerate(batches):
        for part in batch.parts:
            at += 1
            if number in adjusted and part is batch.parts[-1]:
                sheet.write_row(at, 0, [batch.name, part.lot.label, part.lot.name, adjusted[number]])
                continue
            sheet.write_row(at, 0, [batch.name, part.lot.label, part.lot.name, part.amount, part.unit])
            if part.made_up_to is not None:
                sheet.write_row(at, 5, [part.made_up_to, part.made_up_unit])
        if number == unknown_in:
            at += 1
            sheet.write_row(at, 0, [batch.name, UNKNOWN, "", 1.5, "g", 1, "L"])
    sheet = sheets["Stocks"]
    for at, lot in enumerate(lots, start=1):
        sheet.write_row(at, 0, [lot.name, lot.label])
        if lot.strength:
            sheet.write_row(at, 2, [lot.strength, "mol/L"])
        sheet.write_number(at, 4, lot.tolerance)
        sheet.write_datetime(at, 5, FIRST_DAY + timedelta(days=lot.opened), formats["date"])
    for at, meter in enumerate(meters, start=1):
        sheets["Meters"].write_row(at, 0, [meter, 0.02, 0.01])
    for at, check in enumerate(checks, start=1):
        sheets["Checks"].write_datetime(at, 0, check.at, formats["time"])
        sheets["Checks"].write_row(at, 1, [check.buffer, meters[check.meter]])
        sheets["Checks"].write_number(at, 3, check.celsius, formats["0.0"])
        sheets["Checks"].write_number(at, 4, check.ph, formats["0.00"])
    for at, (moment, meter, what) in enumerate(events, start=1):
        sheets["Events"].write_datetime(at, 0, moment, formats["time"])
        sheets["Events"].write_row(at, 1, [meter, what])
    about = book.add_worksheet("About")
    about.set_column(0, 0, 110)
    for at, line in enumerate(ABOUT):
        about.write_string(at, 0, line)
    book.close()


def write_truth(
    path: Path,
    faults: Sequence[dict[str, Any]],
    set_aside: Sequence[dict[str, Any]],
    adjusted: Sequence[dict[str, Any]],
) -> None:
    """The truth: planted faults in the words of a finding, rows that cannot be used, amounts that stand nowhere."""
    truth = {"planted": list(faults), "set_aside": list(set_aside), "adjusted": list(adjusted)}
    text = json.dumps(truth, indent=2, ensure_ascii=False)
    path.write_text(text + "\n", encoding="utf-8")
