"""The layout of a record under a supposed truth: sensitivities and variances recomputed where the recipe changes."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from scipy import sparse

from reconcile.auditor.layout import Layout, lot_sensitivities, matrix
from reconcile.records.arrays import FloatArray, IntArray
from reconcile.records.results import Prediction


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
    z = layout.z[rows].toarray()
    span = effects["span"]
    mine = layout.meter[rows] >= 0
    z[mine, span.first + layout.meter[rows[mine]]] = supposed.ph[mine] - 7.0
    lots = effects["lot"]
    z[:, lots.first : lots.last] = lot_sensitivities(records, supposed).toarray()[:, layout.lots_used]
    model = effects["model"]
    family = layout.family[rows]
    z[np.arange(len(rows)), model.first + family] = supposed.d_model
    known, fresh, variances = _constants(layout, supposed)
    constants = effects["constant"]
    z[:, constants.first : constants.last] = known
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
        z=_with_rows(layout.z, rows, z, fresh),
        prior=np.r_[layout.prior, variances],
        shared=shared,
        preparation=preparation,
        other=other,
    )


def _with_rows(z: sparse.csr_array, rows: IntArray, values: FloatArray, further: FloatArray) -> sparse.csr_array:
    """A matrix with some of its rows replaced, and further columns that are filled in those rows alone."""
    kept = z.copy()
    kept.data[np.isin(np.repeat(np.arange(z.shape[0]), np.diff(z.indptr)), rows)] = 0.0
    kept.eliminate_zeros()
    new = sparse.coo_array(np.hstack([values, further]))
    width = z.shape[1] + further.shape[1]
    placed = sparse.csr_array((new.data, (rows[new.row], new.col)), shape=(z.shape[0], width))
    whole = sparse.csr_array((kept.data, kept.indices, kept.indptr), shape=(z.shape[0], width))
    return sparse.csr_array(whole + placed)


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
