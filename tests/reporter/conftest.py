"""One invented audit, and its report folder, for all tests of the reporter."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest
from chromium_pipe import Chromium
from invented_audit import build

import reconcile
from reconcile.records.results import Audit
from reconcile.reporter.write import write_report

SAMPLES = Path(__file__).parents[2] / "sample_data"


@pytest.fixture(scope="session")
def invented() -> Audit:
    return build()


@pytest.fixture(scope="session")
def folder(invented: Audit, tmp_path_factory: pytest.TempPathFactory) -> Path:
    return write_report(invented, tmp_path_factory.mktemp("reports") / "room")


@pytest.fixture(scope="session", params=["audit", "meters", "pka"])
def any_page(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The page of each kind of report: of the invented audit, of the meters' sample record, of the unfamiliar acid."""
    place = tmp_path_factory.mktemp("reports")
    if request.param == "meters":
        history = reconcile.meters(SAMPLES / "meter_room.xlsx")
        return reconcile.write_report(history, place / "meters") / "meters.html"
    if request.param == "pka":
        fit = reconcile.fit_pka(SAMPLES / "unfamiliar_acid.xlsx", acid="acid K", molar_mass=146.2)
        return reconcile.write_report(fit, place / "pka") / "report.html"
    whole: Path = request.getfixturevalue("folder")
    return whole / "report.html"


@pytest.fixture(scope="session")
def browser(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Chromium]:
    """One browser for all tests of a run; a test that asks for it is skipped where there is none."""
    one = Chromium(tmp_path_factory.mktemp("profile"))
    yield one
    one.close()
