"""Small invented records, each read as a workbook, as CSV files, and with its columns in another order."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import numpy as np
from builders import csv_file, workbook

import reconcile
from reconcile.importer.read import read_books
from reconcile.records.book import BatchRecords
from reconcile.records.results import Audit
from reconcile.records.settings import Settings

Sheets = Mapping[str, Sequence[Sequence[Any]]]
WAYS = ("workbook", "csv", "reordered")


def at(day: int, hour: int = 9, minute: int = 0) -> datetime:
    """A moment of an invented month."""
    return datetime(2031, 5, 1, hour, minute) + timedelta(days=day)


def read_as(way: str, folder: Path, sheets: Sheets, settings: Settings | None = None) -> BatchRecords:
    """A record read in one of three ways."""
    chosen = settings if settings is not None else Settings()
    if way == "workbook":
        return read_books([workbook(folder / "record.xlsx", sheets)], chosen)
    if way == "csv":
        paths = []
        for name, rows in sheets.items():
            written = [[v.isoformat(" ") if isinstance(v, datetime) else v for v in row] for row in rows]
            paths.append(csv_file(folder / f"{name}.csv", written))
        return read_books(paths, chosen)
    order = {name: np.random.default_rng(len(name)).permutation(len(rows[0])) for name, rows in sheets.items()}
    moved = {name: [[row[i] for i in order[name]] for row in rows] for name, rows in sheets.items()}
    return read_books([workbook(folder / "moved.xlsx", moved)], chosen)


def audit_as(way: str, folder: Path, sheets: Sheets, settings: Settings | None = None) -> Audit:
    """The audit of a record read in one of three ways."""
    return reconcile.audit(read_as(way, folder, sheets, settings), settings=settings)


def table(audit: Audit) -> list[tuple[str, str, str, float]]:
    """(batch or known solution, stage, status, predicted pH to two decimals) of every used reading, in file order."""
    readings = audit.records.readings
    names = np.where(readings["batch"] == "", readings["known"], readings["batch"])
    return [
        (str(name), str(stage), str(status), round(float(ph), 2))
        for name, stage, status, ph in zip(names, readings["stage"], audit.status, audit.prediction.ph, strict=True)
    ]


def near(found: list[tuple[str, str, str, float]], expected: list[tuple[str, str, str, float]], within: float) -> None:
    """Assert that two tables agree, predicted pH within a tolerance."""
    assert [row[:3] for row in found] == [row[:3] for row in expected]
    for one, other in zip(found, expected, strict=True):
        assert abs(one[3] - other[3]) <= within or (np.isnan(one[3]) and np.isnan(other[3])), (one, other)
