"""The simulator's own chemistry against published values, so that its truth is true."""

import numpy as np
import pytest

from reconcile.chemistry.predict import predict_records
from reconcile.records.settings import Settings
from reconcile.records.substances import catalogue
from tests.simulated import chemistry_of_truth as chemistry
from tests.simulated.simulator import simulate


def ph_of(celsius=25.0, davies=0.3, **molality):
    """PH of one solution of forms named with underscores [mol/kg]."""
    parts = [(chemistry.brings(catalogue().by_name[n.replace("_", " ")]), m) for n, m in molality.items()]
    names = sorted({a for p, _ in parts for a, _ in p.acids})
    totals = np.array([[sum(m * dict(p.acids).get(a, 0.0) for p, m in parts) for a in names]]).reshape(1, len(names))
    charge = np.array([sum(m * p.charge for p, m in parts)])
    squares = np.array([sum(m * p.squares for p, m in parts)])
    return float(chemistry.solve_ph(totals, names, charge, squares, np.array([celsius]), davies)[0])


@pytest.mark.parametrize(
    ("celsius", "published"),
    # pH(S) of potassium dihydrogen phosphate + disodium hydrogen phosphate, 0.025 mol/kg each:
    # Buck et al. 2002, Pure Appl. Chem. 74, 2169, table of primary standards, doi:10.1351/pac200274112169
    [(15, 6.900), (20, 6.881), (25, 6.865), (30, 6.853), (37, 6.841)],
)
def test_equimolal_phosphate(celsius, published):
    found = ph_of(celsius, potassium_dihydrogen_phosphate=0.025, disodium_hydrogen_phosphate=0.025)
    assert found == pytest.approx(published, abs=0.02)  # Davies at I = 0.1 mol/kg is good to about 0.02


@pytest.mark.parametrize(
    ("celsius", "published"),
    # pH(S) of borax 0.01 mol/kg, the same table of Buck et al. 2002
    [(15, 9.276), (20, 9.225), (25, 9.180), (30, 9.139), (37, 9.088)],
)
def test_borax(celsius, published):
    assert ph_of(celsius, borax_decahydrate=0.01) == pytest.approx(published, abs=0.02)


def test_hydrochloric_acid():
    # mean activity coefficient of HCl at 0.01 mol/kg, 25 °C: 0.9048 (Robinson and Stokes 1959, appendix; from memory)
    assert ph_of(hydrochloric_acid=0.01) == pytest.approx(-np.log10(0.01 * 0.9048), abs=0.005)


@pytest.mark.parametrize(
    ("celsius", "published"),
    # -log10 of the ion product of water: Marshall and Franck 1981, J. Phys. Chem. Ref. Data 10, 295 (from memory)
    [(0, 14.94), (25, 13.995), (50, 13.27)],
)
def test_ion_product_of_water(celsius, published):
    water = chemistry.constant_at(*(np.array(v) for v in chemistry.WATER_CONSTANT), np.array([celsius + 273.15]))
    assert float(water[0]) == pytest.approx(published, abs=0.015)


def test_debye_huckel_slope():
    # 0.4918 at 0 °C and 0.5115 (kg/mol)^0.5 at 25 °C: Robinson and Stokes 1959, appendix 7.1, molal scale (from memory)
    assert chemistry.debye_huckel_slope(np.array([0.0, 25.0])) == pytest.approx([0.4918, 0.5115], rel=0.01)


def test_charge_closes_and_neutral_water_is_neutral():
    assert ph_of(25.0, sodium_chloride=1e-9) == pytest.approx(13.995 / 2, abs=1e-6)


def test_each_temperature_of_a_batch_of_rows_is_its_own():
    """A row solved with others equals the row solved alone: nothing leaks between rows."""
    totals = np.array([[0.05], [0.1], [0.02]])
    charge, celsius = np.array([0.02, 0.07, -0.001]), np.array([18.0, 25.0, 36.0])
    together = chemistry.solve_ph(totals, ["acetic acid"], charge, np.abs(charge), celsius)
    for i in range(3):
        one = slice(i, i + 1)
        alone = chemistry.solve_ph(totals[one], ["acetic acid"], charge[one], np.abs(charge[one]), celsius[one])
        assert together[i] == pytest.approx(float(alone[0]), abs=1e-9)


def test_the_package_engine_predicts_what_the_simulator_prepares():
    """Two programs, one table of constants: they differ only by their equations for water and temperature."""
    for seed in range(15):
        simulated = simulate(seed)
        plain = {"prediction.activity_model": "davies", "prediction.ion_pairs": "none"}  # as the simulator has it
        prediction = predict_records(simulated.records, Settings({**simulated.settings.changed, **plain}))
        assert set(prediction.status) == {"ok"}
        assert prediction.ph == pytest.approx(simulated.world.true_ph(nominal=True), abs=0.003)
