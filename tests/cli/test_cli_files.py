"""Whole commands on files: what is refused and leaves nothing behind, what is set aside, and the exit code of each."""

from __future__ import annotations

import json
import re
import zipfile
from collections.abc import Callable
from pathlib import Path

import pytest
from command_line import READINGS, RECIPES, Run, write_record

from reconcile.reporter.cautions import CAUTIONS


def empty(path: Path) -> None:
    path.write_bytes(b"")


def blank(path: Path) -> None:
    path.write_text("\n\n\n", encoding="utf-8")


def no_heading(path: Path) -> None:
    path.write_text("colour,shape\nred,round\nblue,square\n", encoding="utf-8")


def no_workbook(path: Path) -> None:
    with zipfile.ZipFile(path, "w") as archive:
        archive.writestr("letter.txt", "not a workbook")


def cut_short(path: Path) -> None:
    path.write_bytes(b"PK\x03\x04" + b"\x00" * 40)


REFUSED = [
    ("absent.xlsx", None, "there is no such file"),
    ("empty.xlsx", empty, "empty"),
    ("blank.csv", blank, "empty"),
    ("shapes.csv", no_heading, "no heading row was recognised"),
    ("letter.xlsx", no_workbook, "letter.xlsx"),
    ("cut.xlsx", cut_short, "damaged or incomplete"),
]


@pytest.mark.parametrize("command", ["read", "audit"])
@pytest.mark.parametrize(("name", "make", "said"), REFUSED, ids=[name for name, _, _ in REFUSED])
def test_a_refused_file_leaves_nothing_behind(
    run: Run, tmp_path: Path, command: str, name: str, make: Callable[[Path], None] | None, said: str
) -> None:
    if make:
        make(tmp_path / name)
    before = set(tmp_path.rglob("*"))
    done = run(command, name)
    assert done.code == 1
    assert name in done.err
    assert said in done.err
    assert ("Nothing was written" in done.err) == (command == "audit")
    assert done.out == ""
    assert set(tmp_path.rglob("*")) == before


def test_refusal_keeps_standard_output_clean_for_json(run: Run) -> None:
    done = run("audit", "absent.xlsx", "--json")
    assert (done.code, done.out) == (1, "")


def test_all_refused_files_are_named_at_once(run: Run, tmp_path: Path) -> None:
    empty(tmp_path / "one.csv")
    err = run("read", "one.csv", "two.csv").err
    assert "one.csv" in err
    assert "two.csv" in err


@pytest.mark.parametrize(
    ("settings", "said"),
    [
        ("[prediction]\nactivity_modle = 'davies'\n", "activity_modle"),
        ("[prediction]\nactivity_model = 'magic'\n", "davies, extended, ideal"),
        ("[prediction\n", "site.toml"),
    ],
)
def test_bad_settings_are_refused_in_words(run: Run, tmp_path: Path, settings: str, said: str) -> None:
    files = write_record(tmp_path)
    (tmp_path / "site.toml").write_text(settings, encoding="utf-8")
    done = run("read", *files, "--settings", "site.toml")
    assert done.code == 1
    assert said in done.err


def test_read_shows_what_was_understood(run: Run, tmp_path: Path) -> None:
    done = run("read", *write_record(tmp_path))
    assert done.code == 0
    assert "24 rows read = 24 used + 0 set aside" in done.out
    assert "Temperature (°C)" in done.out
    assert done.files == {READINGS, RECIPES}


def test_read_as_json(run: Run, tmp_path: Path) -> None:
    done = run("read", *write_record(tmp_path, bad={3: "see print"}), "--json")
    found = json.loads(done.out)
    assert found["rows"] == {"read": 24, "used": 23, "set_aside": 1}
    assert [sheet["kind"] for sheet in found["sheets"]] == ["readings", "recipes"]
    (row,) = found["set_aside"]
    assert (row["source"], row["row"], row["batch"], row["meter"]) == (READINGS, 5, "B-03", "M-4")
    assert row["read"] == "see print"


def test_read_strict_minds_rows_set_aside(run: Run, tmp_path: Path) -> None:
    files = write_record(tmp_path, bad={3: "see print"})
    assert run("read", *files).code == 0
    assert run("read", *files, "--strict").code == 3


def test_over_five_percent_set_aside_is_incomplete(run: Run, tmp_path: Path) -> None:
    done = run("read", *write_record(tmp_path, bad={3: "see print", 5: ""}), "--strict")
    assert done.code == 4
    assert "Incomplete: 2 of 24 rows were set aside" in done.out


def test_every_row_of_a_meter_set_aside_is_incomplete(run: Run, tmp_path: Path) -> None:
    bad = dict.fromkeys([0, 20, 40], "")
    done = run("read", *write_record(tmp_path, bad=bad, rows=60, meters=20))
    assert done.code == 4
    assert "Every row of meter M-1 was set aside (3 rows)" in done.out


def test_two_rows_of_a_meter_are_too_few_to_say_so(run: Run, tmp_path: Path) -> None:
    assert run("read", *write_record(tmp_path, bad={0: "", 20: ""}, rows=40, meters=20)).code == 0


def test_a_column_map_is_written_once(run: Run, tmp_path: Path) -> None:
    files = write_record(tmp_path)
    done = run("read", *files, "--write-columns", "columns.toml")
    assert done.code == 0
    assert "columns.toml" in done.files
    assert run("read", *files, "--columns", "columns.toml").code == 0
    again = run("read", *files, "--write-columns", "columns.toml")
    assert again.code == 2
    assert "columns.toml already exists" in again.err


def test_a_column_map_is_begun_where_no_heading_is_recognised(run: Run, tmp_path: Path) -> None:
    files = write_record(tmp_path)
    readings = tmp_path / READINGS
    readings.write_text(
        readings.read_text("utf-8").replace("Batch,Meter,Temperature (°C),pH", "Ansatz,Gerät,Grad,Wert")
    )
    assert run("read", READINGS).code == 1
    done = run("read", READINGS, "--write-columns", "columns.toml")
    assert done.code == 1
    begun = (tmp_path / "columns.toml").read_text("utf-8")
    assert '# "Ansatz" = ' in begun
    named = begun.replace('# "Ansatz" = ', '"Ansatz" = "batch"').replace('# "Wert" = ', '"Wert" = "ph"')
    (tmp_path / "columns.toml").write_text(named, encoding="utf-8")
    assert "24 rows read = 24 used" in run("read", *files, "--columns", "columns.toml").out


def test_audit_writes_the_folder_and_prints_the_gist(run: Run, tmp_path: Path) -> None:
    done = run("audit", *write_record(tmp_path))
    assert done.code == 0
    assert {"reports/readings/report.html", "reports/readings/findings.json"} <= done.files
    assert "24 rows read = 24 used + 0 set aside" in done.out
    assert re.search(r"acetic acid +corrosive", done.out)
    for caution in CAUTIONS:
        assert caution in done.out
    assert done.err == ""


def test_audit_as_json_prints_only_json(run: Run, tmp_path: Path) -> None:
    done = run("audit", *write_record(tmp_path), "--json", "--out", "there")
    found = json.loads(done.out)
    assert found["rows"] == {"read": 24, "used": 24, "set_aside": 0}
    assert found["findings"] == json.loads((tmp_path / "there" / "findings.json").read_text("utf-8"))["findings"]


def test_a_report_is_replaced_only_when_told_to(run: Run, tmp_path: Path) -> None:
    files = write_record(tmp_path)
    assert run("audit", *files, "--out", "there").code == 0
    page = tmp_path / "there" / "report.html"
    kept = page.read_bytes()
    again = run("audit", *files, "--out", "there")
    assert again.code == 2
    assert "--replace" in again.err
    assert page.read_bytes() == kept
    assert run("audit", *files, "--out", "there", "--replace").code == 0


def test_a_folder_that_is_no_report_is_never_replaced(run: Run, tmp_path: Path) -> None:
    files = write_record(tmp_path)
    (tmp_path / "mine").mkdir()
    (tmp_path / "mine" / "notes.txt").write_text("keep", encoding="utf-8")
    assert run("audit", *files, "--out", "mine", "--replace").code == 2
    assert (tmp_path / "mine" / "notes.txt").read_text("utf-8") == "keep"


def test_strict_audit_of_a_meter_that_reads_high_is_exit_3(run: Run, tmp_path: Path) -> None:
    high = dict.fromkeys(range(0, 24, 4), "4.96")  # meter M-1 reads 0.30 high throughout
    files = write_record(tmp_path, bad=high)
    done = run("audit", *files, "--strict", "--json")
    assert done.code == 3
    assert "M-1" in {f["subject"] for f in json.loads(done.out)["findings"]}


def test_strict_audit_of_a_clean_record_is_exit_0(run: Run, tmp_path: Path) -> None:
    assert run("audit", *write_record(tmp_path), "--strict").code == 0


def test_incomplete_outranks_flagged(run: Run, tmp_path: Path) -> None:
    bad = dict.fromkeys(range(0, 24, 4), "4.96") | {1: "?", 2: "?"}
    assert run("audit", *write_record(tmp_path, bad=bad), "--strict").code == 4


def test_interrupting_says_so(run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    def stop(*_args: object, **_named: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr("reconcile.pipeline.predict_parts", stop)
    done = run("predict", "0.1 M HCl")
    assert done.code == 130
    assert "Interrupted" in done.err


def test_a_full_disk_is_exit_1_in_words(run: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def full(*_args: object, **_named: object) -> None:
        raise OSError(28, "No space left on device", "reports")

    monkeypatch.setattr("reconcile.reporter.write.write_report", full)
    done = run("audit", *write_record(tmp_path))
    assert done.code == 1
    assert "No space left on device" in done.err


def test_an_error_of_its_own_shows_no_traceback_unless_asked(
    run: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    from typer.testing import CliRunner

    from reconcile.cli.app import app

    def fault(*_args: object, **_named: object) -> None:
        raise RuntimeError("unforeseen")

    monkeypatch.setattr("reconcile.pipeline.predict_parts", fault)
    done = run("predict", "0.1 M HCl")
    assert done.code == 1
    assert "--debug" in done.err
    with pytest.raises(RuntimeError, match="unforeseen"):
        CliRunner().invoke(app, ["predict", "0.1 M HCl", "--debug"], catch_exceptions=False)
