"""The pages in a browser: load nothing, sort, filter, link, fit a phone, print whole."""

from __future__ import annotations

import base64
import re
from pathlib import Path

import pytest
from chromium_pipe import Chromium, program

pytestmark = [
    pytest.mark.browser,
    pytest.mark.skipif(program() is None, reason="no Chromium is installed on this system"),
]


def test_opens_from_disk_without_a_request_or_a_message(browser: Chromium, any_page: Path) -> None:
    browser.open(any_page)
    browser.value("new Promise(done => setTimeout(done, 300))")
    requested = [e["request"]["url"] for e in browser.of("Network.requestWillBeSent")]
    outside = [url for url in requested if not url.startswith(("data:", any_page.resolve().as_uri()))]
    assert outside == []
    assert browser.of("Runtime.consoleAPICalled") == []
    assert browser.of("Runtime.exceptionThrown") == []
    assert browser.of("Log.entryAdded") == []
    assert browser.value("Array.from(document.images).every(i => i.complete && i.naturalWidth > 300)")
    assert browser.value("document.querySelectorAll('script').length") == 1


COLUMN = "Array.from(document.querySelectorAll('#residuals tbody tr')).map(r => r.cells[{}].textContent)"


def heading(name: str) -> str:
    return (
        f"Array.from(document.querySelectorAll('#residuals thead th')).findIndex(h => h.textContent.includes({name!r}))"
    )


def test_a_heading_sorts_up_and_down_and_blanks_stay_last(browser: Chromium, folder: Path) -> None:
    browser.open(folder / "report.html")
    at = browser.value(heading("Residual"))
    click = f"document.querySelectorAll('#residuals thead th')[{at}].querySelector('button').click()"
    for sign in (1, -1):
        browser.value(click)
        texts = browser.value(COLUMN.format(at))
        numbers = [sign * float(t.replace("−", "-")) for t in texts if t]
        assert numbers == sorted(numbers)
        assert len(numbers) == 39
        assert texts[-1] == ""
    assert browser.value(f"document.querySelectorAll('#residuals thead th')[{at}].ariaSort") == "descending"


def test_the_filter_keeps_rows_that_hold_every_word(browser: Chromium, folder: Path) -> None:
    browser.open(folder / "report.html")
    browser.value(
        "(() => { const i = document.getElementById('residuals-filter'); i.value = 'explained F1';"
        "i.dispatchEvent(new Event('input')); })()"
    )
    shown = browser.value("Array.from(document.querySelectorAll('#residuals tbody tr')).filter(r => !r.hidden).length")
    assert shown == 7
    assert browser.value("document.querySelector('.filter output').textContent") == "7 of 40 rows"


def test_a_link_to_a_filtered_row_brings_it_back(browser: Chromium, folder: Path) -> None:
    browser.open(folder / "report.html")
    browser.value(
        "(() => { const i = document.getElementById('residuals-filter'); i.value = 'void';"
        "i.dispatchEvent(new Event('input')); })()"
    )
    browser.value("document.querySelector('.links a').click()")
    browser.value("new Promise(done => setTimeout(done, 200))")
    assert browser.value("!document.querySelector(location.hash).hidden")
    top = browser.value("document.querySelector(location.hash).getBoundingClientRect().top")
    assert -5 <= top <= 900


def test_the_keyboard_reaches_and_works_it(browser: Chromium, folder: Path) -> None:
    browser.open(folder / "report.html")
    browser.press("Tab", 9)
    assert browser.value("document.activeElement.textContent") == "Skip to the report"
    assert browser.value("document.activeElement.getBoundingClientRect().left") >= 0
    browser.value("document.querySelector('#residuals th button').focus()")
    browser.press("Enter", 13)
    assert browser.value("document.querySelector('#residuals th').ariaSort") == "ascending"


@pytest.mark.parametrize("width", [400, 768, 1280])
def test_nothing_scrolls_sideways_but_inside_its_box(browser: Chromium, any_page: Path, width: int) -> None:
    browser.open(any_page, width)
    assert browser.value("document.documentElement.scrollWidth") <= width
    over = browser.value(
        "Array.from(document.querySelectorAll('main *')).filter(e => !e.closest('.box') && !e.matches('.unseen') &&"
        " e.getBoundingClientRect().right > innerWidth + 1).map(e => e.tagName + '.' + e.className)"
    )
    assert over == []


def test_at_desktop_width_no_table_is_cut_by_its_box(browser: Chromium, any_page: Path) -> None:
    """But for the residuals of the invented record, which fills every column there is."""
    browser.open(any_page, 1280)
    cut = browser.value(
        "Array.from(document.querySelectorAll('.box')).filter(b => b.scrollWidth > b.clientWidth + 1)"
        ".map(b => [b.getAttribute('aria-labelledby'), b.scrollWidth - b.clientWidth])"
    )
    assert [one for one in cut if one[0] != "residuals-caption"] == []


CONTRAST = """
(() => {
  const channel = v => { v /= 255; return v <= 0.04045 ? v / 12.92 : Math.pow((v + 0.055) / 1.055, 2.4); };
  const light = c => 0.2126 * channel(c[0]) + 0.7152 * channel(c[1]) + 0.0722 * channel(c[2]);
  const parse = s => s.match(/[\\d.]+/g).map(Number);
  const ground = e => { for (; e; e = e.parentElement) {
    const c = parse(getComputedStyle(e).backgroundColor); if (c.length < 4 || c[3] > 0) return c; }
    return [255, 255, 255]; };
  const found = [];
  for (const e of document.querySelectorAll('body *')) {
    if (!Array.from(e.childNodes).some(n => n.nodeType === 3 && n.textContent.trim())) continue;
    if (['SCRIPT', 'STYLE', 'TITLE'].includes(e.tagName)) continue;
    const a = light(parse(getComputedStyle(e).color)), b = light(ground(e));
    const ratio = (Math.max(a, b) + 0.05) / (Math.min(a, b) + 0.05);
    if (ratio < 4.5) found.push([e.tagName, e.className, ratio]);
  }
  return found;
})()
"""  # relative luminance and contrast ratio as in WCAG 2.2, https://www.w3.org/TR/WCAG22/#dfn-contrast-ratio


def test_text_has_contrast_of_at_least_four_and_a_half(browser: Chromium, any_page: Path) -> None:
    browser.open(any_page)
    assert browser.value(CONTRAST) == []


def test_prints_with_numbered_pages(browser: Chromium, any_page: Path) -> None:
    browser.open(any_page)
    data = base64.b64decode(browser.call("Page.printToPDF", {"preferCSSPageSize": True})["data"])
    assert data.startswith(b"%PDF")
    pages = len(re.findall(rb"/Type\s*/Page\b", data))
    assert 8 <= pages <= 20
    assert "counter(page)" in browser.value("document.querySelector('style').textContent")


def test_headings_are_text_on_paper_so_that_every_page_repeats_them(browser: Chromium, any_page: Path) -> None:
    """Chromium leaves out buttons where it repeats the head of a table on the next sheet."""
    browser.open(any_page)
    browser.call("Emulation.setEmulatedMedia", {"media": "print"})
    shown = browser.value("Array.from(document.querySelectorAll('th button')).map(b => getComputedStyle(b).display)")
    browser.call("Emulation.setEmulatedMedia", {"media": ""})
    assert shown
    assert set(shown) == {"contents"}


@pytest.mark.parametrize(("chosen", "width"), [("section:not(.wide) table", 680), ("section.wide table", 1009)])
def test_no_table_is_cut_by_the_edge_of_the_paper(browser: Chromium, any_page: Path, chosen: str, width: int) -> None:
    """A4 less the margins of the style: 180 mm upright, 267 mm across, at 96 px an inch."""
    browser.open(any_page, width)
    browser.call("Emulation.setEmulatedMedia", {"media": "print"})
    widths = browser.value(f"Array.from(document.querySelectorAll('{chosen}')).map(t => [t.id, t.scrollWidth])")
    browser.call("Emulation.setEmulatedMedia", {"media": ""})
    assert widths
    assert [one for one in widths if one[1] > width] == []
