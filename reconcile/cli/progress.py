"""A progress bar on standard error, for work that takes over two seconds."""

from __future__ import annotations

import sys
import threading
from collections.abc import Iterator
from contextlib import contextmanager

from reconcile.pipeline import Progress

PATIENCE = 2.0
"""Seconds of work before a bar is shown."""


@contextmanager
def progress_bar(quiet: bool) -> Iterator[Progress]:
    """A function that is told what is being done and the share that is done; it draws only on a terminal."""
    if quiet or not sys.stderr.isatty():
        yield lambda doing, share: None
        return
    from rich import progress as drawn
    from rich.console import Console

    bar = drawn.Progress(
        drawn.TextColumn("{task.description}"),
        drawn.BarColumn(),
        drawn.TaskProgressColumn(),
        console=Console(stderr=True, markup=False, highlight=False),
        transient=True,
    )
    task = bar.add_task("", total=1.0)

    def report(doing: str, share: float | None) -> None:
        bar.update(task, description=doing, total=None if share is None else 1.0, completed=share or 0.0)

    wait = threading.Timer(PATIENCE, bar.start)
    wait.daemon = True
    wait.start()
    try:
        yield report
    finally:
        wait.cancel()
        bar.stop()
