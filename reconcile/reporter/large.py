"""What the workbook shows of a record that is too long for it: one row a batch."""

from __future__ import annotations

import numpy as np

from reconcile.records.results import Audit
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.tables import Column, Table

BATCHES: tuple[Column, ...] = (
    Column("batch", "Batch", width=18),
    Column("readings", "Readings", "integer", 0),
    Column("stand_out", "Unexplained", "integer", 0),
    Column("explained", "Explained", "integer", 0),
    Column("mean_residual", "Mean residual (pH)", "number", 3, signed=True),
    Column("largest_residual", "Largest residual (pH)", "number", 3, signed=True),
)


def summary_of_batches(audit: Audit, lookups: Lookups, most: int) -> tuple[Table, int]:
    """Batches with readings that stand out first, then by name, at most `most`; and how many batches there are."""
    names, inverse = np.unique(lookups.batch.astype(str), return_inverse=True)
    number = len(names)
    count = np.bincount(inverse, minlength=number)
    out = np.bincount(inverse[audit.status == "stands_out"], minlength=number)
    explained = np.bincount(inverse[audit.status == "explained"], minlength=number)
    finite = np.isfinite(audit.residual)
    known = np.bincount(inverse[finite], minlength=number)
    total = np.bincount(inverse[finite], weights=audit.residual[finite], minlength=number)
    with np.errstate(invalid="ignore", divide="ignore"):
        mean = total / known
    size = np.where(finite, np.abs(audit.residual), -1.0)
    by_size = np.lexsort((-size, inverse))
    first = by_size[np.searchsorted(inverse[by_size], np.arange(number))]
    largest = np.where(known > 0, audit.residual[first], np.nan)
    kept = np.lexsort((names, -explained, -out))[:most]
    data = {
        "batch": names[kept].tolist(),
        "readings": count[kept],
        "stand_out": out[kept],
        "explained": explained[kept],
        "mean_residual": mean[kept],
        "largest_residual": largest[kept],
    }
    return Table("batches", "Batches", BATCHES, data), number
