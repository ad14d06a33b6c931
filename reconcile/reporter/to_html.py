"""report.html: one file that works offline, is readable without script and loads nothing."""

from __future__ import annotations

import base64
import hashlib
import re
from functools import cache
from importlib.resources import files

from jinja2 import Environment, PackageLoader, StrictUndefined
from markupsafe import Markup, escape

from reconcile import __version__
from reconcile.records.results import Audit
from reconcile.reporter import method, page_findings, page_scope, summaries
from reconcile.reporter.adjusted import adjusted_table
from reconcile.reporter.cautions import CAUTIONS, SHORT_CAUTION, UNSIGNED
from reconcile.reporter.drawn import Drawn
from reconcile.reporter.gist import gist, silence_in_numbers
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.manifest import inputs, report_id
from reconcile.reporter.page_previous import previous_part
from reconcile.reporter.page_tables import anchor, capped, residual_view, set_aside_view, view
from reconcile.reporter.plain import plain
from reconcile.reporter.tables import Table
from reconcile.reporter.words import STATUS_MEANINGS, STATUSES

STOCKS_ON_PAGE = (
    "lot", "substance", "hazard", "strength", "u_strength", "readings", "mean_residual", "smallest_factor", "findings",
)  # fmt: skip
ELSEWHERE = ("meter_offset", "lot_strength")
"""Kinds whose smallest detectable size stands in the tables of meters and of stocks."""
_UNBROKEN = re.compile(r"\d{4}-\d\d-\d\d(?: \d\d:\d\d)?|[+−]?\d[\d,.]*(?: (?:%|pH|mL|°C))|\b\w{1,6}-\w{1,8}\b")


def prose(text: str) -> Markup:
    """Text escaped, its dates and quantities kept on one line."""
    parts, end = [], 0
    for found in _UNBROKEN.finditer(text):
        parts += [escape(text[end : found.start()]), Markup('<span class="s">{}</span>').format(found.group())]
        end = found.end()
    return Markup("").join([*parts, escape(text[end:])])


@cache
def environment() -> Environment:
    """The templates, with everything that they show escaped."""
    made = Environment(
        loader=PackageLoader("reconcile.reporter"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=True,
    )
    made.filters["prose"] = prose
    return made


def asset(name: str) -> str:
    """A file of the templates' folder, as text."""
    return (files("reconcile.reporter") / "templates" / name).read_text(encoding="utf-8")


def digest(text: str) -> str:
    """The hash by which the page's policy knows its own style and script."""
    return "sha256-" + base64.b64encode(hashlib.sha256(text.encode("utf-8")).digest()).decode("ascii")


def page(audit: Audit, lookups: Lookups, residuals: Table, drawn: list[Drawn]) -> bytes:
    """The page as bytes.

    residuals : the table that residuals.csv holds
    drawn : pictures, whose SVG goes into the page
    """
    identity = report_id(audit)
    style = asset("report.css").replace("REPORT-ID", identity)
    script = asset("report.js")
    targets = {plain(f.id): anchor(f, i) for i, f in enumerate(audit.findings)}
    messages, more_messages = page_scope.notes(audit)
    pictures = {d.name: page_findings.picture(d) for d in drawn if d.finding < 0}
    text = environment().get_template("report.html").render(
        report_id=identity,
        version=__version__,
        policy=f"default-src 'none'; img-src data:; style-src '{digest(style)}'; script-src '{digest(script)}'; "
        "base-uri 'none'; form-action 'none'",
        style=Markup(style),  # our own files, nothing of the record
        script=Markup(script),
        short_caution=SHORT_CAUTION,
        gist=gist(audit, lookups),
        anchors=targets,
        scope=page_scope.scope(audit, lookups),
        overview=page_findings.overview(lookups),
        calculated=page_findings.calculated(lookups),
        sections=page_findings.sections(audit, lookups, drawn),
        previous=previous_part(audit, targets),
        findings_left=max(len(lookups.faults) - page_findings.MOST_SECTIONS, 0),
        pictures=[p for name, p in pictures.items() if name != "smallest_detectable"],
        detectable_picture=pictures["smallest_detectable"] if audit.smallest_detectable else None,
        residuals=residual_view(audit, lookups, residuals, targets),
        statuses=[(STATUSES[s], meaning) for s, meaning in STATUS_MEANINGS.items() if (audit.status == s).any()],
        adjusted=capped(adjusted_table(audit), "adjusted", "Adjusted to a pH", "findings.json holds all.")
        if len(audit.records.solved)
        else None,
        set_aside=set_aside_view(audit) if audit.records.set_aside else None,
        not_testable=capped(
            summaries.not_testable(audit), "not-testable", "Not testable in this record", "findings.json holds all."
        ),
        silence=silence_in_numbers(audit),
        detectable=capped(
            summaries.detectable(audit, but=ELSEWHERE),
            "detectable",
            "Other smallest detectable faults",
            "findings.json holds all.",
        ),
        meters=capped(summaries.meters(audit, lookups), "meters", "Meters", "residuals.xlsx holds all."),
        stocks=capped(
            summaries.stock_table(audit, lookups),
            "stocks",
            "Stocks, with the hazard words recorded for them",
            "residuals.xlsx holds all, with their hazard words.",
            keys=STOCKS_ON_PAGE,
        ),
        method=method.paragraphs(audit),
        settings=view(summaries.settings(audit), "settings", "Settings", tool=False),
        spreads=view(summaries.spreads(audit), "spreads", "Spreads the record was judged by", tool=False),
        constants=view(summaries.constants(audit), "constants", "Ionization constants met", tool=False),
        inputs=inputs(audit),
        sheets=page_scope.sheets_view(audit),
        messages=messages,
        more_messages=more_messages,
        cautions=CAUTIONS,
        unsigned=UNSIGNED,
    )  # fmt: skip
    return text.encode("utf-8")
