"""pka.xlsx: the tables of a fit with a spreadsheet's own manners."""

from __future__ import annotations

import numpy as np

from reconcile import __version__
from reconcile.records.arrays import IntArray
from reconcile.records.pka_results import PkaFit
from reconcile.reporter import pka_tables, summaries
from reconcile.reporter.cautions import CAUTIONS, UNSIGNED
from reconcile.reporter.manifest import inputs, report_id
from reconcile.reporter.pka_gist import command, hazard_lines, pka_gist
from reconcile.reporter.pka_method import paragraphs
from reconcile.reporter.plain import plain
from reconcile.reporter.tables import Table, table_of
from reconcile.reporter.to_xlsx import Book, add_table

MOST_ROWS = 20_000
"""Readings up to which the workbook holds them all."""


def method_table(fit: PkaFit) -> Table:
    """What the Method sheet says, a line each."""
    rows = [
        ("Report id (from inputs, settings and version)", report_id(fit, command(fit))),
        ("Version", f"reconcile {__version__}"),
        ("Command", plain(command(fit))),
        *((f"Input: {i['name']}", f"SHA-256 {i['sha256']}") for i in inputs(fit)),
        *((line.label, line.text) for line in pka_gist(fit)),
        *(("Method", text) for text in paragraphs(fit)),
        *((f"Hazard words: {name}", words) for name, words in hazard_lines(fit)),
        *(("Caution", text) for text in (*CAUTIONS, UNSIGNED)),
    ]
    return table_of("method", "Method", pka_tables.METHOD, rows)


def pka_workbook(fit: PkaFit) -> bytes:
    """The whole workbook as bytes."""
    footer = f"Report {report_id(fit, command(fit))}, reconcile {__version__}"
    book = Book("Ionization constants from pH readings", footer)
    add_table(book, "Steps", pka_tables.steps(fit))
    readings = pka_tables.readings(fit)
    if len(readings) > MOST_ROWS:
        kept = readings.rows(readings_first(fit))
        add_table(book, "Readings", kept, f"The first {MOST_ROWS:,} of {len(readings):,}; readings.csv holds all.")
    else:
        add_table(book, "Readings", readings)
    add_table(book, "Budget", pka_tables.budget(fit))
    add_table(book, "Candidates", pka_tables.candidates(fit))
    if fit.series:
        add_table(book, "Series", pka_tables.series(fit))
    if fit.steps_chosen:
        add_table(book, "Number of steps", pka_tables.numbers(fit))
    add_table(book, "Set aside", pka_tables.set_aside(fit))
    add_table(book, "Settings", summaries.settings(fit))
    add_table(book, "Method", method_table(fit))
    return book.close()


def readings_first(fit: PkaFit) -> IntArray:
    """Rows of the readings that a large workbook keeps: those rejected first, then file order."""
    order: IntArray = np.argsort(fit.status != "rejected", kind="stable")
    return order[:MOST_ROWS]
