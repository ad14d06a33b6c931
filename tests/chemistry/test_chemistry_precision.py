"""The engine against an independent solution with 50 digits, and against a general equilibrium library."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import numpy as np
import pytest
from fifty_digits import Acid, ph_of

from reconcile.chemistry.acids import acid_table
from reconcile.chemistry.predict import predict_ph
from reconcile.chemistry.temperature import solvent
from reconcile.records.settings import Settings
from reconcile.records.substances import Form, catalogue, ions

CHEMPY = Path(__file__).parents[1] / "published" / "chempy_ideal.csv"


def mixtures(count: int, seed: int) -> list[tuple[list[Form], list[float], float]]:
    """Random mixtures of one to four forms of the library [mol/kg] and temperatures [°C]."""
    rng = np.random.default_rng(seed)
    forms = catalogue().forms
    out = []
    for _ in range(count):
        chosen = [forms[i] for i in rng.choice(len(forms), rng.integers(1, 5), replace=False)]
        out.append((chosen, (10.0 ** rng.uniform(-5.0, -1.2, len(chosen))).tolist(), float(rng.uniform(0.0, 60.0))))
    return out


def independent(chosen: list[Form], amounts: list[float], temperature: float, model: str) -> tuple[float, float]:
    table = acid_table()
    water = solvent(np.array([temperature]))
    totals: dict[str, float] = {}
    strong: list[tuple[int, float]] = []
    for form, amount in zip(chosen, amounts, strict=True):
        for acid, units in form.acids.items():
            totals[acid] = totals.get(acid, 0.0) + units * amount
        strong.extend((ions()[ion].charge, n * amount) for ion, n in form.strong_ions.items())
    acids = []
    for name, total in totals.items():
        i = table.index[name]
        q = range(table.first[i], table.first[i] + table.steps[i])
        pka = [float(v) for v in table.pka_at(np.array(q), np.array(temperature))]
        sizes = table.size[table.first[i] + i : table.first[i] + i + table.steps[i] + 1]
        acids.append(Acid(int(table.charge[i]), pka, total, sizes.tolist()))
    ph, strength = ph_of(model, float(water.a[0]), float(water.b[0]), float(water.pkw[0]), acids, strong)
    return float(ph), float(strength)


@pytest.mark.parametrize(
    ("model", "count"), [("davies", 100), ("bates-guggenheim", 100), ("extended", 40), ("ideal", 40)]
)
def test_random_mixtures_against_50_digits(model: str, count: int) -> None:
    cases = mixtures(count, seed=20 + count)
    names = sorted({form.name for chosen, *_ in cases for form in chosen})
    amounts = np.zeros((count, len(names)))
    for row, (chosen, some, _) in enumerate(cases):
        amounts[row, [names.index(form.name) for form in chosen]] = some
    alone = Settings({"prediction.ion_pairs": "none"})
    found = predict_ph(names, amounts, [t for *_, t in cases], unit="mol/kg", activity_model=model, settings=alone)
    for row, (chosen, some, temperature) in enumerate(cases):
        ph, strength = independent(chosen, some, temperature, model)
        assert found.ph[row] == pytest.approx(ph, abs=1e-9), [f.name for f in chosen]
        assert found.ionic_strength[row] == pytest.approx(strength, rel=1e-8)


def test_a_general_equilibrium_library_agrees_in_the_ideal_model() -> None:
    """Values of chempy 0.10.2, frozen by make_chempy_ideal.py beside them, with the same constants at 25 °C."""
    with CHEMPY.open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    assert len(rows) >= 20
    for row in rows:
        parts = json.loads(row["recipe_mol_kg"])
        alone = Settings({"prediction.activity_model": "ideal", "prediction.ion_pairs": "none"})
        found = predict_ph(list(parts), list(parts.values()), 25.0, unit="mol/kg", settings=alone)
        assert found.ph[0] == pytest.approx(float(row["pH"]), abs=1e-5), parts  # water in excess, see the script
