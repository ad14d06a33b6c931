"""A reading that could be taken, and what it would show under each explanation."""

from __future__ import annotations

from dataclasses import dataclass

from reconcile.auditor.proposals import Site
from reconcile.records.arrays import FloatArray
from reconcile.records.rounding import chance_words, significant

CAUTION = "Only where the quality unit authorises it."


@dataclass(frozen=True)
class Check:
    """A practicable reading: which solution on which meter, and the rows of the model that it would follow.

    template : evidence row of the same solution, -1 for a known solution; z : (q,) its random-effect columns
    """

    solution: str
    batch_of: str
    meter: str
    ph: float
    site: Site
    template: int
    z: FloatArray
    batch_sd: float
    other: float
    noise: float
    probe: str = ""


@dataclass(frozen=True)
class Plan:
    """The most telling check, and what it would show under each of e explanations.

    names : e names, "" for the absence of the fault; means, spreads : FloatArray (e,) pH it would read, and their u
    d : smallest separation of two explanations; wrong : chance of a wrong choice by one reading
    repeats : how many readings would decide, 1 where one does, 0 where none would
    """

    check: Check
    names: tuple[str, ...]
    means: FloatArray
    spreads: FloatArray
    d: float
    wrong: float
    repeats: int

    def words(self) -> str:
        """The sentence of a report."""
        outcomes = ", ".join(
            f"pH {m:.2f} (u {u:.2f}) {f'for {name}' if name else 'otherwise'}"
            for name, m, u in zip(self.names, self.means, self.spreads, strict=True)
        )
        shown = significant(self.d, 2 if self.d >= 1 else 1)
        apart = f"Separation d = {shown}, chance of a wrong choice {chance_words(self.wrong)}."
        reading = f"{self.check.solution} on meter {self.check.meter}"
        if self.repeats == 1:
            return f"Read {reading}. Expected: {outcomes}. {apart} {CAUTION}"
        if self.repeats:
            return (
                f"Read {self.check.solution} {self.repeats} times on meter {self.check.meter}. "
                f"Expected: {outcomes}. {apart} "
                f"One such reading would not settle it; the mean of {self.repeats} would. {CAUTION}"
            )
        return (
            f"No practicable reading of what already stands would settle it. The most telling, {reading}, is expected "
            f"at {outcomes}. {apart}"
        )
