"""The usual amount of titrant of like batches, beside which an odd one stands out."""

from __future__ import annotations

import numpy as np

from reconcile.records.adjusting import Solved
from reconcile.records.arrays import BoolArray, FloatArray, IntArray
from reconcile.records.book import BatchRecords
from reconcile.records.problems import Problem

SAME_AMOUNT, SAME_PH = 0.05, 0.1
"""Like batches: every written amount within 5 % of the other's, adjusted to within 0.1 pH of the other or to the same
target by what the record says (no source)."""
LEAST_LIKE = 3
FAR = 3.0
"""An amount is odd when it lies over three times the scatter of the like ones, and of the adjusting reading, off; and
where it lies over three times its own uncertainty below nothing, as a titrant that cannot have given that pH."""
Key = tuple[object, ...]


def usual_amounts(
    records: BatchRecords, solved: Solved
) -> tuple[FloatArray, FloatArray, FloatArray, IntArray, BoolArray]:
    """Median, least and greatest amount of the other like batches, their number, and whether the own one is odd; (k,).

    Notes
    -----
    The scatter is 1.483 times the median absolute deviation (ISO 13528:2022, C.2.2), never under what
    the uncertainty of the adjusting reading makes of an amount. From three like batches on.
    """
    k = len(solved)
    usual, low, high = (np.full(k, np.nan) for _ in range(3))
    like, odd = np.zeros(k, np.intp), np.zeros(k, bool)
    goal = _goals(records, solved)
    odd |= impossible(solved)
    by_kind: dict[Key, list[tuple[int, FloatArray]]] = {}
    for j in range(k):
        if solved.reading[j] >= 0 and np.isfinite(solved.amount[j]) and solved.amount[j] != 0.0:
            key, amounts = _recipe(records, solved, j)
            by_kind.setdefault(key, []).append((j, amounts))
    for some in by_kind.values():
        for j, amounts in some:
            others = [i for i, other in some if i != j and _alike(amounts, other)]
            others = [i for i in others if abs(solved.ph[i] - solved.ph[j]) <= SAME_PH or goal[i] == goal[j]]
            like[j] = len(others)
            if len(others) < LEAST_LIKE:
                continue
            values = solved.amount[others]
            usual[j], low[j], high[j] = float(np.median(values)), float(values.min()), float(values.max())
            scatter = 1.483 * float(np.median(np.abs(values - usual[j])))
            u = np.abs(solved.amount * solved.weight) * solved.u_ph  # what like batches do not share
            scatter = max(scatter, float(np.median(u[others])), float(u[j]))
            odd[j] |= abs(solved.amount[j] - usual[j]) > FAR * scatter
    return usual, low, high, like, odd


def impossible(solved: Solved) -> BoolArray:
    """Whether an amount added until a reading lies below nothing by more than its uncertainty explains, (k,).

    The counter-ion of a stock counts from what its label says, and may well be less than that.
    """
    with np.errstate(invalid="ignore"):
        return np.asarray((solved.reading >= 0) & (solved.amount < -FAR * np.nan_to_num(solved.u)), bool)


def _goals(records: BatchRecords, solved: Solved) -> FloatArray:
    """pH that each open amount was to bring: the recipe's "to pH 7.4", else the target of its reading; NaN, (k,)."""
    goal = np.array(records.open_amounts.stated_ph, np.float64)
    read = np.flatnonzero(np.isnan(goal) & (solved.reading >= 0))
    goal[read] = records.readings["target"][solved.reading[read]]
    return goal


def _recipe(records: BatchRecords, solved: Solved, j: int) -> tuple[Key, FloatArray]:
    """What the batch of an open amount holds otherwise: its forms, and their amounts in the order of the forms."""
    opens, solutions = records.open_amounts, records.solutions
    s = int(records.readings_solution[solved.reading[j]])
    inside = np.flatnonzero(solutions.solution == s)
    mine = opens.contribution[opens.owner == j]
    written = inside[~np.isin(inside, opens.contribution)]
    titrant = sorted({int(solutions.form[c]) for c in np.intersect1d(inside, mine).tolist()})
    order = written[np.lexsort((solutions.amount[written], solutions.form[written]))]
    key = (str(opens.unit[j]), tuple(titrant), tuple(solutions.form[order].tolist()))
    return key, np.asarray(solutions.amount[order], float)


def _alike(one: FloatArray, other: FloatArray) -> bool:
    return bool(np.all(np.abs(one - other) <= SAME_AMOUNT * np.maximum(np.abs(one), np.abs(other))))


def amount_notes(records: BatchRecords, solved: Solved) -> list[Problem]:
    """Notices about implied amounts far from the usual one, and about a pH that no amount of the titrant gives."""
    opens, never = records.open_amounts, impossible(solved)
    found = []
    for j in range(len(solved)):
        name = str(opens.batch[j] or opens.stock[j])
        words = (("name", name), ("titrant", str(opens.substance[j])), ("unit", str(opens.unit[j])))
        if solved.odd[j] and np.isfinite(solved.usual[j]):
            usual = f"{solved.usual_low[j]:.4g} to {solved.usual_high[j]:.4g}"
            more = (*words, ("usual", usual), ("count", str(int(solved.like[j]))))
            found.append(Problem("amount-odd", opens.place[j], f"{solved.amount[j]:.4g} {opens.unit[j]}", more))
        elif never[j] or (np.isnan(solved.amount[j]) and np.isfinite(solved.ph[j])):
            found.append(Problem("amount-none", opens.place[j], f"{solved.ph[j]:.2f}", words))
    return found
