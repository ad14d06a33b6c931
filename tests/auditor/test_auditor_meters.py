"""Meters through time on whole records: calibrations alone, checks alone, and both, against what was put in."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from builders import csv_file, records_from_rows
from meter_room import (
    BUFFERS,
    CALIBRATIONS_HEAD,
    CHECKS_HEAD,
    DECLINE,
    DRIFT,
    NOISE,
    OFFSET,
    START,
    STEP_MV,
    STEP_WEEK,
    WEEKS,
    meter_room,
)

import reconcile
from reconcile.records.meter_results import WHOLE_RECORD, MeterHistory

CALIBRATIONS, EVENTS, READINGS = "Calibrations", "Events", "Readings"


@pytest.fixture(scope="module")
def alone(tmp_path_factory: pytest.TempPathFactory) -> MeterHistory:
    return reconcile.meters(meter_room(tmp_path_factory.mktemp("alone"), CALIBRATIONS, EVENTS))


@pytest.fixture(scope="module")
def whole(tmp_path_factory: pytest.TempPathFactory) -> MeterHistory:
    return reconcile.meters(meter_room(tmp_path_factory.mktemp("whole"), CALIBRATIONS, EVENTS, READINGS))


def line_of(history: MeterHistory, subject: str, quantity: str = "slope", latest: bool = True):  # type: ignore[no-untyped-def]
    (found,) = (x for x in history.lines if (x.subject, x.quantity, x.latest) == (subject, quantity, latest))
    return found


def test_calibrations_alone_are_enough(alone: MeterHistory) -> None:
    assert alone.audit is None
    assert alone.meters == ("M-1", "M-2", "M-3", "M-4", "M-5", "M-6")
    assert {x.subject for x in alone.lines} == set(alone.meters)
    assert not alone.agreement
    assert any("no used readings" in why for _, why in alone.not_shown)


def test_the_rate_of_a_declining_slope(alone: MeterHistory) -> None:
    """Put in: -0.02 % a day, 99.0 % at the start."""
    line = line_of(alone, "M-1")
    low, high = line.rate_interval95
    assert low < -30 * DECLINE < high < 0
    assert line.robust_interval95[0] < -30 * DECLINE < line.robust_interval95[1]
    assert line.at_last == pytest.approx(99.0 - DECLINE * 7 * (WEEKS - 1), abs=0.3)


def test_it_crosses_both_texts_on_the_dates_put_in(alone: MeterHistory) -> None:
    """99 - 0.02 d is 95 after 200 days and 90 after 450, which is beyond twice the length of the calibrations added."""
    found = {x.limit.value: x for x in alone.crossings if (x.subject, x.quantity) == ("M-1", "slope")}
    day = np.timedelta64(1, "D")
    begin = np.datetime64(START, "s")
    assert found[95.0].earliest <= begin + 200 * day <= found[95.0].latest
    assert found[95.0].ahead
    assert not found[95.0].limit.judged
    assert found[90.0].limit.judged
    assert "95 % interval" in found[95.0].text
    if not np.isnat(found[90.0].earliest):
        assert found[90.0].earliest <= begin + 450 * day


def test_an_unlogged_step_is_found_and_a_logged_one_parts_the_line(alone: MeterHistory) -> None:
    (step,) = alone.calibration_steps
    assert (step.subject, step.quantity) == ("M-3", "offset")
    assert step.interval95[0] < STEP_MV < step.interval95[1]
    at = np.datetime64(START, "s") + 7 * STEP_WEEK * np.timedelta64(1, "D")
    assert step.earliest < at <= step.latest + np.timedelta64(1, "h")
    new = line_of(alone, "M-5")
    assert (new.probe, new.begun_by, len(new.calibration)) == ("E-15", "new probe", WEEKS // 2)
    assert line_of(alone, "M-5", latest=False).probe == "E-5"


def test_limits_are_those_of_the_settings_and_the_other_text_stands_beside(tmp_path: Path) -> None:
    path = meter_room(tmp_path, CALIBRATIONS)
    history = reconcile.meters(path, settings={"meters": {"slope_low_percent": 97.0}})
    low = [x for x in history.limits if (x.quantity, x.side) == ("slope", "low")]
    assert [(x.value, x.judged) for x in low] == [(97.0, True), (95.0, False)]
    assert low[0].source == "set by the site"
    assert line_of(history, "M-1").outside > 0
    assert history.flagged


def test_a_probe_that_moved_between_meters_is_followed(tmp_path: Path) -> None:
    rows = [CALIBRATIONS_HEAD]
    for week in range(12):
        rows.append((f"M-{1 + week // 6}", "E-9", START.replace(day=6 + week), 99.0 - 0.1 * week, 1.0 + 0.1 * week))
    history = reconcile.meters(csv_file(tmp_path / "moved.csv", rows))
    line = line_of(history, "E-9")
    assert (line.subject_type, len(line.calibration)) == ("probe", 12)
    assert line.rate == pytest.approx(-3.0, abs=0.01)


def test_checks_alone_are_enough(tmp_path: Path) -> None:
    history = reconcile.meters(meter_room(tmp_path, READINGS, meters=4))
    assert not history.lines
    assert ("slope and offset", "the record holds no calibrations") in history.not_shown
    assert all(b.reason == "no calibration of it is recorded" for b in history.between)
    assert {a.solution for a in history.agreement} == {WHOLE_RECORD, *BUFFERS}


def test_a_saw_tooth_between_calibrations(whole: MeterHistory) -> None:
    """Put in: 0.006 pH a day on M-4 and nothing on the others, whose intervals leave zero out in one of twenty."""
    found = {b.meter: b for b in whole.between}
    low, high = found["M-4"].interval95
    assert 0 < low < DRIFT < high
    assert sum(b.interval95[0] > 0 or b.interval95[1] < 0 for m, b in found.items() if m != "M-4") <= 1
    assert found["M-4"].sessions == WEEKS


def test_noise_of_each_meter(whole: MeterHistory) -> None:
    """Put in: 0.012, rounded to 0.01 (together 0.0123), and 2.5 times 0.012 on M-6; the display is a source of its own
    in the model, so that the noise may come out as either."""
    for noise in whole.noise:
        low, high = noise.interval95
        truth = 2.5 * NOISE if noise.meter == "M-6" else NOISE
        assert low < np.hypot(truth, 0.01 / np.sqrt(12)), noise.meter
        assert high > truth, noise.meter


def test_agreement_shows_who_differs(whole: MeterHistory) -> None:
    record = {a.meter: a for a in whole.agreement if a.solution == WHOLE_RECORD}
    assert max(record.values(), key=lambda a: a.h).meter == "M-2"
    assert record["M-2"].from_centre == pytest.approx(OFFSET, abs=0.012)
    assert record["M-2"].h > record["M-2"].h_5
    assert record["M-6"].k > record["M-6"].k_1
    for name in BUFFERS:
        cells = {a.meter: a for a in whole.agreement if a.solution == name}
        assert cells["M-6"].k > cells["M-6"].k_1
        assert all(a.meters == 6 and a.readings == WEEKS for a in cells.values())


def test_three_meters_are_too_few_for_h_and_k(tmp_path: Path) -> None:
    history = reconcile.meters(meter_room(tmp_path, READINGS, meters=3))
    assert not history.agreement
    assert any("4 meters on" in why for _, why in history.not_shown)


def test_order_of_rows_changes_nothing() -> None:
    rng = np.random.default_rng(2)
    rows = [
        (f"M-{m}", f"E-{m}", START.replace(day=1 + d), 98.0 + rng.normal(), rng.normal())
        for m in (1, 2)
        for d in range(20)
    ]
    turned = [rows[i] for i in rng.permutation(len(rows))]
    one, two = (
        reconcile.meters(records_from_rows([CHECKS_HEAD], more={CALIBRATIONS: [CALIBRATIONS_HEAD, *some]}))
        for some in (rows, turned)
    )
    for a, b in zip(one.lines, two.lines, strict=True):
        assert (a.subject, a.quantity, a.begun_by) == (b.subject, b.quantity, b.begun_by)
        assert (a.rate, a.sd) == pytest.approx((b.rate, b.sd))


def test_undated_calibrations_are_counted_and_said(tmp_path: Path) -> None:
    rows = [CALIBRATIONS_HEAD, *(("M-1", "E-1", START.replace(day=6 + d), 98.0 - d, 1.0) for d in range(6))]
    rows.append(("M-1", "E-1", None, 98.0, 1.0))
    history = reconcile.meters(csv_file(tmp_path / "c.csv", rows))
    assert ("slope and offset", "1 of 7 calibrations have no date and are on no line") in history.not_shown


def test_frames_are_made_when_asked_for(whole: MeterHistory) -> None:
    assert len(whole.lines_table) == len(whole.lines)
    assert {"at", "earliest", "latest"} <= set(whole.crossings_table.columns)
    assert whole.noise_table["meter"].tolist() == list(whole.meters)
    assert len(whole.agreement_table) == 6 * (1 + len(BUFFERS))
    assert len(whole.between_table) == 6
    assert len(whole.steps_table) == 1
