"""Names that may be one, and readings that stand twice: noticed, never merged."""

from __future__ import annotations

import unicodedata
from collections.abc import Callable, Mapping, Sequence

import numpy as np

from reconcile.records.arrays import AnyArray
from reconcile.records.places import Place
from reconcile.records.problems import Problem, shown

_LOOKS = str.maketrans(
    {"o": "0", "l": "1", "i": "1", "|": "1", "а": "a", "в": "b", "е": "e", "к": "k", "м": "m", "н": "h", "о": "0",
     "р": "p", "с": "c", "т": "t", "х": "x", "у": "y", "α": "a", "β": "b", "ο": "0", "ρ": "p"}
)  # fmt: skip
_PLAIN_LOOKS: dict[int, int | str | None] = {
    c: _LOOKS.get(c, c) for c in map(ord, "abcdefghijklmnopqrstuvwxyz0123456789")
}
_PLAIN_LOOKS |= {c: None for c in range(128) if c not in _PLAIN_LOOKS}
_MOST = 20


def looks(name: str) -> str:
    """A name as the eye takes it: case, spaces, dashes, leading zeros and look-alike letters made the same."""
    if name.isascii():
        bare = name.lower().translate(_PLAIN_LOOKS)
    else:
        text = unicodedata.normalize("NFKC", name).casefold().translate(_LOOKS)
        bare = "".join(c for c in text if c.isalnum())
    return bare.lstrip("0") or bare


def alike(names: Sequence[str], what: str, where: Callable[[str], Place]) -> list[Problem]:
    """A notice for every two names of one kind that look the same, the first 20 of them."""
    by_look: dict[str, list[str]] = {}
    for name in sorted(set(names) - {""}):
        by_look.setdefault(looks(name), []).append(name)
    found = []
    for same in by_look.values():
        for other in same[1:]:
            words = (("name", what), ("other", shown(other)))
            found.append(Problem("names-alike", where(other), same[0], words))
    return found[:_MOST]


def doubles(columns: Mapping[str, AnyArray], place_of: Callable[[int], Place]) -> list[Problem]:
    """Notices about rows that repeat another in every column, and about two readings of one moment on one meter."""
    found = []
    ph, batch, meter, stage, repeat = (columns[c].tolist() for c in ("ph", "batch", "meter", "stage", "repeat"))
    moment = columns["read_at"].astype(np.int64).tolist()
    first: dict[tuple[object, ...], int] = {}
    again: list[int] = []  # rows whose batch, meter, moment, stage and repeat stood before
    for i in _not_alone(columns["read_at"]):
        if first.setdefault((batch[i], meter[i], moment[i], stage[i], repeat[i]), i) != i:
            again.append(i)
    if not again:
        return []
    same_key = {(batch[i], meter[i], moment[i], stage[i], repeat[i]) for i in again}
    keys = zip(batch, meter, moment, stage, repeat, strict=True)
    rows = [i for i, key in enumerate(keys) if key in same_key]
    whole: dict[tuple[object, ...], int] = {}
    identical = []
    sub = {c: _plain(v[rows]) for c, v in columns.items() if c != "resolution"}
    for i, content in zip(rows, zip(*sub.values(), strict=True), strict=True):
        if whole.setdefault(content, i) != i:
            identical.append(i)
    if identical:
        words = (("count", str(len(identical))),)
        found.append(Problem("duplicate-row", place_of(identical[0]), words=words))
    undated = np.iinfo(np.int64).min
    clashes = []
    for i in again:
        j = first[batch[i], meter[i], moment[i], stage[i], repeat[i]]
        if moment[i] != undated and batch[i] and meter[i] and ph[i] == ph[i] and ph[j] == ph[j] and ph[i] != ph[j]:
            clashes.append(i)
    if clashes:
        found.append(Problem("same-moment", place_of(clashes[0]), words=(("count", str(len(clashes))),)))
    return found


def _not_alone(moments: AnyArray) -> list[int]:
    """Rows whose moment, or lack of one, occurs more than once."""
    ticks = moments.astype(np.int64)
    ordered = np.sort(ticks)
    twice = np.unique(ordered[1:][ordered[1:] == ordered[:-1]])
    return np.flatnonzero(np.isin(ticks, twice)).tolist() if len(twice) else []


def _plain(values: AnyArray) -> list[object]:
    """Values that compare equal when they are: NaN and NaT as None."""
    if values.dtype.kind == "f":
        return [None if v != v else v for v in values.tolist()]
    return [None if v is None else v for v in values.tolist()]
