"""What the drop-down lists of a new workbook offer, and which column offers which."""

from __future__ import annotations

from collections.abc import Mapping

from reconcile.records.columns import STANDINGS
from reconcile.records.standards import standards
from reconcile.records.substances import Form, catalogue
from reconcile.records.units import UNITS

SHORT_UNITS = ("M", "mM", "µM")
"""Spellings in daily use, offered beside the names."""
CONCENTRATIONS = ("molar", "molal", "normal", "mass_volume", "mass_mass")
QUANTITIES = ("mass", "volume", "mol")
STAGES = ("in process", "final", "after filtration", "after sterilising")


def substances() -> list[Form]:
    """Every substance of the library, by name."""
    return sorted(catalogue().forms, key=lambda form: (form.name.casefold(), form.name))


def units(*measures: str) -> list[str]:
    """Units of some measures, as written in output, with the short spellings before them."""
    found = [u for text, u in UNITS.items() if text == u.name and u.measures in measures]
    short = [text for text in SHORT_UNITS if UNITS[text].measures in measures]
    return [*short, *(u.name for u in found)]


def lists() -> dict[str, list[str]]:
    """The content of each list, by its heading on the Lists sheet."""
    return {
        "Substance": [form.name for form in substances()],
        "Unit of an amount": units(*CONCENTRATIONS, *QUANTITIES, "times"),
        "Unit of a strength": units(*CONCENTRATIONS),
        "Unit made up to": units("volume", "mass"),
        "Known solution, built in": sorted(standards()),
        "Stage": list(STAGES),
        "Standing": list(dict.fromkeys(STANDINGS.values())),
    }


OFFERS: Mapping[tuple[str, str], str] = {
    ("readings", "known"): "Known solution, built in",
    ("readings", "stage"): "Stage",
    ("readings", "standing"): "Standing",
    ("recipes", "substance"): "Substance",
    ("recipes", "unit"): "Unit of an amount",
    ("recipes", "made_up_to_unit"): "Unit made up to",
    ("stocks", "substance"): "Substance",
    ("stocks", "unit"): "Unit of a strength",
    ("series", "substance"): "Substance",
    ("series", "unit"): "Unit of an amount",
    ("series", "titrant"): "Substance",
}
"""(sheet, column) -> list."""
CHECKED = ("Substance", "Unit of an amount", "Unit of a strength", "Unit made up to", "Standing")
"""Lists beside which another entry is asked about; it may be kept, for synonyms and other spellings are read too."""
FROM_SHEET: Mapping[tuple[str, str], tuple[str, str]] = {
    ("readings", "meter"): ("meters", "meter"),
    ("calibrations", "meter"): ("meters", "meter"),
    ("events", "meter"): ("meters", "meter"),
    ("recipes", "lot"): ("stocks", "lot"),
    ("series", "lot"): ("stocks", "lot"),
    ("series", "titrant_lot"): ("stocks", "lot"),
}
"""(sheet, column) -> the column of another sheet whose entries it offers."""
