"""The smallest fault that the record would have shown, subject by subject: what silence means."""

from __future__ import annotations

import numpy as np
from matplotlib.figure import Figure
from matplotlib.ticker import MaxNLocator

from reconcile.records.results import Audit, Silence
from reconcile.reporter.figures.style import GREY, INK, WIDTH, empty, figure, label
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.words import kind_words, unit_words

MOST_EACH = 30
MOST_PANELS = 2


def _groups(audit: Audit) -> list[tuple[str, str, list[Silence]]]:
    """Kinds with a stated size, the most stated first: kind, unit, what is stated."""
    groups: dict[tuple[str, str], list[Silence]] = {}
    for silence in audit.smallest_detectable:
        if silence.size is not None and np.isfinite(silence.size):
            groups.setdefault((silence.kind, silence.unit), []).append(silence)
    order = sorted(groups, key=lambda key: (not key[0].startswith("meter"), -len(groups[key]), key))
    return [(kind, unit, groups[kind, unit]) for kind, unit in order][:MOST_PANELS]


def detectable(audit: Audit, lookups: Lookups) -> Figure:
    """One panel a kind; the largest, where least would be seen, on top."""
    groups = _groups(audit)
    if not groups:
        return empty("No smallest detectable fault is stated for this record.")
    tallest = min(max(len(g) for *_, g in groups), MOST_EACH)
    drawn = figure(WIDTH, 0.7 + 0.16 * max(tallest, 3))
    panels = drawn.subplots(1, len(groups), squeeze=False)[0]
    for axes, (kind, unit, members) in zip(panels, groups, strict=True):
        kept = sorted(members, key=lambda s: (-(s.size or 0.0), s.subject))[:MOST_EACH][::-1]
        sizes = [float(s.size or 0.0) for s in kept]
        factor = unit_words(unit) in ("", "factor")
        base = 1.0 if factor else 0.0
        levels = range(tallest - len(kept), tallest)
        axes.hlines(levels, base, sizes, color=GREY, linewidth=0.8)
        axes.plot(sizes, levels, linestyle="none", marker="o", markersize=3.5, color=INK)
        axes.set_yticks(levels, [label(s.subject, 18) for s in kept])
        axes.tick_params(axis="y", length=0)
        axes.spines["left"].set_visible(False)
        axes.set_ylim(-0.6, tallest - 0.4)
        axes.set_xlim(base, base + 1.06 * (max(sizes) - base))
        axes.xaxis.set_major_locator(MaxNLocator(5, steps=[1, 2, 5, 10]))
        left_out = len(members) - len(kept)
        rest = f" ({len(kept)} largest of {len(members)})" if left_out else ""
        axes.set_title(f"{kept[0].subject_type}: {kind_words(kind)}{rest}")
        axes.set_xlabel(f"smallest detectable ({'factor' if factor else unit_words(unit)})")
    return drawn
