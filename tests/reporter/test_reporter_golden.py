"""Page, workbook, tables and findings of the invented audit against reviewed copies.

REWRITE_GOLDEN=1 in the environment writes the copies anew; the difference is then read before it is committed.
"""

from __future__ import annotations

import json
import os
import re
from pathlib import Path

import openpyxl
import pytest
from test_reporter_html import Page

from reconcile.records.results import Audit
from reconcile.reporter.manifest import report_id

GOLDEN = Path(__file__).parent / "golden"


BLOCKS = frozenset(
    [
        "h1",
        "h2",
        "h3",
        "h4",
        "p",
        "li",
        "dt",
        "dd",
        "td",
        "th",
        "caption",
        "figcaption",
        "tr",
        "div",
        "section",
        "title",
        "option",
    ]
)


class Outline(Page):
    """The page's words, a line a block; pictures by their alternative text. Method and settings are left out, because
    every new setting would change them.
    """

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        super().handle_starttag(tag, attrs)
        if tag in BLOCKS:
            self.words.append("\n")
        if tag == "img":
            self.words.append(f"\n[{dict(attrs)['alt']}]\n")

    def lines(self) -> str:
        found = [" ".join(line.split()) for line in "".join(self.words).split("\n")]
        return "\n".join(line for line in found if line) + "\n"


def outline(text: str) -> str:
    kept = re.sub(r'<section id="method".*?</section>', "", text, flags=re.DOTALL)
    return Outline(kept).lines()


def cells(path: Path) -> str:
    """Every cell of a workbook but for its Method: sheet, cell, value, number format, filled or not."""
    lines = []
    for sheet in openpyxl.load_workbook(path).worksheets[:-1]:
        for row in sheet.iter_rows():
            for cell in row:
                if cell.value is not None:
                    fill = " filled" if cell.fill.fill_type else ""
                    lines.append(f"{sheet.title}!{cell.coordinate} {cell.value!r} {cell.number_format}{fill}")
    return "\n".join(lines) + "\n"


def produced(folder: Path, name: str) -> str:
    if name == "report.txt":
        return outline((folder / "report.html").read_text(encoding="utf-8"))
    if name == "residuals.xlsx.txt":
        return cells(folder / "residuals.xlsx")
    text = (folder / name).read_text(encoding="utf-8")
    if name == "findings.json":
        return json.dumps(json.loads(text) | {"version": "VERSION"}, ensure_ascii=False, indent=1) + "\n"
    return text


@pytest.mark.parametrize(
    "name", ["residuals.csv", "set_aside.csv", "findings.json", "report.txt", "residuals.xlsx.txt"]
)
def test_golden(name: str, folder: Path, invented: Audit) -> None:
    text = produced(folder, name).replace(report_id(invented), "REPORT-ID")
    text = re.sub(r"reconcile \d[\w.]*", "reconcile VERSION", text)
    kept = GOLDEN / name
    if os.environ.get("REWRITE_GOLDEN") == "1":
        GOLDEN.mkdir(exist_ok=True)
        kept.write_text(text, encoding="utf-8", newline="")
    with kept.open(encoding="utf-8", newline="") as file:
        assert text == file.read()
