"""Headings that say more than a name: "pH (25 °C)" states a temperature, "Low limit (final)" names a stage."""

from __future__ import annotations

import re

from reconcile.importer.cells import decimal_mark, number_of
from reconcile.records.columns import BY_SHEET, heading_key
from reconcile.records.units import find_unit

_STATED_AT = re.compile(
    r"(?:ph(?:\s+(?:reading|value|observed|measured))?|measured ph|observed ph)"
    r"\s*[(\[,]?\s*(?:at|@|stated at|corrected to|ref\.?|reference)?"
    r"\s*(-?\d{1,3}(?:[.,]\d+)?)\s*(?:°|º|˚|deg\.?\s*)?\s*c\s*[)\]]?",
    re.IGNORECASE,
)
STAGED = ("low_limit", "high_limit", "target")
"""Columns that may hold for one stage alone."""
_STAGES = {
    heading_key(text)
    for text in (
        "final", "in process", "in-process", "ipc", "release", "bulk", "after adjustment", "after sterilising",
        "after sterilisation", "after sterilization", "after sterilizing", "after filtration", "after autoclaving",
        "stability", "shelf life", "end of shelf life", "before adjustment",
    )
}  # fmt: skip
_LIMITS = {heading_key(h): c.name for c in BY_SHEET["readings"] if c.name in STAGED for h in (c.title, *c.headings)}


def stated_at(text: str) -> str:
    """Temperature [°C] that a heading of readings states them at, as text with a point; "" where it says none."""
    found = _STATED_AT.fullmatch(" ".join(text.split()))
    if found is None:
        return ""
    number = number_of(found.group(1), decimal_mark([found.group(1)], "auto"))
    return f"{number[0]:g}" if number else ""


def staged_limit(text: str, name: str, unit: str) -> tuple[str, str] | None:
    """(field, stage) of a limit that a heading gives for one stage: "Low limit (final)", "Final low limit"; or None.

    name, unit : the heading as split into a name and what stands in brackets behind it
    """
    field = _LIMITS.get(heading_key(name))
    if field is not None and unit and find_unit(unit) is None and heading_key(unit) not in ("ph", ""):
        return field, unit
    key = heading_key(text)
    for stage in sorted(_STAGES, key=len, reverse=True):
        for rest in (key.removeprefix(f"{stage} "), key.removesuffix(f" {stage}")):
            if rest != key and rest in _LIMITS:
                return _LIMITS[rest], stage
    return None
