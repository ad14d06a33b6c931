"""reconcile substances: the library, with constants and sources."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from reconcile.cli.exits import DONE, REFUSED
from reconcile.cli.options import Debug, Json, example

Word = Annotated[
    str,
    typer.Argument(metavar="WORD", help="A name, synonym or formula, or a part of a name [default: everything]."),
]


Add = Annotated[
    Path | None,
    typer.Option(
        "--add",
        metavar="FILE.toml",
        help="Check a site's own substances and keep a copy in the user's configuration; every later run knows them.",
    ),
]
Beside = Annotated[
    Path | None,
    typer.Option("--beside", metavar="DIR", help="Keep the copy beside a record instead, as substances.toml."),
]
ReplaceCopy = Annotated[bool, typer.Option("--replace", help="Replace a copy that is already there.")]


def substances(
    word: Word = "",
    add: Add = None,
    beside: Beside = None,
    replace: ReplaceCopy = False,
    json: Json = False,
    debug: Debug = False,
) -> None:
    """List the substances of the library, or add a site's own.

    Formula, molar mass, names, and the hazard words recorded; for each acid its pKa with uncertainty and source, weak
    values marked.

    A file of a site's own substances holds tables [[substance]] with name, formula, source, and where they apply acid,
    protons_removed, acid_units, ions (such as {"Na+" = 1}), synonyms, molar_mass, hazard, note; and for each acid that
    the library lacks [[acid]] with name and charge (of the fully protonated form), with [[acid.step]] tables of pka
    (25 °C, ionic strength 0), u (standard uncertainty), source, and if known enthalpy (kJ/mol) and heat_capacity
    (J/(K mol)).
    """
    from reconcile import pipeline
    from reconcile.cli import show_substances

    if add is None and (beside is not None or replace):
        raise typer.BadParameter("--beside and --replace go with --add FILE.toml")
    if add is not None and word:
        raise typer.BadParameter("--add takes a file, not a word as well")
    if add is not None:
        from reconcile.records.own_substances import keep

        own, where = keep(add, beside, replace)
        names = [form.name for form in own.forms]
        if json:
            from reconcile.cli.print_json import print_json

            print_json({"kept": str(where), "substances": names})
        else:
            show_substances.kept(names, str(where))
        raise typer.Exit(DONE)
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
    app.command(
        epilog=example(
            "reconcile substances phosphate",
            "reconcile substances Na2HPO4 --json",
            "reconcile substances --add our_substances.toml",
        )
    )(substances)
