"""One invented audit, and its report folder, for all tests of the reporter."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest
from chromium_pipe import Chromium
from invented_audit import build

from reconcile.records.results import Audit
from reconcile.reporter.write import write_report


@pytest.fixture(scope="session")
def invented() -> Audit:
    return build()


@pytest.fixture(scope="session")
def folder(invented: Audit, tmp_path_factory: pytest.TempPathFactory) -> Path:
    return write_report(invented, tmp_path_factory.mktemp("reports") / "room")


@pytest.fixture(scope="session")
def browser(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Chromium]:
    """One browser for all tests of a run; a test that asks for it is skipped where there is none."""
    one = Chromium(tmp_path_factory.mktemp("profile"))
    yield one
    one.close()
