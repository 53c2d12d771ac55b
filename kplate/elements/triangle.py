"""What all elements share: the triangles they are given, areas and gradients.

Axes: n triangles, v or a their vertices (edge k lies opposite vertex k), c the two
coordinates, q points, d unknowns.
"""

from dataclasses import dataclass

import numpy as np

from kplate.arrays import Floats, read_only_floats
from kplate.quadrature import Rule

# Vertices of edge k, in the triangle's own sense of running round.
EDGES = ((1, 2), (2, 0), (0, 1))


@dataclass(frozen=True, eq=False, kw_only=True)
class Geometry:
    """Triangles and the points at which things are integrated over them.

    Parameters
    ----------
    vertices : array_like, shape (n, 3, 2)
        Vertices in m, counter-clockwise.
    rule : Rule
        Quadrature for each of them.
    """

    vertices: Floats
    rule: Rule

    def __post_init__(self) -> None:
        """Freeze the array."""
        object.__setattr__(self, "vertices", read_only_floats(self.vertices))


def area(vertices: Floats) -> Floats:
    """Areas in m2 of triangles (n, 3, 2), (n,)."""
    u = vertices[:, 1] - vertices[:, 0]
    v = vertices[:, 2] - vertices[:, 0]
    return 0.5 * (u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0])


def barycentric_gradients(vertices: Floats) -> Floats:
    """Gradients in 1/m of the barycentric coordinates, (n, 3, 2)."""
    gradients = np.empty(vertices.shape)
    for k, (i, j) in enumerate(EDGES):
        edge = vertices[:, j] - vertices[:, i]
        gradients[:, k, 0] = -edge[:, 1]
        gradients[:, k, 1] = edge[:, 0]
    return gradients / (2.0 * area(vertices))[:, None, None]


def edge_senses(vertices: Floats) -> Floats:
    """Sense in which each edge's own unknowns count, (n, 3), 1 or -1.

    An edge runs from its end of smaller x, or of smaller y where x is the same: so do
    both triangles that share it see it, whatever their own numbers are. The sense is 1
    where edge k of the triangle runs that way from vertex k + 1 to vertex k + 2.
    """
    senses = np.empty(vertices.shape[:2])
    for k, (i, j) in enumerate(EDGES):
        x, y = (vertices[:, j] - vertices[:, i]).T
        senses[:, k] = np.where((x > 0.0) | ((x == 0.0) & (y > 0.0)), 1.0, -1.0)
    return senses


def edge_normals(vertices: Floats) -> Floats:
    """Unit normals (n, 3, 2) on the right of each edge, run as `edge_senses` says."""
    normals = np.empty(vertices.shape)
    for k, (i, j) in enumerate(EDGES):
        edge = vertices[:, j] - vertices[:, i]
        normals[:, k, 0], normals[:, k, 1] = edge[:, 1], -edge[:, 0]
    lengths = np.hypot(normals[..., 0], normals[..., 1])
    return normals * (edge_senses(vertices) / lengths)[..., None]
