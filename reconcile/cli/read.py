"""reconcile read: how the files are understood."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from reconcile.cli.exits import exit_code
from reconcile.cli.options import ColumnsFile, Debug, Files, Json, Quiet, SettingsFile, Strict, example

WriteColumns = Annotated[
    Path | None,
    typer.Option(
        "--write-columns",
        metavar="FILE.toml",
        help="Write a column map to fill in: every heading, and the column it was taken for.",
    ),
]


def read(
    files: Files,
    write_columns: WriteColumns = None,
    json: Json = False,
    quiet: Quiet = False,
    settings: SettingsFile = None,
    columns: ColumnsFile = None,
    strict: Strict = False,
    debug: Debug = False,
) -> None:
    """Show how the files are understood.

    Which sheets and heading rows were recognised, what each column was taken for and in which unit, and which rows are
    set aside and why. Writes no report.
    """
    from reconcile import pipeline
    from reconcile.cli import show_record
    from reconcile.cli.progress import progress_bar
    from reconcile.cli.show import say
    from reconcile.records.completeness import shortfalls

    if write_columns:
        pipeline.write_columns(write_columns, *files, settings=settings, columns=columns)
        say(f"Column map written to {write_columns}.", quiet)
    with progress_bar(quiet) as progress:
        progress("reading the record", 0.0)
        records = pipeline.read(*files, settings=settings, columns=columns)
    if json:
        from reconcile.cli.print_json import print_json

        print_json(show_record.document(records))
    else:
        show_record.show(records)
    aside = any(not row.summary for row in records.set_aside)
    raise typer.Exit(exit_code(flagged=aside, strict=strict, incomplete=bool(shortfalls(records))))


def add_to(app: typer.Typer) -> None:
    app.command(
        epilog=example(
            "reconcile read sample_data/solution_room.xlsx",
            "reconcile read readings.csv recipes.csv --write-columns columns.toml",
        )
    )(read)
