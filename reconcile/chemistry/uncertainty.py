"""Uncertainty budget of predicted pH: each source's share, combined after JCGM 100."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from reconcile.records.arrays import FloatArray, IntArray

ROOT3 = float(np.sqrt(3.0))
"""A half-width a of a rectangular distribution is a standard uncertainty a / sqrt 3 (JCGM 100:2008, 4.3.7)."""
SOURCES = ("strength", "taking", "temperature", "pKa", "activity model", "carbon dioxide", "certificate")


def rows_of(start: IntArray) -> IntArray:
    """Row of every entry of a list whose row i runs from start[i] to start[i + 1]."""
    return np.repeat(np.arange(len(start) - 1), np.diff(start))


def of_independent(start: IntArray, slope: FloatArray, u: FloatArray) -> FloatArray:
    """Root-sum-square share [pH] (n,) of contributions whose relative errors are independent of one another."""
    return np.asarray(np.sqrt(np.bincount(rows_of(start), (slope * u) ** 2, len(start) - 1)), float)


def of_lots(row: IntArray, lot: IntArray, slope: FloatArray, u_lot: FloatArray, n: int) -> FloatArray:
    """Share of the lots' strengths [pH] (n,): the slopes of one lot within a row add up before they are squared.

    Parameters
    ----------
    row, lot : ndarray of int (t,)
        Row, and lot that a contribution of it rests on.
    slope : ndarray (t,)
        dpH/d ln(amount) of that contribution.
    u_lot : ndarray (l,)
        Relative standard uncertainty of each lot's strength [-].
    n : int
        Number of rows.

    Returns
    -------
    ndarray (n,)

    References
    ----------
    JCGM 100:2008, 5.2.2, correlation coefficient 1 within a lot.
    """
    cell, place = np.unique(row * max(len(u_lot), 1) + lot, return_inverse=True)
    together = np.bincount(place, slope, len(cell))
    where, which = np.divmod(cell, max(len(u_lot), 1))
    u = u_lot[which] if len(u_lot) else np.zeros(0)
    return np.asarray(np.sqrt(np.bincount(where, (together * u) ** 2, n)), float)


def combined(budget: Mapping[str, FloatArray]) -> FloatArray:
    """Standard uncertainty: root-sum-square of the shares (JCGM 100:2008, equation 10)."""
    return np.asarray(np.sqrt(sum(share**2 for share in budget.values())), float)
