"""Bernstein polynomials on a triangle.

The polynomial of degree p with multi-index a = (a0, a1, a2), a0 + a1 + a2 = p, is
``p!/(a0! a1! a2!) l0^a0 l1^a1 l2^a2`` in barycentrics l. The coefficients of a
polynomial in this basis are its *ordinates*.

Source: G. Farin, "Triangular Bernstein-Bezier patches", Computer Aided Geometric Design
3 (1986) 83-127 (from memory).
"""

import math
from functools import lru_cache
from math import factorial

import numpy as np

from kplate.arrays import Floats, read_only_floats

Index = tuple[int, int, int]

# Pairs of barycentrics, in the order in which second derivatives are stored.
PAIRS = ((0, 0), (1, 1), (2, 2), (0, 1), (0, 2), (1, 2))


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


def hessians(degree: int, barycentrics: Floats) -> Floats:
    """Second derivatives with respect to the barycentrics `PAIRS`, for a degree >= 2.

    Returns
    -------
    ndarray, shape (..., 6, number of ordinates)
    """
    lower = values(degree - 2, barycentrics)
    return np.einsum("...a,xak->...xk", lower, _twice_lowered(degree))


def hessian_gradients(degree: int, barycentrics: Floats) -> Floats:
    """Third derivatives: those of `hessians` with respect to each barycentric.

    Returns
    -------
    ndarray, shape (..., 3, 6, number of ordinates)
        Zero below degree 3.
    """
    down = _twice_lowered(degree)
    if degree < 3:
        return np.zeros((*barycentrics.shape[:-1], 3, *down.shape[::2]))
    return np.einsum("...va,xak->...vxk", gradients(degree - 2, barycentrics), down)


@lru_cache
def masses(degree: int) -> Floats:
    """Means over the triangle of products of all polynomials, (k, k) ordinates.

    The mean of ``l0^a l1^b l2^c`` is ``2 a! b! c! / (a + b + c + 2)!``.
    """
    every = indices(degree)
    result = np.empty((len(every), len(every)))
    for i, a in enumerate(every):
        for j, b in enumerate(every):
            ways = [math.comb(p + q, p) for p, q in zip(a, b, strict=True)]
            result[i, j] = math.prod(ways)
    scale = math.comb(2 * degree, degree) * math.comb(2 * degree + 2, 2)
    return read_only_floats(result / scale)


@lru_cache
def bendings(degree: int) -> Floats:
    """Means over the triangle of products of second derivatives, (36, k k).

    Row ``6 x + y`` holds, for all pairs of ordinates, the mean of the second derivative
    `PAIRS[x]` of the one times `PAIRS[y]` of the other.
    """
    down = _twice_lowered(degree)
    products = np.einsum("xai,ab,ybj->xyij", down, masses(degree - 2), down)
    return read_only_floats(products.reshape(36, -1))


@lru_cache
def _twice_lowered(degree: int) -> Floats:
    """Second derivatives as polynomials of two degrees less, (6, lower, ordinates)."""
    every, lower = indices(degree), position(degree - 2)
    result = np.zeros((len(PAIRS), len(lower), len(every)))
    for k, a in enumerate(every):
        for pair, (v, u) in enumerate(PAIRS):
            below = list(a)
            below[v] -= 1
            below[u] -= 1
            if min(below) >= 0:
                index = lower[below[0], below[1], below[2]]
                result[pair, index, k] = degree * (degree - 1)
    return read_only_floats(result)


def _powers(base: Floats, highest: int) -> list[Floats]:
    powers = [np.ones_like(base)]
    for _ in range(highest):
        powers.append(powers[-1] * base)
    return powers
