"""Fractions of the protonation states at a solved balance, their means and covariances."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from reconcile.chemistry.balance import Activity, weights
from reconcile.records.arrays import FloatArray

if TYPE_CHECKING:
    from reconcile.chemistry.composition import Chunk


@dataclass(frozen=True)
class Found:
    """Fractions of the states of one slot at the answer, and their means."""

    f: list[FloatArray]
    closed: FloatArray
    lost: FloatArray
    squares: FloatArray


def fractions(chunk: Chunk, act: Activity, ph: FloatArray, raised: FloatArray) -> list[Found]:
    """Fractions of the states of every slot of a chunk at its pH (m,)."""
    out = []
    for i, slot in enumerate(chunk.slots):
        some = weights(slot, ph, act, raised, i)
        whole = np.ones_like(ph)
        for w in some:
            whole += w
        whole = 1.0 / whole
        closed = np.array(1.0)
        if slot.closed is not None:
            closed = slot.closed
            whole = np.where(closed > 0.0, whole, 1.0)
        f = [whole, *(w * whole for w in some)]
        lost, squares = np.zeros_like(ph), slot.charge**2 * whole
        for j, share in enumerate(f[1:], start=1):
            lost += j * share
            squares += (slot.charge - j) ** 2 * share
        out.append(Found(f, closed, lost, squares))
    return out


def spread(x: Found, a: Sequence[FloatArray], b: Sequence[FloatArray]) -> FloatArray:
    """Covariance of two quantities over the states; for an acid whose first state the air holds, the raw moment."""
    mean_a, mean_b, both = (np.zeros_like(x.lost) for _ in range(3))
    for share, p, q in zip(x.f, a, b, strict=True):
        mean_a = mean_a + share * p
        mean_b = mean_b + share * q
        both = both + share * p * q
    return both - x.closed * mean_a * mean_b
