"""A report is recomputed from its inputs: what was changed in it, or in them, is named, and nothing else is."""

from __future__ import annotations

import hashlib
import json
import os
import shutil
import subprocess
import sys
import zipfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from small_record import READINGS, RECIPES, write_record
from typer.testing import CliRunner

import reconcile
from reconcile.cli.app import app
from reconcile.records.problems import InputProblems
from reconcile.replay import Recheck, recheck

ROOT = Path(__file__).parents[2]
HOLDS = "Everything holds: the inputs are the same, and every file and figure is what was recomputed."


@pytest.fixture(scope="module")
def made(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with a record and its report `room`; not to be changed."""
    folder = tmp_path_factory.mktemp("record")
    files = [folder / name for name in write_record(folder, {"M-2": 0.12})]
    reconcile.write_report(reconcile.audit(*files), folder / "room")
    return folder


@pytest.fixture
def record(made: Path, tmp_path: Path) -> Path:
    """A copy of it, whose report names the files of the original."""
    shutil.copytree(made, tmp_path / "copy")
    return tmp_path / "copy"


def found_in(checked: Recheck) -> dict[str, list[str]]:
    """File -> the places in which it differs, of those that differ."""
    return {x.name: [d.where for d in x.differences] for x in checked.files if x.standing != "the same"}


def mend_hashes(report: Path) -> None:
    """Give the manifest the hashes of the files as they are now, as somebody would who covers his tracks."""
    path = report / "manifest.json"
    document = json.loads(path.read_text(encoding="utf-8"))
    for output in document["outputs"]:
        output["sha256"] = hashlib.sha256((report / output["name"]).read_bytes()).hexdigest()
    path.write_text(json.dumps(document, ensure_ascii=False, indent=2) + "\n", encoding="utf-8")


def edit_text(name: str, old: str, new: str) -> Callable[[Path], None]:
    def edit(report: Path) -> None:
        text = (report / name).read_bytes().decode("utf-8")
        assert old in text
        (report / name).write_bytes(text.replace(old, new, 1).encode("utf-8"))

    return edit


def edit_csv(report: Path) -> None:
    lines = (report / "residuals.csv").read_text(encoding="utf-8").split("\n")
    cells = lines[16].split(",")
    cells[lines[0].split(",").index("pH_observed")] = "4.99"
    lines[16] = ",".join(cells)
    (report / "residuals.csv").write_bytes("\n".join(lines).encode("utf-8"))


def edit_workbook(report: Path) -> None:
    """One number of the sheet Residuals, in its XML, so that nothing else of the file changes."""
    path = report / "residuals.xlsx"
    with zipfile.ZipFile(path) as archive:
        parts = {info: archive.read(info) for info in archive.infolist()}
    with zipfile.ZipFile(path, "w") as archive:
        for info, content in parts.items():
            if info.filename == "xl/worksheets/sheet2.xml":
                before, cell, after = content.partition(b'<c r="J17"')
                assert cell, "the observed pH of row 17"
                value, end, rest = after.partition(b"</v>")
                content = before + cell + value.rpartition(b"<v>")[0] + b"<v>4.99" + end + rest
            archive.writestr(info, content)


def edit_png(report: Path) -> None:
    path = report / "plots" / "meter_lot.png"
    path.write_bytes(path.read_bytes() + b"\x00")


EDITS: dict[str, tuple[Callable[[Path], None], str]] = {
    "residuals.csv": (edit_csv, "line 17, pH_observed"),
    "residuals.xlsx": (edit_workbook, "Residuals!J17"),
    "findings.json": (edit_text("findings.json", '"used": 48', '"used": 47'), "rows/used"),
    "report.html": (edit_text("report.html", "48 rows read = ", "49 rows read = "), "under Gist"),
    "set_aside.csv": (edit_text("set_aside.csv", "source,", "sources,"), "line 1, source"),
    "plots/meter_lot.svg": (edit_text("plots/meter_lot.svg", "<!-- M-2 -->", "<!-- M-9 -->"), "line "),
    "plots/meter_lot.png": (edit_png, ""),
}
"""File -> how it is edited, and what the place is called."""


def test_a_report_holds(made: Path) -> None:
    checked = recheck(made / "room")
    assert checked.holds
    assert (found_in(checked), checked.notes, checked.why_not) == ({}, (), "")
    assert [x.name for x in checked.inputs] == [READINGS, RECIPES]
    assert {x.name for x in checked.files} == {
        p.relative_to(made / "room").as_posix() for p in (made / "room").rglob("*") if p.is_file()
    }


@pytest.mark.parametrize("hashes", ["as written", "edited too"])
def test_one_edited_place_of_each_file_is_found(record: Path, hashes: str) -> None:
    report = record / "room"
    for edit, _ in EDITS.values():
        edit(report)
    if hashes == "edited too":
        mend_hashes(report)
    checked = recheck(report)
    assert not checked.holds
    found = found_in(checked)
    listed = found.pop("manifest.json", [])
    assert set(found) == set(EDITS)
    for name, (_, where) in EDITS.items():
        assert len(found[name]) == 1, (name, found[name])
        assert where in found[name][0]
    edited = {f"outputs/{name}/sha256" for name in EDITS}
    assert set(listed) == (edited if hashes == "edited too" else set())
    assert {x.name for x in checked.files if not x.as_written} == (
        {"manifest.json"} if hashes == "edited too" else set(EDITS)
    )


def test_what_an_edited_cell_reads_and_should_read(record: Path) -> None:
    edit_csv(record / "room")
    edit_workbook(record / "room")
    pairs = {x.name: (d.reads, d.recomputed) for x in recheck(record / "room").files for d in x.differences}
    # batch B-15 is read on M-4: 4.66 and the noise of that place in the row of errors
    assert pairs == {"residuals.csv": ("4.99", "4.67"), "residuals.xlsx": ("4.99", "4.67")}


@pytest.mark.parametrize(
    ("old", "new", "where"),
    [
        ('"read": 48', '"read": 50', "rows/read"),
        ('"prediction.pk_equations": true', '"prediction.pk_equations": false', "settings_changed/1"),
        ('"schema": 1', '"schema": 1, "signed_by": "nobody"', "signed_by"),
    ],
)
def test_an_edited_manifest_is_found(record: Path, old: str, new: str, where: str) -> None:
    edit_text("manifest.json", old, new)(record / "room")
    assert where in found_in(recheck(record / "room"))["manifest.json"]


def test_a_changed_input_is_named_with_what_comes_of_it(made: Path, tmp_path: Path) -> None:
    files = [tmp_path / name for name in write_record(tmp_path, {"M-2": 0.12})]
    reconcile.write_report(reconcile.audit(*files), tmp_path / "room")
    text = files[0].read_text(encoding="utf-8")
    files[0].write_text(text.replace(",4.67,", ",4.66,", 1), encoding="utf-8")
    checked = recheck(tmp_path / "room")
    assert not checked.holds
    assert [(x.name, x.standing) for x in checked.inputs] == [(READINGS, "changed"), (RECIPES, "the same")]
    assert checked.inputs[0].now == hashlib.sha256(files[0].read_bytes()).hexdigest()
    line = next(i for i, row in enumerate(text.split("\n"), 1) if ",4.67," in row)
    assert f"line {line}, pH_observed" in found_in(checked)["residuals.csv"]
    assert all(x.as_written for x in checked.files), "nobody changed the report"


def test_a_vanished_input_leaves_the_hashes_to_go_by(made: Path, tmp_path: Path) -> None:
    shutil.copytree(made / "room", tmp_path / "in" / "room")
    path = tmp_path / "in" / "room" / "manifest.json"
    document = json.loads(path.read_text("utf-8"))
    for entry in document["inputs"]:
        entry["path"] = entry["path"].replace(entry["name"], f"gone/{entry['name']}")
    path.write_text(json.dumps(document), encoding="utf-8")
    edit_csv(path.parent)
    checked = recheck(path.parent)
    assert not checked.holds
    assert {x.standing for x in checked.inputs} == {"missing"}
    assert checked.why_not.startswith(f"{READINGS} and {RECIPES} cannot be found")
    assert {x.name for x in checked.files if x.standing == "changed"} == {"residuals.csv"}
    assert set(found_in(recheck(path.parent, made))) == {"residuals.csv", "manifest.json"}
    assert recheck(path.parent, made / READINGS, made / RECIPES).why_not == ""


def test_inputs_are_known_by_their_content(made: Path, tmp_path: Path) -> None:
    """Beside the report lies another file of the name; the right one is found where the user says."""
    shutil.copytree(made / "room", tmp_path / "room")
    path = tmp_path / "room" / "manifest.json"
    path.write_text(path.read_text("utf-8").replace(made.as_posix() + "/", ""), encoding="utf-8")
    write_record(tmp_path, {"M-3": 0.2})
    assert [x.standing for x in recheck(tmp_path / "room").inputs] == ["changed", "the same"]
    assert [x.standing for x in recheck(tmp_path / "room", made).inputs] == ["the same", "the same"]


def test_missing_and_foreign_files(record: Path) -> None:
    report = record / "room"
    (report / "set_aside.csv").unlink()
    (report / "signed.pdf").write_bytes(b"mine")
    (report / "Thumbs.db").write_bytes(b"litter")
    checked = recheck(report)
    assert [(x.name, x.standing) for x in checked.files if x.standing != "the same"] == [("set_aside.csv", "missing")]
    assert checked.notes == ("signed.pdf is no part of this report",)


def test_other_versions_are_notes(record: Path) -> None:
    edit_text("manifest.json", '"numpy": "', '"numpy": "0.')(record / "room")
    checked = recheck(record / "room")
    assert checked.holds
    (note,) = checked.notes
    assert note.startswith("made with numpy 0.")


def test_the_command(record: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("COLUMNS", "400")
    done = CliRunner().invoke(app, ["recheck", str(record / "room")])
    assert (done.exit_code, done.stderr) == (0, "")
    assert done.stdout.splitlines()[-1] == HOLDS
    edit_csv(record / "room")
    done = CliRunner().invoke(app, ["recheck", str(record / "room")])
    assert done.exit_code == 5
    lines = [" ".join(line.split()) for line in done.stdout.splitlines()]
    assert 'line 17, pH_observed "4.99" "4.67"' in lines
    assert lines[-1] == "No longer holds: residuals.csv."
    done = CliRunner().invoke(app, ["recheck", str(record / "room"), "--json"])
    document = json.loads(done.stdout)
    assert (done.exit_code, document["holds"], document["recomputed"]) == (5, False, True)
    (wrong,) = (x for x in document["files"] if x["standing"] != "the same")
    assert wrong["differences"] == [{"where": "line 17, pH_observed", "reads": "4.99", "recomputed": "4.67"}]


MANIFESTS: dict[str, Any] = {
    "no JSON": "{",
    "a list": "[]",
    "empty": "{}",
    "no bytes": "",
    "inputs of no files": {"inputs": 3},
    "outputs without names": {"outputs": [{}]},
    "settings in a list": {"settings": []},
}


@pytest.mark.parametrize("change", MANIFESTS.values(), ids=list(MANIFESTS))
def test_a_manifest_that_is_none_is_refused_in_one_line(record: Path, change: Any) -> None:
    path = record / "room" / "manifest.json"
    whole = json.loads(path.read_text("utf-8"))
    path.write_text(change if isinstance(change, str) else json.dumps(whole | change), encoding="utf-8")
    done = CliRunner().invoke(app, ["recheck", str(record / "room")])
    assert (done.exit_code, done.stdout) == (1, "")
    assert len(done.stderr.splitlines()) == 1
    assert "manifest of this report cannot be read" in done.stderr


CHANGES: dict[str, tuple[dict[str, Any], str]] = {
    "no such command": ({"command": "erase --all"}, "erase --all makes no report"),
    "a setting out of range": ({"settings": {"audit.alarm_rate": "much"}}, "audit.alarm_rate"),
    "no map": ({"column_map": {"readings": 3}}, "no map of columns"),
    "no question": ({"command": "pka --acid x"}, "makes no report"),
    "an odd question": ({"command": "pka", "question": {"acid": "acetic acid", "shape": "round"}}, "question"),
    "an unknown acid": ({"command": "pka", "question": {"acid": "acid of nothing"}}, "acid of nothing"),
}


@pytest.mark.parametrize(("change", "said"), CHANGES.values(), ids=list(CHANGES))
def test_a_manifest_that_no_run_wrote_is_a_difference(record: Path, change: dict[str, Any], said: str) -> None:
    path = record / "room" / "manifest.json"
    path.write_text(json.dumps(json.loads(path.read_text("utf-8")) | change), encoding="utf-8")
    checked = recheck(record / "room")
    assert not checked.holds
    assert said in checked.why_not


def test_there_must_be_a_report(tmp_path: Path) -> None:
    for place in (tmp_path, tmp_path / "absent"):
        with pytest.raises(InputProblems, match="there is no report here"):
            recheck(place)


def test_a_report_with_a_column_map_and_settings(tmp_path: Path) -> None:
    files = [tmp_path / name for name in write_record(tmp_path)]
    files[0].write_text(files[0].read_text("utf-8").replace(",pH,", ",Wert,"), encoding="utf-8")
    (tmp_path / "map.toml").write_text('[readings]\nWert = "ph"\n', encoding="utf-8")
    found = reconcile.audit(*files, columns=tmp_path / "map.toml", settings={"audit": {"alarm_rate": 0.01}})
    reconcile.write_report(found, tmp_path / "room")
    assert recheck(tmp_path / "room").holds
    edit_text("manifest.json", '"Wert": "ph"', '"Wert": "ph_calculated"')(tmp_path / "room")
    assert not recheck(tmp_path / "room").holds


@pytest.mark.parametrize(
    "words",
    [
        ["meters", "sample_data/meter_room.xlsx"],
        ["pka", "sample_data/unfamiliar_acid.xlsx", "--acid", "acid K", "--molar-mass", "146.2", "--free", "strength"],
    ],
    ids=["meters", "pka"],
)
def test_other_reports(words: list[str], tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(ROOT)
    assert CliRunner().invoke(app, [*words, "--out", str(tmp_path / "room")]).exit_code == 0
    assert recheck(tmp_path / "room").holds
    table = next((tmp_path / "room").glob("[ms]*.csv"))
    text = table.read_text("utf-8")
    table.write_text(text.replace("\n", "0\n", 2).replace("0\n", "\n", 1), encoding="utf-8")
    assert set(found_in(recheck(tmp_path / "room"))) == {table.name}


def test_two_runs_give_the_same_bytes(tmp_path: Path) -> None:
    """Two processes with other seeds of hashing, time zones, locales, working folders and places of the report."""
    write_record(tmp_path, {"M-2": 0.12}, remark="seen")
    (tmp_path / "deep" / "deeper").mkdir(parents=True)
    held = []
    for seed, zone, locale, out in (("1", "UTC", "C", "one"), ("77", "Asia/Tokyo", "de_DE.UTF-8", "deep/deeper/two")):
        environment = os.environ | {"PYTHONHASHSEED": seed, "TZ": zone, "LC_ALL": locale}
        subprocess.run(
            [sys.executable, "-m", "reconcile", "audit", READINGS, RECIPES, "--out", out],
            cwd=tmp_path,
            env=environment,
            check=True,
            capture_output=True,
        )
        folder = tmp_path / out
        held.append({p.relative_to(folder).as_posix(): p.read_bytes() for p in folder.rglob("*") if p.is_file()})
    one, two = held
    manifests = [json.loads(files.pop("manifest.json")) for files in held]
    assert list(one) == list(two) or set(one) == set(two)
    assert [name for name in one if one[name] != two[name]] == []
    assert manifests[0] | {"written_at": ""} == manifests[1] | {"written_at": ""}
