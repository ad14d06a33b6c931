"""Usual names of the stages at which a solution is read, in their order."""

from __future__ import annotations

from reconcile.records.columns import heading_key

_ORDER = (
    ("initial", "before adjustment", "pre adjustment", "unadjusted", "not adjusted", "before titration", "start"),
    ("in process", "ipc", "in process control"),
    ("after adjustment", "adjusted", "adjustment", "ph adjustment", "bulk"),
    ("final", "release", "finished"),
    ("after filtration", "after sterilising", "after sterilisation", "after sterilizing", "after sterilization",
     "after autoclaving", "sterilised", "sterilized", "filtered"),
    ("stability", "shelf life", "end of shelf life"),
)  # fmt: skip
"""Usual names of stages in their order; common practice, no source."""
_RANK = {heading_key(name): rank for rank, names in enumerate(_ORDER) for name in names}


BEFORE, IN_PROCESS, FINAL = 0, 1, 3


def rank_of(stage: str) -> int | None:
    """Place of a stage in the usual order, from 0; None for a name that says none."""
    return _RANK.get(heading_key(stage))


def is_before(stage: str) -> bool:
    """Whether a stage lies before anything was adjusted."""
    return rank_of(stage) == BEFORE
