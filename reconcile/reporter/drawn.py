"""All pictures of an audit, drawn once: the same bytes go to the folder and into the page."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from reconcile.records.results import Audit
from reconcile.reporter.figures import PICTURES
from reconcile.reporter.figures.style import styled
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.to_png import images


@dataclass(frozen=True)
class Drawn:
    """One picture: file stem, words, and its bytes. finding is the id of the finding it belongs to, "" for none."""

    name: str
    heading: str
    caption: str
    alt: str
    png: bytes
    svg: bytes
    finding: str = ""


def draw_all(audit: Audit, lookups: Lookups, progress: Callable[[str, float], None]) -> list[Drawn]:
    """Every picture of the table, in its order."""
    found = []
    with styled():
        for i, (name, picture) in enumerate(PICTURES.items()):
            progress(f"Drawing: {picture.heading.lower()}", i / len(PICTURES))
            png, svg = images(picture.draw(audit, lookups))
            found.append(Drawn(name, picture.heading, picture.caption, picture.alt, png, svg))
    return found
