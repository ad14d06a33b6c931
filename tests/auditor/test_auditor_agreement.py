"""Mandel's h and k against the tables of ISO 5725-2, and against simulation."""

from __future__ import annotations

import numpy as np
import pytest

from reconcile.auditor.agreement import compare
from reconcile.auditor.mandel import h_critical, h_statistics, k_critical, k_statistics

# ISO 5725-2:1994, table 6 (indicators at the 1 % level): p -> h, then k for n = 2 to 10 readings
TABLE_6 = {
    3: (1.15, 1.71, 1.64, 1.58, 1.53, 1.49, 1.46, 1.43, 1.41, 1.39),
    4: (1.49, 1.91, 1.77, 1.67, 1.60, 1.55, 1.51, 1.48, 1.45, 1.43),
    5: (1.72, 2.05, 1.85, 1.73, 1.65, 1.59, 1.55, 1.51, 1.48, 1.46),
    6: (1.87, 2.14, 1.90, 1.77, 1.68, 1.62, 1.57, 1.53, 1.50, 1.47),
    7: (1.98, 2.20, 1.94, 1.79, 1.70, 1.63, 1.58, 1.54, 1.51, 1.48),
    8: (2.06, 2.25, 1.97, 1.81, 1.71, 1.65, 1.59, 1.55, 1.52, 1.49),
    9: (2.13, 2.29, 1.99, 1.82, 1.73, 1.66, 1.60, 1.56, 1.53, 1.50),
    10: (2.18, 2.32, 2.00, 1.84, 1.74, 1.66, 1.61, 1.57, 1.53, 1.50),
    12: (2.25, 2.36, 2.02, 1.85, 1.75, 1.68, 1.62, 1.58, 1.54, 1.51),
    14: (2.30, 2.39, 2.04, 1.87, 1.76, 1.69, 1.63, 1.58, 1.55, 1.52),
}
# ISO 5725-2:1994, table 7 (5 % level), h, from memory; the exact formula is Wilrich 2013, doi:10.1007/s10182-011-0185-y
TABLE_7_H = {3: 1.15, 4: 1.42, 5: 1.57, 10: 1.80, 20: 1.89}


@pytest.mark.parametrize("p", sorted(TABLE_6))
def test_critical_values_of_the_standard(p: int) -> None:
    """The table cuts some values where it should round; 0.01 allows for that."""
    h, *ks = TABLE_6[p]
    assert h_critical(p, 0.01) == pytest.approx(h, abs=0.01)
    for n, k in zip(range(2, 11), ks, strict=True):
        assert k_critical(np.full(p, n - 1.0), 0.01) == pytest.approx(k, abs=0.011)


@pytest.mark.parametrize("p", sorted(TABLE_7_H))
def test_five_percent_values_of_h(p: int) -> None:
    assert h_critical(p, 0.05) == pytest.approx(TABLE_7_H[p], abs=0.01)


@pytest.mark.parametrize("alpha", [0.05, 0.01])
def test_h_and_k_pass_their_values_as_often_as_stated(alpha: float) -> None:
    """20,000 solutions of six meters with unequal numbers of readings: within three standard errors of alpha."""
    rng, n = np.random.default_rng(8), np.array([2, 3, 3, 4, 8, 8])
    trials = 20_000
    equal = rng.normal(size=(trials, len(n)))
    beyond_h = np.mean([abs(h_statistics(row)[0]) > h_critical(len(n), alpha) for row in equal])
    df = n - 1.0
    variance = rng.chisquare(df, size=(trials, len(n))) / df
    k = np.sqrt(variance / ((variance * df).sum(axis=1) / df.sum())[:, None])
    beyond_k = (k > k_critical(df, alpha)).mean(axis=0)
    error = 3 * np.sqrt(alpha * (1 - alpha) / trials)
    assert beyond_h == pytest.approx(alpha, abs=error)
    assert np.abs(beyond_k - alpha).max() < error * 1.3  # the largest of six


def test_k_is_over_the_pooled_standard_deviation() -> None:
    """Two readings each: pooled sd of (0.01, 0.01, 0.02, 0.04) is sqrt(0.0022/4) by hand."""
    k = k_statistics(np.array([0.01, 0.01, 0.02, 0.04]), np.ones(4))
    assert k == pytest.approx(np.array([0.01, 0.01, 0.02, 0.04]) / np.sqrt(0.0022 / 4))


def test_no_spread_gives_no_statistic() -> None:
    assert np.isnan(h_statistics(np.full(4, 7.0))).all()
    assert np.isnan(k_statistics(np.full(4, np.nan), np.zeros(4))).all()
    assert np.isnan(k_critical(np.array([3.0, 0.0, 0.0, 0.0]), 0.05)).all()


def test_three_meters_cannot_show_anything_in_h() -> None:
    """(p - 1)/sqrt(p) is the largest h there can be; of three, 1.1547, which is the 1 % value too (ISO 5725-2)."""
    assert h_critical(3, 1e-9) == pytest.approx(2 / np.sqrt(3), abs=1e-6)
    assert h_statistics(np.array([0.0, 0.0, 5.0])).max() == pytest.approx(2 / np.sqrt(3))
    with pytest.raises(ValueError):
        h_critical(2, 0.05)


def test_one_meter_far_off_stands_out_and_leaves_the_centre() -> None:
    mean = np.array([0.001, -0.002, 0.002, 0.0, 0.001, 0.10])
    cells = compare("borax", list("ABCDEF"), mean, np.full(6, np.nan), np.ones(6, np.intp), np.zeros(6), 0.01)
    far = cells[-1]
    assert far.h > far.h_1
    assert abs(far.centre) < 0.003
    assert far.from_centre == pytest.approx(0.10, abs=0.003)
    assert all(abs(c.h) < c.h_5 for c in cells[:-1])
    assert all(np.isnan(c.k) for c in cells)


def test_one_step_of_the_display_is_no_disagreement() -> None:
    """Four single readings at 0.01, one of which shows the next figure: by the law of h alone it is beyond 1 %."""
    mean = np.array([0.0, 0.01, 0.01, 0.01])
    assert abs(h_statistics(mean)[0]) > h_critical(4, 0.01)
    cells = compare("phosphate", list("ABCD"), mean, np.full(4, np.nan), np.ones(4, np.intp), np.zeros(4), 0.01)
    assert all(np.isnan(c.h) for c in cells)
