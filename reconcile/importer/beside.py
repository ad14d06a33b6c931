"""What a workbook carries beside its cells: comments are quoted, the rest is counted; none of it is read as data."""

from __future__ import annotations

import html
import posixpath
import re
from collections.abc import Mapping

from reconcile.importer.raw import RawSheet
from reconcile.importer.sheet_xml import column_index
from reconcile.records.problems import Problem

_QUOTED = 50
_RELATION = re.compile(rb"<(?:\w+:)?Relationship\b[^>]*>")
_COMMENT = re.compile(rb'<(?:\w+:)?comment\b[^>]*?ref="([A-Z]+)(\d+)"[^>]*>(.*?)</(?:\w+:)?comment>', re.DOTALL)
_TEXT = re.compile(rb"<(?:\w+:)?t\b[^>]*>([^<]*)</")


def note_what_lies_beside(sheet: RawSheet, part: str, parts: Mapping[str, bytes]) -> None:
    """Notices about comments, pictures, charts, text boxes and links to other workbooks."""
    folder, _, base = part.rpartition("/")
    counts: dict[str, int] = {}
    for tag in _RELATION.findall(parts.get(f"{folder}/_rels/{base}.rels", b"")):
        kind = _attribute(tag, rb"Type").rpartition("/")[2]
        target = _attribute(tag, rb"Target")
        path = target if target.startswith("/") else posixpath.normpath(posixpath.join(folder, target))
        data = parts.get(path.lstrip("/"), b"")
        if kind == "comments":
            counts["comments"] = counts.get("comments", 0) + _quote(sheet, data)
        elif kind == "drawing":
            number = len(re.findall(rb"<(?:\w+:)?(?:pic|graphicFrame|sp)\b", data))
            counts["pictures, charts or text boxes"] = counts.get("pictures, charts or text boxes", 0) + number
    counts["links to other workbooks"] = sum(1 for p in parts if p.startswith("xl/externalLinks/externalLink"))
    said = ", ".join(f"{number} {kind}" for kind, number in counts.items() if number)
    if said:
        sheet.notes.append(Problem("beside-the-cells", sheet.place(), said))


def _quote(sheet: RawSheet, data: bytes) -> int:
    """Quote the comments of a sheet, the first 50 of them; returns their number."""
    found = _COMMENT.findall(data)
    for letters, row, inside in found[:_QUOTED]:
        text = "".join(html.unescape(t.decode("utf-8", "replace")) for t in _TEXT.findall(inside))
        column = column_index(letters)
        if int(row) <= len(sheet) and column < len(sheet.names):
            sheet.notes.append(Problem("cell-comment", sheet.place(int(row) - 1, column), " ".join(text.split())))
    return len(found)


def _attribute(tag: bytes, name: bytes) -> str:
    match = re.search(rb"\b" + name + rb"\s*=\s*\"([^\"]*)\"", tag)
    return html.unescape(match.group(1).decode("utf-8", "replace")) if match else ""
