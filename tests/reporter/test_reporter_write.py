"""The folder: whole or not at all, never over anything else, the same bytes each time; and its manifest."""

from __future__ import annotations

import hashlib
import json
from datetime import UTC, datetime
from pathlib import Path

import pytest
from invented_audit import build

from reconcile.records.results import Audit
from reconcile.records.settings import Settings
from reconcile.reporter import folder as folder_writer
from reconcile.reporter import write
from reconcile.reporter.manifest import constants, report_id
from reconcile.reporter.write import ReportExists, write_report


@pytest.fixture
def quick(monkeypatch: pytest.MonkeyPatch) -> None:
    """Contents without pictures, for tests of the writing itself."""
    monkeypatch.setattr(write, "contents", lambda audit, progress: {"a.csv": b"a\n", "plots/b.svg": b"<svg/>"})


def names(folder: Path) -> set[str]:
    return {p.relative_to(folder).as_posix() for p in folder.rglob("*") if p.is_file()}


def test_files_of_a_report(folder: Path) -> None:
    plots = {
        f"plots/{stem}.{kind}"
        for stem in ("predicted_observed", "residuals_time", "residuals_lots", "meter_lot", "smallest_detectable",
                     "finding_F1", "finding_F2")
        for kind in ("png", "svg")
    }  # fmt: skip
    assert names(folder) == {
        "residuals.csv", "set_aside.csv", "findings.json", "residuals.xlsx", "report.html", "manifest.json", *plots,
    }  # fmt: skip


def test_manifest_holds_the_hash_of_every_file(folder: Path) -> None:
    document = json.loads((folder / "manifest.json").read_text(encoding="utf-8"))
    listed = {o["name"]: o["sha256"] for o in document["outputs"]}
    assert set(listed) == names(folder) - {"manifest.json"}
    for name, digest in listed.items():
        assert hashlib.sha256((folder / name).read_bytes()).hexdigest() == digest
    assert document["inputs"] == [
        {"name": "log.xlsx", "sha256": "a" * 64},
        {"name": "stocks.csv", "sha256": "b" * 64},
    ]
    assert "unsigned" in document["notice"]
    assert "neither an audit trail nor an electronic signature" in document["notice"]
    assert datetime.strptime(document["written_at"], "%Y-%m-%dT%H:%M:%SZ").replace(tzinfo=UTC) <= datetime.now(UTC)
    assert document["settings"]["prediction.activity_model"] == "bates-guggenheim"
    assert set(document["constants"]) >= {"chemistry/acids.csv", "records/forms.csv", "records/ions.csv"}


def test_hashes_of_the_constants_are_those_of_the_tables() -> None:
    import reconcile

    root = Path(reconcile.__file__).parent
    for name, digest in constants().items():
        assert hashlib.sha256((root / name).read_bytes()).hexdigest() == digest


def test_only_the_time_of_writing_differs(invented: Audit, folder: Path, tmp_path: Path) -> None:
    again = write_report(build(), tmp_path / "again")
    for name in sorted(names(folder) - {"manifest.json"}):
        assert (again / name).read_bytes() == (folder / name).read_bytes(), name
    one, two = (json.loads((f / "manifest.json").read_text("utf-8")) for f in (folder, again))
    assert one | {"written_at": ""} == two | {"written_at": ""}


def test_report_id_follows_inputs_and_settings(invented: Audit) -> None:
    other = build(settings=Settings({"audit.alarm_rate": 0.01}))
    assert report_id(invented) == report_id(build())
    assert report_id(other) != report_id(invented)


@pytest.mark.usefixtures("quick")
def test_an_existing_report_is_kept_unless_told(invented: Audit, tmp_path: Path) -> None:
    out = write_report(invented, tmp_path / "r")
    before = (out / "manifest.json").read_bytes()
    with pytest.raises(ReportExists, match="--replace"):
        write_report(invented, out)
    assert (out / "manifest.json").read_bytes() == before
    (out / "a.csv").write_bytes(b"changed")
    write_report(invented, out, replace=True)
    assert (out / "a.csv").read_bytes() == b"a\n"
    assert [p.name for p in tmp_path.iterdir()] == ["r"]


@pytest.mark.usefixtures("quick")
@pytest.mark.parametrize("replace", [True, False])
def test_what_is_no_report_is_never_touched(invented: Audit, tmp_path: Path, replace: bool) -> None:
    (tmp_path / "notes").mkdir()
    (tmp_path / "notes" / "keep.txt").write_text("mine")
    (tmp_path / "web").mkdir()
    (tmp_path / "web" / "manifest.json").write_text('{"name": "another thing"}')
    (tmp_path / "file").write_text("mine")
    before = {p: p.read_bytes() for p in tmp_path.rglob("*") if p.is_file()}
    for name in ("notes", "web", "file"):
        with pytest.raises(ReportExists):
            write_report(invented, tmp_path / name, replace=replace)
    assert {p: p.read_bytes() for p in tmp_path.rglob("*") if p.is_file()} == before


@pytest.mark.usefixtures("quick")
def test_a_report_with_someones_own_file_in_it_is_not_replaced(invented: Audit, tmp_path: Path) -> None:
    out = write_report(invented, tmp_path / "r")
    (out / "signed.pdf").write_text("mine")
    with pytest.raises(ReportExists, match=r"signed\.pdf"):
        write_report(invented, out, replace=True)
    assert (out / "signed.pdf").read_text() == "mine"


@pytest.mark.usefixtures("quick")
def test_an_empty_folder_is_filled(invented: Audit, tmp_path: Path) -> None:
    (tmp_path / "r").mkdir()
    assert "a.csv" in names(write_report(invented, tmp_path / "r"))


@pytest.mark.usefixtures("quick")
@pytest.mark.parametrize("stage", ["write_file", "sync_folder"])
def test_a_failure_leaves_nothing_behind(
    invented: Audit, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, stage: str
) -> None:
    def full(*_: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(folder_writer, stage, full)
    with pytest.raises(OSError, match="No space"):
        write_report(invented, tmp_path / "deep" / "deeper" / "r")
    assert list(tmp_path.iterdir()) == []


def test_progress_tells_what_is_done_and_never_runs_back(invented: Audit, tmp_path: Path) -> None:
    told: list[tuple[str, float]] = []
    write_report(invented, tmp_path / "r", progress=lambda what, share: told.append((what, share)))
    shares = [share for _, share in told]
    assert shares == sorted(shares)
    assert 0 <= shares[0] <= shares[-1] <= 1
    assert "writing the workbook" in [what for what, _ in told]
