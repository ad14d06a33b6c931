"""Workbooks: inflated once under a cap, values through python-calamine, the rest from the sheets' own XML."""

from __future__ import annotations

import html
import io
import posixpath
import re
import zipfile
import zlib
from typing import Any

import python_calamine as calamine

from reconcile.importer.beside import note_what_lies_beside
from reconcile.importer.hidden import add_what_values_hide
from reconcile.importer.raw import RawSheet, sheet_of_rows
from reconcile.importer.sheet_xml import SheetXml, raised_digits
from reconcile.importer.styles import Styles
from reconcile.records.limits import beyond, check_size
from reconcile.records.places import Place, column_letters
from reconcile.records.problems import InputProblems, Problem
from reconcile.records.settings import Settings

_CHUNK = 1 << 20
_FULL_SHEETS = (65536, 1048576)
_IN_PLACE = re.compile(rb't="(?:inlineStr|str)"')
"""A text that stands in the sheet itself, not among the shared ones."""


def read_workbook(content: bytes, file: str, sha256: str, settings: Settings) -> list[RawSheet]:
    """Every worksheet of an .xlsx or .xlsm file; raises InputProblems where the file is refused."""
    parts = _inflate(content, file, int(settings["limits.inflated_mib"]) << 20)
    if "xl/workbook.xml" not in parts and not any(p.endswith("workbook.xml") for p in parts):
        raise _refused("file-type", file, "a zip archive without a workbook")
    for name, data in parts.items():
        if _declares(data):
            raise _refused("file-entities", file, name)
    styles = Styles(parts.get("xl/styles.xml", b""))
    book = parts.get("xl/workbook.xml", b"")
    epoch_1904 = re.search(rb'date1904\s*=\s*"(1|true)"', book) is not None
    sheets: list[RawSheet] = []
    values = _opened(content, file)
    longest = int(settings["limits.cell_chars"])
    long_shared = re.search(rb"[^<>]{%d}" % min(longest + 1, 65535), parts.get("xl/sharedStrings.xml", b"")) is not None
    raised = raised_digits(parts.get("xl/sharedStrings.xml", b""))
    for name, part, hidden in _sheets(book, parts.get("xl/_rels/workbook.xml.rels", b"")):
        if b"worksheet" not in parts.get(part, b"")[:2048]:
            continue  # a chart or dialogue sheet holds no cells
        xml = SheetXml(parts[part])
        if xml.bad_reference:
            raise InputProblems([Problem("file-damaged", Place(file, name), f"a cell is called {xml.bad_reference}")])
        widest = int(settings["limits.sheet_cells"])
        last_row, last_column = xml.bounds(widest)
        if last_row * last_column > widest:
            raise InputProblems([Problem("sheet-too-wide", Place(file, name), f"{last_row} x {last_column}")])
        rows = _values(values, file, name)
        check_size(len(rows), len(rows[0]) if rows else 0, settings, Place(file, name))
        if long_shared or _IN_PLACE.search(parts[part]):
            _check_cells(rows, longest, Place(file, name))
        sheet = sheet_of_rows(file, name, rows, sha256)
        sheet.epoch_1904 = epoch_1904
        sheet.hidden = hidden
        add_what_values_hide(sheet, xml, styles, raised)
        if len(sheet) in _FULL_SHEETS:
            sheet.notes.append(Problem("file-maybe-cut", Place(file, name), str(len(sheet))))
        note_what_lies_beside(sheet, part, parts)
        sheets.append(sheet)
    if epoch_1904 and sheets:
        sheets[0].notes.append(Problem("epoch-1904", Place(file)))
    return sheets


def _check_cells(rows: list[list[Any]], longest: int, place: Place) -> None:
    """Refuse a sheet with a text longer than the limit; raises InputProblems at the first."""
    for r, row in enumerate(rows, 1):
        for c, value in enumerate(row):
            if isinstance(value, str) and len(value) > longest:
                cell = Place(place.file, place.sheet, r, column_letters(c))
                raise beyond("limit-cell", len(value), longest, cell)


def _declares(data: bytes) -> bool:
    """Whether a part declares a document type or an entity, in whatever encoding."""
    if data[:2] in (b"\xff\xfe", b"\xfe\xff") or b"\x00" in data[:64]:
        data = data.replace(b"\x00", b"")
    return b"<!" in data and (b"<!DOCTYPE" in data or b"<!ENTITY" in data)


def _refused(code: str, file: str, read: str = "") -> InputProblems:
    return InputProblems([Problem(code, Place(file), read)])


def _inflate(content: bytes, file: str, cap: int) -> dict[str, bytes]:
    """Every part, inflated; stops as soon as more comes out than the cap, whatever sizes the archive declares."""
    parts: dict[str, bytes] = {}
    total = 0
    try:
        with zipfile.ZipFile(io.BytesIO(content)) as archive:
            declared = sum(info.file_size for info in archive.infolist())
            if declared > cap:
                raise _refused("file-too-large", file, f"{declared >> 20} MiB")
            for info in archive.infolist():
                if info.flag_bits & 1:
                    raise _refused("file-encrypted", file)
                kept = info.filename.endswith((".xml", ".rels"))
                pieces: list[bytes] = []
                with archive.open(info) as part:
                    while piece := part.read(_CHUNK):
                        total += len(piece)
                        if total > cap:
                            raise _refused("file-too-large", file, f"over {cap >> 20} MiB")
                        if kept:
                            pieces.append(piece)
                parts[info.filename.lstrip("/")] = b"".join(pieces)
    except (zipfile.BadZipFile, zlib.error, EOFError, OSError, NotImplementedError, ValueError, RuntimeError) as error:
        raise _refused("file-damaged", file, str(error) or type(error).__name__) from None
    return parts


def _opened(content: bytes, file: str) -> calamine.CalamineWorkbook:
    try:
        return calamine.CalamineWorkbook.from_filelike(io.BytesIO(content))
    except Exception as error:  # the reader's errors have no common base; all mean the same to the user
        raise _refused("file-damaged", file, f"{type(error).__name__}: {error}") from None


def _values(book: calamine.CalamineWorkbook, file: str, sheet: str) -> list[list[Any]]:
    try:
        return book.get_sheet_by_name(sheet).to_python(skip_empty_area=False)
    except Exception as error:  # as above
        message = f"{type(error).__name__}: {error}"
        raise InputProblems([Problem("file-damaged", Place(file, sheet), message)]) from None


def _sheets(book: bytes, relations: bytes) -> list[tuple[str, str, bool]]:
    """(name, part, hidden) of every sheet, in the order of the workbook."""
    targets: dict[bytes, str] = {}
    for tag in re.findall(rb"<(?:\w+:)?Relationship\b[^>]*>", relations):
        identity, target = _attribute(tag, rb"Id"), _attribute(tag, rb"Target")
        path = target.decode("utf-8", "replace")
        targets[identity] = path.lstrip("/") if path.startswith("/") else posixpath.normpath(posixpath.join("xl", path))
    found = []
    for tag in re.findall(rb"<(?:\w+:)?sheet\b[^>]*>", book):
        found_id = re.search(rb'\br?:?id="([^"]*)"', tag)
        name = _unescaped(_attribute(tag, rb"name"))
        if found_id and name:
            state = _attribute(tag, rb"state")
            found.append((name, targets.get(found_id.group(1), ""), state in (b"hidden", b"veryHidden")))
    return found


def _attribute(tag: bytes, name: bytes) -> bytes:
    match = re.search(rb"\b" + name + rb"\s*=\s*\"([^\"]*)\"", tag)
    return match.group(1) if match else b""


def _unescaped(data: bytes) -> str:
    return html.unescape(data.decode("utf-8", "replace"))
