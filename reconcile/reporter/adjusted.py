"""What was adjusted to a pH by an unwritten amount: the amount that its pH implies, beside the usual one."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from reconcile.records.results import Audit
from reconcile.reporter.plain import plain
from reconcile.reporter.tables import Column, Table, table_of

COLUMNS: tuple[Column, ...] = (
    Column("what", "Batch or stock", width=16),
    Column("titrant", "Titrant", width=26),
    Column("amount", "Implied amount", "number"),
    Column("u", "u", "number"),
    Column("unit", "Unit", width=9),
    Column("ph", "Adjusted to (pH)", "number", 2),
    Column("meter", "On meter", width=14),
    Column("usual", "Usual amount", "number"),
    Column("range", "Like batches", width=26),
    Column("odd", "Beside the usual", width=20),
)


def rows_of(audit: Audit) -> list[dict[str, Any]]:
    """One dictionary for every amount that a pH implies; alternatives that were not used are left out."""
    opens, solved, readings = audit.records.open_amounts, audit.records.solved, audit.records.readings
    found = []
    for k in range(len(solved)):
        if solved.amount[k] == 0.0:
            continue
        reading = int(solved.reading[k])
        found.append(
            {
                "batch": plain(str(opens.batch[k])),
                "stock": plain(str(opens.stock[k])),
                "substance": plain(str(opens.substance[k])),
                "lot": plain(str(opens.lot[k])),
                "amount": float(solved.amount[k]),
                "u": float(solved.u[k]),
                "unit": plain(str(opens.unit[k])),
                "pH": float(solved.ph[k]),
                "meter": plain(str(readings["meter"][reading])) if reading >= 0 else "",
                "usual": float(solved.usual[k]),
                "like": int(solved.like[k]),
                "usual_low": float(solved.usual_low[k]),
                "usual_high": float(solved.usual_high[k]),
                "odd": bool(solved.odd[k]),
            }
        )
    return found


def _beside(row: dict[str, Any]) -> str:
    """What there is to say of an implied amount."""
    if math.isnan(row["amount"]):
        return "no amount gives this pH"
    if row["odd"] and row["amount"] < 0:
        return "less than nothing; a lead"
    return "odd; a lead" if row["odd"] else ""


def adjusted_table(audit: Audit) -> Table:
    """The same as a table; odd amounts are marked by a word and shaded."""
    rows = rows_of(audit)
    data = [
        (
            " of stock ".join(filter(None, (row["batch"], row["stock"]))) if row["batch"] else f"stock {row['stock']}",
            f"{row['substance']}, lot {row['lot']}" if row["lot"] else row["substance"],
            row["amount"],
            row["u"],
            row["unit"],
            row["pH"],
            row["meter"],
            row["usual"],
            f"{row['like']}, {row['usual_low']:.4g} to {row['usual_high']:.4g}" if math.isfinite(row["usual"]) else "",
            _beside(row),
        )
        for row in rows
    ]
    table = table_of("adjusted", "Adjusted to a pH", COLUMNS, data)
    return Table(
        table.name, table.title, table.columns, table.data, flagged=np.array([row["odd"] for row in rows], bool)
    )
