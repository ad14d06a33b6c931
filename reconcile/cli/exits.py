"""Exit codes, and which one a result deserves."""

from __future__ import annotations

DONE = 0
REFUSED = 1
USAGE = 2
FLAGGED = 3
INCOMPLETE = 4
DIFFERENT = 5
INTERRUPTED = 130


def exit_code(flagged: bool, strict: bool, incomplete: bool = False) -> int:
    """Code of a command that has done its work; an incomplete record outranks a flag."""
    if incomplete:
        return INCOMPLETE
    return FLAGGED if strict and flagged else DONE
