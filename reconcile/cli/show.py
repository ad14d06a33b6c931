"""Results as terminal text: coloured and fitted to the window on a terminal, plain and unbroken when piped.

What is piped needs no library that draws on terminals, and takes a fraction of the time to start.
"""

from __future__ import annotations

import sys
from collections.abc import Iterable, Sequence
from functools import lru_cache
from itertools import zip_longest
from typing import TYPE_CHECKING, TextIO
from unicodedata import category, east_asian_width

from reconcile.reporter.cautions import NO_HAZARD_WORD, gas_words
from reconcile.reporter.plain import plain

if TYPE_CHECKING:
    from rich.console import Console, RenderableType

    from reconcile.records.substances import Form

INDENT = 2
GAP = 2
"""Blanks between columns."""


@lru_cache(maxsize=1)
def _console_on(stream: TextIO) -> Console:
    from rich.console import Console

    return Console(file=stream, markup=False, highlight=False, emoji=False)


def console() -> Console:
    """Standard output, as it is now."""
    return _console_on(sys.stdout)


def _on_terminal(thing: RenderableType, indent: int) -> None:
    from rich.padding import Padding

    console().print(Padding(thing, (0, 0, 0, indent), expand=False))


def _width(text: str) -> int:
    """Columns that a text takes: two for a wide character, none for what combines with the one before."""
    if text.isascii():
        return len(text)
    return sum(0 if category(c) in ("Mn", "Me") else 2 if east_asian_width(c) in "WF" else 1 for c in text)


def say(text: str, quiet: bool = False) -> None:
    """One message on standard error."""
    if not quiet:
        print(plain(text), file=sys.stderr)


def line(text: str = "", bold: bool = False, indent: int = 0) -> None:
    """One line, made plain; broken between words where the window is narrow."""
    if not text:
        print()
        return
    if not sys.stdout.isatty():
        print(f"{' ' * indent}{plain(text)}".rstrip())
        return
    from rich.text import Text

    _on_terminal(Text(plain(text), style="bold" if bold else ""), indent)


def heading(text: str) -> None:
    """A heading with an empty line above it."""
    line()
    line(text, bold=True)


def columns(
    rows: Iterable[Sequence[str]], headings: Sequence[str] = (), indent: int = INDENT, right: Sequence[int] = ()
) -> None:
    """Rows of cells under one another; `right` names the columns of numbers."""
    filled = [[plain(cell) for cell in row] for row in rows]
    if not sys.stdout.isatty():
        _piped([list(headings), *filled] if headings else filled, indent, right)
        return
    from rich.table import Table
    from rich.text import Text

    width = len(headings) or max((len(row) for row in filled), default=0)
    table = Table(box=None, show_header=bool(headings), pad_edge=False, padding=(0, GAP, 0, 0), header_style="bold")
    for index in range(width):
        table.add_column(
            headings[index] if headings else "", justify="right" if index in right else "left", overflow="fold"
        )
    for row in filled:
        table.add_row(*(Text(cell) for cell in row))
    _on_terminal(table, indent)


def _piped(rows: Sequence[Sequence[str]], indent: int, right: Sequence[int]) -> None:
    """Rows under one another without a terminal: as wide as they are."""
    widths = [max(map(_width, cells)) for cells in zip_longest(*rows, fillvalue="")]
    for row in rows:
        cells = []
        for at, cell in enumerate(row):
            blanks = " " * (widths[at] - _width(cell))
            cells.append(blanks + cell if at in right else cell + blanks)
        print((" " * indent + (" " * GAP).join(cells)).rstrip())


def hazard_words(form: Form) -> str:
    """What is said of its hazards beside a substance; never empty."""
    return "; ".join(filter(None, [form.hazard, gas_words(form.gas_with_acid)])) or NO_HAZARD_WORD
