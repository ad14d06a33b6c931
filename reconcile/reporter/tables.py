"""Tables described once: the CSV, workbook and page writers all read these, so that they cannot disagree."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any, Literal

import numpy as np

from reconcile.records.arrays import BoolArray, IntArray
from reconcile.records.book import BatchRecords
from reconcile.records.results import Audit
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.plain import plain

CellKind = Literal["text", "number", "integer", "time"]


@dataclass(frozen=True)
class Column:
    """One column: key (heading of the CSV), heading with unit (page and workbook), kind and decimals of its cells.

    decimals : digits after the point when shown; None shows four significant digits
    signed : a difference, shown with its sign
    width : of the workbook's column, in characters
    brief : heading where room is short (the page), "" for the same
    unbroken : a name that is read as one, never broken over lines
    """

    key: str
    heading: str
    kind: CellKind = "text"
    decimals: int | None = None
    signed: bool = False
    width: int = 0
    brief: str = ""
    unbroken: bool = False

    @property
    def characters(self) -> int:
        return self.width or max(10, min(len(self.heading) + 3, 24))


@dataclass(frozen=True)
class Table:
    """Columns of equal length with their description; texts are already plain.

    decimals : key -> (n,) digits of each row, where rows differ (a reading has those of its own display)
    flagged : (n,) rows marked by fill, beside the word that says why
    """

    name: str
    title: str
    columns: tuple[Column, ...]
    data: Mapping[str, Sequence[Any] | np.ndarray[Any, Any]]
    decimals: Mapping[str, IntArray] = field(default_factory=dict)
    flagged: BoolArray = field(default_factory=lambda: np.zeros(0, np.bool_))

    def __post_init__(self) -> None:
        keys = tuple(c.key for c in self.columns)
        if keys != tuple(self.data):
            raise ValueError(f"table {self.name}: columns {keys} are described, {tuple(self.data)} were given")
        lengths = {len(self.data[k]) for k in keys}
        if len(lengths) > 1:
            raise ValueError(f"table {self.name}: columns of unequal length {sorted(lengths)}")

    def __len__(self) -> int:
        return len(self.data[self.columns[0].key])

    def is_flagged(self, row: int) -> bool:
        return bool(len(self.flagged)) and bool(self.flagged[row])

    def places(self, column: Column, row: int) -> int | None:
        """Digits after the point of one cell; None for significant digits."""
        own = self.decimals.get(column.key)
        return int(own[row]) if own is not None else column.decimals

    def rows(self, order: IntArray) -> Table:
        """The same table with only these rows, in this order."""
        return Table(
            self.name,
            self.title,
            self.columns,
            {c.key: _take(self.data[c.key], order) for c in self.columns},
            {key: values[order] for key, values in self.decimals.items()},
            self.flagged[order] if len(self.flagged) else self.flagged,
        )


def _take(values: Sequence[Any] | np.ndarray[Any, Any], order: IntArray) -> Sequence[Any] | np.ndarray[Any, Any]:
    return values[order] if isinstance(values, np.ndarray) else [values[i] for i in order.tolist()]


def table_of(name: str, title: str, columns: tuple[Column, ...], rows: Sequence[Sequence[Any]]) -> Table:
    """A table from rows of cells."""
    data = {column.key: [row[i] for row in rows] for i, column in enumerate(columns)}
    return Table(name, title, columns, data)


RESIDUALS: tuple[Column, ...] = (
    Column("source", "Source", width=18),
    Column("sheet", "Sheet", width=12),
    Column("row", "Row", "integer", 0, width=7),
    Column("batch", "Batch", width=14),
    Column("read_at", "Read at", "time", width=17),
    Column("meter", "Meter", width=10),
    Column("probe", "Probe", width=10),
    Column("stage", "Stage", width=12),
    Column("temperature_C", "Temperature (°C)", "number", 1, brief="t (°C)"),
    Column("pH_observed", "pH observed", "number", 2),
    Column("pH_predicted", "pH predicted", "number", 3),
    Column("u_predicted", "u of prediction (pH)", "number", 3),
    Column("u_residual", "u of residual (pH)", "number", 3),
    Column("residual", "Residual (pH)", "number", 3, signed=True),
    Column("z", "z (–)", "number", 1, signed=True),
    Column("ionic_strength", "Ionic strength (mol/kg)", "number", 4),
    Column("buffer_capacity", "Buffer capacity (mol/L per pH)", "number", 4),
    Column("titrant_equivalent", "Titrant equivalent (mol/L strong base)", "number", 5, signed=True),
    Column("low_limit", "Low limit (pH)", "number", 2),
    Column("high_limit", "High limit (pH)", "number", 2),
    Column("pH_calculated", "Calculated pH in the record", "number", 2),
    Column("standing", "Standing", width=10),
    Column("status", "Status", width=16),
    Column("explained_by", "Explained by", width=13),
)
SET_ASIDE: tuple[Column, ...] = (
    Column("source", "Source", width=18),
    Column("sheet", "Sheet", width=12),
    Column("row", "Row", "integer", 0, width=7),
    Column("batch", "Batch", width=14),
    Column("meter", "Meter", width=10),
    Column("lot", "Lot", width=12),
    Column("cause_source", "Cause: source", width=18),
    Column("cause_sheet", "Cause: sheet", width=12),
    Column("cell", "Cause: cell", width=12),
    Column("read", "What was read", width=20),
    Column("reason", "Reason", width=60),
    Column("advice", "What to do", width=60),
)


def plain_column(values: Any) -> list[str]:
    """Texts of a column, made plain."""
    return [plain(str(v)) for v in values]


def residuals(audit: Audit, lookups: Lookups | None = None) -> Table:
    """One row a used reading, in file order."""
    lookups = lookups or Lookups(audit)
    arrays = audit.residual_columns()
    kinds = {c.key: c.kind for c in RESIDUALS}
    data = {key: plain_column(a.tolist()) if kinds.get(key) == "text" else a for key, a in arrays.items()}
    return Table("residuals", "Residuals", RESIDUALS, data, {"pH_observed": lookups.decimals}, flagged=lookups.flagged)


def set_aside(audit: Audit) -> Table:
    """One row a reading that was set aside, with its reason, in file order."""
    return table_of("set_aside", "Set aside", SET_ASIDE, set_aside_rows(audit.records))


def set_aside_rows(records: BatchRecords) -> list[tuple[Any, ...]]:
    """Cells of the table of readings set aside, in file order."""
    return [
        (
            plain(s.place.file),
            plain(s.place.sheet),
            s.place.row,
            plain(s.batch),
            plain(s.meter),
            plain(s.lot),
            plain(s.cause.file),
            plain(s.cause.sheet),
            plain(s.cause.cell),
            plain(s.read),
            plain(s.reason),
            plain(s.advice),
        )
        for s in records.set_aside
    ]
