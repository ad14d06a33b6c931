"""The auditor on simulated records with known truth: a small seeded part of tests/bench/blame_tables.py.

The records come from tests/simulated, which has its own chemistry, meters, lots and noise.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from reconcile.auditor.audit import audit
from reconcile.chemistry.predict import predict_records, repredictor
from reconcile.records.book import BatchRecords, Table
from reconcile.records.results import Audit
from reconcile.records.settings import Settings
from tests.simulated.matching import match
from tests.simulated.simulator import simulate


def audited(records: BatchRecords, settings: Settings) -> Audit:
    return audit(records, predict_records(records, settings), repredictor(records, settings), settings)


@pytest.mark.parametrize("seed", range(12))
def test_a_clean_record_raises_nothing(seed: int) -> None:
    # seeds 7000 to 7011 raise nothing; over 1,000 seeds the rate is in the bench
    simulated = simulate(7000 + seed)
    assert audited(simulated.records, simulated.settings).findings == ()


KINDS = (
    "meter_offset",
    "meter_span",
    "meter_drift",
    "meter_step",
    "lot_strength",
    "lot_identity",
    "lot_hydrate",
    "batch_preparation",
    "recipe_slip",
    "reading_slip",
    "meter_stuck",
    "meter_temperature",
    "probe_matrix",
    "acid_constant",
    "carbon_dioxide",
    "calibration_buffer",
)


@pytest.mark.parametrize("kind", KINDS)
def test_one_planted_fault_is_named_or_a_rival(kind: str) -> None:
    reached = 0
    for seed in (200, 201, 202):
        simulated = simulate(seed, (kind,))
        found = audited(simulated.records, simulated.settings).findings
        reached += match(found, simulated.truth).outcomes[0].outcome != "missed"
    assert reached >= 2, f"{kind}: {reached} of 3"


def test_two_faults_at_once_are_both_found() -> None:
    simulated = simulate(4, ("meter_offset", "lot_strength"))
    matched = match(audited(simulated.records, simulated.settings).findings, simulated.truth)
    assert [o.outcome for o in matched.outcomes] == ["named", "named"]
    assert matched.stray == ()


def reordered(table: Table, order: np.ndarray) -> Table:
    columns = {name: values[order] for name, values in table.columns.items()}
    return replace(table, columns=columns, source=table.source[order], row=table.row[order])


def gist(found: Audit, names: dict[str, str]) -> list[tuple[object, ...]]:
    return [
        (
            f.kind,
            names.get(f.subject, f.subject)
            if isinstance(f.subject, str)
            else tuple(names.get(s, s) for s in f.subject),
            None if f.estimate is None else round(f.estimate, 6),
            round(f.log_likelihood_gain, 4),
            round(float(np.log(f.family_wise_p)), 4),
        )
        for f in found.findings
    ]


@pytest.mark.parametrize("kind", ["meter_step", "lot_strength", "reading_slip"])
def test_order_of_rows_and_names_of_meters_change_nothing(kind: str) -> None:
    simulated = simulate(11, (kind,))
    records, settings = simulated.records, simulated.settings
    plain = audited(records, settings)
    order = np.random.default_rng(5).permutation(len(records.readings))
    mixed = replace(
        records,
        readings=reordered(records.readings, order),
        readings_solution=records.readings_solution[order],
    )
    assert gist(audited(mixed, settings), {}) == gist(plain, {})

    meters = sorted(set(records.readings["meter"].tolist()))
    new = {old: f"pH-{len(meters) - i}" for i, old in enumerate(meters)}  # the alphabet runs the other way
    columns = {**records.readings.columns, "meter": np.array([new[m] for m in records.readings["meter"]], object)}
    stated = {**records.meters.columns, "meter": np.array([new[m] for m in records.meters["meter"]], object)}
    renamed = replace(
        records,
        readings=replace(records.readings, columns=columns),
        meters=replace(records.meters, columns=stated),
    )
    back = {value: key for key, value in new.items()}
    assert gist(audited(renamed, settings), back) == gist(plain, {})


@pytest.mark.parametrize("seed", range(5))
def test_a_lot_and_a_meter_seen_only_together_are_called_confounded(seed: int) -> None:
    """One meter read nothing but batches of one lot, which no other meter read: either may be at fault."""
    simulated = simulate(400 + seed)
    records, settings = simulated.records, simulated.settings
    prediction = predict_records(records, settings)
    slopes = np.zeros((len(prediction), len(records.lots)))
    lot_of = records.solutions.lot[prediction.contributions.column]
    np.add.at(slopes, (prediction.contributions.row, lot_of), prediction.contributions.value)
    used = np.abs(slopes) > 0.1
    # the lot whose readings feel it most evenly, so that an offset and a strength error look alike
    evenness = [np.std(slopes[u, k]) if u.sum() >= 6 else np.inf for k, u in enumerate(used.T)]
    lot = int(np.argmin(evenness))
    rows = np.flatnonzero(used[:, lot])
    meter = records.readings["meter"].copy()
    meter[rows] = "Lone"
    ph = records.readings["ph"].copy()
    ph[rows] += 0.09
    readings = replace(records.readings, columns={**records.readings.columns, "meter": meter, "ph": ph})
    found = audited(replace(records, readings=readings), settings)
    said = [(f.kind, f.subject) for f in found.findings]
    said += [(r.kind, r.subject) for f in found.findings for r in f.rivals]
    assert any(subject == "Lone" for _, subject in said), said
    # or the constant of an acid that only this lot brings, which is confounded with both
    assert any(kind.startswith("lot") or kind == "acid_constant" for kind, _ in said), said
    name = str(records.lots.name[lot])
    assert any(s.subject == name and "one meter only" in s.reason for s in found.not_testable)
    first = found.findings[0]
    assert "which this record cannot tell from it" in first.text
    assert "Separation d" in first.next_check


def test_silence_has_a_size() -> None:
    simulated = simulate(7001)
    found = audited(simulated.records, simulated.settings)
    meters = {s.subject: s for s in found.smallest_detectable if s.kind == "meter_offset"}
    assert set(meters) == set(simulated.records.readings["meter"].tolist())
    assert all(s.size is not None and 0.03 < s.size < 0.2 and s.power == 0.9 for s in meters.values())
