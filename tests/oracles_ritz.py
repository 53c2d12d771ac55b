"""Ritz's method for rectangles with any sides, products of polynomials.

An upper bound of the stiffness: deflections under even pressure at most creep up with
the number of polynomials. Signs and units are those of oracles.py, D = 1.
"""

import numpy as np
from numpy.polynomial import legendre, polynomial
from oracles_series import Floats

# Power of the distance to a side that its support asks of each polynomial.
POWERS = {"free": 0, "simply supported": 1, "clamped": 2}


def ritz_square(
    places: Floats, sides: tuple[str, str, str, str], n: int, *, nu: float = 0.3
) -> tuple[Floats, Floats]:
    """Deflection (k,) and moments (k, 3) of a unit square under pressure 1, up.

    `sides` are south, east, north, west; `n` polynomials in each direction.
    """
    south, east, north, west = sides
    t, weights = legendre.leggauss(n + 8)
    spans = ((west, east), (south, north))
    own = [_derivatives(n, ends, t) for ends in spans]
    gram = [
        np.einsum("q,iqm,jqn->ijmn", 0.5 * weights, tables, tables) for tables in own
    ]
    (gx, gy) = gram
    K = np.kron(gx[2, 2], gy[0, 0]) + np.kron(gx[0, 0], gy[2, 2])
    K += nu * (np.kron(gx[2, 0], gy[0, 2]) + np.kron(gx[0, 2], gy[2, 0]))
    K += 2 * (1 - nu) * np.kron(gx[1, 1], gy[1, 1])
    f = np.kron(0.5 * weights @ own[0][0], 0.5 * weights @ own[1][0])
    scale = 1 / np.sqrt(np.diag(K))
    c = scale * np.linalg.lstsq(K * scale * scale[:, None], f * scale, rcond=1e-15)[0]
    c = c.reshape(n, n)
    x, y = np.asarray(places, dtype=float).T
    at = [
        _derivatives(n, ends, 2 * s - 1) for ends, s in zip(spans, (x, y), strict=True)
    ]

    def derivative(i: int, j: int) -> Floats:
        return np.einsum("km,mn,kn->k", at[0][i], c, at[1][j])

    w_xx, w_yy = derivative(2, 0), derivative(0, 2)
    w_xy = derivative(1, 1)
    m = [w_xx + nu * w_yy, w_yy + nu * w_xx, (1 - nu) * w_xy]
    return derivative(0, 0), np.column_stack(m)


def _derivatives(n: int, ends: tuple[str, str], t: Floats) -> Floats:
    """Polynomials that keep to the supports, and two derivatives by x, (3, q, n)."""
    first, second = (POWERS[word] for word in ends)
    factor = polynomial.polymul(
        polynomial.polypow([1, 1], first), polynomial.polypow([1, -1], second)
    )
    found = np.empty((3, len(t), n))
    for k in range(n):
        c = legendre.legmul(legendre.poly2leg(factor), np.eye(k + 1)[k])
        for d in range(3):
            found[d, :, k] = 2**d * legendre.legval(t, legendre.legder(c, d))
    return found
