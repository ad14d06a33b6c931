"""One reading that was mistyped: transposed digits, a moved decimal point, another batch's value, or unexplained."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
from scipy import sparse

from reconcile.auditor.layout import Layout
from reconcile.auditor.proposals import Context, Proposal, Told, linear


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


def intended(layout: Layout, row: int, spread: float) -> dict[str, object] | None:
    """The entry that a slip may have stood for: what fits the prediction within `spread` [pH], nearest first."""
    text, target, expected = written(layout, row), float(layout.observed[row]), float(layout.ph[row])
    choices = [(value, "transposed digits") for value in transpositions(text)]
    choices += [(target * 10.0, "decimal point"), (target / 10.0, "decimal point")]
    fitting = [(abs(value - expected), value, how) for value, how in choices if abs(value - expected) <= spread]
    if fitting:
        _, value, how = min(fitting)
        return {"pH": round(value, 4), "slip": how}
    neighbours = np.flatnonzero((layout.meter == layout.meter[row]) & (layout.batch != layout.batch[row]))
    same_day = neighbours[np.abs(layout.day[neighbours] - layout.day[row]) < 1.0]
    for other in same_day:
        if written(layout, int(other)) == text:
            return {"pH": None, "slip": "another batch's value", "batch": layout.batches[layout.batch[other]]}
    return None


class ReadingSlip:
    name, alarm_class = "reading_slip", "reading"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        n = len(layout)
        records = layout.records
        x = context.kept(self.name, lambda: sparse.csc_array(sparse.eye_array(n)))
        rows = np.arange(n)
        if context.model.long:
            rows = context.promising(x, 0.0, steady=True)
            x = sparse.csc_array(x[:, rows])
        subject = [
            (
                layout.batches[layout.batch[i]],
                layout.meters[layout.meter[i]] if layout.meter[i] >= 0 else "",
                str(records.readings.row[layout.reading[i]]),
            )
            for i in rows.tolist()
        ]
        spread = 3.0 * np.sqrt(context.model.variance())

        def tell(k: int, a: float) -> Told:
            row = int(rows[k])
            meant = intended(layout, row, float(spread[row]))
            detail = "" if meant is None else str(meant["slip"])
            return Told(a, "pH", meant, detail=detail)

        return linear(
            self.name,
            self.alarm_class,
            "reading",
            x,
            subject,
            tell,
            prior_sd=0.5,
            block=[str(i) for i in layout.reading[rows].tolist()],
            blocks=n,
        )


KIND = ReadingSlip()
