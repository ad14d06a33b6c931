"""What a prediction cannot see of a solution: codes and sentences for each solution, by one table.

A notice changes no number. It says that something in the bottle is outside the balance, and which way pH would go where
that is known.
"""

from __future__ import annotations

import csv
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cache
from pathlib import Path

import numpy as np

from reconcile.chemistry.acids import AcidTable, acid_table
from reconcile.records.results import Prediction
from reconcile.records.settings import Settings
from reconcile.records.substances import Form, catalogue

SENTENCES: Mapping[str, str] = {
    "concentrated": "The ionic strength, {value:.2g} mol/kg, is above {limit:g} mol/kg: activity coefficients are "
    "little known there, and u grows with it.",
    "mixed-solvent": "{name} makes up about {value:.2g} % of the solvent: ionization constants, the scale of pH and "
    "the electrode's response hold for water, and none of that is in u.",
    "metal-complexes": "{metals} with {ligands}: their complexes are not in the balance and a solid may form, either "
    "of which lowers pH where the ligand still holds protons; none of that is in u.",
    "polyol-borate": "{name} with borate: their complexes are stronger acids than boric acid and are not in the "
    "balance, so that pH is lower than predicted; none of that is in u.",
    "saturated": "{name} is above what dissolves in water at 25 °C, about {limit:.2g} g/kg: undissolved solid is not "
    "in the balance.",
    "carbon-dioxide-uptake": "Carbon dioxide from the air may lower pH by up to {value:.2g}: dilute alkaline and "
    "unbuffered solutions take it up within minutes.",
    "carbon-dioxide-loss": "Bicarbonate loses carbon dioxide to the air until pH has risen; the prediction is for a "
    "closed vessel.",
    "electrode-glass": "Undissociated hydrofluoric acid, about {value:.2g} mol/kg, attacks the glass of an electrode.",
}
"""Code -> sentence. Words in braces come with each notice."""

METALS = ("Ca2+", "Mg2+", "Ba2+")
_METAL_NAMES = {"Ca2+": "calcium", "Mg2+": "magnesium", "Ba2+": "barium"}
LIGANDS = (
    *("phosphoric acid", "citric acid", "carbonic acid", "EDTA", "NTA", "oxalic acid", "tartaric acid", "malic acid"),
    *("succinic acid", "malonic acid", "maleic acid", "phthalic acid", "hydrofluoric acid", "pyrophosphoric acid"),
    *("sulfuric acid", "phosphorous acid", "arsenic acid", "silicic acid", "EGTA"),
)
"""Acids whose anions bind calcium or magnesium or form solids with them; common practice, no source."""
POLYOLS = (
    "mannitol",
    "sorbitol",
    "glycerol",
    "glucose",
    "glucose monohydrate",
    "fructose",
    "xylitol",
    "propylene glycol",
)
SOLVENTS = ("ethanol", "methanol", "2-propanol", "acetonitrile", "propylene glycol", "glycerol")
LEAST = 1e-4  # mol/kg of each of two that might bind; below, what they do lies within u
SOLVENT_PERCENT = 2.0  # % w/w; changes pKa by about 0.02 from there on; common practice, no source
UPTAKE = 0.02  # pH, from which on carbon dioxide is worth a sentence
LEAST_HF = 0.01  # mol/kg


@dataclass(frozen=True)
class Notice:
    """One notice on one solution: its code in SENTENCES, and the sentence."""

    code: str
    text: str


@dataclass(frozen=True)
class Solubility:
    """How much of a form, or of the uncharged form of an acid, dissolves [g/kg of water] at 25 °C."""

    substance: str
    of_acid: bool
    g_per_kg: float


@cache
def solubilities() -> tuple[Solubility, ...]:
    """The rows of solubility.csv."""
    with (Path(__file__).parent / "solubility.csv").open(encoding="utf-8", newline="") as file:
        return tuple(Solubility(r["substance"], r["of"] == "acid", float(r["g_per_kg"])) for r in csv.DictReader(file))


def notices(
    forms: Sequence[Form],
    molality: Sequence[float],
    prediction: Prediction,
    row: int,
    settings: Settings,
    acids: AcidTable | None = None,
) -> tuple[Notice, ...]:
    """Notices on one solution, in the order of SENTENCES.

    Parameters
    ----------
    forms : sequence of Form (k,)
        What it holds.
    molality : sequence of float (k,)
        How much of each [mol/kg].
    prediction : Prediction
        In which the solution is row `row`.
    settings : Settings
    acids : AcidTable, optional
        By default the table of the package.

    Returns
    -------
    tuple of Notice
    """
    table = acids or acid_table()
    found: dict[str, float] = {}
    metals: dict[str, float] = {}
    held: dict[str, float] = {}
    for form, amount in zip(forms, molality, strict=True):
        if not amount > 0.0:
            continue
        held[form.name] = held.get(form.name, 0.0) + amount
        for acid, number in form.acids.items():
            found[acid] = found.get(acid, 0.0) + amount * number
        for ion, number in form.strong_ions.items():
            if ion in METALS:
                metals[ion] = metals.get(ion, 0.0) + amount * number
    ph, kelvin = float(prediction.ph[row]), float(prediction.temperature_c[row])
    out = [
        *_concentrated(float(prediction.ionic_strength[row]), settings),
        *_solvents(held),
        *_metals(metals, found),
        *_polyols(held, found),
        *_saturated(held, found, ph, kelvin, table),
        *_gas(prediction, row, found, ph, settings),
        *_glass(found, ph, kelvin, table),
    ]
    order = list(SENTENCES)
    return tuple(sorted(out, key=lambda notice: order.index(notice.code)))


def _say(code: str, **words: object) -> Notice:
    return Notice(code, SENTENCES[code].format(**words))


def _concentrated(strength: float, settings: Settings) -> list[Notice]:
    limit = float(settings["status.outside_model_ionic_strength"])
    return [_say("concentrated", value=strength, limit=limit)] if strength > limit else []


def _solvents(held: Mapping[str, float]) -> list[Notice]:
    out = []
    for name in SOLVENTS:
        grams = held.get(name, 0.0) * catalogue().by_name[name].molar_mass if name in held else 0.0
        percent = 100.0 * grams / (1000.0 + grams)
        if percent >= SOLVENT_PERCENT:
            out.append(_say("mixed-solvent", name=name[0].upper() + name[1:], value=percent))
    return out


def _listed(names: Sequence[str]) -> str:
    return names[0] if len(names) == 1 else f"{', '.join(names[:-1])} and {names[-1]}"


def _metals(metals: Mapping[str, float], found: Mapping[str, float]) -> list[Notice]:
    some = [_METAL_NAMES[metal] for metal in METALS if metals.get(metal, 0.0) >= LEAST]
    ligands = [acid for acid in LIGANDS if found.get(acid, 0.0) >= LEAST]
    if not some or not ligands:
        return []
    words = _listed(some)
    return [_say("metal-complexes", metals=words[0].upper() + words[1:], ligands=_listed(ligands))]


def _polyols(held: Mapping[str, float], found: Mapping[str, float]) -> list[Notice]:
    some = [name for name in POLYOLS if held.get(name, 0.0) >= LEAST]
    if not some or found.get("boric acid", 0.0) < LEAST:
        return []
    words = _listed(some)
    return [_say("polyol-borate", name=words[0].upper() + words[1:])]


def _uncharged(acid: str, total: float, ph: float, temperature_c: float, table: AcidTable) -> float:
    """Molality of an acid's uncharged form [mol/kg], activity coefficients left out."""
    index = table.index[acid]
    first, steps, charge = int(table.first[index]), int(table.steps[index]), int(table.charge[index])
    pka = table.pka_at(np.arange(first, first + steps), np.full(steps, temperature_c))
    lg = np.concatenate([[0.0], np.cumsum(ph - pka)])
    weight = 10.0 ** np.clip(lg - lg.max(), -300.0, 0.0)
    return float(total * weight[charge] / weight.sum()) if 0 <= charge <= steps else 0.0


def _saturated(
    held: Mapping[str, float], found: Mapping[str, float], ph: float, temperature_c: float, table: AcidTable
) -> list[Notice]:
    out = []
    for one in solubilities():
        if one.of_acid:
            amount, name = 0.0, one.substance
            if one.substance in found and np.isfinite(ph):
                amount = _uncharged(one.substance, found[one.substance], ph, temperature_c, table)
            form = catalogue().by_name.get(one.substance)
            mass = form.molar_mass if form is not None else 96.1  # silicic acid, Si(OH)4
            name = f"Uncharged {one.substance}"
        else:
            amount, mass = held.get(one.substance, 0.0), catalogue().by_name[one.substance].molar_mass
            name = one.substance[0].upper() + one.substance[1:]
        if amount * mass > one.g_per_kg:
            out.append(_say("saturated", name=name, limit=one.g_per_kg))
    return out


def _gas(prediction: Prediction, row: int, found: Mapping[str, float], ph: float, settings: Settings) -> list[Notice]:
    out = []
    share = float(prediction.budget.get("carbon dioxide", np.zeros(row + 1))[row])
    if share * 3.0**0.5 > UPTAKE:  # the share is the largest change over sqrt 3
        out.append(_say("carbon-dioxide-uptake", value=share * 3.0**0.5))
    if found.get("carbonic acid", 0.0) >= LEAST and ph < 10.0 and not settings["prediction.open_to_air"]:
        out.append(_say("carbon-dioxide-loss"))
    return out


def _glass(found: Mapping[str, float], ph: float, temperature_c: float, table: AcidTable) -> list[Notice]:
    total = found.get("hydrofluoric acid", 0.0)
    free = _uncharged("hydrofluoric acid", total, ph, temperature_c, table) if total and np.isfinite(ph) else 0.0
    return [_say("electrode-glass", value=free)] if free >= LEAST_HF else []
