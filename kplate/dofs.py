"""Numbers of the unknowns: vertex by vertex, then edge by edge."""

from dataclasses import dataclass, field
from functools import cached_property

import numpy as np

from kplate.arrays import Floats, Ints
from kplate.elements.arcs import Arcs, no_arcs
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
    edge_deflections : int, optional
        How many of those on an edge, the first ones, are deflections; the rest are
        slopes along the edge's normal.
    arcs : Arcs, optional
        Round edges that the triangles follow; chords stand for them if left out.
    """

    mesh: Mesh
    per_vertex: int
    per_edge: int
    edge_deflections: int = 0
    arcs: Arcs = field(default_factory=no_arcs)

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
            columns.append(self.on_edges(self.mesh.triangle_edges).reshape(n, -1))
        return np.concatenate(columns, axis=1)

    def at_vertices(self, vertices: Ints) -> Ints:
        """Unknowns at vertices (...), (..., per_vertex)."""
        return self.per_vertex * vertices[..., None] + np.arange(self.per_vertex)

    def on_edges(self, edges: Ints) -> Ints:
        """Unknowns on edges (...), (..., per_edge)."""
        first = self.per_vertex * len(self.mesh.points)
        return first + self.per_edge * edges[..., None] + np.arange(self.per_edge)

    def by_vertex(self, values: Floats) -> Floats:
        """View values (count, ...) of the unknowns by vertex, (n_points, p, ...)."""
        n = self.per_vertex * len(self.mesh.points)
        return values[:n].reshape(len(self.mesh.points), self.per_vertex, -1)


def add_up(forces: Floats, table: Ints, own: Floats) -> None:
    """Sum forces (n, d, c) of triangles into those of the unknowns (count, c)."""
    for c in range(forces.shape[1]):
        weights = np.ascontiguousarray(own[:, :, c]).ravel()
        forces[:, c] += np.bincount(table.ravel(), weights, minlength=len(forces))
