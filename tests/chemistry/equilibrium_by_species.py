"""An independent solution with ion pairs: mass action for every species, least squares in lg molality; no engine code.

Of the package it reads the tables alone: pKa at the temperature, pKw, A, and the rows of ion_pairs.csv.
"""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
from scipy.optimize import least_squares

from reconcile.chemistry.acids import acid_table
from reconcile.chemistry.temperature import solvent
from reconcile.records.substances import Form, ions

TABLE = Path(__file__).parents[2] / "reconcile" / "chemistry" / "ion_pairs.csv"
R_LN10 = 8.31446261815324e-3 * np.log(10.0)  # kJ/(mol K)


def lg_k(row: dict[str, str], kelvin: float) -> float:
    """lg K of a row at a temperature, written out from its columns."""
    if row["inverse"]:
        return float(row["constant"]) + float(row["inverse"]) / kelvin + float(row["log10"]) * np.log10(kelvin)
    return float(row["log_K_25C"]) - float(row["dH_kJ_mol"] or 0.0) / R_LN10 * (1.0 / kelvin - 1.0 / 298.15)


def ph_by_species(
    forms: list[Form], molality: list[float], celsius: float, kinds: tuple[str, ...], d_of: str
) -> tuple[float, float]:
    """pH and ionic strength; d_of is "davies" or "bates-guggenheim"."""
    table, kelvin = acid_table(), celsius + 273.15
    water = solvent(np.array([celsius]))
    a, pkw = float(water.a[0]), float(water.pkw[0])
    total: dict[str, float] = {}
    for form, amount in zip(forms, molality, strict=True):
        for name, number in [*form.acids.items(), *form.strong_ions.items()]:
            total[name] = total.get(name, 0.0) + amount * number
    components = [name for name in total if total[name] > 0.0]
    index = {name: i for i, name in enumerate(components)}
    species: list[tuple[float, int, int, dict[str, int]]] = [(0.0, -1, 1, {}), (-pkw, 1, -1, {})]  # lg K, q, z, parts
    states: dict[tuple[str, int], tuple[float, int]] = {}
    for name in components:
        if name in ions() and not ions()[name].acid:
            species.append((0.0, 0, ions()[name].charge, {name: 1}))
            continue
        at = table.index[name]
        running = 0.0
        for lost in range(int(table.steps[at]) + 1):
            if lost:
                running -= float(table.pka_at(np.array(table.first[at] + lost - 1), np.array(celsius)))
            states[name, lost] = running, int(table.charge[at]) - lost
            species.append((running, lost, int(table.charge[at]) - lost, {name: 1}))
    with TABLE.open(encoding="utf-8", newline="") as file:
        rows = [r for r in csv.DictReader(file) if r["kind"] in kinds]
    for row in rows:
        constant, q, z, parts = lg_k(row, kelvin), 0, 0, {}
        for part in row["parts"].split("|"):
            name, _, lost = part.partition(":")
            if part == "OH-":
                constant, q, z = constant - pkw, q + 1, z - 1
                continue
            if name not in index:
                break
            if lost:
                constant, q, z = constant + states[name, int(lost)][0], q + int(lost), z + states[name, int(lost)][1]
            else:
                z += ions()[name].charge
            parts[name] = parts.get(name, 0) + 1
        else:
            species.append((constant, q, z, parts))
    k = np.array([s[0] for s in species])
    q = np.array([s[1] for s in species], float)
    z = np.array([s[2] for s in species], float)
    nu = np.array([[s[3].get(c, 0) for c in components] for s in species], float)
    free = np.array(
        [ions()[c].charge if c in ions() and not ions()[c].acid else table.charge[table.index[c]] for c in components]
    )
    wanted = np.array([total[c] for c in components])

    def molalities(u: np.ndarray) -> tuple[np.ndarray, float]:
        strength = np.exp(u[1])
        root = np.sqrt(strength)
        d = a * (root / (1 + root) - 0.3 * min(strength, 0.5)) if d_of == "davies" else a * root / (1 + 1.5 * root)
        lg = k + q * u[0] + nu @ u[2:] + d * (z**2 - nu @ free**2)
        return 10.0 ** np.clip(lg, -300, 3), strength

    def residual(u: np.ndarray) -> np.ndarray:
        m, strength = molalities(u)
        return np.concatenate(
            [
                [(z @ m) / (np.abs(z) @ m), np.log(0.5 * (z**2 @ m) / strength)],
                np.log(nu.T @ m / wanted),
            ]
        )

    best = None
    for ph in np.linspace(1.0, 13.0, 13):
        start = np.concatenate([[ph, np.log(wanted.sum())], np.log10(wanted) - 1.0])
        found = least_squares(residual, start, xtol=1e-15, ftol=1e-15, gtol=1e-15, max_nfev=4000)
        if best is None or found.cost < best.cost:
            best = found
        if best.cost < 1e-24:
            break
    assert best is not None
    assert best.cost < 1e-18, "the independent solution did not close"
    return float(best.x[0]), float(np.exp(best.x[1]))
