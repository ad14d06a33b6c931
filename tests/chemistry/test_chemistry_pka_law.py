"""pKa against temperature: published equations, what follows beyond their range, and water's share in the curve."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

from reconcile.chemistry.acids import acid_table, build
from reconcile.chemistry.pka_law import equations
from reconcile.chemistry.water import pkw

PUBLISHED = Path(__file__).parents[1] / "published" / "pka_temperature.csv"


def index(acid: str, step: int) -> np.ndarray:
    table = acid_table()
    return np.array(table.first[table.index[acid]] + step - 1)


def pka(acid: str, step: int, celsius: float, use_equations: bool = True) -> float:
    return float(acid_table(use_equations).pka_at(index(acid, step), np.array(celsius)))


@pytest.mark.parametrize(("acid", "step"), sorted(equations()))
def test_an_equation_goes_through_the_tables_value_at_25_c(acid: str, step: int) -> None:
    assert pka(acid, step, 25.0) == pytest.approx(acid_table().pka[index(acid, step)], abs=1e-9)


@pytest.mark.parametrize(("acid", "step"), sorted(equations()))
def test_beyond_its_range_the_constant_goes_on_without_a_step(acid: str, step: int) -> None:
    edge = equations()[acid, step].high_c
    assert pka(acid, step, edge + 1e-6) == pytest.approx(pka(acid, step, edge), abs=1e-6)
    # and bends no more than the two laws differ there
    assert abs(pka(acid, step, edge + 1.0) - 2.0 * pka(acid, step, edge) + pka(acid, step, edge - 1.0)) < 0.004


def emf() -> list[dict[str, str]]:
    with PUBLISHED.open(encoding="utf-8", newline="") as file:
        return [
            r
            for r in csv.DictReader(file)
            if r["acid"] != "water"
            and (r["acid"], int(r["step"])) in equations()
            and float(r["temperature_C"]) <= equations()[r["acid"], int(r["step"])].high_c
            and "equation" in r["source"]
        ]


def test_equations_meet_the_published_values_but_for_the_value_at_25_c() -> None:
    """Values of emf cells (sources in the csv); the table's own value at 25 °C may differ by its u, 0.01."""
    rows = emf()
    assert len({(r["acid"], r["step"]) for r in rows}) >= 15
    for r in rows:
        found = pka(r["acid"], int(r["step"]), float(r["temperature_C"]))
        assert found == pytest.approx(float(r["pKa"]), abs=0.011), (r["acid"], r["step"], r["temperature_C"])


def test_with_equations_the_constants_come_nearer_to_the_published_values() -> None:
    with_, without = [], []
    for r in emf():
        place = r["acid"], int(r["step"]), float(r["temperature_C"])
        with_.append(pka(*place) - float(r["pKa"]))
        without.append(pka(*place, use_equations=False) - float(r["pKa"]))
    assert np.std(with_) < 0.7 * np.std(without)


def test_boric_acid_at_95_c() -> None:
    """Mesmer, Baes and Sweeton 1972, equation for B(OH)3 + OH-, by hand with pKw 12.334 (IAPWS R11-07, 95 °C)."""
    kelvin = 368.15
    by_hand = 12.334 - (1573.21 / kelvin + 28.6059 + 0.012078 * kelvin - 13.2258 * np.log10(kelvin))
    assert pka("boric acid", 1, 95.0) == pytest.approx(by_hand, abs=0.003)


def test_neutral_and_anionic_acids_follow_water_and_cations_do_not() -> None:
    """HA + OH- = A- + H2O keeps its heat capacity: a table with water's enthalpy and heat capacity gives pKw itself."""
    own = acid_table().of("acetic acid")[0]
    celsius = np.array([0.0, 25.0, 60.0, 95.0])
    around = np.array([24.5, 25.0, 25.5])
    value, slope = pkw(around)
    r_ln10 = 8.31446261815324 * np.log(10.0)
    enthalpy = -r_ln10 * (around + 273.15) ** 2 * slope
    from dataclasses import replace

    like_water = replace(
        own, pka=float(value[1]), dh_kj_mol=float(enthalpy[1]) / 1000.0, dcp_j_k_mol=float(enthalpy[2] - enthalpy[0])
    )
    found = build([like_water]).pka_at(np.zeros(4, np.intp), celsius)
    assert found == pytest.approx(pkw(celsius)[0], abs=1e-6)
    cation = build([replace(like_water, charge=1)]).pka_at(np.zeros(4, np.intp), celsius)
    assert abs(cation[3] - found[3]) > 0.01


def test_the_uncertainty_grows_only_beyond_the_range_of_an_equation() -> None:
    table = acid_table()
    q = np.array([index("acetic acid", 1), index("malic acid", 1)])
    inside, beyond = table.u_at(q, np.full(2, 273.15 + 55.0)), table.u_at(q, np.full(2, 273.15 + 90.0))
    assert inside[0] == table.u[q[0]]
    assert inside[1] > table.u[q[1]]
    assert np.all(beyond > inside)
