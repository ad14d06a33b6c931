"""A report is there whole, the old one or the new one, however the run that writes it ends."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from small_record import write_record

from reconcile.reporter import exchange as exchange_module
from reconcile.reporter import folder as folder_module
from reconcile.reporter.exchange import exchange
from reconcile.reporter.folder import put_folder
from reconcile.reporter.working_place import settle, working_place

HERE = Path(__file__).parent
FORKS = pytest.mark.skipif(not hasattr(os, "fork"), reason="this system has no fork")
FILES = {"a.csv": b"a\n", "plots/b.svg": b"<svg/>", "manifest.json": b"{}"}
WAYS = ("exchange", "journal")


def without_exchange(one: Path, other: Path) -> bool:
    return False


@pytest.fixture(params=WAYS)
def way(request: pytest.FixtureRequest, monkeypatch: pytest.MonkeyPatch) -> str:
    """Both ways to swap: one system call, or two renames with a journal."""
    if request.param == "journal":
        monkeypatch.setattr(folder_module, "exchange", without_exchange)
    return str(request.param)


def put(report: Path, text: str = "") -> None:
    put_folder(report, {name: content + text.encode() for name, content in FILES.items()}, lambda: None)


def held(report: Path) -> dict[str, bytes]:
    return {p.relative_to(report).as_posix(): p.read_bytes() for p in report.rglob("*") if p.is_file()}


def died(report: Path, way: str, end: str) -> list[dict[str, Any]]:
    done = subprocess.run(
        [sys.executable, str(HERE / "dying_writer.py"), str(report), way, end],
        capture_output=True,
        text=True,
        check=True,
    )
    found: list[dict[str, Any]] = json.loads(done.stdout)
    return found


@FORKS
@pytest.mark.parametrize("way", WAYS)
@pytest.mark.parametrize("end", ["kill", "interrupt", "failure"])
def test_whatever_line_a_run_ends_at(tmp_path: Path, way: str, end: str) -> None:
    """Killed, interrupted or told of a full disk at each line of the writer in turn."""
    outcomes = died(tmp_path / "room", way, end)
    assert len(outcomes) > 100, "the writer has more lines than that"
    assert outcomes[-1]["code"] == 0, "the last one was not disturbed any more"
    disturbed = outcomes[:-1]
    assert {o["code"] for o in disturbed} <= ({-9} if end == "kill" else {1, 2})
    both = {True, False}
    for o in outcomes:
        assert o["settled"] in (o["before"], o["version"]), o
        assert o["left_after"] == [], o
        if way == "exchange" or end != "kill":
            assert o["found"] == o["settled"], o  # the report is never absent, not even before the next run
    assert {o["settled"] == o["version"] for o in disturbed} == both


@FORKS
@pytest.mark.parametrize("way", WAYS)
def test_kills_at_30_random_moments(tmp_path: Path, way: str) -> None:
    outcomes = died(tmp_path / "room", way, "moments")
    assert len(outcomes) == 30
    assert any(o["left"] for o in outcomes), "no kill met a run at work"
    for o in outcomes:
        assert o["code"] == -9
        assert isinstance(o["settled"], int)
        assert o["settled"] == o["before"] or o["settled"] >= o["version"]
        assert o["left_after"] == []
        assert way == "journal" or o["found"] == o["settled"]


@FORKS
def test_kills_of_the_whole_command(tmp_path: Path) -> None:
    files = [str(tmp_path / name) for name in write_record(tmp_path, {"M-2": 0.12})]
    done = subprocess.run(
        [sys.executable, str(HERE / "dying_command.py"), str(tmp_path / "out" / "room"), *files],
        capture_output=True,
        text=True,
        check=True,
    )
    found = json.loads(done.stdout)
    assert all(kill["whole"] for kill in found["kills"])
    assert sum(kill["code"] == -9 for kill in found["kills"]) > len(found["kills"]) // 2
    assert (found["last"], found["whole"], found["beside"]) == (0, True, ["room"])


def test_folders_change_places_in_one_call(tmp_path: Path) -> None:
    """renameat2(2) with RENAME_EXCHANGE, Linux man pages; renamex_np(2) with RENAME_SWAP, macOS man pages."""
    one, other = tmp_path / "one", tmp_path / "other"
    for place in (one, other):
        (place / "deep").mkdir(parents=True)
        (place / "deep" / "name").write_text(place.name)
    if not exchange(one, other):
        assert sys.platform not in ("linux", "darwin"), "the file system of the temporary folder has no exchange"
        pytest.skip("this system has no such call")
    assert ((one / "deep" / "name").read_text(), (other / "deep" / "name").read_text()) == ("other", "one")


def test_an_exchange_that_fails_changes_nothing(tmp_path: Path) -> None:
    (tmp_path / "one").mkdir()
    if exchange_module._system_call() is None:
        pytest.skip("this system has no such call")
    with pytest.raises(FileNotFoundError, match="other"):
        exchange(tmp_path / "one", tmp_path / "other")
    assert [p.name for p in tmp_path.iterdir()] == ["one"]


@pytest.mark.usefixtures("way")
def test_a_swap_leaves_the_new_report_and_nothing_else(tmp_path: Path) -> None:
    put(tmp_path / "room", "old")
    put(tmp_path / "room", "new")
    assert held(tmp_path / "room") == {name: content + b"new" for name, content in FILES.items()}
    assert [p.name for p in tmp_path.iterdir()] == ["room"]


def refusal(report: Path, text: str) -> OSError | None:
    try:
        put(report, text)
    except OSError as error:
        return error
    return None


@pytest.mark.parametrize("call", ["open", "fsync", "mkdir", "rename"])
def test_a_write_error_at_each_call_leaves_the_old_report_alone(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, way: str, call: str
) -> None:
    """The n-th call fails, for each n until none is left to fail: a full disk, as it may come at any of them."""
    report = tmp_path / "parent" / "room"
    put(report, "old")
    real = getattr(os, call)
    failed = 0
    while True:
        seen = 0

        def failing(*args: Any, **words: Any) -> Any:
            nonlocal seen
            seen += 1
            if seen == failed + 1:  # noqa: B023
                raise OSError(28, "No space left on device")
            return real(*args, **words)

        with monkeypatch.context() as patch:
            patch.setattr(os, call, failing)
            error = refusal(report, f"new {failed}")
        if error is None:
            break
        failed += 1
        assert error.filename == str(report)
        assert held(report) == {name: content + b"old" for name, content in FILES.items()}
        assert [p.name for p in report.parent.iterdir()] == ["room"]
    assert failed > 0 or (way, call) == ("exchange", "rename"), "the call was met at least once"
    assert held(report) == {name: content + f"new {failed}".encode() for name, content in FILES.items()}


def test_a_failure_takes_the_parents_it_made_with_it(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def full(handle: int) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    with pytest.raises(OSError, match="No space"):
        put(tmp_path / "deep" / "deeper" / "room")
    assert list(tmp_path.iterdir()) == []


def test_what_a_live_run_writes_is_let_be(tmp_path: Path) -> None:
    with working_place(tmp_path) as place:
        (place / "half").write_bytes(b"x")
        settle(tmp_path)
        assert (place / "half").read_bytes() == b"x"
    assert list(tmp_path.iterdir()) == []


def leavings(parent: Path, journal: str | None = None, inside: Callable[[Path], None] = lambda place: None) -> Path:
    """What a killed run leaves: a lock that nobody holds, and its place."""
    (parent / ".reconcile-0123abcd.lock").touch()
    place = parent / ".reconcile-0123abcd"
    place.mkdir()
    if journal is not None:
        (place / "swap.json").write_text(journal)
    inside(place)
    return place


def both(place: Path) -> None:
    for name in ("new", "old"):
        (place / name).mkdir()
        (place / name / "which").write_text(name)


def test_a_swap_killed_between_its_renames_is_completed(tmp_path: Path) -> None:
    leavings(tmp_path, '{"report": "room"}', both)
    settle(tmp_path)
    assert (tmp_path / "room" / "which").read_text() == "new"
    assert [p.name for p in tmp_path.iterdir()] == ["room"]


def test_an_old_report_goes_back_where_the_new_one_is_gone(tmp_path: Path) -> None:
    def only_old(place: Path) -> None:
        (place / "old").mkdir()
        (place / "old" / "which").write_text("old")

    leavings(tmp_path, '{"report": "room"}', only_old)
    settle(tmp_path)
    assert (tmp_path / "room" / "which").read_text() == "old"


@pytest.mark.parametrize("journal", ["", "{", "[]", '{"report": 3}', '{"report": "../out"}', '{"report": ""}'])
def test_a_journal_that_is_none_moves_nothing(tmp_path: Path, journal: str) -> None:
    (tmp_path / "in").mkdir()
    leavings(tmp_path / "in", journal, both)
    settle(tmp_path / "in")
    assert list((tmp_path / "in").iterdir()) == []
    assert [p.name for p in tmp_path.iterdir()] == ["in"]


@pytest.mark.parametrize(
    "name", [".reconcile-0123abcd", ".reconcile-notes.lock", ".reconcile-0123ABCD.lock", ".x.lock"]
)
def test_what_is_not_ours_is_no_leaving(tmp_path: Path, name: str) -> None:
    (tmp_path / name).mkdir()
    (tmp_path / name / "mine").write_text("mine")
    settle(tmp_path)
    assert (tmp_path / name / "mine").read_text() == "mine"
