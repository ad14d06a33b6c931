"""From a path to raw sheets: the content decides what a file is, never its name."""

from __future__ import annotations

import hashlib
from pathlib import Path

from reconcile.importer.csv_file import read_csv
from reconcile.importer.raw import RawSheet
from reconcile.importer.workbook import read_workbook
from reconcile.records.places import Place
from reconcile.records.problems import InputProblems, Problem
from reconcile.records.settings import Settings

_ZIP, _OLE = b"PK\x03\x04", b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1"


def refuse(code: str, file: str, read: str = "", **words: str) -> InputProblems:
    """The exception for one file that is refused as a whole."""
    return InputProblems([Problem(code, Place(file), read, tuple(words.items()))])


def read_file(path: Path, settings: Settings) -> list[RawSheet]:
    """Every sheet of one file; raises InputProblems where the file is refused."""
    name = path.name
    if not path.exists():
        raise refuse("file-missing", name)
    cap = int(settings["limits.inflated_mib"])
    try:
        if path.stat().st_size > cap << 20:
            raise refuse("file-too-large", name, f"{path.stat().st_size >> 20} MiB")
        content = path.read_bytes()
    except OSError as error:
        raise refuse("file-unreadable", name, error.strerror or "unreadable") from None
    if name.startswith("~$"):
        raise refuse("file-lock", name)
    if not content.strip(b"\x00 \t\r\n\xef\xbb\xbf"):
        raise refuse("file-empty", name)
    kind = _what_it_is(content)
    if kind == "an encrypted workbook":
        raise refuse("file-encrypted", name)
    if kind not in ("workbook", "text"):
        raise refuse("file-type", name, kind)
    sha256 = hashlib.sha256(content).hexdigest()
    sheets = (
        read_workbook(content, name, sha256, settings)
        if kind == "workbook"
        else [read_csv(content, name, sha256, settings)]
    )
    suffix = path.suffix.lower()
    expected = (".xlsx", ".xlsm", ".xltx", ".xltm") if kind == "workbook" else (".csv", ".txt", ".tsv", ".tab")
    if suffix not in expected and sheets:
        sheets[0].notes.append(Problem("file-name-differs", Place(name), suffix or name, (("kind", kind),)))
    if suffix == ".xlsm" and sheets:
        sheets[0].notes.append(Problem("file-macros", Place(name)))
    return sheets


def _what_it_is(content: bytes) -> str:
    """ "workbook", "text", or plain words for what is refused."""
    start = content[:4096].lstrip(b"\xef\xbb\xbf").lstrip()
    lower = start[:1024].lower()
    if content.startswith(_OLE):
        wide = "EncryptedPackage".encode("utf-16-le")
        return "an encrypted workbook" if wide in content else "an old .xls workbook or another OLE document"
    if content.startswith(_ZIP):
        if b"[Content_Types].xml" in content and b"xl/workbook.bin" in content:
            return "a binary .xlsb workbook"
        if b"mimetypeapplication/vnd.oasis.opendocument" in content[:200]:
            return "an OpenDocument file"
        return "workbook"
    if content[:2] in (b"PK", b"\x1f\x8b") or content.startswith((b"Rar!", b"7z\xbc\xaf")):
        return "a packed archive, or the beginning of one"
    if content.startswith(b"%PDF"):
        return "a PDF document"
    if lower.startswith((b"<!doctype html", b"<html", b"<table", b"<head", b"<meta", b"<body")) or b"<html" in lower:
        return "a web page (HTML)"
    if lower.startswith(b"<?xml") or b"urn:schemas-microsoft-com:office:spreadsheet" in lower:
        return "an XML document"
    if lower.startswith(b"mime-version:") or b"content-type: multipart" in lower:
        return "a web archive (MIME)"
    if start[:1] in (b"{", b"[") and b'":' in lower:
        return "a JSON document"
    return "text"
