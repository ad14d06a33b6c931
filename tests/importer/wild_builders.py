"""Builders of damaged files, each a function from a folder to the paths to be read, for the table of cases."""

from __future__ import annotations

import zipfile
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any

import openpyxl
import xlsxwriter
from builders import workbook
from wild_case import HEAD, RECIPES, book, change_part, csv_log, reading, readings

Paths = Path | Sequence[Path]
Build = Callable[[Path], Paths]
SHEET = "xl/worksheets/sheet1.xml"
OLE = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1"


def rows_of(*rows: list[Any], **more: Any) -> Build:
    """A workbook of these readings after two ordinary ones; the first of them stands in row 4."""
    return lambda folder: book(folder, [*readings(2), *rows], **more)


def one(**cell: Any) -> Build:
    """A workbook with one ordinary reading changed, in row 4."""
    return rows_of(reading(5, **cell))


def bytes_of(name: str, content: bytes) -> Build:
    def build(folder: Path) -> Path:
        (folder / name).write_bytes(content)
        return folder / name

    return build


def whole(name: str, change: Callable[[bytes], bytes] = bytes) -> Build:
    """A good workbook under another name, its bytes changed."""
    return lambda folder: bytes_of(name, change(book(folder, readings(3)).read_bytes()))(folder)


def part(change: Callable[[str], str], name: str = SHEET, rows: Sequence[list[Any]] = ()) -> Build:
    """A workbook with the text of one part changed."""
    return lambda folder: change_part(book(folder, [*readings(3), *rows]), name, change)


def styled(change: Callable[[Any], Any], *rows: list[Any]) -> Build:
    """A workbook whose Readings sheet is changed through openpyxl."""

    def build(folder: Path) -> Path:
        path = book(folder, [*readings(3), *rows])
        changed = openpyxl.load_workbook(path)
        change(changed["Readings"])
        changed.save(path)
        return path

    return build


def text(*lines: str, encoding: str = "utf-8") -> Build:
    return lambda folder: csv_log(folder, ("\n".join(lines) + "\n").encode(encoding))


def sheets(**named: Sequence[Sequence[Any]]) -> Build:
    return lambda folder: workbook(folder / "record.xlsx", {**named, "Recipes": RECIPES})


def zipped(name: str, **parts: str) -> Build:
    def build(folder: Path) -> Path:
        with zipfile.ZipFile(folder / name, "w", zipfile.ZIP_DEFLATED) as archive:
            for inside, content in parts.items():
                archive.writestr(inside.replace("__", "/"), content)
        return folder / name

    return build


def bomb(folder: Path) -> Path:
    """A workbook of a few hundred kilobytes that says it inflates to 600 MiB."""
    path = zipped("bomb.xlsx", xl__workbook_xml="<workbook/>", xl__sheet="0" * 1000)(folder)
    data = path.read_bytes()
    path.write_bytes(data.replace((1000).to_bytes(4, "little"), (600 << 20).to_bytes(4, "little")))
    return path


def raised(folder: Path) -> Path:
    path = folder / "rich.xlsx"
    rich = xlsxwriter.Workbook(path)
    log, recipes = rich.add_worksheet("Readings"), rich.add_worksheet("Recipes")
    for r, row in enumerate([("Batch", "pH"), ("B1", 4.71), ("B1", 4.7)]):
        log.write_row(r, 0, row)
    log.write_rich_string(2, 1, "10", rich.add_format({"font_script": 1}), "3", " ")
    for r, row in enumerate(RECIPES):
        recipes.write_row(r, 0, row)
    rich.close()
    return path


def made_of(amount: Any, unit: Any) -> Build:
    recipe = [("Batch", "Substance", "Amount", "Unit"), ("B1", "KCl", amount, unit)]
    return lambda folder: workbook(folder / "r.xlsx", {"Readings": [HEAD, reading()], "Recipes": recipe})


def log(*rows: list[Any], **more: Any) -> Build:
    """A workbook of exactly these readings."""
    return lambda folder: book(folder, rows, **more)


def percents(*assays: Any) -> Build:
    """Lots with these assays, the first in a cell with a percent format."""
    lots = [(f"L{k}", "NaCl", assay) for k, assay in enumerate(assays)]
    batches = [(f"B{k}", "NaCl", f"L{k}", 5.8, "g", "1 L") for k in range(len(assays))]
    named = {
        "Readings": [("Batch", "pH"), *((f"B{k}", 7.0) for k in range(len(assays)))],
        "Recipes": [("Batch", "Substance", "Lot", "Amount", "Unit", "Made up to"), *batches],
        "Stocks": [("Lot", "Substance", "Assay (%)"), *lots],
    }
    return lambda folder: workbook(folder / "record.xlsx", named, {"Stocks!C2": "0.0%"})
