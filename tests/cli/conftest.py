"""Runs commands inside the test's own folder, and makes small records for them."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest
from typer.testing import CliRunner

from reconcile.cli.app import app

Run = Callable[..., "Outcome"]


@dataclass(frozen=True)
class Outcome:
    """What a command left: exit code, standard output, standard error, and the files in the folder."""

    code: int
    out: str
    err: str
    files: frozenset[str]


@pytest.fixture
def run(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Run:
    """Runs one command line in an empty folder of its own."""
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("COLUMNS", "400")

    def _run(*words: str) -> Outcome:
        result = CliRunner().invoke(app, list(words))
        assert "Traceback" not in result.stdout + result.stderr
        files = frozenset(str(p.relative_to(tmp_path)) for p in tmp_path.rglob("*"))
        return Outcome(result.exit_code, result.stdout, result.stderr, files)

    return _run
