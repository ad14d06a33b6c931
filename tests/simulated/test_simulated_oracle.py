"""The oracle knows the true spreads: its statistics have the distributions that theory gives them."""

import numpy as np
import pytest

from tests.simulated.oracle import consult, covariance, residuals, signature
from tests.simulated.simulator import simulate


def test_weighted_squares_of_clean_residuals_are_chi_square():
    # r'V⁻¹r of n normal residuals has mean n and variance 2n (common knowledge); 30 records of 80 readings
    found = []
    for seed in range(30):
        r = residuals(simulate(seed))
        found.append(r @ np.linalg.solve(covariance(seed), r) / len(r))
    assert np.mean(found) == pytest.approx(1.0, abs=4.0 * np.sqrt(2.0 / 80 / 30))


def test_the_best_test_has_unit_spread_about_its_mean():
    # a step is added to what the meter does anyway, so the value is normal about its mean with unit variance
    oracles = [consult(seed, "meter_step", 0.05) for seed in range(30)]
    departures = np.array([o.value - o.mean for o in oracles])
    assert departures.mean() == pytest.approx(0.0, abs=4.0 / np.sqrt(30))
    assert departures.std() == pytest.approx(1.0, abs=0.4)


def test_a_signature_is_the_fault_alone():
    shift = signature(5, "meter_offset")
    simulated = simulate(5, ["meter_offset"])
    (planted,) = simulated.truth
    expected = np.zeros(len(shift))
    expected[list(planted.readings)] = planted.size
    assert shift == pytest.approx(expected, abs=1e-5)
    with pytest.raises(ValueError, match="depends on the readings shown"):
        signature(5, "reading_slip")
