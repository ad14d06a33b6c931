"""What the lines of a solution are made up to, or add up to."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from reconcile.importer.amounts import amount_words
from reconcile.importer.cells import Fault
from reconcile.importer.lines import QUANTITIES
from reconcile.records.problems import Problem
from reconcile.records.units import UNITS

if TYPE_CHECKING:
    from reconcile.importer.compose import Composer

WATER_DENSITY_20 = 0.99821
"""g/mL at 20 °C and 0.101325 MPa (IAPWS-95)."""
ADDED = "added "


def total_of(composer: Composer, lines: Sequence[int]) -> tuple[float, str, Problem | None]:
    """What a solution is made up to, in mL or g: that of its last step; two in one step are a contradiction.

    (NaN, "", None) where nothing is said, or that its lines are added to something: see `added_up`.
    """
    L, reader = composer.lines, composer.reader
    total, measure, where = np.nan, "", -1
    for line in lines:
        value, kind = float(L.total[line]), L.total_measure[line]
        column = L.total_column[line]
        if L.special[line] == "fill" and not np.isnan(L.value[line]):
            unit, column = UNITS.get(L.unit[line]), L.column[line]
            if L.problem[line] is not None:
                return np.nan, "", L.problem[line]
            if unit is None or unit.measures not in ("volume", "mass"):
                code = "unit-unknown" if unit is not None else "unit-missing"
                return np.nan, "", composer.fault(line, code)
            value, kind = float(L.value[line]) * unit.factor, unit.measures
        if not kind:
            continue
        same_step = where >= 0 and L.step[line] == L.step[where]
        if same_step and (kind != measure or abs(value - total) > 1e-9 * total):
            named = [_words(x, k) for x, k in ((total, measure), (value, kind))]
            fault = Fault("made-up-to-differs", named[0], (("name", named[1]),))
            return np.nan, "", reader.problem(line, fault, column)
        total, measure, where = value, kind, line
    if measure and total <= 0.0:
        fault = Fault("made-up-to-missing", "0")
        return np.nan, "", reader.problem(where, fault, L.total_column[where])
    return (np.nan, "", None) if measure.startswith(ADDED) else (total, measure, None)


def _words(value: float, kind: str) -> str:
    words = amount_words(value, "mL" if kind.endswith("volume") else "g")
    return f"added to {words}" if kind.startswith(ADDED) else words


def added_up(composer: Composer, lines: Sequence[int]) -> tuple[float, str]:
    """What the lines of a solution add up to, in g where all is weighed but water, else in mL; (NaN, "") if unknown.

    The water is stated: a line of its own, or what the lines are added to. Volumes of stocks and water add up, in which
    solids taken up take no room: within 1 % for solutions of less than about 0.3 mol/L (common practice, no source).
    """
    L = composer.lines
    mass, volume = 0.0, 0.0
    has_water, by_volume = False, False
    base = [i for i in lines if L.total_measure[i].startswith(ADDED)]
    if base:  # every line that says so names the same vessel; total_of has compared them
        value, kind = float(L.total[base[-1]]), L.total_measure[base[-1]]
        grams = value if kind.endswith("mass") else value * WATER_DENSITY_20
        mass, volume, has_water = grams, grams / WATER_DENSITY_20, True
    for line in lines:
        unit = UNITS.get(L.unit[line])
        if np.isnan(L.value[line]) or unit is None or L.special[line]:
            continue
        amount = float(L.value[line]) * unit.factor
        taken = composer.resolver.taken(L.substance[line], L.lot[line], unit.measures)
        if taken.water and base:
            continue  # that is what the others were added to
        if unit.measures == "mass":
            mass += amount
            stock = taken.stock
            if taken.water:
                volume += amount / WATER_DENSITY_20
            elif stock is not None and (stock.is_solution or stock.batch):
                volume += amount / stock.density
        elif unit.measures == "volume":
            mass += amount * WATER_DENSITY_20
            volume += amount
            by_volume |= not taken.water
        elif unit.measures in QUANTITIES:
            return np.nan, ""
        has_water |= taken.water
    if not has_water:
        return np.nan, ""
    if by_volume:
        return (volume, "volume") if np.isfinite(volume) else (np.nan, "")
    return mass, "mass"
