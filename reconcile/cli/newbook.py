"""reconcile newbook: an empty workbook for a new record."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from reconcile.cli.options import Debug, Json, Quiet, example

File = Annotated[Path, typer.Argument(metavar="FILE.xlsx", help="The workbook to make.", show_default=False)]
Filled = Annotated[bool, typer.Option("--filled", help="With the rows of the example in place, to try commands on.")]
ReplaceFile = Annotated[bool, typer.Option("--replace", help="Replace a file that is already there.")]


def newbook(
    file: File,
    filled: Filled = False,
    replace: ReplaceFile = False,
    json: Json = False,
    quiet: Quiet = False,
    debug: Debug = False,
) -> None:
    """Make a workbook for a new record.

    Empty sheets for readings, recipes, stocks, known solutions, meters, calibrations, events and titration series, with
    drop-down lists of substances and units, notes, and a filled example on a sheet of its own. A record may come in any
    other form too; see reconcile read.
    """
    if file.suffix.lower() != ".xlsx":
        raise typer.BadParameter(f"{file} does not end in .xlsx", param_hint="FILE.xlsx")
    from reconcile.cli.show import say
    from reconcile.reporter.newbook import SHEETS, write_newbook

    written = write_newbook(file, filled=filled, replace=replace)
    if json:
        from reconcile.cli.print_json import print_json

        print_json({"written": str(written), "filled": filled, "sheets": list(SHEETS.values())})
    else:
        print(written)
        say(f"Sheets: {', '.join(SHEETS.values())}; with Notes, an Example and Lists, which are not read.", quiet)


def add_to(app: typer.Typer) -> None:
    app.command(epilog=example("reconcile newbook record.xlsx", "reconcile newbook example.xlsx --filled"))(newbook)
