"""Ion pairs and condensed species: what they are made of, their constants against temperature, and which are chosen."""

from __future__ import annotations

import csv
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from pathlib import Path

import numpy as np

from reconcile.chemistry.temperature import GAS_CONSTANT, LN10, T_REFERENCE
from reconcile.records.arrays import FloatArray
from reconcile.records.substances import ions

HYDROXIDE = "OH-"
CHOICES: Mapping[str, tuple[str, ...]] = {"none": (), "complexes": ("complex",), "all": ("complex", "alkali")}
"""Setting prediction.ion_pairs -> kinds of ion_pairs.csv that take part.

Pairs of sodium and potassium are kept apart: a model of activity coefficients that was tested without them holds their
effect already.
"""


@dataclass(frozen=True)
class Pair:
    """One species of ion_pairs.csv, formed from its parts; lg K(T) as in `value`.

    metals : strong ions among its parts, each with its number
    states : (acid, protons lost) among its parts, each with its number
    hydroxide : number of hydroxide ions among its parts
    """

    name: str
    kind: str
    metals: Mapping[str, int]
    states: Mapping[tuple[str, int], int]
    hydroxide: int
    inverse: float
    constant: float
    log10: float
    u: float
    u_dh: float
    source: str

    def value(self, kelvin: FloatArray) -> tuple[FloatArray, FloatArray]:
        """lg K at I = 0 on the molal scale, and its slope [1/K], at temperatures [K]."""
        lg = self.constant + self.inverse / kelvin + self.log10 * np.log10(kelvin)
        return lg, -self.inverse / kelvin**2 + self.log10 / (LN10 * kelvin)

    def u_at(self, kelvin: FloatArray) -> FloatArray:
        """Standard uncertainty of lg K at temperatures [K]."""
        by_dh = 1000.0 / (GAS_CONSTANT * LN10) * (1.0 / kelvin - 1.0 / T_REFERENCE)
        return np.asarray(np.hypot(self.u, by_dh * self.u_dh))


def _pair(row: Mapping[str, str]) -> Pair:
    metals: dict[str, int] = {}
    states: dict[tuple[str, int], int] = {}
    hydroxide = 0
    for part in row["parts"].split("|"):
        acid, _, lost = part.partition(":")
        if part == HYDROXIDE:
            hydroxide += 1
        elif lost:
            states[acid, int(lost)] = states.get((acid, int(lost)), 0) + 1
        elif part in ions():
            metals[part] = metals.get(part, 0) + 1
        else:
            raise ValueError(f"ion_pairs.csv: {row['pair']} is made of {part}, which no table of ions holds")
    if row["inverse"]:
        inverse, constant, log10 = float(row["inverse"]), float(row["constant"]), float(row["log10"])
    else:  # van 't Hoff with a constant enthalpy; one that is not known counts as 0 and costs uncertainty
        inverse = -float(row["dH_kJ_mol"] or 0.0) * 1000.0 / (GAS_CONSTANT * LN10)
        constant, log10 = float(row["log_K_25C"]) - inverse / T_REFERENCE, 0.0
    return Pair(
        row["pair"],
        row["kind"],
        metals,
        states,
        hydroxide,
        inverse,
        constant,
        log10,
        float(row["u_log_K"]),
        float(row["u_dH_kJ_mol"]),
        row["source"],
    )


@cache
def _every() -> tuple[Pair, ...]:
    with (Path(__file__).parent / "ion_pairs.csv").open(encoding="utf-8", newline="") as file:
        return tuple(map(_pair, csv.DictReader(file)))


@cache
def pairs(choice: str | tuple[str, ...]) -> tuple[Pair, ...]:
    """The species that take part under the setting: one of CHOICES, or several of these and of names of species.

    Raises ValueError that lists what there is.
    """
    chosen = (choice,) if isinstance(choice, str) else choice
    names = {pair.name for pair in _every()}
    for one in chosen:
        if one not in CHOICES and one not in names:
            known = ", ".join((*CHOICES, *sorted(names)))
            raise ValueError(f"no choice of ion pairs is called {one!r}; there are: {known}")
    kinds = {kind for one in chosen for kind in CHOICES.get(one, ())}
    return tuple(pair for pair in _every() if pair.kind in kinds or pair.name in chosen)
