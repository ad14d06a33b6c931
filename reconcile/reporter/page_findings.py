"""A finding as its section of the page shows it."""

from __future__ import annotations

import base64
from dataclasses import dataclass

from reconcile.records.results import Audit, Finding
from reconcile.reporter.drawn import Drawn
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.page_limits import moved, unmoved
from reconcile.reporter.page_tables import Cell, Row, View, anchor, row_id, shown_rows, text_cell
from reconcile.reporter.plain import plain
from reconcile.reporter.stocks import Stock, stocks
from reconcile.reporter.words import (
    TIMELESS,
    explains_words,
    half_up,
    interval,
    lead,
    listed,
    minus,
    moment,
    quantity,
    rival_words,
    since_words,
    title,
    unsaid,
)

MOST_LINKS = 30
MOST_CALCULATIONS = 200
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
    """One finding in words and links; readings by batch, as (batch, [(row, target)])."""

    anchor: str
    id: str
    title: str
    text: str
    facts: list[tuple[str, str]]
    readings: list[tuple[str, list[tuple[str, str]]]]
    more_readings: str
    rivals: View | None
    alone: str
    next_check: str
    impact: View | None
    unmoved: str
    picture: Picture | None


def picture(drawn: Drawn) -> Picture:
    """A picture as data, so that the page needs no other file."""
    uri = "data:image/svg+xml;base64," + base64.b64encode(drawn.svg).decode("ascii")
    return Picture(uri, drawn.alt, drawn.caption, drawn.heading, f"plots/{drawn.name}.png")


def sections(audit: Audit, lookups: Lookups, drawn: list[Drawn]) -> list[Section]:
    """One section a finding about readings, most supported first."""
    pictures = {d.finding: picture(d) for d in drawn if d.finding >= 0}
    on_page = set(shown_rows(lookups).tolist())
    labels = {stock.lot: stock for stock in stocks(audit) if stock.lot}
    return [
        _section(audit, lookups, finding, i, pictures.get(i), on_page, labels)
        for i, finding in lookups.faults[:MOST_SECTIONS]
    ]


def _section(
    audit: Audit,
    lookups: Lookups,
    finding: Finding,
    index: int,
    own: Picture | None,
    on_page: set[int],
    labels: dict[str, Stock],
) -> Section:
    facts = unsaid(finding)
    if finding.subject_type == "lot" and isinstance(finding.subject, str) and plain(finding.subject) in labels:
        stock = labels[plain(finding.subject)]
        facts.insert(0, ("On the label", f"{stock.substance}; {stock.hazard}"))
    onset = lookups.before_onset(finding)
    if onset is not None:
        facts.append(("Last reading before", f"{moment(lookups.times[onset])}, {lookups.place_words(onset)}"))
    rows = sorted(int(i) for i in finding.readings)
    shown = rows[:MOST_LINKS]
    by_batch: dict[str, list[tuple[str, str]]] = {}
    for i in shown:
        target = row_id(i) if i in on_page else ""
        name = str(lookups.batch[i])
        short_name = name if len(name) <= 24 else f"{name[:23]}…"
        if not audit.records.readings["batch"][i]:
            short_name = f"known solution {short_name}"
        by_batch.setdefault(short_name, []).append((lookups.row_words(i), target))
    more = len(rows) - len(shown)
    name = anchor(finding, index)
    return Section(
        name,
        plain(finding.id),
        title(finding),
        lead(finding),
        facts,
        list(by_batch.items()),
        f"and {more:,} more; filter the residuals for {plain(finding.id)}." if more > 0 else "",
        _rivals(finding, name),
        _alone(finding),
        plain(finding.next_check),
        moved(audit, lookups, finding, name, on_page),
        unmoved(audit, finding),
        own,
    )


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


def _alone(finding: Finding) -> str:
    """What stands in place of rivals."""
    if not finding.also:
        return "No other explanation comes within reach of this one."
    alike = listed([plain(a) for a in finding.also], 8)
    return f"pH cannot tell it from {alike}. No further explanation comes within reach."


def _without_blank(headings: list[tuple[str, str]], rows: list[Row]) -> tuple[list[tuple[str, str]], list[Row]]:
    """The same table without columns that hold nothing but dashes."""
    kept = [k for k in range(len(headings)) if any(row.cells[k].text != "–" for row in rows)]
    return [headings[k] for k in kept], [Row(r.id, r.flagged, [r.cells[k] for k in kept]) for r in rows]


def overview(lookups: Lookups) -> View | None:
    """All findings about readings in one table, each leading to its section."""
    if not lookups.faults:
        return None
    rows = []
    for place, (i, finding) in enumerate(lookups.faults):
        ident = plain(finding.id)
        link = ((ident, anchor(finding, i)),) if place < MOST_SECTIONS else ()
        solutions = {str(lookups.batch[int(k)]) for k in finding.readings} - {""}
        rows.append(
            Row(
                "",
                False,
                [
                    Cell(ident, "", link),
                    text_cell(title(finding)),
                    text_cell(quantity(finding) or "–"),
                    Cell(interval(finding) or "–", "s"),
                    Cell(_since(finding), "s"),
                    Cell(f"{len(finding.readings):,}", "n"),
                    Cell(f"{len(solutions):,}", "n"),
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
        ("Since", ""),
        ("Readings", "n"),
        ("Solutions", "n"),
        ("Would change place in limits", "n"),
        ("What else it could be", ""),
    ]
    headings, rows = _without_blank(headings, rows)
    return View("findings-table", "Findings, most supported first", headings, rows, tool=len(rows) > 8)


def _since(finding: Finding) -> str:
    """The day of the onset; a meter's or a probe's fault without one holds from the beginning."""
    if finding.since is None:
        return "–" if finding.subject_type in TIMELESS else "whole record"
    return moment(finding.since)[:10]


def calculated(lookups: Lookups) -> View | None:
    """The record's own calculated pH where it is off: a line a batch."""
    if not lookups.calculations:
        return None
    rows = [
        Row(anchor(f, i), False, [Cell(plain(f.id)), Cell(quantity(f), "n"), Cell(plain(f.text), "long")])
        for i, f in lookups.calculations[:MOST_CALCULATIONS]
    ]
    left = len(lookups.calculations) - len(rows)
    note = f"and {left:,} more in findings.json" if left > 0 else ""
    headings = [("Finding", ""), ("Off by", "n"), ("In words", "long")]
    return View("calculated", "Calculated pH in the record that is off", headings, rows, note, tool=False)
