"""Predictions of readings still to be taken, from the factored covariance of a long record."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy import sparse

from reconcile.auditor.base_model import BaseModel
from reconcile.auditor.layout import Layout
from reconcile.records.arrays import FloatArray, IntArray


@dataclass(frozen=True)
class Ahead:
    """Covariance c of a record with m readings to come, in the parts that a factored covariance needs.

    effects : FloatArray (q, m)   scaled effects that each reading to come rests on
    shared : sparse (n, m)        what it shares with the readings of its own batch [pH^2]
    known : FloatArray (m,)       c' K c: variance that the record takes off it [pH^2]
    """

    base: BaseModel
    effects: FloatArray
    shared: sparse.csc_array
    known: FloatArray

    def carried(self, weighed: FloatArray) -> FloatArray:
        """c' K y from K y, (m,) or (m, k)."""
        return np.asarray(self.effects.T @ (self.base.z.T @ weighed) + self.shared.T @ weighed)


def ahead(base: BaseModel, z_new: FloatArray, templates: IntArray, batch_sd: FloatArray, sd_new: FloatArray) -> Ahead:
    """What a record says of readings to come.

    Parameters
    ----------
    z_new : FloatArray (m, q')    their rows of the design, in the columns of layout.z
    templates : IntArray (m,)     a reading of the same batch; -1 for a known solution
    batch_sd : FloatArray (n,)    standard deviation that each reading shares with its batch [pH]
    sd_new : FloatArray (m,)      the same of the readings to come [pH]

    Notes
    -----
    With c = Z e + s: c' K c = e' (I - M^-1) e + 2 s' W Z M^-1 e + s' K s, as Z' K Z = I - M^-1 and K Z = W Z M^-1.
    """
    layout = base.layout
    effects = np.zeros((base.z.shape[1], len(z_new)))
    effects[: len(base.columns)] = (z_new[:, base.columns] * np.sqrt(base.g[base.columns])).T
    wide = {int(batch): i for i, batch in enumerate(base.wide)}
    rows: list[IntArray] = []
    values: list[FloatArray] = []
    for j, template in enumerate(templates.tolist()):
        batch = int(layout.batch[template]) if template >= 0 else -1
        if batch in wide:
            effects[len(base.columns) + wide[batch], j] = sd_new[j]
        inside = rows_of_batch(layout, batch) if batch >= 0 and batch not in wide else np.zeros(0, np.intp)
        rows.append(inside)
        values.append(batch_sd[inside] * sd_new[j])
    sizes = [len(part) for part in rows]
    shared = sparse.csc_array(
        (np.concatenate(values), np.concatenate(rows), np.r_[0, np.cumsum(sizes)]), shape=(len(layout), len(z_new))
    )
    taken = base.solved(effects)
    known = np.einsum("ij,ij->j", effects, effects - taken) + base.quadratic(shared)
    known += 2.0 * np.asarray(base.cross(shared).multiply(taken).sum(axis=0)).ravel()
    return Ahead(base, effects, shared, np.asarray(known, float))


def rows_of_batch(layout: Layout, batch: int) -> IntArray:
    """Evidence rows of one batch; they stand together."""
    first = layout.first_of_batch
    last = first[batch + 1] if batch + 1 < len(first) else len(layout)
    return np.arange(first[batch], last, dtype=np.intp)


def foreseen(
    seen: Ahead, r: FloatArray, fixed: sparse.csc_array | None, x_new: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Mean of the readings to come less their predictions, (m,) [pH]; what the record adds to their prior variance.

    r : residuals without what is supposed; fixed : sparse (n, f) columns of free amplitude, x_new (m, f) their effects
    on the readings to come. Universal kriging, as for a short record.
    """
    base = seen.base
    weighed = base.weigh(r)
    if fixed is None:
        return seen.carried(weighed), -seen.known
    px, _ = base.weighed_columns(fixed)
    inverse = np.linalg.pinv(np.asarray(fixed.T @ px), rcond=1e-10, hermitian=True)
    beta = inverse @ np.asarray(fixed.T @ weighed)
    carried = seen.carried(px)
    gap = x_new - carried
    mean = x_new @ beta + seen.carried(weighed) - carried @ beta
    return np.asarray(mean), np.asarray(np.einsum("ji,ik,jk->j", gap, inverse, gap) - seen.known)


def most_recent(layout: Layout, rows: IntArray, most: int) -> list[int]:
    """The last reading of each of the batches read last, among some rows; latest first, then by batch."""
    day = np.nan_to_num(layout.day[rows], nan=-1.0)
    order = np.argsort(day, kind="stable")
    last = np.full(len(layout.batches), -1, np.intp)
    last[layout.batch[rows[order]]] = rows[order]
    found = last[last >= 0]
    ranked = found[np.lexsort((layout.batch[found], -np.nan_to_num(layout.day[found], nan=-1.0)))]
    return [int(row) for row in ranked[:most]]


def most_read_meters(layout: Layout, first: Sequence[str], most: int) -> list[int]:
    """The named meters, then those with the most readings."""
    counts = np.bincount(layout.meter[layout.meter >= 0], minlength=len(layout.meters))
    named = [layout.meters.index(name) for name in dict.fromkeys(first) if name in layout.meters]
    rest = [int(i) for i in np.argsort(-counts, kind="stable") if i not in named]
    return sorted([*named, *rest][:most])
