"""What an imaginary solution room makes: recipes, and the bottles they are made from."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

Amounts = tuple[float, ...]
Draw = Callable[[np.random.Generator], Amounts]


def _between(rng: np.random.Generator, low: float, high: float) -> float:
    """A concentration, as likely in each octave."""
    return float(np.exp(rng.uniform(np.log(low), np.log(high))))


def _pair(most: float) -> Draw:
    def draw(rng: np.random.Generator) -> Amounts:
        total, part = _between(rng, 0.02, most), rng.uniform(0.25, 0.75)
        return total * (1 - part), total * part

    return draw


def _neutralised(low: float, high: float, most: float = 0.12) -> Draw:
    def draw(rng: np.random.Generator) -> Amounts:
        total = _between(rng, 0.02, most)
        return total, total * rng.uniform(low, high)

    return draw


def _alone(least: float) -> Draw:
    return lambda rng: (_between(rng, least, 0.2),)


def _dilute_base(rng: np.random.Generator) -> Amounts:
    return (_between(rng, 0.002, 0.006),)


@dataclass(frozen=True)
class Template:
    """One kind of solution: its substances, how its amounts are drawn, how often it is made."""

    kind: str
    substances: tuple[str, ...]
    draw: Draw
    share: float


ACETIC, ACETATE = "acetic acid", "sodium acetate"
CITRIC, CITRATE = "citric acid", "trisodium citrate"
PRIMARY, SECONDARY = "sodium dihydrogen phosphate", "disodium hydrogen phosphate"
BASE, STRONG = "sodium hydroxide", "hydrochloric acid"
# amounts keep every ionic strength between 0.001 mol/kg (slow electrodes) and 0.5 mol/kg (the Davies equation)
TEMPLATES: tuple[Template, ...] = (
    Template("acetate", (ACETIC, ACETATE), _pair(0.15), 3),
    Template("acetate", (ACETIC, BASE), _neutralised(0.2, 0.8), 3),
    Template("acetate", (ACETATE, STRONG), _neutralised(0.2, 0.8), 2),
    Template("citrate", (CITRIC, CITRATE), _pair(0.09), 3),
    Template("citrate", (CITRIC, BASE), _neutralised(0.4, 2.5), 3),
    Template("citrate", (CITRATE, STRONG), _neutralised(0.4, 2.5, 0.07), 2),
    Template("citrate phosphate", (CITRIC, SECONDARY), _pair(0.15), 1),
    Template("phosphate", (PRIMARY, SECONDARY), _pair(0.15), 4),
    Template("phosphate", (PRIMARY, BASE), _neutralised(0.2, 0.8), 2),
    Template("phosphate", (SECONDARY, STRONG), _neutralised(0.2, 0.8), 2),
    Template("Tris", ("Tris base", STRONG), _neutralised(0.2, 0.8), 4),
    Template("lactate", ("lactic acid", BASE), _neutralised(0.25, 0.75), 3),
    Template("MES", ("MES", BASE), _neutralised(0.2, 0.8), 3),
    Template("borate", ("boric acid", BASE), _neutralised(0.15, 0.6), 3),
    Template("acetic acid", (ACETIC,), _alone(0.06), 1),
    Template("citric acid", (CITRIC,), _alone(0.01), 1),
    Template("lactic acid", ("lactic acid",), _alone(0.01), 1),
)
DILUTE_BASE = Template("dilute base", (BASE,), _dilute_base, 0)
BOTTLES: dict[str, int] = {
    ACETIC: 2,
    ACETATE: 1,
    CITRIC: 1,
    CITRATE: 1,
    PRIMARY: 1,
    SECONDARY: 1,
    "Tris base": 1,
    STRONG: 2,
    BASE: 2,
    "lactic acid": 1,
    "MES": 1,
    "boric acid": 1,
}
"""Bottles of each substance opened over one set of lots; the first is replaced by the second on the way."""
WEIGHED = frozenset({ACETATE, CITRATE, PRIMARY, SECONDARY, CITRIC})
"""Weighed solids: a wrong form in the bottle changes the moles by the molar mass. The others are stock solutions."""
USES = 3
"""Every lot goes into at least this many batches, unless a single-use lot is asked for."""


def choose_templates(rng: np.random.Generator, n_batches: int, sets: int, shares: dict[str, float]) -> list[Template]:
    """Templates of all batches, in order of making: first what gives every lot its uses, then by share.

    shares multiplies the share of the kinds it names.
    """
    chosen: list[Template] = []
    count = dict.fromkeys(BOTTLES, 0)
    kinds = list(TEMPLATES)
    weight = np.array([t.share * shares.get(t.kind, 1.0) for t in kinds])

    def add(template: Template) -> None:
        chosen.append(template)
        for substance in template.substances:
            count[substance] += 1

    for substance in rng.permutation(list(BOTTLES)):
        usable = np.array([substance in t.substances for t in kinds]) * weight
        while count[substance] < USES * BOTTLES[substance] * sets and len(chosen) < n_batches:
            add(kinds[rng.choice(len(kinds), p=usable / usable.sum())])
    while len(chosen) < n_batches:
        add(kinds[rng.choice(len(kinds), p=weight / weight.sum())])
    return [chosen[i] for i in rng.permutation(n_batches)]


def bottles_in_turn(rng: np.random.Generator, uses: int, bottles: int) -> np.ndarray:
    """Which bottle each use of a substance is taken from, in order of use; each bottle serves USES times or more."""
    bottles = max(1, min(bottles, uses // USES))
    spare = uses - USES * bottles
    extra = rng.multinomial(spare, np.full(bottles, 1.0 / bottles)) if spare > 0 else np.zeros(bottles, int)
    sizes = extra + (USES if spare >= 0 else uses)
    return np.repeat(np.arange(bottles), sizes)[:uses]
