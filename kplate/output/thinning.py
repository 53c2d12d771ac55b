"""Few triangles in place of many, for a picture that moves; and the edges of a mesh.

Points are gathered in square cells of the plan, and the one nearest the middle of a
cell stands for all of it, so that every field of the few is one of the many.
"""

import numpy as np

from kplate.arrays import Floats, Ints

NEAR = 1e-6  # share of a triangle's height within which a point is on its edge


def thinned(points: Floats, triangles: Ints, most: int) -> tuple[Ints, Ints]:
    """Gather points so that about `most` triangles remain.

    Parameters
    ----------
    points : ndarray, shape (n, 2)
        Places.
    triangles : ndarray, shape (m, 3)
        Their point numbers.
    most : int
        How many triangles to aim at.

    Returns
    -------
    kept : ndarray, shape (k,)
        Numbers of the points that stand for all.
    few : ndarray, shape (l, 3)
        Triangles among these, counter-clockwise as they were.
    """
    a, b, c = np.moveaxis(points[triangles], 1, 0)
    ab, ac = b - a, c - a
    area = 0.5 * np.abs(ab[:, 0] * ac[:, 1] - ab[:, 1] * ac[:, 0]).sum()
    pitch = np.sqrt(2.0 * area / most)
    place = (points - points.min(axis=0)) / pitch
    cell = np.floor(place).astype(np.int64)
    off = np.abs(place - cell - 0.5).max(axis=1)
    order = np.argsort(off, kind="stable")
    key = cell[:, 0] * (cell[:, 1].max() + 1) + cell[:, 1]
    _, first, number = np.unique(key[order], return_index=True, return_inverse=True)
    own = np.empty(len(points), dtype=np.int64)
    own[order] = number
    few = own[triangles]
    few = few[
        (few[:, 0] != few[:, 1]) & (few[:, 1] != few[:, 2]) & (few[:, 2] != few[:, 0])
    ]
    _, which = np.unique(np.sort(few, axis=1), axis=0, return_index=True)
    return order[first], few[np.sort(which)]


def mesh_edges(points: Floats, triangles: Ints, owners: Ints) -> Ints:
    """Edges of the triangles that small ones (m, 3) are parts of, in pieces (k, 2).

    `owners` (m,) says which. Both triangles at an edge list it. An edge that is an arc
    is not found, but it is a part of the rim.
    """
    pairs = triangles[:, [0, 1, 1, 2, 2, 0]].reshape(-1, 3, 2)
    _, own = np.unique(owners, return_inverse=True)
    corners = _corners(points, triangles, own)[own]
    a, b, c = (corners[:, k, None, None] for k in range(3))
    size = _cross(b - a, c - a)
    ends = points[pairs]
    shares = [_cross(c - b, ends - b), _cross(a - c, ends - c), _cross(b - a, ends - a)]
    on = [(np.abs(share / size) < NEAR).all(axis=2) for share in shares]
    return pairs[np.any(on, axis=0)]


def _corners(points: Floats, triangles: Ints, own: Ints) -> Floats:
    """Corners (n, 3, 2) of the triangles that small ones are parts of, by number."""
    number, flat = np.repeat(own, 3), points[triangles].reshape(-1, 2)
    count = np.bincount(number)
    middle = np.column_stack([np.bincount(number, x) / count for x in flat.T])
    first = _furthest(number, np.hypot(*(flat - middle[number]).T), flat)
    second = _furthest(number, np.hypot(*(flat - first[number]).T), flat)
    off = _cross(second[number] - first[number], flat - first[number])
    return np.stack([first, second, _furthest(number, np.abs(off), flat)], axis=1)


def _furthest(number: Ints, distance: Floats, places: Floats) -> Floats:
    """Of each number the place with the largest distance."""
    order = np.lexsort((distance, number))
    last = np.flatnonzero(np.diff(number[order], append=-1))
    return places[order[last]]


def _cross(a: Floats, b: Floats) -> Floats:
    return np.asarray(a[..., 0] * b[..., 1] - a[..., 1] * b[..., 0])
