"""One fit of every case: start, noise, readings rejected, covariance."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from scipy import special

from reconcile.fitter.cases import Cases, Medium
from reconcile.fitter.least_squares import STEPS, Data, Point, bounds, normal, search
from reconcile.fitter.model import Shape
from reconcile.fitter.scatter import FIRST_SIGMA, Scatter, estimated_sigma
from reconcile.fitter.starts import starts
from reconcile.records.arrays import BoolArray, FloatArray

STRETCH = 0.01
QUICK_STEPS = 6
ROUNDS = 3
"""Times that noise and fit are brought into agreement."""
UNSEEN = (3.0, 300.0, 1.5, 1.5)
"""u of a constant, an enthalpy [kJ/mol], ln strength and an offset from which on the readings say nothing about it."""


@dataclass(frozen=True)
class Fitted:
    """A fit of P cases of N readings with k parameters.

    theta (P, k); covariance (P, k, k), of the readings' own scatter, 0 for what is not free or not seen
    seen : BoolArray (P, k)       free parameters that the readings say something about
    sigma (P,) [pH]; freedom (P,) n - p, infinite where the noise was given
    data : observed, variance, kept; residual (N,); jacobian (N, k)
    leverage (N,); deleted (N,) externally studentised residual
    chi2 (P,); converged (P,)
    scale (P,) by which the readings scatter more than the noise stated for them; 1 where they do not
    """

    theta: FloatArray
    covariance: FloatArray
    free: BoolArray
    seen: BoolArray
    sigma: FloatArray
    freedom: FloatArray
    data: Data
    residual: FloatArray
    jacobian: FloatArray
    leverage: FloatArray
    deleted: FloatArray
    chi2: FloatArray
    converged: BoolArray
    scale: FloatArray


@dataclass(frozen=True)
class Task:
    """What is to be fitted: P cases of N readings, all with one shape, and which parameters are free (k,)."""

    medium: Medium
    cases: Cases
    shape: Shape
    observed: FloatArray
    scatter: Scatter
    free: BoolArray
    held: FloatArray
    near: bool = False
    """held (k,): values of the parameters that are not free; near: the search begins near these."""


def first_data(task: Task) -> Data:
    """The readings with the noise that is assumed before any is estimated."""
    sigma = np.full(task.cases.readings, FIRST_SIGMA)
    return Data(task.observed, task.scatter.variance(sigma), np.ones(task.cases.readings, bool))


def fit(task: Task, theta: FloatArray | None = None) -> Fitted:
    """Least squares of every case with its noise; no reading is rejected.

    theta : ndarray (P, k), start; looked for on a grid of constants when None
    """
    data = first_data(task)
    free = np.tile(task.free, (len(task.cases), 1))
    if theta is None:
        theta = starts(task.medium, task.cases, task.shape, data, task.free, task.held, task.near)
    point = search(task.medium, task.cases, task.shape, data, theta, free)
    return settle(task, data, point)


def refit(task: Task, fitted: Fitted, kept: BoolArray, quickly: bool = False) -> Fitted:
    """The same with other readings kept, from where it ended.

    quickly : a few steps, which do where the fit is only to show which reading lies furthest from it
    """
    data = replace(fitted.data, kept=kept)
    most = QUICK_STEPS if quickly else STEPS
    point = search(task.medium, task.cases, task.shape, data, fitted.theta, fitted.free, most)
    return settle(task, data, point, 1 if quickly else ROUNDS)


def settle(task: Task, data: Data, point: Point, rounds: int = ROUNDS) -> Fitted:
    """Brings noise and fit into agreement, and works out covariance, leverage and studentised residuals."""
    medium, cases, shape = task.medium, task.cases, task.shape
    free = np.tile(task.free, (len(cases), 1))
    count = cases.sums(data.kept.astype(float))
    given = task.scatter.known_in(cases)
    sigma = np.zeros(len(cases))
    for turn in range(rounds):
        seen = _seen(cases, shape, data, point, free)
        left = count - seen.sum(axis=1)
        sigma = estimated_sigma(cases, task.scatter, point.residual, data.kept, left)
        sigma = np.where(left < 1.0, FIRST_SIGMA, sigma)
        variance = task.scatter.variance(cases.spread(sigma))
        ratio = np.log(variance / data.variance)
        data = replace(data, variance=variance)
        whole = cases.spread(cases.sums(ratio) / np.diff(cases.first))
        if turn and float(np.abs(ratio).max(initial=0.0)) < 1e-6:
            break
        if (
            rounds > 1 and float(np.abs(ratio - whole).max(initial=0.0)) > 1e-9
        ):  # weights have moved against one another
            point = search(medium, cases, shape, data, point.theta, free)
    seen = _seen(cases, shape, data, point, free)
    left = count - seen.sum(axis=1)
    data, scale = _stretched(cases, data, point, given, left)
    freedom = np.where((given & (scale <= 1.0)) | (left < 1.0), np.inf, left)
    chi2 = cases.sums(np.where(data.kept, point.residual**2 / data.variance, 0.0))
    covariance = _covariance(cases, data, point, seen)
    leverage, deleted = _deleted(task, data, point, covariance, chi2, freedom)
    return Fitted(
        theta=point.theta,
        covariance=covariance,
        free=free,
        seen=seen,
        sigma=sigma,
        freedom=freedom,
        data=data,
        residual=point.residual,
        jacobian=point.jacobian,
        leverage=leverage,
        deleted=deleted,
        chi2=chi2,
        converged=point.converged,
        scale=scale,
    )


def _stretched(cases: Cases, data: Data, point: Point, given: BoolArray, left: FloatArray) -> tuple[Data, FloatArray]:
    """Variances stretched where readings of given noise scatter more than it allows at the 1 % level."""
    chi2 = cases.sums(np.where(data.kept, point.residual**2 / data.variance, 0.0))
    most = special.chdtri(np.maximum(left, 1.0), STRETCH)
    wide = given & (left >= 1.0) & (chi2 > most)
    scale = np.where(wide, np.sqrt(chi2 / np.maximum(left, 1.0)), 1.0)
    return replace(data, variance=data.variance * cases.spread(scale) ** 2), scale


def _seen(cases: Cases, shape: Shape, data: Data, point: Point, free: BoolArray) -> BoolArray:
    """Free parameters away from their bounds that the readings say something about."""
    low, high, _ = bounds(shape)
    s = shape.steps
    least = np.array([UNSEEN[0]] * s + [UNSEEN[1]] * s + [UNSEEN[2], UNSEEN[3]]) ** -2.0
    matrix, _ = normal(cases, data, point.residual, point.jacobian)
    inside = (point.theta > low) & (point.theta < high)
    return np.asarray(free & inside & (np.einsum("pkk->pk", matrix) > least))


def _covariance(cases: Cases, data: Data, point: Point, seen: BoolArray) -> FloatArray:
    matrix, _ = normal(cases, data, point.residual, point.jacobian)
    return inverse(matrix, seen)


def inverse(matrix: FloatArray, seen: BoolArray) -> FloatArray:
    """Inverse of the normal matrices (P, k, k) over the parameters seen (P, k); 0 elsewhere.

    Directions that the readings leave open get a variance as large as numbers allow, so that they show.
    """
    both = seen[:, :, None] & seen[:, None, :]
    diagonal = np.where(seen, np.einsum("pkk->pk", matrix), 1.0)
    norm = np.sqrt(np.where(diagonal > 0.0, diagonal, 1.0))
    scaled = np.where(both, matrix, 0.0) / norm[:, :, None] / norm[:, None, :]
    scaled[:, range(matrix.shape[1]), range(matrix.shape[1])] += np.where(seen, 0.0, 1.0)
    values, vectors = np.linalg.eigh(np.nan_to_num(scaled))
    turned = vectors / np.maximum(values, 1e-13)[:, None, :]
    whole = turned @ np.swapaxes(vectors, 1, 2)
    return np.where(both, whole / norm[:, :, None] / norm[:, None, :], 0.0)


def _deleted(
    task: Task, data: Data, point: Point, covariance: FloatArray, chi2: FloatArray, freedom: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Leverage, and the residual over its standard deviation as estimated without the reading itself.

    References
    ----------
    Cook and Weisberg 1982, Residuals and Influence in Regression, equations 2.1.8 and 2.2.9.
    """
    cases = task.cases
    own = cases.spread(covariance)
    leverage = np.einsum("ni,nij,nj->n", point.jacobian, own, point.jacobian) / data.variance
    leverage = np.where(data.kept, np.clip(leverage, 0.0, 1.0), np.nan)
    square = point.residual**2 / data.variance / np.maximum(1.0 - leverage, 1e-9)
    left = cases.spread(freedom)
    floor = task.scatter.variance(np.zeros(cases.readings)) / data.variance
    with np.errstate(invalid="ignore", divide="ignore"):
        without = np.where(left > 1.0, (cases.spread(chi2) - square) / (left - 1.0), np.nan)
    scale = np.where(np.isfinite(left), np.maximum(without, floor), 1.0)
    deleted = np.sign(point.residual) * np.sqrt(square / scale)
    out = ~data.kept  # a reading left out is judged by the fit that it had no part in
    spread = np.einsum("ni,nij,nj->n", point.jacobian, own, point.jacobian) + data.variance
    return leverage, np.where(out, point.residual / np.sqrt(spread), deleted)
