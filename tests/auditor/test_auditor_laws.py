"""The laws that the auditor judges by, against scipy.stats, which computes them by other routines of its own."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from reconcile.auditor import laws

CHANCES = (1e-300, 1e-40, 1e-8, 0.001, 0.025, 0.3, 0.5, 0.8, 0.975)
DEGREES = (1.0, 3.5, 10.0, 200.0)


@pytest.mark.parametrize("p", CHANCES)
def test_the_normal_law(p: float) -> None:
    assert laws.norm_isf(p) == pytest.approx(stats.norm.isf(p), rel=1e-12, abs=1e-15)
    assert laws.norm_ppf(p) == pytest.approx(stats.norm.ppf(p), rel=1e-12, abs=1e-15)
    assert laws.norm_sf(30.0 * p) == pytest.approx(stats.norm.sf(30.0 * p), rel=1e-12)


@pytest.mark.parametrize("p", [p for p in CHANCES if p > 1e-30])
@pytest.mark.parametrize("df", DEGREES)
def test_the_other_laws(p: float, df: float) -> None:
    assert laws.t_isf(p, df) == pytest.approx(stats.t.isf(p, df), rel=1e-9, abs=1e-12)
    assert laws.t_sf(30.0 * p, df) == pytest.approx(stats.t.sf(30.0 * p, df), rel=1e-12)
    assert laws.chi2_isf(p, df) == pytest.approx(stats.chi2.isf(p, df), rel=1e-9)
    assert laws.chi2_sf(30.0 * p, df) == pytest.approx(stats.chi2.sf(30.0 * p, df), rel=1e-12)
    assert laws.beta_isf(p, df, df + 1.0) == pytest.approx(stats.beta.isf(p, df, df + 1.0), rel=1e-9)
    if p > 1e-6:
        assert laws.f_isf(p, 1.0, df) == pytest.approx(stats.f.isf(p, 1.0, df), rel=1e-9)


@pytest.mark.parametrize("df", [5.0, 8.0, np.inf])
def test_a_law_about_zero(df: float) -> None:
    law, same = laws.Law(df), stats.norm() if np.isinf(df) else stats.t(df)
    x = np.linspace(-9.0, 9.0, 41)
    np.testing.assert_allclose(law.logpdf(x), same.logpdf(x), rtol=1e-12)
    assert law.ppf(0.75) == pytest.approx(same.ppf(0.75), rel=1e-12)
    assert law.cdf(1.3) == pytest.approx(same.cdf(1.3), rel=1e-12)
