"""The report of meters through time: folder, tables, page and pictures, with hostile names, and in a browser."""

from __future__ import annotations

import csv
import hashlib
import json
import re
from collections.abc import Iterator
from datetime import datetime, timedelta
from pathlib import Path

import numpy as np
import pytest
from builders import csv_file, workbook
from chromium_pipe import Chromium, program

import reconcile
from reconcile.records.meter_results import MeterHistory
from reconcile.reporter.figures.calibration_course import calibration_course
from reconcile.reporter.figures.mandel import mandel
from reconcile.reporter.figures.style import styled
from reconcile.reporter.meter_gist import meter_gist
from reconcile.reporter.meter_tables import calibrations, lines
from reconcile.reporter.write import write_report

START = datetime(2025, 2, 3, 8)
FORMULA, TAGS, SIGNS = '=HYPERLINK("x")', "<script>alert(1)</script>", "M-\u202e3"
METERS = (FORMULA, TAGS, SIGNS, "M-4")


@pytest.fixture(scope="module")
def history(tmp_path_factory: pytest.TempPathFactory) -> MeterHistory:
    """Four meters, some with names that act; M-4 loses slope until it is outside the limits."""
    rng = np.random.default_rng(1)
    sheets: dict[str, list[tuple[object, ...]]] = {
        "Calibrations": [("Meter", "Probe", "Calibrated at", "Slope (%)", "Offset (mV)")],
        "Events": [("Meter", "Date", "What was done"), ("M-4", START + timedelta(days=50), "<b>refilled</b>")],
        "Checks": [("Read at", "Known solution", "Meter", "Temperature (°C)", "pH")],
    }
    for week in range(16):
        for m, name in enumerate(METERS):
            at = START + timedelta(days=7 * week, minutes=m)
            slope = 99.0 - (0.1 * 7 * week if m == 3 else 0.0) + rng.normal(0, 0.2)
            sheets["Calibrations"].append((name, f"E-{m}", at, round(slope, 1), round(rng.normal(), 1)))
            for i, (buffer, ph) in enumerate((("phosphate", 6.865), ("borax", 9.180))):
                read = at + timedelta(days=1 + 2 * ((week + i) % 3))
                sheets["Checks"].append((read, buffer, name, 25.0, round(ph + rng.normal(0, 0.012), 2)))
    folder = tmp_path_factory.mktemp("input")
    return reconcile.meters(*(csv_file(folder / f"{name.lower()}.csv", rows) for name, rows in sheets.items()))


@pytest.fixture(scope="module")
def folder(history: MeterHistory, tmp_path_factory: pytest.TempPathFactory) -> Path:
    return write_report(history, tmp_path_factory.mktemp("reports") / "meters")


def test_the_folder_holds_what_its_manifest_lists(folder: Path) -> None:
    document = json.loads((folder / "manifest.json").read_text("utf-8"))
    held = {p.relative_to(folder).as_posix() for p in folder.rglob("*") if p.is_file()} - {"manifest.json"}
    assert {o["name"] for o in document["outputs"]} == held
    for output in document["outputs"]:
        assert hashlib.sha256((folder / output["name"]).read_bytes()).hexdigest() == output["sha256"]
    assert document["command"] == "meters"
    assert {"meters.html", "lines.csv", "plots/calibrations_4.png", "plots/agreement.svg"} <= held


def test_an_audit_of_the_same_files_has_another_id(history: MeterHistory, tmp_path: Path) -> None:
    assert history.audit is not None
    audit = write_report(history.audit, tmp_path / "audit")
    other = write_report(history, tmp_path / "meters")
    one, two = (json.loads((f / "manifest.json").read_text("utf-8")) for f in (audit, other))
    assert one["report_id"] != two["report_id"]
    assert one["command"] == "audit"


def test_the_same_bytes_each_time(history: MeterHistory, folder: Path, tmp_path: Path) -> None:
    again = write_report(history, tmp_path / "again")
    for path in sorted(p for p in folder.rglob("*") if p.is_file() and p.name != "manifest.json"):
        assert path.read_bytes() == (again / path.relative_to(folder)).read_bytes(), path.name


def test_names_that_act_are_made_harmless(folder: Path) -> None:
    page = (folder / "meters.html").read_text("utf-8")
    assert TAGS not in page
    assert "&lt;script&gt;" in page
    assert "<b>refilled" not in page
    assert "\u202e" not in page
    assert len(re.findall("<script", page)) == 1
    with (folder / "lines.csv").open(encoding="utf-8", newline="") as file:
        subjects = {row["subject"] for row in csv.DictReader(file)}
    assert f"'{FORMULA}" in subjects
    assert FORMULA not in subjects
    assert "M-\\u202e3" in subjects


def test_calibrations_outside_the_limits_are_named_and_shaded(history: MeterHistory) -> None:
    """99 - 0.1 d is 88.5 on the last day, put in; the limit is 90 (USP <791>, revision of 2016)."""
    table = calibrations(history)
    out = [w for w in table.data["outside"] if w]
    assert out
    assert set(out) == {"slope below 90 %"}
    assert table.flagged.sum() == len(out)
    assert sum(lines(history).data["outside"]) == len(out)


def test_the_page_says_what_it_must(folder: Path) -> None:
    page = (folder / "meters.html").read_text("utf-8")
    for words in (
        "does not extend a calibration interval",
        "Ph. Eur. 2.2.3",
        "USP",
        "A flag is a lead for the quality unit, not a disposition",
        "This manifest is unsigned",
        "ISO 5725-2",
        "Algorithm A",
    ):
        assert words in page, words
    assert not re.search(r"\b(pass(ed)?|fail(ed)?|score)\b", re.sub(r"<(style|script).*?</\1>", "", page, flags=re.S))


def test_the_gist_has_a_line_for_each_question(history: MeterHistory) -> None:
    gist = {line.key: line.text for line in meter_gist(history)}
    assert gist["looked_at"].startswith("64 calibrations and 128 readings of 4 meters and 4 probes")
    assert "M-4, slope below 90 %" in gist["outside"]
    assert "M-4, slope 90 %" in gist["crossings"]
    assert gist["complete"] == "128 rows of readings read = 128 used + 0 set aside."


def test_a_picture_of_calibrations_shows_limits_line_and_event(history: MeterHistory) -> None:
    with styled():
        drawn = calibration_course(history, "M-4", "meter")
    slope, offset = drawn.axes
    assert slope.get_ylabel() == "slope (%)"
    assert offset.get_ylabel() == "offset (mV)"
    levels = {float(line.get_ydata()[0]) for line in slope.lines if len(set(np.asarray(line.get_ydata()))) == 1}
    assert {90.0, 95.0, 105.0} <= levels
    assert {-30.0, 30.0} <= {float(line.get_ydata()[0]) for line in offset.lines}
    low, high = slope.get_ylim()
    assert low < 90.0
    assert high > 105.0
    assert any("refilled" in text.get_text() for text in slope.texts)
    assert sum(len(c.get_offsets()) for c in slope.collections if len(c.get_offsets()) > 0) >= 16


def test_a_picture_of_agreement_has_a_place_for_every_meter(history: MeterHistory) -> None:
    with styled():
        drawn = mandel(history)
    upper, lower = drawn.axes
    assert len(lower.get_xticks()) == 4
    assert upper.get_ylabel() == "h (–)"


def test_calibrations_of_slope_alone_give_one_strip(tmp_path: Path) -> None:
    rows = [("Meter", "Calibrated at", "Slope (%)"), *(("M-1", START + timedelta(days=d), 98.0) for d in range(6))]
    found = reconcile.meters(workbook(tmp_path / "c.xlsx", {"Calibrations": rows}))
    with styled():
        assert len(calibration_course(found, "M-1", "meter").axes) == 1
    assert write_report(found, tmp_path / "report").is_dir()


@pytest.fixture(scope="module")
def browser(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Chromium]:
    one = Chromium(tmp_path_factory.mktemp("profile"))
    yield one
    one.close()


@pytest.mark.browser
@pytest.mark.skipif(program() is None, reason="no Chromium is installed on this system")
def test_it_opens_from_disk_without_a_request_or_a_message(browser: Chromium, folder: Path) -> None:
    page = folder / "meters.html"
    browser.open(page)
    browser.value("new Promise(done => setTimeout(done, 300))")
    requested = [e["request"]["url"] for e in browser.of("Network.requestWillBeSent")]
    assert [url for url in requested if not url.startswith(("data:", page.resolve().as_uri()))] == []
    for kind in ("Runtime.consoleAPICalled", "Runtime.exceptionThrown", "Log.entryAdded"):
        assert browser.of(kind) == []
    assert browser.value("Array.from(document.images).every(i => i.complete && i.naturalWidth > 300 && i.alt)")
    ids = "Array.from(document.querySelectorAll('[id]')).map(e => e.id)"
    found = browser.value(ids)
    assert len(found) == len(set(found))
    targets = browser.value("Array.from(document.querySelectorAll('a[href^=\"#\"]')).map(a => a.hash.slice(1))")
    assert set(targets) <= set(found)
