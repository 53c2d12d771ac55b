"""Bernstein polynomials on a triangle.

The polynomial of degree p with multi-index a = (a0, a1, a2), a0 + a1 + a2 = p, is
``p!/(a0! a1! a2!) l0^a0 l1^a1 l2^a2`` in barycentrics l. The coefficients of a
polynomial in this basis are its *ordinates*.

Source: G. Farin, "Triangular Bernstein-Bezier patches", Computer Aided Geometric Design
3 (1986) 83-127 (from memory).
"""

from functools import lru_cache
from math import factorial

import numpy as np

from kplate.arrays import Floats

Index = tuple[int, int, int]


@lru_cache
def indices(degree: int) -> tuple[Index, ...]:
    """Multi-indices in the order in which ordinates are stored."""
    return tuple(
        (i, j, degree - i - j)
        for i in range(degree, -1, -1)
        for j in range(degree - i, -1, -1)
    )


@lru_cache
def position(degree: int) -> dict[Index, int]:
    """Place of each multi-index among the ordinates."""
    return {index: k for k, index in enumerate(indices(degree))}


def values(degree: int, barycentrics: Floats) -> Floats:
    """All polynomials at points (..., 3); returns (..., number of ordinates)."""
    powers = [_powers(barycentrics[..., v], degree) for v in range(3)]
    columns = []
    for a in indices(degree):
        scale = factorial(degree) / (
            factorial(a[0]) * factorial(a[1]) * factorial(a[2])
        )
        columns.append(scale * powers[0][a[0]] * powers[1][a[1]] * powers[2][a[2]])
    return np.stack(columns, axis=-1)


def gradients(degree: int, barycentrics: Floats) -> Floats:
    """Derivatives with respect to the three barycentrics.

    Returns
    -------
    ndarray, shape (..., 3, number of ordinates)
    """
    lower = values(degree - 1, barycentrics)
    place = position(degree - 1)
    result = np.zeros((*barycentrics.shape[:-1], 3, len(indices(degree))))
    for k, a in enumerate(indices(degree)):
        for v in range(3):
            if a[v] > 0:
                below = list(a)
                below[v] -= 1
                index = place[below[0], below[1], below[2]]
                result[..., v, k] = degree * lower[..., index]
    return result


def _powers(base: Floats, highest: int) -> list[Floats]:
    powers = [np.ones_like(base)]
    for _ in range(highest):
        powers.append(powers[-1] * base)
    return powers
