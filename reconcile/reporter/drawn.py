"""All pictures of an audit, drawn once: the same bytes go to the folder and into the page."""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from reconcile.records.results import Audit, Finding
from reconcile.reporter.figures import PICTURES
from reconcile.reporter.figures.finding import finding_picture
from reconcile.reporter.figures.style import EMPTY, styled
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.plain import plain
from reconcile.reporter.to_png import images
from reconcile.reporter.words import counted, half_up, signed, subject_words

MOST_FINDINGS = 24
"""Findings that get a picture of their own, most supported first."""


@dataclass(frozen=True)
class Drawn:
    """One picture: file stem, words, and its bytes. finding is the place of its finding in the audit, -1 for none."""

    name: str
    heading: str
    caption: str
    alt: str
    png: bytes
    svg: bytes
    finding: int = -1


def draw_all(audit: Audit, lookups: Lookups, progress: Callable[[str, float], None]) -> list[Drawn]:
    """Every picture of the table, then one for each finding."""
    found = []
    findings = lookups.faults[:MOST_FINDINGS]
    steps = len(PICTURES) + len(findings)
    with styled():
        for i, (name, picture) in enumerate(PICTURES.items()):
            progress(f"drawing {picture.heading.lower()}", i / steps)
            drawn = picture.draw(audit, lookups)
            blank = drawn.get_label() == EMPTY  # asked before it is written and closed
            png, svg = images(drawn)
            caption = "" if blank else f"{picture.caption} {picture.rest(audit, lookups)}".strip()
            found.append(Drawn(name, picture.heading, caption, picture.alt, png, svg))
        for place, (i, finding) in enumerate(findings):
            progress(f"drawing finding {place + 1} of {len(findings)}", (len(PICTURES) + place) / steps)
            png, svg = images(finding_picture(audit, lookups, finding))
            words = _alt(audit, lookups, finding)
            found.append(
                Drawn(
                    finding_stem(finding, i),
                    f"evidence for {plain(finding.id)}",
                    caption_of(finding, lookups),
                    words,
                    png,
                    svg,
                    i,
                )
            )
    return found


def finding_stem(finding: Finding, index: int) -> str:
    """File stem of a finding's picture, never anything that a cell held."""
    return f"finding_{finding.id if re.fullmatch(r'F[0-9]{1,6}', finding.id) else f'F{index + 1}'}"


def caption_of(finding: Finding, lookups: Lookups) -> str:
    """Caption of a finding's picture; says why readings of other meters are in that of a meter."""
    text = (
        f"Residuals of {subject_words(finding)}, with {plain(finding.id)} left in and taken out, on one scale. "
        "The band is twice the spread of a clean record."
    )
    if finding.subject_type != "meter":
        return text
    meters = lookups.audit.records.readings["meter"][np.asarray(finding.readings, np.intp)]
    elsewhere = int((meters != finding.subject).sum())
    if not elsewhere:
        return text
    if elsewhere == 1:
        return (
            f"{text} One of the readings was made on another meter, of a solution that was adjusted on this one; it "
            "carries its error with the opposite sign."
        )
    return (
        f"{text} {elsewhere:,} of the readings were made on other meters, of solutions that were adjusted on this one; "
        "they carry its error with the opposite sign."
    )


def _alt(audit: Audit, lookups: Lookups, finding: Finding) -> str:
    own = np.asarray(finding.readings, np.intp)
    before = lookups.apart_from_others([finding])[own]
    after = before - lookups.part(finding)[own]
    known = np.isfinite(before)
    text = f"Residuals of {subject_words(finding)}, {counted(len(own), 'reading')}."
    if known.any():
        ends = [signed(half_up(float(np.median(v[known])), 3)) for v in (before, after)]
        text += f" Their median is {ends[0]} pH with the finding left in and {ends[1]} pH with it taken out."
    return text
