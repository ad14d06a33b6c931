"""Which acid of the library could it be: each with its own constants against the same readings."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.composition import form_table
from reconcile.fitter.cases import Medium
from reconcile.fitter.common_errors import Common
from reconcile.fitter.evidence import Evidence
from reconcile.fitter.fitting import Fitted
from reconcile.fitter.further_acids import with_further
from reconcile.fitter.library_constants import u_constant
from reconcile.fitter.model import evaluate, without_uncertainty
from reconcile.fitter.scatter import quantile_f
from reconcile.records.arrays import FloatArray, IntArray
from reconcile.records.pka_results import PkaCandidate
from reconcile.records.substances import ions

MOST = 8
"""Candidates reported."""
SCREENED = 400
"""Readings on which every acid is tried; the best are then tried on all."""
KEPT = 24
LEVEL = 0.99
WIDE = 100.0
"""Standard uncertainty of what is left free, so large that it does not count."""
TOGETHER = 40


def candidates(
    evidence: Evidence,
    fitted: Fitted,
    errors: Sequence[Common],
    free: Sequence[FloatArray],
    sought: int,
    table: AcidTable,
) -> tuple[PkaCandidate, ...]:
    """The acids of the library that explain the readings best, best first.

    Parameters
    ----------
    evidence, fitted
        The n readings and their fit.
    errors : sequence of Common
        What the readings share: strengths, meters, temperature, activity model.
    free : sequence of ndarray (n,)
        Effects of what was set free beside the constants; every candidate may use them too.
    sought : int
        Number of constants found.
    table : AcidTable
        The library with its uncertainties.

    Returns
    -------
    tuple of PkaCandidate

    Notes
    -----
    Each acid takes the place of the studied one at the same amounts of substance and charges, with its own constants.
    Its misfit is what remains of the readings when the shared errors, and its own constants within their uncertainties,
    are used in its favour: r' V^-1 r with V the noise and all of these. The log likelihood ratio is minus half its
    excess over the misfit of the fitted constants, which use the same; a candidate explains the readings while twice
    the ratio stays within the 99 % quantile of sought F(sought, n - p).

    References
    ----------
    Seber and Wild 1989, Nonlinear Regression, section 5.3 (likelihood ratio of a subset of parameters).
    """
    possible = _possible(evidence, table)
    kept = np.flatnonzero(fitted.data.kept)
    if len(kept) > SCREENED:
        thin = kept[(np.arange(SCREENED) * len(kept)) // SCREENED]
        misfit, _ = _misfits(evidence, fitted, errors, free, thin, possible, table)
        possible = possible[np.argsort(misfit, kind="stable")[:KEPT]]
    misfit, rms = _misfits(evidence, fitted, errors, free, kept, possible, table)
    wide = [fitted.jacobian[kept, j] for j in np.flatnonzero(fitted.seen[0]).tolist()]
    columns = [error.effect[kept] * error.u for error in errors] + [WIDE * column for column in wide]
    best = _quadratic(fitted.residual[kept], fitted.data.variance[kept], columns)
    ratio = -0.5 * (misfit - best)
    within = float(quantile_f(max(sought, 1), fitted.freedom, LEVEL)[0])
    mean = float(evidence.temperature[kept].mean())
    found = []
    for place in np.argsort(-ratio, kind="stable")[:MOST].tolist():
        acid = int(possible[place])
        constant = int(table.first[acid]) + np.arange(int(table.steps[acid]))
        pka = table.pka_at(constant, np.full(len(constant), mean))
        explains = bool(-2.0 * ratio[place] <= within)
        found.append(
            PkaCandidate(table.names[acid], float(ratio[place]), explains, float(rms[place]), tuple(pka.tolist()))
        )
    return tuple(found)


def _possible(evidence: Evidence, table: AcidTable) -> IntArray:
    """Acids that can carry the charge which the studied one carries in every form that brings it."""
    medium = evidence.medium
    name, charge = medium.acids.names[medium.studied], medium.acids.charge[medium.studied]
    low, high = table.charge - table.steps - 1e-9, table.charge + 1e-9
    fits = np.ones(len(table.names), bool)
    for f in medium.bringing.tolist():
        form = evidence.records.forms[f]
        carried = [float(ions()[ion].charge) for ion in form.ions if ions()[ion].acid == name]
        if form.acid == name:
            carried.append(float(charge) - form.protons_removed)
        for z in carried:
            fits &= (low <= z) & (z <= high)
    return np.flatnonzero(fits)


def _wide(evidence: Evidence, table: AcidTable) -> Medium:
    """The chemistry of the solutions with the whole library; an unfamiliar acid stands behind it."""
    own = evidence.medium
    name, place = own.acids.names[own.studied], own.studied
    wide = table
    if name not in table.index:
        shape = (1, int(own.acids.steps[place]))
        wide = with_further(table, (name,), int(own.acids.charge[place]), {"pka": np.full(shape, 7.0)})
    plain = without_uncertainty(wide)
    return replace(own, forms=form_table(evidence.records.forms, plain), acids=plain, studied=plain.index[name])


def _misfits(
    evidence: Evidence,
    fitted: Fitted,
    errors: Sequence[Common],
    free: Sequence[FloatArray],
    rows: IntArray,
    possible: IntArray,
    table: AcidTable,
) -> tuple[FloatArray, FloatArray]:
    """Misfit of every candidate, and its root mean square residual with nothing adjusted."""
    cases = evidence.cases.of_readings(rows, np.array([len(rows)]))
    observed, variance = evidence.observed[rows], fitted.data.variance[rows]
    shared = [error.effect[rows] * error.u for error in errors if not error.own]
    shared += [WIDE * column[rows] for column in free]
    medium = _wide(evidence, table)
    misfit, rms = np.empty(len(possible)), np.empty(len(possible))
    for begin in range(0, len(possible), TOGETHER):
        some = possible[begin : begin + TOGETHER]
        many = cases.take(np.zeros(len(some), np.intp))
        found = evaluate(medium, many, medium.acids, some, np.ones(len(some)))
        ph = found.ph.reshape(len(some), len(rows))
        slopes = found.slopes.reshape(len(some), len(rows), -1)
        for k, acid in enumerate(some.tolist()):
            residual = observed - ph[k]
            columns = shared + _constants(slopes[k], int(acid), table, evidence.temperature[rows])
            place = begin + k
            misfit[place] = _quadratic(residual, variance, columns) if np.all(np.isfinite(residual)) else np.inf
            rms[place] = float(np.sqrt(np.mean(residual**2)))
    return misfit, rms


def _constants(slopes: FloatArray, acid: int, table: AcidTable, temperature: FloatArray) -> list[FloatArray]:
    """Effect of each of a candidate's own constants within its uncertainty."""
    out = []
    for step in range(int(table.steps[acid])):
        q = np.full(len(temperature), int(table.first[acid]) + step)
        out.append(slopes[:, step] * u_constant(table, q, temperature))
    return out


def _quadratic(residual: FloatArray, variance: FloatArray, columns: Sequence[FloatArray]) -> float:
    """r' V^-1 r with V = diag(variance) + sum of c c' over the columns, by the matrix inversion lemma."""
    weight = 1.0 / variance
    plain = float(np.sum(weight * residual**2))
    used = [c for c in columns if np.any(np.nan_to_num(c))]
    if not used:
        return plain
    stack = np.nan_to_num(np.stack(used, axis=1))
    inner = np.eye(stack.shape[1]) + stack.T @ (weight[:, None] * stack)
    right = stack.T @ (weight * residual)
    scale = 1.0 / np.sqrt(np.diag(inner))
    solved = np.linalg.solve(inner * scale[:, None] * scale[None, :], right * scale)
    return plain - float((right * scale) @ solved)
