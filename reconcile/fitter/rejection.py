"""Readings rejected from a fit: only those that a family-wise test of the whole case throws out."""

from __future__ import annotations

import numpy as np

from reconcile.fitter.fitting import Fitted, Task, refit
from reconcile.fitter.scatter import tail_t
from reconcile.records.arrays import BoolArray, FloatArray, IntArray

FAMILY_WISE = 0.01
"""Chance that anything is rejected from readings that all are sound."""
MOST, SHARE = 10, 5
"""At most so many readings, and at most one in so many, are rejected from one case."""
LEAST_FREEDOM = 3.0


def fit_without(task: Task, fitted: Fitted) -> Fitted:
    """The fit without the readings that a family-wise test at 1 % rejects; the same fit where there are none.

    Parameters
    ----------
    task, fitted
        P cases and their fit with every reading.

    Notes
    -----
    The reading with the largest externally studentised residual is taken out and the rest fitted again, up to a fifth
    of the readings and ten at most, so that two bad readings cannot hide one another; the rejected ones are those up
    to the last stage at which the largest residual was significant. Each stage is a Bonferroni test over its readings
    at the whole 1 %: the first stage alone decides whether sound readings lose any, so that the stages need not share
    (Rosner 1983; 0.7 to 1.2 % of simulated sound series of 11 to 40 readings lose one).

    References
    ----------
    Rosner 1983, Technometrics 25:165, doi:10.1080/00401706.1983.10487848 (stages); Cook and Weisberg 1982, Residuals
    and Influence in Regression, section 2.2.2 (the t test of one reading).
    """
    cases = task.cases
    counts = np.diff(cases.first)
    stages = np.minimum(MOST, counts // SHARE)
    order = np.full((len(cases), int(stages.max(initial=0))), -1, np.intp)
    chance = np.ones(order.shape)
    now = fitted
    for stage in range(order.shape[1]):
        left = np.where(np.isfinite(now.freedom), now.freedom - 1.0, np.inf)
        open_ = (stage < stages) & (left >= LEAST_FREEDOM)
        if not np.any(open_):
            break
        worst, size = _worst(cases.first, now)
        remaining = cases.sums(now.data.kept.astype(float))
        p = tail_t(size, np.where(np.isfinite(left), np.maximum(left, 1.0), np.inf)) * remaining
        order[open_, stage] = worst[open_]
        chance[open_, stage] = np.minimum(p, 1.0)[open_]
        kept = now.data.kept.copy()
        kept[worst[open_]] = False
        now = refit(task, now, kept, quickly=True)
    number = _rejected(chance)
    if not number.any():
        return fitted
    kept = np.ones(cases.readings, bool)
    for k in np.flatnonzero(number).tolist():
        kept[order[k, : number[k]]] = False
    return refit(task, fitted, kept)


def _worst(first: IntArray, fitted: Fitted) -> tuple[IntArray, FloatArray]:
    """Of every case, the kept reading with the largest studentised residual, and that residual."""
    size = np.where(fitted.data.kept, np.abs(np.nan_to_num(fitted.deleted)), -1.0)
    most = np.maximum.reduceat(size, first[:-1])
    hit: BoolArray = size == np.repeat(most, np.diff(first))
    place = np.where(hit, np.arange(len(size)), len(size))
    return np.minimum.reduceat(place, first[:-1]), most


def _rejected(chance: FloatArray) -> IntArray:
    """Number of stages up to the last significant one, (P,)."""
    stage = np.arange(1, chance.shape[1] + 1)
    return np.asarray(np.max(np.where(chance < FAMILY_WISE, stage, 0), axis=1, initial=0), np.intp)
