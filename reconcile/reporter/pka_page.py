"""report.html of a fit of ionization constants: one page that works offline and loads nothing."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from markupsafe import Markup

from reconcile import __version__
from reconcile.records.pka_results import PkaFit
from reconcile.reporter import page_findings, pka_tables, summaries
from reconcile.reporter.cautions import CAUTIONS, SHORT_CAUTION, UNSIGNED
from reconcile.reporter.drawn import Drawn
from reconcile.reporter.manifest import inputs, report_id
from reconcile.reporter.page_scope import notes, sheets_view
from reconcile.reporter.page_tables import Cell, View, set_aside_view, view
from reconcile.reporter.pka_gist import command, hazard_lines, pka_gist
from reconcile.reporter.pka_method import paragraphs
from reconcile.reporter.plain import plain
from reconcile.reporter.tables import Column, Table, table_of
from reconcile.reporter.to_html import asset, digest, environment

MOST_READINGS = 2000
READINGS_ON_PAGE = (
    "source", "sheet", "row", "batch", "series", "titrant_added", "meter", "temperature_C", "base_per_acid",
    "ionic_strength", "pH_observed", "pH_fitted", "residual", "studentised", "leverage", "status",
)  # fmt: skip
WHERE_SAID = ("source", "sheet", "batch", "series", "meter")
"""Shown on the page only where they tell rows apart; readings.csv holds every column."""


def pka_page(fit: PkaFit, drawn: Sequence[Drawn]) -> bytes:
    """The page as bytes; `drawn` holds the pictures, whose SVG goes into it."""
    identity = report_id(fit, command(fit))
    style = asset("report.css").replace("REPORT-ID", identity)
    script = asset("report.js")
    pictures = {d.name: page_findings.picture(d) for d in drawn}
    messages, more_messages = notes(fit)
    text = environment().get_template("pka.html").render(
        report_id=identity,
        version=__version__,
        policy=f"default-src 'none'; img-src data:; style-src '{digest(style)}'; script-src '{digest(script)}'; "
        "base-uri 'none'; form-action 'none'",
        style=Markup(style),  # our own files, nothing of the record
        script=Markup(script),
        short_caution=SHORT_CAUTION,
        acid=plain(fit.acid),
        gist=pka_gist(fit),
        pictures=pictures,
        steps=_steps(fit),
        budget=_small(pka_tables.budget(fit), "budget"),
        numbers=_small(pka_tables.numbers(fit), "numbers"),
        series=_small(pka_tables.series(fit), "series"),
        candidates=_small(pka_tables.candidates(fit), "candidates"),
        readings=_readings(fit),
        set_aside=set_aside_view(fit) if fit.records.set_aside else None,
        hazards=view(
            table_of("hazards", "Hazard words", pka_tables.HAZARDS, hazard_lines(fit)), "hazards", "Hazard words",
            tool=False,
        ),
        method=paragraphs(fit),
        constants=_small(_constants(fit), "constants"),
        settings=view(summaries.settings(fit), "settings", "Settings", tool=False),
        command=plain(command(fit)),
        inputs=inputs(fit),
        sheets=sheets_view(fit),
        messages=messages,
        more_messages=more_messages,
        cautions=CAUTIONS,
        unsigned=UNSIGNED,
    )  # fmt: skip
    return text.encode("utf-8")


def _small(table: Table, table_id: str) -> View | None:
    return view(table, table_id, table.title, tool=False) if len(table) else None


def _steps(fit: PkaFit) -> View:
    """The steps with a fact a row, since there are more facts than steps."""
    table = pka_tables.steps(fit)
    whole = view(table, "steps", table.title, tool=False)
    names = ["Value" if len(fit.steps) == 1 else f"Step {step.step}" for step in fit.steps]
    columns = (Column("what", "Quantity", width=30), *(Column(f"s{i}", name, width=30) for i, name in enumerate(names)))
    rows = [
        [heading, *(_short(row.cells[at]) for row in whole.rows)]
        for at, (heading, _) in enumerate(whole.headings)
        if heading != "Step"
    ]
    turned = table_of("steps", "Ionization steps", columns, rows)
    return view(turned, "steps", "Ionization steps", tool=False)


def _short(cell: Cell) -> str:
    return cell.text


def _constants(fit: PkaFit) -> Table:
    rows = [(plain(c.acid), c.step, c.pka, c.u, c.enthalpy, c.heat_capacity, plain(c.source)) for c in fit.constants]
    return table_of("constants", "Constants of the library met", summaries.CONSTANTS, rows)


def _readings(fit: PkaFit) -> View:
    table = pka_tables.readings(fit)
    order = (fit.status != "rejected").argsort(kind="stable") if len(table) > MOST_READINGS else np.arange(len(table))
    keys = [k for k in READINGS_ON_PAGE if k not in WHERE_SAID or len(set(table.data[k])) > 1]

    def cell(column: Column, _row: int, text: str) -> Cell | None:
        return Cell(pka_tables.STATUSES.get(text, text), "status") if column.key == "status" else None

    if len(table) > MOST_READINGS:
        note = f"Shown are {MOST_READINGS:,} of {len(table):,} readings, those rejected first; readings.csv holds all."
        return view(table.rows(order[:MOST_READINGS]), "readings-table", "Readings", keys=keys, cells=cell, note=note)
    note = "readings.csv holds the same readings with all columns."
    return view(table, "readings-table", "Readings", keys=keys, cells=cell, note=note, tool=len(table) > 8)
