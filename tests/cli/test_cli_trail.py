"""reconcile predict --trail and the notices of a prediction, as text and as JSON."""

from __future__ import annotations

import json

import pytest
from command_line import Run

PHOSPHATE = ("0.025 mol/kg KH2PO4", "0.025 mol/kg Na2HPO4", "--at", "25")


def test_the_record_holds_what_a_reviewer_looks_for(run: Run) -> None:
    done = run("predict", *PHOSPHATE, "--trail")
    assert done.code == 0
    for wanted in (
        *("Calculation record", "0.025 mol/kg", "IAPWS R11-07(2019)", "phosphoric acid 2", "NIST SRD 46"),
        *("Species at pH 6.8", "Sum of charges", "activity model", "together", "Hand methods, none of them used here"),
        *("ratio of base to acid", "full balance with 25 °C constants", "carbon dioxide"),
    ):
        assert wanted in done.out, wanted
    assert "Calculation record" not in run("predict", *PHOSPHATE).out


def test_the_record_as_json(run: Run) -> None:
    done = run("predict", *PHOSPHATE, "--trail", "--json")
    found = json.loads(done.out)
    laid_open = found["trail"]
    strength = 0.5 * sum(s["charge"] ** 2 * s["mol_per_kg"] for s in laid_open["species"])
    assert strength == pytest.approx(found["ionic_strength"]["value"], rel=1e-6)
    assert abs(laid_open["sum_of_charges_mol_per_kg"]) < 1e-12
    by_name = {h["method"]: h for h in laid_open["hand_methods"]}
    # 7.20 of the ratio against 6.865 of the standard: Buck et al. 2002, doi:10.1351/pac200274112169
    assert by_name["ratio of base to acid"]["difference"] == pytest.approx(7.20 - 6.865, abs=0.02)
    assert by_name["square root of Ka C"]["pH"] is None
    assert "trail" not in json.loads(run("predict", *PHOSPHATE, "--json").out)


def test_without_a_ph_there_is_no_record(run: Run) -> None:
    done = run("predict", "40 M HCl", "30 M NaOH", "200 M citric acid", "--trail")
    assert done.code == 0 or "Calculation record" not in done.out


def test_notices_stand_in_text_and_json(run: Run) -> None:
    words = ("0.05 M borax", "0.3 M mannitol")
    assert "Mannitol with borate" in run("predict", *words).out
    (notice,) = json.loads(run("predict", *words, "--json").out)["notices"]
    assert notice["code"] == "polyol-borate"
    assert "Notices" not in run("predict", *PHOSPHATE).out
