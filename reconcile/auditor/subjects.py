"""Who and what a reading rests on, by name: solution, kind of solution, calibration session."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

import numpy as np

from reconcile.records.arrays import IntArray, TextArray, TimeArray
from reconcile.records.book import BatchRecords


def codes(values: Iterable[object]) -> tuple[IntArray, tuple[str, ...]]:
    """Index of each value among the sorted distinct ones; -1 for an empty text."""
    texts = [str(v) for v in values]
    names = sorted({v for v in texts if v})
    index = {name: i for i, name in enumerate(names)}
    return np.array([index.get(v, -1) for v in texts], np.intp), tuple(names)


def solution_names(records: BatchRecords) -> TextArray:
    """Batch or known solution that each reading was taken on; the series where neither is named."""
    readings = records.readings
    named = np.where(readings["batch"] == "", readings["known"], readings["batch"])
    return np.where(named == "", records.solutions.batch[records.readings_solution], named)


def family_names(records: BatchRecords) -> list[str]:
    """Kind of each solution: the acids in it, in alphabetical order; "no weak acid" where there is none."""
    acids: list[set[str]] = [set() for _ in range(len(records.solutions))]
    forms = records.forms
    for solution, form in zip(records.solutions.solution.tolist(), records.solutions.form.tolist(), strict=True):
        acids[solution].update(forms[form].acids)
    return [
        "known solution" if np.isfinite(known) else (" + ".join(sorted(found)) or "no weak acid")
        for found, known in zip(acids, records.solutions.known_ph, strict=True)
    ]


def sessions_of(
    records: BatchRecords, meters: Sequence[str], meter: IntArray, rows: IntArray
) -> tuple[IntArray, tuple[str, ...]]:
    """Calibration session of each reading; the meter's day where no calibration of the meter is recorded before it.

    A calibration that names a probe begins a session for that probe alone, where the reading names its probe too. A
    logged event of the meter or of the probe (replaced, cleaned, dropped) ends a session.
    """
    at = records.readings["read_at"][rows]
    probe = records.readings["probe"][rows]
    days = at.astype("datetime64[D]").astype(str)
    labels = [f"{meters[m]} {t}" if m >= 0 and t != "NaT" else "" for m, t in zip(meter, days, strict=True)]
    table = records.calibrations
    if not len(table):
        return codes(labels)
    named, with_probe = np.array([str(m) for m in table["meter"]], object), table["probe"]
    for index, name in enumerate(meters):
        dated = (named == name) & ~np.isnat(table["calibrated_at"])
        mine = np.flatnonzero((meter == index) & ~np.isnat(at)) if dated.any() else np.zeros(0, np.intp)
        for own in sorted(set(probe[mine].tolist())):
            fits = dated & ((with_probe == own) | (with_probe == "")) if own else dated
            calibrated = np.sort(table["calibrated_at"][fits])
            broken = np.sort(_events_of(records, name, own))
            some = mine[probe[mine] == own]
            sessions = np.searchsorted(calibrated, at[some], side="right")
            events = np.searchsorted(broken, at[some], side="right")
            for row, session, event in zip(some, sessions, events, strict=True):
                if session:
                    labels[row] = f"{name} calibrated {calibrated[session - 1]}"
                    if event and broken[event - 1] > calibrated[session - 1]:
                        labels[row] += f", event {broken[event - 1]}"
    return codes(labels)


def _events_of(records: BatchRecords, meter: str, probe: str) -> TimeArray:
    """When something was done to a meter or to the probe that it was read with."""
    table = records.events
    if not len(table):
        return np.zeros(0, "datetime64[s]")
    mine = ((table["meter"] == meter) & (table["probe"] == "")) | ((table["probe"] == probe) & (probe != ""))
    at: TimeArray = table["at"][mine & ~np.isnat(table["at"])]
    return at
