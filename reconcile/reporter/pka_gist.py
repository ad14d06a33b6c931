"""The gist of a fit of ionization constants: what a reviewer asks first, for page, terminal and JSON."""

from __future__ import annotations

import shlex
from collections import Counter

from reconcile.records.pka_results import PkaFit
from reconcile.reporter.cautions import NO_HAZARD_WORD, gas_words
from reconcile.reporter.gist import Line
from reconcile.reporter.pka_tables import STATUSES
from reconcile.reporter.plain import plain
from reconcile.reporter.words import counted, listed, significant

PKA = "pka"
NOISES = {
    "estimated": "estimated from their scatter",
    "floor": "the least that the display and the settings allow",
    "given": "as stated",
    "assumed": "assumed, as there are no more readings than unknowns",
}


def command(fit: PkaFit) -> str:
    """The command that makes this report again, files and settings apart."""
    asked = fit.question
    words = [PKA, "--acid", asked.acid]
    for option, value in (
        ("--steps", asked.steps),
        ("--charge", asked.charge),
        ("--protons-removed", asked.protons_removed),
        ("--counter-ion", asked.counter_ion or None),
        ("--molar-mass", asked.molar_mass),
        ("--noise", asked.noise),
    ):
        if value is not None:
            words += [option, value if isinstance(value, str) else f"{value:g}"]
    for one in asked.free:
        words += ["--free", one]
    return shlex.join(words)


def pka_gist(fit: PkaFit) -> list[Line]:
    """What was sought, what was found, what to know first, what is missing, which acid it could be, how complete."""
    return [
        Line("sought", "What was sought", _sought(fit)),
        Line("found", "What was found", " ".join(plain(text) for text in fit.values)),
        Line("cautions", "What to know first", " ".join(plain(t) for t in fit.cautions) or "Nothing in particular."),
        Line("gaps", "What is missing", " ".join(plain(t) for t in fit.gap_words) or _no_gap(fit)),
        Line("candidates", "Which acid it could be", " ".join(plain(t) for t in fit.ranking) or "No acid was tried."),
        Line("complete", "How complete", _complete(fit)),
    ]


def _sought(fit: PkaFit) -> str:
    free = f", and {listed(list(fit.question.free))} set free" if fit.question.free else ""
    return (
        f"The ionization constants of {plain(fit.formula_words)}{free}, from {counted(fit.readings_used, 'reading')}; "
        f"their noise is {significant(fit.noise, 2)} pH, {NOISES[fit.noise_origin]}."
    )


def _no_gap(fit: PkaFit) -> str:
    if any(set(hazard.words.split()) - {"corrosive"} or hazard.gas_with_acid for hazard in fit.hazards):
        return "Gaps are not told where a substance in the solutions has a hazard word beyond corrosive."
    return "No single reading would shrink an interval by much."


def _complete(fit: PkaFit) -> str:
    rows = fit.rows
    text = f"{rows['read']:,} rows read = {rows['used']:,} used + {rows['set_aside']:,} set aside"
    counts = Counter(str(s) for s in fit.status)
    words = [f"{number:,} {STATUSES[status]}" for status, number in counts.items()]
    return f"{text}. Of those used, {counted(len(fit.status), 'reading')} are of the acid: {listed(words)}."


def hazard_lines(fit: PkaFit) -> list[tuple[str, str]]:
    """Substance and the hazard words recorded for it; never empty words."""
    none = NO_HAZARD_WORD
    return [
        (plain(h.substance), "; ".join(filter(None, [plain(h.words), gas_words(plain(h.gas_with_acid))])) or none)
        for h in fit.hazards
    ]
