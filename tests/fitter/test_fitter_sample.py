"""The sample record of an unfamiliar acid: made by its script, the same each time, and its constants come back."""

from __future__ import annotations

from pathlib import Path

import pytest
from openpyxl import load_workbook

import reconcile
from sample_data import make_unfamiliar_acid as script

SAMPLE = Path(script.__file__).parent / "unfamiliar_acid.xlsx"


def test_the_script_makes_the_committed_workbook_and_the_same_bytes_twice(tmp_path: Path) -> None:
    for folder in ("one", "other"):
        (tmp_path / folder).mkdir()
        script.main(tmp_path / folder)
    one, other = (tmp_path / folder / SAMPLE.name for folder in ("one", "other"))
    assert one.read_bytes() == other.read_bytes()
    made, committed = ([list(s.values) for s in load_workbook(path)] for path in (one, SAMPLE))
    assert made == committed


def test_its_constants_come_back_and_the_slip_is_rejected() -> None:
    found = reconcile.fit_pka(SAMPLE, acid=script.ACID, molar_mass=script.GRAMS_PER_MOL)
    assert [step.standing for step in found.steps] == ["found", "found"]
    for step, pka in zip(found.steps, script.PKA, strict=True):
        assert step.pka == pytest.approx(pka, abs=3.0 * (step.u or 0.0))
    assert found.rejected.tolist() == [script.SLIP]
    assert found.none_of_these
    assert found.rows["set_aside"] == 0
    assert found.flags == ("rejected",)
