"""Pictures of an audit: one file each, one row each in this table; adding one touches its file and a row here."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

from matplotlib.figure import Figure

from reconcile.records.results import Audit
from reconcile.reporter.figures.predicted_observed import predicted_observed
from reconcile.reporter.lookups import Lookups


@dataclass(frozen=True)
class Picture:
    """One picture: how it is drawn, its heading and caption, and what a reader who cannot see it is told."""

    draw: Callable[[Audit, Lookups], Figure]
    heading: str
    caption: str
    alt: str


PICTURES: Mapping[str, Picture] = {
    "predicted_observed": Picture(
        predicted_observed,
        "Observed against predicted",
        "Each mark is one reading; the line is agreement.",
        "Scatter of observed pH against the pH predicted from the recipe, with the line of agreement.",
    ),
}
"""Name (and file stem) -> picture, in the order of the page."""
