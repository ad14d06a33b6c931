"""Published properties of single ions and of pairs of ions, for the activity models that ask for them."""

from __future__ import annotations

import csv
from collections.abc import Sequence
from functools import cache
from pathlib import Path

import numpy as np

from reconcile.records.arrays import FloatArray
from reconcile.records.substances import ions

FOLDER = Path(__file__).parent
TITRANT = "Na+"
"""Cation of the strong base that the buffer capacity adds, where it matters which."""
State = tuple[str, int, int]
"""(acid, protons lost, charge)."""


def _rows(name: str) -> list[dict[str, str]]:
    with (FOLDER / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


@cache
def read_sizes() -> dict[tuple[str, int], float]:
    """Ion sizes [angstrom] of ion_sizes.csv, (acid, protons lost) -> size."""
    return {(r["acid"], int(r["protons_lost"])): float(r["size_angstrom"]) for r in _rows("ion_sizes.csv")}


@cache
def truesdell_jones_ions() -> dict[str, tuple[float, float, int]]:
    """Size [angstrom], linear coefficient [kg/mol] and charge of truesdell_jones.csv, by ion or "acid:protons lost"."""
    return {
        f"{r['ion']}:{r['protons_lost']}" if r["protons_lost"] else r["ion"]: (
            float(r["size_angstrom"]),
            float(r["linear_kg_mol"]),
            int(r["charge"]),
        )
        for r in _rows("truesdell_jones.csv")
    }


def truesdell_jones(states: Sequence[State], size: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Sizes [angstrom] and linear coefficients over charge squared [kg/mol] of states; `size` and 0 if unpublished."""
    known = truesdell_jones_ions()
    sizes, linear = np.array(size, float), np.zeros(len(size))
    for i, (acid, lost, charge) in enumerate(states):
        found = known.get(f"{acid}:{lost}")
        if found is not None:
            sizes[i], linear[i] = found[0], found[1] / charge**2
    return sizes, linear


@cache
def interactions() -> dict[tuple[str, str], float]:
    """Coefficients of interactions.csv [kg/mol], (cation, anion) -> epsilon; weak ions as "acid:protons lost"."""
    return {(r["cation"], r["anion"]): float(r["epsilon"]) for r in _rows("interactions.csv")}


@cache
def strong_ions() -> tuple[str, ...]:
    """Ions that never change, in the order of the columns of `interaction_matrix`."""
    return tuple(name for name, ion in ions().items() if not ion.acid and name not in ("H+", "OH-"))


def _charge(name: str, charges: dict[str, int]) -> int:
    return ions()[name].charge if name in ions() else charges[name]


@cache
def usual_interactions() -> dict[tuple[int, int], float]:
    """Mean coefficient of each pair of charges in the table [kg/mol]: what stands in where none is published."""
    charges = {"ammonia:0": 1}
    for _, anion in interactions():
        if ":" in anion:
            charges[anion] = -int(anion.rpartition(":")[2])  # all of them lose protons from a neutral acid
    sums: dict[tuple[int, int], list[float]] = {}
    for (cation, anion), epsilon in interactions().items():
        if cation != "H+":  # far above the others: it would lift the mean of ordinary salts
            sums.setdefault((_charge(cation, charges), _charge(anion, charges)), []).append(epsilon)
    return {pair: sum(values) / len(values) for pair, values in sums.items()}


def interaction(one: str, charge: int, ion: str) -> float:
    """Coefficient [kg/mol] of an ion (a strong one, H+, OH- or "acid:protons lost") with a strong ion.

    0 for ions of like charge; the mean for such charges where none is published.
    """
    other = ions()[ion].charge
    if charge * other >= 0:
        return 0.0
    pair = (one, ion) if charge > 0 else (ion, one)
    found = interactions().get(pair)
    if found is not None:
        return found
    if one == "H+":
        own = [v for (cation, _), v in interactions().items() if cation == "H+"]
        return sum(own) / len(own)
    return usual_interactions().get((charge, other) if charge > 0 else (other, charge), 0.0)


def interaction_matrix(states: Sequence[State]) -> FloatArray:
    """Coefficients of every state, then of H+ and OH-, with every strong ion (s + 2, i) [kg/mol]."""
    names = [(f"{acid}:{lost}", charge) for acid, lost, charge in states]
    return np.array(
        [[interaction(name, charge, ion) for ion in strong_ions()] for name, charge in [*names, ("H+", 1), ("OH-", -1)]]
    )


@cache
def chloride_interactions() -> FloatArray:
    """Coefficient of chloride with every strong ion (i,) [kg/mol]: what moves it off the convention of the pH scale."""
    return np.array([interaction("Cl-", -1, ion) for ion in strong_ions()])
