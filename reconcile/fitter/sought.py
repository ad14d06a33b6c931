"""Which parameters are sought: the steps that the readings bear on, enthalpies, strength and offset."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from reconcile.chemistry.water import ZERO_CELSIUS
from reconcile.fitter.common_errors import taking_variance
from reconcile.fitter.evidence import Evidence
from reconcile.fitter.fitting import Fitted, Task, fit, refit
from reconcile.fitter.library_constants import heats
from reconcile.fitter.model import Shape, found_at, predict
from reconcile.fitter.question import Studied
from reconcile.fitter.rejection import fit_without
from reconcile.fitter.scatter import FIRST_SIGMA, Scatter, estimated_sigma
from reconcile.records.arrays import BoolArray, FloatArray

SPAN_K = 10.0
"""Span of temperatures from which an enthalpy is sought [K]."""
WORTH = 0.10
"""u of a library acid's constant above which a step is held at the library's value instead of being sought."""


@dataclass(frozen=True)
class Structure:
    """One number of steps: shape, start and parameters that are free."""

    shape: Shape
    held: FloatArray
    free: BoolArray


def structure(evidence: Evidence, studied: Studied, steps: int, free: tuple[str, ...]) -> Structure:
    """Shape of one number of steps at the readings' mean temperature, with what is sought."""
    kelvin = float(evidence.temperature.mean()) + ZERO_CELSIUS
    acids = studied.table(steps)
    i = acids.index[studied.acid]
    constant = int(acids.first[i]) + np.arange(steps)
    dcp, dh = np.zeros(steps), np.zeros(steps)
    if studied.known:
        dh, dcp = heats(acids, constant, kelvin - ZERO_CELSIUS)
    shape = Shape(steps, studied.charge, kelvin, dcp)
    pka = acids.pka_at(constant, np.full(steps, kelvin - ZERO_CELSIUS))
    held = np.concatenate([pka, dh, [0.0, 0.0]])
    warm = float(np.ptp(evidence.temperature)) >= SPAN_K
    mask = np.array([True] * steps + [warm] * steps + ["strength" in free, "offset" in free])
    if studied.known:
        mask = _worth_seeking(evidence, shape, held, mask)
    return Structure(shape, held, mask)


def _worth_seeking(evidence: Evidence, shape: Shape, held: FloatArray, free: BoolArray) -> BoolArray:
    """Of a library acid, the steps that the readings would tell, one at least; the others keep the library's values.

    Judged by the slopes at the library's constants: u of the step if it alone were sought. No more are sought than
    there are readings for.
    """
    _, jacobian = predict(evidence.medium, evidence.cases, shape, held[None])
    slopes = np.nan_to_num(jacobian[:, shape.pka]) / np.maximum(evidence.floor, FIRST_SIGMA)[:, None]
    u = 1.0 / np.sqrt(np.maximum((slopes**2).sum(axis=0), 1e-300))
    each = 2 if free[shape.dh].any() else 1
    most = max(1, (len(evidence) - int(free[shape.strength :].sum())) // each)
    rank = np.argsort(np.argsort(u, kind="stable"), kind="stable")
    worth = ((u <= WORTH) & (rank < most)) | (rank == 0)
    free = free.copy()
    free[shape.pka] &= worth
    free[shape.dh] &= worth
    return free


@dataclass(frozen=True)
class Outcome:
    """A fit with one number of steps: with all readings, and without those rejected."""

    structure: Structure
    task: Task
    whole: Fitted
    fitted: Fitted


def outcome(evidence: Evidence, studied: Studied, structure: Structure) -> Outcome:
    """Fits one number of steps: noise, amounts taken, rejected readings."""
    n = len(evidence)
    scatter = Scatter(evidence.floor, evidence.averaged, np.zeros(n), evidence.given)
    task = Task(
        evidence.medium, evidence.cases, structure.shape, evidence.observed, scatter, structure.free, structure.held,
        near=studied.known,
    )  # fmt: skip
    whole = fit(task)
    for _ in range(2):
        found = found_at(evidence.medium, evidence.cases, structure.shape, whole.theta)
        scatter = Scatter(evidence.floor, evidence.averaged, taking_variance(evidence, found), evidence.given)
        task = Task(
            evidence.medium, evidence.cases, structure.shape, evidence.observed, scatter, structure.free,
            structure.held, near=studied.known,
        )  # fmt: skip
        whole = fit(task, whole.theta)
    return Outcome(structure, task, whole, fit_without(task, whole))


def compared(tried: Mapping[int, Outcome]) -> dict[int, float]:
    """AICc of every number of steps, NaN where it cannot be had.

    What one number of steps rejects every other may reject as well, at the price of a parameter for each reading:
    otherwise a number would win by nothing but a reading that it alone was rid of.
    """
    kept = {one.fitted.data.kept.tobytes(): one.fitted.data.kept for one in tried.values()}
    out = {}
    for number, one in tried.items():
        own = one.fitted
        fits = [own if np.array_equal(own.data.kept, k) else refit(one.task, own, k) for k in kept.values()]
        found = [aicc(one.task, fitted) for fitted in fits]
        out[number] = float(np.nanmin(found)) if np.any(np.isfinite(found)) else float("nan")
    return out


def aicc(task: Task, fitted: Fitted) -> float:
    """Akaike's criterion corrected for few readings, of a single case.

    Notes
    -----
    -2 ln L + 2k + 2k(k + 1)/(n - k - 1), at the noise of greatest likelihood but not under its floor. k counts every
    parameter that is free, the noise where it is estimated, and one for each rejected reading, whose own residual is
    then nothing.

    References
    ----------
    Hurvich and Tsai 1989, Biometrika 76:297, doi:10.1093/biomet/76.2.297.
    """
    kept = fitted.data.kept
    n, rejected = len(kept), int(np.count_nonzero(~kept))
    given = bool(task.scatter.known_in(task.cases)[0])
    k = int(task.free.sum()) + rejected + (0 if given else 1)
    if n - k - 1 <= 0:
        return float("nan")
    most = estimated_sigma(task.cases, task.scatter, fitted.residual, kept, np.array([float(kept.sum())]))
    variance = task.scatter.variance(task.cases.spread(most))
    loss = float(np.sum(np.log(2.0 * np.pi * variance)) + np.sum(np.where(kept, fitted.residual**2 / variance, 0.0)))
    return loss + 2.0 * k + 2.0 * k * (k + 1.0) / (n - k - 1.0)
