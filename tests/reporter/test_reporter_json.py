"""findings.json as the design fixes it, and the JSON of --json."""

from __future__ import annotations

import dataclasses
import json
from pathlib import Path

import numpy as np
from invented_audit import build

from reconcile.records.results import Audit
from reconcile.reporter.cautions import CAUTIONS, NO_HAZARD_WORD
from reconcile.reporter.to_json import findings_json, gist_json

FINDING_FIELDS = [
    "id",
    "kind",
    "subject",
    "subject_type",
    "estimate",
    "unit",
    "interval95",
    "since",
    "until",
    "since_interval95",
    "would_explain",
    "also",
    "readings",
    "evidence",
    "rivals",
    "next_check",
    "impact",
    "text",
]  # the design's list of fields


def document(folder: Path) -> dict:
    return json.loads((folder / "findings.json").read_text(encoding="utf-8"))


def test_top_level_is_that_of_the_design(folder: Path) -> None:
    found = document(folder)
    assert list(found) == [
        "schema", "version", "rows", "findings", "not_testable", "smallest_detectable", "hazards",
    ]  # fmt: skip
    assert found["schema"] == 1
    assert found["rows"] == {"read": 43, "set_aside": 3, "used": 40}


def test_a_finding_and_its_rivals_have_the_same_fields(folder: Path) -> None:
    for finding in document(folder)["findings"]:
        assert list(finding) == FINDING_FIELDS
        assert set(finding["evidence"]) == {"log_likelihood_gain", "family_wise_p"}
        for rival in finding["rivals"]:
            assert list(rival) == FINDING_FIELDS


def test_values_of_a_finding(invented: Audit, folder: Path) -> None:
    step = document(folder)["findings"][0]
    assert step["interval95"] == [0.12, 0.16]
    assert step["since"] == "2026-03-05T09:00:00"
    assert step["until"] is None
    assert step["since_interval95"] == ["2026-03-04T00:00:00", "2026-03-06T00:00:00"]
    assert step["rivals"][0]["would_explain"] == {"total": 0.14}
    rows = invented.records.readings.row[invented.findings[0].readings].tolist()
    assert step["readings"] == [{"source": "log.xlsx", "sheet": "March", "row": r} for r in sorted(rows)]
    assert len(step["impact"]) == 2
    assert document(folder)["findings"][1]["rivals"][0]["estimate"] is None


def test_numbers_that_are_none_become_null(invented: Audit) -> None:
    bad = dataclasses.replace(
        invented.findings[0], estimate=float("nan"), family_wise_p=float("inf"), interval95=(float("-inf"), 1.0)
    )
    audit = dataclasses.replace(invented, findings=(bad,))
    finding = json.loads(findings_json(audit))["findings"][0]
    assert finding["estimate"] is None
    assert finding["evidence"]["family_wise_p"] is None
    assert finding["interval95"] == [None, 1.0]


def test_at_most_eight_rivals_in_their_order(invented: Audit) -> None:
    rivals = tuple(dataclasses.replace(invented.findings[0].rivals[0], text=f"rival {i}") for i in range(12))
    audit = dataclasses.replace(invented, findings=(dataclasses.replace(invented.findings[0], rivals=rivals),))
    found = json.loads(findings_json(audit))["findings"][0]["rivals"]
    assert [r["text"] for r in found] == [f"rival {i}" for i in range(8)]


def test_a_reading_is_named_by_batch_meter_and_row(invented: Audit) -> None:
    slip = dataclasses.replace(invented.findings[0], subject=("B-01", "pH-2", "3"), subject_type="reading")
    audit = dataclasses.replace(invented, findings=(slip,))
    assert json.loads(findings_json(audit))["findings"][0]["subject"] == ["B-01", "pH-2", "3"]


def test_silences_hold_a_reason_or_a_size(folder: Path) -> None:
    found = document(folder)
    assert all({"kind", "subject", "subject_type", "reason"} == set(s) for s in found["not_testable"])
    assert all({"size", "unit", "power"} < set(s) for s in found["smallest_detectable"])


def test_every_stock_has_its_hazard_words_or_says_that_none_is_recorded(folder: Path) -> None:
    hazards = {(h["subject"], h["substance"]): h["reason"] for h in document(folder)["hazards"]}
    assert hazards["AZ-1", "sodium azide"] == "toxic; gives off hydrogen azide with acid"
    assert hazards["SA-7", "sodium acetate"] == NO_HAZARD_WORD
    assert "sulfur dioxide" in hazards["sodium sulfite", "sodium sulfite"]


def test_no_control_character_reaches_the_terminal(invented: Audit) -> None:
    text = gist_json(invented)
    assert all(c.isprintable() or c == "\n" for c in text)
    assert json.loads(text)["cautions"] == list(CAUTIONS)


def test_same_audit_same_bytes() -> None:
    assert findings_json(build()) == findings_json(build())


def test_order_of_a_findings_readings_changes_nothing(invented: Audit) -> None:
    turned = dataclasses.replace(invented.findings[0], readings=invented.findings[0].readings[::-1])
    audit = dataclasses.replace(invented, findings=(turned, *invented.findings[1:]))
    assert findings_json(audit) == findings_json(invented)
    assert np.array_equal(turned.readings[::-1], invented.findings[0].readings)
