"""Text on its way out: what a cell held, made harmless for terminals, pages, workbooks and CSV readers."""

from __future__ import annotations

from functools import lru_cache

FORMULA_STARTS = ("=", "+", "-", "@", "＝", "＋", "－", "＠")
LONGEST = 32000
"""Characters of one text that are written; a spreadsheet cell holds 32,767."""


@lru_cache(maxsize=65536)
def plain(text: str) -> str:
    """The text with every character that acts instead of showing written as its code point.

    Control characters, terminal escapes, line breaks, direction overrides, zero-width characters, unusual spaces and
    lone surrogates become \\u and their code, so that two names that differ only there still differ on paper.
    """
    if len(text) > LONGEST:
        text = f"{text[:LONGEST]}… ({len(text)} characters, cut here)"
    if text.isprintable():
        return text
    return "".join(
        c if c.isprintable() else f"\\u{ord(c):04x}" if ord(c) < 0x10000 else f"\\U{ord(c):08x}" for c in text
    )


def acts_as_formula(text: str) -> bool:
    """Whether a spreadsheet may take the text for a formula when it opens a CSV file."""
    return text.lstrip(" ").startswith(FORMULA_STARTS)


def csv_text(text: str) -> str:
    """Plain text for a CSV field; one that a spreadsheet may take for a formula gets an apostrophe in front."""
    text = plain(text)
    return f"'{text}" if acts_as_formula(text) else text
