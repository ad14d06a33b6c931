"""Shares of the acid's protonation states against pH, with the readings as ticks on the axis."""

from __future__ import annotations

import numpy as np
from matplotlib.figure import Figure

from reconcile.records.pka_results import PkaFit
from reconcile.reporter.figures.style import GREY, INK, WIDTH, figure

DASHES = ((0, ()), (0, (5, 2)), (0, (2, 1.5)), (0, (6, 1.5, 1.5, 1.5)), (0, (1, 1)), (0, (8, 2, 2, 2)), (0, (3, 3)))


def charge_words(charge: str) -> str:
    """A charge as it is written at a species: 0, +1, −2."""
    number = int(charge)
    return "charge 0" if number == 0 else f"charge {number:+d}".replace("-", "−")


def pka_species(fit: PkaFit) -> Figure:
    """One line a state, named where it stands highest."""
    drawn = figure(WIDTH, 2.9)
    axes = drawn.subplots()
    for rank, line in enumerate(fit.species):
        axes.plot(line.x, line.y, color=INK, linewidth=1.0, linestyle=DASHES[rank % len(DASHES)])
        if len(line.y) and line.y.max() > 0.2:
            top = int(np.argmax(np.where(line.y >= line.y.max() - 1e-3, 1, 0)))
            right = top > len(line.x) // 2
            axes.annotate(
                charge_words(line.label), (line.x[top], line.y[top]), xytext=(-3 if right else 3, 3),
                textcoords="offset points", fontsize=6.5, ha="right" if right else "left", annotation_clip=False,
            )  # fmt: skip
    used = fit.status == "used"
    inside = axes.get_xaxis_transform()
    axes.vlines(fit.observed[used], 0.0, 0.045, color=INK, linewidth=0.7, transform=inside)
    if (~used).any():
        axes.vlines(fit.observed[~used], 0.0, 0.025, color=GREY, linewidth=0.5, transform=inside)
    if fit.species:
        axes.set_xlim(fit.species[0].x.min(), fit.species[0].x.max())
    axes.set(ylim=(0.0, 1.05), xlabel="pH", ylabel="share of the acid (–)")
    return drawn
