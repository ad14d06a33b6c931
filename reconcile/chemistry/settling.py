"""Which reading, or which stated pH, settles each amount that a record leaves open."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from reconcile.records.arrays import BoolArray, IntArray
from reconcile.records.book import BatchRecords
from reconcile.records.columns import heading_key
from reconcile.records.stages import FINAL, IN_PROCESS, rank_of

_LAST = np.datetime64("9999-12-31", "s")


@dataclass(frozen=True)
class Job:
    """Open amounts of which one is settled by one pH.

    opens : alternatives, in the order of the recipe; reading : that settles them, -1 for a stated pH
    needs : open amounts that have to be known before
    """

    opens: tuple[int, ...]
    reading: int
    needs: frozenset[int]


def own_opens(records: BatchRecords) -> dict[int, frozenset[int]]:
    """Solution -> the open amounts of its own recipe (not those of stocks that it was made from)."""
    opens, solutions = records.open_amounts, records.solutions
    found: dict[int, set[int]] = {}
    for c, k in zip(opens.contribution.tolist(), opens.owner.tolist(), strict=True):
        s = int(solutions.solution[c])
        if opens.batch[k] and opens.batch[k] == solutions.batch[s]:
            found.setdefault(s, set()).add(k)
    return {s: frozenset(some) for s, some in found.items()}


def all_opens(records: BatchRecords) -> dict[int, frozenset[int]]:
    """Solution -> every open amount that it holds."""
    found: dict[int, set[int]] = {}
    opens = records.open_amounts
    for c, k in zip(opens.contribution.tolist(), opens.owner.tolist(), strict=True):
        found.setdefault(int(records.solutions.solution[c]), set()).add(k)
    return {s: frozenset(some) for s, some in found.items()}


def _order(records: BatchRecords, rows: list[int]) -> list[int]:
    """Readings in order of time, undated last, originals before retests, else as in the file."""
    at, standing = records.readings["read_at"], records.readings["standing"]
    return sorted(rows, key=lambda i: (standing[i] == "retest", _LAST if np.isnat(at[i]) else at[i], i))


def same_sitting(records: BatchRecords, one: int, other: int) -> bool:
    """Whether two readings were taken on one meter on one day, as far as the record says."""
    table = records.readings
    if table["meter"][one] != table["meter"][other]:
        return False
    a, b = table["read_at"][one], table["read_at"][other]
    return bool(np.isnat(a) or np.isnat(b) or a.astype("datetime64[D]") == b.astype("datetime64[D]"))


def jobs_of(records: BatchRecords) -> list[Job]:
    """Every open amount that a pH settles, with that pH.

    A batch is settled by its first reading that holds the titrant: by the last one of that sitting, since solutions are
    read while they are adjusted. A titrant of a later step is settled by the first reading of that later stage, and a
    reading whose stage bears the step's own name goes before others; one in process, or after sterilising, after them.
    """
    opens = records.open_amounts
    own, inside = own_opens(records), all_opens(records)
    ph, standing = records.readings["ph"], records.readings["standing"]
    usable = np.isfinite(ph) & (standing != "void")
    by_batch: dict[str, list[int]] = {}
    for i, s in enumerate(records.readings_solution.tolist()):
        if usable[i] and s in own:
            by_batch.setdefault(records.solutions.batch[s], []).append(i)
    jobs: list[Job] = []
    settled: set[int] = set()
    for batch in sorted(by_batch):
        rows = _order(records, by_batch[batch])
        solution = {i: int(records.readings_solution[i]) for i in rows}
        for some in sorted({own[s] for s in solution.values()}, key=lambda x: (len(x), sorted(x))):
            new = tuple(sorted(some - settled))
            if not new:
                continue
            holding = [i for i in rows if own[solution[i]] == some]
            steps = {heading_key(str(opens.step[k])) for k in new} - {""}
            named = [i for i in holding if heading_key(str(records.readings["stage"][i])) in steps]
            done = named or [i for i in holding if not _in_process(records, i)] or holding
            sitting = [i for i in done if same_sitting(records, done[0], i)]
            reading = ([i for i in sitting if not _later(records, i)] or sitting)[-1]
            settled.update(new)
            jobs.append(Job(new, reading, inside[solution[reading]] - set(new)))
    stated = [k for k in range(len(opens)) if k not in settled and np.isfinite(opens.stated_ph[k])]
    choices: dict[int, list[int]] = {}
    for k in stated:
        choices.setdefault(int(opens.choice[k]), []).append(k)
    for some_k in choices.values():
        parts = np.isin(opens.part_owner, some_k)
        if parts.any():
            needs = {int(k) for k in opens.part_open[parts] if k >= 0}
            jobs.append(Job(tuple(some_k), -1, frozenset(needs - set(some_k))))
    return jobs


def anchors(records: BatchRecords, jobs: list[Job]) -> tuple[IntArray, BoolArray]:
    """For every reading the one that its solution was adjusted by (-1: none), and whether it says only that.

    A solution adjusted in several steps follows the last of them. What was read in process, where no step is called
    that, may have been read before the last drop.
    """
    n = len(records.readings)
    anchor, adjusted = np.full(n, -1, np.intp), np.zeros(n, bool)
    own = own_opens(records)
    settled_by = {k: job.reading for job in jobs if job.reading >= 0 for k in job.opens}
    last = {
        s: max((settled_by[k] for k in some if k in settled_by), key=lambda i: _moment(records, i), default=-1)
        for s, some in own.items()
    }
    for i, s in enumerate(records.readings_solution.tolist()):
        if last.get(s, -1) >= 0:
            anchor[i] = last[s]
            steps = {heading_key(str(records.open_amounts.step[k])) for k in own[s]}
            before = _in_process(records, i) and heading_key(str(records.readings["stage"][i])) not in steps
            adjusted[i] = before or (same_sitting(records, last[s], i) and not _later(records, i))
    return anchor, adjusted


def _in_process(records: BatchRecords, reading: int) -> bool:
    """Whether a reading is of a stage that may come before the last drop of titrant."""
    return rank_of(str(records.readings["stage"][reading])) == IN_PROCESS


def _later(records: BatchRecords, reading: int) -> bool:
    """Whether a reading is of a stage at which adjusting is long over, such as after sterilising."""
    return (rank_of(str(records.readings["stage"][reading])) or 0) > FINAL


def _moment(records: BatchRecords, reading: int) -> tuple[np.datetime64, int]:
    at = records.readings["read_at"][reading]
    return (np.datetime64("0001-01-01", "s") if np.isnat(at) else at, reading)
