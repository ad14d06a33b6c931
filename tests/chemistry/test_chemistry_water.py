"""Water and Debye-Hueckel coefficients against the iapws library and published tables."""

from __future__ import annotations

import csv
import warnings
from pathlib import Path

import iapws
import numpy as np
import pytest
from iapws._iapws import _Dielectric, _Kw

from reconcile.chemistry.temperature import debye_hueckel, solvent
from reconcile.chemistry.water import DENSITY_20C, co2_solubility, density, permittivity, pkw

PUBLISHED = Path(__file__).parents[1] / "published" / "activity_reference.csv"
TEMPERATURES = np.linspace(0.0, 60.0, 25)
ATMOSPHERE = 0.101325  # MPa


def reference(quantity: str, source: str = "") -> list[tuple[float, float]]:
    with PUBLISHED.open(encoding="utf-8", newline="") as file:
        return [
            (float(r["temperature_C"]), float(r["value"]))
            for r in csv.DictReader(file)
            if r["quantity"] == quantity and source in r["source"]
        ]


def test_density_is_that_of_iapws_95() -> None:
    for t in (1.0, 4.0, 20.0, 25.0, 40.0, 60.0, 90.0):
        expected = iapws.IAPWS95(T=t + 273.15, P=ATMOSPHERE).rho / 1000.0
        assert density(np.array([t]))[0][0] == pytest.approx(expected, rel=2e-6)
    assert pytest.approx(0.998207, abs=2e-6) == DENSITY_20C  # IAPWS-95 at 20 °C and one atmosphere


def test_permittivity_is_that_of_iapws_r8_97() -> None:
    for t in TEMPERATURES[1:]:
        kelvin = float(t) + 273.15
        rho = float(density(np.array([t]))[0][0]) * 1000.0
        assert permittivity(np.array([t]))[0][0] == pytest.approx(_Dielectric(rho, kelvin), abs=0.05)  # 0.06 %


def test_pkw_is_that_of_the_iapws_library_within_0_002() -> None:
    for t in TEMPERATURES[1:]:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            rho = iapws.IAPWS95(T=float(t) + 273.15, P=ATMOSPHERE).rho
        assert pkw(np.array([t]))[0][0] == pytest.approx(_Kw(rho, float(t) + 273.15), abs=0.002)


def test_pkw_at_0_c_and_25_c() -> None:
    # CRC Handbook, "Ionization constant of water" at 0.1 MPa: 14.946 at 0 °C; 13.995 at 25 °C (IAPWS R11-07)
    assert pkw(np.array([0.0, 25.0]))[0] == pytest.approx([14.946, 13.995], abs=0.002)


@pytest.mark.parametrize("quantity", ["debye_huckel_A_log10_molal"])
def test_debye_hueckel_a_within_half_a_percent(quantity: str) -> None:
    # computed from CODATA constants with IAPWS-95 density and permittivity; and GOST 8.134-2014 table 2
    for source in ("CODATA", "GOST"):
        table = [(t, a) for t, a in reference(quantity, source) if t <= 60.0]
        assert len(table) >= 10
        for t, a in table:
            assert debye_hueckel(np.array([t]))[0][0] == pytest.approx(a, rel=0.005)


def test_debye_hueckel_b_within_half_a_percent() -> None:
    table = [(t, b) for t, b in reference("debye_huckel_B_molal", "CODATA") if t <= 60.0]
    assert len(table) >= 10
    for t, b in table:
        assert debye_hueckel(np.array([t]))[2][0] == pytest.approx(b, rel=0.005)


@pytest.mark.parametrize("function", [density, permittivity, pkw, co2_solubility])
def test_slopes_are_those_of_the_values(function) -> None:
    t, step = np.linspace(0.5, 95.0, 20), 1e-3
    slope = (function(t + step)[0] - function(t - step)[0]) / (2.0 * step)
    assert function(t)[1] == pytest.approx(slope, rel=1e-5, abs=1e-9)


def test_slopes_of_a_and_b() -> None:
    t, step = np.linspace(0.5, 95.0, 20), 1e-3
    up, down, here = debye_hueckel(t + step), debye_hueckel(t - step), debye_hueckel(t)
    assert here[1] == pytest.approx((up[0] - down[0]) / (2.0 * step), rel=1e-6)
    assert here[3] == pytest.approx((up[2] - down[2]) / (2.0 * step), rel=1e-6)


def test_carbon_dioxide_solubility() -> None:
    # Plummer and Busenberg 1982, Geochim. Cosmochim. Acta 46:1011, equation for lg K_H, from memory; within 2 %
    t = np.array([0.0, 10.0, 25.0, 40.0])
    kelvin = t + 273.15
    lg = 108.3865 + 0.01985076 * kelvin - 6919.53 / kelvin - 40.45154 * np.log10(kelvin) + 669365.0 / kelvin**2
    assert co2_solubility(t)[0] == pytest.approx(10.0**lg, rel=0.02)


def test_outside_0_to_100_c_there_is_no_answer() -> None:
    found = solvent(np.array([-0.1, 0.0, 100.0, 100.1, np.nan]))
    assert np.isnan(found.pkw).tolist() == [True, False, False, True, True]
    assert np.isnan(found.a).tolist() == [True, False, False, True, True]
