"""What a fresh reader of the example must be able to say (fresh_reader.md): it stands where one looks first.

The answers are those planted in the sample record (sample_data/solution_room_truth.json), not the program's own.
"""

from __future__ import annotations

import html
import json
import re
from datetime import date
from functools import cache
from pathlib import Path
from typing import Any

import pytest
from test_reporter_golden import outline

ROOT = Path(__file__).parents[2]
TRUTH = json.loads((ROOT / "sample_data" / "solution_room_truth.json").read_text(encoding="utf-8"))
PLANTED = TRUTH["planted"]
PAGE = ROOT / "reports" / "example" / "report.html"
FINDINGS = json.loads((PAGE.parent / "findings.json").read_text(encoding="utf-8"))["findings"]
OF_METERS = [p for p in PLANTED if p["subject_type"] == "meter"]
OF_LOTS = [p for p in PLANTED if p["subject_type"] == "lot"]


@pytest.fixture(scope="module")
def source() -> str:
    return PAGE.read_text(encoding="utf-8")


def gist_line(source: str, label: str) -> str:
    lines = outline(source).splitlines()
    first = lines.index(label) + 1
    ends = ("What was checked", "What stands out", "What to read next", "What could not be checked", "How complete")
    last = next(i for i in range(first, len(lines)) if lines[i] in (*ends, "Scope"))
    return "\n".join(lines[first:last])


def section_of(source: str, subject: str) -> str:
    """Words of the section whose heading names a subject."""
    for found in re.finditer(r'<article class="finding".*?</article>', source, re.DOTALL):
        words = outline(found.group())
        if subject in words.splitlines()[0]:
            return words
    raise AssertionError(f"no section about {subject}")


@cache
def residual_rows(source: str) -> list[dict[str, str]]:
    """Rows of the page's table of residuals, by heading."""
    found = re.search(r'<table id="residuals".*?</table>', source, re.DOTALL)
    assert found
    rows = [
        [
            html.unescape(re.sub("<[^>]*>", "", cell))
            for cell in re.findall(r"<t[hd]\b[^>]*>(.*?)</t[hd]>", row, re.DOTALL)
        ]
        for row in re.findall(r"<tr\b.*?</tr>", found.group(), re.DOTALL)
    ]
    return [dict(zip(rows[0], row, strict=True)) for row in rows[1:]]


def name_of(planted: dict[str, Any]) -> str:
    subject = planted["subject"]
    return subject if isinstance(subject, str) else subject[0]


@pytest.mark.parametrize("planted", PLANTED, ids=lambda p: f"{p['kind']} {name_of(p)}")
def test_the_gist_names_each_fault_and_its_section_the_rows(source: str, planted: dict[str, Any]) -> None:
    assert name_of(planted) in gist_line(source, "What stands out")
    words = section_of(source, name_of(planted))
    assert "What else it could be" in words
    assert "What to read next" in words
    assert "Reviewer’s conclusion" in words


@pytest.mark.parametrize("planted", PLANTED, ids=lambda p: f"{p['kind']} {name_of(p)}")
def test_the_rows_of_a_finding_are_those_of_its_subject(source: str, planted: dict[str, Any]) -> None:
    """Planted are rows of the sheet Readings. A meter's finding may count more: its readings of known solutions, and
    later readings of a solution that was brought to its target on this meter, on whatever meter those were made; a
    reading that only brought a solution to its target is no evidence, and may be counted or not.
    """
    name = name_of(planted)
    words = section_of(source, name)
    finding = next(f for f in FINDINGS if f["id"] == words.split()[0])
    places = {(place["sheet"], str(place["row"])) for place in finding["readings"]}
    counted = [row for row in residual_rows(source) if (row["Sheet"], row["Row"]) in places]
    evidence = [row for row in counted if row["Status"] != "adjusted"]
    found = re.search(r"It rests on (\d+) reading", words)
    assert found
    assert len(evidence) <= int(found[1]) <= len(counted)

    left_out = {one["row"] for one in TRUTH["set_aside"]}
    left_out |= {int(row["Row"]) for row in residual_rows(source) if row["Status"] == "adjusted"}
    of_meter = planted["subject_type"] == "meter"
    own = {int(r["Row"]) for r in evidence if r["Sheet"] == "Readings" and (r["Meter"] == name or not of_meter)}
    assert len(own ^ (set(planted["rows"]) - left_out)) <= 2  # an onset lies between two readings
    adjusted_here = {r["Batch"] for r in residual_rows(source) if (r["Status"], r["Meter"]) == ("adjusted", name)}
    elsewhere = [row for row in counted if of_meter and row["Meter"] != name]
    assert {row["Batch"] for row in elsewhere} <= adjusted_here


@pytest.mark.parametrize("planted", [p for p in OF_METERS if "since" in p], ids=name_of)
def test_since_when(source: str, planted: dict[str, Any]) -> None:
    line = next(x for x in gist_line(source, "What stands out").splitlines() if planted["subject"] in x)
    found = re.search(r"since (\d{4}-\d\d-\d\d)", line)
    assert found
    assert abs((date.fromisoformat(found[1]) - date.fromisoformat(planted["since"][:10])).days) <= 2


@pytest.mark.parametrize("planted", [p for p in OF_METERS + OF_LOTS if p["estimate"]], ids=name_of)
def test_how_large_lies_in_the_interval_shown(source: str, planted: dict[str, Any]) -> None:
    words = section_of(source, planted["subject"])
    found = re.search(r"95 % interval ([\d.]+) to ([\d.]+)", words)
    assert found
    low, high = float(found[1]), float(found[2])
    assert low - 0.01 * high <= abs(planted["estimate"]) <= high + 0.01 * high
    assert "as striking is" in words


@pytest.mark.parametrize("planted", [p for p in OF_LOTS if p.get("substance")], ids=name_of)
def test_what_the_bottle_acts_as_and_what_its_label_says(source: str, planted: dict[str, Any]) -> None:
    words = section_of(source, planted["subject"])
    assert f"acts as {planted['substance']}" in words
    assert "On the label" in words
    assert planted["substance"] in gist_line(source, "What stands out")


def test_what_to_read_next_and_what_it_would_show(source: str) -> None:
    text = gist_line(source, "What to read next")
    assert re.search(r"Read .+ on meter .+\. Expected: pH \d+\.\d\d \(u [\d.]+\) for .+, pH \d+\.\d\d", text)
    assert "quality unit" in text


def test_what_silence_means_and_what_was_left_out(source: str) -> None:
    text = gist_line(source, "What could not be checked")
    assert re.search(r"a meter offset of 0\.\d+ (to 0\.\d+ )?pH \(\d+ meters\)", text)
    assert re.search(r"a strength [\d.]+ (to [\d.]+ )?% off \(\d+ lots\)", text)
    assert "both halves of a buffer" in text
    assert re.search(r"\d+ rows read = \d+ used \+ \d+ set aside", gist_line(source, "How complete"))


def test_which_batches_change_place_in_their_limits(source: str) -> None:
    words = section_of(source, "Bench 2")
    assert "Readings that would change their place in or out of limits" in words
    assert re.search(r"row \d+\nS25-\d+\nBench 2", words)


def test_no_release_and_no_correction(source: str) -> None:
    words = outline(source)
    assert "no finding is not a release" in words
    assert "it is never amended from a report" in words


def test_every_question_ends_in_a_question_mark() -> None:
    text = (Path(__file__).parent / "fresh_reader.md").read_text(encoding="utf-8")
    questions = re.findall(r"^(\d+)\. (.+(?:\n   .+)*)$", text, re.MULTILINE)
    assert [int(number) for number, _ in questions] == list(range(1, 15))
    assert all(question.endswith("?") for _, question in questions)
