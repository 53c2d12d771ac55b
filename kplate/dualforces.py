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

_POINTS = 8  # along an edge; exact on straight ones


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
    lengths = mesh.boundary_lengths[own].copy()
    shares, weights = gauss(_POINTS)
    triangles, barycentrics = _at(mesh, own, shares)
    normal = np.column_stack([end[:, 1] - start[:, 1], start[:, 0] - end[:, 0]])
    normals = np.repeat((normal / lengths[:, None])[:, None], len(shares), axis=1)
    arcs = dual.constraints.numbering.arcs.among(triangles)
    if len(arcs):
        lengths[arcs.rows] = arcs.lengths
        barycentrics[arcs.rows] = arcs.barycentrics(arcs.at(shares)[0])
        normals[arcs.rows] = arcs.frames(shares)[1]
    shears = dual.shears_at(triangles, barycentrics)
    total = np.einsum(
        "k,q,kqa,kqac->c", lengths, weights, normals, shears, optimize=True
    )
    ends = edge_moments(dual, own, np.array([0.0, 1.0]))
    vertices = mesh.boundary_edges[own]
    tangent = np.stack([mesh.tangents(own, vertices[:, k]) for k in (0, 1)], axis=1)
    tx, ty = np.moveaxis(tangent, -1, 0)
    twist = np.stack([ty * tx, -tx * ty, ty * ty - tx * tx], axis=-1)
    m_ns = np.einsum("kqa,kqac->kqc", twist, ends)
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
