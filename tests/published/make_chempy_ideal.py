"""Makes chempy_ideal.csv: pH of mixtures by chempy (a general equilibrium library) with ideal activities at 25 °C.

Run where both chempy and the package can be imported: python tests/published/make_chempy_ideal.py
chempy gets every equilibrium in the form of its own reactions and the same constants; the balance it solves is its own.
"""

from __future__ import annotations

import csv
import json
from collections import defaultdict
from pathlib import Path

import numpy as np
from chempy import Equilibrium
from chempy._eqsys import NumSysLin, NumSysLog
from chempy.chemistry import Species
from chempy.equilibria import EqSystem

from reconcile.chemistry.acids import acid_table
from reconcile.chemistry.temperature import solvent
from reconcile.records.substances import catalogue

MOLALITY_WATER = 1e4  # so much that its own consumption shifts pH by under 3e-6: its activity is 1 in the package
EXACT = {"rref_equil": True, "rref_preserv": True}
TRIES = [
    {"NumSys": systems, "tol": tol, **more}
    for tol in (1e-13, 1e-12, 1e-11)
    for systems in ((NumSysLog,), (NumSysLin, NumSysLog), (NumSysLog, NumSysLin), (NumSysLog, NumSysLin, NumSysLog))
    for more in (EXACT, {**EXACT, "method": "lm"}, {})
]
RECIPES = [
    {"acetic acid": 0.1},
    {"acetic acid": 0.05, "sodium acetate": 0.05},
    {"sodium acetate": 0.1},
    {"acetic acid": 0.001},
    {"formic acid": 0.02, "sodium hydroxide": 0.005},
    {"hydrochloric acid": 0.01},
    {"sodium hydroxide": 0.01},
    {"potassium dihydrogen phosphate": 0.025, "disodium hydrogen phosphate": 0.025},
    {"disodium hydrogen phosphate": 0.05},
    {"trisodium phosphate": 0.02},
    {"phosphoric acid": 0.1},
    {"citric acid": 0.05},
    {"citric acid": 0.02, "trisodium citrate": 0.03},
    {"Tris": 0.05, "hydrochloric acid": 0.025},
    {"Tris": 0.05},
    {"ammonium chloride": 0.1},
    {"ammonium acetate": 0.05},
    {"sodium hydrogen carbonate": 0.025, "sodium carbonate": 0.025},
    {"sodium carbonate": 0.05},
    {"borax": 0.01},
    {"potassium hydrogen phthalate": 0.05},
    {"glycine": 0.1, "hydrochloric acid": 0.05},
    {"lactic acid": 0.02, "Tris": 0.01},
    {"oxalic acid": 0.01},
    {"succinic acid": 0.02, "sodium hydroxide": 0.03},
]


HYDROGEN, OXYGEN, CORE = 1, 8, 200  # keys of composition; each acid's core counts as an element of its own


def system(acids: set[str], start: dict[str, float]) -> float:
    """pH of a solution that starts from the given species [mol/kg]; ions that never change are left out."""
    table, water = acid_table(), solvent(np.array([25.0]))
    species = {
        "H2O": Species("H2O", composition={HYDROGEN: 2, OXYGEN: 1}),
        "H+": Species("H+", composition={HYDROGEN: 1}),
        "OH-": Species("OH-", composition={HYDROGEN: 1, OXYGEN: 1}),
    }
    equilibria = [Equilibrium({"H2O": 1}, {"H+": 1, "OH-": 1}, 10.0 ** -float(water.pkw[0]) / MOLALITY_WATER)]
    for number, acid in enumerate(sorted(acids)):
        i = table.index[acid]
        steps = int(table.steps[i])
        for step in range(steps + 1):
            composition = {CORE + number: 1} | ({HYDROGEN: steps - step} if step < steps else {})
            species[f"{acid}/{step}"] = Species(f"{acid}/{step}", composition=composition)
        for step in range(steps):
            k = 10.0 ** -float(table.pka[table.first[i] + step])
            equilibria.append(Equilibrium({f"{acid}/{step}": 1}, {f"{acid}/{step + 1}": 1, "H+": 1}, k))
    eqsys = EqSystem(equilibria, species)
    full = defaultdict(float, {name: amount for name, amount in start.items() if name in species})
    full["H2O"] = MOLALITY_WATER
    for tries in TRIES:
        x, solution, sane = eqsys.root(full, **tries)
        done = all(part["success"] for part in solution) if isinstance(solution, tuple) else solution["success"]
        if done and sane:
            break
    else:
        raise ArithmeticError(f"chempy did not solve {start}")
    return -float(np.log10(x[eqsys.as_substance_index("H+")]))


def start_of(recipe: dict[str, float]) -> tuple[set[str], dict[str, float]]:
    """Acids of a recipe, and the species it is started from: each acid at its protons removed, strong ions, H+, OH-."""
    forms, start = catalogue().by_name, defaultdict(float)
    acids: set[str] = set()
    for name, amount in recipe.items():
        form = catalogue().look_up(name).form or forms[name]
        if form.acid:
            acids.add(form.acid)
            whole, part = divmod(form.protons_removed, 1.0)
            start[f"{form.acid}/{int(whole)}"] += amount * form.acid_units * (1.0 - part)
            if part:
                start[f"{form.acid}/{int(whole) + 1}"] += amount * form.acid_units * part
        for ion, number in form.ions.items():
            other = {"NH4+": "ammonia/0"}.get(ion, ion)
            if other != ion:
                acids.add("ammonia")
            start[other] += amount * number
    return acids, dict(start)


if __name__ == "__main__":
    out = []
    for recipe in RECIPES:
        acids, start = start_of(recipe)
        try:
            out.append((json.dumps(recipe), f"{system(acids, start):.10f}"))
        except ArithmeticError as failure:
            print(failure)
    with (Path(__file__).parent / "chempy_ideal.csv").open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(("recipe_mol_kg", "pH"))
        writer.writerows(out)
