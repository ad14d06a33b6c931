"""Known solutions: certified pH at the temperature of the reading, from the record or the published standards."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from reconcile.importer.lines import text_column
from reconcile.importer.tables import TableCells
from reconcile.records.columns import heading_key
from reconcile.records.standards import find_standard, standard_ph

U_CERTIFICATE = 0.01
"""Standard uncertainty of a known solution's pH where none is stated [pH]; common practice, no source."""
_BEYOND = 2.0
"""K outside the tabulated temperatures within which the nearest value still stands; common practice, no source."""


@dataclass
class KnownSolutions:
    """Certified values by name: rows of (lot, temperature [°C], pH, u); and the solutions already made of them.

    solutions : (name, lot, temperature, whether that is only the room's) -> solution
    """

    by_name: dict[str, list[tuple[str, float, float, float]]] = field(default_factory=dict)
    solutions: dict[tuple[str, str, float, bool], int] = field(default_factory=dict)

    def add(self, table: TableCells) -> None:
        """Take the rows of one Known solutions sheet."""
        names, lots = text_column(table, "name"), text_column(table, "lot")
        numbers = [
            table.columns[c].values if c in table.columns else np.full(len(table), np.nan)
            for c in ("temperature", "ph", "u")
        ]
        for i in range(len(table)):
            if names[i] and not table.summary[i] and not np.isnan(numbers[1][i]):
                row = (lots[i], float(numbers[0][i]), float(numbers[1][i]), float(numbers[2][i]))
                self.by_name.setdefault(heading_key(names[i]), []).append(row)

    def certified(self, name: str, lot: str, temperature: float) -> tuple[float, float] | None:
        """(pH, u) at a temperature, linear between certified ones; published standards where the record has none."""
        rows = self.by_name.get(heading_key(name), [])
        if lot and any(r[0] == lot for r in rows):
            rows = [r for r in rows if r[0] == lot]
        if not rows:
            return standard_ph(name, temperature)
        stated = sorted((t, ph, u) for _, t, ph, u in rows if not np.isnan(t))
        if not stated:
            return rows[0][2], rows[0][3]
        t, ph, u = (np.array(x) for x in zip(*stated, strict=True))
        if temperature < t[0] - _BEYOND or temperature > t[-1] + _BEYOND:
            return None
        return float(np.interp(temperature, t, ph)), float(np.interp(temperature, t, u))

    def at(self, name: str, lot: str, temperature: float, u_kelvin: float) -> tuple[float, float, float] | None:
        """(pH, u, part of u from the temperature) at a temperature that is itself uncertain by u_kelvin [K]."""
        value = self.certified(name, lot, temperature)
        if value is None or u_kelvin == 0.0:
            return None if value is None else (*value, 0.0)
        ends = [self.certified(name, lot, temperature + step) for step in (-1.0, 1.0)]
        known = [ph for ph, _ in (end for end in ends if end is not None)]
        slope = (known[1] - known[0]) / 2.0 if len(known) == 2 else known[0] - value[0] if known else 0.0
        u = U_CERTIFICATE if np.isnan(value[1]) else value[1]
        return value[0], float(np.hypot(u, slope * u_kelvin)), abs(slope) * u_kelvin

    def is_listed(self, name: str) -> bool:
        """Whether the record or the published standards know the name, at any temperature."""
        return heading_key(name) in self.by_name or find_standard(name) is not None
