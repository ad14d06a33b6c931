"""How predictions follow the pH that settled an amount, instead of everything that the amount made up for."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.uncertainty import combined
from reconcile.records.arrays import FloatArray, IntArray, Triplets
from reconcile.records.book import BatchRecords
from reconcile.records.results import Prediction


def following(records: BatchRecords, prediction: Prediction) -> tuple[IntArray, IntArray, FloatArray]:
    """(row, open amount, dpH over the pH that settled it) for every row that holds an open amount."""
    opens, solved = records.open_amounts, records.solved
    if not len(solved):
        return np.zeros(0, np.intp), np.zeros(0, np.intp), np.zeros(0)
    owner = np.full(len(records.solutions.solution), -1, np.intp)
    owner[opens.contribution] = opens.owner
    t = prediction.contributions
    hit = np.flatnonzero(owner[t.column] >= 0)
    j = owner[t.column[hit]]
    hit, j = hit[np.isfinite(solved.weight[j])], j[np.isfinite(solved.weight[j])]
    cell, place = np.unique(t.row[hit] * len(solved) + j, return_inverse=True)
    value = np.bincount(place, t.value[hit] * solved.weight[j], len(cell))
    row, which = np.divmod(cell, len(solved))
    return row.astype(np.intp), which.astype(np.intp), np.asarray(value, float)


def linked(
    records: BatchRecords,
    prediction: Prediction,
    reading: IntArray,
    acids: AcidTable,
    u_taking: FloatArray,
    chain: tuple[IntArray, IntArray, FloatArray],
) -> Prediction:
    """The same prediction, with slopes and budget of the rows that hold a solved amount as total derivatives.

    Parameters
    ----------
    reading : ndarray of int (n,)
        Reading of the record that each row predicts.
    u_taking : ndarray (c,)
        Relative standard uncertainty of taking each amount.
    chain : (start, lot, u)
        Lots of contribution c are lot[start[c]:start[c + 1]]; u (l,) their relative standard uncertainties.

    Notes
    -----
    With k = dpH / d(pH that settled amount x): d(pH)/d theta becomes dpH/dtheta - k (dpH/dtheta where x was settled).
    At the reading that settled it everything cancels but that reading's own uncertainty.
    """
    row, j, k = following(records, prediction)
    solved = records.solved
    if not len(row):
        return prediction
    names = list(prediction.constant_names)
    place = {name: i for i, name in enumerate(names)}
    for name in solved.constant_names:
        if name not in place:
            place[name] = len(names)
            names.append(name)
    of_table = {name: i for i, name in enumerate(acids.constant_names)}
    u_constant = np.array([acids.u[of_table[name]] for name in names])
    moved = np.array([place[name] for name in solved.constant_names], np.intp)
    constants = _less(prediction.constants, solved.constants, row, j, k, moved, len(names))
    contributions = _less(
        prediction.contributions, solved.contributions, row, j, k, np.arange(solved.contributions.shape[1]),
        prediction.contributions.shape[1],
    )  # fmt: skip
    d_model = prediction.d_model.copy()
    np.subtract.at(d_model, row, k * np.nan_to_num(solved.d_model[j]))
    touched = np.unique(row)
    share: FloatArray = np.sqrt(np.bincount(row, (k * solved.u_ph[j]) ** 2, len(prediction))).astype(np.float64)
    itself = np.zeros(len(prediction), bool)
    itself[row] = solved.reading[j] == reading[row]
    budget = {name: values.copy() for name, values in prediction.budget.items()}
    budget["activity model"][touched] = np.abs(d_model[touched]) * prediction.u_model
    budget["pKa"][touched] = _root(constants, u_constant, len(prediction))[touched]
    budget["taking"][touched] = _root(contributions, u_taking, len(prediction))[touched]
    budget["strength"][touched] = _of_lots(contributions, chain, len(prediction))[touched]
    budget["temperature"][itself] = 0.0
    budget["adjustment"] = share
    return replace(
        prediction,
        u=combined(budget),
        budget=budget,
        d_model=d_model,
        contributions=contributions,
        constants=constants,
        constant_names=tuple(names),
        constant_u=u_constant,
    )


def _less(
    own: Triplets, there: Triplets, row: IntArray, j: IntArray, k: FloatArray, column: IntArray, columns: int
) -> Triplets:
    """own - sum over j of k times row j of `there`; column : where the columns of `there` stand; cells added up."""
    start = np.searchsorted(there.row, np.arange(there.shape[0] + 1))
    counts = start[j + 1] - start[j]
    entry = np.repeat(start[j], counts) + np.arange(counts.sum()) - np.repeat(np.cumsum(counts) - counts, counts)
    rows = np.concatenate([own.row, np.repeat(row, counts)])
    where = np.concatenate([own.column, column[there.column[entry]]])
    values = np.concatenate([own.value, -np.repeat(k, counts) * there.value[entry]])
    cell, place = np.unique(rows * max(columns, 1) + where, return_inverse=True)
    total = np.bincount(place, values, len(cell))
    kept = np.abs(total) > 1e-12
    r, c = np.divmod(cell[kept], max(columns, 1))
    return Triplets(r.astype(np.intp), c.astype(np.intp), total[kept].astype(np.float64), (own.shape[0], columns))


def _root(t: Triplets, u: FloatArray, n: int) -> FloatArray:
    return np.asarray(np.sqrt(np.bincount(t.row, (t.value * u[t.column]) ** 2, n)), float)


def _of_lots(t: Triplets, chain: tuple[IntArray, IntArray, FloatArray], n: int) -> FloatArray:
    """Share of the strengths: slopes of one lot within a row add up before they are squared."""
    start, lot, u = chain
    counts = start[t.column + 1] - start[t.column]
    entry = np.repeat(start[t.column], counts) + np.arange(counts.sum()) - np.repeat(np.cumsum(counts) - counts, counts)
    cell, place = np.unique(np.repeat(t.row, counts) * max(len(u), 1) + lot[entry], return_inverse=True)
    together = np.bincount(place, np.repeat(t.value, counts), len(cell))
    where, which = np.divmod(cell, max(len(u), 1))
    return np.asarray(np.sqrt(np.bincount(where, (together * u[which]) ** 2, n)), float)
