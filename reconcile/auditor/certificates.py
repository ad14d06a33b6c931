"""Errors of certificates: all readings of one known solution, of one lot where it is named, share one error."""

from __future__ import annotations

import numpy as np
from scipy import sparse

from reconcile.records.arrays import IntArray
from reconcile.records.book import BatchRecords
from reconcile.records.results import Prediction


def certificate_columns(
    records: BatchRecords, prediction: Prediction, rows: IntArray
) -> tuple[list[str], sparse.csc_array]:
    """Known solutions among some readings, by name and lot, and the standard uncertainty of each reading's certificate.

    Parameters
    ----------
    rows : IntArray (n,)
        Readings.

    Returns
    -------
    list of str (k,), sparse (n, k) [pH]
        A column holds u of the certificate at each reading's temperature: an effect of variance 1 is shared by all.
    """
    stated = prediction.budget.get("certificate")
    u = np.zeros(len(rows)) if stated is None else np.nan_to_num(stated)[rows]
    mine = np.flatnonzero(u > 0)
    names, lots = records.readings["known"][rows], records.readings["known_lot"][rows]
    keys = [(str(names[i]), str(lots[i])) for i in mine]
    subjects = sorted(set(keys))
    column = {key: j for j, key in enumerate(subjects)}
    at = np.array([column[key] for key in keys], np.intp)
    block = sparse.csc_array((u[mine], (mine, at)), shape=(len(rows), len(subjects)))
    return [f"{name}, lot {lot}" if lot else name for name, lot in subjects], block
