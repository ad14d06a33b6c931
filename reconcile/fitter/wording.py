"""Every sentence that a fit says, in one place."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

SENTENCES: Mapping[str, str] = {
    "found": "{name} = {value} at {temperature} °C and I = 0 (standard uncertainty {u}, 95 % interval {low} to "
    "{high}); apparent (mixed: activity of the hydrogen ion, molality of the acid's forms) {apparent} at I = "
    "{strength} mol/kg.",
    "at-25": "{name} at 25 °C = {value} (u {u}), moved with {origin}.",
    "enthalpy": "Van 't Hoff enthalpy of {step}: {value} kJ/mol (u {u}), from readings at {low} to {high} °C.",
    "no-25": "No value at 25 °C is given: the readings are at {temperature} °C, and no enthalpy is known.",
    "held": "{name} is not told by these readings; it is held at the library's {value} (u {u}).",
    "bound-above": "{name} is not identifiable: these readings only say that it lies below {high} (95 %).",
    "bound-below": "{name} is not identifiable: these readings only say that it lies above {low} (95 %).",
    "bound-none": "{name} is not identifiable: these readings say nothing about it.",
    "wide": "{name} is not identifiable to {limit}: these readings only say that it lies between {low} and {high} "
    "(95 %); its standard uncertainty is {u}.",
    "with-strength": "{name} and the strength of the acid cannot be told apart: what is known is "
    "{name} {sign} {slope} lg(strength over stated) = {value} (u {u}).",
    "with-offset": "{name} and an offset of the meter cannot be told apart: what is known is "
    "{name} {sign} {slope} times the offset = {value} (u {u}).",
    "with-step": "{name} and {other} lie closer together than these readings can part; their mean is known: {value} "
    "(u {u}).",
    "rests-on-strength": "{name} rests on the stated strength, which these readings cannot tell from it: 1 % of error "
    "in the strength moves {name} by {move}.",
    "with-mean": "{name} and {other} show in these readings through their mean alone, which is known: {value} (u {u}).",
    "ka-times-c": "These readings fix only Ka times C, the product of ionization constant and concentration: {name} "
    "rests on the stated strength, and 1 % of error in it moves {name} by {move}.",
    "strength-found": "Strength factor (actual over stated) {value}, u {u}.",
    "strength-unknown": "The strength factor is not identifiable from these readings.",
    "offset-found": "Meter offset {value} pH, u {u}.",
    "offset-unknown": "The meter's offset is not identifiable from these readings.",
    "one-side": "All readings lie on one side of half neutralisation of step {step} ({low} to {high} % neutralised): "
    "an error of strength or titrant goes into {name} undiminished.",
    "span": "The readings span only {span} pH; under 0.5 pH a wrong strength, a wrong step and noise look alike.",
    "few": "Only {count} left to fit; from five on the scatter itself tells something.",
    "no-scatter": "As many unknowns as readings: the scatter cannot be judged, and a noise of {noise} pH is taken "
    "instead.",
    "meter": "Meter {meter} is itself suspect: {reason}. An offset of the meter goes into {name} {how}.",
    "rejected": "{count} rejected by a test at a family-wise 1 % ({places}); with every reading {values}.",
    "leverage": "{places} almost alone {verb} what was found (leverage over {limit}): an error there would not show.",
    "steps": "{count} by AICc ({values}); a further step must lower it by more than 2, or by more than 10 where the "
    "readings do not tell its constant.",
    "bent": "The residuals bend with pH beyond chance: a step too few, an impurity, carbon dioxide or an error of the "
    "electrode may be behind it, and the uncertainty does not cover that.",
    "series": "The series disagree beyond chance: {group} lies {apart} pH {side} the others.",
    "not-settled": "The search for the best fit did not settle; the values are those of its last step.",
    "noise-larger": "The readings scatter {ratio} times as much as the noise stated for them; the uncertainty follows "
    "their scatter.",
    "dilute": "{count} at an ionic strength under {limit} mol/kg, where a glass electrode is slow and depends on flow.",
    "left-out": "{count} left out: {reasons}.",
    "explains": "Of the library, {acids} with its own constants {verb} these readings best (log likelihood ratio "
    "{ratio}){others}. That is a ranking, not an identification.",
    "none-explains": "None of these: no acid of the library explains the readings with its own constants; the nearest "
    "is {acid} (log likelihood ratio {ratio}).",
    "gap": "No reading lies between {low} and {high} % neutralised of step {step}; one there would {change}.",
    "gap-shrinks": "shrink the 95 % interval of {name} from {before} to {after}",
    "gap-closes": "give {name} a 95 % interval of {after}, which is open now",
    "bad-library": "It differs from the library's {value} (u {u}) by {difference}.",
}


REASONS: Mapping[str, str] = {
    "void": "void",
    "outside_electrode_range": "outside the range of the glass electrode",
    "outside_model": "beyond the ionic strength of the activity model",
    "adjusted": "of a solution brought to a pH with an amount that is not written",
    "not_solved": "not solved",
}
"""Why a reading took no part, by its status."""


def say(key: str, **words: str) -> str:
    """A sentence with its words filled in."""
    return SENTENCES[key].format(**words)


def figure(value: float, decimals: int = 3) -> str:
    """A number with fixed decimals and a true minus sign."""
    text = f"{value:.{decimals}f}"
    if float(text) == 0.0:
        text = text.lstrip("-")
    return text.replace("-", "−")


def uncertainty(value: float) -> str:
    """A standard uncertainty with two significant digits, three decimals at least."""
    return f"{value:.3f}" if value >= 0.0095 else f"{value:.2g}"


def counted(number: int, one: str = "reading") -> str:
    """A count with its noun and verb: "1 reading is", "3 readings are"."""
    return f"{number} {one} is" if number == 1 else f"{number} {one}s are"


def listed(words: Sequence[str]) -> str:
    """A list in a sentence: "a, b and c"."""
    return " and ".join(filter(None, [", ".join(words[:-1]), *words[-1:]])) if words else ""


def constant_name(step: int, steps: int) -> str:
    """pKa where there is one step, else pKa1, pKa2, ..."""
    return "pKa" if steps == 1 else f"pKa{step}"
