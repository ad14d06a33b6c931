"""Which lines of a recipe a reading's stage has behind it."""

from __future__ import annotations

from typing import TYPE_CHECKING

from reconcile.records.columns import heading_key
from reconcile.records.stages import is_before, rank_of

if TYPE_CHECKING:
    from reconcile.importer.compose import Composer


def up_to_stage(composer: Composer, lines: list[int], stage: str) -> list[int]:
    """Lines added up to and with the step that a stage names.

    Where no step bears its name: before any adjustment, the lines of no step that leave no amount open; else all lines
    but those of steps that are known to come later (a "final" one is behind no "in process" reading).
    """
    keys = [heading_key(composer.lines.step[i]) for i in lines]
    steps = list(dict.fromkeys(keys))
    wanted = heading_key(stage)
    if wanted in steps:
        upto = set(steps[: steps.index(wanted) + 1]) | {""}
        return [i for i, key in zip(lines, keys, strict=True) if key in upto]
    if is_before(stage):
        first = [i for i, key in zip(lines, keys, strict=True) if not key and not composer.leaves_open(i)]
        return first or lines
    rank = rank_of(wanted)
    if rank is None:
        return lines
    kept = [i for i, key in zip(lines, keys, strict=True) if (rank_of(key) or 0) <= rank]
    return kept or lines
