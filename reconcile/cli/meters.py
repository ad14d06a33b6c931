"""reconcile meters: each meter and probe through time."""

from __future__ import annotations

import typer

from reconcile.cli.audit import DEFAULT_FOLDER
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


def meters(
    files: Files,
    out: Out = None,
    replace: Replace = False,
    json: Json = False,
    quiet: Quiet = False,
    settings: SettingsFile = None,
    columns: ColumnsFile = None,
    strict: Strict = False,
    debug: Debug = False,
) -> None:
    """Follow each meter and probe through time.

    Calibration slopes and offsets against limits, with drift rates and the dates on which a line crosses a limit; steps
    that nobody logged; residuals against days since calibration; the noise of each meter and its agreement with the
    others. Calibrations alone are enough, and so are readings of known solutions. Writes a report folder and prints its
    gist. A date of crossing does not extend a calibration interval.
    """
    from reconcile import pipeline
    from reconcile.cli.printed import after_writing
    from reconcile.cli.progress import progress_bar
    from reconcile.records.completeness import shortfalls
    from reconcile.reporter.plain import folder_name
    from reconcile.reporter.write import check_place, write_report

    folder = out or DEFAULT_FOLDER / folder_name(f"{files[0].stem}_meters")
    check_place(folder, replace)
    with progress_bar(quiet) as progress:
        found = pipeline.meters(*files, settings=settings, columns=columns, progress=progress)
        write_report(found, folder, replace=replace, progress=progress)
    with after_writing(folder):
        if json:
            from reconcile.reporter.meter_json import meter_json

            print(meter_json(found), end="")
        else:
            from reconcile.cli import show_meters

            show_meters.show(found, folder)
    raise typer.Exit(exit_code(flagged=found.flagged, strict=strict, incomplete=bool(shortfalls(found.records))))


def add_to(app: typer.Typer) -> None:
    app.command(
        epilog=example(
            "reconcile meters sample_data/solution_room.xlsx --out reports/solution_room_meters --replace",
            "reconcile meters calibrations.csv events.csv --settings site.toml --strict",
        )
    )(meters)
