"""One invented audit, and its report folder, for all tests of the reporter."""

from __future__ import annotations

from pathlib import Path

import pytest
from invented_audit import build

from reconcile.records.results import Audit
from reconcile.reporter.write import write_report


@pytest.fixture(scope="session")
def invented() -> Audit:
    return build()


@pytest.fixture(scope="session")
def folder(invented: Audit, tmp_path_factory: pytest.TempPathFactory) -> Path:
    return write_report(invented, tmp_path_factory.mktemp("reports") / "room")
