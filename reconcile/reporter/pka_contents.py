"""Everything the report folder of a fit of ionization constants holds, as bytes by path."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

from matplotlib.figure import Figure

from reconcile.records.pka_results import PkaFit
from reconcile.reporter.drawn import Drawn
from reconcile.reporter.figures.pka_fit import pka_fit
from reconcile.reporter.figures.pka_profile import pka_profile
from reconcile.reporter.figures.pka_species import pka_species
from reconcile.reporter.figures.style import styled
from reconcile.reporter.pka_json import pka_json
from reconcile.reporter.pka_page import pka_page
from reconcile.reporter.pka_tables import CSV_TABLES
from reconcile.reporter.pka_workbook import pka_workbook
from reconcile.reporter.to_csv import table_csv
from reconcile.reporter.to_png import images


@dataclass(frozen=True)
class Picture:
    """One picture: how it is drawn, its heading, caption, and what a reader who cannot see it is told."""

    draw: Callable[[PkaFit], Figure]
    heading: str
    caption: str
    alt: str


PICTURES: Mapping[str, Picture] = {
    "fit": Picture(
        pka_fit,
        "Readings and fit",
        "Above: the readings and the fitted pH; a line joins neighbouring readings of one series through all mixtures "
        "of the two solutions. Below: observed minus fitted; the band is twice the median standard deviation of a "
        "reading about the fit. A caret at the edge is a residual beyond the scale, with its value.",
        "Observed pH with the fitted curve, and the residuals beneath. The values are in the table of readings.",
    ),
    "profile": Picture(
        pka_profile,
        "Likelihood profiles",
        "How much the weighted sum of squares rises when a constant is held at another value and everything else that "
        "is sought follows. The line is the rise at the ends of a 95 % interval; where the curve stays below it the "
        "interval is open.",
        "Rise of the weighted sum of squares against each constant. The intervals are in the table of steps.",
    ),
    "species": Picture(
        pka_species,
        "Species of the acid",
        "Share of every protonation state by its charge, at the readings’ mean temperature and ionic strength. The "
        "ticks on the axis are the readings; shorter ones took no part.",
        "Shares of the acid’s protonation states against pH, with the readings as ticks on the axis.",
    ),
}
"""Name (and file stem) -> picture, in the order of the page."""


def draw_all(fit: PkaFit, progress: Callable[[str, float], None]) -> list[Drawn]:
    """Every picture of the table, drawn once for the folder and the page."""
    found = []
    with styled():
        for i, (name, picture) in enumerate(PICTURES.items()):
            progress(f"drawing {picture.heading.lower()}", i / len(PICTURES))
            png, svg = images(picture.draw(fit))
            found.append(Drawn(name, picture.heading, picture.caption, picture.alt, png, svg))
    return found


def pka_contents(fit: PkaFit, progress: Callable[[str, float], None]) -> dict[str, bytes]:
    """Path within the folder (forward slashes) -> content, the manifest apart."""
    progress("writing tables", 0.0)
    files = {}
    for build in CSV_TABLES:
        table = build(fit)
        files[f"{table.name}.csv"] = table_csv(table)
    files["pka.json"] = pka_json(fit)
    progress("writing the workbook", 0.1)
    files["pka.xlsx"] = pka_workbook(fit)
    drawn = draw_all(fit, lambda what, share: progress(what, 0.3 + 0.5 * share))
    for picture in drawn:
        files[f"plots/{picture.name}.png"] = picture.png
        files[f"plots/{picture.name}.svg"] = picture.svg
    progress("setting the page", 0.9)
    files["report.html"] = pka_page(fit, drawn)
    progress("writing the folder", 0.98)
    return files
