"""Results as terminal text: coloured and fitted to the window on a terminal, plain and unbroken when piped."""

from __future__ import annotations

import sys
from collections.abc import Iterable, Sequence
from functools import lru_cache
from typing import TYPE_CHECKING, TextIO

from rich.console import Console, RenderableType
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from reconcile.reporter.cautions import NO_HAZARD_WORD, gas_words
from reconcile.reporter.plain import plain

if TYPE_CHECKING:
    from reconcile.records.substances import Form

PIPED_WIDTH = 100_000
"""Columns of output that goes to no terminal: no line is broken there."""
INDENT = 2


@lru_cache(maxsize=1)
def _console_on(stream: TextIO) -> Console:
    width = None if stream.isatty() else PIPED_WIDTH
    return Console(file=stream, width=width, markup=False, highlight=False, emoji=False)


def console() -> Console:
    """Standard output, as it is now."""
    return _console_on(sys.stdout)


def _put(thing: RenderableType) -> None:
    """Print; without the blanks that fill a line, where no terminal needs them."""
    if console().is_terminal:
        console().print(thing)
        return
    with console().capture() as captured:
        console().print(thing)
    for text in captured.get().splitlines():
        print(text.rstrip())


def say(text: str, quiet: bool = False) -> None:
    """One message on standard error."""
    if not quiet:
        print(plain(text), file=sys.stderr)


def line(text: str = "", bold: bool = False, indent: int = 0) -> None:
    """One line, made plain; broken between words where the window is narrow."""
    if not text:
        print()
        return
    written = Text(plain(text), style="bold" if bold else "")
    _put(Padding(written, (0, 0, 0, indent), expand=False))


def heading(text: str) -> None:
    """A heading with an empty line above it."""
    line()
    line(text, bold=True)


def columns(
    rows: Iterable[Sequence[str]], headings: Sequence[str] = (), indent: int = INDENT, right: Sequence[int] = ()
) -> None:
    """Rows of cells under one another; `right` names the columns of numbers."""
    filled = [[plain(cell) for cell in row] for row in rows]
    width = len(headings) or max((len(row) for row in filled), default=0)
    table = Table(box=None, show_header=bool(headings), pad_edge=False, padding=(0, 2, 0, 0), header_style="bold")
    for index in range(width):
        table.add_column(
            headings[index] if headings else "", justify="right" if index in right else "left", overflow="fold"
        )
    for row in filled:
        table.add_row(*(Text(cell) for cell in row))
    _put(Padding(table, (0, 0, 0, indent), expand=False))


def hazard_words(form: Form) -> str:
    """What is said of its hazards beside a substance; never empty."""
    return "; ".join(filter(None, [form.hazard, gas_words(form.gas_with_acid)])) or NO_HAZARD_WORD
