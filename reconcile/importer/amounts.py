"""Amounts as laboratories write them: a number, a number with its unit, "q.s. to 1 L", "10x", "to pH 7.4"."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from reconcile.importer.cells import Fault, Parsed, decimal_mark, number_of, parse_numbers, tidy_number
from reconcile.records.arrays import TextArray
from reconcile.records.units import UNITS, find_unit

_SPLIT = re.compile(r"([+-]?(?:\d[\d.,]*|[.,]\d+)(?:[eE][+-]?\d{1,3})?)\s*([^\d\s.,+-].*)", re.DOTALL)
_FILL = re.compile(
    r"(?:q\.?\s?s\.?(?:\s+(?:to|ad))?|ad|to|(?:make|made|bring|brought|top|topped) (?:up )?to|"
    r"(?:fill|filled|diluted?) (?:up )?to|up to|add to)\s*:?\s+(?=[\d.,])",
    re.IGNORECASE,
)
_ADDED = re.compile(r"added\s+to\s*:?\s+(?=[\d.,])", re.IGNORECASE)
_FILL_ONLY = re.compile(r"q\.?\s?s\.?(?:\s+(?:to|ad))?|to volume|to mark|balance|remainder|ad|fill up", re.IGNORECASE)
_ADJUST = re.compile(
    r"(?:as|if|when|where)\s+(?:needed|required|necessary)|to\s+(?:target\s+)?ph\b.*|q\.?\s?s\.?\s+(?:(?:to|ad)\s+)?ph\b.*|"
    r"adjust.*|ph\s*(?:to\s*)?[\d.,]+|titrate.*|drop\s?wise|a\.?r\.?|a\.\s?n\.|qs ph",
    re.IGNORECASE,
)
_DILUTED = re.compile(r"1\s*(in|\+)\s*(\d{1,4})", re.IGNORECASE)
"""A dilution that can mean one thing only: 1 in 10, 1 + 9; "1:10" may mean either of two."""
_STATED_PH = re.compile(r"ph\D{0,4}(\d[\d.,]*)", re.IGNORECASE)


@dataclass
class Amounts:
    """A column of amounts.

    parsed : numbers, with the cells that are none of the kinds below in `bad`
    units : TextArray (n,), canonical unit written in the cell itself, "" where none
    special : TextArray (n,), "adjust" (amount left to a pH, which is the number where it is said), "fill" (made up to
        this), "added" (added to this), or ""
    """

    parsed: Parsed
    units: TextArray
    special: TextArray


def parse_amounts(cells: Sequence[Any], decimal: str, text_is_usual: bool, added: bool = False) -> Amounts:
    """A column of amounts; see `Amounts`. added : "added to 1 L" is an answer here (what a solution is made up to)."""
    n = len(cells)
    units = np.full(n, "", object)
    special = np.full(n, "", object)
    if set(map(type, cells)) <= {float, int}:
        return Amounts(Parsed(np.array(cells, np.float64)), units, special)
    texts = {v for v in cells if type(v) is str}
    tidy = {t: tidy_number(t)[0] for t in texts}
    begun = {t: _begun(bare, added) for t, bare in tidy.items()}
    numbers = [m.group(1) if (m := _SPLIT.fullmatch(rest)) else rest for _, rest in begun.values()]
    mark = decimal_mark(numbers, decimal)
    own = {t: found for t, bare in tidy.items() if (found := _with_unit(t, bare, *begun[t], mark)) is not None}
    plain = ["" if type(v) is str and v in own else v for v in cells] if own else list(cells)
    parsed = parse_numbers(plain, decimal, text_is_usual, mark=mark)
    for i, v in enumerate(cells):
        if type(v) is not str or v not in own:
            continue
        found = own[v]
        if isinstance(found, Fault):
            parsed.bad[i] = found
        else:
            parsed.values[i], units[i], special[i] = found
    for i, fault in list(parsed.bad.items()):
        if fault.code == "number-not-a-number":
            parsed.bad[i] = Fault("amount-not-a-number", fault.read)
    return Amounts(parsed, units, special)


def _begun(bare: str, added: bool) -> tuple[str, str]:
    """What the words before a number say of it ("fill", "added" or nothing), and the rest."""
    for how, pattern in (("fill", _FILL), ("added", _ADDED)):
        match = pattern.match(bare) if how == "fill" or added else None
        if match is not None:
            return how, bare[match.end() :]
    return "", bare


def _with_unit(text: str, bare: str, how: str, rest: str, mark: str) -> Fault | tuple[float, str, str] | None:
    """(value, unit, special) of a text that is more than a number; None for anything that parse_numbers judges."""
    if _ADJUST.fullmatch(bare):
        stated = _STATED_PH.search(bare)
        number = number_of(stated.group(1).rstrip(".,"), mark) if stated else None
        return (number[0] if number else np.nan), "", "adjust"
    diluted = _DILUTED.fullmatch(bare)
    if diluted:
        return float(diluted.group(2)) + (diluted.group(1) == "+"), UNITS["x"].name, ""
    if _FILL_ONLY.fullmatch(bare):
        return np.nan, "", "fill"
    split = _SPLIT.fullmatch(rest)
    if split is None:
        number = number_of(rest, mark) if how else None
        return (number[0], "", how) if number else None
    unit = find_unit(split.group(2))
    number = number_of(split.group(1), mark)
    if unit is None:
        if number is not None and re.fullmatch(r"[^\W\d]{1,6}(?:/[^\W\d]{1,6})?|%\s*\S*", split.group(2).strip()):
            return Fault("unit-unknown", text)
        return None
    if number is None:
        return Fault("decimal-unclear" if "," in split.group(1) else "amount-not-a-number", text)
    return number[0], unit.name, how


def amount_words(value: float, unit: str) -> str:
    """An amount for a message: 25 mL."""
    return f"{value:.10g} {unit}" if unit else f"{value:.10g}"
