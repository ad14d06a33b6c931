"""Which solutions need more than first order for their uncertainty, and what draws give for them."""

from __future__ import annotations

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.activity import ActivityModel
from reconcile.chemistry.composition import Contents, FormTable, entries_at
from reconcile.chemistry.engine import LARGE, Answers, solved_ph
from reconcile.chemistry.monte_carlo import Errors, spread
from reconcile.chemistry.uncertainty import ROOT3
from reconcile.chemistry.water import ZERO_CELSIUS
from reconcile.records.arrays import FloatArray, IntArray

BEND = 0.08
"""Share of the amounts in u [pH] from which on the pH curve bends within the spread: buffering changes by a fifth."""
DRAWS = 512


def u_drawn(
    contents: Contents,
    forms: FormTable,
    acids: AcidTable,
    model: ActivityModel,
    errors: Errors,
    answers: Answers,
    amounts: FloatArray,
) -> FloatArray:
    """Standard uncertainty by Monte Carlo where first order does not serve.

    Parameters
    ----------
    contents, forms, acids, model, errors, answers
        n solutions, as for monte_carlo.spread.
    amounts : ndarray (n,)
        Share of strengths and taking together, to first order [pH].

    Returns
    -------
    ndarray (n,)
        [pH], carbon dioxide left out; NaN where first order serves.

    References
    ----------
    JCGM 101:2008, section 5.7 (where the law of propagation may be used) and 7.
    """
    out = np.full(len(contents), np.nan)
    with np.errstate(invalid="ignore"):
        bent = answers.solved & (amounts > BEND)
    rows = np.flatnonzero(bent)
    if len(rows):
        out[rows] = spread(contents, rows, forms, acids, model, errors, answers, DRAWS)
    rows = np.flatnonzero(answers.solved & answers.uneven & ~bent)
    if len(rows):
        others = amounts[rows] ** 2 + (answers.d_temperature[rows] * errors.u_temperature[rows]) ** 2
        others += (answers.d_model[rows] * errors.u_model) ** 2
        out[rows] = np.sqrt(others + _of_constants(contents, rows, forms, acids, model, answers))
    return out


def _of_constants(
    contents: Contents, rows: IntArray, forms: FormTable, acids: AcidTable, model: ActivityModel, answers: Answers
) -> FloatArray:
    """Variance that the constants cause, with the bend along the most uncertain one of each solution (r,) [pH^2].

    Three points of a normal distribution, at 0 and at sqrt 3 standard deviations either way with weight 1/6, give its
    moments to the fifth (Abramowitz and Stegun 1964, equation 25.4.46 and table 25.10, n = 3).
    """
    at, row = entries_at(answers.constants.start, rows)
    q = answers.constants.column[at]
    u = acids.u_at(q, contents.temperature_c[rows[row]] + ZERO_CELSIUS)
    load = np.where(u > LARGE, np.abs(answers.constants.value[at] * u), 0.0)
    order = np.lexsort([load, row])
    last = order[np.flatnonzero(np.concatenate([np.diff(row[order]) > 0, [True]]))]  # the largest of each solution
    entry, place = entries_at(contents.start, rows)
    some = Contents(
        np.concatenate([[0], np.cumsum(np.bincount(place, minlength=len(rows)))]).astype(np.intp),
        contents.form[entry],
        contents.amount[entry],
        contents.temperature_c[rows],
        contents.open_co2[rows],
    )
    square = np.zeros(len(rows))
    for sign in (1.0, -1.0):
        ph = solved_ph(some, forms, acids, model, q[last], sign * ROOT3 * u[last])
        square += (ph - answers.ph[rows]) ** 2 / 6.0
    straight = answers.u_constants[rows] ** 2 - load[last] ** 2
    return np.where(np.isfinite(square), straight + square, answers.u_constants[rows] ** 2)


def errors_of_record(
    origin: IntArray,
    chain_start: IntArray,
    chain_lot: IntArray,
    u_lot: FloatArray,
    u_taking: FloatArray,
    u_temperature: FloatArray,
    u_model: float,
) -> Errors:
    """Errors of solutions whose contributions come from a record: one for each lot, one for each taking.

    Parameters
    ----------
    origin : ndarray of int (e,)
        Contribution of the record that each contribution is; -1 for carbon dioxide, whose amount is supposed.
    chain_start, chain_lot, u_lot, u_taking
        As in of_records.Record.
    u_temperature : ndarray (n,)
        [K].
    u_model : float
    """
    kept = np.flatnonzero(origin >= 0)
    link, which = entries_at(chain_start, origin[kept])
    return Errors(
        np.concatenate([kept[which], kept]),
        np.concatenate([chain_lot[link], len(u_lot) + origin[kept]]),
        np.concatenate([u_lot[chain_lot[link]], u_taking[origin[kept]]]),
        u_temperature,
        u_model,
    )
