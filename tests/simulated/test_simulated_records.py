"""Simulated records are what they claim: repeatable, whole, with the spread and the faults they should have."""

import dataclasses

import numpy as np
import pytest

from reconcile.records.book import BatchRecords
from reconcile.records.columns import BY_SHEET
from tests.simulated.recipes import USES
from tests.simulated.simulator import FAULTS, NEEDS, simulate

STILL = {"accuracy": 0.0, "span_percent": 0.0, "lot_percent": 0.0, "preparation_percent": 0.0}
STILL |= {"temperature_k": 0.0, "pka_u": 0.0}
"""A room in which nothing but the reading noise spreads."""


def residuals(seeds=60, faults=(), **room):
    """Reading minus what the recipe says, by the simulator's own chemistry; one array over many seeds."""
    found = []
    for seed in range(seeds):
        simulated = simulate(seed, faults, **room)
        found.append(simulated.records.readings["ph"] - simulated.world.true_ph(nominal=True))
    return np.concatenate(found)


def test_the_same_seed_gives_the_same_record_and_another_seed_another():
    one, same, other = (simulate(seed, ["lot_strength"]) for seed in (7, 7, 8))
    assert one.truth == same.truth
    for table in ("readings", "recipes", "stocks"):
        a, b = getattr(one.records, table), getattr(same.records, table)
        for name in a.columns:
            assert np.array_equal(a[name], b[name], equal_nan=a[name].dtype.kind in "fM"), name
    assert not np.array_equal(one.records.readings["ph"], other.records.readings["ph"])


def test_a_fault_changes_only_the_readings_it_names():
    """The clean record of a seed and the one with a fault share every draw, so that runs can be paired."""
    for name in ("meter_offset", "meter_drift", "lot_strength", "batch_preparation", "reading_slip", "meter_stuck"):
        clean, faulty = simulate(3, **STILL), simulate(3, [name], **STILL)
        moved = np.flatnonzero(np.abs(clean.records.readings["ph"] - faulty.records.readings["ph"]) > 0.005)
        assert len(moved)
        assert set(moved.tolist()) <= set(faulty.truth[0].readings), name


def test_noise_alone_has_its_spread():
    # a display of 0.01 adds 0.01²/12 to the variance of the noise (uniform rounding error)
    assert residuals(**STILL).std() == pytest.approx(np.sqrt(0.012**2 + 0.01**2 / 12), rel=0.03)
    heavy = residuals(noise_shape="t4", **STILL)
    assert heavy.std() == pytest.approx(np.sqrt(0.012**2 + 0.01**2 / 12), rel=0.10)
    assert (heavy**4).mean() / (heavy**2).mean() ** 2 > 4.0  # a normal distribution has 3


def test_each_source_has_its_share_and_the_shares_add_up():
    """Spreads of independent sources add as squares; a meter's share is its accuracy over root three."""
    quiet = {**STILL, "noise": 0.0, "resolution": 1e-6}
    shares = {}
    for source, setting in {
        "accuracy": 0.02,
        "span_percent": 0.5,
        "lot_percent": 1.0,
        "preparation_percent": 0.3,
        "temperature_k": 0.5,
        "pka_u": 1.0,
    }.items():
        shares[source] = residuals(30, **{**quiet, source: setting}).var()
    assert np.sqrt(shares["accuracy"]) == pytest.approx(0.02 / np.sqrt(3), rel=0.1)
    assert all(share > 0 for share in shares.values())
    together = residuals(30).var()
    assert together == pytest.approx(sum(shares.values()) + 0.012**2 + 0.01**2 / 12, rel=0.2)
    assert abs(residuals(30).mean()) < 0.005


def test_meter_days_and_sessions_add_their_spread():
    days = residuals(**{**STILL, "meter_day_sd": 0.03})
    sessions = residuals(**{**STILL, "session_sd": 0.03})
    for found in (days, sessions):
        assert found.std() == pytest.approx(np.sqrt(0.03**2 + 0.012**2 + 0.01**2 / 12), rel=0.1)


def test_every_lot_goes_into_three_batches_unless_asked():
    for seed in range(40):
        world = simulate(seed).world
        uses = [len(set(world.solution[world.lot == lot])) for lot in range(len(world.lot_label))]
        assert min(uses) >= USES
        assert 12 <= len(uses) <= 16
    single = simulate(1, single_use_lots=5).world
    assert sum(np.bincount(single.lot) == 1) >= 5


def test_a_confined_lot_is_read_on_one_meter_only():
    world = simulate(2, confined_lot=True).world
    _, lot, meter = next(t for t in world.taken if t[0] == "confined")
    inside = np.isin(world.read_solution, world.solution[world.lot == lot])
    assert inside.sum() >= USES
    assert set(world.meter[inside]) == {meter}


@pytest.mark.parametrize("name", sorted(FAULTS))
def test_every_fault_shows_in_the_record_and_keeps_it_whole(name):
    for seed in range(12):
        simulated = simulate(seed, [name], checks_per_meter=1)
        clean = simulate(seed, checks_per_meter=1, **NEEDS.get(name, {}))
        (planted,) = simulated.truth
        assert planted.fault == name
        assert planted.readings
        whole(simulated.records)
        column = "ph_calculated" if name == "record_value" else "ph"
        change = simulated.records.readings[column] - clean.records.readings[column]
        assert np.nanmax(np.abs(change[list(planted.readings)])) > 0.02


def whole(records: BatchRecords) -> None:
    """Every array of a record has the length its neighbours have, and every index points at something."""
    assert records.rows_read == len(records.readings) + len(records.set_aside)
    for table in (records.readings, records.recipes, records.stocks, records.meters, records.calibrations):
        assert {c.name for c in BY_SHEET[table.kind]} <= set(table.columns)
        assert {len(column) for column in table.columns.values()} <= {len(table)}
        assert len(table.source) == len(table)
        for index in range(len(table)):
            assert records.place(table, index).row == index + 2
    solutions, lots = records.solutions, records.lots
    for name in ("form", "lot", "amount", "u_amount", "by_mass", "recipe_row", "place", "stated"):
        assert len(getattr(solutions, name)) == len(solutions.solution), name
    assert np.all(np.diff(solutions.solution) >= 0)
    assert solutions.lot.max() < len(lots)
    assert solutions.form.max() < len(records.forms)
    assert len(records.readings_solution) == len(records.readings)
    assert records.readings_solution.max() < len(solutions)
    for field in dataclasses.fields(lots):
        assert len(getattr(lots, field.name)) == len(lots), field.name
