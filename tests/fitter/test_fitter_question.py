"""What may be asked, and what is refused with which words before any fit."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest
from made_records import Made, Truth

import reconcile
from reconcile.fitter.question import understood
from reconcile.records.pka_results import PkaQuestion
from reconcile.records.problems import InputProblems


def refused(**asked: Any) -> tuple[str, str]:
    """Code and message of the one reason."""
    with pytest.raises(InputProblems) as caught:
        understood(PkaQuestion(**asked))
    (problem,) = caught.value.problems
    return problem.code, problem.message()


@pytest.mark.parametrize(
    ("asked", "code", "said"),
    [
        ({"acid": " "}, "pka-option", "the name of a substance"),
        ({"acid": "HCl"}, "pka-no-acid", "brings no acid or base whose ionization could be sought"),
        ({"acid": "K", "steps": 4}, "pka-option", "1, 2 or 3"),
        ({"acid": "K", "charge": 3}, "pka-option", "0, 1 or 2"),
        ({"acid": "K", "protons_removed": -1.0}, "pka-option", "from 0 to 3"),
        ({"acid": "K", "steps": 1, "protons_removed": 2.0}, "pka-option", "at most the 1 of the ionization steps"),
        ({"acid": "K", "molar_mass": 0.0}, "pka-option", "a positive number"),
        ({"acid": "K", "noise": 2.0}, "pka-option", "a standard deviation up to 1 pH"),
        ({"acid": "K", "free": ("titrant",)}, "pka-option", "strength or offset"),
        ({"acid": "K", "charge": 1}, "pka-counter-ion-missing", "a charge of +1"),
        ({"acid": "K", "protons_removed": 1.0, "counter_ion": "chloride:1"}, "pka-counter-ion-charge", "brings -1"),
        ({"acid": "K", "counter_ion": "unobtainium:1"}, "pka-option", "an ion ("),
        ({"acid": "K", "charge": 1, "counter_ion": "chloride:one"}, "pka-option", "name:number"),
        (
            {"acid": "K", "charge": 2, "counter_ion": "acetate:1"},
            "pka-counter-ion-charge",
            "no charge that it can have",
        ),
        ({"acid": "acetic acid", "steps": 2}, "pka-library-option", "--steps would say otherwise"),
        ({"acid": "acetic acid", "counter_ion": "sodium:1"}, "pka-library-option", "--counter-ion"),
    ],
)
def test_a_question_that_contradicts_itself_is_refused(asked: dict[str, Any], code: str, said: str) -> None:
    found, message = refused(**asked)
    assert found == code
    assert said in message


@pytest.mark.parametrize(
    ("asked", "acid", "acids"),
    [
        ({"acid": "KHP"}, "phthalic acid", None),
        ({"acid": "borax"}, "boric acid", None),
        ({"acid": "ammonium chloride"}, "ammonia", None),
        ({"acid": "EDTA"}, "EDTA", None),
        ({"acid": "K", "charge": 1, "counter_ion": "chloride:1"}, "K", {"K": 1.0}),
        ({"acid": "K", "charge": 1, "counter_ion": "Cl-:1"}, "K", {"K": 1.0}),
        ({"acid": "K", "charge": 1, "counter_ion": "maleate:1"}, "K", {"K": 1.0, "maleic acid": 1.0}),
        ({"acid": "K", "protons_removed": 1.0, "counter_ion": "ammonium:1"}, "K", {"K": 1.0, "ammonia": 1.0}),
    ],
)
def test_names_salts_and_counter_ions(asked: dict[str, Any], acid: str, acids: dict[str, float] | None) -> None:
    found = understood(PkaQuestion(**asked))
    assert found.acid == acid
    assert (found.form is None) == (acids is None)
    if found.form is not None:
        assert dict(found.form.acids) == acids


def test_an_acid_that_no_solution_holds_is_refused_with_near_names(tmp_path: Path) -> None:
    book = Made().titration(Truth(), "acetic acid").write(tmp_path)
    with pytest.raises(InputProblems) as caught:
        reconcile.fit_pka(book, acid="acetic acd")
    assert "no reading is of a solution that holds" in str(caught.value)
    assert "(near it in the library: acetic acid" in str(caught.value)


def test_amounts_by_mass_need_a_molar_mass(tmp_path: Path) -> None:
    made = Made()
    ph = Truth().ph([0.05] * 6, [0.005, 0.01, 0.02, 0.03, 0.04, 0.045])
    for i, shown in enumerate(Truth().read(ph, made.rng)):
        made.reading(batch=f"B{i}", celsius=25.0, ph=shown)
        made.recipes.append((f"B{i}", "acid K", "A-1", 0.05 * 150.0 * 0.1, "g", 100.0, "mL"))  # of 150 g/mol
        base = [0.005, 0.01, 0.02, 0.03, 0.04, 0.045][i]
        made.recipes.append((f"B{i}", "sodium hydroxide", None, base, "mol/L", None, None))
    book = made.write(tmp_path)
    with pytest.raises(InputProblems) as caught:
        reconcile.fit_pka(book, acid="acid K", steps=1)
    assert "amounts of" in str(caught.value)
    assert "--molar-mass" in str(caught.value)
    found = reconcile.fit_pka(book, acid="acid K", steps=1, molar_mass=150.0)
    assert found.steps[0].pka == pytest.approx(Truth().pka[0], abs=0.03)


def test_more_unknowns_than_readings_are_refused(tmp_path: Path) -> None:
    book = Made().solutions(Truth(), "acid K", [(0.05, 0.025)]).write(tmp_path)
    with pytest.raises(InputProblems) as caught:
        reconcile.fit_pka(book, acid="acid K", steps=2)
    assert "usable readings number 1, for 2 unknowns" in str(caught.value)


def test_readings_none_of_which_can_be_used_are_refused_with_the_reason(tmp_path: Path) -> None:
    rows = [(0.01, 0.06), (0.01, 0.07), (0.01, 0.08)]  # pH near 12.7
    with pytest.raises(InputProblems) as caught:
        reconcile.fit_pka(Made().solutions(Truth(), "acid K", rows).write(tmp_path), acid="acid K")
    assert "none can be used: 3 outside the range of the glass electrode" in str(caught.value)


def test_carbonic_acid_of_solutions_open_to_air_has_no_known_total(tmp_path: Path) -> None:
    book = Made().solutions(Truth("carbonic acid"), "sodium bicarbonate", [(0.05, 0.0)]).write(tmp_path)
    with pytest.raises(InputProblems) as caught:
        reconcile.fit_pka(book, acid="carbonic acid", settings={"prediction": {"open_to_air": True}})
    assert "follows from the air and not from the recipes" in str(caught.value)
