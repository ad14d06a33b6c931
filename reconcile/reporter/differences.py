"""Where two contents of one file of a report differ, in the words of that kind of file."""

from __future__ import annotations

import csv
import io
import json
import re
import zipfile
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from difflib import SequenceMatcher
from itertools import islice, zip_longest
from typing import Any

ALIGNED = 4_000
"""Rows or lines between the first and the last difference up to which those put in or taken out are told apart."""
AROUND = 40
"""Characters shown on both sides of the first difference of two long texts."""
INFLATED = 1 << 30
"""Bytes that a workbook may inflate to before it is not looked into."""
_HEADING = re.compile(r"<h[1-4][^>]*>(.*?)</h[1-4]>")
_TAG = re.compile(r"<[^>]*>")
NOTHING = ""
Row = Sequence[Any]


@dataclass(frozen=True)
class Difference:
    """One place in a file: what stands there now, and what was computed again ("" where there is nothing)."""

    where: str
    reads: str
    recomputed: str


def differences(name: str, now: bytes, again: bytes) -> Iterator[Difference]:
    """Every place in which a file of a report differs from what it should hold; at least one, if they differ at all.

    name : path within the folder, whose ending tells the kind of file
    """
    if now == again:
        return
    look = KINDS.get(name.rpartition(".")[2])
    found = False
    if look is not None:
        try:
            for difference in look(now, again):
                found = True
                yield difference
        except (ValueError, KeyError, csv.Error, zipfile.BadZipFile, OSError, EOFError) as error:
            found = True
            yield Difference("", f"cannot be read: {error}", "")
    if not found:
        yield Difference("", f"other content, {len(now):,} bytes", f"{len(again):,} bytes")


def _in_csv(now: bytes, again: bytes) -> Iterator[Difference]:
    one, other = ([(*r,) for r in csv.reader(io.StringIO(b.decode("utf-8"), newline=""))] for b in (now, again))
    headings = other[0] if other else ()
    for at, row, wanted in _aligned(one, other):
        yield from _in_row(f"line {at + 1}", headings, row, wanted)


def _in_row(where: str, headings: Row, row: Row | None, wanted: Row | None) -> Iterator[Difference]:
    if row is None or wanted is None:
        yield Difference(where, *(", ".join(map(_text, r)) if r is not None else "no such row" for r in (row, wanted)))
        return
    for i, (cell, should) in enumerate(zip_longest(row, wanted, fillvalue=NOTHING)):
        if cell != should:
            heading = headings[i] if i < len(headings) else f"field {i + 1}"
            yield Difference(f"{where}, {heading}", _text(cell), _text(should))


def _text(value: Any) -> str:
    return value if isinstance(value, str) else "" if value is None else str(value)


def _aligned(one: Sequence[Any], other: Sequence[Any]) -> Iterator[tuple[int, Any, Any]]:
    """(index, item now, item wanted) of all that differ; None where one side has none.

    As many on both sides are compared one by one; else those put in or taken out are found first.
    """
    if len(one) == len(other):
        yield from ((i, a, b) for i, (a, b) in enumerate(zip(one, other, strict=True)) if a != b)
        return
    head = next((i for i, (a, b) in enumerate(zip(one, other, strict=False)) if a != b), min(len(one), len(other)))
    tail = 0
    while tail < min(len(one), len(other)) - head and one[-1 - tail] == other[-1 - tail]:
        tail += 1
    mid_one, mid_other = one[head : len(one) - tail], other[head : len(other) - tail]
    if max(len(mid_one), len(mid_other)) > ALIGNED:
        yield from ((head + i, a, b) for i, (a, b) in enumerate(zip_longest(mid_one, mid_other)) if a != b)
        return
    for what, i, j, k, m in SequenceMatcher(None, mid_one, mid_other, autojunk=False).get_opcodes():
        if what != "equal":
            pairs = zip_longest(mid_one[i:j], mid_other[k:m])
            yield from ((head + i + n, a, b) for n, (a, b) in enumerate(pairs))


def _in_json(now: bytes, again: bytes) -> Iterator[Difference]:
    return between_documents(json.loads(now), json.loads(again))


def between_documents(now: Any, again: Any, path: str = "") -> Iterator[Difference]:
    """Every value in which two JSON documents differ, by its path: findings/F1/estimate."""
    if isinstance(now, Mapping) and isinstance(again, Mapping):
        for key in dict.fromkeys([*again, *now]):
            yield from between_documents(now.get(key), again.get(key), f"{path}/{key}".lstrip("/"))
    elif isinstance(now, list) and isinstance(again, list):
        one, other = ({_called(item, i): item for i, item in enumerate(items)} for items in (now, again))
        for key in dict.fromkeys([*other, *one]):
            yield from between_documents(one.get(key), other.get(key), f"{path}/{key}".lstrip("/"))
    elif now != again or type(now) is not type(again):
        yield Difference(path, *(v if isinstance(v, str) else json.dumps(v, ensure_ascii=False) for v in (now, again)))


def _called(item: Any, index: int) -> str:
    """How an item of a list is called: by its id or name, else by its number."""
    if isinstance(item, Mapping):
        for key in ("id", "name"):
            if isinstance(item.get(key), str):
                return str(item[key])
    return str(index + 1)


def _in_workbook(now: bytes, again: bytes) -> Iterator[Difference]:
    one, other = _sheets(now), _sheets(again)
    for name in dict.fromkeys([*other, *one]):
        if name not in one or name not in other:
            yield Difference(f"sheet {name}", *("there" if name in book else "no such sheet" for book in (one, other)))
            continue
        for cell in dict.fromkeys([*other[name], *one[name]]):
            (value, shown), (wanted, form) = (book[name].get(cell, (None, "General")) for book in (one, other))
            if value != wanted:
                yield Difference(f"{name}!{cell}", _text(value), _text(wanted))
            elif shown != form:
                yield Difference(f"{name}!{cell}", f"{_text(value)}, shown as {shown}", f"shown as {form}")


def _sheets(content: bytes) -> dict[str, dict[str, tuple[Any, str]]]:
    """Sheet -> cell -> (value, number format)."""
    import openpyxl

    with zipfile.ZipFile(io.BytesIO(content)) as archive:
        if sum(part.file_size for part in archive.infolist()) > INFLATED:
            raise ValueError("it inflates to over 1 GiB")
    book = openpyxl.load_workbook(io.BytesIO(content))
    return {
        sheet.title: {
            cell.coordinate: (cell.value, str(cell.number_format))
            for row in sheet.iter_rows()
            for cell in row
            if cell.value is not None
        }
        for sheet in book.worksheets
    }


def _in_text(now: bytes, again: bytes) -> Iterator[Difference]:
    one, other = (content.decode("utf-8").split("\n") for content in (now, again))
    headings = list(_headings(one))
    for at, a, b in _aligned(one, other):
        under = next((text for line, text in reversed(headings) if line <= at), "")
        where = f"line {at + 1}" + (f", under {under}" if under else "")
        yield Difference(where, *_apart(a, b))


def _headings(lines: Iterable[str]) -> Iterator[tuple[int, str]]:
    for at, line in enumerate(lines):
        for found in _HEADING.finditer(line):
            yield at, " ".join(_TAG.sub(" ", found.group(1)).split())


def _apart(one: str | None, other: str | None) -> tuple[str, str]:
    """Two lines as far as they differ, with a little of what stands on both sides."""
    if one is None or other is None:
        return tuple("no such line" if t is None else _excerpt(t, 0, len(t)) for t in (one, other))  # type: ignore[return-value]
    head = next((i for i, (a, b) in enumerate(zip(one, other, strict=False)) if a != b), min(len(one), len(other)))
    tail = 0
    while tail < min(len(one), len(other)) - head and one[-1 - tail] == other[-1 - tail]:
        tail += 1
    return _excerpt(one, head, len(one) - tail), _excerpt(other, head, len(other) - tail)


def _excerpt(text: str, begin: int, end: int) -> str:
    begin, end = max(begin - AROUND, 0), min(end + AROUND, len(text))
    cut = text[begin:end]
    if len(cut) > 5 * AROUND:
        cut = f"{cut[: 4 * AROUND]}…"
    return f"{'…' if begin else ''}{cut}{'…' if end < len(text) else ''}".strip()


KINDS: Mapping[str, Callable[[bytes, bytes], Iterator[Difference]]] = {
    "csv": _in_csv,
    "json": _in_json,
    "xlsx": _in_workbook,
    "html": _in_text,
    "svg": lambda now, again: islice(_in_text(now, again), 1),
}
"""Ending of a file -> how two contents of it are compared. A drawing tells where it first differs, for one moved line
moves others; pictures in pixels only differ as a whole.
"""
