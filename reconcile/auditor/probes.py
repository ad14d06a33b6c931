"""Probes that were moved between meters: their readings, and a layout in which they stand for meters."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from reconcile.records.arrays import IntArray, TextArray
from reconcile.records.book import BatchRecords

if TYPE_CHECKING:
    from reconcile.auditor.layout import Layout

LEAST = 3
"""Readings that a probe needs on each of two meters at least; on fewer its fault and the meter's look alike."""


def moved_probes(meter: TextArray, probe: TextArray) -> tuple[str, ...]:
    """Probes with enough readings on each of two meters or more, by name."""
    counts: dict[str, dict[str, int]] = {}
    for m, p in zip(meter.tolist(), probe.tolist(), strict=True):
        if m and p:
            on = counts.setdefault(p, {})
            on[m] = on.get(m, 0) + 1
    return tuple(sorted(p for p, on in counts.items() if sum(n >= LEAST for n in on.values()) >= 2))


def probe_index(records: BatchRecords, rows: IntArray) -> tuple[IntArray, tuple[str, ...]]:
    """Index of the moved probe that each reading was taken with, -1 for any other; and their names."""
    meter, probe = records.readings["meter"][rows], records.readings["probe"][rows]
    names = moved_probes(meter, probe)
    place = {name: i for i, name in enumerate(names)}
    return np.array([place.get(p, -1) for p in probe.tolist()], np.intp), names


def by_probe(layout: Layout) -> Layout | None:
    """The layout with moved probes in place of meters; None where no probe was moved."""
    if "by probe" not in layout.kept:
        index, names = probe_index(layout.records, layout.reading)
        effects = {name: found for name, found in layout.effects.items() if name not in ("meter", "span")}
        if "probe" in effects:
            effects["meter"] = effects["probe"]
        layout.kept["by probe"] = replace(layout, meter=index, meters=names, effects=effects) if names else None
    found: Layout | None = layout.kept["by probe"]
    return found


def latest_probe(layout: Layout, meter: str) -> str:
    """Probe that a meter was last read with; "" where none is named."""
    table = layout.records.readings
    mine = np.flatnonzero((table["meter"] == meter) & (table["probe"] != ""))
    if not len(mine):
        return ""
    at = table["read_at"][mine]
    order = np.lexsort((mine, np.where(np.isnat(at), np.datetime64("0001-01-01", "s"), at)))
    return str(table["probe"][mine[order[-1]]])
