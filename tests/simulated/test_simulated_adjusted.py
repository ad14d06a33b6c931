"""Records in which half of the batches were adjusted, and calibration buffers shared by three meters.

A small seeded set; tests/bench/adjusted_tables.py prints the shares over 200 records.
"""

from __future__ import annotations

import numpy as np
import pytest

from reconcile.auditor.audit import audit
from reconcile.chemistry.adjusted import with_adjustments
from reconcile.chemistry.predict import predict_records, repredictor
from reconcile.records.results import Audit
from tests.simulated.half_adjusted import half_adjusted
from tests.simulated.matching import match
from tests.simulated.simulator import Simulated, simulate


def audited(simulated: Simulated, seed: int, adjusted: bool) -> Audit:
    records, settings = simulated.records, simulated.settings
    if adjusted:
        records = with_adjustments(half_adjusted(records, seed), settings)
    return audit(records, predict_records(records, settings), repredictor(records, settings), settings)


def test_clean_records_with_half_of_the_batches_adjusted_stay_clean() -> None:
    found = [seed for seed in range(20) if audited(simulate(seed), seed, True).findings]
    assert len(found) <= 2  # 5 % of 20 is 1; 3 or more by chance in 8 % of such sets


def test_an_offset_is_named_when_half_of_the_batches_were_adjusted() -> None:
    """Meters whose accuracy is stated as 0.01: on those of 0.02 an offset of 0.06 is found in 8 of 10 (the bench)."""
    outcomes = []
    for seed in range(12):
        simulated = simulate(seed, ("meter_offset",), {"meter_offset": 0.06}, accuracy=0.01)
        matched = match(audited(simulated, seed, True).findings, simulated.truth)
        outcomes.append(matched.outcomes[0].outcome)
    assert sum(outcome in ("named", "rival") for outcome in outcomes) >= 10


def test_a_buffer_lot_shared_by_three_meters_is_one_finding() -> None:
    named = 0
    for seed in range(8):
        simulated = simulate(seed, ("calibration_buffer",), n_meters=3)
        findings = audited(simulated, seed, False).findings
        named += match(findings, simulated.truth).outcomes[0].outcome == "named"
        assert sum(f.subject_type == "meter" for f in findings) < 3
    assert named >= 7


def test_adjusted_readings_are_no_evidence_and_later_ones_are() -> None:
    simulated = simulate(3)
    records = with_adjustments(half_adjusted(simulated.records, 3), simulated.settings)
    found = audit(records, predict_records(records, simulated.settings), repredictor(records, simulated.settings),
                  simulated.settings)  # fmt: skip
    adjusted = found.status == "adjusted"
    assert adjusted.sum() >= 20
    assert not found.evidence[adjusted].any()
    assert np.abs(found.residual[adjusted & (records.solved.anchor == np.arange(len(adjusted)))]).max() < 1e-6
    later = (records.solved.anchor >= 0) & ~adjusted
    assert found.evidence[later].all()
    # their spread is that of two meters and two readings: sqrt(2) (0.02^2 / 3 + 0.012^2), or a little more
    assert np.median(found.u_residual[later]) == pytest.approx(np.sqrt(2 * (0.02**2 / 3 + 0.012**2)), rel=0.15)


def test_implied_amounts_cover_the_true_ones() -> None:
    """True over stated amounts of the simulator lie within the stated uncertainty of what the reading implies."""
    deviations = []
    for seed in range(10):
        simulated = simulate(seed)
        records = with_adjustments(half_adjusted(simulated.records, seed), simulated.settings)
        opens, solved, world = records.open_amounts, records.solved, simulated.world
        order = np.argsort(world.solution, kind="stable")
        true = (world.amount * world.factor * world.lot_factor[world.lot])[order]
        for k in range(len(opens)):
            c = int(opens.contribution[k])
            if np.isfinite(solved.u[k]) and solved.u[k] < 0.2 * solved.amount[k]:
                deviations.append((solved.amount[k] - true[c]) / solved.u[k])
    spread = float(np.sqrt(np.mean(np.square(deviations))))
    assert 0.6 < spread < 1.3
