"""What a finding's section says of its rows, its onset and the limits; what the page says where there is little."""

from __future__ import annotations

from dataclasses import replace
from datetime import datetime
from pathlib import Path

import numpy as np
import pytest
from invented_audit import build

import reconcile
from reconcile.records.book import SheetSource
from reconcile.records.results import Audit, Silence
from reconcile.reporter.drawn import caption_of, draw_all
from reconcile.reporter.figures.residuals_time import residuals_time
from reconcile.reporter.figures.timeline import day
from reconcile.reporter.gist import gist
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.page_findings import overview, sections
from reconcile.reporter.page_tables import view
from reconcile.reporter.summaries import settings
from reconcile.reporter.words import explains_words, subject_words


def with_second_sheet(audit: Audit, moved: np.ndarray) -> Audit:
    """The same audit with some readings in a sheet of their own, of known solutions."""
    records = audit.records
    readings = records.readings
    source = readings.source.copy()
    source[moved] = len(records.sheets)
    columns = {k: v.copy() for k, v in readings.columns.items()}
    columns["known"][moved], columns["batch"][moved] = "borax", ""
    sheets = (*records.sheets, SheetSource("log.xlsx", "Checks", "readings", 1, {}))
    return replace(
        audit, records=replace(records, sheets=sheets, readings=replace(readings, source=source, columns=columns))
    )


def test_a_row_of_another_sheet_is_named_with_its_sheet(invented: Audit) -> None:
    own = np.asarray(invented.findings[0].readings)
    both = with_second_sheet(invented, own[-1:])
    lookups = Lookups(both)
    section = sections(both, lookups, [])[0]
    named = {batch: [text for text, _ in rows] for batch, rows in section.readings}
    row = int(both.records.readings.row[own[-1]])
    assert named["known solution borax"] == [f"Checks {row}"]
    assert all(text.isdecimal() for batch, texts in named.items() if batch != "known solution borax" for text in texts)
    assert lookups.place_words(int(own[-1])) == f"Checks, row {row}"
    assert lookups.place_words(int(own[0])) == f"row {int(both.records.readings.row[own[0]])}"


def test_the_last_reading_before_an_onset(invented: Audit) -> None:
    lookups, step = Lookups(invented), invented.findings[0]
    readings = invented.records.readings
    at = lookups.before_onset(step)
    assert at is not None
    mine = (readings["meter"] == step.subject) & (lookups.times < np.datetime64(step.since, "s"))
    assert mine[at]
    assert lookups.times[at] == lookups.times[mine & lookups.usable].max()
    assert lookups.before_onset(replace(step, since=None)) is None
    assert lookups.before_onset(replace(step, since=datetime(1999, 1, 1))) is None
    assert lookups.before_onset(replace(step, subject="SA-7", subject_type="lot")) is None


def test_the_table_of_limits_says_where_each_reading_would_lie(invented: Audit) -> None:
    impact = sections(invented, Lookups(invented), [])[0].impact
    assert impact is not None
    at = {heading: i for i, (heading, _) in enumerate(impact.headings)}
    for row in impact.rows:
        text = {heading: row.cells[i].text for heading, i in at.items()}
        value, low, high = (float(text[k]) for k in ("pH observed", "Low limit (pH)", "High limit (pH)"))
        share = float(text["Share of the finding (pH)"].replace("−", "-"))
        for heading, ph in (("As read", value), ("Without that share", value - share)):
            assert text[heading] == ("below" if ph < low else "above" if ph > high else "inside")
        assert text["As read"] != text["Without that share"]


def test_a_slip_says_what_was_meant(invented: Audit) -> None:
    slip = replace(
        invented.findings[0],
        kind="reading_slip",
        subject=("B-3", "pH-1", "7"),
        subject_type="reading",
        estimate=-0.45,
        would_explain={"pH": 3.83, "slip": "transposed digits"},
        since=None,
    )
    assert explains_words(slip) == "pH 3.83 meant; transposed digits"
    items = next(line for line in gist(replace(invented, findings=(slip,))) if line.key == "stands_out").items
    assert "pH 3.83 meant" in items[0][1]


def test_every_meter_is_not_a_meter_of_that_name(invented: Audit) -> None:
    assert subject_words(Silence("meter_step", "all", "meter", "the readings have no date or time")) == "every meter"
    assert subject_words(replace(invented.findings[0], subject="all", subject_type="meter")) == "meter all"


def test_without_findings_the_gist_says_whether_readings_stand_out() -> None:
    none = replace(build(with_findings=False), findings=())
    calm = replace(none, status=np.where(none.status == "stands_out", "as_predicted", none.status))
    loud = replace(none, status=np.where(np.arange(len(none.status)) == 0, "stands_out", calm.status))
    texts = [next(x.text for x in gist(one) if x.key == "stands_out") for one in (calm, loud)]
    assert texts[0].endswith("and no reading stands out by itself.")
    assert texts[1].startswith("No fault is supported by the readings. 1 reading stands out")
    assert overview(Lookups(calm)) is None


def test_with_findings_the_gist_says_that_nothing_else_stands_out(invented: Audit) -> None:
    calm = replace(invented, status=np.where(invented.status == "stands_out", "as_predicted", invented.status))
    loud = replace(calm, status=np.where(np.arange(len(calm.status)) == 0, "stands_out", calm.status))
    leads = [next(x.lead for x in gist(one) if x.key == "stands_out") for one in (calm, loud)]
    assert leads[0].endswith("No other reading stands out.")
    assert leads[1].endswith("1 reading stands out without a finding that explains it.")


def test_a_caption_says_why_readings_of_other_meters_are_in_the_picture(invented: Audit) -> None:
    lookups, step = Lookups(invented), invented.findings[0]
    elsewhere = np.flatnonzero(invented.records.readings["meter"] != step.subject)[:2]
    felt = replace(
        step, readings=np.r_[step.readings, elsewhere], shift=np.r_[step.shift, np.full(len(elsewhere), -0.14)]
    )
    assert "2 of the readings were made on other meters" in caption_of(felt, lookups)
    assert "other meters" not in caption_of(step, lookups)


def test_the_course_before_an_onset_ends_there(invented: Audit) -> None:
    """A later reading that the finding does not rest on (the solution was adjusted by it) belongs to neither part."""
    step = invented.findings[0]
    fewer = replace(step, readings=step.readings[:-1], shift=step.shift[:-1])
    audit = replace(invented, findings=(fewer, *invented.findings[1:]))
    drawn = residuals_time(audit, Lookups(audit))
    assert step.since is not None
    courses = [
        np.asarray(one.get_xdata(), float)
        for axes in drawn.axes
        if axes.get_title().startswith(str(step.subject))
        for one in axes.lines
        if one.get_linewidth() == 1.3
    ]
    assert len(courses) == 2
    inside, before = courses
    assert before.max() < day(step.since) <= inside.min()


def test_names_of_settings_are_not_broken(invented: Audit) -> None:
    shown = view(settings(invented), "settings", "Settings", tool=False)
    assert {row.cells[0].css for row in shown.rows} == {"s"}


@pytest.fixture(scope="module")
def little(tmp_path_factory: pytest.TempPathFactory) -> Audit:
    """Three readings on one meter, one of them far off; no lots."""
    path = tmp_path_factory.mktemp("little") / "three.csv"
    path.write_text(
        "Batch,Meter,Read at,Temperature (°C),pH,Low limit (pH),High limit (pH),Acetic acid (mM),Sodium acetate (mM)\n"
        "B1,M1,2025-03-03 09:00,22.0,4.66,4.60,4.80,50,50\n"
        "B2,M1,2025-03-04 09:00,22.0,4.68,4.60,4.80,50,50\n"
        "B3,M1,2025-03-05 09:00,22.0,5.30,4.60,4.80,50,50\n",
        encoding="utf-8",
    )
    return reconcile.audit(path)


def test_three_readings_make_a_whole_report_and_no_caption_for_a_picture_that_is_not_there(
    little: Audit, tmp_path: Path
) -> None:
    captions = {drawn.name: drawn.caption for drawn in draw_all(little, Lookups(little), lambda what, share: None)}
    assert captions["residuals_lots"] == ""  # no lot is named
    assert captions["meter_lot"] == ""
    assert captions["residuals_time"]
    page = (reconcile.write_report(little, tmp_path / "three") / "report.html").read_text(encoding="utf-8")
    assert "<figcaption></figcaption>" not in page
    assert "B3" in page
