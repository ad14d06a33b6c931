"""The simulator's own chemistry: pH of mixtures by charge balance, written apart from the package's engine.

It reads the package's table of ionization constants (so that a record can be simulated in which the table is right, or
wrong by a known amount) and shares no code with the engine: another solver, another equation for water, permittivity
and the Debye-Hückel slope. pKa follows van 't Hoff with a constant heat capacity.
"""

from __future__ import annotations

import csv
from dataclasses import dataclass
from functools import cache
from pathlib import Path

import numpy as np

from reconcile.records.arrays import FloatArray
from reconcile.records.substances import Form, ions

TABLE = Path(__file__).parents[2] / "reconcile" / "chemistry" / "acids.csv"
GAS_CONSTANT = 8.314462618e-3  # kJ/(mol K), CODATA 2018
LN10 = np.log(10.0)
T0 = 298.15
KG_WATER_PER_LITRE = 0.99821  # dilute solution made up at 20 °C: density of water (IAPWS-95 value, from memory)
WATER_CONSTANT = (13.995, 55.81, -0.2246)  # pKw, dH [kJ/mol], dCp [kJ/(mol K)] at 25 °C; from memory, tested 0-60 °C


@dataclass(frozen=True)
class Acid:
    """One acid of the table: charge fully protonated; by step pKa (25 °C, I = 0), dH [kJ/mol], dCp [kJ/(mol K)], u."""

    name: str
    charge: int
    pka: FloatArray
    enthalpy: FloatArray
    heat_capacity: FloatArray
    u: FloatArray
    weak_data: bool


@cache
def acids() -> dict[str, Acid]:
    """Every acid of the package's table, read here by this file's own code."""
    steps: dict[str, list[dict[str, str]]] = {}
    with TABLE.open(encoding="utf-8", newline="") as file:
        for row in csv.DictReader(file):
            steps.setdefault(row["acid"], []).append(row)
    found = {}
    for name, rows in steps.items():
        rows.sort(key=lambda r: int(r["step"]))
        found[name] = Acid(
            name,
            int(rows[0]["charge_of_fully_protonated_form"]),
            np.array([float(r["pKa_25C_I0"]) for r in rows]),
            np.array([float(r["dH_kJ_mol"] or 0.0) for r in rows]),
            np.array([float(r["dCp_J_K_mol"] or 0.0) for r in rows]) / 1000.0,
            np.array([float(r["u_pKa"] or 0.05) for r in rows]),
            any(not r["dH_kJ_mol"] for r in rows),
        )
    return found


def constant_at(pka: FloatArray, enthalpy: FloatArray, heat_capacity: FloatArray, kelvin: FloatArray) -> FloatArray:
    """PK at a temperature from its value, enthalpy and heat capacity at 25 °C (van 't Hoff, dCp constant)."""
    shift = enthalpy / (GAS_CONSTANT * LN10) * (1.0 / kelvin - 1.0 / T0)
    return pka + shift - heat_capacity / (GAS_CONSTANT * LN10) * (T0 / kelvin - 1.0 + np.log(kelvin / T0))


def debye_huckel_slope(celsius: FloatArray) -> FloatArray:
    """A [kg^0.5 mol^-0.5] in log10 units: 1.8248e6 sqrt(density) / (permittivity T)^1.5.

    Permittivity after Malmberg and Maryott 1956 (J. Res. NBS 56, 1), density after Kell 1975; both from memory.
    """
    t = np.asarray(celsius, float)
    permittivity = 87.740 - 0.40008 * t + 9.398e-4 * t**2 - 1.410e-6 * t**3
    density = 0.99984 + 6.0e-5 * t - 8.0e-6 * t**2 + 4.0e-8 * t**3
    return np.asarray(1.8248e6 * np.sqrt(density) / (permittivity * (t + 273.15)) ** 1.5)


@dataclass(frozen=True)
class Brings:
    """What one mole of a form brings: moles of each acid, net charge and sum of z² of its unchanging ions."""

    acids: tuple[tuple[str, float], ...]
    charge: float
    squares: float


@cache
def brings(form: Form) -> Brings:
    """One form as the balance sees it."""
    charge = sum(ions()[i].charge * n for i, n in form.strong_ions.items())
    squares = sum(ions()[i].charge ** 2 * n for i, n in form.strong_ions.items())
    return Brings(tuple(sorted(form.acids.items())), float(charge), float(squares))


def solve_ph(
    totals: FloatArray,
    names: list[str],
    charge: FloatArray,
    squares: FloatArray,
    celsius: FloatArray,
    davies: float = 0.3,
    pka_shift: dict[tuple[str, int], float] | None = None,
) -> FloatArray:
    """PH (-log10 of the hydrogen-ion activity) of n solutions.

    Parameters: totals (n, a) of each acid named [mol/kg]; charge (n,) and squares (n,) of the unchanging ions [mol/kg];
    celsius (n,); davies, the coefficient b in log g = -A z² (sqrt I / (1 + sqrt I) - b I); pka_shift, true minus table
    by (acid, step from 1). Newton in pH from the sign change on a grid, the ionic strength by substitution.
    Raises ArithmeticError when a row does not settle.
    """
    shift = pka_shift or {}
    table = [acids()[name] for name in names]
    steps = max((len(a.pka) for a in table), default=1)
    width = len(table)
    pka, enthalpy, capacity = np.full((width, steps), 60.0), np.zeros((width, steps)), np.zeros((width, steps))
    states = np.zeros((width, steps + 1))
    for i, acid in enumerate(table):
        k = len(acid.pka)
        pka[i, :k] = acid.pka + [shift.get((acid.name, s + 1), 0.0) for s in range(k)]
        enthalpy[i, :k], capacity[i, :k] = acid.enthalpy, acid.heat_capacity
        states[i] = acid.charge - np.arange(steps + 1)
    kelvin = np.asarray(celsius, float) + 273.15
    thermal = constant_at(pka, enthalpy, capacity, kelvin[:, None, None])
    water = constant_at(*(np.array(v) for v in WATER_CONSTANT), kelvin)
    slope = debye_huckel_slope(celsius)
    jump = states[:, 1:] ** 2 - states[:, :-1] ** 2

    def balance(ph: FloatArray, screen: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Net charge, its slope in pH, and the ionic strength, at given log10 activity coefficients -screen z²."""
        lost = np.cumsum(ph[:, None, None] - thermal + jump * screen[:, None, None], axis=2)
        lost = np.concatenate([np.zeros((*lost.shape[:2], 1)), lost], axis=2)
        weight = 10.0 ** np.clip(lost - lost.max(axis=2, keepdims=True), -80.0, 0.0)
        weight /= weight.sum(axis=2, keepdims=True)
        mean = (weight * states).sum(axis=2)
        square = (weight * states**2).sum(axis=2)
        hydrogen = 10.0 ** (screen - ph)
        hydroxide = 10.0 ** (ph - water + screen)
        net = charge + hydrogen - hydroxide + (totals * mean).sum(axis=1)
        rate = -LN10 * (hydrogen + hydroxide + (totals * (square - mean**2)).sum(axis=1))
        strength = 0.5 * (squares + hydrogen + hydroxide + (totals * square).sum(axis=1))
        return net, rate, strength

    def screening(strength: FloatArray) -> FloatArray:
        root = np.sqrt(strength)
        return np.asarray(slope * (root / (1.0 + root) - davies * strength))

    strength = 0.5 * squares + np.abs(charge) * 0.5
    grid = np.arange(-0.5, 14.6, 0.5)
    first = screening(strength)
    nets = np.stack([balance(np.full(len(kelvin), g), first)[0] for g in grid], axis=1)
    ph = grid[np.clip((nets > 0).sum(axis=1) - 1, 0, len(grid) - 1)] + 0.25
    for _ in range(60):
        net, rate, strength_now = balance(ph, screening(strength))
        step = np.clip(-net / rate, -0.4, 0.4)
        ph = ph + step
        settled = np.abs(step).max(initial=0.0) < 1e-9 and np.abs(strength_now - strength).max(initial=0.0) < 1e-10
        strength = strength_now
        if settled:
            return np.asarray(ph)
    raise ArithmeticError("the simulated solutions did not settle")
