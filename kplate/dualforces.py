"""Corner forces and sides' forces from the balanced moments.

They are no bounded functionals, so that no bound can be given; what they differ by from
those of the plate's elements indicates the error.
"""

from collections.abc import Sequence

import numpy as np

from kplate.arrays import Floats, Ints
from kplate.mesh import Mesh
from kplate.quadrature import gauss
from kplate.solve.dual import DualState


def edge_moments(dual: DualState, edges: Ints, shares: Floats) -> Floats:
    """Moments in N at shares (q,) of boundary edges (k,), (k, q, 3, c)."""
    triangles, barycentrics = _at(dual.mesh, edges, shares)
    return dual.moments_at(triangles, barycentrics)


def side_forces(dual: DualState, name: str, corners: Sequence[int]) -> Floats:
    """Force in N, positive up, that a side brings without its corner forces, (c,).

    The integral of the effective shear and the jumps of m_ns between its edges: the
    integral of q_n less the gain of m_ns over each run between `corners` (vertices) or
    the ends of the side.
    """
    mesh = dual.mesh
    own = np.flatnonzero(mesh.boundary_sides == mesh.side_names.index(name))
    start, end = np.moveaxis(mesh.points[mesh.boundary_edges[own]], 1, 0)
    lengths = mesh.boundary_lengths[own]
    tangent = (end - start) / lengths[:, None]
    normal = np.column_stack([tangent[:, 1], -tangent[:, 0]])
    shares, weights = gauss(dual.order)
    triangles, barycentrics = _at(mesh, own, shares)
    shears = dual.shears_at(triangles, barycentrics)
    total = np.einsum("k,q,ka,kqac->c", lengths, weights, normal, shears, optimize=True)
    ends = edge_moments(dual, own, np.array([0.0, 1.0]))
    nx, ny = normal.T
    tx, ty = tangent.T
    twist = np.stack([nx * tx, ny * ty, nx * ty + ny * tx], axis=-1)
    m_ns = np.einsum("ka,kqac->kqc", twist, ends)
    vertices = mesh.boundary_edges[own]
    breaks = np.isin(vertices, corners)
    breaks |= np.bincount(vertices.ravel(), minlength=len(mesh.points))[vertices] == 1
    total += m_ns[breaks[:, 0], 0].sum(axis=0) - m_ns[breaks[:, 1], 1].sum(axis=0)
    return np.asarray(total, dtype=np.float64)


def _at(mesh: Mesh, edges: Ints, shares: Floats) -> tuple[Ints, Floats]:
    """Triangles at boundary edges, and shares of these in them, (k, q, 3)."""
    ends = mesh.boundary_edges[edges]
    triangles = mesh.triangles_at(ends)
    corners = mesh.triangles[triangles]
    first = (corners == ends[:, :1]).astype(float)
    last = (corners == ends[:, 1:]).astype(float)
    s = shares[:, None]
    return triangles, (1.0 - s) * first[:, None] + s * last[:, None]
