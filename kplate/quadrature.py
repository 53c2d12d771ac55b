"""Quadrature on triangles: points in barycentrics, weights that sum to one.

An integral over a triangle is its area times the weighted sum.
"""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from kplate.arrays import Floats, read_only_floats


@dataclass(frozen=True, eq=False, kw_only=True)
class Rule:
    """Points and weights on a triangle.

    Parameters
    ----------
    points : array_like, shape (q, 3)
        Barycentric coordinates.
    weights : array_like, shape (q,)
        Shares of the area.
    """

    points: Floats
    weights: Floats

    def __post_init__(self) -> None:
        """Freeze the arrays."""
        object.__setattr__(self, "points", read_only_floats(self.points))
        object.__setattr__(self, "weights", read_only_floats(self.weights))


# Exact for quadratics.
MIDPOINTS = Rule(
    points=[[0.0, 0.5, 0.5], [0.5, 0.0, 0.5], [0.5, 0.5, 0.0]],  # type: ignore[arg-type]
    weights=[1 / 3, 1 / 3, 1 / 3],  # type: ignore[arg-type]
)


@lru_cache
def gauss(n: int) -> tuple[Floats, Floats]:
    """Points and weights of Gauss's rule on [0, 1], exact to degree 2 n - 1."""
    points, weights = np.polynomial.legendre.leggauss(n)
    return read_only_floats(0.5 * (points + 1.0)), read_only_floats(0.5 * weights)


@lru_cache
def triangle_rule(degree: int) -> Rule:
    """Rule exact for polynomials of this degree: Gauss points on rays from a vertex.

    The square (s, t) is folded to ``(1 - s, s (1 - t), s t)``; its Jacobian 2 s costs
    one degree along s.
    """
    s, ws = gauss((degree + 3) // 2)
    t, wt = gauss(degree // 2 + 1)
    S, T = np.meshgrid(s, t, indexing="ij")
    points = np.stack([1.0 - S, S * (1.0 - T), S * T], axis=-1)
    weights = 2.0 * np.outer(ws * s, wt)
    return Rule(points=points.reshape(-1, 3), weights=weights.ravel())


def composite(pieces: Floats, rule: Rule) -> Rule:
    """Repeat a rule on each of the pieces a triangle is parted into.

    Parameters
    ----------
    pieces : ndarray, shape (s, 3, 3)
        Barycentric coordinates, in the whole triangle, of the vertices of each piece.
    rule : Rule
        The rule for one piece.

    Returns
    -------
    Rule
        The points of piece 0 first.
    """
    shares = np.abs(np.linalg.det(pieces))
    points = np.einsum("qv,svc->sqc", rule.points, pieces)
    weights = shares[:, None] * rule.weights
    return Rule(points=points.reshape(-1, 3), weights=weights.ravel())
