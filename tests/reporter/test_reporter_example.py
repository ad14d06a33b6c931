"""reports/example: whole, and what the present program makes of the present sample record.

Made anew by one command, which stands in DEVELOPERS.md. Compared are tables, findings and the words of the page, with
figures to within a few units of their last shown digit; never the bytes of pictures, which depend on the versions of
the drawing library and its typeface.
"""

from __future__ import annotations

import csv
import hashlib
import io
import json
import re
from pathlib import Path
from typing import Any

import pytest
from test_reporter_golden import cells, outline

import reconcile
from reconcile.records.results import Audit
from reconcile.reporter.contents import contents
from reconcile.reporter.manifest import report_id

ROOT = Path(__file__).parents[2]
EXAMPLE = ROOT / "reports" / "example"
COMMAND = "reconcile audit sample_data/solution_room.xlsx --out reports/example --replace"
OUT_OF_DATE = f"reports/example is out of date; make it again: {COMMAND}"
NUMBER = re.compile(r"[-−+]?\d+(?:[.,]\d+)*(?:e-?\d+)?")
NAMES = re.compile(r"[0-9a-f]{64}|[0-9a-f]{4}(?:-[0-9a-f]{4}){3}")
"""Hashes and the report id: they change with every table of the package, and are compared through the manifest."""


@pytest.fixture(scope="module")
def audit() -> Audit:
    return reconcile.audit(ROOT / "sample_data" / "solution_room.xlsx")


@pytest.fixture(scope="module")
def made(audit: Audit) -> dict[str, bytes]:
    return contents(audit, lambda what, share: None)


def close(one: str, other: str) -> bool:
    """Two texts that are the same but for the last digits of their numbers."""
    if NUMBER.sub("#", one) != NUMBER.sub("#", other):
        return False
    pairs = zip(NUMBER.findall(one), NUMBER.findall(other), strict=True)
    return all(a == b or abs(_value(a) - _value(b)) <= _slack(a, b) for a, b in pairs)


def _value(text: str) -> float:
    return float(text.replace("−", "-").replace(",", ""))


def _slack(one: str, other: str) -> float:
    """Three units of the coarser last digit shown, or half a per cent; nothing for whole numbers below a hundred."""
    digits = min(len(t.partition(".")[2]) for t in (one, other))
    size = max(abs(_value(one)), abs(_value(other)))
    return 0.0 if digits == 0 and size < 100 else max(3 * 10.0**-digits, 0.005 * size)


def differences(kept: str, now: str) -> list[tuple[str, str]]:
    """Lines that differ by more than last digits; the first of them, with the number of lines where that differs."""
    one, other = (NAMES.sub("NAME", text).splitlines() for text in (kept, now))
    found = [(a, b) for a, b in zip(one, other, strict=False) if not close(a, b)]
    return found + [(f"{len(one)} lines", f"{len(other)} lines")] * (len(one) != len(other))


def text_of(name: str) -> str:
    return (EXAMPLE / name).read_text(encoding="utf-8")


def test_it_is_of_the_present_record_settings_and_version(audit: Audit) -> None:
    assert json.loads(text_of("manifest.json"))["report_id"] == report_id(audit), OUT_OF_DATE


def test_it_is_whole(made: dict[str, bytes]) -> None:
    listed = {o["name"]: o["sha256"] for o in json.loads(text_of("manifest.json"))["outputs"]}
    held = {p.relative_to(EXAMPLE).as_posix(): p for p in EXAMPLE.rglob("*") if p.is_file()}
    assert set(held) == {*listed, "manifest.json"}
    assert set(listed) == set(made), OUT_OF_DATE
    for name, digest in listed.items():
        assert hashlib.sha256(held[name].read_bytes()).hexdigest() == digest, f"{name} was changed by hand"


@pytest.mark.parametrize("name", ["residuals.csv", "set_aside.csv"])
def test_tables(name: str, made: dict[str, bytes]) -> None:
    kept, now = (list(csv.reader(io.StringIO(text))) for text in (text_of(name), made[name].decode()))
    assert kept[0] == now[0]
    assert len(kept) == len(now), OUT_OF_DATE
    wrong = [(a, b) for a, b in zip(kept, now, strict=True) if not all(map(close, a, b))]
    assert wrong == [], OUT_OF_DATE


def test_findings(made: dict[str, bytes]) -> None:
    kept, now = (json.loads(text) for text in (text_of("findings.json"), made["findings.json"].decode()))
    assert _flat(kept) == pytest.approx(_flat(now), rel=0.01, abs=1e-4), OUT_OF_DATE
    assert [f["subject"] for f in kept["findings"]] == [f["subject"] for f in now["findings"]]
    for a, b in zip(kept["findings"], now["findings"], strict=True):
        assert close(a["text"], b["text"]), OUT_OF_DATE
        assert close(a["next_check"], b["next_check"]), OUT_OF_DATE


def _flat(thing: Any, path: str = "") -> dict[str, float]:
    """Every number of a document by its path; None and texts are left to the other comparisons."""
    if isinstance(thing, dict):
        return {k: v for key, value in thing.items() for k, v in _flat(value, f"{path}/{key}").items()}
    if isinstance(thing, list):
        return {k: v for i, value in enumerate(thing) for k, v in _flat(value, f"{path}/{i}").items()}
    return {path: float(thing)} if isinstance(thing, (int, float)) and not isinstance(thing, bool) else {}


def test_words_of_the_page(made: dict[str, bytes]) -> None:
    assert differences(outline(text_of("report.html")), outline(made["report.html"].decode())) == [], OUT_OF_DATE


def test_workbook(made: dict[str, bytes], tmp_path: Path) -> None:
    now = tmp_path / "residuals.xlsx"
    now.write_bytes(made["residuals.xlsx"])
    assert differences(cells(EXAMPLE / "residuals.xlsx"), cells(now)) == [], OUT_OF_DATE


def test_the_command_stands_in_the_documents() -> None:
    assert COMMAND in (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")


def test_the_comparison_sees_a_change() -> None:
    assert close("pH 4.37 (u 0.01), 21 readings", "pH 4.38 (u 0.01), 21 readings")
    assert not close("pH 4.37, 21 readings", "pH 4.37, 22 readings")
    assert not close("pH 4.37", "pH 4.47")
    assert not close("meter Bench 2", "meter Bench 3")
    assert not close("drifts up", "drifts down")
