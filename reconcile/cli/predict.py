"""reconcile predict: the pH that a recipe should have."""

from __future__ import annotations

from typing import Annotated

import typer

from reconcile.cli.exits import exit_code
from reconcile.cli.options import Debug, Json, Quiet, SettingsFile, Strict, example

Parts = Annotated[
    list[str],
    typer.Argument(
        metavar="PART",
        help='What is in the solution: a final concentration ("0.1 M acetic acid"), or a quantity taken of a '
        'substance or a stock solution ("25 mL of 0.1 M sodium hydroxide").',
        show_default=False,
    ),
]
To = Annotated[str, typer.Option("--to", metavar="TOTAL", help='What quantities are made up to, such as "100 mL".')]
At = Annotated[
    str, typer.Option("--at", metavar="°C", help="Temperature of the solution [default: 25].", show_default=False)
]
Model = Annotated[
    str,
    typer.Option("--model", metavar="NAME", help="Activity model, as in the settings [default: bates-guggenheim]."),
]


TrailOption = Annotated[
    bool,
    typer.Option(
        "--trail",
        help="Add the calculation: molalities, constants with sources, every species, the budget, hand methods.",
    ),
]


def predict(
    parts: Parts,
    to: To = "",
    at: At = "",
    model: Model = "",
    trail: TrailOption = False,
    json: Json = False,
    quiet: Quiet = False,
    settings: SettingsFile = None,
    strict: Strict = False,
    debug: Debug = False,
) -> None:
    """Predict the pH of a solution.

    With its standard uncertainty and where that comes from, ionic strength, buffer capacity, degree of ionization, and
    the hazard words recorded for each substance.
    """
    from reconcile import pipeline
    from reconcile.cli import show_prediction
    from reconcile.records.parts import parse_temperature

    temperature = parse_temperature(at) if at else pipeline.DEFAULT_TEMPERATURE_C
    predicted = pipeline.predict_parts(parts, to, temperature, settings, model)
    laid_open = predicted.trail() if trail else None
    if json:
        from reconcile.cli.print_json import print_json

        document = show_prediction.document(predicted)
        if laid_open is not None:
            from reconcile.cli import show_trail

            document["trail"] = show_trail.document(laid_open)
        print_json(document)
    else:
        from reconcile.cli.show import say

        say(f"No --at was given; predicted at {temperature:g} °C.", quiet or bool(at))
        show_prediction.show(predicted)
        if laid_open is not None:
            from reconcile.cli import show_trail

            show_trail.show(laid_open, predicted)
    raise typer.Exit(exit_code(flagged=str(predicted.prediction.status[0]) != "ok", strict=strict))


def add_to(app: typer.Typer) -> None:
    app.command(
        epilog=example(
            'reconcile predict "0.1 M acetic acid" "25 mL of 0.1 M sodium hydroxide" --to "100 mL" --at 20',
            'reconcile predict "2.05 g sodium acetate trihydrate" "5 mL of 1 M HCl" --to "250 mL" --json',
            'reconcile predict "0.05 mol/kg potassium hydrogen phthalate" --trail',
        )
    )(predict)
