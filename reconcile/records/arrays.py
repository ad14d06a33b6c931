"""Array types that every room uses, and the sparse triplets in which sensitivities travel."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]
BoolArray = NDArray[np.bool_]
TextArray = NDArray[np.object_]
TimeArray = NDArray[np.datetime64]
AnyArray = NDArray[Any]


@dataclass(frozen=True)
class Triplets:
    """A sparse matrix as three arrays of equal length; entries of one cell add up.

    row, column : IntArray (t,)
    value : FloatArray (t,)
    shape : (rows, columns)
    """

    row: IntArray
    column: IntArray
    value: FloatArray
    shape: tuple[int, int]

    def dense(self) -> FloatArray:
        """The whole matrix; only for small ones."""
        whole = np.zeros(self.shape)
        np.add.at(whole, (self.row, self.column), self.value)
        return whole
