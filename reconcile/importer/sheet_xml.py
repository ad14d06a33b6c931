"""What plain values hide, found by byte searches of a sheet's XML: errors, formulas, merges, formats, hidden rows."""

from __future__ import annotations

import html
import re
from dataclasses import dataclass

import numpy as np

from reconcile.records.arrays import IntArray
from reconcile.records.places import column_letters

_FEW = 100_000
_ANY_CELL = re.compile(
    rb"<(?:\w+:)?row\b([^>]*?)/?>|<(?:\w+:)?c\b((?:[^>\"]|\"[^\"]*\")*?)(?:/>|>(.*?)</(?:\w+:)?c>)", re.DOTALL
)
_ATTRIBUTE = re.compile(rb"([\w:]+)\s*=\s*[\"']([^\"']*)[\"']")


@dataclass(frozen=True)
class Formula:
    """A formula cell: place counted from 0, its text, and whether a value was saved with it."""

    row: int
    column: int
    text: str
    saved: bool


def column_index(letters: bytes) -> int:
    """Index from 0 of a column's letters: A is 0, AA is 26."""
    index = 0
    for letter in letters:
        index = index * 26 + letter - 64
    return index - 1


class SheetXml:
    """The XML of one sheet. A sheet whose cells are written in an unusual way is first written out in the usual one."""

    def __init__(self, data: bytes) -> None:
        self._shape = _shape(data)
        self._last_row = 0
        self.bad_reference = ""
        self.data = data
        self._letters = _longest_column(self._shape)
        if self._letters < 0:
            self.data, self.bad_reference = _usual(data)
            self._shape = _shape(self.data)
            self._letters = max(_longest_column(self._shape), 0)

    def bounds(self, many: int) -> tuple[int, int]:
        """Last row and last column that can hold a cell, from rows and cells and never from the declared dimension.

        Exact where it matters, that is, where rows times columns might exceed `many`.
        """
        rows = max(map(int, re.findall(rb'<row [^>]*?\br="(\d{1,9})', self.data)), default=0)
        columns = (0, 26, 702, 16384)[self._letters]
        digits = len(str(rows))
        longer = any(b'<c r="' + b"A" * n + b"0" * (digits + 1) in self._shape for n in range(1, self._letters + 1))
        if longer or (10**digits - 1) * columns > many:
            rows = max(rows, self._row_beyond(rows))
        if rows * columns > many:
            found = set(re.findall(rb'<c r="([A-Z]{%d})\d' % self._letters, self.data))
            columns = max(map(column_index, found), default=-1) + 1
        self._last_row = rows
        return rows, columns

    def _row_beyond(self, rows: int) -> int:
        """The last row that a cell names, where one lies beyond `rows`; at most that where none does."""
        digits = len(str(rows))
        begins = [b'<c r="' + b"A" * n + b"0" * digits for n in range(1, self._letters + 1)]
        if sum(self._shape.count(b) for b in begins) > _FEW:
            found = re.findall(rb'<c r="[A-Z]+(\d{%d,})"' % digits, self.data)
            return max((int(r[:9]) for r in found), default=0)
        last = 0
        for begin in begins:  # the few cells whose row has as many digits: the shape is as long as the data
            at = self._shape.find(begin)
            while at >= 0:
                named = re.match(rb"\d+", self.data[at + len(begin) - digits : at + len(begin) + 9])
                last = max(last, int(named.group(0)) if named else 0)
                at = self._shape.find(begin, at + 1)
        return last

    def holds(self, row: int, column: int) -> bool:
        """Whether a cell (from 0) lies within the rows that were bounded and the columns that a sheet can have."""
        return 0 <= row < self._last_row and 0 <= column < 16384

    def errors(self) -> list[tuple[int, int, str]]:
        """(row, column, text) of every error cell."""
        if b't="e"' not in self._shape:
            return []
        cells = re.finditer(rb'<c r="([A-Z]+)(\d+)"([^>]*\bt="e"[^>]*)>(.*?)</c>', self.data, re.DOTALL)
        found = []
        for match in cells:
            letters, row, _, inside = match.groups()
            value = re.search(rb"<v>([^<]*)</v>", inside)
            found.append((int(row) - 1, column_index(letters), _plain(value.group(1)) if value else "#ERROR"))
        return found

    def formulas(self) -> list[Formula]:
        """Every formula cell."""
        if b"<f" not in self._shape:
            return []
        found = []
        for match in re.finditer(rb'<c r="([A-Z]+)(\d+)"([^>]*)>(<f\b.*?)</c>', self.data, re.DOTALL):
            letters, row, attributes, inside = match.groups()
            value = re.search(rb"<v[^>]*>([^<]*)</v>", inside)
            saved = value is not None and (value.group(1) != b"" or b't="str"' in attributes)
            formula = re.search(rb"<f\b[^>]*>([^<]*)</f>", inside)
            text = "=" + _plain(formula.group(1)) if formula else "a formula"
            found.append(Formula(int(row) - 1, column_index(letters), text, saved))
        return found

    def cells_of_strings(self, indices: list[int]) -> list[tuple[int, int]]:
        """(row, column) of the cells that show any of some shared strings."""
        if not indices:
            return []
        wanted = b"|".join(b"%d" % i for i in indices)
        found = re.findall(rb'<c r="([A-Z]+)(\d+)"[^>]*\bt="s"[^>]*><v>(?:' + wanted + rb")</v>", self.data)
        return [(int(row) - 1, column_index(letters)) for letters, row in found]

    def uses_style(self, index: int) -> bool:
        """Whether any cell has a style."""
        return b's="%d"' % index in self.data

    def styles_of(self, column: int) -> tuple[IntArray, IntArray]:
        """Rows (from 0) and style indices of the styled cells of one column."""
        letters = column_letters(column).encode()
        found = re.findall(rb'<c r="' + letters + rb'(\d+)"(?: t="\w+")? s="(\d+)"', self.data)
        if not found:
            return np.zeros(0, np.intp), np.zeros(0, np.intp)
        numbers, styles = zip(*found, strict=True)
        first, last, n = int(numbers[0]), int(numbers[-1]), len(found)
        in_a_run = last - first == n - 1  # the usual case needs no conversion of every number
        rows = np.arange(first - 1, last) if in_a_run else np.array([int(r) for r in numbers], np.intp) - 1
        alike = len(set(styles)) == 1
        return rows, np.full(n, int(styles[0])) if alike else np.array([int(s) for s in styles], np.intp)

    def merges(self) -> list[tuple[int, int, int, int]]:
        """(first row, first column, last row, last column) of every merged range."""
        after = self.data[max(self.data.rfind(b"sheetData>"), 0) :]
        found = re.findall(rb'mergeCell [^>]*?ref="([A-Z]+)(\d+):([A-Z]+)(\d+)"', after)
        return [(int(b) - 1, column_index(a), int(d) - 1, column_index(c)) for a, b, c, d in found]

    def hidden_rows(self) -> set[int]:
        """Hidden rows (from 0), filtered ones among them."""
        if b"hidden=" not in self._shape:
            return set()
        tags = re.findall(rb'<(?:\w+:)?row\b([^>]*\bhidden="(?:1|true)"[^>]*)>', self.data)
        return {int(m.group(1)) - 1 for t in tags if (m := re.search(rb'\br="(\d+)"', t))}

    def hidden_columns(self) -> list[tuple[int, int]]:
        """(first, last) index of every run of hidden columns."""
        head = self.data[: max(self.data.find(b"<sheetData"), 0)]
        found = []
        for tag in re.findall(rb"<(?:\w+:)?col\b[^>]*>", head):
            a = dict(_ATTRIBUTE.findall(tag))
            if a.get(b"hidden") in (b"1", b"true") and b"min" in a and b"max" in a:
                found.append((int(a[b"min"]) - 1, int(a[b"max"]) - 1))
        return found


def raised_digits(strings: bytes) -> list[int]:
    """Indices of the shared strings in which digits are written as a superscript or subscript, such as 10 to the 3."""
    if b"vertAlign" not in strings:
        return []
    run = re.compile(
        rb'<(?:\w+:)?r>(?:(?!</(?:\w+:)?r>).)*vertAlign val="su(?:per|b)script".*?<(?:\w+:)?t[^>]*>([^<]*)<', re.DOTALL
    )
    texts = re.findall(rb"<(?:\w+:)?si>(.*?)</(?:\w+:)?si>|<(?:\w+:)?si/>", strings, re.DOTALL)
    return [i for i, text in enumerate(texts) if any(re.search(rb"\d", t) for t in run.findall(text))]


_FORM = bytes(65 if 65 <= c <= 90 else 48 if 48 <= c <= 57 else c for c in range(256))


def _shape(data: bytes) -> bytes:
    """The XML with every digit a 0 and every capital an A, so that questions about its form are plain searches."""
    return data.translate(_FORM)


def _longest_column(shape: bytes) -> int:
    """Letters of the longest column name, 0 without any cell; -1 where a cell does not begin with its reference."""
    first, last = shape.find(b"<sheetAata"), shape.rfind(b"</sheetAata")
    if first < 0 or shape.find(b":c ", first) >= 0:
        return -1
    if last < 0:  # no rows at all
        last = len(shape)
    cells, letters = shape.count(b"<c", first, last), 0
    while cells and letters < 3:
        letters += 1
        cells -= shape.count(b'<c r="' + b"A" * letters + b"0", first, last)
    return letters if cells == 0 else -1


def _usual(data: bytes) -> tuple[bytes, str]:
    """The sheet with every cell as <c r="A1" s="1" t="s">, references filled in; and a reference that is none."""
    bad = ""
    out, row, column, end = [], 0, 0, 0
    for match in _ANY_CELL.finditer(data):
        out.append(data[end : match.start()])
        end = match.end()
        if match.group(1) is not None:
            attributes = dict(_ATTRIBUTE.findall(match.group(1)))
            number = attributes.get(b"r", b"")
            row, column = int(number) if number.isdigit() else row + 1, 0
            others = b"".join(b' %s="%s"' % (k, v) for k, v in attributes.items() if k != b"r")
            out.append(b'<row r="%d"%s>' % (row, others))
            continue
        attributes = dict(_ATTRIBUTE.findall(match.group(2)))
        named = re.fullmatch(rb"([A-Z]{1,3})(\d{1,7})", attributes.get(b"r", b""))
        if named is None and attributes.get(b"r"):
            bad = bad or _plain(attributes[b"r"])
        column = column_index(named.group(1)) if named else column
        here = b"%s%d" % (column_letters(column).encode(), int(named.group(2)) if named else row)
        kept = b"".join(b' %s="%s"' % (k, attributes[k]) for k in (b"s", b"t") if k in attributes)
        inside = re.sub(rb"<(/?)\w+:(\w)", rb"<\1\2", match.group(3) or b"")
        out.append(b'<c r="%s"%s>%s</c>' % (here, kept, inside))
        column += 1
    out.append(data[end:])
    return b"".join(out), bad


def _plain(data: bytes) -> str:
    return html.unescape(data.decode("utf-8", "replace"))
