"""Figures and words as they are shown."""

from __future__ import annotations

import dataclasses
import math

import pytest

from reconcile.records.results import COULD_ALSO_BE, Audit
from reconcile.records.rounding import chance_words
from reconcile.reporter import words
from reconcile.reporter.gist import gist, silence_in_numbers
from reconcile.reporter.text import caution_lines, finding_lines, gist_lines, hazard_lines


@pytest.mark.parametrize(
    ("value", "decimals", "text"),
    [
        (2.675, 2, "2.68"),  # binary rounding gives 2.67; halves go away from zero (common practice, no source)
        (-2.675, 2, "-2.68"),
        (7.405, 2, "7.41"),
        (-0.0004, 3, "0.000"),
        (12.0, 0, "12"),
        (math.nan, 2, ""),
    ],
)
def test_half_up(value: float, decimals: int, text: str) -> None:
    assert words.half_up(value, decimals) == text


@pytest.mark.parametrize(
    ("value", "digits", "text"),
    [(0.00012345, 2, "0.00012"), (1234.5, 3, "1235"), (0.0, 3, "0"), (1.5e-9, 2, "1.5e-9"), (math.inf, 2, "")],
)
def test_significant(value: float, digits: int, text: str) -> None:
    assert words.significant(value, digits) == text


def test_signs_are_true_minus_signs() -> None:
    assert words.signed("-0.11") == "−0.11"
    assert words.signed("0.11") == "+0.11"
    assert words.signed("0.00") == "0.00"


def test_size_has_the_decimals_its_interval_deserves(invented: Audit) -> None:
    step, strength = invented.findings
    assert words.size_words(step) == "+0.140 pH (95 % interval +0.120 to +0.160)"
    assert words.size_words(strength) == "0.780 times as stated (95 % interval 0.740 to 0.820)"
    drift = dataclasses.replace(step, estimate=0.00721, unit="pH/day", interval95=(0.00684, 0.00761))
    assert words.size_words(drift) == "+0.00721 pH/day (95 % interval +0.00684 to +0.00761)"


def test_another_substance_is_told_in_words(invented: Audit) -> None:
    assert words.size_words(invented.findings[1].rivals[0]) == "acts as sodium formate"


@pytest.mark.parametrize(
    ("p", "text"),
    [
        (0.0, "less than 1 in 10,000"),
        (1.7e-17, "less than 1 in 10,000"),
        (9.9e-5, "less than 1 in 10,000"),
        (0.00123, "about 1 in 810"),  # 1 / 0.00123 = 813
        (0.013, "about 1 %"),
        (0.435, "about 44 %"),
        (math.nan, "not stated"),
    ],
)
def test_chances_are_told_as_people_read_them(p: float, text: str) -> None:
    assert chance_words(p) == text


def test_a_section_says_nothing_twice(invented: Audit) -> None:
    step = dataclasses.replace(
        invented.findings[0],
        text="Meter pH-2 reads 0.140 pH higher than before (95 % interval 0.120 to 0.160) from 2026-03-05. The chance "
        "is less than 1 in 10,000. " + COULD_ALSO_BE + "drift of meter pH-2.",
    )
    assert "drift" not in words.lead(step)
    assert words.lead(step).endswith("1 in 10,000.")
    assert [name for name, _ in words.unsaid(step)] == ["Log-likelihood gain"]
    terse = dataclasses.replace(step, text="Meter pH-2.", also=("probe E1",))
    assert [name for name, _ in words.unsaid(terse)] == [
        "How large", "When", "Acts the same in pH", "Family-wise p", "Log-likelihood gain",
    ]  # fmt: skip


def test_silence_is_told_in_numbers(invented: Audit) -> None:
    text = silence_in_numbers(invented)
    # the invented audit states 0.021 and 0.019 pH, and a factor of 1.08, each at a power of 0.9
    assert "90 of 100" in text
    assert "a meter offset of 0.019 to 0.021 pH (2 meters)" in text
    assert "a strength 8.0 % off (1 lot)" in text


def test_the_gist_has_five_lines_in_the_order_of_a_reviewers_questions(invented: Audit) -> None:
    lines = gist(invented)
    assert [line.key for line in lines] == ["checked", "stands_out", "read_next", "not_checked", "complete"]
    text = {line.key: line.text for line in lines}
    assert text["checked"].startswith("40 readings of 20 batches, on 3 meters, made with 4 stock lots")
    assert "F1 meter pH-2: step" in text["stands_out"]
    assert "phosphate 6.86" in text["read_next"]
    assert "43 rows read = 40 used + 3 set aside" in text["complete"]


def test_terminal_lines_hold_no_control_characters(invented: Audit) -> None:
    for line in (*gist_lines(invented), *finding_lines(invented), *hazard_lines(invented), *caution_lines()):
        assert line.isprintable()


def test_no_hazard_word_is_left_out(invented: Audit) -> None:
    text = "\n".join(hazard_lines(invented))
    assert "sodium azide (lot AZ-1): toxic; gives off hydrogen azide with acid" in text
    assert "no hazard word recorded here; see the safety data sheet" in text


def test_every_caution_is_a_sentence_and_none_suggests_preparing_anything() -> None:
    joined = " ".join(caution_lines())
    assert "lead for the quality unit, not a disposition" in joined
    assert "not a release" in joined
    assert "original reading stands" in joined
    assert "not an identification" in joined
    assert "safety data sheets" in joined
    assert "not a preparation instruction" in joined
    assert all(line.endswith(".") for line in caution_lines())
