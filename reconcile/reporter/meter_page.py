"""meters.html: meters and probes through time on one page that works offline and loads nothing."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from markupsafe import Markup

from reconcile import __version__
from reconcile.records.meter_results import MeterHistory
from reconcile.records.rounding import chance_words
from reconcile.reporter import meter_tables, page_findings, summaries
from reconcile.reporter.cautions import CAUTIONS, FORMULA_NOTE, ROUNDING_NOTE, SHORT_CAUTION, UNSIGNED
from reconcile.reporter.drawn import Drawn
from reconcile.reporter.manifest import inputs, report_id
from reconcile.reporter.meter_gist import NO_LEAVE, meter_gist
from reconcile.reporter.page_scope import notes, sheets_view
from reconcile.reporter.page_tables import Cell, View, capped, set_aside_view, view
from reconcile.reporter.tables import Column
from reconcile.reporter.to_html import asset, digest, environment
from reconcile.reporter.words import counted

METERS = "meters"
"""The command that makes this report."""
MOST_ROWS = 400
MOST_TEXTS = 60
LINES_ON_PAGE = (
    "subject", "probe", "quantity", "unit", "begun_by", "first", "last", "calibrations", "outside", "at_last",
    "rate_30d", "rate_low", "rate_high", "robust_30d", "sd", "reason",
)  # fmt: skip
"""Without the interval of the Theil–Sen rate, so that the table fits a screen; lines.csv holds it."""

CROSSINGS_ON_PAGE = (
    "subject", "probe", "quantity", "limit", "unit", "counted", "at", "earliest", "latest", "ahead",
)  # fmt: skip


def meter_page(history: MeterHistory, drawn: Sequence[Drawn]) -> bytes:
    """The page as bytes; `drawn` holds the pictures, whose SVG goes into it."""
    identity = report_id(history, METERS)
    style = asset("report.css").replace("REPORT-ID", identity)
    script = asset("report.js")
    pictures = {d.name: page_findings.picture(d) for d in drawn}
    messages, more_messages = notes(history)

    def table(build: str, caption: str, keys: Sequence[str] | None = None) -> View:
        made = getattr(meter_tables, build)(history)
        rest = f"{made.name}.csv holds all."
        return capped(made, made.name.replace("_", "-"), caption, rest, MOST_ROWS, keys, _in_few_words)

    text = environment().get_template("meters.html").render(
        report_id=identity,
        version=__version__,
        policy=f"default-src 'none'; img-src data:; style-src '{digest(style)}'; script-src '{digest(script)}'; "
        "base-uri 'none'; form-action 'none'",
        style=Markup(style),  # our own files, nothing of the record
        script=Markup(script),
        short_caution=SHORT_CAUTION,
        gist=meter_gist(history),
        limits=view(meter_tables.limits(history), "limits", "Limits of slope and offset", tool=False),
        courses=[p for name, p in pictures.items() if name.startswith("calibrations_")],
        lines=table("lines", "Lines through calibrations", LINES_ON_PAGE),
        crossings=_dated(history),
        any_crossing=bool(history.crossings),
        undated=_undated(history),
        reached=[x.text for x in history.crossings if x.limit.judged and not (x.ahead and np.isnat(x.at))][:MOST_TEXTS],
        steps=table("steps", "Unlogged steps between calibrations"),
        findings=_findings(history),
        residuals_time=pictures.get("residuals_time"),
        since_calibration=pictures.get("since_calibration"),
        meters=table("meters", "Meters"),
        agreement_picture=pictures.get("agreement"),
        agreement=table("agreement", "Agreement of the meters"),
        not_shown=history.not_shown,
        set_aside=set_aside_view(history) if history.records.set_aside else None,
        method=paragraphs(history),
        no_leave=NO_LEAVE,
        settings=view(summaries.settings(history), "settings", "Settings", tool=False),
        inputs=inputs(history),
        sheets=sheets_view(history),
        messages=messages,
        more_messages=more_messages,
        cautions=CAUTIONS,
        unsigned=UNSIGNED,
    )  # fmt: skip
    return text.encode("utf-8")


def _in_few_words(column: Column, _row: int, text: str) -> Cell | None:
    """Days of calibrations without the time of day, chances in words: the CSV files hold both in full."""
    if column.key in ("first", "last"):
        return Cell(text[:10], "t")
    return Cell(chance_words(float(text)), "s") if column.key == "family_wise_p" and text else None


def _dated_rows(history: MeterHistory) -> list[int]:
    dates = ((x.at, x.earliest, x.latest) for x in history.crossings)
    return [i for i, found in enumerate(dates) if not all(np.isnat(date) for date in found)]


def _dated(history: MeterHistory) -> View:
    """The crossings that have a date."""
    dated = meter_tables.crossings(history).rows(np.array(_dated_rows(history), np.intp))
    return capped(
        dated, "crossings", "When lines cross limits", "crossings.csv holds all.", MOST_ROWS, CROSSINGS_ON_PAGE
    )


def _undated(history: MeterHistory) -> str:
    """How many lines have no date of crossing, and why that may be."""
    number = len(history.crossings) - len(_dated_rows(history))
    if not number:
        return ""
    return (
        f"No date is given for {counted(number, 'pair')} of line and limit: the line does not reach the limit "
        "within twice the length of its calibrations, or its rate cannot be told from zero. crossings.csv says which."
    )


def _findings(history: MeterHistory) -> View | None:
    """The audit's findings about meters, in the form of the audit's own table."""
    if history.audit is None or not history.findings:
        return None
    own = summaries.findings(replace(history.audit, findings=history.findings))
    return view(
        own, "findings", "Findings about meters", keys=("id", "what", "text", "rivals", "next_check"), tool=False
    )


def paragraphs(history: MeterHistory) -> list[str]:
    """The method in short paragraphs."""
    return [
        "The calibrations of a meter are parted where an event is logged for it or its probe, where the probe changes, "
        "and where slope or offset steps without a logged event (the likeliest date in a line with a step, the chance "
        "of which, over all dates, meters and quantities looked at, is below 5 %). A probe calibrated on several "
        "meters is followed as well.",
        "Each part gets a line by least squares, with the 95 % interval of its rate by Student’s law, and beside it "
        "the median of all pairwise rates (Theil 1950, Sen 1968), which single wild calibrations do not move. The "
        "scatter about the line is never taken as less than that of the decimals recorded. Successive calibrations "
        "are taken as independent; where they are not, the intervals are too short.",
        "The date of crossing is where the fitted line meets a limit; its interval holds all dates on which the limit "
        "lies inside the 95 % band of the line (Fieller 1954). A line is followed beyond the last calibration by twice "
        f"the length of its calibrations, no further. {NO_LEAVE} Single calibrations scatter about the line, so one "
        "may lie beyond a limit earlier.",
        "Residuals are observed minus predicted pH from the same prediction and the same joint model as an audit: the "
        "rate against days since calibration, the noise and the means of the meters allow for sessions, stock lots, "
        "preparation and constants, and findings about other subjects are taken out. Readings within a session are "
        "not taken as independent.",
        "h and k are those of ISO 5725-2, computed from residuals so that a difference in temperature is no "
        "disagreement, from four meters on. Their 5 % and 1 % values come from the exact laws (Wilrich 2013, "
        "doi:10.1007/s10182-011-0185-y), for k with each meter’s own number of readings; h takes the means of all "
        "meters as equally well known, and is left out where they lie within a step of the display. The robust centre "
        "and its standard deviation follow Algorithm A (ISO 13528, Annex C). With many solutions some values lie "
        "beyond 1 % by chance; one meter beyond on most of them is what to look for.",
        ROUNDING_NOTE,
        FORMULA_NOTE,
    ]
