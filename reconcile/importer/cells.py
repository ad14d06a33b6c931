"""One column of cells read by one strict grammar: numbers and names. Nothing is mended in silence."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, field
from datetime import date, datetime, time, timedelta
from typing import Any

import numpy as np

from reconcile.importer.raw import SPACES, Marker
from reconcile.records.arrays import AnyArray, IntArray

_NUMBER = re.compile(r"[+-]?(?:\d+(?:[.,]\d*)?|[.,]\d+)(?:[eE][+-]?\d{1,3})?", re.ASCII)
_MINUS = re.compile("^[\u2212\u2012\u2013](?=[\\d.,\uff10-\uff19])")
_FULL_WIDTH = {0xFF10 + d: str(d) for d in range(10)} | {0xFF0E: ".", 0xFF0C: ",", 0xFF0B: "+", 0xFF0D: "-"}
MISSING = frozenset(
    {"", "n/a", "na", "n.a.", "n.a", "-", "--", "\u2013", "\u2014", "\u2212", "nd", "n.d.", "nan", "none", "null"}
)
"""What stands for a missing value in a column of numbers or times; in a column of names these are names."""
ROOM = frozenset({"rt", "r.t.", "room", "room temp", "room temp.", "room temperature", "ambient", "amb", "amb."})
"""What stands for no temperature in particular."""
_CENSORED = re.compile(r"^\s*[<>≤≥]|±|\+/-|\d\s*(?:-|–|to|\.\.)\s*\d", re.IGNORECASE)


@dataclass(frozen=True)
class Fault:
    """One cell that cannot be used: the code, what was read, and the words its message needs."""

    code: str
    read: str
    words: tuple[tuple[str, str], ...] = ()


@dataclass
class Parsed:
    """One column after reading.

    values : FloatArray, TextArray or TimeArray (n,)
    bad : row index -> Fault
    notes : (code, first row index, what was read, words)
    decimals : IntArray (n,), decimals as written, -1 where unknown; None where the column has no text numbers
    open_choice : row indices that a choice (decimal comma, day-month order) would settle, by that choice's name
    """

    values: AnyArray
    bad: dict[int, Fault] = field(default_factory=dict)
    notes: list[tuple[str, int, str, tuple[tuple[str, str], ...]]] = field(default_factory=list)
    decimals: IntArray | None = None
    open_choice: dict[str, list[int]] = field(default_factory=dict)


def as_text(cell: Any) -> str:
    """A cell as a person sees it, for messages."""
    if isinstance(cell, Marker):
        return cell.text
    if isinstance(cell, float) and cell.is_integer() and abs(cell) < 1e15:
        return str(int(cell))
    if isinstance(cell, bool):
        return str(cell).upper()
    if isinstance(cell, datetime):
        return cell.isoformat(" ", "seconds")
    return str(cell)


def blanks(cells: Sequence[Any]) -> AnyArray:
    """BoolArray (n,): cells that hold nothing but spaces."""
    empty = {v for v in set(cells) if isinstance(v, str) and not v.strip(SPACES)}
    if not empty:
        return np.zeros(len(cells), bool)
    return np.fromiter((v in empty for v in cells), bool, len(cells))


MARKER_CODES = {
    "error": "cell-error",
    "uncalculated": "formula-uncalculated",
    "raised": "superscript-digits",
    "overlong": "cell-too-long",
    "duration": "time-without-date",
}


def tidy_number(text: str) -> tuple[str, bool]:
    """Text of a number with its look-alike characters replaced, and whether any was."""
    stripped = text.strip(SPACES)
    tidy = _MINUS.sub("-", stripped.translate(_FULL_WIDTH))
    return tidy, tidy != stripped


def decimal_mark(texts: Sequence[str], wanted: str) -> str:
    """The decimal mark of a column: "." or ",", "both" where cells contradict each other, "" where nothing tells.

    A comma followed by other than three digits, or after a leading zero, can only be a decimal comma; so for points.
    """
    if wanted in (".", ","):
        return wanted
    sure = set()
    for text in texts:
        if _NUMBER.fullmatch(text) and ("," in text or "." in text):
            mark = "," if "," in text else "."
            whole, _, rest = text.lstrip("+-").partition(mark)
            digits = re.match(r"\d*", rest)
            if mark == "." or whole in ("0", "") or len(digits.group(0) if digits else "") != 3 or len(whole) > 3:
                sure.add(mark)
    return "both" if len(sure) == 2 else next(iter(sure), "")


def number_of(text: str, mark: str) -> tuple[float, int] | None:
    """Value and decimals of a tidy text under one decimal mark; None where it is no finite number."""
    if not _NUMBER.fullmatch(text):
        return None
    if mark == "both":
        mark = "," if "," in text else "."
    if ("," in text and mark != ",") or ("." in text and mark == ","):
        return None
    plain = text.replace(",", ".")
    value = float(plain)
    if not np.isfinite(value):
        return None
    mantissa = re.split("[eE]", plain)[0]
    return value, -1 if "e" in plain.lower() else len(mantissa.partition(".")[2])


def parse_numbers(
    cells: Sequence[Any],
    decimal: str,
    text_is_usual: bool,
    unit_factors: Any = None,
    mark: str | None = None,
    missing: frozenset[str] = MISSING,
) -> Parsed:
    """A column of numbers; cells of another kind are named in `bad`, blanks and missing marks are NaN.

    decimal : "auto", "." or ","; text_is_usual : True in a CSV file, where text is no notice
    unit_factors : function text -> (factor, offset) or None, for cells such as "25 mL" or "20 °C"
    mark : what `decimal_mark` says, where more texts than these settle it; missing : what stands for no value
    """
    kinds = set(map(type, cells))
    if kinds <= {float, int}:
        return Parsed(np.array(cells, np.float64))
    n = len(cells)
    values = np.full(n, np.nan)
    parsed = Parsed(values)
    if kinds <= {float, int, str} and kinds & {float, int}:
        is_number = np.fromiter((type(v) is not str for v in cells), bool, n)
        values[is_number] = np.array([v for v in cells if type(v) is not str], np.float64)
        others = np.flatnonzero(~is_number)
    elif kinds == {str}:
        others = np.arange(n)
    else:
        good = np.fromiter((type(v) in (float, int) for v in cells), bool, n)
        values[good] = np.array([v for v in cells if type(v) in (float, int)], np.float64)
        others = np.flatnonzero(~good)
    distinct: dict[str, tuple[str, bool]] = {}
    for i in others.tolist():
        v = cells[i]
        if type(v) is str and v not in distinct:
            distinct[v] = tidy_number(v)
    if mark is None:
        mark = decimal_mark([t for t, _ in distinct.values()], decimal)
    meaning = {text: _meaning(tidy, text, mark, unit_factors, missing) for text, (tidy, _) in distinct.items()}
    if decimal != "auto":  # the choice is made: what does not follow it is no number
        for text, found in meaning.items():
            if isinstance(found, Fault) and found.code == "decimal-unclear":
                meaning[text] = Fault("number-not-a-number", text)
    counts: dict[str, list[int]] = {}
    decimals = np.full(n, -1, np.intp)
    for i in others.tolist():
        v = cells[i]
        if type(v) is not str:
            _other_kind(parsed, i, v)
            continue
        found = meaning[v]
        if isinstance(found, Fault):
            parsed.bad[i] = found
            if found.code == "decimal-unclear":
                parsed.open_choice.setdefault("decimal", []).append(i)
            continue
        value, places, how = found
        values[i] = value
        decimals[i] = places
        for name in how:
            counts.setdefault(name, []).append(i)
        if places >= -1 and not text_is_usual and "number-with-unit" not in how and "missing-mark" not in how:
            counts.setdefault("number-as-text", []).append(i)
        if distinct[v][1] and "missing-mark" not in how:
            counts.setdefault("look-alike-characters", []).append(i)
    for code, rows in counts.items():
        if code:
            parsed.notes.append((code, rows[0], as_text(cells[rows[0]]), (("count", str(len(rows))),)))
    parsed.decimals = decimals
    return parsed


def _meaning(
    tidy: str, text: str, mark: str, unit_factors: Any, missing: frozenset[str]
) -> Fault | tuple[float, int, tuple[str, ...]]:
    if tidy.casefold() in missing:
        return np.nan, -2, ("missing-mark",) if tidy else ()
    number = number_of(tidy, mark)
    if number is not None:
        if "," in tidy and mark == "both":
            return Fault("decimal-unclear", text)
        return *number, ("decimal-comma",) if "," in tidy else ()
    if _NUMBER.fullmatch(tidy) and np.isfinite(float(tidy.replace(",", "."))):
        return Fault("decimal-unclear", text)
    if _CENSORED.search(tidy):
        return Fault("number-censored", text)
    if unit_factors is not None:
        split = re.match(r"([+-]?[\d.,]+(?:[eE][+-]?\d+)?)\s*(\D.*)$", tidy)
        number = number_of(split.group(1), mark) if split else None
        change = unit_factors(split.group(2).strip()) if split and number else None
        if number is not None and change is not None:
            return number[0] * change[0] + change[1], number[1], ("number-with-unit",)
    return Fault("number-not-a-number", text)


def _other_kind(parsed: Parsed, i: int, cell: Any) -> None:
    """A cell that is neither a number nor text."""
    if isinstance(cell, Marker):
        if cell.kind in ("percent", "padded"):
            parsed.values[i] = float(cell.value)
            return
        if cell.kind == "covered":
            return
        parsed.bad[i] = Fault(MARKER_CODES[cell.kind], cell.text)
    elif isinstance(cell, (datetime, date, time, timedelta)):
        parsed.bad[i] = Fault("number-turned-date", as_text(cell))
    else:
        parsed.bad[i] = Fault("number-not-a-number", as_text(cell))


def parse_names(cells: Sequence[Any], identifier: bool = True) -> Parsed:
    """A column of names or remarks, as text: "0012" and "NA" stay as they are.

    identifier : False for remarks and the like, where a date or a number is just written out
    """
    n = len(cells)
    kinds = set(map(type, cells))
    values = np.empty(n, object)
    parsed = Parsed(values)
    if kinds <= {str}:
        clean = {v: v.strip(SPACES) for v in set(cells)}
        tidy = all(k is v or k == v for k, v in clean.items())
        values[:] = cells if tidy else [clean[v] for v in cells]
        return parsed
    counts: dict[str, list[int]] = {}
    clean = {}
    for i, v in enumerate(cells):
        if type(v) is str:
            if v not in clean:
                clean[v] = v.strip(SPACES)
            values[i] = clean[v]
            continue
        values[i] = as_text(v)
        if isinstance(v, Marker):
            if v.kind == "padded":
                counts.setdefault("id-padded", []).append(i)
            elif v.kind in ("error", "uncalculated", "overlong"):
                parsed.bad[i] = Fault(MARKER_CODES[v.kind], v.text)
                values[i] = ""
            elif v.kind == "covered":
                values[i] = ""
        elif not identifier:
            continue
        elif isinstance(v, (bool, datetime, date, time, timedelta)):
            parsed.bad[i] = Fault("id-destroyed", as_text(v))
        elif isinstance(v, (int, float)):
            if float(v).is_integer() and abs(v) < 1e15:
                counts.setdefault("id-number", []).append(i)
            else:
                parsed.bad[i] = Fault("id-destroyed", as_text(v))
    for code, rows in counts.items():
        parsed.notes.append((code, rows[0], as_text(cells[rows[0]]), (("count", str(len(rows))),)))
    return parsed
