"""The discrete Kirchhoff triangle (DKT): nine unknowns, not C1.

Unknowns, vertex by vertex: ``w``, ``dw/dx``, ``dw/dy``. The slope is quadratic over the
triangle, and its part square to an edge linear along that edge; w is cubic along the
edges and not defined inside. Both agree at the vertices and, along the edge, at
mid-edges, which fixes the slope from nine unknowns. Inside, w is taken from the reduced
Hsieh-Clough-Tocher triangle of the same unknowns, which is the same on the edges: for
loads, masses and values between the vertices. Exact for quadratic w on any mesh;
deflection converges as h**2.

Source: J.-L. Batoz, K.-J. Bathe, L.-W. Ho, "A study of three-node triangular plate
bending elements", Int. J. Numer. Meth. Engng 15 (1980) 1771-1812 (from memory).
"""

import numpy as np

from kplate.arrays import Floats
from kplate.elements.triangle import EDGES, Geometry, area, barycentric_gradients
from kplate.quadrature import MIDPOINTS

# The curvature is linear, so that its products are exact at mid-edges.
RULE = MIDPOINTS


def stiffness(geometry: Geometry, rigidity: Floats) -> Floats:
    """Element stiffness matrices.

    `geometry` has the rule RULE; rigidity (n, q, 3, 3) in N m; returns (n, 9, 9).
    """
    vertices, rule = geometry.vertices, geometry.rule
    B = curvature(vertices, rule.points)
    n, q, _, d = B.shape
    weights = area(vertices)[:, None] * rule.weights
    weighted = (rigidity @ B) * weights[..., None, None]
    return B.reshape(n, 3 * q, d).swapaxes(1, 2) @ weighted.reshape(n, 3 * q, d)


def curvature(vertices: Floats, barycentrics: Floats) -> Floats:
    """Curvatures ``w,xx, w,yy, 2 w,xy`` at points of triangles (n, 3, 2).

    Barycentrics (q, 3), the same in every triangle, or (n, q, 3); returns (n, q, 3, 9).
    """
    G = _slopes(vertices)
    by_coordinate = (
        _shape_gradients(barycentrics) @ barycentric_gradients(vertices)[:, None]
    )  # (n, q, 6, 2)
    n, q = by_coordinate.shape[:2]
    H = by_coordinate.swapaxes(-1, -2).reshape(n, 2 * q, 6) @ G.reshape(n, 6, 18)
    H = H.reshape(n, q, 2, 2, 9)  # derivative, slope
    return np.stack(
        [H[:, :, 0, 0], H[:, :, 1, 1], H[:, :, 0, 1] + H[:, :, 1, 0]], axis=2
    )


def _slopes(vertices: Floats) -> Floats:
    """Map unknowns to slopes at the vertices, then the mid-edges, (n, 6, 2, 9)."""
    G = np.zeros((len(vertices), 6, 2, 9))
    for i in range(3):
        G[:, i, :, 3 * i + 1 : 3 * i + 3] = np.eye(2)
    for k, (i, j) in enumerate(EDGES):
        e = vertices[:, j] - vertices[:, i]
        s = e / np.einsum("nc,nc->n", e, e)[:, None]
        along = s[:, :, None] * e[:, None, :]  # projector on the edge direction
        G[:, 3 + k, :, 3 * j] = 1.5 * s
        G[:, 3 + k, :, 3 * i] = -1.5 * s
        for v in (i, j):
            G[:, 3 + k, :, 3 * v + 1 : 3 * v + 3] = 0.5 * np.eye(2) - 0.75 * along
    return G


def _shape_gradients(barycentrics: Floats) -> Floats:
    """Derivatives of the quadratic shape functions by barycentrics, (..., 6, 3)."""
    result = np.zeros((*barycentrics.shape[:-1], 6, 3))
    for i in range(3):
        result[..., i, i] = 4.0 * barycentrics[..., i] - 1.0
    for k, (i, j) in enumerate(EDGES):
        result[..., 3 + k, i] = 4.0 * barycentrics[..., j]
        result[..., 3 + k, j] = 4.0 * barycentrics[..., i]
    return result
