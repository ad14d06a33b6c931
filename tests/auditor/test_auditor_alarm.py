"""Probabilities of the largest of many scores, and intervals given a selection, against what is known exactly."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from reconcile.auditor.alarm import block_p, equivalent_z, root_of
from reconcile.auditor.estimates import critical_z, given_selected
from reconcile.auditor.exact import _refined
from reconcile.auditor.faults.calibration_buffer import lots_named, reading_error
from reconcile.auditor.faults.reading_slip import transpositions


def p_of(correlation: np.ndarray, threshold: float, one_sided: bool = False) -> float:
    sides = np.full(len(correlation), one_sided)
    return block_p(correlation, root_of(correlation), sides, threshold, seed=1)


@pytest.mark.parametrize("threshold", [2.0, 3.0, 4.5])
def test_independent_scores_follow_sidak(threshold: float) -> None:
    # Sidak 1967, J. Am. Stat. Assoc. 62:626: 1 - (1 - p)^j for independent scores
    single = 2 * stats.norm.sf(threshold)
    assert p_of(np.eye(10), threshold) == pytest.approx(1 - (1 - single) ** 10, rel=0.04)


def test_equal_scores_cost_one() -> None:
    assert p_of(np.ones((50, 50)), 3.5) == pytest.approx(2 * stats.norm.sf(3.5), rel=1e-6)


def test_two_correlated_scores_follow_the_bivariate_normal() -> None:
    # P(|Z1| >= t or |Z2| >= t) by scipy's multivariate normal distribution function
    rho, t = 0.6, 2.5
    law = stats.multivariate_normal([0, 0], [[1, rho], [rho, 1]])
    inside = law.cdf([t, t], lower_limit=[-t, -t])
    assert p_of(np.array([[1, rho], [rho, 1]]), t) == pytest.approx(1 - inside, rel=0.03)


def test_one_sided_scores_count_on_one_side() -> None:
    assert p_of(np.eye(1), 3.0, one_sided=True) == pytest.approx(stats.norm.sf(3.0))


def test_critical_value_inverts_the_probability() -> None:
    correlation = 0.5 * np.eye(8) + 0.5
    z = critical_z(correlation, root_of(correlation), np.zeros(8, bool), 25, 0.05, seed=3)
    assert 25 * p_of(correlation, z) == pytest.approx(0.05, rel=0.1)
    assert equivalent_z(2 * stats.norm.sf(3.2)) == pytest.approx(3.2)


def test_a_far_estimate_keeps_its_plain_interval() -> None:
    low, middle, high = given_selected(1.0, 0.05, 0.2, (0.025, 0.5, 0.975))
    assert (low, middle, high) == pytest.approx((1 - 1.96 * 0.05, 1.0, 1 + 1.96 * 0.05), abs=1e-3)


def test_intervals_given_selection_cover_and_estimates_are_median_unbiased() -> None:
    """Normal estimates kept only where they pass a cut: coverage and median by simulation, from the definition."""
    rng = np.random.default_rng(8)
    true, u, cut = 0.07, 0.02, 0.06
    drawn = rng.normal(true, u, 4000)
    kept = drawn[np.abs(drawn) >= cut][:600]
    ends = np.array([given_selected(float(x), u, cut, (0.025, 0.5, 0.975)) for x in kept])
    assert np.mean((ends[:, 0] <= true) & (true <= ends[:, 2])) == pytest.approx(0.95, abs=0.025)
    assert np.mean(ends[:, 1] <= true) == pytest.approx(0.5, abs=0.06)
    assert kept.mean() > true + 0.2 * u  # without the correction the estimates would be too large


def test_the_top_of_a_parabola_is_found() -> None:
    at = np.array([-1.0, -0.5, 0.5, 1.0])
    assert _refined(at, 4.0 - (at - 0.3) ** 2 * 10 - (4.0 - 0.9)) == pytest.approx(0.3, abs=0.02)


def test_transposed_digits() -> None:
    assert sorted(transpositions("7.41")) == [4.71, 7.14]
    assert transpositions("4.44") == []


def test_a_wrong_buffer_shifts_and_tilts_the_line() -> None:
    """Two buffers: the meter reads the certified value at each, so the error is linear between them (algebra)."""
    error = reading_error(np.array([4.0, 7.0, 5.5]), 4.0, [7.0])
    assert error == pytest.approx([-1.0, 0.0, -0.5])
    assert lots_named("B4-1, B7-2; B10-3") == ["B4-1", "B7-2", "B10-3"]
