"""One batch in which one component was taken wrongly: too much, too little, twice, or not at all."""

from __future__ import annotations

import numpy as np
from scipy import sparse

from reconcile.auditor.exact import points, secants
from reconcile.auditor.layout import Layout, one_hot
from reconcile.auditor.proposals import Context, Proposal, Told, stack
from reconcile.auditor.retrial import Supposed
from reconcile.records.arrays import FloatArray, IntArray

ROOM = 2.5
"""Score of a batch's shift from which its exact profiles are computed."""
DOUBLED, LEFT_OUT = 2.0, 1e-9


def batches_with_room(context: Context) -> set[int]:
    """Batches whose readings share a shift."""
    layout = context.layout
    x = context.kept("batches", lambda: one_hot(layout.batch, len(layout.batches)))
    return set(context.promising(x, ROOM, steady=True).tolist())


def components(context: Context, of: set[int] | None = None) -> list[tuple[int, int, np.ndarray, np.ndarray]]:
    """(batch, contribution, rows, dpH/d ln amount) for every component that moves a reading, of some batches or all."""
    layout = context.layout
    batch, column, rows, value, cuts = context.kept("components", lambda: _components(layout))
    chosen = np.arange(len(batch)) if of is None else np.flatnonzero(np.isin(batch, sorted(of)))
    spans = [(int(i), int(cuts[i]), int(cuts[i + 1])) for i in chosen.tolist()]
    return [(int(batch[i]), int(column[i]), rows[a:b], value[a:b]) for i, a, b in spans]


def _components(layout: Layout) -> tuple[IntArray, IntArray, IntArray, FloatArray, IntArray]:
    """Batch and contribution of every component, the rows it moves and how far, and where each component begins."""
    t = layout.prediction.contributions
    row_of = np.full(len(layout.prediction), -1, np.intp)
    row_of[layout.reading] = np.arange(len(layout))
    use = (row_of[t.row] >= 0) & (np.abs(t.value) > 1e-5)
    rows, column, value = row_of[t.row[use]], t.column[use], t.value[use]
    order = np.lexsort((rows, column))
    rows, column, value = rows[order], column[order], value[order]
    cuts = np.flatnonzero(np.r_[True, column[1:] != column[:-1], True]) if len(column) else np.zeros(1, np.intp)
    return layout.batch[rows[cuts[:-1]]], column[cuts[:-1]], rows, value, cuts


def component_name(context: Context, contribution: int) -> str:
    """Name of the substance a contribution brings."""
    records = context.layout.records
    return records.forms[int(records.solutions.form[contribution])].name


class BatchPreparation:
    name, alarm_class = "batch_preparation", "batch"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        room = batches_with_room(context)
        found = components(context, room if context.model.long else None)
        blocks = len(layout.batches) if context.model.long else 0
        if not found and not blocks:
            return None
        x = stack([(rows, value) for _, _, rows, value in found], len(layout))
        promising = [i for i, (batch, *_) in enumerate(found) if batch in room]
        likely: dict[int, Supposed | None] = {}
        if promising:
            exact, at = secants(context, [(found[i][1],) for i in promising], x[:, promising])
            likely = dict(zip(promising, at, strict=True))
            rest = np.setdiff1d(np.arange(len(found)), promising)
            order = np.argsort(np.r_[promising, rest])
            x = sparse.csc_array(sparse.csc_array(sparse.hstack([exact, x[:, rest]]))[:, order])
        whole = [Supposed((found[i][1],), factor=f) for i in promising for f in (DOUBLED, LEFT_OUT)]
        kept, at_one = points(context, whole)
        of = list(range(len(found))) + [promising[k // 2] for k in kept]
        likely.update({len(found) + i: whole[k] for i, k in enumerate(kept)})
        factors = [float("nan")] * len(found) + [whole[k].factor for k in kept]
        count = np.bincount([b for b, *_ in found], minlength=len(layout.batches))

        def tell(k: int, a: float) -> Told:
            name = component_name(context, found[of[k]][1])
            if np.isnan(factors[k]):
                factor = float(np.exp(np.clip(a, -7, 7)))
                return Told(
                    factor,
                    "factor",
                    {"factor": factor, "component": name},
                    detail=name,
                    scale=lambda v: float(np.exp(np.clip(v, -7, 7))),
                )
            factor = 0.0 if factors[k] == LEFT_OUT else factors[k]
            return Told(factor, "factor", {"factor": factor, "component": name}, detail=name)

        batch = [found[i][0] for i in of]
        subject = [layout.batches[b] for b in batch]
        point = np.array([np.isfinite(f) for f in factors])
        return Proposal(
            self.name,
            self.alarm_class,
            "batch",
            sparse.csc_array(sparse.hstack([x, at_one])),
            subject,
            subject,
            np.full(len(of), 0.5),
            -np.log(np.maximum(count[batch], 1)) - np.where(point, np.log(4.0), 0.0),
            point,
            tell,
            same=[component_name(context, found[i][1]) for i in of],
            blocks=blocks,
            supposed=likely.get,
        )


KIND = BatchPreparation()
