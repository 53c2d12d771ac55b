"""Pressures that are stated as functions: triangles parted where they are not smooth.

A rule is exact for smooth pressures only. Where its sums over a piece and over the four
quarters of it differ, or the function at the piece's rim does not go with that inside,
the piece is parted, again and again, so that a jump lies within ever smaller pieces.
What is left there is known no better than the sums over the last pieces and over their
quarters agree; that is what `Sampled.rough` is for. A function that samples do not
show, such as a spike between them, is not found.
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from kplate.arrays import Bools, Floats, Ints
from kplate.quadrature import Rule, composite, triangle_rule

Pressures = Callable[[Floats], Floats]

# Sums that agree to this share of the largest pressure are those of a smooth function;
# what the rim may differ by, for the rule at the rim is exact for cubics only.
SMOOTH, RIM = 1e-6, 0.02
# How often a triangle is parted; no more pieces than this in all.
DEEPEST, MOST = 4, 60_000
BLOCK = 2048  # pieces
_RULE = triangle_rule(6)
_RIM = Rule(
    points=np.array(
        [*np.eye(3), *(0.5 * (1.0 - np.eye(3))), np.full(3, 1.0 / 3.0)], dtype=float
    ),
    weights=np.array([1 / 20] * 3 + [2 / 15] * 3 + [9 / 20]),
)
# Corners of the quarters of a triangle, barycentric.
QUARTERS = 0.5 * np.array(
    [
        [(2, 0, 0), (1, 1, 0), (1, 0, 1)],
        [(1, 1, 0), (0, 2, 0), (0, 1, 1)],
        [(1, 0, 1), (0, 1, 1), (0, 0, 2)],
        [(0, 1, 1), (1, 0, 1), (1, 1, 0)],
    ]
)


@dataclass(frozen=True, eq=False, kw_only=True)
class Sampled:
    """Pieces into which triangles are parted so that a pressure is smooth on most.

    Parameters
    ----------
    pieces : ndarray, shape (k, 3, 2)
        Their corners in m; triangles that need no parting have none.
    owners : ndarray, shape (k,)
        The triangle of each.
    rough : ndarray of bool, shape (k,)
        Where the pressure is still not smooth.
    """

    pieces: Floats
    owners: Ints
    rough: Bools


def sampled(pressure: Pressures, triangles: Floats) -> Sampled:
    """Part triangles (n, 3, 2) where a pressure of points (m, q, 2) is not smooth."""
    number = np.arange(len(triangles))
    coarse = _rough(pressure, triangles)
    pieces, owners = triangles[coarse], number[coarse]
    rough = np.ones(len(pieces), dtype=bool)
    for _ in range(DEEPEST):
        parted = int(rough.sum())
        if not parted or len(pieces) + 3 * parted > MOST:
            break
        quarters = np.einsum("skv,nvc->nskc", QUARTERS, pieces[rough]).reshape(-1, 3, 2)
        still = _rough(pressure, quarters)
        pieces = np.concatenate([pieces[~rough], quarters])
        owners = np.concatenate([owners[~rough], np.repeat(owners[rough], 4)])
        rough = np.concatenate([np.zeros(len(rough) - parted, dtype=bool), still])
    return Sampled(pieces=pieces, owners=owners, rough=rough)


def _rough(pressure: Pressures, pieces: Floats) -> Bools:
    """Whether sums over pieces (n, 3, 2) and over their quarters differ, (n,)."""
    fine = composite(QUARTERS, _RULE)
    points = np.concatenate([_RULE.points, fine.points, _RIM.points])
    a, b = len(_RULE.points), len(_RULE.points) + len(fine.points)
    differ = np.zeros((len(pieces), 2))
    size = 0.0
    for start in range(0, len(pieces), BLOCK):
        block = slice(start, start + BLOCK)
        own = pressure(points @ pieces[block])
        size = max(size, float(np.abs(own).max(initial=0.0)))
        once = (own[:, :a] * _RULE.weights) @ _RULE.points
        again = (own[:, a:b] * fine.weights) @ fine.points
        differ[block, 0] = np.abs(once - again).max(axis=1)
        differ[block, 1] = np.abs(own[:, b:] @ _RIM.weights - again.sum(axis=1))
    return np.any(differ > size * np.array([SMOOTH, RIM]), axis=1)
