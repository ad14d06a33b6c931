"""Predictions under supposed changes to what the solutions of a record hold, all changes in one run of the engine."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from reconcile.chemistry.of_records import laid_out, predict_rows
from reconcile.records.arrays import IntArray, Triplets
from reconcile.records.book import BatchRecords
from reconcile.records.results import Change, Prediction, Repredict
from reconcile.records.settings import Settings

_COLUMNS = (
    "ph",
    "status",
    "u",
    "ionic_strength",
    "buffer_capacity",
    "temperature_c",
    "d_temperature",
    "d_model",
    "d_titrant",
)


def repredictor(records: BatchRecords, settings: Settings) -> Repredict:
    """A function that predicts readings again under supposed changes, all changes in one run of the engine.

    Parameters
    ----------
    records, settings
        As for predict_records; an unchanged reading gets the same values, but u to first order and without the share
        of carbon dioxide.

    Returns
    -------
    Callable
        From a sequence of Change to a list of Prediction, one for each, with a row for each of its `rows`. Raises
        ValueError when a change names a form that the library does not hold.
    """
    record = laid_out(records, settings)

    def repredict(changes: Sequence[Change]) -> list[Prediction]:
        if not changes:
            return []
        sizes = np.array([len(c.rows) for c in changes], np.intp)
        change = np.repeat(np.arange(len(changes)), sizes)
        reading = np.concatenate([np.asarray(c.rows, np.intp) for c in changes])
        whole = predict_rows(record, changes, change, reading)
        ends = np.cumsum(sizes).astype(np.intp)
        return _cut(whole, ends - sizes, ends)

    return repredict


def _cut(whole: Prediction, begins: IntArray, ends: IntArray) -> list[Prediction]:
    """The rows begins[i] to ends[i] of a Prediction, for every i."""
    sparse = {}
    for name in ("contributions", "constants", "degree"):
        part: Triplets = getattr(whole, name)
        sparse[name] = (part, np.searchsorted(part.row, begins), np.searchsorted(part.row, ends))
    out = []
    for i, (begin, end) in enumerate(zip(begins.tolist(), ends.tolist(), strict=True)):
        cut = {name: getattr(whole, name)[begin:end] for name in _COLUMNS}
        for name, (part, low, high) in sparse.items():
            some = slice(low[i], high[i])
            cut[name] = Triplets(
                part.row[some] - begin, part.column[some], part.value[some], (end - begin, part.shape[1])
            )
        budget = {name: share[begin:end] for name, share in whole.budget.items()}
        out.append(replace(whole, **cut, budget=budget))
    return out
