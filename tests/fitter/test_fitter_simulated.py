"""Simulated truth: closeness to the Cramér-Rao bound, coverage, and what a blunder does (1,000 series: tests/bench)."""

from __future__ import annotations

import numpy as np
import pytest
from simulated_fits import moves, quality, simulated

SERIES = 400
# limits for 400 series: 4 standard errors of a share near 95 % are 4.4 %; of an RMS ratio, 4 sqrt(1/800) = 14 %


@pytest.mark.parametrize("strength", [False, True], ids=["strength fixed", "strength free"])
@pytest.mark.parametrize("steps", [1, 2])
def test_estimates_are_as_good_as_they_can_be_and_intervals_hold_the_truth(steps: int, strength: bool) -> None:
    found = quality(simulated(steps, strength, SERIES, 20, seed=11 * steps + strength))
    assert np.all(found.error < 1.14)
    assert np.all(np.abs(found.coverage - 0.95) < 0.044)
    # at a family-wise 1 %, clean series rarely lose a reading
    assert found.rejected < 0.03


def test_one_error_of_ten_standard_deviations_in_eleven_readings_hardly_moves_the_estimate() -> None:
    made, clean = (simulated(1, False, SERIES, 11, seed=5, blunder=b) for b in (10.0, 0.0))
    # one seed draws one noise, so that the two differ by the blunder alone
    assert np.mean(moves(made, clean) < 1.0) >= 0.95


def test_two_errors_cannot_hide_one_another() -> None:
    made = simulated(1, False, 50, 20, seed=7)
    clean = simulated(1, False, 50, 20, seed=7)
    observed = made.task.observed.reshape(50, 20)
    observed[:, 6] += 0.2
    observed[:, 9] += 0.2
    assert np.mean(moves(made, clean) < 1.5) >= 0.95
