"""A finding as its section of the page shows it."""

from __future__ import annotations

import base64
from dataclasses import dataclass

import numpy as np

from reconcile.records.results import Audit, Finding
from reconcile.reporter.drawn import Drawn
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.page_tables import Cell, Row, View, anchor, row_id, shown_rows, text_cell
from reconcile.reporter.plain import plain
from reconcile.reporter.words import (
    brief_since,
    certainty_words,
    counted,
    explains_words,
    half_up,
    interval,
    listed,
    minus,
    quantity,
    rival_words,
    signed,
    since_words,
    size_words,
    title,
)

MOST_LINKS = 30
MOST_IMPACT = 40
MOST_BATCHES = 20
MOST_SECTIONS = 100
"""Findings that get a section; the overview lists all."""


@dataclass(frozen=True)
class Picture:
    """A picture as the page holds it."""

    uri: str
    alt: str
    caption: str
    heading: str
    file: str


@dataclass(frozen=True)
class Section:
    """One finding in words and links."""

    anchor: str
    id: str
    title: str
    text: str
    facts: list[tuple[str, str]]
    readings: list[tuple[str, str]]
    more_readings: str
    rivals: View | None
    next_check: str
    impact: View | None
    picture: Picture | None


def picture(drawn: Drawn) -> Picture:
    """A picture as data, so that the page needs no other file."""
    uri = "data:image/svg+xml;base64," + base64.b64encode(drawn.svg).decode("ascii")
    return Picture(uri, drawn.alt, drawn.caption, drawn.heading, f"plots/{drawn.name}.png")


def sections(audit: Audit, lookups: Lookups, drawn: list[Drawn]) -> list[Section]:
    """One section a finding, most supported first."""
    pictures = {d.finding: picture(d) for d in drawn if d.finding >= 0}
    on_page = set(shown_rows(lookups).tolist())
    return [
        _section(audit, lookups, finding, i, pictures.get(i), on_page)
        for i, finding in enumerate(audit.findings[:MOST_SECTIONS])
    ]


def _section(
    audit: Audit, lookups: Lookups, finding: Finding, index: int, own: Picture | None, on_page: set[int]
) -> Section:
    facts = [("How large" if finding.estimate is not None else "What would explain it", size_words(finding))]
    when = since_words(finding)
    if when:
        facts.append(("Since when", when))
    explains = explains_words(finding)
    if explains and finding.estimate is not None:
        facts.append(("Would explain it", explains))
    if finding.also:
        facts.append(("The same for pH", listed([plain(a) for a in finding.also], 8)))
    facts.append(("How sure", certainty_words(finding)))
    rows = sorted(int(i) for i in finding.readings)
    batches = list(dict.fromkeys(b for b in (str(lookups.batch[i]) for i in rows) if b))
    if finding.subject_type not in ("batch", "reading") and batches:
        facts.append(("Batches concerned", f"{len(batches):,}: {listed(batches, MOST_BATCHES)}"))
    links = [(_row_words(audit, lookups, i), row_id(i) if i in on_page else "") for i in rows[:MOST_LINKS]]
    more = len(rows) - len(links)
    name = anchor(finding, index)
    return Section(
        name,
        plain(finding.id),
        title(finding),
        plain(finding.text),
        facts,
        links,
        f"and {more:,} more; filter the residuals for {plain(finding.id)}." if more > 0 else "",
        _rivals(finding, name),
        plain(finding.next_check),
        _impact(audit, lookups, finding, name, on_page),
        own,
    )


def _row_words(audit: Audit, lookups: Lookups, i: int) -> str:
    place = audit.records.readings.row[i]
    name = str(lookups.batch[i])
    return f"row {int(place)}" + (f" ({name if len(name) <= 24 else name[:23] + '…'})" if name else "")


def _rivals(finding: Finding, name: str) -> View | None:
    if not finding.rivals:
        return None
    rows = []
    for rival in finding.rivals[:8]:
        behind = finding.log_likelihood_gain - rival.log_likelihood_gain
        explains = explains_words(rival)
        also = f" (the same for pH: {listed([plain(a) for a in rival.also], 4)})" if rival.also else ""
        size = quantity(rival) if rival.estimate is not None else "–"
        rows.append(
            Row(
                "",
                False,
                [
                    text_cell(title(rival)),
                    Cell(size, "n"),
                    text_cell(f"{explains}{also}" or "–"),
                    text_cell(since_words(rival) or "–"),
                    Cell(minus(half_up(behind, 1)), "n"),
                ],
            )
        )
    headings = [
        ("Explanation", ""),
        ("Size", "n"),
        ("Would explain it", ""),
        ("When", ""),
        ("Behind the finding (log likelihood)", "n"),
    ]
    headings, rows = _without_blank(headings, rows)
    return View(f"{name}-rivals", f"What else it could be, instead of {plain(finding.id)}", headings, rows, tool=False)


def _impact(audit: Audit, lookups: Lookups, finding: Finding, name: str, on_page: set[int]) -> View | None:
    chosen = sorted(int(i) for i in finding.impact)
    if not chosen:
        return None
    readings = audit.records.readings
    shift = dict(zip(np.asarray(finding.readings).tolist(), finding.shift.tolist(), strict=False))

    def digits(value: float, i: int) -> str:
        return minus(half_up(float(value), int(max(lookups.decimals[i], 2))))

    rows = []
    for i in chosen[:MOST_IMPACT]:
        target = ((f"row {int(readings.row[i])}", row_id(i)),) if i in on_page else ()
        rows.append(
            Row(
                "",
                False,
                [
                    Cell(f"row {int(readings.row[i])}", "", target),
                    text_cell(str(lookups.batch[i])),
                    text_cell(str(lookups.meter[i])),
                    Cell(minus(half_up(float(readings["ph"][i]), int(lookups.decimals[i]))), "n"),
                    Cell(digits(readings["low_limit"][i], i), "n"),
                    Cell(digits(readings["high_limit"][i], i), "n"),
                    Cell(signed(half_up(shift.get(i, np.nan), 3)), "n"),
                ],
            )
        )
    headings = [
        ("Reading", ""),
        ("Batch", ""),
        ("Meter", ""),
        ("pH observed", "n"),
        ("Low limit (pH)", "n"),
        ("High limit (pH)", "n"),
        ("Share of the finding (pH)", "n"),
    ]
    more = len(chosen) - MOST_IMPACT
    note = f"and {counted(more, 'more reading')} in findings.json" if more > 0 else ""
    return View(f"{name}-impact", f"Readings whose place in their limits {plain(finding.id)} concerns", headings, rows,
                note, tool=False)  # fmt: skip


def _without_blank(headings: list[tuple[str, str]], rows: list[Row]) -> tuple[list[tuple[str, str]], list[Row]]:
    """The same table without columns that hold nothing but dashes."""
    kept = [k for k in range(len(headings)) if any(row.cells[k].text != "–" for row in rows)]
    return [headings[k] for k in kept], [Row(r.id, r.flagged, [r.cells[k] for k in kept]) for r in rows]


def overview(audit: Audit) -> View | None:
    """All findings in one table, each leading to its section."""
    if not audit.findings:
        return None
    rows = []
    for i, finding in enumerate(audit.findings):
        ident = plain(finding.id)
        link = ((ident, anchor(finding, i)),) if i < MOST_SECTIONS else ()
        rows.append(
            Row(
                "",
                False,
                [
                    Cell(ident, "", link),
                    text_cell(title(finding)),
                    Cell(quantity(finding) or "–", "s"),
                    Cell(interval(finding) or "–", "s"),
                    Cell(brief_since(finding) or "–", "s"),
                    Cell(f"{len(finding.readings):,}", "n"),
                    Cell(f"{len(finding.impact):,}", "n"),
                    text_cell(listed([rival_words(finding, r) for r in finding.rivals], 3) or "–"),
                ],
            )
        )
    headings = [
        ("Finding", ""),
        ("What", ""),
        ("How large", ""),
        ("95 % interval", ""),
        ("When", ""),
        ("Readings", "n"),
        ("Limits concerned", "n"),
        ("What else it could be", ""),
    ]
    headings, rows = _without_blank(headings, rows)
    return View("findings-table", "Findings, most supported first", headings, rows, tool=len(rows) > 8, captioned=True)
