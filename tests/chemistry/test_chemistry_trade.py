"""Facts of the trade, each marked with where it comes from: common practice, no source."""

from __future__ import annotations

import numpy as np
import pytest

from reconcile.chemistry.acids import acid_table
from reconcile.chemistry.predict import predict_ph
from reconcile.chemistry.temperature import solvent

WEAK = ("acetic acid", "formic acid", "lactic acid", "benzoic acid", "propionic acid", "hydrocyanic acid")


def ideal(acid: str, amounts: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """pH and degree of ionization of a weak acid in the ideal model at 25 °C."""
    found = predict_ph([acid], amounts[:, None], unit="mol/kg", activity_model="ideal")
    return found.ph, found.degree.dense()[:, 0]


def pka(acid: str) -> float:
    return acid_table().of(acid)[0].pka


@pytest.mark.parametrize("acid", WEAK[:5])
def test_square_root_shortcut_under_5_percent_ionized(acid: str) -> None:
    """Common practice, no source: [H+] = sqrt(Ka c) serves where a weak acid is ionized under 5 %."""
    amounts = 10.0 ** np.linspace(-4.5, 0.0, 60)
    ph, degree = ideal(acid, amounts)
    shortcut = 0.5 * (pka(acid) - np.log10(amounts))
    error = np.abs(ph - shortcut)
    under = degree < 0.05
    assert under.any()
    assert (~under).any()
    assert error[under].max() <= 0.012
    grows = error[~under & (amounts > 1e-4)][::-1]  # ever more dilute
    assert np.all(np.diff(grows) > 0.0)


@pytest.mark.parametrize("acid", WEAK)
def test_degree_of_ionization_rises_on_dilution_to_its_bound(acid: str) -> None:
    """Common practice, no source: dilution ionizes a weak acid; water's own ions set the bound Ka/(Ka + 1e-7)."""
    ph, degree = ideal(acid, 10.0 ** np.linspace(0.0, -9.0, 80))
    ka = 10.0 ** -pka(acid)
    neutral = 10.0 ** (-0.5 * float(solvent(np.array([25.0])).pkw[0]))
    assert np.all(np.diff(degree) > 0.0)
    assert np.all(degree < ka / (ka + neutral))
    assert np.all(np.diff(ph) > 0.0)


def test_at_equal_concentration_the_larger_ka_gives_the_lower_ph() -> None:
    """Common practice, no source."""
    acids = sorted(WEAK, key=pka)
    found = predict_ph(acids, 0.01 * np.eye(len(acids)))
    assert np.all(np.diff(found.ph) > 0.0)


def test_a_trace_of_strong_acid_stays_just_below_neutral() -> None:
    """Common practice, no source: 1e-8 mol/L HCl reads 6.98, not 8."""
    found = predict_ph(["HCl"], [[1e-8], [0.0]])
    assert found.ph[0] < found.ph[1]
    assert found.ph[0] == pytest.approx(found.ph[1] - 0.0217, abs=0.001)  # h = (c + sqrt(c^2 + 4 Kw)) / 2


def test_tris_falls_about_0_028_per_kelvin_and_phosphate_hardly() -> None:
    """Common practice, no source: Tris loses 0.028 pH per kelvin near 25 °C, phosphate 0.003."""
    tris = predict_ph(["Tris", "HCl"], [[0.05, 0.025]])
    phosphate = predict_ph(["KH2PO4", "Na2HPO4"], [[0.025, 0.025]])
    assert tris.d_temperature[0] == pytest.approx(-0.028, abs=0.001)
    assert phosphate.d_temperature[0] == pytest.approx(-0.003, abs=0.001)


def test_hydrates_and_potassium_twins_give_the_same_ph() -> None:
    """Common practice, no source: equal moles of a hydrate or of the potassium salt act alike."""
    acetate = predict_ph(
        ["acetic acid", "sodium acetate", "sodium acetate trihydrate", "potassium acetate"],
        [[0.05, 0.05, 0, 0], [0.05, 0, 0.05, 0], [0.05, 0, 0, 0.05]],
    )
    assert np.ptp(acetate.ph) < 1e-12


def test_half_neutralised_reads_its_apparent_constant() -> None:
    """Common practice, no source: half neutralised, an acid reads its pKa at that ionic strength."""
    found = predict_ph(["acetic acid", "NaOH"], [0.1, 0.05], unit="mol/kg", activity_model="ideal")
    assert found.ph[0] == pytest.approx(4.756, abs=0.001)


def test_equivalents_of_one_reaction_agree() -> None:
    """Common practice, no source: Na2HPO4 with HCl is the same solution as NaH2PO4 with NaCl."""
    one = predict_ph(["Na2HPO4", "HCl"], [0.05, 0.05]).ph[0]
    other = predict_ph(["sodium dihydrogen phosphate", "NaCl"], [0.05, 0.05]).ph[0]
    assert one == pytest.approx(other, abs=1e-9)
