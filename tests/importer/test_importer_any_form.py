"""One record in any form: layout, units, order, names of sheets, delimiter, decimal mark and way of writing dates."""

from __future__ import annotations

import tempfile
from collections.abc import Callable
from dataclasses import dataclass
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import numpy as np
import openpyxl
import pytest
from builders import csv_text, workbook
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from wild_case import aside

from reconcile.importer.read import read_books
from reconcile.records.book import BatchRecords
from reconcile.records.columns import BY_SHEET
from reconcile.records.settings import Settings
from reconcile.records.substances import catalogue
from reconcile.records.units import UNITS

FIRST = datetime(2026, 1, 13, 8, 30)
NAMES = {
    "acetic acid": ("acetic acid", "Acetic Acid", "ethanoic acid", "CH3COOH"),
    "sodium acetate": ("sodium acetate", "NaOAc", "Sodium acetate"),
    "potassium chloride": ("potassium chloride", "KCl"),
}
"""Substances, and spellings that all mean the same; from memory."""
CONCENTRATIONS = ("mM", "M", "mmol/L", "µM", "mol/L", "mol dm-3", "g/L", "mg/mL", "mg/L", "% w/v")
LITRES = 2.0
TAKEN = ("g", "mg", "kg", "mmol", "mol")


@dataclass(frozen=True)
class Record:
    """What is meant, free of any form.

    readings : (batch, meter, moment, °C, pH, remark); recipes : (batch, substance, lot, mol/L)
    """

    readings: tuple[tuple[str, str, datetime, float, float, str], ...]
    recipes: tuple[tuple[str, str, str, float], ...]


@st.composite
def records(draw: st.DrawFn) -> Record:
    """A record of a few batches, meters and lots; every reading at a moment of its own."""
    batches = [f"B-{k:02d}" for k in range(draw(st.integers(1, 4)))]
    recipes = []
    for batch in batches:
        for substance in draw(st.lists(st.sampled_from(list(NAMES)), min_size=1, max_size=3, unique=True)):
            lot = f"{substance[:3]}-{draw(st.integers(1, 3))}"
            recipes.append((batch, substance, lot, draw(st.integers(1, 400)) / 2000))
    minutes = draw(st.lists(st.integers(0, 500_000), min_size=1, max_size=8, unique=True))
    readings = [
        (
            draw(st.sampled_from(batches)),
            f"M{draw(st.integers(1, 3))}",
            FIRST + timedelta(minutes=minute),
            draw(st.integers(150, 300)) / 10,
            draw(st.integers(200, 999)) / 100,
            draw(st.sampled_from(["", "as usual", "a, b; c|d", 'said "so"', "25 µL more"])),
        )
        for minute in minutes
    ]
    return Record(tuple(readings), tuple(recipes))


DATES: dict[str, Callable[[datetime], Any]] = {
    "real dates": lambda t: t,
    "ISO": lambda t: t.strftime("%Y-%m-%d %H:%M"),
    "ISO with T": lambda t: t.isoformat(),
    "slashes": lambda t: t.strftime("%Y/%m/%d %H:%M:%S"),
    "month in words": lambda t: t.strftime("%d %b %Y %H:%M"),
    "half days": lambda t: t.strftime("%d-%B-%Y %I:%M %p"),
    "day-month": lambda t: t.strftime("%d/%m/%Y %H:%M"),
    "day.month": lambda t: t.strftime("%d.%m.%Y %H:%M"),
    "month-day": lambda t: t.strftime("%m/%d/%Y %H:%M"),
}
"""Ways of writing a moment; where the order of day and month is open, the settings say it."""


@st.composite
def forms(draw: st.DrawFn) -> dict[str, Any]:
    """Everything about a record's form that means nothing."""
    return {
        "file": draw(st.sampled_from(["workbook", "two workbooks", "one sheet", "csv"])),
        "wide": draw(st.booleans()),
        "delimiter": draw(st.sampled_from([",", ";", "\t", "|"])),
        "decimal": draw(st.sampled_from([".", ","])),
        "encoding": draw(st.sampled_from(["utf-8", "utf-8-sig", "utf-16"])),
        "dates": draw(st.sampled_from(list(DATES))),
        "apart": draw(st.booleans()),  # date and time in two columns
        "epoch_1904": draw(st.booleans()),
        "units": [draw(st.sampled_from([*CONCENTRATIONS, *TAKEN])) for _ in range(3)],
        "unit_in": draw(st.sampled_from(["column", "cell"])),
        "title": draw(st.booleans()),
        "sheets": draw(st.permutations(["Sheet1", "März", "pH", "Recipes of the week & more"])),
        "headings": draw(st.integers(0, 10**9)),
        "random": draw(st.randoms(use_true_random=False)),
    }


def heading(kind: str, name: str, number: int) -> str:
    """One of the usual headings of a column, in one of three cases."""
    column = next(c for c in BY_SHEET[kind] if c.name == name)
    several = (column.title, *(h for h in column.headings if len(h) > 1 or name == "ph"))
    text = several[number % len(several)]
    return (text, text.upper(), text.capitalize())[number // 7 % 3] if text != column.title else text


def amount_in(unit: str, substance: str, molar: float) -> float:
    """A concentration [mol/L] in another unit, or the quantity of it in LITRES of solution."""
    form = catalogue().by_name[substance]
    measured = UNITS[unit]
    per_litre = molar * (form.molar_mass if measured.measures in ("mass_volume", "mass") else 1.0)
    return per_litre * (LITRES if measured.measures in ("mass", "mol") else 1.0) / measured.factor


Rows = list[list[Any]]


def tables(record: Record, form: dict[str, Any]) -> dict[str, Rows]:
    """The record as rows with their headings: readings, and recipes where they are not in the readings' own columns."""
    random = form["random"]
    moment = DATES[form["dates"]]
    columns: list[tuple[str, list[Any]]] = []
    for i, name in enumerate(("batch", "meter", "read_at", "temperature", "ph", "remark")):
        values = [r[i] for r in record.readings]
        title = heading("readings", name, form["headings"] + 11 * i)
        if name != "read_at":
            columns.append((title, values))
        elif form["apart"]:
            days = [moment(t.replace(hour=0, minute=0)) for t in values]
            columns.append(("Date", [d if isinstance(d, datetime) else d.split("T")[0] for d in days]))
            columns[-1] = ("Date", [_day(d, form["dates"], t) for d, t in zip(columns[-1][1], values, strict=True)])
            columns.append(("Time", [t.strftime("%H:%M") for t in values]))
        else:
            columns.append((title, [moment(t) for t in values]))
    inside = {(b, s): (lot, x) for b, s, lot, x in record.recipes}
    if form["wide"]:
        for k, substance in enumerate(NAMES):
            unit = next(u for u in (form["units"][k], "mM") if u in CONCENTRATIONS)
            name = random.choice(NAMES[substance])
            found = [inside.get((r[0], substance)) for r in record.readings]
            columns.append((f"{name} ({unit})", [f and amount_in(unit, substance, f[1]) for f in found]))
            columns.append((f"{name} lot", [f and f[0] for f in found]))
    random.shuffle(columns)
    rows: Rows = [[title for title, _ in columns], *map(list, zip(*(v for _, v in columns), strict=True))]
    if form["title"]:
        rows = [["Log of the room"], [], *rows]
    return {"readings": rows} if form["wide"] else {"readings": rows, "recipes": long_rows(record, form)}


def _day(day: Any, dates: str, moment: datetime) -> Any:
    """The day alone, in the same way of writing."""
    if isinstance(day, datetime):
        return day
    written = DATES[dates](moment)
    return (
        str(written).split("T")[0] if "T" in str(written)[10:11] else " ".join(str(written).split(" ")[: _words(dates)])
    )


def _words(dates: str) -> int:
    return 3 if dates == "month in words" else 1


def long_rows(record: Record, form: dict[str, Any]) -> Rows:
    """Recipes, a row a component, in any order of rows and columns."""
    random, number = form["random"], form["headings"]
    names = ["batch", "substance", "lot", "amount", "unit", "made_up_to", "made_up_to_unit"]
    lines = []
    for k, (batch, substance, lot, molar) in enumerate(record.recipes):
        unit = form["units"][k % 3]
        amount = amount_in(unit, substance, molar)
        taken = UNITS[unit].measures in ("mass", "mol")
        in_cell = form["unit_in"] == "cell"
        lines.append(
            {
                "batch": batch,
                "substance": random.choice(NAMES[substance]),
                "lot": lot,
                "amount": f"{_decimal(amount, form)} {unit}" if in_cell else amount,
                "unit": None if in_cell else unit,
                "made_up_to": LITRES * 1000.0 if taken else None,
                "made_up_to_unit": "mL" if taken else None,
            }
        )
    random.shuffle(lines)
    random.shuffle(names)
    titles = [heading("recipes", name, number + 5 * i) for i, name in enumerate(names)]
    return [titles, *([line[name] for name in names] for line in lines)]


def _decimal(number: float, form: dict[str, Any]) -> str:
    return f"{number:.17g}".replace(".", form["decimal"] if form["file"] == "csv" else ".")


def written(folder: Path, named: dict[str, Rows], form: dict[str, Any]) -> list[Path]:
    """The tables in files."""
    names = form["sheets"]
    if form["file"] == "csv":
        paths = []
        for name, rows in named.items():
            text = [[v.strftime("%Y-%m-%d %H:%M") if isinstance(v, datetime) else v for v in row] for row in rows]
            paths.append(folder / f"{name}.txt")
            content = csv_text(text, form["delimiter"], form["decimal"])
            paths[-1].write_bytes(content.encode(form["encoding"]))
        form["random"].shuffle(paths)
        return paths
    if form["file"] == "two workbooks":
        return [workbook(folder / f"{name}.xlsx", {names[0]: rows}) for name, rows in named.items()]
    if form["file"] == "one sheet" and len(named) == 2:
        rows = [*named["readings"], [], [], *named["recipes"]]
        return [epoch(workbook(folder / "a.xlsx", {names[0]: rows}), form)]
    return [epoch(workbook(folder / "a.xlsx", dict(zip(names, named.values(), strict=False))), form)]


def epoch(path: Path, form: dict[str, Any]) -> Path:
    """The same workbook with its dates counted from 1904, where the form says so."""
    if form["epoch_1904"]:
        book = openpyxl.load_workbook(path)
        book.epoch = openpyxl.utils.datetime.CALENDAR_MAC_1904
        book.save(path)
    return path


def meant(records: BatchRecords) -> Record:
    """What was read, as what was meant; recipes only of batches that were read, amounts rounded to nine digits."""
    r, s = records.readings, records.solutions
    readings = [
        (
            r["batch"][i],
            r["meter"][i],
            r["read_at"][i].item(),
            float(r["temperature"][i]),
            float(r["ph"][i]),
            r["remark"][i],
        )
        for i in range(len(r))
    ]
    recipes = {
        (str(s.batch[s.solution[c]]), records.forms[s.form[c]].name, records.lots.name[s.lot[c]], nine(s.amount[c]))
        for c in range(len(s.amount))
    }
    return Record(tuple(readings), tuple(sorted(recipes)))


def nine(x: float) -> float:
    return float(f"{x:.9g}")


@settings(max_examples=120, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(records(), forms())
def test_a_record_in_any_form_is_read_as_what_it_means(record: Record, form: dict[str, Any]) -> None:
    order = "month-day" if form["dates"] == "month-day" else "day-month"
    keys: dict[str, Any] = {"date_order": order}
    if form["file"] == "csv":
        keys |= {"decimal": form["decimal"], "delimiter": {"\t": "tab"}.get(form["delimiter"], form["delimiter"])}
    with tempfile.TemporaryDirectory() as name:
        paths = written(Path(name), tables(record, form), form)
        found = read_books(paths, Settings.from_sections({"reading": keys}))
    assert aside(found) == set()
    one, other = meant(found), record
    assert one.readings == other.readings
    read = {r[0] for r in record.readings}
    expected = sorted((b, s, lot, nine(x)) for b, s, lot, x in record.recipes if b in read)
    assert [r[:3] for r in one.recipes] == [r[:3] for r in expected]
    assert [r[3] for r in one.recipes] == pytest.approx([r[3] for r in expected], rel=1e-6)
    assert np.isfinite([r[3] for r in one.recipes]).all()
