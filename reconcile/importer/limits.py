"""Limits written in one cell: "4.5 - 4.8", "4.7 ± 0.1", "not less than 4.5"."""

from __future__ import annotations

import re

import numpy as np

from reconcile.importer.cells import decimal_mark, number_of
from reconcile.records.arrays import FloatArray

_N = r"(\d+(?:[.,]\d+)?)"
_BETWEEN = re.compile(rf"(?:between\s+)?{_N}\s*(?:-|–|—|to|and|\.\.\.?|…)\s*{_N}")
_ABOUT = re.compile(rf"{_N}\s*(?:±|\+\s*/?\s*-)\s*{_N}")
_LEAST = re.compile(rf"(?:≥|>=|=>|>|nlt|not less than|at least|min\.?|minimum|from)\s*{_N}")
_MOST = re.compile(rf"(?:≤|<=|=<|<|nmt|not more than|at most|max\.?|maximum|up to)\s*{_N}")
_PH = re.compile(r"^\s*ph\b\s*[:=]?\s*|\s*ph\s*$|\s*units?\s*$")


def limits_of(text: str, decimal: str) -> tuple[float, float] | None:
    """Low and high limit [pH] that one cell states, NaN for one that it leaves open; None where it states none.

    decimal : "auto", "." or ","
    """
    bare = " ".join(text.casefold().replace("\u2212", "-").split())
    bare = _PH.sub("", _PH.sub("", bare)).strip("()[] ")
    mark = decimal_mark(re.findall(r"\d+[.,]\d+", bare), decimal)

    def numbers(pattern: re.Pattern[str]) -> list[float] | None:
        match = pattern.fullmatch(bare)
        found = [number_of(part, mark) for part in match.groups()] if match else [None]
        return [n[0] for n in found if n is not None] if None not in found else None

    if (pair := numbers(_BETWEEN)) is not None:
        return (pair[0], pair[1]) if pair[0] <= pair[1] else None
    if (pair := numbers(_ABOUT)) is not None:
        return round(pair[0] - pair[1], 10), round(pair[0] + pair[1], 10)
    if (one := numbers(_LEAST)) is not None:
        return one[0], float("nan")
    if (one := numbers(_MOST)) is not None:
        return float("nan"), one[0]
    return None


def fill_limits(texts: list[str], low: FloatArray, high: FloatArray, decimal: str) -> list[int]:
    """Fill limits that have no cell of their own, in place; the rows whose text states none that could be read."""
    known = {text: limits_of(text, decimal) for text in set(texts) if text}
    bad = []
    for i, text in enumerate(texts):
        if not text:
            continue
        found = known[text]
        if found is None or any(not np.isnan(x) and not -2.0 <= x <= 16.0 for x in found):
            bad.append(i)
            continue
        low[i] = found[0] if np.isnan(low[i]) else low[i]
        high[i] = found[1] if np.isnan(high[i]) else high[i]
    return bad
