"""The one table of columns (columns.csv): what a sheet may hold, how it may be headed, what its cells must be."""

from __future__ import annotations

import csv
import unicodedata
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

KINDS = ("number", "text", "time", "amount")
NOT_READ = "This sheet is not read by reconcile."
"""What the first cell of a sheet says that is there for its readers alone: notes, lists, an example."""


@dataclass(frozen=True)
class Column:
    """One column of one kind of sheet.

    sheet : kind of sheet: readings, recipes, stocks, known, meters, calibrations, events, series
    name : field name in the Table
    title : heading as we write it ourselves, with its unit
    kind : number, text, time, or amount (a number that may carry its own unit)
    headings : the trade's usual spellings, compared after `heading_key`
    unit : unit of the values once read ("" when it has none)
    low, high : range outside which a value is not physical, in that unit
    advice : what to do about a cell that cannot be read
    needed : the sheet is not recognised without it
    """

    sheet: str
    name: str
    title: str
    kind: str
    headings: tuple[str, ...]
    unit: str = ""
    low: float = float("-inf")
    high: float = float("inf")
    advice: str = "Compare with the original entry and correct it under site procedure."
    needed: bool = False


def heading_key(text: str) -> str:
    """A heading as it is compared: NFKC, case folded, without unit brackets' contents, one space between words."""
    folded = unicodedata.normalize("NFKC", text).casefold()
    folded = "".join(
        " " if c in "_-/.:#*\u200b\ufeff\n\r\t" or c.isspace() else c for c in folded if c not in "\u200b\ufeff"
    )
    return " ".join(folded.split())


def _columns() -> tuple[Column, ...]:
    with (Path(__file__).parent / "columns.csv").open(encoding="utf-8", newline="") as file:
        return tuple(
            Column(
                r["sheet"],
                r["name"],
                r["title"],
                r["kind"],
                tuple(r["headings"].split("|")),
                r["unit"],
                float(r["low"] or "-inf"),
                float(r["high"] or "inf"),
                needed=bool(r["needed"]),
            )
            for r in csv.DictReader(file)
        )


COLUMNS: tuple[Column, ...] = _columns()
BY_SHEET: Mapping[str, tuple[Column, ...]] = {
    sheet: tuple(c for c in COLUMNS if c.sheet == sheet) for sheet in dict.fromkeys(c.sheet for c in COLUMNS)
}
READING_EXTRA = ("resolution", "repeat")
"""Numbers that a readings Table carries beside its columns: display resolution [pH], and the repeat (1, 2, ...)."""
_JUDGED = (
    *("pass", "passed", "fail", "failed", "complies", "conforms", "does not comply", "in spec", "out of spec", "oos"),
    *("in specification", "out of specification", "within limits", "outside limits", "approved", "released"),
    *("accepted", "reviewed", "checked", "done", "complete", "completed", "closed", "final", "first"),
)
STANDINGS: Mapping[str, str] = {
    "": "original",
    "original": "original",
    "initial": "original",
    "valid": "original",
    "ok": "original",
    **dict.fromkeys(_JUDGED, "original"),
    "re test": "retest",
    "re tested": "retest",
    "retested": "retest",
    "re read": "retest",
    "reading repeated": "retest",
    "excluded": "void",
    "discarded": "void",
    "deleted": "void",
    "withdrawn": "void",
    "not valid": "void",
    "retest": "retest",
    "repeat": "retest",
    "reread": "retest",
    "remeasured": "retest",
    "void": "void",
    "voided": "void",
    "invalid": "void",
    "rejected": "void",
    "invalidated": "void",
    "cancelled": "void",
}
"""Spellings of `standing`, compared after heading_key. What a reading was judged to be leaves its standing as it is."""


def column(sheet: str, name: str) -> Column:
    """One column by its sheet and field name; KeyError where there is none."""
    for one in BY_SHEET[sheet]:
        if one.name == name:
            return one
    raise KeyError((sheet, name))
