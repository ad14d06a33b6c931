"""A simulated record in which half of the batches were adjusted: the amount of one component stands nowhere.

The solutions and their readings are those of the simulator; the first reading of such a batch is the one that it was
adjusted by, on whatever meter that was.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from reconcile.records.adjusting import OpenAmounts
from reconcile.records.arrays import AnyArray
from reconcile.records.book import BatchRecords
from reconcile.records.places import Place

TITRANTS = ("sodium hydroxide", "hydrochloric acid")


def half_adjusted(records: BatchRecords, seed: int) -> BatchRecords:
    """The record with the titrant of every other batch "as needed": a strong acid or base, else the last component."""
    solutions = records.solutions
    names = np.array([records.forms[f].name for f in solutions.form], object)
    several = [s for s in range(len(solutions)) if np.count_nonzero(solutions.solution == s) > 1]
    chosen = np.random.default_rng([seed, 7]).permutation(several)[: len(solutions) // 2]
    open_ones = []
    for s in sorted(chosen.tolist()):
        inside = np.flatnonzero(solutions.solution == s)
        strong = [c for c in inside if names[c] in TITRANTS]
        open_ones.append(int(strong[0] if strong else inside[-1]))
    k = len(open_ones)
    amount = np.array(solutions.amount, float)
    amount[open_ones] = np.nan
    lots = np.array([records.lots.name[solutions.lot[c]] for c in open_ones], object)
    opens = OpenAmounts(
        batch=_texts([solutions.batch[solutions.solution[c]] for c in open_ones]),
        stock=_texts([""] * k),
        substance=_texts([names[c] for c in open_ones]),
        lot=lots,
        unit=_texts(["mol/L"] * k),
        step=_texts([""] * k),
        choice=np.arange(k),
        stated_ph=np.full(k, np.nan),
        stated_at=np.full(k, np.nan),
        place=tuple(Place("simulated.xlsx", "Recipes", 2 + c, "D") for c in open_ones),
        contribution=np.array(open_ones, np.intp),
        owner=np.arange(k),
        per_unit=np.ones(k),
    )
    return replace(records, solutions=replace(solutions, amount=amount), open_amounts=opens)


def _texts(values: list[str]) -> AnyArray:
    out: AnyArray = np.empty(len(values), object)
    out[:] = values
    return out
