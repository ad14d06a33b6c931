"""The gist of a fit of ionization constants as terminal text."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from reconcile.cli.show import columns, heading, line
from reconcile.records.completeness import shortfalls
from reconcile.reporter.pka_gist import hazard_lines, pka_gist
from reconcile.reporter.text import caution_lines
from reconcile.reporter.words import half_up, minus

if TYPE_CHECKING:
    from reconcile.records.pka_results import PkaFit


def show(fit: PkaFit, folder: Path) -> None:
    """Gist, budget, candidates, what is incomplete, hazard words, cautions, and where the report is."""
    columns([(text.label, text.text) for text in pka_gist(fit)], indent=0)
    for step in fit.steps:
        if step.budget:
            whole = sum(share.u**2 for share in step.budget)
            heading(f"Shares of the uncertainty of step {step.step} (percent of the variance)")
            columns([(s.source, half_up(100.0 * s.u**2 / whole, 1)) for s in step.budget], right=(1,))
    if fit.candidates:
        heading("Acids of the library (log likelihood ratio)")
        columns(
            [
                (c.acid, minus(half_up(c.log_likelihood_ratio, 1)), "consistent" if c.explains else "")
                for c in fit.candidates
            ],
            right=(1,),
        )
    short = shortfalls(fit.records)
    if short:
        heading("Incomplete")
        columns([(text,) for text in short])
    heading("Hazard words")
    columns(hazard_lines(fit))
    heading("Cautions")
    columns([(text,) for text in caution_lines()])
    line()
    line(f"Report: {folder / 'report.html'}", bold=True)
