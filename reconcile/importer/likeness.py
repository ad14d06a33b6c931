"""Names that may be one, and readings that stand twice: noticed, never merged."""

from __future__ import annotations

import unicodedata
from collections import Counter
from collections.abc import Mapping, Sequence

import numpy as np

from reconcile.records.arrays import AnyArray
from reconcile.records.places import Place
from reconcile.records.problems import Problem, shown

_LOOKS = str.maketrans(
    {"o": "0", "l": "1", "i": "1", "|": "1", "а": "a", "в": "b", "е": "e", "к": "k", "м": "m", "н": "h", "о": "0",
     "р": "p", "с": "c", "т": "t", "х": "x", "у": "y", "α": "a", "β": "b", "ο": "0", "ρ": "p"}
)  # fmt: skip
_MOST = 20


def looks(name: str) -> str:
    """A name as the eye takes it: case, spaces, dashes, leading zeros and look-alike letters made the same."""
    text = unicodedata.normalize("NFKC", name).casefold().translate(_LOOKS)
    bare = "".join(c for c in text if c.isalnum())
    return bare.lstrip("0") or bare


def alike(names: Sequence[str], what: str, where: Mapping[str, Place]) -> list[Problem]:
    """A notice for every two names of one kind that look the same, the first 20 of them."""
    by_look: dict[str, list[str]] = {}
    for name in sorted(set(names) - {""}):
        by_look.setdefault(looks(name), []).append(name)
    found = []
    for same in by_look.values():
        for other in same[1:]:
            words = (("name", what), ("other", shown(other)))
            found.append(Problem("names-alike", where.get(other, Place("")), same[0], words))
    return found[:_MOST]


def doubles(columns: Mapping[str, AnyArray], place_of: Sequence[Place]) -> list[Problem]:
    """Notices about rows that repeat another in every column, and about two readings of one moment on one meter."""
    found = []
    n = len(columns["ph"])
    names = [c for c in columns if c not in ("resolution",)]
    whole = Counter[tuple[object, ...]]()
    first: dict[tuple[object, ...], int] = {}
    keys = list(zip(*(_plain(columns[c]) for c in names), strict=True))
    for i, key in enumerate(keys):
        whole[key] += 1
        first.setdefault(key, i)
    repeats = [(key, count) for key, count in whole.items() if count > 1]
    if repeats:
        second = _second(keys, {key for key, _ in repeats})
        count = sum(c - 1 for _, c in repeats)
        found.append(Problem("duplicate-row", place_of[second], words=(("count", str(count)),)))
    dated = ~np.isnat(columns["read_at"]) & (columns["batch"] != "") & (columns["meter"] != "")
    seen: dict[tuple[object, ...], float] = {}
    clashes = []
    moments = columns["read_at"].astype(np.int64)
    for i in np.flatnonzero(dated).tolist():
        key = (columns["batch"][i], columns["meter"][i], moments[i], columns["repeat"][i], columns["stage"][i])
        if key in seen and seen[key] != columns["ph"][i]:
            clashes.append(i)
        seen.setdefault(key, float(columns["ph"][i]))
    if clashes:
        found.append(Problem("same-moment", place_of[clashes[0]], words=(("count", str(len(clashes))),)))
    return found if n else []


def _plain(values: AnyArray) -> list[object]:
    """Values that compare equal when they are: NaN and NaT as None."""
    if values.dtype.kind == "f":
        return [None if v != v else v for v in values.tolist()]
    return [None if v is None else v for v in values.tolist()]


def _second(keys: Sequence[tuple[object, ...]], repeated: set[tuple[object, ...]]) -> int:
    seen = set()
    for i, key in enumerate(keys):
        if key in repeated:
            if key in seen:
                return i
            seen.add(key)
    return 0
