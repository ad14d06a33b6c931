"""A whole audit of a long workbook against what openpyxl takes merely to read it.

Run as `python tests/bench/end_to_end.py [rows]`. The workbook has one sheet of 12 columns, wide (two acids of a batch
with their lots beside): by default 100,000 readings of 50,000 batches on 24 meters with 300 lots; one meter and one lot
are off. Both are processes of their own in one run, so that their imports count; printed are processor seconds, wall
seconds, the largest memory, and the ratio. Then the same audit again in this process, room by room; and CSV files of
growing length, with memory per row. Nothing here asserts.
"""

from __future__ import annotations

import csv
import json
import os
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable, Iterator
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import numpy as np
import xlsxwriter

import reconcile

METERS, LOTS = 24, 300
HEADINGS = (
    "Read at", "Batch", "Meter", "Temperature (°C)", "pH", "Stage", "Low limit (pH)", "High limit (pH)",
    "Acetic acid (mM)", "Acetic acid lot", "Sodium acetate (mM)", "Sodium acetate lot",
)  # fmt: skip
OFF_METER, OFF_LOT, OFFSET, FACTOR = 7, 11, 0.06, 1.2
CSV_SIZES = (50_000, 100_000, 200_000)
READ = """
import sys, openpyxl
book = openpyxl.load_workbook(sys.argv[1], read_only=True)
cells = sum(len(row) for sheet in book.worksheets for row in sheet.iter_rows(values_only=True))
"""
USED = """
import json, resource, runpy, sys, time
begin = time.perf_counter()
code = 0
try:
    {what}
except SystemExit as done:
    code = done.code
use = resource.getrusage(resource.RUSAGE_SELF)
seconds = use.ru_utime + use.ru_stime
print("\\n" + json.dumps([seconds, time.perf_counter() - begin, use.ru_maxrss / 1024, code]))
"""


def rows(count: int) -> Iterator[list[Any]]:
    """Readings in the order of their time, each batch twice; errors of reading are 0.01 pH, seeded."""
    rng = np.random.default_rng(1)
    batches = max(count // 2, 1)
    acid, salt = rng.integers(20, 80, batches), rng.integers(20, 80, batches)
    acid_lot, salt_lot = (rng.integers(0, LOTS // 2, batches) for _ in range(2))
    actual = np.column_stack([acid * np.where(acid_lot == OFF_LOT, FACTOR, 1.0), salt]) / 1000.0
    names = ["acetic acid", "sodium acetate"]
    batch = np.minimum(np.arange(count) // 2, batches - 1)
    meter, warm = rng.integers(0, METERS, count), np.round(22 + rng.normal(0, 0.6, count), 1)
    truth = reconcile.predict_ph(names, actual[batch], temperature_c=warm).ph
    ph = np.round(truth + rng.normal(0, 0.01, count) + np.where(meter == OFF_METER, OFFSET, 0.0), 2)
    begin = datetime(2025, 1, 1)
    for i in range(count):
        b = int(batch[i])
        yield [
            begin + timedelta(minutes=5 * i), f"B-{b:06d}", f"M-{meter[i]:02d}", float(warm[i]), float(ph[i]), "final",
            4.0, 5.5, int(acid[b]), f"HA-{acid_lot[b]:03d}", int(salt[b]), f"NA-{salt_lot[b]:03d}",
        ]  # fmt: skip


def write_workbook(path: Path, count: int) -> Path:
    book = xlsxwriter.Workbook(path, {"constant_memory": True})
    moment, two = book.add_format({"num_format": "yyyy-mm-dd hh:mm"}), book.add_format({"num_format": "0.00"})
    sheet = book.add_worksheet("Readings")
    sheet.write_row(0, 0, HEADINGS)
    for r, row in enumerate(rows(count), 1):
        sheet.write_datetime(r, 0, row[0], moment)
        for c, value in enumerate(row[1:], 1):
            sheet.write(r, c, value, two if c == 4 else None)
    book.close()
    return path


def write_csv(path: Path, count: int) -> Path:
    with path.open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file)
        writer.writerow(HEADINGS)
        writer.writerows([row[0].strftime("%Y-%m-%d %H:%M"), *row[1:]] for row in rows(count))
    return path


def used(what: str, *words: str) -> tuple[float, float, float]:
    """Processor seconds, wall seconds and MiB of a process of its own that runs some code."""
    code = USED.format(what=what)
    done = subprocess.run([sys.executable, "-c", code, *words], capture_output=True, text=True, check=True)
    cpu, wall, memory, exit_code = json.loads(done.stdout.splitlines()[-1])
    if exit_code:
        raise SystemExit(f"the run ended with {exit_code}: {done.stderr}")
    return cpu, wall, memory


def audited(path: Path, out: Path) -> tuple[float, float, float]:
    what = "sys.argv[0] = 'reconcile'; runpy.run_module('reconcile', run_name='__main__')"
    return used(what, "audit", str(path), "--out", str(out), "--json", "--replace")


class Rooms:
    """Processor seconds by part of an audit."""

    def __init__(self) -> None:
        self.spent: dict[str, float] = {}

    def time(self, name: str, function: Callable[[], Any]) -> Any:
        begin = time.process_time()
        result = function()
        self.spent[name] = self.spent.get(name, 0.0) + time.process_time() - begin
        return result


def by_room(path: Path, out: Path) -> dict[str, float]:
    """Where the time of an audit goes: importing modules first, then the rooms in the order of a reading's way."""
    rooms = Rooms()

    def load() -> None:
        import reconcile.auditor.audit
        import reconcile.pipeline
        import reconcile.reporter.write  # noqa: F401

    rooms.time("loading the program", load)
    from reconcile import pipeline
    from reconcile.auditor.audit import audit as explain
    from reconcile.chemistry import predict
    from reconcile.chemistry.shortcuts import shortcut_values
    from reconcile.records.settings import Settings
    from reconcile.reporter import contents, folder, tables, to_csv, to_html, to_json, to_xlsx
    from reconcile.reporter.drawn import draw_all
    from reconcile.reporter.lookups import Lookups
    from reconcile.reporter.manifest import manifest

    settings = Settings()
    records = rooms.time("importer", lambda: pipeline.read(path))
    print(f"\n{len(records.readings):,} readings used, {len(records.set_aside):,} set aside")
    prediction = rooms.time("chemistry", lambda: predict.predict_records(records, settings))
    found = rooms.time(
        "auditor",
        lambda: explain(
            records,
            prediction,
            predict.repredictor(records, settings),
            settings,
            shortcuts=lambda wanted: shortcut_values(records, settings, wanted),
        ),
    )
    print("found:", ", ".join(f"{f.kind} {f.subject}" for f in found.findings) or "nothing")
    lookups = Lookups(found)
    residuals = rooms.time("reporter: residual table", lambda: tables.residuals(found, lookups))
    aside = tables.set_aside(found)
    files = rooms.time("reporter: CSV", lambda: {f"{t.name}.csv": to_csv.table_csv(t) for t in (residuals, aside)})
    files["findings.json"] = rooms.time("reporter: JSON", lambda: to_json.findings_json(found))
    files["residuals.xlsx"] = rooms.time("reporter: workbook", lambda: to_xlsx.workbook(found, lookups, residuals))
    drawn = rooms.time("reporter: pictures", lambda: draw_all(found, lookups, lambda what, share: None))
    for picture in drawn:
        files |= {f"plots/{picture.name}.png": picture.png, f"plots/{picture.name}.svg": picture.svg}
    files["report.html"] = rooms.time("reporter: page", lambda: to_html.page(found, lookups, residuals, drawn))
    files["manifest.json"] = rooms.time("reporter: manifest", lambda: manifest(found, files))
    rooms.time("reporter: writing the folder", lambda: folder.put_folder(out, files, lambda: None))
    assert set(files) == {*contents.contents(found, lambda what, share: None), "manifest.json"}
    return rooms.spent


def main(count: int) -> None:
    for variable in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS"):
        os.environ.setdefault(variable, "1")  # as the command line has it
    with tempfile.TemporaryDirectory() as name:
        place = Path(name)
        path = write_workbook(place / "long.xlsx", count)
        print(f"{count:,} readings, 12 columns, {METERS} meters, {LOTS} lots; {path.stat().st_size / 2**20:.1f} MiB")
        read = used(READ.strip().replace("\n", "\n    "), str(path))
        whole = audited(path, place / "room")
        print(f"{'':34}{'processor':>10}{'wall':>10}{'memory':>12}")
        for label, (cpu, wall, memory) in (("openpyxl, read-only, reads it", read), ("reconcile audits it", whole)):
            print(f"{label:34}{cpu:8.2f} s{wall:8.2f} s{memory:8.0f} MiB")
        print(f"{'ratio':34}{whole[0] / read[0]:10.2f}{whole[1] / read[1]:10.2f}")
        spent = by_room(path, place / "again")
        total = sum(spent.values())
        print(f"\nRoom by room, {total:.2f} s of the processor in one process")
        for room, seconds in spent.items():
            print(f"  {room:34}{seconds:7.2f} s {100 * seconds / total:5.1f} %")
        print("\nCSV of growing length")
        for size in CSV_SIZES:
            size = size * count // 100_000
            cpu, wall, memory = audited(write_csv(place / "long.csv", size), place / "csv")
            print(f"  {size:9,} rows {cpu:7.2f} s {memory:7.0f} MiB {1e6 * cpu / size:7.1f} µs a row "
                  f"{memory * 2**10 / size:6.2f} KiB a row")  # fmt: skip


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 100_000)
