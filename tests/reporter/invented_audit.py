"""A small invented audit, built by hand: 40 used readings, three meters, two findings, hostile names.

An imaginary solution room; nothing here is computed by the program under test.
"""

from __future__ import annotations

from datetime import datetime
from typing import Any

import numpy as np

from reconcile.records.arrays import Triplets
from reconcile.records.book import BatchRecords, Lots, SetAside, SheetSource, Solutions, Table
from reconcile.records.columns import BY_SHEET, READING_EXTRA
from reconcile.records.places import Place
from reconcile.records.results import (
    Audit,
    Constant,
    Finding,
    Hazard,
    Prediction,
    Silence,
    Spreads,
)
from reconcile.records.settings import Settings
from reconcile.records.substances import catalogue

HOSTILE_BATCH = '=HYPERLINK("http://invalid.example/","press")'
HOSTILE_LOT = "<script>alert(1)</script>"
PATH_BATCH = "../../x"
ESCAPE_BATCH = "B-09\x1b[31mred\x07"
OVERRIDE_BATCH = "B-10\u202egnp.exe"
DOLLAR_BATCH = r"B-11 $\frac{1}{"
COMMA_BATCH = 'B-12, "quoted"'
METERS = ("pH-1", "pH-2", "+pH-3")
N = 40


def table(kind: str, rows: list[dict[str, Any]], source: int = 0, first_row: int = 2) -> Table:
    """A Table of one kind; fields that are not given are missing, as the importer leaves them."""
    columns: dict[str, Any] = {}
    for column in BY_SHEET[kind]:
        values = [row.get(column.name) for row in rows]
        if column.kind == "text":
            columns[column.name] = np.array([v or "" for v in values] or [], object)
        elif column.kind == "time":
            columns[column.name] = np.array([v or "NaT" for v in values], "datetime64[s]")
        else:
            columns[column.name] = np.array([np.nan if v is None else v for v in values], float)
    if kind == "readings":
        for extra in READING_EXTRA:
            columns[extra] = np.array([np.nan if row.get(extra) is None else row[extra] for row in rows], float)
    n = len(rows)
    return Table(kind, columns, np.full(n, source, np.intp), np.arange(first_row, first_row + n, dtype=np.intp))


def batch_name(i: int) -> str:
    """Batch of reading i: two readings a batch."""
    special = {
        8: HOSTILE_BATCH,
        9: ESCAPE_BATCH,
        10: OVERRIDE_BATCH,
        11: DOLLAR_BATCH,
        12: COMMA_BATCH,
        13: PATH_BATCH,
    }
    return special.get(i // 2, f"B-{i // 2 + 1:02d}")


def build(n: int = N, settings: Settings | None = None, with_findings: bool = True, with_times: bool = True) -> Audit:
    """The audit; n is a multiple of 2, and the same n gives the same audit."""
    draw = np.random.default_rng(20260301)
    forms = tuple(
        catalogue().by_name[name] for name in ("acetic acid", "sodium acetate", "sodium azide", "sodium sulfite")
    )
    predicted = 4.0 + 4.0 * draw.random(n // 2).repeat(2)
    meter = np.array([METERS[(i % 2 + i // 2) % 3] for i in range(n)], object)
    noise = draw.normal(0, 0.012, n)
    fault = np.zeros(n)
    late = np.arange(n) >= n // 2
    on_meter = (meter == METERS[1]) & late
    fault[on_meter] += 0.14
    decided = np.flatnonzero(on_meter)[:2]  # readings whose place in their limits hangs on the step
    lot_of_solution = np.array([s % 3 for s in range(n // 2)])
    on_lot = (lot_of_solution == 2).repeat(2)
    fault[on_lot] -= 0.11
    observed = np.round(predicted + noise + fault, 2)
    start = np.datetime64("2026-03-02T08:30:00")
    rows = [
        {
            "batch": batch_name(i),
            "read_at": start + np.timedelta64(int(9 * 3600 * (i // 2) * N / n), "s") if with_times else None,
            "meter": meter[i],
            "probe": "E1",
            "temperature": 22.0 + (i % 5) * 0.5,
            "ph": observed[i],
            "low_limit": np.round(predicted[i] - 0.15, 2),
            "high_limit": np.round(predicted[i] + (0.1 if i in decided else 0.15), 2),
            "standing": "original",
            "stage": "final" if i % 2 else "in process",
            "resolution": 0.1 if meter[i] == METERS[2] else 0.01,
        }
        for i in range(n)
    ]
    for i, change in (
        (3, {"batch": "", "known": "phosphate 6.86"}),
        (5, {"standing": "void"}),
        (7, {"ph_calculated": 5.12}),
    ):
        if i < n:
            rows[i].update(change)
    readings = table("readings", rows)
    sheets = (
        SheetSource(
            "log.xlsx", "March", "readings", 1, {"ph": ("E", "pH", ""), "batch": ("B", "Batch", "")}, sha256="a" * 64
        ),
        SheetSource("log.xlsx", "Recipes", "recipes", 1, {"amount": ("D", "Amount", "")}, sha256="a" * 64),
        SheetSource("stocks.csv", "", "stocks", 1, {"lot": ("lot", "lot", "")}, ("colour",), sha256="b" * 64),
    )
    lots = Lots(
        np.array(["AC-1", HOSTILE_LOT, "SA-7", "AZ-1"], object),
        np.array([0, 1, 1, 2], np.intp),
        np.array([0.0058, 0.0058, 0.0058, 0.01]),
        np.array([1.0, np.nan, 0.5, 0.1]),
        np.array(["mol/L", "", "mol/L", "mol/L"], object),
        np.array([0, -1, 1, 2], np.intp),
    )
    s = n // 2
    first_lot = np.zeros(s, np.intp)
    second_lot = np.array([(3, 1, 2)[k] for k in lot_of_solution], np.intp)
    contribution_lot = np.stack([first_lot, second_lot], 1).ravel()
    c = 2 * s
    contribution_lot[-1] = -1
    form = np.where(contribution_lot >= 0, lots.form[contribution_lot], 3).astype(np.intp)
    has = np.flatnonzero(contribution_lot >= 0)
    solutions = Solutions(
        np.array([batch_name(2 * k) for k in range(s)], object),
        np.array([""] * s, object),
        np.zeros(s, bool),
        np.full(s, np.nan),
        np.full(s, np.nan),
        np.repeat(np.arange(s), 2).astype(np.intp),
        form,
        contribution_lot.astype(np.intp),
        np.full(c, 0.05),
        np.full(c, 0.002),
        np.zeros(c, bool),
        np.arange(c, dtype=np.intp),
        tuple(Place("log.xlsx", "Recipes", 2 + k, "D") for k in range(c)),
        np.array(["50 mM"] * c, object),
        has.astype(np.intp),
        contribution_lot[has].astype(np.intp),
    )
    status = np.array(["as_predicted"] * n, object)
    residual = observed - predicted
    u_residual = np.full(n, 0.021)
    z = residual / u_residual
    status[np.abs(z) > 3] = "stands_out"
    for i, word in ((5, "void"), (15, "outside_model"), (17, "adjusted"), (19, "unbuffered")):
        status[i : i + 1] = word
    evidence = ~np.isin(status, ("void", "outside_model", "adjusted", "unbuffered"))
    explained_by = np.array([""] * n, object)
    findings: tuple[Finding, ...] = ()
    if with_findings:
        findings = invented_findings(readings, on_meter, on_lot, fault, n)
        for finding in findings:
            own = finding.readings[np.isin(status[finding.readings], ("stands_out", "explained"))]
            explained_by[own] = [f"{e} {finding.id}".strip() for e in explained_by[own]]
            status[own] = "explained"
    records = BatchRecords(
        sheets,
        readings,
        np.arange(n, dtype=np.intp) // 2,
        table(
            "recipes",
            [{"batch": batch_name(2 * (k // 2)), "substance": "acetic acid", "amount": 50.0} for k in range(c)],
            1,
        ),
        table("stocks", [{"lot": "AC-1"}, {"lot": "SA-7"}, {"lot": "AZ-1"}], 2),
        table("known", []),
        table("meters", [{"meter": METERS[0], "accuracy": 0.02, "resolution": 0.01}]),
        table(
            "calibrations",
            [
                {"meter": METERS[0], "calibrated_at": start, "slope": 98.1},
                {"meter": METERS[1], "calibrated_at": start + np.timedelta64(3, "D"), "slope": 97.0},
            ],
        ),
        table("events", [{"meter": METERS[1], "at": start + np.timedelta64(4, "D"), "what": "replaced <b>"}]),
        table("series", []),
        forms,
        lots,
        solutions,
        n + 3,
        invented_set_aside(),
        (),
    )
    nothing = Triplets(np.zeros(0, np.intp), np.zeros(0, np.intp), np.zeros(0), (n, 1))
    ph = predicted.copy()
    ph[19:20] = np.nan
    residual[19:20], z[19:20] = np.nan, np.nan
    status[19:20] = "not_solved"
    prediction = Prediction(
        ph,
        np.where(status == "outside_model", "outside_model", "ok").astype(object),
        np.full(n, 0.011),
        {},
        np.full(n, 0.0512345678),
        np.full(n, 0.0231),
        np.full(n, 22.0),
        np.zeros(n),
        np.zeros(n),
        np.full(n, 43.0),
        nothing,
        nothing,
        (("acetic acid", 1),),
        np.array([0.01]),
        0.1,
        nothing,
        ("acetic acid",),
    )
    return Audit(
        records,
        prediction,
        settings or Settings(),
        residual,
        u_residual,
        z,
        status,
        explained_by,
        evidence,
        findings,
        (
            Silence("lot_strength", "AC-1", "lot", reason="both halves of the buffer scale together"),
            Silence("meter_span", "pH-1", "meter", reason="the readings cover too little pH"),
        ),
        (
            Silence("meter_offset", "pH-1", "meter", size=0.021, unit="pH", power=0.9),
            Silence("meter_offset", "pH-2", "meter", size=0.019, unit="pH", power=0.9),
            Silence("lot_strength", "SA-7", "lot", size=1.08, unit="factor", power=0.9),
        ),
        (Hazard("hazard", "AZ-1", "lot", "sodium azide", "toxic", "hydrogen azide"),),
        Spreads(np.full(n, 0.012), {"noise": (0.012, "pH", "estimated", "from the record")}),
        (Constant("acetic acid", 1, 4.756, 0.01, -0.41, -142.0, "invented source <i>"),),
    )


def invented_findings(readings: Table, on_meter: Any, on_lot: Any, fault: Any, n: int) -> tuple[Finding, ...]:
    """Two findings with rivals."""
    on_it, of_it = np.flatnonzero(on_meter), np.flatnonzero(on_lot)
    rival = Finding(
        "meter_drift",
        "pH-2",
        "meter",
        0.012,
        "pH/day",
        (0.008, 0.016),
        20.1,
        1e-3,
        on_it,
        "The readings are consistent with a drift of meter pH-2.",
        since=datetime(2026, 3, 4),
        would_explain={"total": 0.14},
    )
    other = Finding(
        "lot_identity",
        "SA-7",
        "lot",
        None,
        "",
        None,
        16.0,
        2e-3,
        of_it,
        "The readings are consistent with sodium formate in lot SA-7.",
        would_explain={"substance": "sodium formate"},
        also=("potassium formate",),
    )
    return (
        Finding(
            "meter_step",
            "pH-2",
            "meter",
            0.14,
            "pH",
            (0.12, 0.16),
            22.3,
            4e-5,
            on_it,
            "The readings are consistent with a step of meter pH-2 by +0.14 pH.",
            "F1",
            since=datetime(2026, 3, 5, 9, 0),
            since_interval95=(datetime(2026, 3, 4), datetime(2026, 3, 6)),
            rivals=(rival,),
            next_check="Read phosphate 6.86 on meter pH-2: a step expects 7.00, a drift 7.05 (d = 2.4).",
            impact=on_it[:2],
            shift=np.full(len(on_it), 0.14),
        ),
        Finding(
            "lot_strength",
            "SA-7",
            "lot",
            0.78,
            "factor",
            (0.74, 0.82),
            17.2,
            1.3e-3,
            of_it,
            "The readings are consistent with lot SA-7 at 0.78 of its stated strength.",
            "F2",
            would_explain={"factor": 0.78},
            rivals=(other,),
            next_check=f"Read batch {batch_name(4)} on meter pH-1.",
            shift=np.full(len(of_it), -0.11),
        ),
    )


def invented_set_aside() -> tuple[SetAside, ...]:
    """Three rows set aside: text for a number, a bad recipe, a summary row."""
    return (
        SetAside(
            Place("log.xlsx", "March", 44, ""),
            Place("log.xlsx", "March", 44, "E"),
            "ph-not-a-number",
            "7,41o",
            'pH reads "7,41o". Expected a number such as 7.41.',
            "Compare with the original entry.",
            "B-21",
            "pH-1",
        ),
        SetAside(
            Place("log.xlsx", "March", 45, ""),
            Place("log.xlsx", "Recipes", 60, "D"),
            "unit-missing",
            "@SUM(1)",
            "the amount has no unit",
            "Units are never guessed.",
            "-B-22",
            "pH-2",
            HOSTILE_LOT,
        ),
        SetAside(
            Place("log.xlsx", "March", 46, ""),
            Place("log.xlsx", "March", 46, "A"),
            "summary-row",
            "Mean\x00",
            "this is a summary row",
            "None needed; it is no reading.",
            summary=True,
        ),
    )
