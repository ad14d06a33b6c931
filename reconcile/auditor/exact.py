"""Exact profiles of an amount's error: the effect on pH is recomputed, never extrapolated from its slope."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from scipy import sparse

from reconcile.auditor.components import Model
from reconcile.auditor.proposals import Context, stack
from reconcile.auditor.retrial import Supposed
from reconcile.records.arrays import FloatArray, IntArray

Column = tuple[IntArray, FloatArray]
LN_FACTORS = tuple(s * v for v in (0.03, 0.07, 0.12, 0.18, 0.25, 0.35, 0.5, 0.7, 1.0) for s in (1.0, -1.0))
"""ln(actual amount / stated amount) at which the profile is computed, within the +-1 that a fault may reach."""


def gains(model: Model, x: sparse.csc_array) -> FloatArray:
    """Log-likelihood gain of each column at amplitude 1: x'Pr - x'Px/2."""
    return np.asarray(x.T @ model.pr).ravel() - 0.5 * model.quadratic(x)


def secants(
    context: Context, groups: Sequence[tuple[int, ...]], tangents: sparse.csc_array
) -> tuple[sparse.csc_array, list[Supposed | None]]:
    """Columns of effect per unit of ln factor, exact at each group's own most likely factor, which comes with them.

    groups : contributions that share one factor, one group a column of `tangents` (dpH/d ln factor).
    A group that cannot be solved anywhere keeps its tangent.
    """
    n, k = len(context.layout), len(groups)
    if not k:
        return tangents, []
    grid = [Supposed(group, factor=float(np.exp(v))) for group in groups for v in LN_FACTORS]
    found = context.retrial.shifts(grid)
    gain = _gains_or_never(context, found, n).reshape(k, len(LN_FACTORS))
    best = [_refined(np.array(LN_FACTORS), gain[i]) for i in range(k)]
    at: list[Supposed | None] = []
    likely = [Supposed(g, factor=float(np.exp(v))) for g, v in zip(groups, best, strict=True)]
    last = context.retrial.shifts(likely)
    columns: list[Column] = []
    for index, (value, (rows, shift)) in enumerate(zip(best, last, strict=True)):
        if np.isfinite(shift).all() and len(rows):
            columns.append((rows, shift / value))
            at.append(likely[index])
        else:
            at.append(None)
            begin, end = tangents.indptr[index], tangents.indptr[index + 1]
            columns.append((tangents.indices[begin:end].astype(np.intp), tangents.data[begin:end]))
    return stack(columns, n), at


def _gains_or_never(context: Context, found: Sequence[Column], n: int) -> FloatArray:
    good = np.array([bool(np.isfinite(shift).all()) and len(rows) > 0 for rows, shift in found])
    result = np.full(len(found), -np.inf)
    if good.any():
        kept = [c for c, g in zip(found, good, strict=True) if g]
        result[good] = gains(context.model, stack(kept, n))
    return result


def _refined(at: FloatArray, gain: FloatArray) -> float:
    """Place of the maximum of a profile: the parabola through the best point and its neighbours (0 is one, gain 0)."""
    order = np.argsort(at)
    x, y = np.r_[at[order], 0.0], np.r_[gain[order], 0.0]
    order = np.argsort(x)
    x, y = x[order], y[order]
    top = int(np.argmax(np.where(x == 0.0, -np.inf, y)))
    value = float(x[top])
    if 0 < top < len(x) - 1 and np.isfinite(y[top - 1 : top + 2]).all():
        (x0, x1, x2), (y0, y1, y2) = x[top - 1 : top + 2], y[top - 1 : top + 2]
        bend = (x1 - x0) * (y1 - y2) - (x1 - x2) * (y1 - y0)
        if bend != 0.0:
            vertex = x1 - 0.5 * ((x1 - x0) ** 2 * (y1 - y2) - (x1 - x2) ** 2 * (y1 - y0)) / bend
            value = float(np.clip(vertex, x0, x2))
    value = round(value, 3)
    return value if abs(value) >= 0.005 else float(np.copysign(0.005, value if value else 1.0))


def points(context: Context, supposed: Sequence[Supposed]) -> tuple[list[int], sparse.csc_array]:
    """Effects of supposed truths at amplitude 1: which of them can be solved and move something, and their columns."""
    found = context.retrial.shifts(supposed)
    kept = [
        i
        for i, (rows, shift) in enumerate(found)
        if len(rows) and np.isfinite(shift).all() and np.abs(shift).max() > 1e-4
    ]
    return kept, stack([found[i] for i in kept], len(context.layout))
