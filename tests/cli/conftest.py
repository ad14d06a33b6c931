"""Runs commands inside the test's own folder."""

from __future__ import annotations

from pathlib import Path

import pytest
from command_line import Outcome, Run
from typer.testing import CliRunner

from reconcile.cli.app import app


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
