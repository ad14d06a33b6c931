"""reconcile substances: what the library says of a word."""

from __future__ import annotations

import json

import pytest
from command_line import Run

from reconcile.reporter.cautions import NO_HAZARD_WORD


def found(run: Run, *words: str) -> dict:
    done = run("substances", *words, "--json")
    assert done.err == ""
    return json.loads(done.out)


@pytest.mark.parametrize(
    ("word", "name", "molar_mass"),
    [  # molar masses: sums of IUPAC 2021 abridged standard atomic weights
        ("HCl", "hydrochloric acid", 36.458),
        ("Na2HPO4", "disodium hydrogen phosphate", 141.957),
        ("Tris", "Tris", 121.136),
        ("glacial acetic acid", "acetic acid", 60.052),
        ("Citric acid monohydrate", "citric acid monohydrate", 210.138),
    ],
)
def test_names_synonyms_and_formulas(run: Run, word: str, name: str, molar_mass: float) -> None:
    first = found(run, word)["substances"][0]
    assert first["name"].casefold().startswith(name.casefold())
    assert first["molar_mass_g_mol"] == pytest.approx(molar_mass, abs=0.005)


def test_constants_come_with_uncertainty_and_source(run: Run) -> None:
    """pKa 2.148, 7.198, 12.35 of phosphoric acid: NIST SRD 46 version 8 and Goldberg et al. 2002."""
    constants = found(run, "phosphoric acid")["substances"][0]["constants"]
    assert [c["pKa"] for c in constants] == pytest.approx([2.148, 7.198, 12.35], abs=0.02)
    assert all(c["u"] > 0 and c["source"] for c in constants)


def test_weak_values_are_marked(run: Run) -> None:
    """The first step of EDTA is among the weakest of the table (its own uncertainty there)."""
    assert any(c["weak"] for c in found(run, "EDTA free acid")["substances"][0]["constants"])
    assert "weak = " in run("substances", "EDTA free acid").out


def test_an_ambiguous_word_lists_its_readings(run: Run) -> None:
    done = run("substances", "EDTA")
    assert done.code == 0
    assert "EDTA may mean:" in done.out
    assert "EDTA disodium salt dihydrate" in done.out
    assert found(run, "EDTA")["ambiguous"] is True


def test_a_near_miss_suggests_the_right_name(run: Run) -> None:
    done = run("substances", "acetik acid")
    assert done.code == 1
    assert done.out == ""
    assert "acetic acid" in done.err


def test_part_of_a_name_finds_all_that_hold_it(run: Run) -> None:
    names = {s["name"] for s in found(run, "phthalate")["substances"]}
    assert "potassium hydrogen phthalate" in names


def test_hazards_stand_beside_every_substance(run: Run) -> None:
    everything = found(run)["substances"]
    assert len(everything) > 300
    assert all(s["hazard"] for s in everything)
    assert any(s["hazard"] == NO_HAZARD_WORD for s in everything)
    azide = next(s for s in everything if s["name"] == "sodium azide")
    assert "gives off" in azide["hazard"]


def test_the_whole_library_as_text(run: Run) -> None:
    out = run("substances").out
    assert "acetic acid" in out
    assert NO_HAZARD_WORD in out
