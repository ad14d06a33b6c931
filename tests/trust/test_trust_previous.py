"""What is new, what persists and what is gone since an earlier report."""

from __future__ import annotations

import json
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from small_record import write_record
from typer.testing import CliRunner

import reconcile
from reconcile.cli.app import app
from reconcile.records.book import BatchRecords
from reconcile.records.over_time import Standing, standings
from reconcile.records.problems import InputProblems
from reconcile.records.results import Finding
from reconcile.replay import recheck
from reconcile.reporter.previous import read_previous, remark


def finding(
    kind: str, subject: str | tuple[str, ...], ident: str = "F1", rivals: tuple[Finding, ...] = (), of: str = "meter"
) -> Finding:
    return Finding(
        kind, subject, of, 0.1, "pH", (0.08, 0.12), 20.0, 0.001, np.zeros(0, np.intp), "", id=ident, rivals=rivals
    )


@pytest.fixture(scope="module")
def records(tmp_path_factory: pytest.TempPathFactory) -> BatchRecords:
    folder = tmp_path_factory.mktemp("record")
    return reconcile.read(*(folder / name for name in write_record(folder)))


def told(found: tuple[Standing, ...]) -> list[tuple[str, str, str, str]]:
    """(what, id now, id then, remark) of each."""
    return [(s.what, s.now.id if s.now else "", s.then.id if s.then else "", remark(s)) for s in found]


def test_they_match_by_kind_and_subject(records: BatchRecords) -> None:
    now = [finding("meter_offset", "M-1", "F1"), finding("meter_drift", "M-2", "F2")]
    then = [finding("meter_drift", "M-2", "F1"), finding("meter_offset", "M-3", "F2")]
    assert told(standings(now, then, records)) == [
        ("new", "F1", "", ""),
        ("persists", "F2", "F1", ""),
        ("gone", "", "F2", ""),
    ]


def test_the_same_findings_all_persist(records: BatchRecords) -> None:
    every = [finding("meter_offset", "M-1", "F1"), finding("lot_strength", "HA-A", "F2", of="lot")]
    assert [s.what for s in standings(every, every, records)] == ["persists", "persists"]
    assert standings([], [], records) == ()


def test_another_kind_of_the_same_subject_is_said(records: BatchRecords) -> None:
    now, then = [finding("meter_drift", "M-1", "F7")], [finding("meter_offset", "M-1", "F3")]
    assert told(standings(now, then, records)) == [
        ("new", "F7", "", "F3 then, as offset"),
        ("gone", "", "F3", "F7 now, as drift"),
    ]


def test_a_rival_then_or_now_is_said(records: BatchRecords) -> None:
    lot, meter = finding("lot_strength", "HA-A", "F2", of="lot"), finding("meter_offset", "M-1", "F1")
    now = [finding("meter_offset", "M-1", "F1", rivals=(lot,))]
    then = [finding("lot_strength", "HA-A", "F2", rivals=(meter,), of="lot")]
    assert told(standings(now, then, records)) == [
        ("new", "F1", "", "among the rivals of F2 then"),
        ("gone", "", "F2", "among the rivals of F1 now"),
    ]


@pytest.mark.parametrize(
    ("subject", "of", "said"),
    [
        ("M-9", "meter", "not in this record"),
        ("M-1", "meter", ""),
        ("HA-Z", "lot", "not in this record"),
        ("HA-A", "lot", ""),
        (("B-99", "M-1", "5"), "reading", "not in this record"),
        ("acetic acid", "acid", ""),
    ],
)
def test_what_is_no_longer_in_the_record_is_said(
    records: BatchRecords, subject: str | tuple[str, ...], of: str, said: str
) -> None:
    assert told(standings([], [finding("kind", subject, of=of)], records)) == [("gone", "", "F1", said)]


def test_a_reading_is_known_again_when_its_row_has_moved(records: BatchRecords) -> None:
    then = [finding("reading_slip", ("B-03", "M-4", "5"), of="reading")]
    moved = finding("reading_slip", ("B-03", "M-4", "9"), "F1", of="reading")
    assert [s.what for s in standings([moved], then, records)] == ["persists"]
    twice = [moved, finding("reading_slip", ("B-03", "M-4", "12"), "F2", of="reading")]
    assert [s.what for s in standings(twice, then, records)] == ["new", "new", "gone"]
    there = [finding("reading_slip", ("B-03", "M-4", "5"), "F2", of="reading"), moved]
    assert [s.what for s in standings(there, then, records)] == ["persists", "new"]


@pytest.fixture(scope="module")
def reports(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Reports `march` and `april`; M-2 is off in both, M-3 in March alone, M-4 in April alone."""
    folder = tmp_path_factory.mktemp("reports")
    months: Mapping[str, dict[str, float]] = {"march": {"M-2": 0.12, "M-3": -0.1}, "april": {"M-2": 0.13, "M-4": 0.15}}
    for month, off in months.items():
        (folder / f"{month}_files").mkdir()
        files = [folder / f"{month}_files" / name for name in write_record(folder / f"{month}_files", off)]
        audit = reconcile.audit(*files)
        if month == "april":
            audit = reconcile.since_previous(audit, folder / "march")
        reconcile.write_report(audit, folder / month)
    return folder


def test_findings_json_is_added_to(reports: Path) -> None:
    march, april = (json.loads((reports / m / "findings.json").read_text("utf-8")) for m in ("march", "april"))
    assert set(april) - set(march) == {"previous"}
    assert march["schema"] == april["schema"] == 1
    past = april["previous"]
    assert past["report_id"] == json.loads((reports / "march" / "manifest.json").read_text("utf-8"))["report_id"]
    by_id = {f["id"]: f for f in april["findings"]}
    (new,), (same,), (gone,) = past["new"], past["persisting"], past["gone"]
    assert by_id[new["id"]]["subject"] == "M-4"
    assert by_id[same["id"]]["subject"] == same["then"]["subject"] == "M-2"
    assert (gone["kind"], gone["subject"]) == ("meter_offset", "M-3")
    then = next(f for f in march["findings"] if f["subject"] == "M-2")
    assert same["then"] == {key: then[key] for key in same["then"]}


def test_the_page_has_a_part_for_it(reports: Path) -> None:
    march, april = ((reports / m / "report.html").read_text("utf-8") for m in ("march", "april"))
    assert 'id="previous"' not in march
    assert '<li><a href="#previous">Since the previous report</a></li>' in april
    assert "1 new, 1 persisting, 1 finding gone" in april
    part = april.partition('<section id="previous"')[2].partition("</section>")[0]
    rows = part.split("<tr")[2:]
    assert [row.partition('class="s">')[2].partition("<")[0] for row in rows] == ["new", "persists", "gone"]
    assert [word in row for word, row in zip(("M-4", "M-2", "M-3"), rows, strict=True)] == [True] * 3


def test_it_is_rechecked_with_the_findings_that_it_keeps(reports: Path, tmp_path: Path) -> None:
    assert recheck(reports / "april").holds
    kept = reports / "april" / "previous.json"
    assert kept.read_bytes() == (reports / "march" / "findings.json").read_bytes()
    whole = kept.read_bytes()
    try:
        kept.write_bytes(whole.replace(b'"M-3"', b'"M-5"'))
        checked = recheck(reports / "april")
        wrong = {x.name for x in checked.files if x.standing != "the same"}
        assert {"manifest.json", "findings.json", "report.html"} <= wrong
        kept.unlink()
        assert "previous.json" in recheck(reports / "april").why_not
    finally:
        kept.write_bytes(whole)


def test_another_previous_report_makes_another_report(reports: Path) -> None:
    audit = reconcile.audit(*sorted((reports / "april_files").glob("*.csv")))
    from reconcile.reporter.manifest import report_id

    against = {report_id(reconcile.since_previous(audit, reports / month)) for month in ("march", "april")}
    assert len({report_id(audit), *against}) == 3


def test_the_command_may_replace_what_it_compares_with(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("COLUMNS", "400")
    files = write_record(tmp_path, {"M-2": 0.12})
    assert CliRunner().invoke(app, ["audit", *files, "--out", "room"]).exit_code == 0
    write_record(tmp_path)
    done = CliRunner().invoke(app, ["audit", *files, "--out", "room", "--replace", "--previous", "room"])
    assert done.exit_code == 0
    lines = [line.strip() for line in done.stdout.splitlines()]
    assert any(line.startswith("gone  Meter M-2: offset, then +0.1") for line in lines)
    done = CliRunner().invoke(app, ["audit", *files, "--out", "room", "--replace", "--previous", "room", "--json"])
    document = json.loads(done.stdout)
    assert document["previous"]["gone"] == []
    assert document["gist"]["previous"].endswith(": 0 new; 0 persisting; 0 gone.")
    assert recheck(tmp_path / "room").holds


def spoiled(change: Any) -> bytes:
    one = {
        "id": "F1", "kind": "meter_offset", "subject": "M-2", "subject_type": "meter", "estimate": 0.1, "unit": "pH",
        "interval95": [0.0, 0.2], "since": None,
    }  # fmt: skip
    return json.dumps({"schema": 1, "findings": [one | change]}).encode()


@pytest.mark.parametrize(
    "content",
    [
        b"",
        b"{",
        b"[]",
        b'{"schema": 2, "findings": []}',
        b'{"schema": 1, "findings": [3]}',
        b"[" * 100_000,
        spoiled({"estimate": "much"}),
        spoiled({"estimate": float("nan")}),
        spoiled({"interval95": [1]}),
        spoiled({"interval95": 3}),
        spoiled({"kind": None}),
        spoiled({"since": "yesterday"}),
        spoiled({"would_explain": 3}),
        spoiled({"rivals": [{}]}),
    ],
)
def test_findings_that_are_none_are_refused(tmp_path: Path, content: bytes) -> None:
    (tmp_path / "manifest.json").write_text('{"report_id": "0000-0000-0000-0000"}')
    (tmp_path / "findings.json").write_bytes(content)
    with pytest.raises(InputProblems, match="the findings of this report cannot be read"):
        read_previous(tmp_path)


def test_there_must_be_an_earlier_report(tmp_path: Path) -> None:
    for place in (tmp_path, tmp_path / "absent"):
        with pytest.raises(InputProblems, match="there is no report here"):
            read_previous(place)
    (tmp_path / "findings.json").write_bytes(spoiled({}))
    (tmp_path / "manifest.json").write_text("[]")
    with pytest.raises(InputProblems, match="manifest"):
        read_previous(tmp_path)
