"""Molar mass from a chemical formula: C5H8O3, Ca(OH)2, Na2B4O7.10H2O."""

from __future__ import annotations

import re
from collections.abc import Mapping

WEIGHTS: Mapping[str, float] = {
    "H": 1.008,
    "Li": 6.94,
    "B": 10.81,
    "C": 12.011,
    "N": 14.007,
    "O": 15.999,
    "F": 18.998,
    "Na": 22.990,
    "Mg": 24.305,
    "Al": 26.982,
    "Si": 28.085,
    "P": 30.974,
    "S": 32.06,
    "Cl": 35.45,
    "K": 39.098,
    "Ca": 40.078,
    "Cr": 51.996,
    "Mn": 54.938,
    "Fe": 55.845,
    "Co": 58.933,
    "Ni": 58.693,
    "Cu": 63.546,
    "Zn": 65.38,
    "As": 74.922,
    "Se": 78.971,
    "Br": 79.904,
    "Mo": 95.95,
    "Ag": 107.87,
    "Cd": 112.41,
    "Sn": 118.71,
    "I": 126.90,
    "Ba": 137.33,
    "W": 183.84,
    "Hg": 200.59,
    "Pb": 207.2,
}
"""Abridged standard atomic weights [g/mol]: IUPAC 2021, doi:10.1515/pac-2019-0603 (values from memory)."""
_TOKEN = re.compile(r"([A-Z][a-z]?)(\d*)|(\()|(\))(\d*)")
_WATER = re.compile(r"(?<=[A-Za-z0-9)])[.·*•](\d*(?:\.\d+)?)(?=[A-Z(])")


def molar_mass(formula: str) -> float | None:
    """Molar mass [g/mol]; None where the formula cannot be read or names an element that is not in WEIGHTS."""
    total = 0.0
    pieces = _WATER.split(formula.replace(" ", ""))
    # the split leaves: first piece, number, piece, number, piece ...
    for number, piece in zip(["1", *pieces[1::2]], [pieces[0], *pieces[2::2]], strict=True):
        mass = _mass(piece)
        if mass is None:
            return None
        total += (float(number) if number else 1.0) * mass
    return total or None


def _mass(piece: str) -> float | None:
    stack, at = [0.0], 0
    while at < len(piece):
        found = _TOKEN.match(piece, at)
        if found is None:
            return None
        element, count, opened, closed, times = found.groups()
        if element:
            if element not in WEIGHTS:
                return None
            stack[-1] += WEIGHTS[element] * (int(count) if count else 1)
        elif opened:
            stack.append(0.0)
        elif closed:
            if len(stack) < 2:
                return None
            inner = stack.pop()
            stack[-1] += inner * (int(times) if times else 1)
        at = found.end()
    return stack[0] if len(stack) == 1 else None
