"""report.html parsed: structure, links, nothing loaded, nothing of the record acting as markup."""

from __future__ import annotations

import base64
import hashlib
import re
from dataclasses import replace
from html.parser import HTMLParser
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
from invented_audit import HOSTILE_LOT, build

from reconcile.records.results import Audit, Finding
from reconcile.records.settings import Settings
from reconcile.reporter.cautions import CAUTIONS, NO_HAZARD_WORD
from reconcile.reporter.contents import contents
from reconcile.reporter.page_tables import MOST_RESIDUALS

VOID = {"meta", "img", "input", "br", "link"}


class Page(HTMLParser):
    """Elements with their attributes, and the text outside script and style."""

    def __init__(self, text: str) -> None:
        super().__init__(convert_charrefs=True)
        self.elements: list[tuple[str, dict[str, str | None]]] = []
        self.open: list[str] = []
        self.words: list[str] = []
        self.raw: dict[str, str] = {}
        self.feed(text)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.elements.append((tag, dict(attrs)))
        if tag not in VOID:
            self.open.append(tag)

    def handle_endtag(self, tag: str) -> None:
        assert self.open, f"</{tag}> closes nothing"
        assert self.open.pop() == tag

    def handle_data(self, data: str) -> None:
        if self.open and self.open[-1] in ("script", "style"):
            self.raw[self.open[-1]] = self.raw.get(self.open[-1], "") + data
        else:
            self.words.append(data)

    @property
    def text(self) -> str:
        return " ".join(" ".join(self.words).split())

    def all(self, *tags: str) -> list[dict[str, str | None]]:
        return [attributes for tag, attributes in self.elements if tag in tags]


@pytest.fixture(scope="module")
def source(folder: Path) -> str:
    return (folder / "report.html").read_text(encoding="utf-8")


@pytest.fixture(scope="module")
def page(source: str) -> Page:
    return Page(source)


def test_every_element_is_closed(page: Page) -> None:
    assert page.open == []


def policy(page: Page) -> str:
    return str(next(a["content"] for a in page.all("meta") if a.get("http-equiv") == "Content-Security-Policy"))


def test_nothing_is_loaded_from_outside(page: Page) -> None:
    for tag, attributes in page.elements:
        for name in ("src", "href", "data", "action", "srcset", "poster"):
            target = attributes.get(name)
            if target is not None:
                assert target.startswith(("#", "data:image/svg+xml;base64,")), (tag, target[:60])
        assert not any(name.startswith("on") for name in attributes), tag
    assert "@import" not in page.raw["style"]
    assert "url(" not in page.raw["style"]
    assert "fetch(" not in page.raw["script"]
    assert "default-src 'none'" in policy(page)


def test_policy_lets_only_our_own_script_and_style_run(page: Page) -> None:
    for name in ("script", "style"):
        digest = base64.b64encode(hashlib.sha256(page.raw[name].encode()).digest()).decode()
        assert f"{name}-src 'sha256-{digest}'" in policy(page)


def test_names_of_the_record_are_text_and_not_markup(page: Page) -> None:
    assert len(page.all("script")) == 1
    assert HOSTILE_LOT in page.text
    assert "\\u001b[31m" in page.text
    assert not page.all("b")
    assert "\x1b" not in page.text
    assert "\u202e" not in page.text


def test_headings_are_in_order(page: Page) -> None:
    levels = [int(tag[1]) for tag, _ in page.elements if re.fullmatch(r"h[1-6]", tag)]
    assert levels.count(1) == 1
    assert levels[0] == 1
    assert all(after <= before + 1 for before, after in pairwise(levels))


def test_ids_are_unique_and_links_lead_somewhere(page: Page) -> None:
    ids = [a["id"] for _, a in page.elements if "id" in a]
    assert len(ids) == len(set(ids))
    for attributes in page.all("a"):
        assert str(attributes["href"])[1:] in ids
    for _, attributes in page.elements:
        if attributes.get("aria-labelledby"):
            assert attributes["aria-labelledby"] in ids


def test_findings_and_rows_are_linked_both_ways(page: Page, invented: Audit) -> None:
    targets = {str(a["href"]) for a in page.all("a")}
    for finding in invented.findings:
        assert f"#{finding.id}" in targets
        for reading in finding.readings.tolist():
            assert f"#r{reading + 1}" in targets


def test_pictures_have_words(page: Page) -> None:
    pictures = page.all("img")
    assert len(pictures) == 7
    assert all(len(str(p.get("alt") or "")) > 40 for p in pictures)


def test_scrolling_boxes_can_be_reached_and_are_named(page: Page) -> None:
    boxes = [a for a in page.all("div") if a.get("class") == "box"]
    assert boxes
    for box in boxes:
        assert box["tabindex"] == "0"
        assert box["role"] == "group"
        assert box.get("aria-label") or box.get("aria-labelledby")


def test_tables_have_captions_and_scoped_headings(page: Page) -> None:
    assert len(page.all("caption")) == len(page.all("table"))
    assert all(a.get("scope") in ("col", "row") for a in page.all("th"))


def test_what_a_reviewer_looks_for_is_there(page: Page) -> None:
    for words in (
        "What was checked", "What stands out", "What to read next", "What could not be checked", "How complete",
        "Prepared by, date", "Reviewed by, date", "Reviewer’s conclusion", "Reference", "SHA-256 " + "a" * 64,
        "toxic; gives off hydrogen azide with acid", NO_HAZARD_WORD, "invented source <i>", "both halves of the buffer",
        "Read phosphate 6.86 on meter pH-2", "acts as sodium formate", "Headings not read",
    ):  # fmt: skip
        assert words in page.text, words
    for caution in CAUTIONS:
        assert caution in page.text


def test_no_verdict_words_stand_on_the_page(page: Page) -> None:
    assert not re.search(r"\b(pass(ed)?|fail(ed|ure)?|compliant|complies|score)\b", page.text, re.IGNORECASE)


def test_settings_that_differ_are_marked_and_named() -> None:
    audit = build(settings=Settings({"audit.alarm_rate": 0.01}))
    page = Page(contents(audit, lambda what, share: None)["report.html"].decode())
    assert "audit.alarm_rate = 0.01" in page.text
    assert "audit.alarm_rate 0.01 - differs" in page.text


def test_wrong_hand_calculations_take_one_line_each_and_no_picture() -> None:
    audit = build()
    wrong = Finding(
        "record_value", "B-04", "batch", 0.21, "pH", (0.18, 0.24), 90.0, 1e-9, np.array([7]),
        "The record's own calculated pH of batch B-04, 5.12, is off by +0.21 from the full balance, 4.91. "
        "The square root of Ka C gives 5.12.", "F3", next_check="None: the calculation is to be checked.",
        would_explain={"shortcut": "square root of Ka C"}, shift=np.zeros(1),
    )  # fmt: skip
    files = contents(replace(audit, findings=(*audit.findings, wrong)), lambda what, share: None)
    page = Page(files["report.html"].decode())
    assert page.text.count("The square root of Ka C gives 5.12.") == 1
    assert "1 calculated pH in the record is off" in page.text
    assert "plots/finding_F2.png" in files
    assert "plots/finding_F3.png" not in files
    assert len(page.all("article")) == 2
    assert any(a.get("id") == "F3" for a in page.all("tr"))


def test_no_finding_says_that_it_is_no_release() -> None:
    page = Page(contents(build(with_findings=False), lambda what, share: None)["report.html"].decode())
    assert "No fault is supported by these readings. That is not a release" in page.text


@pytest.mark.slow
def test_a_large_record_shows_what_matters_and_stays_small() -> None:
    n = 20_000
    files = contents(build(n), lambda what, share: None)
    page = Page(files["report.html"].decode())
    assert len(files["report.html"]) < 8 * 2**20
    assert f"Shown are {MOST_RESIDUALS:,} of {n:,} readings" in page.text
    rows = [a for a in page.all("tr") if re.fullmatch(r"r\d+", str(a.get("id") or ""))]
    assert len(rows) == MOST_RESIDUALS
    assert all(a.get("class") == "out" for a in rows)
