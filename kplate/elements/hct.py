"""The reduced Hsieh-Clough-Tocher triangle: nine unknowns, C1, cubic in three pieces.

Unknowns, vertex by vertex: ``w``, ``dw/dx``, ``dw/dy``. The triangle is parted at its
centroid S into three pieces; piece k has the vertices (k+1, k+2, S). On each piece w is
a cubic, given by ten Bernstein ordinates; w and its slopes are continuous across pieces
and triangles, and the slope square to an outer edge is linear along it, which takes the
place of an unknown there.

The ordinates next to a vertex follow from w and its slopes, the one in the middle of a
piece from the linear slope on its outer edge, and the others from the conditions for a
continuous slope inside: each is the mean of the three around it.

Source: R. W. Clough and J. L. Tocher, "Finite element stiffness matrices for analysis
of plate bending", Proc. Conf. on Matrix Methods in Structural Mechanics,
Wright-Patterson AFB, 1965; P. G. Ciarlet, "The Finite Element Method for Elliptic
Problems", North-Holland, 1978, ch. 6 (both from memory).
"""

import numpy as np

from kplate.arrays import Floats
from kplate.elements import bernstein
from kplate.elements.triangle import EDGES, Geometry, area, barycentric_gradients
from kplate.quadrature import composite, triangle_rule

DEGREE = 3
_CENTROID = np.full(3, 1 / 3)
PIECES = np.array([[np.eye(3)[i], np.eye(3)[j], _CENTROID] for i, j in EDGES])
# Cubic shape functions times a quadratic pressure are integrated exactly.
LOAD_RULE = composite(PIECES, triangle_rule(5))


def load(geometry: Geometry, pressure: Floats) -> Floats:
    """Consistent loads of a pressure.

    `geometry` has the rule LOAD_RULE; pressure (n, q) in Pa at its points, positive up;
    returns (n, 9): forces in N, couples in N m that work on the slopes.
    """
    rule = geometry.rule
    forces = pressure * area(geometry.vertices)[:, None] * rule.weights
    piece, local = _split(rule.points)
    shape = bernstein.values(DEGREE, local)
    weighted = np.stack(
        [forces[:, piece == k] @ shape[piece == k] for k in range(3)], axis=1
    )
    n = len(forces)
    C = ordinates(geometry.vertices)
    return (weighted.reshape(n, 1, 30) @ C.reshape(n, 30, 9))[:, 0]


def evaluate(vertices: Floats, barycentrics: Floats) -> Floats:
    """Deflection and slopes at points (n, q, 3) of triangles (n, 3, 2).

    Returns (n, q, 3, 9): the rows that turn unknowns into w, dw/dx, dw/dy.
    """
    piece, local = _split(barycentrics)
    n = np.arange(len(vertices))[:, None]
    C = ordinates(vertices)[n, piece]  # (n, q, 10, 9)
    corners = np.einsum("skv,nvc->nskc", PIECES, vertices)
    shape = np.stack([barycentric_gradients(corners[:, k]) for k in range(3)], axis=1)
    by_barycentric = bernstein.gradients(DEGREE, local)  # (n, q, 3, 10)
    slopes = shape[n, piece].swapaxes(-1, -2) @ by_barycentric  # (n, q, 2, 10)
    value = bernstein.values(DEGREE, local)[..., None, :]
    return np.concatenate([value, slopes], axis=-2) @ C


def ordinates(vertices: Floats) -> Floats:
    """Turn unknowns into the ordinates of the three pieces, (n, 3, 10, 9)."""
    n = len(vertices)
    centroid = vertices.mean(axis=1)
    value = np.zeros((3, n, 9))
    inward = np.zeros((3, n, 9))  # beside each vertex, towards the centroid
    for v in range(3):
        value[v, :, 3 * v] = 1.0
        inward[v] = _beside(value[v], v, centroid - vertices[:, v])
    outer, middle = [], []
    for k, (i, j) in enumerate(EDGES):
        edge = vertices[:, j] - vertices[:, i]
        outer.append((_beside(value[i], i, edge), _beside(value[j], j, -edge)))
        corners = np.stack([vertices[:, i], vertices[:, j], centroid], axis=1)
        middle.append(
            _middle(corners, (value[i], *outer[k], value[j]), (inward[i], inward[j]))
        )
    around = [
        (inward[v] + middle[(v + 1) % 3] + middle[(v + 2) % 3]) / 3 for v in range(3)
    ]
    centre = (around[0] + around[1] + around[2]) / 3
    C = np.empty((n, 3, 10, 9))
    place = bernstein.position(DEGREE)
    for k, (i, j) in enumerate(EDGES):
        C[:, k, place[3, 0, 0]], C[:, k, place[0, 3, 0]] = value[i], value[j]
        C[:, k, place[2, 1, 0]], C[:, k, place[1, 2, 0]] = outer[k]
        C[:, k, place[2, 0, 1]], C[:, k, place[0, 2, 1]] = inward[i], inward[j]
        C[:, k, place[1, 1, 1]] = middle[k]
        C[:, k, place[1, 0, 2]], C[:, k, place[0, 1, 2]] = around[i], around[j]
        C[:, k, place[0, 0, 3]] = centre
    return C


def _beside(value: Floats, v: int, arm: Floats) -> Floats:
    """Ordinate a third of the way along an arm (n, 2) from vertex v."""
    ordinate = value.copy()
    ordinate[:, 3 * v + 1 : 3 * v + 3] = arm / 3.0
    return ordinate


def _middle(
    corners: Floats,
    along: tuple[Floats, Floats, Floats, Floats],
    inward: tuple[Floats, Floats],
) -> Floats:
    """Ordinate (1, 1, 1) of a piece whose slope across its outer edge is linear.

    Along the outer edge the slope across it is a quadratic with the ordinates
    ``3 (d0 b_j0 + d1 b_j1 + d2 b_j2)``, d the direction in barycentrics; it is linear
    where the middle one is the mean of the others.
    """
    edge = corners[:, 1] - corners[:, 0]
    across = np.column_stack([edge[:, 1], -edge[:, 0]])
    d = np.einsum("nvc,nc->vn", barycentric_gradients(corners), across)[..., None]
    first = d[0] * along[0] + d[1] * along[1] + d[2] * inward[0]
    last = d[0] * along[2] + d[1] * along[3] + d[2] * inward[1]
    return (0.5 * (first + last) - d[0] * along[1] - d[1] * along[2]) / d[2]


def _split(barycentrics: Floats) -> tuple[np.ndarray, Floats]:
    """Piece of each point (..., 3) and its barycentrics within that piece."""
    piece = np.argmin(barycentrics, axis=-1)
    least = np.take_along_axis(barycentrics, piece[..., None], axis=-1)[..., 0]
    outer = [
        np.take_along_axis(barycentrics, ((piece + s) % 3)[..., None], axis=-1)[..., 0]
        for s in (1, 2)
    ]
    return piece, np.stack([outer[0] - least, outer[1] - least, 3.0 * least], axis=-1)
