"""The calculation behind one prediction, for a reviewer: molalities, constants with sources, every species."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from reconcile.chemistry.acids import AcidTable, acid_table
from reconcile.chemistry.activity import activity_model
from reconcile.chemistry.composition import Contents, form_table, pad
from reconcile.chemistry.hand_record import Facts, HandValue, hand_values
from reconcile.chemistry.pair_rows import laid_out
from reconcile.chemistry.pair_solve import solve_pairs
from reconcile.chemistry.pka_law import equations
from reconcile.chemistry.prediction import u_of_model
from reconcile.chemistry.solve import solve
from reconcile.chemistry.temperature import solvent
from reconcile.chemistry.trail_species import Solved, Species, acting, all_species
from reconcile.chemistry.water import DENSITY_20C, ZERO_CELSIUS, co2_solubility
from reconcile.records.settings import Settings
from reconcile.records.substances import Form, ions

WATER_SOURCES = (
    ("density", "IAPWS SR6-08(2011)"),
    ("pKw", "IAPWS R11-07(2019)"),
    ("Debye-Hückel A and B", "from density and permittivity, IAPWS SR6-08(2011), and constants of CODATA 2018"),
)


@dataclass(frozen=True)
class Brought:
    """One part: its molality [mol/kg], and what it brings, in words."""

    name: str
    molality: float
    brings: str


@dataclass(frozen=True)
class ConstantUsed:
    """One ionization constant: at 25 °C and I = 0, at the temperature, and as it acts in the solution."""

    acid: str
    step: int
    pka_25c: float
    u_25c: float
    pka: float
    u: float
    acting: float
    how: str
    source: str


@dataclass(frozen=True)
class PairUsed:
    """One ion pair or condensed species: lg K at the temperature and I = 0."""

    name: str
    lg_k: float
    u: float
    source: str


@dataclass(frozen=True)
class Trail:
    """The calculation behind one prediction.

    pkw, a, b : water's constant and the Debye-Hückel coefficients at the temperature
    model : name, source of its equation, what is uncertain in it
    charge : sum of molality times charge over all species, 0 but for rounding [mol/kg]
    """

    temperature_c: float
    density_20c: float
    brought: tuple[Brought, ...]
    pkw: float
    a: float
    b: float
    model: tuple[str, str, str]
    ph: float
    ionic_strength: float
    constants: tuple[ConstantUsed, ...]
    pairs: tuple[PairUsed, ...]
    species: tuple[Species, ...]
    charge: float
    hand: tuple[HandValue, ...]


def _brings(form: Form) -> str:
    words = [f"{number:g} {ion}" for ion, number in form.ions.items() if not ions()[ion].acid]
    if form.acid:
        words.append(f"{form.acid_units:g} {form.acid} with {form.protons_removed:g} H removed")
    words += [f"{number:g} {ion} (of {ions()[ion].acid})" for ion, number in form.ions.items() if ions()[ion].acid]
    return ", ".join(words) or "nothing that takes part"


def _constants(
    acids: AcidTable, present: Sequence[int], temperature_c: float, species: Sequence[Species]
) -> tuple[ConstantUsed, ...]:
    out = []
    known = equations() if acids.use_equations else {}
    for acid in present:
        name = acids.names[acid]
        for step, row in enumerate(acids.of(name), start=1):
            q = np.array(acids.first[acid] + step - 1)
            pka = float(acids.pka_at(q, np.array(temperature_c)))
            found = known.get((name, step))
            if found is None:
                how, source = "enthalpy and heat capacity", row.source
            else:
                beyond = temperature_c > found.high_c
                how = f"equation to {found.high_c:g} °C" + (", then enthalpy and heat capacity" if beyond else "")
                source = f"{row.source}; with temperature: {found.source}"
            out.append(
                ConstantUsed(
                    name,
                    step,
                    row.pka,
                    row.u,
                    pka,
                    float(acids.u_at(q, np.array(temperature_c + ZERO_CELSIUS))),
                    acting(species, name, step, pka, int(acids.charge[acid])),
                    how,
                    source,
                )
            )
    return tuple(out)


def trail(forms: Sequence[Form], molality: Sequence[float], temperature_c: float, settings: Settings) -> Trail:
    """The calculation for one solution.

    Parameters
    ----------
    forms, molality : sequences (k,)
        What it holds [mol/kg].
    temperature_c : float
    settings : Settings
        Activity model, equations, ion pairs, open to air.

    Returns
    -------
    Trail

    Raises
    ------
    ValueError
        When no pH is reached for the solution.
    """
    acids = acid_table(settings["prediction.pk_equations"], settings["prediction.ion_pairs"])
    model = activity_model(settings["prediction.activity_model"])
    air = 0.0
    if settings["prediction.open_to_air"]:
        pressure = settings["prediction.co2_partial_pressure_atm"]
        air = float(co2_solubility(np.array(temperature_c))[0] * pressure)
    contents = Contents(
        np.array([0, len(forms)]),
        np.arange(len(forms)),
        np.array(molality, float),
        np.array([temperature_c]),
        np.array([air]),
    )
    table, water = form_table(list(forms), acids), solvent(np.array([temperature_c]))
    chunk, padding = pad(contents, np.arange(1), table, acids, water, model)
    ph, strength, fine = solve(chunk, model)
    _, lay, pairs = laid_out(chunk, padding, contents, table, acids, water, fine)
    y = np.zeros((0, 1))
    if lay is not None:
        ph, strength, y, fine = solve_pairs(lay, model, ph, strength)
    if not fine[0]:
        raise ValueError("no pH was reached for this solution")
    solved = Solved(chunk, padding, contents, table, water, ph, strength, lay, pairs if lay is not None else (), y)
    species = all_species(solved, acids, model)
    constants = _constants(acids, padding.columns.tolist(), temperature_c, species)
    by_name = {s.name: s for s in species}
    facts = Facts(
        float(ph[0]),
        float(strength[0]),
        by_name["H+"].lg_gamma,
        temperature_c,
        by_name["H+"].molality,
        by_name["OH-"].molality,
        tuple(c.pka_25c for c in constants),
        tuple(c.acting for c in constants),
        float(water.pkw[0]),
        sum(by_name[pair.name].molality for pair in solved.pairs if pair.name in by_name),
    )
    kelvin = np.array(temperature_c + ZERO_CELSIUS)
    return Trail(
        temperature_c,
        DENSITY_20C,
        tuple(Brought(form.name, float(m), _brings(form)) for form, m in zip(forms, molality, strict=True)),
        float(water.pkw[0]),
        float(water.a[0]),
        float(water.b[0]),
        (model.name, model.source, f"{model.coefficient}; standard uncertainty {u_of_model(model, settings):g}"),
        facts.ph,
        facts.strength,
        constants,
        tuple(PairUsed(p.name, float(p.value(kelvin)[0]), float(p.u_at(kelvin)), p.source) for p in solved.pairs),
        tuple(species),
        float(sum(s.molality * s.charge for s in species)),
        hand_values(forms, molality, temperature_c, air, acids, model, facts),
    )
