"""Time of an import against that of python-calamine alone reading the same workbook, as ratios measured in one run.

Run as `python tests/bench/speed_import.py [rows]`. Each workbook is written first (not timed); both times are the
smallest of three, in processor seconds of this process.
"""

from __future__ import annotations

import random
import resource
import sys
import tempfile
import time
from collections.abc import Callable, Iterator
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import python_calamine
import xlsxwriter

from reconcile.importer.read import read_books

LOG = ("Read at", "Batch", "Meter", "Probe", "Temperature (°C)", "pH", "Stage", "Target pH", "Low limit (pH)",
       "High limit (pH)", "Analyst", "Remark")  # fmt: skip
WIDE = (*LOG[:8], "Acetic acid (mM)", "Acetic acid lot", "Sodium acetate (mM)", "Sodium acetate lot")
ODD = ("4,71", "4.7 rpt", "<2", "n/a", "#N/A", "7.02")


def log_rows(n: int, batches: int, odd: float = 0.0) -> Iterator[list[Any]]:
    """Readings of 12 columns; a share of the pH cells is odd."""
    rng = random.Random(1)
    for i in range(n):
        ph: Any = round(4 + rng.random(), 2)
        if rng.random() < odd:
            ph = rng.choice(ODD)
        moment = datetime(2026, 1, 1) + timedelta(minutes=5 * i)
        yield [moment, f"B-{i % batches:05d}", f"M{i % 50}", f"P{i % 50}", round(20 + 5 * rng.random(), 1), ph, "final",
               4.7, 4.5, 4.9, "AB", "none"]  # fmt: skip


def wide_rows(n: int) -> Iterator[list[Any]]:
    """Readings of 12 columns, four of them amounts and lots; a batch is read three times."""
    for i, row in enumerate(log_rows(n, n)):
        b = i // 3
        yield [row[0], f"B-{b:05d}", *row[2:8], 20 + b % 90, f"A{b % 1000}", 15 + b % 77, f"S{b % 1000}"]


def recipe_rows(batches: int) -> Iterator[list[Any]]:
    """A long recipe of two components for every batch."""
    for b in range(batches):
        yield [f"B-{b:05d}", "acetic acid", f"A{b % 700}", 25 + b % 17, "mM"]
        yield [f"B-{b:05d}", "sodium acetate", f"S{b % 700}", 25 + b % 13, "mM"]


def write(path: Path, sheets: dict[str, tuple[tuple[str, ...], Iterator[list[Any]]]]) -> Path:
    """A workbook as spreadsheet programs write it, with number formats for moments and pH."""
    book = xlsxwriter.Workbook(path)
    moment, ph = book.add_format({"num_format": "yyyy-mm-dd hh:mm"}), book.add_format({"num_format": "0.00"})
    for name, (head, rows) in sheets.items():
        sheet = book.add_worksheet(name)
        sheet.write_row(0, 0, head)
        for r, row in enumerate(rows, 1):
            for c, value in enumerate(row):
                if isinstance(value, datetime):
                    sheet.write_datetime(r, c, value, moment)
                elif c == 5 and isinstance(value, float):
                    sheet.write_number(r, c, value, ph)
                else:
                    sheet.write(r, c, value)
    book.close()
    return path


def least(work: Callable[[], object], times: int = 3) -> float:
    """Smallest processor time of several runs [s]."""
    spent = []
    for _ in range(times):
        begin = time.process_time()
        work()
        spent.append(time.process_time() - begin)
    return min(spent)


def values_alone(path: Path) -> None:
    """What python-calamine needs for all sheets."""
    book = python_calamine.CalamineWorkbook.from_path(str(path))
    for name in book.sheet_names:
        book.get_sheet_by_name(name).to_python()


def main() -> None:
    """Print the table."""
    n = int(sys.argv[1]) if len(sys.argv) > 1 else 100_000
    head = ("Batch", "Substance", "Lot", "Amount", "Unit")
    cases = {
        "clean log, 400 batches": {"Log": (LOG, log_rows(n, 400)), "Recipes": (head, recipe_rows(400))},
        "log with 3 % odd pH cells": {"Log": (LOG, log_rows(n, 400, 0.03)), "Recipes": (head, recipe_rows(400))},
        "log, a third as many batches as rows": {
            "Log": (LOG, log_rows(n, n // 3)),
            "Recipes": (head, recipe_rows(n // 3)),
        },
        "wide log, a third as many batches as rows": {"Log": (WIDE, wide_rows(n))},
    }
    print(f"{n} rows of 12 columns; processor seconds")
    with tempfile.TemporaryDirectory() as name:
        for title, sheets in cases.items():
            path = write(Path(name) / "log.xlsx", sheets)
            alone, whole = least(lambda p=path: values_alone(p)), least(lambda p=path: read_books([p]))
            records = read_books([path])
            print(
                f"{title:44s} values alone {alone:5.2f}  import {whole:5.2f}  ratio {whole / alone:4.2f}"
                f"  used {len(records.readings)}  set aside {len(records.set_aside)}"
            )
    print(f"peak memory {resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024:.0f} MiB")


if __name__ == "__main__":
    main()
