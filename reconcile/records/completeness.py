"""Whether so much of a record was set aside that the work, though done, is incomplete."""

from __future__ import annotations

from collections import Counter

from reconcile.records.book import BatchRecords, SetAside

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
    substances = {form.name for form in records.forms}
    meters = set(records.readings["meter"].tolist())
    lots = {_as_written(str(name), substances) for name in records.lots.name}
    for subject, lost in (
        ("meter", Counter(row.meter for row in aside if row.meter and row.meter not in meters)),
        ("lot", Counter(lot for row in aside for lot in _lots(row) if lot not in lots)),
    ):
        found += [
            f"Every row of {subject} {name} was set aside ({count} rows)."
            for name, count in sorted(lost.items())
            if count >= LEAST_OF_ONE
        ]
    return tuple(found)


def _lots(row: SetAside) -> set[str]:
    """Lots that a row set aside names; several are joined by a semicolon."""
    return {lot for lot in row.lot.split("; ") if lot}


def _as_written(lot: str, substances: set[str]) -> str:
    """A lot's name without the substance added where one name stands for two bottles."""
    name, bracket, substance = lot.rpartition(" (")
    return name if bracket and substance.removesuffix(")") in substances else lot
