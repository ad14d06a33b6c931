"""Lines through calibrations, their crossing dates, and steps, against simulated truth."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from reconcile.auditor.calibration_lines import Fit, crossing, display_sd, fit_line
from reconcile.auditor.calibration_steps import best_step, places, steps

WEEKLY = np.arange(0.0, 7 * 40, 7.0)


def fitted(day: np.ndarray, y: np.ndarray) -> Fit:
    fit = fit_line(day, y)
    assert isinstance(fit, Fit)
    return fit


def test_the_line_is_the_least_squares_line() -> None:
    """Rate, its standard error and Sen's interval against scipy's own."""
    rng = np.random.default_rng(3)
    y = 98.0 - 0.01 * WEEKLY + rng.normal(0, 0.3, len(WEEKLY))
    fit, plain = fitted(WEEKLY, y), stats.linregress(WEEKLY, y)
    assert fit.rate == pytest.approx(plain.slope)
    half = stats.t.ppf(0.975, len(y) - 2) * plain.stderr
    assert fit.rate95 == pytest.approx((plain.slope - half, plain.slope + half))
    assert fit.robust == pytest.approx(stats.theilslopes(y, WEEKLY)[0])


def test_one_wild_calibration_moves_the_robust_rate_little() -> None:
    y = 98.0 - 0.01 * WEEKLY
    y[-1] = 60.0
    fit = fitted(WEEKLY, y)
    assert fit.robust == pytest.approx(-0.01, abs=1e-3)
    assert abs(fit.rate + 0.01) > 0.01


def test_a_slope_declining_over_known_dates_crosses_within_its_interval() -> None:
    """600 simulated meters that cross 90 % on day 450, followed for 280 days: the 95 % interval holds that day in 93 to
    97 % (three standard errors of the binomial are 2.7)."""
    rng, held, told = np.random.default_rng(11), 0, 0
    for _ in range(600):
        y = 99.0 - 0.02 * WEEKLY + rng.normal(0, 0.5, len(WEEKLY))
        dates = crossing(fitted(WEEKLY, y), 90.0)
        told += dates.told
        held += dates.earliest <= 450.0 <= dates.latest
    assert told == 600
    assert 0.923 <= held / 600 <= 0.977


def test_few_calibrations_cover_as_well() -> None:
    """Five weekly calibrations: the interval may have no last date, and then holds every day from its first one on."""
    rng, held = np.random.default_rng(12), 0
    day = WEEKLY[:5]
    for _ in range(600):
        dates = crossing(fitted(day, 95.0 - 0.05 * day + rng.normal(0, 0.5, 5)), 90.0)
        if dates.told:
            held += dates.earliest <= 100.0 <= dates.latest
        else:
            held += not dates.earliest > 100.0
    assert held / 600 >= 0.923


def test_a_level_line_has_no_date() -> None:
    dates = crossing(fitted(WEEKLY, 98.0 + np.tile([0.3, -0.3], 20)), 90.0)
    assert not dates.told
    assert np.isnan(dates.at)
    assert np.isnan(dates.latest)
    assert dates.earliest > WEEKLY[-1]


def test_without_noise_the_date_is_exact() -> None:
    """99 - 0.02 d is 90 on day 450; values of three decimals still carry the display's share of scatter."""
    dates = crossing(fitted(WEEKLY, np.round(99.0 - 0.02 * WEEKLY, 3)), 90.0)
    assert dates.at == pytest.approx(450.0, abs=0.01)
    assert dates.earliest < 450.0 < dates.latest


def test_coarse_decimals_give_scatter_of_their_own() -> None:
    """A uniform error over one step has the standard deviation step/sqrt 12 (JCGM 100, 4.3.7)."""
    assert display_sd(np.array([98.0, 97.0, 97.0])) == pytest.approx(1 / np.sqrt(12))
    assert display_sd(np.array([98.5, 97.0])) == pytest.approx(0.1 / np.sqrt(12))
    assert fitted(WEEKLY, np.full(len(WEEKLY), 98.0)).sd == pytest.approx(1 / np.sqrt(12))


@pytest.mark.parametrize(
    ("day", "said"),
    [([], "no value"), ([0.0, 7.0, 14.0], "only 3"), ([0.0, 0.1, 0.2, 0.3], "within a day")],
)
def test_why_there_is_no_line(day: list[float], said: str) -> None:
    why = fit_line(np.array(day), np.full(len(day), 98.0))
    assert isinstance(why, str)
    assert said in why


def test_a_step_is_found_with_its_date_and_size() -> None:
    """300 simulated steps of five standard deviations in a drifting offset: the interval of the date holds the truth in
    at least 95 %, that of the size in about as many."""
    rng, dated, sized = np.random.default_rng(4), 0, 0
    for _ in range(300):
        y = 0.01 * WEEKLY + rng.normal(0, 1.0, len(WEEKLY)) + np.where(WEEKLY >= 140.0, 5.0, 0.0)
        found = best_step(WEEKLY, y)
        assert found is not None
        dated += found.earliest <= 133.0 and found.latest >= 140.0
        sized += found.interval95[0] <= 5.0 <= found.interval95[1]
    assert dated / 300 >= 0.93
    assert sized / 300 >= 0.90


def test_clean_series_show_few_steps() -> None:
    """At most 5 % of whole series show any (family-wise); the bound is that of Bonferroni, so it is under."""
    rng = np.random.default_rng(5)
    trials = len(places(WEEKLY))
    found = sum(bool(steps(WEEKLY, rng.normal(0, 1, len(WEEKLY)) - 0.02 * WEEKLY, trials)) for _ in range(400))
    assert found / 400 <= 0.05 + 3 * np.sqrt(0.05 * 0.95 / 400)


def test_two_steps_part_a_series_in_three() -> None:
    rng = np.random.default_rng(6)
    y = rng.normal(0, 1, len(WEEKLY)) + np.where(WEEKLY >= 91, 12.0, 0.0) + np.where(WEEKLY >= 189, -20.0, 0.0)
    assert [WEEKLY[j.position] for j in steps(WEEKLY, y, 70)] == [91.0, 189.0]


def test_a_ramp_is_no_step() -> None:
    rng = np.random.default_rng(7)
    assert not steps(WEEKLY, -0.2 * WEEKLY + rng.normal(0, 0.5, len(WEEKLY)), len(places(WEEKLY)))
