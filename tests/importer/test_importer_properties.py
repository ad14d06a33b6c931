"""Properties of the importer on generated records."""

from __future__ import annotations

import tempfile
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from builders import csv_file, records_from_rows, workbook
from hypothesis import HealthCheck, event, given, settings
from hypothesis import strategies as st
from wild_case import aside

from reconcile.importer.bulk import compose_plain
from reconcile.importer.compose import Composer
from reconcile.importer.line_parts import LineReader
from reconcile.importer.lines import empty_lines
from reconcile.importer.read import read_books
from reconcile.importer.resolve import Resolver
from reconcile.importer.stocks import Stock, StockRoom
from reconcile.records.places import Place
from reconcile.records.problems import InputProblems
from reconcile.records.settings import Settings
from reconcile.records.substances import catalogue
from reconcile.records.units import UNITS

FEW = settings(max_examples=40, deadline=None, suppress_health_check=[HealthCheck.too_slow])
FIRST = datetime(2026, 1, 5, 8, 30)

CELLS = st.one_of(
    st.none(),
    st.floats(-5, 20, allow_nan=False).map(lambda x: round(x, 2)),
    st.sampled_from(["4,71", "4.71", "<2", "n/a", "x", "", " ", "#N/A", "2026-03-01", "Mean", "B1", "pH", "7.0 °C"]),
    st.booleans(),
    st.datetimes(datetime(1990, 1, 1), datetime(2040, 1, 1)).map(lambda t: t.replace(microsecond=0)),
    st.integers(-3, 50000),
)


@FEW
@given(st.lists(st.tuples(*[CELLS] * 6), min_size=1, max_size=12))
def test_every_row_is_used_or_set_aside_whatever_it_holds(rows: list[tuple[Any, ...]]) -> None:
    head = ("Read at", "Batch", "Meter", "pH", "Temperature (°C)", "Acetic acid (mM)")
    first = (FIRST, "B1", "M1", 4.7, 22.0, 50.0)
    try:
        records = records_from_rows([head, first, *rows])
    except InputProblems as refused:
        event("a question")
        asked = {p.code for p in refused.problems}
    else:
        asked = set()
    if asked:
        assert asked <= {"too-many-alike", "names-zeros"}
        return
    aside(records)
    filled = sum(1 for row in rows if any(c is not None and not (isinstance(c, str) and not c.strip()) for c in row))
    repeats = sum(s.rows.get("heading repeat", 0) for s in records.sheets)
    units = sum(s.rows.get("units", 0) for s in records.sheets)
    assert records.rows_read == 1 + filled - repeats - units
    named = {(s.place.row) for s in records.set_aside}
    used = set(records.readings.row.tolist())
    assert not named & used


@st.composite
def plain_record(draw: st.DrawFn) -> tuple[list[tuple[Any, ...]], list[tuple[Any, ...]]]:
    """Readings (batch, meter, moment, temperature, pH) and recipes (batch, substance, lot, mmol/L)."""
    batches = [f"B-{k:03d}" for k in range(draw(st.integers(1, 5)))]
    recipes = []
    for batch in batches:
        for substance in draw(
            st.lists(st.sampled_from(["acetic acid", "NaOAc", "KCl"]), min_size=1, max_size=3, unique=True)
        ):
            recipes.append(
                (batch, substance, f"L{draw(st.integers(1, 3))}-{substance}", float(draw(st.integers(1, 200))))
            )
    readings = [
        (
            draw(st.sampled_from(batches)),
            f"M{draw(st.integers(1, 3))}",
            FIRST + timedelta(minutes=draw(st.integers(0, 400000))),
            draw(st.integers(150, 300)) / 10,
            draw(st.integers(200, 999)) / 100,
        )
        for _ in range(draw(st.integers(1, 8)))
    ]
    return readings, recipes


def as_compared(records: Any) -> list[tuple[Any, ...]]:
    """Every reading with what its solution holds, free of the order of contributions."""
    s = records.solutions
    out = []
    for i in range(len(records.readings)):
        mine = np.flatnonzero(s.solution == records.readings_solution[i])
        inside = sorted(
            (
                records.forms[s.form[c]].name,
                records.lots.name[s.lot[c]] if s.lot[c] >= 0 else "",
                round(float(s.amount[c]), 12),
            )
            for c in mine
        )
        r = records.readings
        out.append(
            (
                r["batch"][i],
                r["meter"][i],
                str(r["read_at"][i]),
                round(float(r["temperature"][i]), 9),
                float(r["ph"][i]),
                inside,
            )
        )
    return out


LAYOUTS = ["long xlsx", "wide xlsx", "long csv", "wide csv", "long csv ; ,", "long tab", "long shuffled"]
SUBSTANCES = ["acetic acid", "NaOAc", "KCl"]


@FEW
@given(
    plain_record(),
    st.sampled_from(LAYOUTS),
    st.sampled_from(["mM", "M", "mmol/L", "µM"]),
    st.randoms(use_true_random=False),
)
def test_the_same_record_in_any_layout_imports_alike(record: Any, layout: str, unit: str, random: Any) -> None:
    readings, recipes = record
    expected = as_compared(
        records_from_rows(
            [("Batch", "Meter", "Read at", "Temperature (°C)", "pH"), *readings],
            [("Batch", "Substance", "Lot", "Amount", "Unit"), *((*r, "mM") for r in recipes)],
        )
    )
    scale = 1e-3 / UNITS[unit].factor
    columns = [("pH", 4), ("Batch", 0), ("Date", 2), ("pH meter", 1), ("Temp [°C]", 3)]
    if "shuffled" in layout:
        random.shuffle(columns)
    head: list[Any] = [name for name, _ in columns]
    rows: list[list[Any]] = [[r[i] for _, i in columns] for r in readings]
    long = [
        ("Component", "Batch no.", f"Qty ({unit})", "Bottle"),
        *((s, b, x * scale, lot) for b, s, lot, x in recipes),
    ]
    if layout.startswith("wide"):
        inside = {(b, s): (lot, x) for b, s, lot, x in recipes}
        for s in SUBSTANCES:
            head += [f"{s} ({unit})", f"{s} lot"]
            for row, r in zip(rows, readings, strict=True):
                lot, x = inside.get((r[0], s), (None, None))
                row += [x * scale if x is not None else None, lot]
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        if "xlsx" in layout or "shuffled" in layout:
            sheets = (
                {"Blatt 7": [head, *rows]}
                if layout.startswith("wide")
                else {"x": long, "y": [["Log"], [], head, *rows]}
            )
            paths = [workbook(folder / "a.xlsx", sheets)]
        else:
            delimiter = ";" if ";" in layout else "\t" if "tab" in layout else ","
            decimal = "," if layout.endswith(",") else "."
            text = [[c.strftime("%Y-%m-%d %H:%M:%S") if isinstance(c, datetime) else c for c in row] for row in rows]
            paths = [csv_file(folder / "a.csv", [head, *text], delimiter, decimal)]
            if not layout.startswith("wide"):
                paths.append(csv_file(folder / "b.csv", long, delimiter, decimal))
        records = read_books(paths)
    assert aside(records) == set()
    found = as_compared(records)
    assert [f[:5] for f in found] == [e[:5] for e in expected]
    for one, other in zip(found, expected, strict=True):
        assert [x[:2] for x in one[5]] == [x[:2] for x in other[5]]
        assert [x[2] for x in one[5]] == pytest.approx([x[2] for x in other[5]], rel=1e-9)


LINE = st.tuples(
    st.integers(0, 3),
    st.sampled_from(["acetic acid", "sodium acetate trihydrate", "NaCl", "water", "HCl", "H2SO4", "nonsense", ""]),
    st.sampled_from(["", "L1", "L2"]),
    st.sampled_from([0.0, 1.0, 2.5, 40.0, np.nan]),
    st.sampled_from(["mM", "g/L", "g/kg", "mol/kg", "N", "g", "mL", "mmol", "x", "%", ""]),
    st.sampled_from([np.nan, 1000.0, 500.0]),
    st.sampled_from(["volume", "mass"]),
    st.sampled_from(["", "", "", "fill", "adjust"]),
)


@settings(max_examples=300, deadline=None)
@given(st.lists(LINE, max_size=12))
def test_recipes_composed_in_arrays_are_those_composed_one_by_one(drawn: list[tuple[Any, ...]]) -> None:
    lines = empty_lines(len(drawn))
    for i, (group, substance, lot, value, unit, total, measure, special) in enumerate(drawn):
        lines.group[i], lines.substance[i], lines.lot[i], lines.special[i] = group, substance, lot, special
        lines.value[i], lines.unit[i] = value, UNITS[unit].name if unit else ""
        lines.total[i], lines.total_measure[i] = total, "" if np.isnan(total) else measure
        lines.source[i] = 0
    room, nan = StockRoom(), np.nan
    hcl, acetic = catalogue().look_up("HCl").form, catalogue().look_up("acetic acid").form
    room.add(Stock("L1", hcl, "", 1.0, UNITS["M"], nan, nan, 1.01, nan, 0, Place("")))
    room.add(Stock("L2", acetic, "", nan, None, 1.05, 99.0, nan, nan, 1, Place("")))
    composer = Composer(LineReader(lines, Resolver(catalogue(), room, ("nonsense",)), Settings(), [("f", "s")]))
    plain = compose_plain(composer, 4)
    for group in range(4):
        mixture = composer.mixture(composer.by_group.get(group, []))
        if not plain.plain[group]:
            continue
        assert mixture.problem is None
        kept = plain.lines_of(group)
        assert [p.line for p, _, _ in mixture.parts] == kept.tolist()
        assert [a for _, a, _ in mixture.parts] == pytest.approx(plain.amount[kept].tolist(), rel=1e-12)
        assert [u for _, _, u in mixture.parts] == pytest.approx(plain.u[kept].tolist(), rel=1e-12)
        assert mixture.without_effect == plain.without_effect[group]
        if kept.size:
            assert mixture.per_kg_water == plain.per_kg_water[group]
