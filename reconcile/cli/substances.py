"""reconcile substances: the library, with constants and sources."""

from __future__ import annotations

from typing import Annotated

import typer

from reconcile.cli.exits import DONE, REFUSED
from reconcile.cli.options import Debug, Json, example

Word = Annotated[
    str,
    typer.Argument(metavar="WORD", help="A name, synonym or formula, or a part of a name [default: everything]."),
]


def substances(word: Word = "", json: Json = False, debug: Debug = False) -> None:
    """List the substances of the library.

    Formula, molar mass, names, and the hazard words recorded; for each acid its pKa with uncertainty and source, weak
    values marked.
    """
    from reconcile import pipeline
    from reconcile.cli import show_substances

    answer = pipeline.substances(word)
    if json:
        from reconcile.cli.print_json import print_json

        print_json(show_substances.document(answer, word))
    elif answer.entries:
        show_substances.show(answer, word)
    if not answer.entries:
        show_substances.suggest(answer, word)
    raise typer.Exit(DONE if answer.entries else REFUSED)


def add_to(app: typer.Typer) -> None:
    app.command(epilog=example("reconcile substances phosphate", "reconcile substances Na2HPO4 --json"))(substances)
