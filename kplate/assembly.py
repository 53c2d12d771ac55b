"""Sparse stiffness and internal forces from elements.

Triangles go through in blocks, which stay in the processor's cache and bound the
memory.
"""

from collections.abc import Iterator

import numpy as np
import scipy.sparse as sp

from kplate.arrays import Floats, Ints
from kplate.boundary import Constraints
from kplate.dofs import Numbering, add_up
from kplate.elements import Element
from kplate.elements.triangle import Geometry, edge_normals
from kplate.pattern import Pattern
from kplate.plate import Plate

BLOCK = 1024  # triangles; 512 to 2048 are about equally fast


def stiffness(plate: Plate, element: Element, constraints: Constraints) -> sp.csc_array:
    """Lower triangle of the stiffness of the free unknowns.

    Parameters
    ----------
    plate : Plate
        Gives the rigidity.
    element : Element
        Gives the matrices of the triangles.
    constraints : Constraints
        Frames of the turned unknowns, and which are held.

    Returns
    -------
    csc_array, shape (n_free, n_free)
        Rows sorted, diagonal included.
    """
    numbering = constraints.numbering
    own = _turned(element_stiffness(plate, numbering, element), constraints)
    return Pattern(numbering=numbering).matrix(own, constraints.free)


def element_stiffness(
    plate: Plate, numbering: Numbering, element: Element, triangles: Ints | None = None
) -> Iterator[tuple[Ints, Floats]]:
    """Element stiffness matrices, block by block.

    Yields
    ------
    triangles : ndarray, shape (n,)
        Their numbers.
    K : ndarray, shape (n, d, d)
        Their matrices.
    """
    mesh, q = numbering.mesh, len(element.rule.weights)
    chosen = np.arange(len(mesh.triangles)) if triangles is None else triangles
    for start in range(0, len(chosen), BLOCK):
        block = chosen[start : start + BLOCK]
        geometry = Geometry(
            vertices=mesh.points[mesh.triangles[block]], rule=element.rule
        )
        own = plate.rigidities[mesh.zones[block]]
        rigidity = np.broadcast_to(own[:, None], (len(block), q, 3, 3))
        K = element.stiffness(geometry, rigidity)
        arcs = numbering.arcs.among(block)
        if len(arcs):
            K[arcs.rows] = element.shape.round_stiffness(arcs, own[arcs.rows])
        yield block, K


def internal_forces(
    plate: Plate,
    element: Element,
    numbering: Numbering,
    unknowns: Floats,
    triangles: Ints | None = None,
) -> Floats:
    """Stiffness times unknowns (count, c), summed over some triangles or all.

    Each triangle's rigid motion, which brings no forces, is taken off first: where
    triangles are small its round-off would be larger than the forces themselves.
    """
    mesh = numbering.mesh
    result = np.zeros_like(unknowns)
    for block, K in element_stiffness(plate, numbering, element, triangles):
        table = numbering.table[block]
        vertices = mesh.points[mesh.triangles[block]]
        bent = without_rigid_motion(unknowns[table], vertices, numbering)
        add_up(result, table, K @ bent)
    return result


def without_rigid_motion(own: Floats, vertices: Floats, numbering: Numbering) -> Floats:
    """Take the mean deflection and slope off the unknowns (n, d, c) of triangles."""
    p = numbering.per_vertex
    result = own.copy()
    parted = result[:, : 3 * p].reshape(len(own), 3, p, -1)  # a view
    slope = parted[:, :, 1:3].mean(axis=1)  # (n, 2, c)
    arms = vertices - vertices.mean(axis=1, keepdims=True)
    parted[:, :, 1:3] -= slope[:, None]
    parted[:, :, 0] -= parted[:, :, 0].mean(axis=1, keepdims=True) + arms @ slope
    if numbering.per_edge:
        result[:, 3 * p :] -= edge_normals(vertices) @ slope
    return result


def _turned(
    elements: Iterator[tuple[Ints, Floats]], constraints: Constraints
) -> Iterator[tuple[Ints, Floats]]:
    """Turn element matrices where a vertex has a frame."""
    mesh, frames = constraints.numbering.mesh, constraints.frames
    frame_of = np.full(len(mesh.points), -1)
    frame_of[constraints.vertices] = np.arange(len(constraints.vertices))
    p = frames.shape[-1]
    for triangles, K in elements:
        frame = frame_of[mesh.triangles[triangles]]
        for k in range(3):
            some = np.flatnonzero(frame[:, k] >= 0)
            if some.size:
                Q, own = frames[frame[some, k]], slice(p * k, p * (k + 1))
                K[some, own] = Q.swapaxes(-1, -2) @ K[some, own]
                K[some, :, own] = K[some, :, own] @ Q
        yield triangles, K
