"""Bounds on what a run takes on: over one of them the input is refused, never cut short."""

from __future__ import annotations

import time
from collections.abc import Callable

from reconcile.records.places import Place
from reconcile.records.problems import InputProblems, Problem
from reconcile.records.settings import Settings

Progress = Callable[[str, float | None], None]


def beyond(code: str, number: object, limit: object, place: Place | None = None) -> InputProblems:
    """The refusal of what is over a limit.

    code : key of the table of problems; number, limit : what there is, and what there may be at most
    """
    words = (("limit", f"{limit:,}" if isinstance(limit, int) else str(limit)),)
    shown = f"{number:,}" if isinstance(number, int) else str(number)
    return InputProblems([Problem(code, place or Place(""), shown, (("number", shown), *words))])


def check_size(rows: int, columns: int, settings: Settings, place: Place) -> None:
    """Refuse a sheet with more rows or columns than the settings allow."""
    for code, number in (("limit-rows", rows), ("limit-columns", columns)):
        limit = int(settings[f"limits.{code.removeprefix('limit-')}"])
        if number > limit:
            raise beyond(code, number, limit, place)


def timed(progress: Progress | None, settings: Settings) -> Progress:
    """The same progress, told also to refuse the record once it has taken longer than the settings allow.

    The clock decides about nothing but that refusal.
    """
    minutes = float(settings["limits.minutes"])
    end = time.monotonic() + 60.0 * minutes

    def tell(doing: str, share: float | None) -> None:
        if time.monotonic() > end:
            raise beyond("limit-minutes", doing, f"{minutes:g}")
        if progress is not None:
            progress(doing, share)

    return tell
