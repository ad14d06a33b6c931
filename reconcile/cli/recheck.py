"""reconcile recheck: whether a report still holds."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from reconcile.cli.exits import DIFFERENT, DONE
from reconcile.cli.options import Debug, Json, Quiet, example

Folder = Annotated[Path, typer.Argument(metavar="FOLDER", help="Folder of the report.", show_default=False)]
Inputs = Annotated[
    list[Path] | None,
    typer.Argument(
        metavar="FILE",
        help="The inputs, or folders that hold them, where they no longer lie where they lay.",
        show_default=False,
    ),
]


def recheck(
    folder: Folder, files: Inputs = None, json: Json = False, quiet: Quiet = False, debug: Debug = False
) -> None:
    """Recompute a report from its inputs and compare.

    Every file of the report is computed again from the inputs that its manifest names by their SHA-256, with its
    settings, and compared figure by figure: what was changed shows even where the manifest was changed with it. Writes
    nothing. Exits with 5 where an input, a file or a figure no longer holds.
    """
    from reconcile.cli.progress import progress_bar
    from reconcile.replay import recheck as again

    with progress_bar(quiet) as progress:
        found = again(folder, *(files or ()), progress=progress)
    from reconcile.cli import show_recheck

    if json:
        from reconcile.cli.print_json import print_json

        print_json(show_recheck.document(found))
    else:
        show_recheck.show(found)
    raise typer.Exit(DONE if found.holds else DIFFERENT)


def add_to(app: typer.Typer) -> None:
    app.command(
        epilog=example("reconcile recheck reports/solution_room", "reconcile recheck reports/march archive/2025-03")
    )(recheck)
