"""Text on its way out: what a cell held, made harmless for terminals, pages, workbooks and CSV readers."""

from __future__ import annotations

import re
from functools import lru_cache

FORMULA_STARTS = ("=", "+", "-", "@", "＝", "＋", "－", "＠")
NOT_IN_NAMES = re.compile(r'[<>:"/\\|?*]')
"""What a name of a file may not hold on one system or another, control characters apart."""
DEVICES = re.compile(r"(con|prn|aux|nul|com[0-9¹²³]|lpt[0-9¹²³])\s*(\.|$)", re.IGNORECASE)
LONGEST_NAME = 200
"""Bytes of a folder's name; file systems take 255."""
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


def folder_name(text: str) -> str:
    """A name for a folder, made of a text, that is one name and no device on every system."""
    name = NOT_IN_NAMES.sub("_", plain(text)).strip().rstrip(" .")
    while len(name.encode("utf-8")) > LONGEST_NAME:
        name = name[:-1].rstrip(" .")
    if not name.strip("."):
        return "report"
    return f"_{name}" if DEVICES.match(name) else name
