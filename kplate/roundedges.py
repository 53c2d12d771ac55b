"""Round edges of a mesh as arcs that an element follows.

A triangle can have one round edge, and every ray from the vertex opposite must meet it
once; `fitted` parts triangles until that is so.
"""

import numpy as np

from kplate.arrays import Ints
from kplate.elements.arcs import Arcs
from kplate.elements.piecewise import Piecewise
from kplate.elements.quintic import QUINTIC
from kplate.errors import MeshError
from kplate.mesh import STRAIGHT_EDGE, Mesh
from kplate.plate import Plate
from kplate.refine import parted_at_middles, refined

# Least share of a triangle's area that a ray may sweep at an arc: below it the
# triangle is bisected, for the quadrature to be exact to 1e-9.
_STEEP = 0.3
# An arc turns by no more than this, in rad, for the lift and the quadrature to be exact
# to round-off.
_MOST_TURN = 1.1
_ROUNDS = 40


def round_edges(plate: Plate, mesh: Mesh) -> Arcs:
    """The round edges of a mesh, and what the plate's supports hold along them.

    Parameters
    ----------
    plate : Plate
        The statement.
    mesh : Mesh
        Triangles over its outline, `fitted`.

    Returns
    -------
    Arcs
        Their rows are numbers of triangles.

    Raises
    ------
    MeshError
        If a triangle has two round edges or is too flat for its own.
    """
    arcs = _arcs(mesh, plate)
    if len(np.unique(arcs.rows)) < len(arcs):
        raise MeshError(
            "a triangle has two round edges; mesh the plate with more triangles."
        )
    check_room(arcs)
    return arcs


def check_room(arcs: Arcs) -> None:
    """Refuse triangles that are too flat for their round edges.

    Raises
    ------
    MeshError
    """
    if (arcs.steepness <= 0.0).any():
        raise MeshError(
            "a triangle is too large for the round edge of its own; mesh the plate "
            "with more triangles."
        )


def fitted(mesh: Mesh, shape: Piecewise = QUINTIC) -> Mesh:
    """Part triangles until each has one round edge at most, and room for it.

    `shape` is that of the element; nothing is done where it does not follow arcs.
    """
    if not shape.follows or (mesh.boundary_circles == STRAIGHT_EDGE).all():
        return mesh
    for _ in range(_ROUNDS):
        arcs = _arcs(mesh)
        twice = np.bincount(arcs.rows, minlength=len(mesh.triangles)) > 1
        if twice.any():
            mesh = parted_at_middles(mesh, twice)
            continue
        steep = shape.cones(arcs).steepness
        flat = (steep < _STEEP) | (np.abs(arcs.turn) > _MOST_TURN)
        if not flat.any():
            return mesh
        wanted = np.zeros(len(mesh.triangles), dtype=bool)
        wanted[arcs.rows[flat]] = True
        mesh = refined(mesh, wanted)
    return mesh


def _arcs(mesh: Mesh, plate: Plate | None = None) -> Arcs:
    """All round edges, held as a plate says or not at all."""
    curved = np.flatnonzero(mesh.boundary_circles != STRAIGHT_EDGE)
    pairs = mesh.boundary_edges[curved]
    triangles: Ints = mesh.triangles_at(pairs)
    own = mesh.triangle_edges[triangles] == mesh.edge_numbers(pairs)[:, None]
    holds = np.zeros(len(mesh.side_names), dtype=bool)
    clamps = holds.copy()
    if plate is not None:
        supports = [plate.support(name) for name in mesh.side_names]
        holds = np.array([s.holds_deflection for s in supports])
        clamps = np.array([s.holds_slope for s in supports]) & holds
    sides = mesh.boundary_sides[curved]
    return Arcs(
        rows=triangles,
        vertices=mesh.points[mesh.triangles[triangles]],
        edges=own.argmax(axis=1),
        circles=mesh.circles[mesh.boundary_circles[curved]],
        holds=holds[sides],
        clamps=clamps[sides],
    )
