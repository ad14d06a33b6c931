"""How figures are rounded for people, wherever they are shown: one rule for sentences, tables and pictures."""

from __future__ import annotations

import math
from decimal import ROUND_HALF_UP, Decimal

MINUS = "−"
LEAST_CHANCE = 1e-4
"""A smaller chance is not told more exactly: no model of a record is right so far out."""


def half_up(value: float, decimals: int) -> str:
    """The number with fixed decimals, halves away from zero; "" for NaN, and never "-0.00"."""
    if not math.isfinite(value):
        return ""
    rounded = Decimal(repr(float(value))).quantize(Decimal(1).scaleb(-decimals), rounding=ROUND_HALF_UP)
    return f"{abs(rounded) if rounded == 0 else rounded:f}"


def significant(value: float, digits: int = 3) -> str:
    """The number with so many significant digits, in plain notation where that is readable."""
    if not math.isfinite(value):
        return ""
    if value == 0:
        return "0"
    exponent = math.floor(math.log10(abs(value)))
    if -5 <= exponent < 7:
        return half_up(value, max(digits - 1 - exponent, 0))
    mantissa, _, power = f"{value:.{digits - 1}e}".partition("e")
    return f"{mantissa}e{int(power)}"


def signed(text: str) -> str:
    """A number as shown for a difference: with its sign, and a true minus."""
    if not text or not any(c in "123456789" for c in text):
        return text
    return MINUS + text[1:] if text.startswith("-") else f"+{text}"


def minus(text: str) -> str:
    """A number with a true minus sign."""
    return MINUS + text[1:] if text.startswith("-") else text


def decimals_of(interval: tuple[float, float] | None, least: int = 3) -> int:
    """Digits after the point that an interval deserves: two of its width, but at least `least`."""
    if interval is None:
        return 3
    width = abs(interval[1] - interval[0])
    if not math.isfinite(width) or width <= 0:
        return 3
    return max(min(max(math.ceil(-math.log10(width)) + 1, 0), 6), least)


def chance_words(p: float) -> str:
    """A chance as people read it: "less than 1 in 10,000", "about 1 in 250", "about 4 %"."""
    if not math.isfinite(p):
        return "not stated"
    if p < LEAST_CHANCE:
        return "less than 1 in 10,000"
    if p < 0.01:
        return f"about 1 in {round(1.0 / p, 1 - math.floor(math.log10(1.0 / p))):,.0f}"
    return f"about {significant(100.0 * p, 2 if p >= 0.1 else 1)} %"
