"""reconcile audit: the report on a record."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from reconcile.cli.exits import exit_code
from reconcile.cli.options import (
    ColumnsFile,
    Debug,
    Files,
    Json,
    Out,
    Quiet,
    Replace,
    SettingsFile,
    Strict,
    example,
)

DEFAULT_FOLDER = Path("reports")
Previous = Annotated[
    Path | None,
    typer.Option(
        "--previous",
        metavar="FOLDER",
        help="An earlier report; says which findings are new, which persist and which are gone since.",
    ),
]


def audit(
    files: Files,
    out: Out = None,
    replace: Replace = False,
    json: Json = False,
    quiet: Quiet = False,
    settings: SettingsFile = None,
    columns: ColumnsFile = None,
    strict: Strict = False,
    previous: Previous = None,
    debug: Debug = False,
) -> None:
    """Audit a record and write its report.

    Every reading is compared with the pH that its recipe predicts; what stands out is put down to the meter, stock lot,
    preparation or entry that most likely caused it. Writes the report folder and prints the gist.
    """
    from reconcile import pipeline
    from reconcile.cli.printed import after_writing
    from reconcile.cli.progress import progress_bar
    from reconcile.records.completeness import shortfalls
    from reconcile.reporter.plain import folder_name
    from reconcile.reporter.previous import read_previous, since_previous
    from reconcile.reporter.write import check_place, write_report

    folder = out or DEFAULT_FOLDER / folder_name(files[0].stem)
    check_place(folder, replace)
    then = read_previous(previous) if previous is not None else None
    with progress_bar(quiet) as progress:
        found = pipeline.audit(*files, settings=settings, columns=columns, progress=progress)
        found = since_previous(found, then) if then is not None else found
        write_report(found, folder, replace=replace, progress=progress)
    with after_writing(folder):
        if json:
            from reconcile.reporter.to_json import gist_json

            print(gist_json(found), end="")
        else:
            from reconcile.cli import show_audit

            show_audit.show(found, folder)
    raise typer.Exit(exit_code(flagged=bool(found.findings), strict=strict, incomplete=bool(shortfalls(found.records))))


def add_to(app: typer.Typer) -> None:
    app.command(
        epilog=example(
            "reconcile audit sample_data/solution_room.xlsx --out reports/solution_room --replace",
            "reconcile audit readings.csv recipes.csv --settings site.toml --strict",
            "reconcile audit april.xlsx --previous reports/march",
        )
    )(audit)
