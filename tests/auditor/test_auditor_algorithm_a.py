"""Algorithm A against published results, an independent implementation, and its own definition."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats
from statsmodels.robust.scale import Huber

from reconcile.auditor.algorithm_a import CLIP, CLIPPED_TO_SD, MAD_TO_SD, algorithm_a

# 24 determinations of copper in wholemeal flour [µg/g]: Analytical Methods Committee 1989, Analyst 114, 1693
COPPER = np.array(
    [2.9, 3.1, 3.4, 3.4, 3.7, 3.7, 2.8, 2.5, 2.4, 2.4, 2.7, 2.2, 5.28, 3.37, 3.03, 3.03, 28.95, 3.77, 3.4, 2.2, 3.5,
     3.6, 3.7, 3.7]
)  # fmt: skip
# Means of nine laboratories, creosote: ISO 5725-5:1998, example of Algorithm A (data as reproduced in print; the answer
# 20.412 from memory)
CREOSOTE = np.array([24.140, 20.155, 19.500, 20.300, 20.705, 17.570, 20.100, 20.940, 21.185])


def test_copper_in_flour() -> None:
    """Huber's proposal 2 with k = 1.5 gives 3.2055 and 0.67365: Venables and Ripley, Modern Applied Statistics with S,
    4th ed., section 5.5 (3.206 and 0.674 there). Algorithm A differs by the rounding of its factors, below 0.001."""
    found = algorithm_a(COPPER)
    assert found.centre == pytest.approx(3.20550, abs=0.001)
    assert found.spread == pytest.approx(0.67365, abs=0.001)


def test_creosote() -> None:
    assert algorithm_a(CREOSOTE).centre == pytest.approx(20.412, abs=0.001)


@pytest.mark.parametrize("seed", range(5))
def test_against_an_independent_implementation(seed: int) -> None:
    """statsmodels solves the same equations by another route; factors rounded to four digits differ below 0.1 %."""
    x = np.random.default_rng(seed).standard_t(4, 30)
    centre, spread = Huber(maxiter=500, tol=1e-10)(x)
    found = algorithm_a(x)
    assert found.centre == pytest.approx(float(centre), abs=0.002)
    assert found.spread == pytest.approx(float(spread), rel=0.002)


def test_the_factors_follow_from_the_normal_law() -> None:
    """1/(quartile of the normal law), and 1/sqrt(variance of a normal value clipped at 1.5)."""
    inside = stats.norm.cdf(CLIP) - stats.norm.cdf(-CLIP)
    variance = inside - 2 * CLIP * stats.norm.pdf(CLIP) + CLIP**2 * (1 - inside)
    assert pytest.approx(1 / stats.norm.ppf(0.75), abs=5e-4) == MAD_TO_SD
    assert pytest.approx(1 / np.sqrt(variance), abs=1e-3) == CLIPPED_TO_SD  # 1.1334; the standard prints 1.134


def test_its_result_satisfies_its_definition() -> None:
    found = algorithm_a(CREOSOTE)
    clipped = np.clip(CREOSOTE, found.centre - CLIP * found.spread, found.centre + CLIP * found.spread)
    assert clipped.mean() == pytest.approx(found.centre, rel=1e-6)
    assert CLIPPED_TO_SD * clipped.std(ddof=1) == pytest.approx(found.spread, rel=1e-5)
    assert found.clipped == 2


def test_a_fifth_of_bad_values_moves_it_little() -> None:
    """Tolerates about a fifth of bad values (ISO 13528, Annex C); the mean would move by 2."""
    clean = np.random.default_rng(1).normal(7.0, 0.02, 40)
    bad = clean.copy()
    bad[:8] += 10.0
    assert abs(algorithm_a(bad).centre - 7.0) < 0.02
    assert bad.mean() - 7.0 > 1.9


def test_a_coarse_display_does_not_make_the_spread_nothing() -> None:
    """More than half of the values equal: the median deviation is nought, the display's share (0.1/sqrt 12) is not."""
    x = np.array([7.0, 7.0, 7.0, 7.0, 7.1, 6.9])
    assert algorithm_a(x, 0.1 / np.sqrt(12)).spread >= 0.1 / np.sqrt(12)


def test_few_values() -> None:
    assert np.isnan(algorithm_a(np.array([])).centre)
    assert algorithm_a(np.array([7.0, np.nan])).centre == 7.0
    assert np.isnan(algorithm_a(np.array([7.0])).spread)
