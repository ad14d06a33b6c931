"""Readings whose place inside or outside their limits hangs on a finding, with a guard band for the uncertainty."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from reconcile.records.arrays import BoolArray, FloatArray, IntArray
from reconcile.records.book import BatchRecords
from reconcile.records.results import COULD_ALSO_BE, Finding

READING_ERRORS = ("meter", "probe", "reading", "calibration", "buffer")
"""Subjects that make a reading wrong, so that its place against limits may change."""
EVERYWHERE = ("meter_offset", "meter_step")
"""Kinds that touch every reading of a meter alike, those that are no evidence too (adjusted, unbuffered)."""
GUARD = 1.645
"""Guard band over standard uncertainty: at most 5 % of decisions beyond it are wrong (JCGM 106:2012, 8.3)."""
MOST_NAMED = 6


Error = tuple[IntArray, FloatArray]
"""Readings (k,) that a fault makes wrong and by how much [pH] (k,)."""


def touched(records: BatchRecords, finding: Finding, error: Error) -> Error:
    """Readings that a finding makes wrong, and by how much [pH]; those that are no evidence included."""
    rows, shift = error
    if finding.kind not in EVERYWHERE or finding.estimate is None:
        return rows, shift
    table = records.readings
    mine = table["probe" if finding.subject_type == "probe" else "meter"] == finding.subject
    if finding.since is not None:
        mine &= ~np.isnat(table["read_at"]) & (table["read_at"] >= np.datetime64(finding.since, "s"))
    more = np.setdiff1d(np.flatnonzero(mine & np.isfinite(table["ph"])), rows)
    whole = np.concatenate([rows, more])
    order = np.argsort(whole, kind="stable")
    return whole[order], np.concatenate([shift, np.full(len(more), finding.estimate)])[order]


def places(
    value: FloatArray, low: FloatArray, high: FloatArray, guard: FloatArray | float
) -> tuple[BoolArray, BoolArray]:
    """(inside by more than the guard band, outside by more than it) of values against limits; NaN is no limit."""
    inside = ~((value < low + guard) | (value > high - guard))
    outside = (value < low - guard) | (value > high + guard)
    return np.asarray(inside, bool), np.asarray(outside, bool)


def impact_of(records: BatchRecords, finding: Finding, noise: FloatArray, error: Error) -> tuple[IntArray, IntArray]:
    """Readings whose place would change if a finding holds, and those for which it is not sure on which side they lie.

    Notes
    -----
    What a reading would have been is the reading less the error found. Its uncertainty is that of the error (a quarter
    of its 95 % interval) and the reading's own noise. A place changes where it lies beyond the limit by more than the
    guard band; within the band it is left open. A lead, never a replacement result.

    References
    ----------
    JCGM 106:2012, 8.3 (guard bands).
    """
    nothing = np.zeros(0, np.intp)
    if finding.subject_type not in READING_ERRORS:
        return nothing, nothing
    rows, shift = touched(records, finding, error)
    table = records.readings
    low, high, observed = table["low_limit"][rows], table["high_limit"][rows], table["ph"][rows]
    relative = 0.0
    if finding.interval95 is not None and finding.estimate:
        relative = (finding.interval95[1] - finding.interval95[0]) / 3.92 / abs(finding.estimate)
    guard = GUARD * np.sqrt((relative * shift) ** 2 + noise[rows] ** 2)
    was_inside, was_outside = places(observed, low, high, 0.0)
    inside, outside = places(observed - shift, low, high, guard)
    limited = (np.isfinite(low) | np.isfinite(high)) & np.isfinite(shift) & (shift != 0.0)
    changed = limited & ((was_inside & outside) | (was_outside & inside))
    unsure = limited & ~inside & ~outside
    return rows[changed], rows[unsure]


def with_impact(
    records: BatchRecords, findings: Sequence[Finding], noise: FloatArray, errors: Sequence[Error]
) -> list[Finding]:
    """Findings with the readings whose place against their limits hangs on them, and words for them.

    errors : what each finding makes of the readings themselves; a residual may move where its reading is right
    """
    out = []
    for finding, error in zip(findings, errors, strict=True):
        changed, unsure = impact_of(records, finding, noise, error)
        said, rivals, named = finding.text.partition(f" {COULD_ALSO_BE}")
        text = f"{said}{_words(records, changed, unsure)}{rivals}{named}"
        out.append(replace(finding, impact=changed, impact_open=unsure, text=text))
    return out


def _words(records: BatchRecords, changed: IntArray, unsure: IntArray) -> str:
    """A sentence, with a space before it; "" where nothing hangs on the finding."""
    said = []
    if len(changed):
        said.append(f"{_of_batches(records, changed)} would change place against the limits")
    if len(unsure):
        said.append(f"{_of_batches(records, unsure)} would lie too near to a limit to say")
    return f" If this holds, {'; '.join(said)}." if said else ""


def _of_batches(records: BatchRecords, rows: IntArray) -> str:
    table = records.readings
    named = np.where(table["batch"] == "", table["known"], table["batch"])[rows].tolist()
    names = list(dict.fromkeys(str(name) for name in named))
    more = f" and {len(names) - MOST_NAMED} more" if len(names) > MOST_NAMED else ""
    return f"{len(rows)} reading{'s' * (len(rows) != 1)} of {', '.join(names[:MOST_NAMED])}{more}"
