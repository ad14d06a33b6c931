"""Standard output that cannot be written: a full disk behind it, or a reader that has gone."""

from __future__ import annotations

import os
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path


class CannotPrint(OSError):
    """The work is done and its report is written, but standard output takes no more."""


@contextmanager
def after_writing(folder: Path) -> Iterator[None]:
    """For what is printed once a report is written; raises CannotPrint, which says so, where printing fails."""
    try:
        yield
        sys.stdout.flush()
    except BrokenPipeError:
        raise
    except OSError as error:
        raise CannotPrint(error.errno, f"{error.strerror}. The report itself is whole, in {folder}.") from error


def flushed(code: int) -> int:
    """Exit code once everything printed has gone out: the one given, or 1 with a line that says why it could not."""
    try:
        sys.stdout.flush()
    except OSError as error:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())  # or the interpreter tries once more
        if not isinstance(error, BrokenPipeError):
            print(f"standard output: {error.strerror}", file=sys.stderr)
        return code or 1
    return code
