"""The pages by the rules of axe-core (WCAG 2 A and AA and its best practices): no violation, wide and narrow.

axe-core is fetched by .ci/run into .ci/npm; where it or a browser is missing, the tests are skipped.
"""

from __future__ import annotations

import os
from pathlib import Path
from typing import Any

import pytest
from chromium_pipe import Chromium, program

ROOT = Path(__file__).parents[2]
AXE = Path(os.environ.get("AXE_CORE") or ROOT / ".ci/npm/node_modules/axe-core/axe.min.js")
EXAMPLE = ROOT / "reports" / "example" / "report.html"

pytestmark = [
    pytest.mark.browser,
    pytest.mark.skipif(program() is None, reason="no Chromium is installed on this system"),
    pytest.mark.skipif(not AXE.is_file(), reason="axe-core is not there; .ci/run fetches it, or name it in AXE_CORE"),
]


def violations(browser: Chromium) -> list[tuple[str, str, list[str]]]:
    """Rule, what it asks, and the elements that break it."""
    browser.value(AXE.read_text(encoding="utf-8") + "; true")
    found: dict[str, Any] = browser.value(
        "axe.run(document, {resultTypes: ['violations']}).then(r => ({passes: r.passes.length,"
        " violations: r.violations.map(v => [v.id, v.help, v.nodes.map(n => n.html.slice(0, 120))])}))"
    )
    assert found["passes"] > 20  # it did run
    return [(rule, what, nodes) for rule, what, nodes in found["violations"]]


@pytest.mark.parametrize("width", [400, 1280])
def test_a_page_breaks_no_rule(browser: Chromium, any_page: Path, width: int) -> None:
    browser.open(any_page, width)
    assert violations(browser) == []


def test_the_example_breaks_no_rule(browser: Chromium) -> None:
    browser.open(EXAMPLE)
    assert violations(browser) == []


def test_a_broken_page_is_caught(browser: Chromium, tmp_path: Path) -> None:
    page = tmp_path / "broken.html"
    page.write_text("<title>x</title><html><body><img src='data:,'><p style='color:#ccc'>pale</p></body></html>")
    browser.open(page)
    browser.value(AXE.read_text(encoding="utf-8") + "; true")
    rules = browser.value("axe.run(document).then(r => r.violations.map(v => v.id))")
    assert {"image-alt", "html-has-lang", "color-contrast"} <= set(rules)
