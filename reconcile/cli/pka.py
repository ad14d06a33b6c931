"""reconcile pka: the ionization constants of one acid from pH readings."""

from __future__ import annotations

from typing import Annotated

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

Acid = Annotated[
    str,
    typer.Option(
        "--acid",
        metavar="NAME",
        help="The acid or base: of the library, or an unfamiliar one as the record names it.",
        show_default=False,
    ),
]
Steps = Annotated[
    int | None,
    typer.Option(
        "--steps",
        metavar="1..3",
        help="Number of ionization steps of an unfamiliar acid [default: chosen by AICc].",
        show_default=False,
    ),
]
Charge = Annotated[
    int | None,
    typer.Option(
        "--charge",
        metavar="0..2",
        help="Charge of its fully protonated form [default: 0].",
        show_default=False,
    ),
]
Removed = Annotated[
    float | None,
    typer.Option(
        "--protons-removed",
        metavar="NUMBER",
        help="Protons that the substance as weighed has lost from that form [default: 0].",
        show_default=False,
    ),
]
CounterIon = Annotated[
    str,
    typer.Option(
        "--counter-ion",
        metavar="NAME:n",
        help="Counter-ion of the substance as weighed, and its number: sodium:1, chloride:1, maleate:1.",
        show_default=False,
    ),
]
MolarMass = Annotated[
    float | None,
    typer.Option(
        "--molar-mass",
        metavar="G/MOL",
        help="Molar mass of the substance as weighed, for amounts by mass.",
        show_default=False,
    ),
]
Free = Annotated[
    list[str] | None,
    typer.Option(
        "--free",
        metavar="strength|offset",
        help="Seek the strength of the acid, or the offset of the meter, as well; may be given twice.",
        show_default=False,
    ),
]
Noise = Annotated[
    float | None,
    typer.Option(
        "--noise",
        metavar="PH",
        help="Standard deviation of a reading [default: stated in the record, or estimated].",
        show_default=False,
    ),
]


def pka(
    files: Files,
    acid: Acid,
    steps: Steps = None,
    charge: Charge = None,
    protons_removed: Removed = None,
    counter_ion: CounterIon = "",
    molar_mass: MolarMass = None,
    free: Free = None,
    noise: Noise = None,
    out: Out = None,
    replace: Replace = False,
    json: Json = False,
    quiet: Quiet = False,
    settings: SettingsFile = None,
    columns: ColumnsFile = None,
    strict: Strict = False,
    debug: Debug = False,
) -> None:
    """Find the ionization constants of one acid.

    From every solution that holds it: the acid alone at several dilutions, partly neutralised, titrated, in a buffer,
    at several temperatures. Thermodynamic and apparent pKa with uncertainty and its sources, what the readings cannot
    tell, and the acids of the library that would explain them. Writes a report folder and prints its gist.
    """
    from reconcile import pipeline
    from reconcile.cli.printed import after_writing
    from reconcile.cli.progress import progress_bar
    from reconcile.records.completeness import shortfalls
    from reconcile.reporter.plain import folder_name
    from reconcile.reporter.write import check_place, write_report

    folder = out or DEFAULT_FOLDER / folder_name(f"{files[0].stem}_pka")
    check_place(folder, replace)
    with progress_bar(quiet) as progress:
        found = pipeline.fit_pka(
            *files,
            acid=acid,
            steps=steps,
            charge=charge,
            protons_removed=protons_removed,
            counter_ion=counter_ion,
            molar_mass=molar_mass,
            free=tuple(free or ()),
            noise=noise,
            settings=settings,
            columns=columns,
            progress=progress,
        )
        write_report(found, folder, replace=replace, progress=progress)
    with after_writing(folder):
        if json:
            from reconcile.reporter.pka_json import printed_json

            print(printed_json(found), end="")
        else:
            from reconcile.cli import show_pka

            show_pka.show(found, folder)
    raise typer.Exit(exit_code(flagged=bool(found.flags), strict=strict, incomplete=bool(shortfalls(found.records))))


def add_to(app: typer.Typer) -> None:
    app.command(
        epilog=example(
            'reconcile pka titration.xlsx --acid "acetic acid" --free strength --out reports/acetic --replace',
            'reconcile pka log.csv series.csv --acid "amine K" --charge 1 --counter-ion chloride:1 --molar-mass 157.6',
        )
    )(pka)
