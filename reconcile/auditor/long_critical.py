"""Scores that faults of many subjects must pass, all at once."""

from __future__ import annotations

import numpy as np

from reconcile.auditor import laws
from reconcile.auditor.alarm import Alarm, mixed_p
from reconcile.auditor.components import Model
from reconcile.auditor.estimates import critical_z
from reconcile.records.arrays import FloatArray, IntArray

ALIKE = 0.1
"""Blocks whose numbers of candidates differ by less than about this share have one critical score."""
HIGHEST, HALVINGS = 200.0, 50


def critical_scores(alarm: Alarm, members: IntArray, df: FloatArray, rate: float, seed: int) -> FloatArray:
    """Score that each of k subjects must pass in a long record, (k,).

    Blocks of one candidate need no simulation; of blocks of about the same size one is simulated, the one with the most
    readings.

    Parameters
    ----------
    members : IntArray (k,)    a candidate of each subject in the pool; -1 where it has none
    df : FloatArray (laws, k)  as alarm.score_df gives it
    """
    pool = alarm.pool
    block = np.where(members >= 0, pool.block[members], -1)
    sizes = np.bincount(pool.block, minlength=1)
    size = np.where(block >= 0, sizes[block], 1)
    trials = np.array([pool.trials(k) if k >= 0 else max(pool.classes * len(members), 1) for k in members.tolist()])
    p = rate / trials
    bucket = np.round(np.log(size) / ALIKE).astype(np.intp)
    for which in np.unique(bucket[size > 1]).tolist():
        mine = np.flatnonzero((bucket == which) & (size > 1))
        readings = [len(pool.candidate(int(members[i])).x.indices) for i in mine.tolist()]
        chosen = int(mine[int(np.argmax(readings))])
        correlation, root, one_sided = alarm.block(int(block[chosen]))
        if len(correlation):
            normal = critical_z(correlation, root, one_sided, int(trials[chosen]), rate, seed)
            p[mine] = 2.0 * float(laws.norm_sf(normal))
    return scores_needed(alarm.model, df, p)


def scores_needed(model: Model, df: FloatArray, p: FloatArray) -> FloatArray:
    """Scores whose two-sided probabilities are p, for columns with degrees of freedom (laws, k), by halving."""
    low, high = np.zeros(len(p)), np.full(len(p), HIGHEST)
    for _ in range(HALVINGS):
        middle = (low + high) / 2.0
        over = mixed_p(model, df, middle) > p
        low, high = np.where(over, middle, low), np.where(over, high, middle)
    return np.asarray((low + high) / 2.0)
