"""Numbers of the unknowns: vertex by vertex, then edge by edge."""

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from kplate.arrays import Floats, Ints
from kplate.mesh import Mesh


@dataclass(frozen=True, eq=False, kw_only=True)
class Numbering:
    """Unknowns on a mesh.

    Parameters
    ----------
    mesh : Mesh
        The triangles.
    per_vertex, per_edge : int
        Unknowns at each vertex and on each edge.
    """

    mesh: Mesh
    per_vertex: int
    per_edge: int

    @property
    def count(self) -> int:
        """Number of unknowns."""
        edges = len(self.mesh.edges) if self.per_edge else 0
        return self.per_vertex * len(self.mesh.points) + self.per_edge * edges

    @cached_property
    def table(self) -> Ints:
        """Unknowns of each triangle in the element's order, (n_triangles, d)."""
        n = len(self.mesh.triangles)
        columns = [self.at_vertices(self.mesh.triangles).reshape(n, -1)]
        if self.per_edge:
            first = self.per_vertex * len(self.mesh.points)
            own = self.per_edge * self.mesh.triangle_edges[:, :, None]
            columns.append((first + own + np.arange(self.per_edge)).reshape(n, -1))
        return np.concatenate(columns, axis=1)

    def at_vertices(self, vertices: Ints) -> Ints:
        """Unknowns at vertices (...), (..., per_vertex)."""
        return self.per_vertex * vertices[..., None] + np.arange(self.per_vertex)

    def by_vertex(self, values: Floats) -> Floats:
        """View values (count, ...) of the unknowns by vertex, (n_points, p, ...)."""
        n = self.per_vertex * len(self.mesh.points)
        return values[:n].reshape(len(self.mesh.points), self.per_vertex, -1)
