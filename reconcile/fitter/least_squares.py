"""Weighted nonlinear least squares of many cases at once: damped Gauss-Newton with analytic slopes, within bounds."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from reconcile.fitter.cases import Cases, Medium
from reconcile.fitter.model import Shape, predict
from reconcile.records.arrays import AnyArray, BoolArray, FloatArray, IntArray

STEPS = 80
PKA_LOW, PKA_HIGH = -2.0, 16.0
"""Constants that are looked for: beyond them water itself leaves nothing to see."""
SMALL = 1e-9  # a step that ends the search, in each parameter's own scale
SMALL_EFFECT = 1e-7  # or one whose effect is so small a part of the noise
SMALL_GAIN = 1e-9  # or that would lower the weighted sum of squares by so little, as in a valley that leads nowhere
TURN = 0.3  # ratio of successive steps from which on the next is stretched or shortened
LIGHT = 1e-2  # damping up to which the gain of a step is that of the undamped one
SLACK = 1e-8  # of the weighted sum of squares: what the engine's own rounding may do to it


@dataclass(frozen=True)
class Data:
    """What the readings of some cases say.

    observed, variance : FloatArray (N,)   pH, and its variance without what is common to several readings
    kept : BoolArray (N,)                  readings that take part
    """

    observed: FloatArray
    variance: FloatArray
    kept: BoolArray

    def take(self, rows: AnyArray) -> Data:
        return Data(self.observed[rows], self.variance[rows], self.kept[rows])


@dataclass(frozen=True)
class Point:
    """Where the search ended, for P cases of N readings.

    theta : FloatArray (P, k); residual (N,) observed - fitted; jacobian (N, k); chi2 (P,) weighted sum of squares of
    the readings kept; converged (P,)
    """

    theta: FloatArray
    residual: FloatArray
    jacobian: FloatArray
    chi2: FloatArray
    converged: BoolArray


def bounds(shape: Shape) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Lowest and highest value of every parameter, and the largest step, (k,) each."""
    s = shape.steps
    low = np.array([PKA_LOW] * s + [-300.0] * s + [-np.log(10.0), -2.0])
    high = np.array([PKA_HIGH] * s + [300.0] * s + [np.log(10.0), 2.0])
    step = np.array([2.0] * s + [40.0] * s + [0.5, 0.5])
    return low, high, step


def normal(cases: Cases, data: Data, residual: FloatArray, jacobian: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Normal matrices (P, k, k) and right-hand sides (P, k) of the readings kept."""
    weight = np.where(data.kept, 1.0 / data.variance, 0.0)
    scaled = jacobian * weight[:, None]
    k = jacobian.shape[1]
    square = (scaled[:, :, None] * jacobian[:, None, :]).reshape(len(jacobian), k * k)
    return cases.sums(square).reshape(-1, k, k), cases.sums(scaled * np.where(data.kept, residual, 0.0)[:, None])


def chi_squared(cases: Cases, data: Data, residual: FloatArray) -> FloatArray:
    """Weighted sum of squares of the readings kept, (P,); infinite where a pH was not reached."""
    part = np.where(data.kept, residual**2 / data.variance, 0.0)
    return cases.sums(np.where(np.isfinite(part), part, np.inf))


def at(medium: Medium, cases: Cases, shape: Shape, data: Data, theta: FloatArray) -> Point:
    """The fit at given parameters, nothing sought."""
    ph, jacobian = predict(medium, cases, shape, theta)
    residual = data.observed - ph
    chi2 = chi_squared(cases, data, residual)
    return Point(theta, residual, jacobian, chi2, np.ones(len(cases), bool))


def search(
    medium: Medium, cases: Cases, shape: Shape, data: Data, theta: FloatArray, free: BoolArray, steps: int = STEPS
) -> Point:
    """The parameters that make the weighted sum of squares least, from a start.

    Parameters
    ----------
    medium, cases, shape, data
        P cases of N readings.
    theta : ndarray (P, k)
        Start; parameters that are not free keep their value.
    free : ndarray of bool (P, k)

    Returns
    -------
    Point

    Notes
    -----
    Levenberg-Marquardt with Marquardt's scaling; steps are cut at the bounds. Where steps follow one another in a fixed
    ratio, as in curved valleys, the next is stretched or shortened to the end of that series. Cases that are done take
    no further part.

    References
    ----------
    Marquardt 1963, J. Soc. Indust. Appl. Math. 11:431, doi:10.1137/0111030; Aitken 1926, Proc. R. Soc. Edinb. 46:289,
    doi:10.1017/S0370164600022070 (the end of a geometric series).
    """
    low, high, widest = bounds(shape)
    scale = np.where(widest > 10.0, 100.0, 1.0)
    theta = theta.copy()
    point = at(medium, cases, shape, data, theta)
    residual, jacobian, chi2 = point.residual, point.jacobian, point.chi2
    damping, converged = np.full(len(cases), 1e-4), np.zeros(len(cases), bool)
    before, eased = np.zeros_like(theta), np.zeros(len(cases), bool)
    left: IntArray = np.arange(len(cases))
    part, rows, own = cases, np.arange(cases.readings), data
    for _ in range(steps):
        matrix, right = normal(part, own, residual[rows], jacobian[rows])
        step = _step(shape, matrix, right, free[left], damping[left], theta[left])
        small = _is_small(matrix, right, step, scale, damping[left])
        ratio = np.where(eased[left] | (damping[left] > LIGHT), 0.0, _ratio(matrix, step, before[left]))
        eased[left] = np.abs(ratio) > TURN
        factor = np.where(eased[left], 1.0 / (1.0 - np.clip(ratio, -1.5, 0.8)), 1.0)
        step = np.clip(theta[left] + step * factor[:, None], low, high) - theta[left]
        trial = theta[left] + step
        new = at(medium, part, shape, own, trial)
        slack = SLACK * (1.0 + chi2[left])
        good = new.chi2 <= chi2[left] + slack
        promised = 2.0 * np.sum(right * step, axis=1) - np.einsum("pi,pij,pj->p", step, matrix, step)
        poor = (chi2[left] - new.chi2 < 0.25 * promised) & (promised > slack)  # a step that went too far
        before[left] = np.where(good[:, None], step, 0.0)
        taken = left[good]
        theta[taken], chi2[taken] = trial[good], new.chi2[good]
        moved = good[part.case]
        residual[rows[moved]], jacobian[rows[moved]] = new.residual[moved], new.jacobian[moved]
        damping[left] = np.clip(np.where(good & ~poor, damping[left] * 0.1, damping[left] * 8.0), 1e-14, 1e16)
        done = small | (damping[left] > 1e14)
        converged[left[small]] = True
        if np.any(done):
            left = left[~done]
            if not len(left):
                break
            part = cases.take(left)
            rows = np.flatnonzero(np.isin(cases.case, left))
            own = data.take(rows)
    return Point(theta, residual, jacobian, chi2, converged)


def _is_small(
    matrix: FloatArray, right: FloatArray, step: FloatArray, scale: FloatArray, damping: FloatArray
) -> BoolArray:
    """Whether a step (P, k) is so small, or changes so little, that the search may end with it."""
    diagonal = np.sqrt(np.maximum(np.einsum("pkk->pk", matrix), 0.0))
    small = np.all((np.abs(step) < SMALL * scale) | (np.abs(step) * diagonal < SMALL_EFFECT), axis=1)
    gain = np.abs(np.sum(right * step, axis=1))
    return np.asarray(small | ((gain < SMALL_GAIN) & (damping <= LIGHT)))


def _ratio(matrix: FloatArray, step: FloatArray, before: FloatArray) -> FloatArray:
    """Ratio of a step to the one before, along the one before, (P,); 0 where there is none."""
    size = np.einsum("pi,pij,pj->p", before, matrix, before)
    along = np.einsum("pi,pij,pj->p", step, matrix, before)
    return np.where(size > 0.0, along / np.where(size > 0.0, size, 1.0), 0.0)


def _step(
    shape: Shape, matrix: FloatArray, right: FloatArray, free: BoolArray, damping: FloatArray, theta: FloatArray
) -> FloatArray:
    """Damped steps (P, k); a parameter at its bound that would leave it stays there, and its enthalpy with it."""
    low, high, widest = bounds(shape)
    stuck = ((theta <= low) & (right < 0.0)) | ((theta >= high) & (right > 0.0))
    stuck[:, shape.dh] |= stuck[:, shape.pka]
    moving = free & ~stuck
    k = matrix.shape[1]
    both = moving[:, :, None] & moving[:, None, :]
    system = np.where(both, matrix, 0.0)
    diagonal = np.einsum("pkk->pk", system)
    most = diagonal.max(axis=1, keepdims=True)
    added = damping[:, None] * diagonal + 1e-18 * most + 1e-300
    system[:, range(k), range(k)] += np.where(moving, added, 1.0)
    system = np.where(np.isfinite(system), system, 0.0) + np.where(np.isfinite(system), 0.0, 1.0)
    wanted = np.where(moving & np.isfinite(right), right, 0.0)
    norm = np.sqrt(np.maximum(np.einsum("pkk->pk", system), 1e-300))
    scaled = system / norm[:, :, None] / norm[:, None, :]
    step = np.linalg.solve(scaled + 1e-15 * np.eye(k), (wanted / norm)[..., None])[..., 0] / norm
    step = np.clip(np.nan_to_num(step), -widest, widest)
    return np.asarray(np.clip(theta + step, low, high) - theta)
