"""Unit spellings and what they mean. Case matters: mM is not MM, and a missing unit is never guessed."""

from __future__ import annotations

import unicodedata
from collections.abc import Mapping
from dataclasses import dataclass

# What a unit measures:
#   molar        amount of substance in a volume of solution           -> mol/L
#   molal        amount of substance per kg of water                   -> mol/kg
#   normal       equivalents in a volume                               -> eq/L
#   mass_volume  mass in a volume of solution                          -> g/L
#   mass_mass    mass in a mass of solution                            -> g/kg
#   mass         mass taken                                            -> g
#   volume       volume taken                                          -> mL
#   mol          amount taken                                          -> mol
#   times        a multiple: 10x of a stock                            -> 1
#   percent      % with neither w/v nor w/w said: a question           -> 1


@dataclass(frozen=True)
class Unit:
    """One unit: spelling used in output, what it measures, and the factor to that measure's base unit."""

    name: str
    measures: str
    factor: float


_TABLE: tuple[tuple[str, str, float, str], ...] = (
    ("mol/L", "molar", 1.0, "M|mol/l|mol L-1|mol·L-1|mol/dm3|molar|mol l-1|mol dm-3"),
    ("mmol/L", "molar", 1e-3, "mM|mmol/l|mmol L-1|mmol·L-1|millimolar|mmol/dm3|mol/m3"),
    ("µmol/L", "molar", 1e-6, "µM|uM|µmol/l|umol/L|umol/l|micromolar"),
    ("mol/kg", "molal", 1.0, "m (molal)|mol kg-1|molal|mol/kg water"),
    ("mmol/kg", "molal", 1e-3, "mmol kg-1|millimolal"),
    ("N", "normal", 1.0, "eq/L|Eq/L|eq/l|normal|val"),
    ("mEq/L", "normal", 1e-3, "meq/L|meq/l|mN|mEq/l"),
    ("g/L", "mass_volume", 1.0, "g/l|g L-1|g/dm3|gram per litre|mg/mL|mg/ml|g·L-1"),
    ("mg/L", "mass_volume", 1e-3, "mg/l|mg L-1|µg/mL|ug/mL|mg·L-1"),
    ("% w/v", "mass_volume", 10.0, "%w/v|% (w/v)|%(w/v)|w/v %|% m/v|g/100 mL|g/100mL|g/dL"),
    ("g/kg", "mass_mass", 1.0, "g kg-1|mg/g|g·kg-1"),
    ("% w/w", "mass_mass", 10.0, "%w/w|% (w/w)|%(w/w)|w/w %|% m/m|g/100 g|g/100g|wt%|wt %"),
    ("ppm", "mass_mass", 1e-3, "mg/kg|mg kg-1"),
    ("kg", "mass", 1000.0, "kilogram|kilograms"),
    ("g", "mass", 1.0, "gram|grams|gm"),
    ("mg", "mass", 1e-3, "milligram|milligrams"),
    ("µg", "mass", 1e-6, "ug|microgram"),
    ("L", "volume", 1000.0, "l|litre|liter|litres|liters|dm3"),
    ("mL", "volume", 1.0, "ml|millilitre|milliliter|cm3|cc"),
    ("µL", "volume", 1e-3, "ul|uL|µl|microlitre|microliter"),
    ("mol", "mol", 1.0, "mole|moles"),
    ("mmol", "mol", 1e-3, "millimole|millimoles"),
    ("µmol", "mol", 1e-6, "umol|micromole"),
    ("x", "times", 1.0, "×|X|fold"),
    ("%", "percent", 1.0, "percent|per cent"),
)


def unit_key(text: str) -> str:
    """A unit as it is compared: one micro sign, no stray spaces, superscripts as digits; case is kept."""
    text = unicodedata.normalize("NFKC", text).replace("\u03bc", "µ").replace("\u2212", "-").replace("\u22c5", "·")
    return " ".join(text.split()).strip("[]() ") if not text.strip().startswith("%") else " ".join(text.split())


UNITS: Mapping[str, Unit] = {
    unit_key(spelling): Unit(name, measures, factor)
    for name, measures, factor, spellings in _TABLE
    for spelling in (name, *spellings.split("|"))
}


def find_unit(text: str) -> Unit | None:
    """The unit a text spells, or None; never a guess, and never with the case changed."""
    return UNITS.get(unit_key(text))


def unit_names() -> list[str]:
    """Every unit as written in output, for messages and drop-down lists."""
    return [name for name, *_ in _TABLE]
