"""The layout of a record under a supposed truth: sensitivities and variances recomputed where the recipe changes."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from scipy import sparse

from reconcile.auditor.layout import Layout, lot_sensitivities, matrix
from reconcile.records.arrays import FloatArray, IntArray
from reconcile.records.results import Prediction

LEAST_MOVED = 1e-3
"""Uncertainty of a supposed truth that a long record takes beside its covariance [pH]."""


def relinearised(layout: Layout, rows: IntArray, supposed: Prediction) -> Layout:
    """A layout in which some rows rest on another prediction than the recipe's; its residuals stay as they are.

    Parameters
    ----------
    rows : ndarray (m,)    evidence rows
    supposed : Prediction  of those rows, in that order, under the supposed truth

    Returns
    -------
    Layout
        With the sensitivities to lots, constants, the activity model and the preparation that hold under it; constants
        that only it knows become further columns.
    """
    records, effects = layout.records, layout.effects
    z = layout.z.toarray()
    span = effects["span"]
    mine = layout.meter[rows] >= 0
    z[rows[mine], span.first + layout.meter[rows[mine]]] = supposed.ph[mine] - 7.0
    lots = effects["lot"]
    z[rows, lots.first : lots.last] = lot_sensitivities(records, supposed).toarray()[:, layout.lots_used]
    model = effects["model"]
    family = layout.family[rows]
    z[rows, model.first + family] = supposed.d_model
    known, fresh, variances = _constants(layout, supposed)
    constants = effects["constant"]
    z[rows, constants.first : constants.last] = known
    further = np.zeros((len(layout), fresh.shape[1]))
    further[rows] = fresh
    t = supposed.contributions
    square = np.bincount(t.row, t.value**2, minlength=len(rows))
    taken = np.bincount(t.row, (t.value * records.solutions.u_amount[t.column]) ** 2, minlength=len(rows))
    before = layout.prediction
    old = matrix(before.contributions).tocsr()[layout.reading[rows]]
    was_taken = np.asarray(old.multiply(old) @ np.square(records.solutions.u_amount)).ravel()
    shared, preparation, other = layout.shared.copy(), layout.preparation.copy(), layout.other.copy()
    shared[rows] = np.maximum(shared[rows] - was_taken, 0.0) + taken
    preparation[rows] = np.sqrt(square)
    warm = np.nan_to_num(before.budget["temperature"][layout.reading[rows]])
    other[rows] = np.maximum(other[rows] - warm**2, 0.0) + np.nan_to_num(supposed.budget["temperature"]) ** 2
    return replace(
        layout,
        z=sparse.csr_array(np.hstack([z, further])),
        prior=np.r_[layout.prior, variances],
        shared=shared,
        preparation=preparation,
        other=other,
    )


def constants_moved(layout: Layout, rows: IntArray, supposed: Prediction) -> sparse.csc_array:
    """What constants leave unsure about a supposed truth beyond what the layout holds, (n, m) of unit variance [pH].

    A long record keeps its covariance and takes these columns beside it: u(pKa) times the change of dpH/dpKa, for the
    constants that the layout holds as well as for those that only the supposed truth knows.
    """
    known, fresh, variances = _constants(layout, supposed)
    constants = layout.effects["constant"]
    before = layout.z[rows][:, constants.first : constants.last].toarray()
    prior = layout.prior[constants.first : constants.last]
    moved = np.hstack([(known - before) * np.sqrt(prior), fresh * np.sqrt(variances)])
    moved = moved[:, np.abs(moved).max(axis=0, initial=0.0) > LEAST_MOVED]
    entries = sparse.coo_array(moved)
    return sparse.csc_array((entries.data, (rows[entries.row], entries.col)), shape=(len(layout), moved.shape[1]))


def _constants(layout: Layout, supposed: Prediction) -> tuple[FloatArray, FloatArray, FloatArray]:
    """dpH/dpKa of the constants that the layout holds, of those it does not, and the variances of the latter."""
    dense = matrix(supposed.constants).toarray()
    names = [f"{acid}, step {step}" for acid, step in supposed.constant_names]
    place = {name: i for i, name in enumerate(layout.effects["constant"].subjects)}
    known = np.zeros((dense.shape[0], len(place)))
    fresh = []
    for column, name in enumerate(names):
        if name in place:
            known[:, place[name]] = dense[:, column]
        elif np.abs(dense[:, column]).max(initial=0.0) * supposed.constant_u[column] > 1e-5:
            fresh.append(column)
    return known, dense[:, fresh], np.square(supposed.constant_u[fresh])
