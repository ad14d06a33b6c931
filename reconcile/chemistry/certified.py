"""Known solutions in a prediction: their certified pH in place of a computed one."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from reconcile.records.arrays import IntArray
from reconcile.records.book import BatchRecords
from reconcile.records.results import Prediction

U_CERTIFICATE = 0.01
"""Standard uncertainty of a known solution's pH where none is stated [pH]; common practice, no source."""


def with_certified(records: BatchRecords, prediction: Prediction, solution: IntArray) -> Prediction:
    """The same prediction, with known solutions at their certified pH.

    Parameters
    ----------
    solution : IntArray (n,)
        Solution of each row of the prediction.

    Returns
    -------
    Prediction
        The share "certificate" is what all readings of one known solution have in common, "temperature" what each has
        to itself where its temperature is not recorded; status ok, and nothing that only a composition gives.
    """
    table = records.solutions
    ph = np.asarray(table.known_ph, float)[solution]
    known = np.isfinite(ph)
    certificate = np.zeros(len(solution))
    if not known.any():
        return replace(prediction, budget={**prediction.budget, "certificate": certificate})
    u = np.asarray(table.known_u, float)[solution]
    u = np.where(known, np.where(np.isfinite(u), u, U_CERTIFICATE), 0.0)
    warm = np.zeros(len(solution))
    if len(table.known_u_temperature):
        warm[known] = np.minimum(table.known_u_temperature[solution], u)[known]
    certificate = np.sqrt(np.maximum(u**2 - warm**2, 0.0))
    budget = {name: np.where(known, 0.0, share) for name, share in prediction.budget.items()}
    budget["temperature"] = np.where(known, warm, prediction.budget["temperature"])
    status = prediction.status.copy()
    status[known] = "ok"
    return replace(
        prediction,
        ph=np.where(known, ph, prediction.ph),
        status=status,
        u=np.where(known, u, prediction.u),
        budget={**budget, "certificate": certificate},
        ionic_strength=np.where(known, np.nan, prediction.ionic_strength),
        buffer_capacity=np.where(known, np.nan, prediction.buffer_capacity),
        d_temperature=np.where(known, 0.0, prediction.d_temperature),
        d_model=np.where(known, 0.0, prediction.d_model),
        d_titrant=np.where(known, np.nan, prediction.d_titrant),
    )
