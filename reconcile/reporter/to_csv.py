"""A table as CSV: UTF-8 without byte-order mark, LF, six significant digits, ISO times, no formula."""

from __future__ import annotations

import csv
import io
import math
from typing import Any

import numpy as np

from reconcile.reporter.plain import csv_text
from reconcile.reporter.tables import Column, Table


def six_digits(value: float) -> str:
    """A number with six significant digits, without plus signs; "" where there is none."""
    if not math.isfinite(value):
        return ""
    text = f"{value:.6g}".replace("e+", "e")
    return "0" if text == "-0" else text


def _cells(column: Column, values: Any) -> list[str]:
    if column.kind == "text":
        known = {v: csv_text(v) for v in set(values)}
        return [known[v] for v in values]
    if column.kind == "time":
        times = np.asarray(values, "datetime64[s]")
        return ["" if missing else t for t, missing in zip(times.astype(str).tolist(), np.isnat(times), strict=True)]
    if column.kind == "integer":
        return ["" if v is None else str(int(v)) for v in values]
    if not isinstance(values, np.ndarray):
        return ["" if v is None else six_digits(v) for v in values]
    different, which = np.unique(values, return_inverse=True)  # limits, temperatures, readings come again and again
    texts = [six_digits(v) for v in different.tolist()]
    return [texts[i] for i in which.tolist()]


def table_csv(table: Table) -> bytes:
    """The whole table, its keys as headings."""
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow([c.key for c in table.columns])
    writer.writerows(zip(*(_cells(c, table.data[c.key]) for c in table.columns), strict=True))
    return text.getvalue().encode("utf-8")
