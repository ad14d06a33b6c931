"""The published standard buffers: pH(S) against temperature, built in as known solutions."""

from __future__ import annotations

import csv
import re
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from pathlib import Path

import numpy as np

from reconcile.records.arrays import FloatArray
from reconcile.records.substances import name_key

ALONE_C = 1.0
"""Where a buffer has a value at one temperature only, that value serves within this many kelvin of it."""


@dataclass(frozen=True)
class StandardBuffer:
    """One published standard buffer.

    temperature_c, ph, u : FloatArray (t,)   tabulated, ascending in temperature; u is a standard uncertainty [pH]
    sources : (t,)                           source of each value
    """

    name: str
    synonyms: tuple[str, ...]
    formula: str
    temperature_c: FloatArray
    ph: FloatArray
    u: FloatArray
    sources: tuple[str, ...]


@cache
def standards() -> Mapping[str, StandardBuffer]:
    """Every published standard buffer by name, as in standards.csv."""
    with (Path(__file__).parent / "standards.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    grouped: dict[str, list[dict[str, str]]] = {}
    for row in rows:
        grouped.setdefault(row["name"], []).append(row)
    return {
        name: StandardBuffer(
            name,
            tuple(some[0]["synonyms"].split("|")),
            some[0]["formula"],
            np.array([float(r["temperature_c"]) for r in some]),
            np.array([float(r["ph"]) for r in some]),
            np.array([float(r["u"]) for r in some]),
            tuple(r["source"] for r in some),
        )
        for name, some in grouped.items()
    }


def _bare(text: str) -> str:
    """A buffer's name as it is compared: without the words that only say that it is a buffer."""
    words = [w for w in re.sub(r"[(),;]", " ", name_key(text)).split() if w not in _SAYS_NOTHING]
    return " ".join(words)


_SAYS_NOTHING = {"buffer", "standard", "solution", "ph(s)", "nist", "nbs", "primary", "reference"}


@cache
def _names() -> Mapping[str, StandardBuffer]:
    return {_bare(text): s for s in standards().values() for text in (s.name, *s.synonyms, s.formula)}


def find_standard(name: str) -> StandardBuffer | None:
    """The standard buffer that a name, synonym or formula means, or None."""
    bare = _bare(name)
    return _names().get(bare) or _named_twice(bare)


def _named_twice(bare: str) -> StandardBuffer | None:
    """The buffer that both a name and a pH mean: "borax ph 9.18", "ph 6.86 phosphate"; None where they disagree."""
    words = bare.split()
    numbers = [w for w in words if re.fullmatch(r"\d{1,2}\.\d{1,3}", w)]
    rest = " ".join(w for w in words if w not in (*numbers, "ph"))
    if len(numbers) != 1 or not rest:
        return None
    by_ph, by_name = _names().get(f"ph {numbers[0]}"), _names().get(rest)
    if by_ph is None or by_name is None:
        return None
    return by_ph if by_ph.name.split()[0] == by_name.name.split()[0] else None


def standard_ph(name: str, temperature_c: float) -> tuple[float, float] | None:
    """pH(S) of a published standard buffer at a temperature, and its standard uncertainty.

    Parameters
    ----------
    name : str
        Name, synonym or formula, such as "phthalate" or "0.05 mol/kg potassium hydrogen phthalate".
    temperature_c : float
        Temperature [°C].

    Returns
    -------
    tuple of float, or None
        pH(S) and standard uncertainty [pH]; None for another name, or a temperature outside the table.

    Notes
    -----
    Cubic through the four tabulated temperatures around (fewer at hand: as many as there are): the tabulated values
    themselves are returned at their temperatures. Tables reach from 0 °C to 50 or 95 °C.

    References
    ----------
    Bates 1962, J. Res. NBS 66A:179; Staples and Bates 1969, J. Res. NBS 73A:37; source of each value in standards.csv.
    """
    buffer = find_standard(name)
    if buffer is None or not np.isfinite(temperature_c):
        return None
    t, ph = buffer.temperature_c, buffer.ph
    if len(t) == 1:
        return (float(ph[0]), float(buffer.u[0])) if abs(temperature_c - t[0]) <= ALONE_C else None
    if not t[0] <= temperature_c <= t[-1]:
        return None
    right = int(np.clip(np.searchsorted(t, temperature_c), 1, len(t) - 1))
    nodes = np.arange(max(0, min(right - 2, len(t) - 4)), min(len(t), max(right + 2, 4)))
    value = 0.0
    for i in nodes:
        others = nodes[nodes != i]
        value += float(ph[i] * np.prod((temperature_c - t[others]) / (t[i] - t[others])))
    return value, float(max(buffer.u[right - 1], buffer.u[right]))
