"""reconcile newbook: a file is made once, and replaced only when told to."""

from __future__ import annotations

import json
from pathlib import Path

from command_line import Run


def test_a_workbook_is_made_and_read_at_once(run: Run) -> None:
    done = run("newbook", "log.xlsx")
    assert (done.code, done.out, done.files) == (0, "log.xlsx\n", {"log.xlsx"})
    assert "Known solutions" in done.err
    read = run("read", "log.xlsx", "--strict")
    assert read.code == 0
    assert "0 rows read = 0 used + 0 set aside" in read.out
    assert "Not read, as these sheets say themselves: Notes, Example, Lists" in read.out


def test_a_file_that_is_there_is_kept_unless_told(run: Run, tmp_path: Path) -> None:
    (tmp_path / "log.xlsx").write_text("mine")
    done = run("newbook", "log.xlsx")
    assert (done.code, done.out) == (2, "")
    assert "--replace" in done.err
    assert (tmp_path / "log.xlsx").read_text() == "mine"
    done = run("newbook", "log.xlsx", "--replace", "--quiet")
    assert (done.code, done.err) == (0, "")
    assert (tmp_path / "log.xlsx").read_bytes()[:2] == b"PK"


def test_another_ending_and_a_missing_folder_are_refused(run: Run) -> None:
    assert run("newbook", "log.csv").code == 2
    done = run("newbook", "nowhere/log.xlsx")
    assert done.code == 1
    assert "nowhere/log.xlsx: " in done.err
    assert done.files == frozenset()


def test_the_filled_example_can_be_audited(run: Run) -> None:
    made = json.loads(run("newbook", "example.xlsx", "--filled", "--json").out)
    assert (made["written"], made["filled"], made["sheets"][0]) == ("example.xlsx", True, "Readings")
    done = run("audit", "example.xlsx", "--strict")
    assert done.code == 0
    assert "10 rows read = 10 used + 0 set aside" in done.out
