"""Small operations on the columns of sparse matrices."""

from __future__ import annotations

import itertools
from collections.abc import Hashable
from typing import TypeVar

import numpy as np
from scipy import sparse

from reconcile.records.arrays import FloatArray, IntArray

Sparse = TypeVar("Sparse", sparse.csc_array, sparse.csr_array)


def squared(x: Sparse) -> Sparse:
    """Every entry squared."""
    return type(x)((x.data**2, x.indices, x.indptr), shape=x.shape)


def column_sums(x: sparse.csc_array) -> FloatArray:
    """Sum of each column, (k,)."""
    return np.asarray(x.T @ np.ones(x.shape[0]), float)


def column_maxima(x: sparse.csc_array) -> FloatArray:
    """Largest entry of each column of entries that are not negative, (k,); 0 for an empty one."""
    found = np.zeros(x.shape[1])
    filled = np.flatnonzero(np.diff(x.indptr) > 0)
    if len(filled):
        found[filled] = np.maximum.reduceat(x.data, x.indptr[filled])
    return found


def column_keys(x: sparse.csc_array) -> list[Hashable]:
    """A key for each column that equal columns share."""
    return [
        (x.indices[a:b].astype(np.int64).tobytes(), x.data[a:b].tobytes())
        for a, b in itertools.pairwise(x.indptr.tolist())
    ]


def same_group(x: sparse.csc_array, group: IntArray) -> IntArray:
    """Group of the rows that a column touches, (k,); -1 where they are of several, of none, or there are none."""
    found = np.full(x.shape[1], -1, np.intp)
    filled = np.flatnonzero(np.diff(x.indptr) > 0)
    if len(filled):
        of_entry = group[x.indices]
        low, high = (f.reduceat(of_entry, x.indptr[filled]) for f in (np.minimum, np.maximum))
        found[filled] = np.where(low == high, low, -1)
    return found
