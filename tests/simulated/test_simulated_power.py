"""The auditor beside a reader who knows the candidate, and next checks that are taken; small sets of the bench tables.

Both yardsticks stand outside the auditor: the likelihood-ratio test of the one true candidate with the simulator's own
covariance (Patterson and Thompson 1971, Biometrika 58:545, for the variances it has to estimate), and readings drawn in
the simulated room.
"""

import numpy as np

from tests.bench.blame_run import Case, run
from tests.bench.check_tables import tried
from tests.bench.power_tables import critical_of
from tests.simulated.oracle import ask

SEEDS = range(24)
SIZE = {"meter_offset": 0.07, "lot_strength": 1.1}


def test_faults_near_the_threshold_are_covered_as_often_as_the_best_test_finds_them():
    oracle = covered = 0
    for seed in SEEDS:
        needed = critical_of((seed, "lot_strength", 1.08))
        oracle += ask(seed, "lot_strength", 1.08).without_spreads().gain >= needed
        covered += run(Case(seed, ("lot_strength",), {"lot_strength": 1.08})).outcomes[0] != "missed"
    assert 6 < oracle < 24  # the size is near the threshold, or the comparison says nothing
    assert covered >= oracle - 2


def test_estimating_the_spreads_costs_the_best_test_little():
    shown = [ask(seed, "meter_step", 0.06) for seed in SEEDS]
    known = np.array([one.with_spreads().value for one in shown])
    asked = np.array([one.without_spreads().value for one in shown])
    assert np.corrcoef(known, asked)[0, 1] > 0.6
    assert abs(np.median(asked / known) - 1.0) < 0.1


def test_a_next_check_picks_the_true_explanation_as_often_as_it_claims():
    found = [row for seed in range(12) for kind, size in SIZE.items() for row in tried((kind, size, seed))]
    claimed, right = np.array([r[2] for r in found]), np.array([r[3] for r in found])
    assert len(found) >= 10
    assert abs(right.mean() - claimed.mean()) < 0.05 + 2.0 * right.std() / len(found) ** 0.5
