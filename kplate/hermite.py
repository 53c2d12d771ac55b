"""Polynomials on [0, 1] by their values and derivatives at the ends."""

from functools import lru_cache
from math import perm

import numpy as np

from kplate.arrays import Floats, read_only_floats
from kplate.quadrature import gauss


@lru_cache
def basis(jets: int, *, halfway: bool) -> Floats:
    """Polynomials on [0, 1] of jets at 0, at 1 and, if so, the value at 1/2.

    Returns
    -------
    ndarray, shape (k, k)
        Coefficients of rising powers, one polynomial a row.
    """
    count = 2 * jets + halfway
    power = np.arange(count)
    rows: list[Floats] = []
    for place in (0.0, 1.0):
        for j in range(jets):
            falling = np.array([float(perm(k, j)) for k in power.tolist()])
            steep = falling * place ** np.maximum(power - j, 0)
            rows.append(steep.astype(np.float64))
    if halfway:
        rows.append((0.5**power).astype(np.float64))
    return read_only_floats(np.linalg.inv(np.array(rows)).T)


@lru_cache
def products(jets: int, *, halfway: bool) -> Floats:
    """Integrals over [0, 1] of products of the basis, (k, k)."""
    shapes = basis(jets, halfway=halfway)
    s, weights = gauss(len(shapes))
    found = values(shapes, s)
    return read_only_floats(found.T @ (weights[:, None] * found))


def values(shapes: Floats, shares: Floats) -> Floats:
    """Values of the basis at shares (q,), (q, k)."""
    return shares[:, None] ** np.arange(len(shapes)) @ shapes.T
