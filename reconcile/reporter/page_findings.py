"""A finding as its section of the page shows it."""

from __future__ import annotations

import base64
from dataclasses import dataclass

import numpy as np

from reconcile.records.book import Table as Records
from reconcile.records.results import Audit, Finding
from reconcile.reporter.drawn import Drawn
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.page_tables import Cell, Row, View, anchor, row_id, shown_rows, text_cell
from reconcile.reporter.plain import plain
from reconcile.reporter.stocks import Stock, stocks
from reconcile.reporter.words import (
    counted,
    explains_words,
    half_up,
    interval,
    lead,
    listed,
    minus,
    moment,
    quantity,
    rival_words,
    signed,
    since_words,
    title,
    unsaid,
)

MOST_LINKS = 30
MOST_IMPACT = 40
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
    next_check: str
    impact: View | None
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
        plain(finding.next_check),
        _impact(audit, lookups, finding, name, on_page),
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
        where = lookups.place_words(i)
        target = ((where, row_id(i)),) if i in on_page else ()
        share = shift.get(i, finding.estimate or np.nan)
        rows.append(
            Row(
                "",
                False,
                [
                    Cell(where, "", target),
                    text_cell(str(lookups.batch[i])),
                    text_cell(str(lookups.meter[i])),
                    Cell(minus(half_up(float(readings["ph"][i]), int(lookups.decimals[i]))), "n"),
                    Cell(digits(readings["low_limit"][i], i), "n"),
                    Cell(digits(readings["high_limit"][i], i), "n"),
                    Cell(signed(half_up(share, 3)), "n"),
                    Cell(_place(readings, i, 0.0), "s"),
                    Cell(_place(readings, i, share), "s"),
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
        ("As read", ""),
        ("Without that share", ""),
    ]
    more = len(chosen) - MOST_IMPACT
    note = f"and {counted(more, 'more reading')} in findings.json" if more > 0 else ""
    caption = f"Readings that would change their place in or out of limits if {plain(finding.id)} holds"
    return View(f"{name}-impact", caption, headings, rows, note, tool=False)


def _place(readings: Records, i: int, share: float) -> str:
    """Where a reading lies against its limits, less what a finding accounts for [pH]."""
    value = float(readings["ph"][i]) - share
    if not np.isfinite(value):
        return "–"
    if value < float(readings["low_limit"][i]):
        return "below"
    return "above" if value > float(readings["high_limit"][i]) else "inside"


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
                    Cell(moment(finding.since)[:10] or "–", "s"),
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
        ("Limits concerned", "n"),
        ("What else it could be", ""),
    ]
    headings, rows = _without_blank(headings, rows)
    return View("findings-table", "Findings, most supported first", headings, rows, tool=len(rows) > 8)


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
