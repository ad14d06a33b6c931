"""Hand calculations in the record: where the record's own calculated pH is wrong, and which short cut reproduces it."""

from __future__ import annotations

from collections.abc import Callable, Mapping

import numpy as np

from reconcile.auditor import laws
from reconcile.records.arrays import FloatArray, IntArray
from reconcile.records.book import BatchRecords
from reconcile.records.results import Finding, Prediction
from reconcile.records.rounding import half_up, signed

Shortcuts = Callable[[IntArray], Mapping[str, FloatArray]]
"""Given by the pipeline: hand methods' values for some readings, method -> FloatArray (m,)."""

CHANCE = 0.01
"""Chance over a whole record of any calculated pH being named though it was worked out rightly."""
ROUNDING = 0.01 / 12**0.5
LEAST = 0.03
"""A calculated pH closer than this to the full balance is called right [pH]; common practice, no source."""
CLOSE = 0.012
"""A short cut reproduces a calculated pH when it lies within this: two decimals, and constants that differ a little."""
WHY: Mapping[str, str] = {
    "square root of Ka C": "it takes the ionized part as negligible beside the whole, and leaves out activity "
    "coefficients and water's own ions",
    "quadratic": "it leaves out activity coefficients and water's own ions",
    "ratio of base to acid": "it takes the amounts as mixed for those at equilibrium, and leaves out activity "
    "coefficients",
    "strong acid or base alone": "it leaves out activity coefficients and water's own ions",
    "full balance without activity coefficients": "activity coefficients matter at this ionic strength",
    "full balance with 25 °C constants": "the solution was not at 25 °C",
}


def reproduced_by(value: float, methods: Mapping[str, float]) -> str:
    """The simplest hand method whose value a calculated pH is, "" where none gives it."""
    for name, given in methods.items():
        if np.isfinite(given) and abs(given - value) <= CLOSE:
            return name
    return ""


def record_values(records: BatchRecords, prediction: Prediction, shortcuts: Shortcuts | None) -> list[Finding]:
    """A finding for each batch whose calculated pH in the record differs from the full balance by more than it may.

    The calculated pH is compared with the prediction, never with the reading. One value a batch is judged: the first.
    """
    calculated = records.readings["ph_calculated"]
    judged = np.flatnonzero(np.isfinite(calculated) & np.isfinite(prediction.ph) & (prediction.status == "ok"))
    names = records.readings["batch"][judged]
    first: dict[str, int] = {}
    for row, name in zip(judged.tolist(), names.tolist(), strict=True):
        first.setdefault(str(name), row)
    rows = np.array([row for name, row in first.items() if name], np.intp)
    if not len(rows):
        return []
    error = calculated[rows] - prediction.ph[rows]
    spread = np.sqrt(prediction.u[rows] ** 2 + ROUNDING**2)
    z = np.abs(error) / spread
    needed = float(laws.norm_isf(CHANCE / len(rows) / 2.0))
    wrong = np.flatnonzero((z > needed) & (np.abs(error) > LEAST))
    if not len(wrong):
        return []
    values = shortcuts(rows[wrong]) if shortcuts is not None else {}
    found = []
    for place, i in enumerate(wrong.tolist()):
        row = int(rows[i])
        batch = str(records.readings["batch"][row])
        method = reproduced_by(float(calculated[row]), {name: float(v[place]) for name, v in values.items()})
        degree = degree_of(prediction, row)
        right, given = float(prediction.ph[row]), float(calculated[row])
        words = (
            f"The record's own calculated pH of batch {batch}, {given:.2f}, is off by "
            f"{signed(half_up(error[i], 2))} from the full balance, {right:.2f}."
        )
        if method:
            words += f" The {method} gives {float(values[method][place]):.2f}: {WHY[method]}."
        else:
            words += " No usual hand method reproduces it."
        if degree:
            words += f" {degree}"
        same = np.flatnonzero(records.readings["batch"] == batch)
        same = same[np.isfinite(calculated[same])]
        p = min(1.0, len(rows) * 2.0 * float(laws.norm_sf(z[i])))
        half = 1.96 * float(spread[i])
        found.append(
            Finding(
                kind="record_value",
                subject=batch,
                subject_type="batch",
                estimate=float(error[i]),
                unit="pH",
                interval95=(float(error[i]) - half, float(error[i]) + half),
                log_likelihood_gain=0.5 * float(z[i]) ** 2,
                family_wise_p=p,
                readings=same.astype(np.intp),
                text=words,
                would_explain={"shortcut": method or None, "pH": right},
                next_check="None: the calculation is to be checked, not a reading.",
                shift=np.zeros(len(same)),
            )
        )
    return found


def degree_of(prediction: Prediction, row: int) -> str:
    """Degree of ionization of each acid of one solution, in words."""
    t = prediction.degree
    mine = np.flatnonzero(t.row == row)
    parts = [f"{prediction.acid_names[int(t.column[i])]} {100 * t.value[i]:.2g} %" for i in mine.tolist()]
    return f"Degree of ionization: {', '.join(parts)}." if parts else ""
