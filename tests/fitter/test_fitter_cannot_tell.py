"""What the readings cannot tell, each situation with its words; readings by the simulator's own chemistry."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest
from made_records import Made, Truth

import reconcile
from reconcile.records.pka_results import PkaFit
from reconcile.reporter.pka_json import pka_document

NAME = "acid K"
DILUTIONS = [(c, 0.0) for c in (0.1, 0.05, 0.02, 0.01, 0.005, 0.002)]
HALF_WAY = [(0.05, 0.05 * share) for share in (0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9)]


def fit(folder: Path, made: Made, acid: str = NAME, **about: Any) -> PkaFit:
    found = reconcile.fit_pka(made.write(folder), acid=acid, **about)
    json.dumps(pka_document(found), allow_nan=False)
    return found


def test_plain_dilution_fixes_only_ka_times_c(tmp_path: Path) -> None:
    # the exact relation: [H+]^2 = Ka C for a weak acid little ionized, so that pKa moves by half a unit of lg C; in
    # steps of 1 %, lg 1.01 = 0.0043
    found = fit(tmp_path, Made().solutions(Truth(), NAME, DILUTIONS), steps=1)
    assert "These readings fix only Ka times C" in found.conclusion
    assert "1 % of error in it moves pKa by 0.004" in found.conclusion
    assert found.steps[0].pka == pytest.approx(Truth().pka[0], abs=3 * (found.steps[0].u or 0))
    assert not found.strength.identifiable
    assert "ka_times_c" in found.flags


def test_plain_dilution_with_the_strength_free_gives_the_relation_and_no_number(tmp_path: Path) -> None:
    found = fit(tmp_path, Made().solutions(Truth(factor=1.3), NAME, DILUTIONS), steps=1, free=("strength",))
    document = pka_document(found)
    assert document["steps"][0]["pKa_thermodynamic"] is None
    assert document["steps"][0]["interval95"] is None
    assert document["strength_factor"] is None
    assert document["identifiable"] == {"pKa": False, "strength": False, "offset": False}
    assert "pKa and the strength of the acid cannot be told apart: what is known is pKa −" in document["conclusion"]
    # with the true factor of 1.3 the relation gives 4.756 - lg 1.3 = 4.642
    value = float(document["conclusion"].split(" = ")[1].split(" ")[0])
    assert value == pytest.approx(4.756 - 0.1139, abs=0.03)


def test_an_offset_that_cannot_be_told_gives_the_relation(tmp_path: Path) -> None:
    found = fit(tmp_path, Made().solutions(Truth(), NAME, DILUTIONS), steps=1, free=("offset",))
    assert "pKa and an offset of the meter cannot be told apart: what is known is pKa + 2." in found.conclusion
    assert found.offset.value is None


def test_points_on_one_side_of_a_strong_acid_give_a_bound(tmp_path: Path) -> None:
    strong = Truth("hydrofluoric acid", {1: -4.0})  # pKa near -0.8
    shares = (0.5, 0.6, 0.7, 0.8, 0.9, 0.95)
    found = fit(tmp_path, Made().solutions(strong, NAME, [(0.05, 0.05 * s) for s in shares]), steps=1)
    one = found.steps[0]
    assert one.pka is None
    assert one.bounds[0] is None
    assert one.bounds[1] is not None
    assert strong.pka[0] < one.bounds[1] < 2.0
    assert f"these readings only say that it lies below {one.bounds[1]:.2f}" in found.conclusion.replace("−", "-")
    assert "All readings lie on one side of half neutralisation of step 1" in found.conclusion


def test_points_on_one_side_that_still_tell_are_said_too(tmp_path: Path) -> None:
    found = fit(tmp_path, Made().solutions(Truth(), NAME, HALF_WAY[:3]), steps=1)
    assert "(10 to 30 % neutralised)" in found.conclusion
    assert "one_side" in found.flags
    assert found.steps[0].standing == "found"


def test_a_small_span(tmp_path: Path) -> None:
    rows = [(0.05, 0.05 * s) for s in (0.45, 0.47, 0.49, 0.51, 0.53, 0.55)]
    found = fit(tmp_path, Made().solutions(Truth(), NAME, rows), steps=1)
    assert "The readings span only 0.1" in found.conclusion
    assert "span" in found.flags


def test_steps_closer_than_the_data_can_part(tmp_path: Path) -> None:
    # succinic acid with its constants moved to 5.41 and 5.44
    near = Truth("succinic acid", {1: 1.2, 2: -0.2}, noise=0.03)
    found = fit(tmp_path, Made().titration(near, NAME, added=range(20, 32, 2)), steps=2)
    assert [step.pka for step in found.steps] == [None, None]
    assert "pKa1 and pKa2 lie closer together than these readings can part; their mean is known:" in found.conclusion
    mean = float(found.conclusion.split("mean is known: ")[1].split(" ")[0])
    assert mean == pytest.approx(sum(near.pka) / 2, abs=0.08)


def test_a_meter_that_is_itself_suspect(tmp_path: Path) -> None:
    made = Made().titration(Truth(offset=0.1), NAME)
    for shown in (6.96, 6.97, 6.96, 6.97):  # the standard has 6.865 at 25 °C (NBS/NIST table)
        made.reading(known="phosphate 1:1", meter="M-1", celsius=25.0, ph=shown)
    found = fit(tmp_path, made, steps=1)
    assert "Meter M-1 is itself suspect: its 4 readings of other solutions lie 0.10 pH above" in found.conclusion
    assert "meter" in found.flags
    sound = Made().titration(Truth(), NAME)
    for shown in (6.86, 6.87, 6.86, 6.87):
        sound.reading(known="phosphate 1:1", meter="M-1", celsius=25.0, ph=shown)
    assert "suspect" not in fit(tmp_path, sound, steps=1).conclusion


def test_a_calibration_outside_the_limits_makes_a_meter_suspect(tmp_path: Path) -> None:
    made = Made().titration(Truth(), NAME)
    made.sheet("Cal", ("Meter", "Calibrated at", "Slope (%)", "Offset (mV)"), ("M-1", "2026-01-05 08:00", 84.0, 3.0))
    found = fit(tmp_path, made, steps=1)
    assert "a calibration of it has a slope of 84 %, outside 90 to 105 %" in found.conclusion


def test_few_readings_and_none_to_judge_the_scatter_by(tmp_path: Path) -> None:
    found = fit(tmp_path, Made().solutions(Truth(), NAME, HALF_WAY[3:6]), steps=1)
    assert "Only 3 readings are left to fit" in found.conclusion
    one = fit(tmp_path, Made().solutions(Truth(), NAME, HALF_WAY[4:5]), steps=1)
    assert "the scatter cannot be judged, and a noise of 0.02 pH is taken instead" in one.conclusion
    assert one.noise_origin == "assumed"


def test_series_that_disagree(tmp_path: Path) -> None:
    made = Made().titration(Truth(), NAME, "T1").titration(Truth(offset=0.08), NAME, "T2")
    found = fit(tmp_path, made, steps=1)
    assert "The series disagree beyond chance: T1 lies 0.0" in found.conclusion
    assert [one.series for one in found.series] == ["T1", "T2"]
    apart = [one.pka[0] for one in found.series]
    assert apart[1] - apart[0] == pytest.approx(0.08, abs=0.02)  # type: ignore[operator]


def test_residuals_that_bend(tmp_path: Path) -> None:
    made = Made().titration(Truth("succinic acid", noise=0.005), NAME, added=range(2, 50, 2))
    found = fit(tmp_path, made, steps=1)
    assert "The residuals bend with pH beyond chance" in found.conclusion


def test_scatter_beyond_the_noise_stated(tmp_path: Path) -> None:
    found = fit(tmp_path, Made().titration(Truth(noise=0.03), NAME), steps=1, noise=0.003)
    assert "times as much as the noise stated for them" in found.conclusion


def test_no_value_at_25_without_an_enthalpy(tmp_path: Path) -> None:
    found = fit(tmp_path, Made().titration(Truth(), NAME, celsius=18.0), steps=1)
    assert found.steps[0].pka_25c is None
    assert "No value at 25 °C is given: the readings are at 18.0 °C, and no enthalpy is known" in found.conclusion
    known = fit(tmp_path, Made().titration(Truth(), "acetic acid", celsius=18.0), "acetic acid")
    assert known.steps[0].pka_25c is not None
    assert "moved with the library's enthalpy" in known.conclusion


def test_none_of_these(tmp_path: Path) -> None:
    found = fit(tmp_path, Made().titration(Truth(shift={1: 0.6}), NAME), steps=1)  # pKa 5.36, where no acid stands
    assert found.none_of_these
    assert "None of these: no acid of the library explains the readings" in found.conclusion


def test_a_gap_is_told_with_what_it_would_change_and_without_an_instruction(tmp_path: Path) -> None:
    rows = [*DILUTIONS, (0.05, 0.05 * 0.05)]
    found = fit(tmp_path, Made().solutions(Truth(noise=0.03), NAME, rows), steps=1, free=("strength",))
    gap = found.gaps[0]
    assert gap.after < 0.7 * (gap.before or float("inf"))
    words = " ".join(found.gap_words)
    assert f"No reading lies between {gap.low:.0f} and {gap.high:.0f} % neutralised of step 1; one there would" in words
    assert not any(verb in words.lower() for verb in ("prepare", "add ", "mix", "titrate", "make ", "dilute"))
    # the same with one more reading there: the interval is as long as was told, within the luck of its noise
    share = (gap.low + gap.high) / 200.0
    more = fit(
        tmp_path, Made().solutions(Truth(noise=0.03), NAME, [*rows, (0.03, 0.03 * share)]), steps=1, free=("strength",)
    )
    low, high = more.steps[0].interval95 or (0.0, 9.0)
    assert high - low == pytest.approx(gap.after, rel=0.25)  # the noise is estimated anew


@pytest.mark.parametrize(("also", "told"), [({}, True), ({"hydrazoic acid": 0.01}, False)])
def test_no_gap_beside_a_substance_with_a_hazard_word_beyond_corrosive(
    tmp_path: Path, also: dict[str, float], told: bool
) -> None:
    rows = [(0.05, 0.05 * s) for s in (0.05, 0.08, 0.92)]
    made = Made().solutions(Truth(noise=0.03), NAME, rows, also=also)
    found = fit(tmp_path, made, steps=1)
    assert bool(found.gaps) == told
    assert bool(found.gap_words) == told
