"""reconcile predict against values known outside the project, and what it says of parts that it cannot read."""

from __future__ import annotations

import json
import math

import pytest
from command_line import Run

from reconcile.reporter.cautions import CAUTIONS, NO_HAZARD_WORD


def prediction(run: Run, *words: str) -> dict:
    done = run("predict", *words, "--json")
    assert done.code == 0, done.err
    return json.loads(done.out)


# Primary standards: Buck et al. 2002, Pure Appl. Chem. 74, 2169, table of pH(PS), doi:10.1351/pac200274112169
PUBLISHED = [
    (("0.025 mol/kg KH2PO4", "0.025 mol/kg Na2HPO4", "--at", "25"), 6.865),
    (("0.025 mol/kg KH2PO4", "0.025 mol/kg Na2HPO4", "--at", "15"), 6.900),
    (("0.05 mol/kg potassium hydrogen phthalate", "--at", "25"), 4.005),
    (("0.01 mol/kg borax", "--at", "25 °C"), 9.180),
]


@pytest.mark.parametrize(("words", "ph"), PUBLISHED)
def test_primary_standards(run: Run, words: tuple[str, ...], ph: float) -> None:
    found = prediction(run, *words)
    assert found["pH"] == pytest.approx(ph, abs=0.02)  # Davies' equation at I = 0.1: about 0.02
    low, high = found["interval95"]
    assert low < ph < high


def test_weak_acid_in_the_ideal_model(run: Run) -> None:
    """x^2 / (C - x) = Ka solved by hand; pKa 4.756 from Harris, Quantitative Chemical Analysis, appendix G."""
    ka, c = 10**-4.756, 0.1
    x = (-ka + math.sqrt(ka * ka + 4 * ka * c)) / 2
    found = prediction(run, "0.1 M acetic acid", "--model", "ideal")
    assert found["pH"] == pytest.approx(-math.log10(x), abs=0.003)  # mol/L against mol/kg: 0.0006
    assert found["degree_of_ionization"]["acetic acid"] == pytest.approx(x / c, rel=0.01)


def test_quantities_are_made_up_to_the_total(run: Run) -> None:
    """50 mL of 0.1 mol/L in 200 mL is 0.025 mol/L; at half neutralisation pH = pKa (common practice, no source)."""
    found = prediction(run, "100 mL of 0.1 M acetic acid", "50 mL of 0.1 M NaOH", "--to", "200 mL", "--model", "ideal")
    assert [part["amount"] for part in found["parts"]] == pytest.approx([0.05, 0.025])
    assert found["pH"] == pytest.approx(4.756, abs=0.005)


def test_a_weighed_hydrate_counts_with_its_water(run: Run) -> None:
    """2.05 g / 136.08 g/mol / 0.1 L; molar mass of the trihydrate by IUPAC atomic weights."""
    found = prediction(run, "2.05 g sodium acetate trihydrate", "--to", "100 mL")
    assert found["parts"][0]["amount"] == pytest.approx(2.05 / 136.08 / 0.1, rel=1e-4)


def test_temperature_of_the_solution_counts(run: Run) -> None:
    """Tris falls by about 0.028 a kelvin: Goldberg et al. 2002, J. Phys. Chem. Ref. Data 31, 231 (from memory)."""
    parts = ("0.05 M Tris", "0.025 M HCl")
    fall = prediction(run, *parts, "--at", "20")["pH"] - prediction(run, *parts, "--at", "30")["pH"]
    assert fall == pytest.approx(0.28, abs=0.02)


def test_json_holds_the_whole_answer_and_nothing_else(run: Run) -> None:
    done = run("predict", "0.1 M acetic acid", "25 mL of 0.1 M sodium hydroxide", "--to", "100 mL", "--json")
    found = json.loads(done.out)
    assert done.err == ""
    assert {"pH", "u", "interval95", "status", "ionic_strength", "buffer_capacity", "degree_of_ionization"} <= set(
        found
    )
    assert sum(found["uncertainty_shares_percent"].values()) == pytest.approx(100.0)
    assert {h["substance"]: h["words"] for h in found["hazards"]}["acetic acid"] == "corrosive"
    assert set(found["cautions"]) <= set(CAUTIONS)


def test_text_shows_what_the_json_holds(run: Run) -> None:
    words = ("predict", "0.1 M acetic acid", "0.05 M sodium acetate", "--at", "25")
    found = json.loads(run(*words, "--json").out)
    text = run(*words).out
    assert f"pH {found['pH']:.3f}" in text
    for word in ("95 % interval", "ionic strength", "buffer capacity", "degree of ionization, acetic acid", "at 25 °C"):
        assert word in text
    assert "acetic acid     corrosive" in text
    assert f"sodium acetate  {NO_HAZARD_WORD}" in text
    assert found["cautions"][0] in text


def test_gas_given_off_with_acid_stands_beside_the_substance(run: Run) -> None:
    assert "gives off" in run("predict", "1 mM sodium sulfite").out


def test_beyond_the_model_the_prediction_comes_with_a_status(run: Run) -> None:
    done = run("predict", "2 M sodium chloride", "0.01 M acetic acid", "--strict", "--json")
    found = json.loads(done.out)
    assert found["status"] == "outside_model"
    assert found["pH"] is not None
    assert done.code == 3


REFUSED = [
    (("0.1 M acetik acid",), 'substance "acetik acid" is not in the library; the nearest names are acetic acid'),
    (("0.1 M EDTA",), "may mean EDTA free acid or"),
    (("acetic acid",), "cannot be read"),
    (("0,1 M acetic acid",), "decimal point"),
    (("0.1 MM acetic acid",), "no known unit"),
    (("5 % acetic acid",), "w/v"),
    (("25 mL of 0.1 M sodium hydroxide",), '--to "100 mL"'),
    (("2.05 g sodium acetate trihydrate",), '--to "100 mL"'),
    (("25 mL acetic acid", "--to", "1 L"), "unsaid strength"),
    (("25 mL of 37 % w/w HCl", "--to", "1 L"), "density"),
    (("150 mL of 1 M HCl", "--to", "100 mL"), "more was taken"),
    (("1 mL of 1 M HCl", "--to", "100"), "the total reads"),
    (("0.1 M HCl", "0.1 mol/kg KCl"), "side by side"),
    (("0.1 M HCl", "--at", "warm"), "the temperature reads"),
    (("0.1 M HCl", "--at", "130"), "from 0 °C to 100 °C"),
    (("0.1 M HCl", "--model", "magic"), "davies, extended, ideal"),
    (("0.1 M HCl", "--settings", "none.toml"), "none.toml"),
]


@pytest.mark.parametrize(("words", "said"), REFUSED)
def test_what_cannot_be_read_is_refused_in_words(run: Run, words: tuple[str, ...], said: str) -> None:
    done = run("predict", *words)
    assert done.code == 1
    assert said in done.err
    assert done.out == ""


def test_every_bad_part_is_named_at_once(run: Run) -> None:
    err = run("predict", "0.1 M acetik acid", "0.1 MM HCl", "0.1 M HCl").err
    assert "acetik" in err
    assert "0.1 MM HCl" in err


def test_no_more_than_twenty_problems_are_spelled_out(run: Run) -> None:
    err = run("predict", *(f"{i} M nonsense{i}" for i in range(1, 26))).err
    assert "nonsense20" in err
    assert "nonsense21" not in err
    assert "and 5 more problems" in err


def test_wrong_usage_is_exit_2(run: Run) -> None:
    assert run("predict").code == 2
    assert run("predict", "0.1 M HCl", "--colour", "red").code == 2
    assert run("forecast", "0.1 M HCl").code == 2


def test_quiet_drops_the_message_but_not_the_result(run: Run) -> None:
    loud, quiet = run("predict", "0.1 M HCl"), run("predict", "0.1 M HCl", "--quiet")
    assert "No --at was given" in loud.err
    assert quiet.err == ""
    assert quiet.out == loud.out
