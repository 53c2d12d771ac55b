"""Array types, and copies of the user's arrays that nobody can change."""

from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]


def read_only_floats(values: ArrayLike) -> Floats:
    """Copy to a float array that cannot be written to."""
    return _frozen(np.array(values, dtype=np.float64))


def read_only_ints(values: ArrayLike) -> Ints:
    """Copy to an integer array that cannot be written to."""
    return _frozen(np.array(values, dtype=np.int64))


def _frozen(array: NDArray[Any]) -> NDArray[Any]:
    array.setflags(write=False)
    return array
