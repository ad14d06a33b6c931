"""Pictures by their data and labels; from four readings to many, with and without times, meters and lots."""

from __future__ import annotations

import dataclasses
import xml.etree.ElementTree as ET

import numpy as np
import pytest
from invented_audit import METERS, build
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from reconcile.records.results import Audit
from reconcile.reporter.figures import PICTURES
from reconcile.reporter.figures.finding import finding_picture
from reconcile.reporter.figures.marks import RASTER_FROM
from reconcile.reporter.figures.style import styled
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.to_png import images


def draw(name: str, audit: Audit) -> Figure:
    with styled():
        return PICTURES[name].draw(audit, Lookups(audit))


def offsets(axes: Axes) -> np.ndarray:
    return np.concatenate([np.asarray(c.get_offsets()) for c in axes.collections if len(c.get_offsets()) > 0])


def without(audit: Audit, **columns: object) -> Audit:
    """The audit with some columns of its readings emptied."""
    readings = audit.records.readings
    changed = dataclasses.replace(readings, columns={**readings.columns, **columns})
    return dataclasses.replace(audit, records=dataclasses.replace(audit.records, readings=changed))


def test_observed_against_predicted_holds_every_solved_reading(invented: Audit) -> None:
    left, right = draw("predicted_observed", invented).axes
    known = np.isfinite(invented.prediction.ph)
    points = offsets(left)
    expected = np.column_stack([invented.prediction.ph, invented.records.readings["ph"]])[known]
    assert sorted(map(tuple, points.tolist())) == sorted(map(tuple, expected.tolist()))
    assert left.get_xlabel() == "pH predicted from the recipe"
    assert right.get_ylabel() == "observed − predicted (pH)"
    line = left.lines[0]
    np.testing.assert_array_equal(line.get_xdata(), line.get_ydata())


def test_one_strip_a_meter_with_calibrations_events_and_findings(invented: Audit) -> None:
    drawn = draw("residuals_time", invented)
    assert [axes.get_title(loc="left").split("   ")[0] for axes in drawn.axes] == sorted(METERS)
    accused = drawn.axes[sorted(METERS).index("pH-2")]
    after, before = [line.get_ydata() for line in accused.lines if line.get_linewidth() == 1.3]  # the course
    assert np.ptp(after) == np.ptp(before) == 0.0
    assert float(after[0] - before[0]) == pytest.approx(0.14)  # the invented step, from where the meter stood
    assert abs(float(before[0])) < 0.02
    assert any("replaced <b>" in text.get_text() for text in accused.texts)
    labels = [text.get_text() for text in drawn.legends[0].get_texts()]
    assert {"calibration", "logged event", "course a finding gives"} <= set(labels)


def test_a_reading_far_out_is_named_at_the_edge(invented: Audit) -> None:
    residual = invented.residual.copy()
    residual[0] = 2.5
    drawn = draw("residuals_time", dataclasses.replace(invented, residual=residual))
    assert any(text.get_text() == "+2.50" for axes in drawn.axes for text in axes.texts)
    assert max(axes.get_ylim()[1] for axes in drawn.axes) < 1.0


def test_lots_are_sorted_by_their_mean_and_count_their_readings(invented: Audit) -> None:
    (axes,) = draw("residuals_lots", invented).axes
    labels = [label.get_text() for label in axes.get_yticklabels()]
    assert labels[0].startswith("SA-7  F2   n = ")
    lookups = Lookups(invented)
    reading, lot = lookups.reading_lots
    usable = lookups.usable[reading]
    count = int(((lot == 2) & usable).sum())
    assert labels[0].endswith(f"n = {count}")
    assert len(labels) == 4


def test_grid_writes_mean_and_count(invented: Audit) -> None:
    (axes,) = draw("meter_lot", invented).axes
    lookups = Lookups(invented)
    reading, lot = lookups.reading_lots
    chosen = (lot == 2) & (lookups.meter[reading] == METERS[0]) & lookups.usable[reading]
    mean = invented.residual[reading[chosen]].mean()
    expected = f"−{abs(mean):.3f}\nn = {int(chosen.sum())}"
    assert expected in [text.get_text() for text in axes.texts]


def test_a_finding_is_shown_before_and_after(invented: Audit) -> None:
    finding = invented.findings[0]
    with styled():
        before, after = finding_picture(invented, Lookups(invented), finding).axes
    assert before.get_title(loc="left") == "as recorded"
    assert after.get_title(loc="left") == "with F1 taken out"
    own = invented.residual[finding.readings]
    np.testing.assert_allclose(np.sort(offsets(before)[:, 1])[-len(own) :], np.sort(own))
    assert np.abs(offsets(after)[:, 1]).max() < 0.13
    assert Lookups(invented).part(finding).sum() == pytest.approx(0.14 * len(finding.readings))


def test_other_findings_on_the_same_readings_are_taken_out_and_said_so(invented: Audit) -> None:
    step = invented.findings[0]
    other = dataclasses.replace(
        invented.findings[1], id="F3", readings=step.readings, shift=np.full(len(step.readings), 0.05)
    )
    audit = dataclasses.replace(invented, findings=(*invented.findings, other))
    with styled():
        before, after = finding_picture(audit, Lookups(audit), step).axes
    assert before.get_title(loc="left") == "as recorded, other findings taken out"
    assert after.get_title(loc="left") == "F1 taken out too"
    own = np.sort(audit.residual[step.readings] - 0.05)
    np.testing.assert_allclose(np.sort(offsets(before)[:, 1])[-len(own) :], own)


@pytest.mark.parametrize("name", sorted(PICTURES))
def test_axes_have_names_with_units(name: str, invented: Audit) -> None:
    drawn = draw(name, invented)
    labels = [axes.get_xlabel() + axes.get_ylabel() for axes in drawn.axes]
    assert any(labels)
    if name not in ("meter_lot",):
        whole = " ".join(labels) + (drawn.get_supylabel() if hasattr(drawn, "get_supylabel") else "")
        assert "pH" in whole


@pytest.mark.parametrize("name", sorted(PICTURES))
@pytest.mark.parametrize("n", [2, 4, 40, 3000])
@pytest.mark.parametrize("times", [True, False])
def test_every_picture_can_be_drawn_at_any_size(name: str, n: int, times: bool) -> None:
    audit = build(n, with_times=times)
    with styled():
        png, svg = images(PICTURES[name].draw(audit, Lookups(audit)))
    assert png.startswith(b"\x89PNG")
    ET.fromstring(svg)


@pytest.mark.parametrize("name", sorted(PICTURES))
def test_a_record_without_meters_and_times_still_draws(name: str) -> None:
    audit = build(with_times=False)
    audit = without(audit, meter=np.array([""] * 40, object))
    audit = dataclasses.replace(audit, findings=(), smallest_detectable=(), not_testable=())
    with styled():
        images(PICTURES[name].draw(audit, Lookups(audit)))


def test_names_with_formula_signs_are_drawn_as_they_stand(invented: Audit) -> None:
    lots = dataclasses.replace(invented.records.lots, name=np.array(["$\\frac{", "日本語", "<b>", "a_b^c"], object))
    audit = dataclasses.replace(invented, records=dataclasses.replace(invented.records, lots=lots))
    with styled():
        drawn = PICTURES["residuals_lots"].draw(audit, Lookups(audit))
        images(drawn)
    assert any(t.get_text().startswith("$\\frac{") for t in drawn.axes[0].get_yticklabels())


@pytest.mark.parametrize(("n", "raster"), [(40, False), (RASTER_FROM + 200, True)])
def test_many_points_are_a_picture_inside_the_svg(n: int, raster: bool) -> None:
    audit = build(n)
    with styled():
        _, svg = images(PICTURES["predicted_observed"].draw(audit, Lookups(audit)))
    assert (b"<image" in svg) == raster
    assert len(svg) < 1_500_000


def test_images_hold_no_date_and_no_version(invented: Audit) -> None:
    with styled():
        png, svg = images(PICTURES["predicted_observed"].draw(invented, Lookups(invented)))
        again = images(PICTURES["predicted_observed"].draw(invented, Lookups(invented)))
    assert (png, svg) == again
    assert b"<dc:date>" not in svg
    assert b"Matplotlib v" not in svg + png
    assert b"Software" not in png
