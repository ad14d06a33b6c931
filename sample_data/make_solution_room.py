"""Makes solution_room.xlsx, eight weeks of an invented solution room with planted faults, and the truth beside it.

Run from anywhere: python sample_data/make_solution_room.py. Every name, number and event is invented. The pH values
come from the simulator's own chemistry (tests/simulated), not from the engine that audits them. Same bytes each time.
"""

from __future__ import annotations

import sys
from dataclasses import dataclass, field, replace
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import numpy as np

HERE = Path(__file__).resolve().parent
sys.path.insert(0, str(HERE.parent))
from reconcile.records.substances import catalogue  # noqa: E402
from sample_data.solution_room_additions import EVENTS, adjusted_batches, check_readings  # noqa: E402
from sample_data.solution_room_sheets import FIRST_DAY, untidy_rows, write_truth, write_workbook  # noqa: E402
from sample_data.solution_room_stock import ACETIC, KINDS, LOTS, REMARKS, Lot  # noqa: E402
from tests.simulated import chemistry_of_truth as chemistry  # noqa: E402

DAYS = 54.0
METERS = ("Bench 1", "Bench 2", "Bench 3", "Bench 4", "Bench 5", "Hatch")
STEP_AT, DRIFT_FROM = datetime(2025, 4, 2, 12), datetime(2025, 3, 31, 8)
STEP, DRIFT, OFFSET = 0.10, 0.18, -0.09


@dataclass
class Part:
    """One recipe line: lot, amount as written, and the true moles a litre of what was really added."""

    lot: Lot
    amount: float
    unit: str
    made_up_to: float | None
    made_up_unit: str
    stated: float
    true: float


@dataclass
class Batch:
    """One preparation."""

    name: str
    kind: str
    day: float
    parts: list[Part] = field(default_factory=list)


def take(lot: Lot, concentration: float, litres: float, style: int, rng: np.random.Generator) -> Part:
    """One recipe line for a wanted concentration [mol/L]: weighed, pipetted from a stock, or a final concentration."""
    label = catalogue().by_name[lot.label]
    held = catalogue().by_name[lot.content or lot.label]
    error = lot.factor * float(np.exp(rng.normal(0.0, 0.003 / np.sqrt(3.0))))
    by_mass = label.molar_mass / held.molar_mass if not lot.strength else 1.0
    if style == 0 and not lot.strength:
        grams = round(concentration * litres * label.molar_mass, 3)
        stated = grams / label.molar_mass / litres
        return Part(lot, grams, "g", litres, "L", stated, stated * by_mass * error)
    if style == 0:
        millilitres = round(concentration * litres / lot.strength * 1000.0, 1)
        stated = millilitres / 1000.0 * lot.strength / litres
        return Part(lot, millilitres, "mL", litres * 1000.0, "mL", stated, stated * error)
    stated = float(f"{concentration:.3g}")
    amount, unit = (float(f"{stated * 1000.0:.3g}"), "mM") if style == 1 else (stated, "M")
    return Part(lot, amount, unit, None, "", stated, stated * by_mass * error)


def make_batches(lots: list[Lot], rng: np.random.Generator) -> list[Batch]:
    """All preparations, in order of making."""
    kinds = [kind for kind in KINDS for _ in range(kind[2])]
    order, days = rng.permutation(len(kinds)), np.sort(rng.uniform(0.0, DAYS, len(kinds)))
    batches = []
    for number, (index, day) in enumerate(zip(order, days, strict=True)):
        title, substances, _, low, high = kinds[index]
        day -= max(0.0, day % 7 - 4.9)  # nobody prepares at the weekend
        batch = Batch(f"S25-{number + 1:03d}", title, float(day))
        first = float(np.exp(rng.uniform(np.log(0.02), np.log(0.10)))) if high else float(rng.uniform(0.06, 0.2))
        wanted = [first, first * float(np.exp(rng.uniform(np.log(low), np.log(high))))] if high else [first]
        style, litres = int(rng.integers(3)), float(rng.choice([0.5, 1.0, 2.0]))
        for substance, concentration in zip(substances, wanted, strict=True):
            open_lots = [lot for lot in lots if lot.label == substance and lot.opened <= batch.day]
            lot = open_lots[-1] if len(open_lots) == 1 or rng.random() < 0.75 else open_lots[-2]
            batch.parts.append(take(lot, concentration, litres, style, rng))
        batches.append(batch)
    return batches


def ph_of(batches: list[Batch], celsius: np.ndarray, true: bool) -> np.ndarray:
    """PH of each batch at a temperature each, as prepared or as written."""
    names = sorted({a for lot in LOTS for n in (lot.label, lot.content or lot.label) for a, _ in _brings(n).acids})
    totals, charge, squares = np.zeros((len(batches), len(names))), np.zeros(len(batches)), np.zeros(len(batches))
    for i, batch in enumerate(batches):
        for part in batch.parts:
            brings = _brings((part.lot.content or part.lot.label) if true else part.lot.label)
            moles = (part.true if true else part.stated) / chemistry.KG_WATER_PER_LITRE
            for acid, units in brings.acids:
                totals[i, names.index(acid)] += moles * units
            charge[i] += moles * brings.charge
            squares[i] += moles * brings.squares
    return chemistry.solve_ph(totals, names, charge, squares, celsius)


def _brings(name: str) -> chemistry.Brings:
    return chemistry.brings(catalogue().by_name[name])


def error_of(offset: np.ndarray, span: np.ndarray, meter: int, at: datetime, ph: float) -> float:
    """What a meter shows too much, with all planted faults of meters."""
    error = float(offset[meter] + span[meter] * (ph - 7.0))
    if METERS[meter] == "Bench 3" and at >= STEP_AT:
        error += STEP
    if METERS[meter] == "Bench 2" and at >= DRIFT_FROM:
        error += DRIFT * ((at - DRIFT_FROM) / (FIRST_DAY + timedelta(days=DAYS) - DRIFT_FROM))
    return error


def read_all(batches: list[Batch], rng: np.random.Generator) -> tuple[list[dict[str, Any]], np.ndarray, np.ndarray]:
    """Every reading, in order of time; and the offset and span of every meter."""
    count = len(batches)
    repeats = np.where(rng.permutation(count) % 2 == 0, 2, 3)
    rows: list[dict[str, Any]] = []
    offset, span = rng.normal(0.0, 0.010, len(METERS)), rng.normal(0.0, 0.0025, len(METERS))
    offset[METERS.index("Bench 5")] = OFFSET
    targets = np.round(ph_of(batches, np.full(count, 22.0), False), 1)
    for i, batch in enumerate(batches):
        for meter in rng.permutation(len(METERS))[: repeats[i]]:
            at = FIRST_DAY + timedelta(days=int(batch.day), hours=8)
            at += timedelta(minutes=int(rng.integers(30, 560)))
            celsius = round(float(rng.uniform(18.5, 25.5)), 1)
            rows.append({"at": at, "batch": i, "meter": int(meter), "celsius": celsius, "target": float(targets[i])})
    rows.sort(key=lambda r: (r["at"], r["meter"]))
    here = [batches[r["batch"]] for r in rows]
    warmth = np.array([r["celsius"] for r in rows]) + rng.normal(0.0, 0.15, len(rows))
    ph = ph_of(here, warmth, True)
    for row, value in zip(rows, ph, strict=True):
        shown = value + rng.normal(0.0, 0.011) + error_of(offset, span, row["meter"], row["at"], float(value))
        row["ph"] = round(float(shown), 2)
        row["remark"] = str(rng.choice(REMARKS)) if rng.random() < 0.06 else ""
    return rows, offset, span


def transpose_one(rows: list[dict[str, Any]], batches: list[Batch], lots: list[Lot]) -> int:
    """Exchange two neighbouring digits of one reading of a sound batch on a sound meter; its index."""
    sound = {lot.name for lot in lots if lot.factor < 1.1 and not lot.content}
    for index, row in enumerate(rows[100:], start=100):
        text, used = f"{row['ph']:.2f}", {part.lot.name for part in batches[row["batch"]].parts}
        far_apart = abs(int(text[2]) - int(text[3])) >= 5
        if METERS[row["meter"]] in ("Bench 1", "Bench 4", "Hatch") and far_apart and used <= sound:
            row["slip_from"], row["ph"] = row["ph"], float(f"{text[:2]}{text[3]}{text[2]}")
            return index
    raise LookupError("no reading to transpose")


def draw_lots(rng: np.random.Generator) -> list[Lot]:
    """The bottles, every sound one with its own small error within its tolerance."""
    lots = [replace(lot) for lot in LOTS]
    for lot in lots:
        if lot.factor == 1.0 and not lot.content:
            lot.factor = float(np.exp(rng.normal(0.0, lot.tolerance / 100.0 / np.sqrt(3.0))))
    return lots


def truth(lots: list[Lot], batches: list[Batch], rows: list[dict[str, Any]], slip: int) -> list[dict[str, Any]]:
    """Every planted fault, in the words of a finding, with the sheet rows it touches."""

    def of_meter(name: str, since: datetime | None = None) -> list[int]:
        return [i + 2 for i, r in enumerate(rows) if METERS[r["meter"]] == name and (not since or r["at"] >= since)]

    def of_lot(name: str) -> list[int]:
        uses = {i for i, batch in enumerate(batches) if name in (part.lot.name for part in batch.parts)}
        return [i + 2 for i, row in enumerate(rows) if row["batch"] in uses]

    def fault(kind: str, subject: Any, estimate: float | None, unit: str, at: list[int], **more: Any) -> dict[str, Any]:
        kind_of = kind.split("_")[0]
        return {"kind": kind, "subject": subject, "subject_type": kind_of, "estimate": estimate, "unit": unit} | {
            **more,
            "rows": at,
        }

    row = rows[slip]
    days = (FIRST_DAY + timedelta(days=DAYS) - DRIFT_FROM) / timedelta(days=1)
    wrong_strength = next(lot for lot in lots if lot.factor > 1.1)
    hydrate = next(lot for lot in lots if "hydrate" in lot.content)
    other = next(lot for lot in lots if lot.content == ACETIC)
    label, held = (catalogue().by_name[name].molar_mass for name in (hydrate.label, hydrate.content))
    since = {"Bench 3": STEP_AT.isoformat(), "Bench 2": DRIFT_FROM.isoformat()}
    return [
        fault("meter_step", "Bench 3", STEP, "pH", of_meter("Bench 3", STEP_AT), since=since["Bench 3"]),
        fault("meter_offset", "Bench 5", OFFSET, "pH", of_meter("Bench 5")),
        fault(
            "meter_drift",
            "Bench 2",
            round(DRIFT / days, 6),
            "pH/day",
            of_meter("Bench 2", DRIFT_FROM),
            since=since["Bench 2"],
            total=DRIFT,
        ),
        fault("lot_strength", wrong_strength.name, wrong_strength.factor, "-", of_lot(wrong_strength.name)),
        fault("lot_identity", other.name, None, "", of_lot(other.name), substance=other.content),
        fault(
            "lot_identity",
            hydrate.name,
            None,
            "",
            of_lot(hydrate.name),
            substance=hydrate.content,
            factor=round(label / held, 6),
        ),
        fault(
            "reading_slip",
            [batches[row["batch"]].name, METERS[row["meter"]], str(slip + 2)],
            round(row["ph"] - row["slip_from"], 2),
            "pH",
            [slip + 2],
            pH=row["slip_from"],
        ),
    ]


def main(folder: Path = HERE) -> None:
    """Write the workbook and the truth into a folder."""
    rng = np.random.default_rng(20250303)
    lots = draw_lots(rng)
    batches = make_batches(lots, rng)
    rows, offset, span = read_all(batches, rng)
    slip = transpose_one(rows, batches, lots)
    faults = truth(lots, batches, rows, slip)
    touched = {row for fault in faults for row in fault["rows"]}
    clean = [i for i in range(len(rows)) if i + 2 not in touched]
    unknown_in = next(
        rows[i]["batch"] for i in clean if i > 80 and len([r for r in rows if r["batch"] == rows[i]["batch"]]) == 2
    )
    untidy = untidy_rows(rows, lambda row: rows.index(row) in clean and row["batch"] != unknown_in)
    lost = [
        {"row": u.index + 2, "why": u.remark or f"pH reads {u.written}"}
        for u in untidy
        if not (u.written or "").replace(".", "").isdigit()
    ]
    lost += [{"row": i + 2, "why": "a substance nobody knows"} for i, r in enumerate(rows) if r["batch"] == unknown_in]
    beside = np.random.default_rng(20250304)
    checks = check_readings(len(METERS), lambda meter, at, ph: error_of(offset, span, meter, at, ph), beside)
    sound = {lot.name for lot in lots if lot.factor < 1.1 and not lot.content}
    targets = {row["batch"]: row["target"] for row in rows}
    adjusted = adjusted_batches(batches, targets, {rows[slip]["batch"], unknown_in}, sound)
    amounts = [
        {
            "batch": batches[i].name,
            "substance": batches[i].parts[1].lot.label,
            "mol_per_litre": batches[i].parts[1].true,
        }
        for i in adjusted
    ]
    write_workbook(
        folder / "solution_room.xlsx", lots, METERS, batches, rows, untidy, unknown_in, checks, adjusted, EVENTS
    )
    write_truth(folder / "solution_room_truth.json", faults, sorted(lost, key=lambda item: item["row"]), amounts)
    print(
        f"solution_room.xlsx: {len(batches)} batches, {len(rows)} readings and {len(checks)} of certified buffers, "
        f"{len(adjusted)} batches adjusted, {len(faults)} planted faults"
    )


if __name__ == "__main__":
    main()
