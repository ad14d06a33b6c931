"""The simulated world as BatchRecords, as if an importer had read it from one workbook."""

from __future__ import annotations

from collections.abc import Mapping
from datetime import datetime

import numpy as np

from reconcile.records.arrays import AnyArray, FloatArray, IntArray
from reconcile.records.book import BatchRecords, Lots, SheetSource, Solutions, Table
from reconcile.records.columns import BY_SHEET, READING_EXTRA
from reconcile.records.places import Place
from tests.simulated.recipes import WEIGHED
from tests.simulated.world import ROOT3, World

FILE = "simulated.xlsx"
FIRST_DAY = datetime(2031, 3, 3, 8, 0, 0)
SHEETS = ("readings", "recipes", "stocks", "meters", "calibrations", "known", "events", "series")
LETTERS = "ABCDEFGHIJKLMNOPQRSTUVWXYZ"


def reading_row(index: int) -> int:
    """Row of a reading in its sheet: one heading row, then the readings in order."""
    return index + 2


def _table(kind: str, rows: int, filled: Mapping[str, AnyArray]) -> Table:
    columns: dict[str, AnyArray] = {}
    for column in BY_SHEET[kind]:
        if column.kind == "text":
            columns[column.name] = np.full(rows, "", object)
        elif column.kind == "time":
            columns[column.name] = np.full(rows, np.datetime64("NaT"), "datetime64[s]")
        else:
            columns[column.name] = np.full(rows, np.nan)
    if kind == "readings":
        columns.update({name: np.full(rows, np.nan) for name in READING_EXTRA})
    columns.update(filled)
    return Table(kind, columns, np.full(rows, SHEETS.index(kind), np.intp), np.arange(rows, dtype=np.intp) + 2)


def _texts(items: list[str]) -> AnyArray:
    found = np.empty(len(items), object)
    found[:] = items
    return found


def _times(days: FloatArray) -> AnyArray:
    start = np.datetime64(FIRST_DAY, "s")
    return np.asarray(start + np.round(np.asarray(days) * 86400.0).astype("timedelta64[s]"))


def _solutions(world: World, forms: dict[str, int]) -> tuple[Solutions, IntArray]:
    """Solutions of the batches, then one for each known solution that was read; and which one each reading is of."""
    batches = len(world.made)
    known = np.unique(world.known[~np.isnan(world.known)])
    count = len(world.solution)
    order = np.arange(count, dtype=np.intp)
    which = world.read_solution.copy()
    for i, ph in enumerate(known):
        which[world.known == ph] = batches + i
    solutions = Solutions(
        batch=_texts([world.batch_name(i) for i in range(batches)] + [""] * len(known)),
        stage=_texts([""] * (batches + len(known))),
        per_kg_water=np.zeros(batches + len(known), bool),
        known_ph=np.concatenate([np.full(batches, np.nan), known]),
        known_u=np.concatenate([np.full(batches, np.nan), np.full(len(known), 0.003)]),
        solution=world.solution.astype(np.intp),
        form=np.array([forms[name] for name in world.label], np.intp),
        lot=world.lot.astype(np.intp),
        amount=world.amount.copy(),
        u_amount=np.full(count, world.room.preparation_percent / 100.0 / ROOT3),
        by_mass=world.weighed,
        recipe_row=order,
        place=tuple(Place(FILE, "Recipes", i + 2, "D") for i in range(count)),
        stated=_texts([f"{1000 * a:g} mmol/L" for a in world.amount]),
        chain_contribution=order,
        chain_lot=world.lot.astype(np.intp),
    )
    return solutions, which


def to_records(world: World, shown: FloatArray) -> BatchRecords:
    """The record that such a room would have kept, with the readings shown."""
    room, n = world.room, len(shown)
    names = list(dict.fromkeys(world.lot_label))
    forms = {name: i for i, name in enumerate(names)}
    solutions, which = _solutions(world, forms)
    size = len(world.lot_label)
    solid = np.array([label in WEIGHED for label in world.lot_label], bool)
    lots = Lots(
        name=_texts(world.lot_name),
        form=np.array([forms[label] for label in world.lot_label], np.intp),
        u_strength=np.full(size, room.lot_percent / 100.0 / ROOT3),
        strength=np.where(solid, np.nan, 1.0),
        unit=_texts(["" if weighed else "mol/L" for weighed in solid]),
        row=np.arange(size, dtype=np.intp),
    )
    is_known = ~np.isnan(world.known)
    calculated = np.full(n, np.nan)
    if room.hand_calculation:
        calculated = np.round(world.true_ph(nominal=True), 2)
        for change in world.calculated:
            calculated = change(calculated)
    meters = _texts([world.meter_name(i) for i in range(room.n_meters)])
    readings = _table(
        "readings",
        n,
        {
            "ph": shown,
            "batch": _texts(
                ["" if k else world.batch_name(int(s)) for k, s in zip(is_known, world.read_solution, strict=True)]
            ),
            "known": _texts([f"pH {v:.3f} buffer" if k else "" for k, v in zip(is_known, world.known, strict=True)]),
            "read_at": _times(world.day),
            "meter": meters[world.meter],
            "temperature": world.celsius,
            "ph_calculated": calculated,
            "standing": _texts(["original"] * n),
            "resolution": np.full(n, room.resolution),
            "repeat": np.ones(n),
        },
    )
    recipes = _table(
        "recipes",
        len(world.label),
        {
            "batch": _texts([world.batch_name(int(s)) for s in world.solution]),
            "substance": _texts(world.label),
            "lot": lots.name[world.lot],
            "amount": 1000.0 * world.amount,
            "unit": _texts(["mmol/L"] * len(world.label)),
        },
    )
    stocks = _table(
        "stocks",
        size,
        {
            "lot": lots.name,
            "substance": _texts(world.lot_label),
            "strength": lots.strength,
            "unit": lots.unit,
            "tolerance": np.full(size, room.lot_percent),
        },
    )
    sheet = _table(
        "meters",
        room.n_meters,
        {
            "meter": meters,
            "accuracy": np.full(room.n_meters, room.accuracy),
            "resolution": np.full(room.n_meters, room.resolution),
        },
    )
    return BatchRecords(
        sheets=tuple(_source(kind) for kind in SHEETS),
        readings=readings,
        readings_solution=which.astype(np.intp),
        recipes=recipes,
        stocks=stocks,
        known=_known(world),
        meters=sheet,
        calibrations=_calibrations(world, meters),
        events=_table("events", 0, {}),
        series=_table("series", 0, {}),
        forms=tuple(world.form(name) for name in names),
        lots=lots,
        solutions=solutions,
        rows_read=n,
        set_aside=(),
        notes=(),
    )


def _known(world: World) -> Table:
    """Known solutions that were read, and the lots of calibration buffers with their certified values."""
    values = np.unique(world.known[~np.isnan(world.known)]).tolist()
    lots = sorted({lot for _, _, some in world.sessions for lot in some.split(",")})
    names = [f"pH {v:.3f} buffer" for v in values] + [f"pH {lot[3:].split('-')[0]} calibration buffer" for lot in lots]
    return _table(
        "known",
        len(names),
        {
            "name": _texts(names),
            "lot": _texts([""] * len(values) + lots),
            "temperature": np.full(len(names), 25.0),
            "ph": np.array(values + [float(lot[3:].split("-")[0]) for lot in lots]),
            "u": np.full(len(names), 0.003),
        },
    )


def _calibrations(world: World, meters: AnyArray) -> Table:
    sessions = world.sessions
    return _table(
        "calibrations",
        len(sessions),
        {
            "meter": meters[np.array([m for m, _, _ in sessions], np.intp)],
            "calibrated_at": _times(np.array([day for _, day, _ in sessions])),
            "slope": np.full(len(sessions), 98.0),
            "offset": np.zeros(len(sessions)),
            "buffer_lots": _texts([lots for _, _, lots in sessions]),
        },
    )


def _source(kind: str) -> SheetSource:
    columns = {
        c.name: (LETTERS[i % 26] if i < 26 else f"A{LETTERS[i - 26]}", c.title, c.unit)
        for i, c in enumerate(BY_SHEET[kind])
    }
    return SheetSource(FILE, kind.capitalize(), kind, 1, columns)
