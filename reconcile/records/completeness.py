"""Whether so much of a record was set aside that the work, though done, is incomplete."""

from __future__ import annotations

from collections import Counter

from reconcile.records.book import BatchRecords

SHARE = 0.05
"""Share of the rows set aside above which a record is incomplete."""
LEAST_ROWS = 20
"""Rows from which on that share is judged."""
LEAST_OF_ONE = 3
"""Rows of one meter or one lot from which on the loss of all of them is judged."""


def shortfalls(records: BatchRecords) -> tuple[str, ...]:
    """What makes a record incomplete, a sentence each; empty for a complete one.

    Over 5 % of at least 20 rows set aside, or every row of a meter or of a lot (from 3 rows on). Summary rows do not
    count.
    """
    aside = [row for row in records.set_aside if not row.summary]
    rows = len(records.readings) + len(aside)
    found = []
    if rows >= LEAST_ROWS and len(aside) > SHARE * rows:
        found.append(f"{len(aside)} of {rows} rows were set aside, over {SHARE:.0%}.")
    used = {"meter": set(records.readings["meter"].tolist()), "lot": set(records.lots.name.tolist())}
    for subject in ("meter", "lot"):
        lost = Counter(name for row in aside if (name := getattr(row, subject)) and name not in used[subject])
        found += [
            f"Every row of {subject} {name} was set aside ({count} rows)."
            for name, count in sorted(lost.items())
            if count >= LEAST_OF_ONE
        ]
    return tuple(found)
