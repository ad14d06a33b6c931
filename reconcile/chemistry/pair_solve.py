"""Newton on the equations of solutions with ion pairs: pH, ionic strength and the components together."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from reconcile.chemistry.activity import ActivityModel
from reconcile.chemistry.balance import Balance, balance
from reconcile.chemistry.pairs import NOTHING, Layout
from reconcile.chemistry.temperature import LN10
from reconcile.records.arrays import BoolArray, FloatArray

STEPS = 25
TOLERANCE = 3e-6  # of the last step: Newton doubles the digits, so that what is left is about 1e-11
TOLERANCE_SIZED = 1e-10  # the slopes of balance.py are then only nearly exact
SOFTER = (-6.0, -4.0, -2.0, -1.0, 0.0)  # lg K is approached through these where the direct way does not close


def exponents(lay: Layout, model: ActivityModel, strength: FloatArray) -> tuple[FloatArray, FloatArray]:
    """D and dD/dI of every species (s, n)."""
    size = lay.size if model.sized else np.full((1, len(strength)), 4.5)
    d, d_i, *_ = model.exponent(lay.rest.a, lay.rest.b, strength, size)
    return np.broadcast_to(d, lay.lgc.shape), np.broadcast_to(d_i, lay.lgc.shape)


@dataclass(frozen=True)
class Trial:
    """The equations at a trial point: unknowns are pH, I and y, (c + 2) of them, last axis rows.

    residual : FloatArray (c + 2, n); jacobian : FloatArray (c + 2, c + 2, n); molality : FloatArray (s, n)
    """

    residual: FloatArray
    jacobian: FloatArray
    molality: FloatArray


def trial(
    lay: Layout,
    model: ActivityModel,
    ph: FloatArray,
    strength: FloatArray,
    y: FloatArray,
    softer: float = 0.0,
    rest: Balance | None = None,
) -> Trial:
    """Charge balance, ionic strength and the balance of every component, with their slopes.

    softer : added to lg K of every pair; rest : the part of what takes no part in pairs, where it is known already
    """
    b = balance(lay.rest, model, ph, strength) if rest is None else rest
    d, d_i = exponents(lay, model, strength)
    lg = lay.lgc + lay.q[:, None] * ph + lay.nu @ y + lay.shifts(d)
    if softer:
        lg = lg + softer * (lay.pair >= 0)[:, None]
    m = np.exp(LN10 * np.clip(lg, NOTHING, 3.0))
    count = len(lay.total)
    counted = np.stack([lay.z, -0.5 * lay.z**2, *lay.nu.T])  # (c + 2, s): what a species adds to every equation
    residual = counted @ m
    residual[0] += b.excess
    residual[1] += b.strength
    jacobian = np.empty((count + 2, count + 2, len(ph)))
    growing = LN10 * m
    jacobian[:, 0] = (counted * lay.q) @ growing
    jacobian[:, 1] = counted @ (growing * lay.shifts(d_i))
    for c in range(count):
        jacobian[:, c + 2] = (counted * lay.nu[:, c]) @ growing
    jacobian[0, 0] += b.excess_ph
    jacobian[0, 1] += b.excess_i
    jacobian[1, 0] += b.strength_ph
    jacobian[1, 1] += b.strength_i
    for c in range(count):
        residual[c + 2] -= lay.total[c]
        fixed = np.flatnonzero(lay.held[c] | (lay.total[c] <= 0.0))
        if len(fixed):
            total = lay.total[c, fixed]
            wanted = np.where(total > 0.0, np.log10(np.maximum(total, 1e-300)), NOTHING)
            residual[c + 2, fixed] = y[c, fixed] - wanted
            jacobian[c + 2][:, fixed] = 0.0
            jacobian[c + 2, c + 2, fixed] = 1.0
    return Trial(residual, jacobian, m)


def eliminate(jacobian: FloatArray, right: FloatArray) -> FloatArray:
    """Solution (k, n) of n systems of k equations, every row's at once; components first, whose pivots are positive."""
    k = len(jacobian)
    a, x = jacobian.copy(), right.copy()
    order = [*range(2, k), 0, 1]
    with np.errstate(divide="ignore", invalid="ignore"):
        for place, p in enumerate(order):
            inverse = 1.0 / a[p, p]
            for r in order[place + 1 :]:
                factor = a[r, p] * inverse
                a[r, order[place:]] -= factor * a[p, order[place:]]
                x[r] -= factor * x[p]
        for place in range(k - 1, -1, -1):
            p = order[place]
            for later in order[place + 1 :]:
                x[p] -= a[p, later] * x[later]
            x[p] /= a[p, p]
    return x


def start(lay: Layout, model: ActivityModel, ph: FloatArray, strength: FloatArray) -> FloatArray:
    """y of every component if there were no pairs, at a given pH and ionic strength (c, n)."""
    d, _ = exponents(lay, model, strength)
    lg = lay.lgc + lay.q[:, None] * ph + lay.shifts(d)
    y = np.full(lay.total.shape, NOTHING)
    for c in range(len(y)):
        own = (lay.nu[:, c] > 0.0) & (lay.pair < 0)
        most = lg[own].max(axis=0)
        whole = np.where(lay.held[c], 0.0, most + np.log10(np.exp(LN10 * (lg[own] - most)).sum(axis=0)))
        some = lay.total[c] > 0.0
        y[c, some] = np.log10(lay.total[c, some]) - whole[some]
    return y


def at_start(lay: Layout, model: ActivityModel, ph: FloatArray, strength: FloatArray) -> FloatArray:
    """Molality of all pairs of each row together, if the rest were as it is without them (n,)."""
    d, _ = exponents(lay, model, strength)
    lg = lay.lgc + lay.q[:, None] * ph + lay.nu @ start(lay, model, ph, strength) + lay.shifts(d)
    return np.asarray(np.exp(LN10 * np.clip(lg[lay.pair >= 0], NOTHING, 3.0)).sum(axis=0))


def solve_pairs(
    lay: Layout, model: ActivityModel, ph: FloatArray, strength: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray, BoolArray]:
    """pH, ionic strength and y with pairs, from the answer without them.

    Parameters
    ----------
    lay : Layout
        n solutions.
    model : ActivityModel
    ph, strength : ndarray (n,)
        The answer without pairs.

    Returns
    -------
    ph, strength : ndarray (n,); y : ndarray (c, n); solved : ndarray of bool (n,)
        NaN where not solved.

    Notes
    -----
    Newton in pH, I and the y together, steps held to 1 in pH and in y and to a factor of 2 in I. Rows that do not close
    so are led there through weaker pairs.
    """
    y = start(lay, model, ph, strength)
    x, i, y, done = _newton(lay, model, ph, strength, y, 0.0)
    left = np.flatnonzero(~done)
    if len(left):
        part = lay.take(left)
        x1, i1 = ph[left], strength[left]
        y1 = start(part, model, x1, i1)
        for softer in SOFTER:
            x1, i1, y1, closed = _newton(part, model, x1, i1, y1, softer)
        x[left], i[left], y[:, left], done[left] = x1, i1, y1, closed
    return np.where(done, x, np.nan), np.where(done, i, np.nan), np.where(done, y, np.nan), done


def _newton(
    lay: Layout, model: ActivityModel, ph: FloatArray, strength: FloatArray, y: FloatArray, softer: float
) -> tuple[FloatArray, FloatArray, FloatArray, BoolArray]:
    x, i, y = ph.copy(), strength.copy(), y.copy()
    done = np.zeros(len(x), bool)
    row = np.arange(len(x))
    part, tolerance = lay, TOLERANCE_SIZED if model.sized else TOLERANCE
    for _ in range(STEPS):
        now = trial(part, model, x[row], i[row], y[:, row], softer)
        step = eliminate(now.jacobian, -now.residual)
        step = np.where(np.isfinite(step), step, 0.1)
        largest = np.maximum(np.abs(step[0]), np.abs(step[1]) / i[row])
        largest = np.maximum(largest, np.abs(np.where(part.total > 0.0, step[2:], 0.0)).max(axis=0, initial=0.0))
        x[row] += np.clip(step[0], -1.0, 1.0)
        i[row] = np.clip(i[row] + step[1], 0.5 * i[row], 2.0 * i[row])
        y[:, row] += np.clip(step[2:], -1.0, 1.0)
        closed = largest < tolerance
        count = int(np.count_nonzero(closed))
        if count == len(row) or count > 0.3 * len(row):
            done[row[closed]] = True
            keep = np.flatnonzero(~closed)
            row = row[keep]
            part = part.take(keep)
        if not len(row):
            break
    return x, i, y, done
