"""One reading that was mistyped: transposed digits, a moved decimal point, another batch's value, or unexplained."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
from scipy import sparse

from reconcile.auditor.layout import Layout
from reconcile.auditor.proposals import Context, Proposal, Told, linear, stack

ROOM = 3.0
"""Score from which the entries that a reading may have stood for are tried."""
ANY_SIZE, UNEXPLAINED = 1.0, -1.0
"""Usual size of a slip of unknown origin [pH], and its log prior odds to one of a known sort."""


def transpositions(text: str) -> list[float]:
    """Values that a swap of two neighbouring digits (over a decimal point too) could have come from."""
    digits = [i for i, c in enumerate(text) if c.isdigit()]
    found = []
    for left, right in pairwise(digits):
        if text[left] != text[right]:
            swapped = list(text)
            swapped[left], swapped[right] = text[right], text[left]
            found.append(float("".join(swapped)))
    return found


def written(layout: Layout, row: int) -> str:
    """The reading as displayed, with the decimals of its display where they are known."""
    resolution = layout.resolution[row]
    decimals = int(np.clip(round(-np.log10(resolution)), 0, 4)) if np.isfinite(resolution) and resolution > 0 else 2
    return f"{layout.observed[row]:.{decimals}f}"


def values_meant(layout: Layout, row: int) -> list[tuple[float, str]]:
    """Entries that are one slip of the pen away from a reading, with the slip's name."""
    target = float(layout.observed[row])
    meant = [(value, "transposed digits") for value in transpositions(written(layout, row))]
    return [*meant, (target * 10.0, "decimal point"), (target / 10.0, "decimal point")]


def borrowed_from(layout: Layout, row: int) -> dict[str, object] | None:
    """Another batch that the same meter read on the same day with the very same value."""
    neighbours = np.flatnonzero((layout.meter == layout.meter[row]) & (layout.batch != layout.batch[row]))
    for other in neighbours[np.abs(layout.day[neighbours] - layout.day[row]) < 1.0].tolist():
        if written(layout, other) == written(layout, row):
            return {"pH": None, "slip": "another batch's value", "batch": layout.batches[layout.batch[other]]}
    return None


def subject_of(layout: Layout, row: int) -> tuple[str, str, str]:
    """Batch, meter and row of one reading."""
    meter = layout.meters[layout.meter[row]] if layout.meter[row] >= 0 else ""
    return layout.batches[layout.batch[row]], meter, str(layout.records.readings.row[layout.reading[row]])


class ReadingSlip:
    """A slip of any size, unexplained unless another batch of that day has the very same value."""

    name, alarm_class = "reading_slip", "reading"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        n = len(layout)
        x = context.kept(self.name, lambda: sparse.csc_array(sparse.eye_array(n)))
        rows = np.arange(n)
        if context.model.long:
            rows = context.promising(x, 0.0, steady=True)
            x = sparse.csc_array(x[:, rows])

        def tell(k: int, a: float) -> Told:
            meant = borrowed_from(layout, int(rows[k]))
            return Told(a, "pH", meant, detail="" if meant is None else str(meant["slip"]))

        return linear(
            self.name,
            self.alarm_class,
            "reading",
            x,
            [subject_of(layout, i) for i in rows.tolist()],
            tell,
            prior_sd=ANY_SIZE,
            block=[str(i) for i in layout.reading[rows].tolist()],
            log_prior=np.full(len(rows), UNEXPLAINED),
            blocks=n,
        )


class MistypedValue:
    """A slip whose intended entry is known but for chance: transposed digits, a moved decimal point."""

    name, alarm_class = "reading_slip", "reading"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        n = len(layout)
        unit = context.kept(ReadingSlip.name, lambda: sparse.csc_array(sparse.eye_array(n)))
        rows = context.promising(unit, ROOM, steady=True)
        meant = [(row, *value) for row in rows.tolist() for value in values_meant(layout, row)]
        if not meant:
            return None
        count = np.bincount([row for row, *_ in meant], minlength=n)

        def tell(k: int, a: float) -> Told:
            row, value, how = meant[k]
            size = float(layout.observed[row]) - value
            return Told(size, "pH", {"pH": round(value, 4), "slip": how}, detail=how)

        k = len(meant)
        of = np.array([row for row, *_ in meant], np.intp)
        shift = layout.observed[of] - np.array([value for _, value, _ in meant])
        return Proposal(
            self.name,
            self.alarm_class,
            "reading",
            stack([(of[[i]], shift[[i]]) for i in range(k)], n),
            [subject_of(layout, row) for row in of.tolist()],
            [str(i) for i in layout.reading[of].tolist()],
            np.ones(k),
            -np.log(count[of]),
            np.ones(k, bool),
            tell,
            blocks=n,
        )


KIND = ReadingSlip()
KIND_OF_VALUES = MistypedValue()
