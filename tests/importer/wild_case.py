"""A damaged file, read, and what the importer says of it as (sheet, cell, code)."""

from __future__ import annotations

import re
import zipfile
from collections.abc import Callable, Mapping, Sequence
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

from builders import csv_file, workbook

from reconcile.importer.read import read_books
from reconcile.records.book import BatchRecords
from reconcile.records.problems import InputProblems
from reconcile.records.settings import Settings

HEAD: tuple[Any, ...] = ("Read at", "Batch", "Meter", "Temperature (°C)", "pH")
RECIPES: list[Sequence[Any]] = [
    ("Batch", "Substance", "Lot", "Amount", "Unit"),
    ("B1", "acetic acid", "L1", 50.0, "mM"),
    ("B1", "sodium acetate", "L2", 50.0, "mM"),
]
FIRST = datetime(2026, 3, 2, 9, 0)


def reading(
    k: int = 0, ph: Any = 4.71, batch: Any = "B1", meter: Any = "M1", at: Any = None, t: Any = 22.0
) -> list[Any]:
    """One ordinary reading, with any cell replaced."""
    return [FIRST + timedelta(hours=k) if at is None else at, batch, meter, t, ph]


def readings(n: int, **replaced: Any) -> list[list[Any]]:
    """n ordinary readings under no heading."""
    return [reading(k, **replaced) for k in range(n)]


def book(folder: Path, rows: Sequence[Sequence[Any]], *, head: Sequence[Any] = HEAD, **more: Any) -> Path:
    """A workbook with a Readings and a Recipes sheet."""
    sheets = {"Readings": [head, *rows], "Recipes": RECIPES}
    return workbook(folder / "record.xlsx", sheets, **more)


def csv_pair(folder: Path, rows: Sequence[Sequence[Any]], *, head: Sequence[Any] = HEAD, **more: Any) -> list[Path]:
    """A CSV file of readings beside one of recipes."""
    written = [[v.isoformat(" ") if isinstance(v, datetime) else v for v in row] for row in rows]
    return [csv_file(folder / "log.csv", [head, *written], **more), csv_file(folder / "recipes.csv", RECIPES)]


def csv_log(folder: Path, content: str | bytes) -> list[Path]:
    """A CSV file with exactly this content, beside one of recipes."""
    path = folder / "log.csv"
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    return [path, csv_file(folder / "recipes.csv", RECIPES)]


def settings(**keys: Any) -> Settings:
    """Settings from [reading] keys."""
    return Settings.from_sections({"reading": keys})


def read(paths: Path | Sequence[Path], **keys: Any) -> BatchRecords:
    """Import, with [reading] settings."""
    return read_books([paths] if isinstance(paths, Path) else paths, settings(**keys))


def refusal(paths: Path | Sequence[Path], **keys: Any) -> set[tuple[str, str, str]]:
    """(sheet, cell, code) of every reason for which the input is refused."""
    try:
        read(paths, **keys)
    except InputProblems as refused:
        for problem in refused.problems:
            message = problem.message()
            assert "Traceback" not in message
            assert not re.search(r"\{\w+\}", message), message
        return {(p.place.sheet, p.place.cell, p.code) for p in refused.problems}
    raise AssertionError("the input was accepted")


def aside(records: BatchRecords) -> set[tuple[str, str, str]]:
    """(sheet, cell, code) of the causes of every row set aside; the ledger must add up."""
    assert records.rows_read == len(records.readings) + len(records.set_aside)
    for row in records.set_aside:
        assert not re.search(r"\{\w+\}", row.reason + row.advice), row.reason
    return {(s.cause.sheet, s.cause.cell, s.code) for s in records.set_aside}


def noted(records: BatchRecords) -> set[tuple[str, str, str]]:
    """(sheet, cell, code) of every notice."""
    for note in records.notes:
        assert not re.search(r"\{\w+\}", note.message()), note.message()
    return {(p.place.sheet, p.place.cell, p.code) for p in records.notes}


def change_part(path: Path, part: str, change: Callable[[str], str], name: str = "changed.xlsx") -> Path:
    """A copy of a workbook with the text of one part changed."""
    return change_parts(path, {part: change}, name)


def change_parts(path: Path, changes: Mapping[str, Callable[[str], str]], name: str = "changed.xlsx") -> Path:
    """A copy of a workbook with the text of some parts changed."""
    out = path.with_name(name)
    with zipfile.ZipFile(path) as old, zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as new:
        for info in old.infolist():
            data = old.read(info)
            if info.filename in changes:
                changed = changes[info.filename](data.decode())
                assert changed.encode() != data, "the change did nothing"
                data = changed.encode()
            new.writestr(info.filename, data)
    return out
