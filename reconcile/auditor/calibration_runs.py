"""Calibrations of each meter and probe in order of time, parted where something was done to them."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from reconcile.auditor.layout import DAY
from reconcile.records.arrays import FloatArray, IntArray, TextArray, TimeArray
from reconcile.records.book import BatchRecords, Table


@dataclass(frozen=True)
class Run:
    """Calibrations of one meter or probe between two events.

    probe : the one in use, "" where none is named; begun_by : what began the run, "" for the first
    rows : IntArray (m,) rows of the calibrations table, in order of time; day : FloatArray (m,) [d] since 1970
    latest : nothing has been done since that would end it
    """

    subject: str
    subject_type: str
    probe: str
    begun_by: str
    rows: IntArray
    day: FloatArray
    latest: bool


def days_of(at: TimeArray) -> FloatArray:
    """Times as days since 1970; NaN where missing."""
    seconds = at.astype("datetime64[s]")
    return np.where(np.isnat(seconds), np.nan, seconds.astype(np.int64) / DAY)


def time_of(day: float) -> np.datetime64:
    """A day since 1970 as a time, to the minute; NaT for NaN."""
    if not np.isfinite(day):
        return np.datetime64("NaT", "s")
    return np.datetime64(round(day * 1440) * 60, "s")


def _texts(table: Table, name: str) -> TextArray:
    return np.array([str(v) for v in table[name]], object)


def runs(records: BatchRecords) -> list[Run]:
    """Every run of dated calibrations: of each meter, then of each probe that was calibrated on several meters."""
    table = records.calibrations
    if not len(table):
        return []
    meter, probe, day = _texts(table, "meter"), _texts(table, "probe"), days_of(table["calibrated_at"])
    found: list[Run] = []
    for name in sorted(set(meter.tolist()) - {""}):
        found += _parted(records, name, "meter", np.flatnonzero((meter == name) & np.isfinite(day)), day, probe)
    for name in sorted(set(probe.tolist()) - {""}):
        rows = np.flatnonzero((probe == name) & np.isfinite(day))
        if len(set(meter[rows].tolist())) > 1:
            found += _parted(records, name, "probe", rows, day, probe)
    return found


def _parted(
    records: BatchRecords, subject: str, subject_type: str, rows: IntArray, day: FloatArray, probe: TextArray
) -> Iterator[Run]:
    if not len(rows):
        return
    rows = rows[np.argsort(day[rows], kind="stable")]
    done = _events(records, subject, subject_type)
    first, begun = 0, ""
    for i in range(1, len(rows) + 1):
        before = rows[i - 1]
        last = i == len(rows)
        until = np.inf if last else day[rows[i]]
        why = [what for at, on, what in done if day[before] < at <= until and on in ("", probe[before])]
        changed = not last and probe[rows[i]] != probe[before] and probe[rows[i]] != ""
        if changed and probe[before] and not why:
            why = [f"probe {probe[rows[i]]} in place of {probe[before]}"]
        if why or last:
            own = rows[first:i]
            named = [str(p) for p in probe[own] if p]
            yield Run(subject, subject_type, named[-1] if named else "", begun, own, day[own], last and not why)
            first, begun = i, "; ".join(why)


def _events(records: BatchRecords, subject: str, subject_type: str) -> list[tuple[float, str, str]]:
    """(day, probe concerned or "" for any, what was done) of every dated event that may concern a subject."""
    events = records.events
    if not len(events):
        return []
    found = []
    for at, meter, probe, what in zip(
        days_of(events["at"]), _texts(events, "meter"), _texts(events, "probe"), _texts(events, "what"), strict=True
    ):
        mine = subject in (meter, probe) if subject_type == "meter" else subject == probe
        if np.isfinite(at) and subject_type == "meter" and not meter and probe:
            found.append((float(at), str(probe), str(what)))
        elif np.isfinite(at) and mine:
            found.append((float(at), "", str(what)))
    return sorted(found)
