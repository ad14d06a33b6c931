"""What is noticed about the readings as a whole: doubles, names that look the same, stray dates, the display's grid."""

from __future__ import annotations

from collections.abc import Callable, Mapping

import numpy as np

from reconcile.importer.likeness import alike, doubles
from reconcile.records.arrays import AnyArray, FloatArray
from reconcile.records.places import Place
from reconcile.records.problems import Problem

_FAR = np.timedelta64(1400, "D")
"""The two ways of counting dates in spreadsheets lie 1462 days apart."""
_LEAST = 10
"""Readings of a meter from which on the grid that they lie on is taken for its display; common practice, no source."""


def notices(
    columns: Mapping[str, AnyArray], place_of: Callable[..., Place], lots: Mapping[str, Place]
) -> list[Problem]:
    """Notices about the readings; none of them leaves a row out.

    place_of : from a row, and a column where it is not the pH, to the cell
    """
    found = doubles(columns, place_of)
    for name in ("meter", "probe", "batch"):
        values = columns[name].tolist()
        where = dict(zip(reversed(values), range(len(values) - 1, -1, -1), strict=True))  # the first of each stays
        found += alike(list(where), name, lambda value, where=where, name=name: place_of(where[value], name))  # type: ignore[misc]
    found += alike(list(lots), "lot", lots.__getitem__)
    moments = columns["read_at"]
    dated = np.flatnonzero(~np.isnat(moments))
    if len(dated) >= 3:
        days = moments[dated].astype("datetime64[D]")
        middle = np.sort(days)[len(days) // 2]
        far = dated[np.abs(days - middle) > _FAR]
        if len(far):
            words = (("count", str(len(far))), ("name", "Read at"))
            found.append(Problem("date-far-off", place_of(int(far[0]), "read_at"), str(moments[far[0]]), words))
    return found


def of_temperatures(
    columns: Mapping[str, AnyArray], used: AnyArray, place_of: Callable[[int], Place], room_c: float
) -> list[Problem]:
    """Notices about used readings without a temperature, and about those stated at a reference temperature."""
    own, reference = (np.isfinite(columns[name]) for name in ("temperature", "reference_temperature"))
    found = []
    for code, rows in (("temperature-missing", ~own & ~reference & used), ("temperature-reference", reference & used)):
        if rows.any():
            words = (("count", str(int(rows.sum()))), ("temperature", f"{room_c:g}"))
            found.append(Problem(code, place_of(int(np.argmax(rows))), "", words))
    return found


def with_grid(columns: Mapping[str, AnyArray]) -> FloatArray:
    """Resolution of every reading [pH]; where unknown, the decimal grid on which all readings of its meter lie.

    A grid is taken only from 10 readings on, and never a grid of whole units.
    """
    resolution = np.array(columns["resolution"], np.float64)
    unknown = np.isnan(resolution) & ~np.isnan(columns["ph"])
    names, code = np.unique(columns["meter"].astype(str), return_inverse=True)
    for k in range(len(names)):
        mine = unknown & (code == k)
        values = columns["ph"][mine]
        if len(values) < _LEAST:
            continue
        for decimals in (0, 1, 2, 3):
            if np.all(np.abs(values * 10.0**decimals - np.round(values * 10.0**decimals)) < 1e-6):
                if decimals:
                    resolution[mine] = 10.0**-decimals
                break
    return resolution
