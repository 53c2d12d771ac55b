"""Edges along which supports hold a plate, and how they go on from one to the next.

A run is a chain of edges, held alike, that go on smoothly: with one tangent at a joint.
"""

from dataclasses import dataclass

import numpy as np

from kplate.arrays import Bools, Floats, Ints
from kplate.boundary import seam_tangents, side_tangents
from kplate.elements.arcs import Arcs
from kplate.mesh import Mesh
from kplate.plate import Plate

# Tangents that differ by less than this are one.
ONE = 1e-12


@dataclass(frozen=True, eq=False, kw_only=True)
class HeldEdges:
    """Edges along which supports hold the plate.

    Parameters
    ----------
    lines : ndarray, shape (m,)
        Number of the side of each, or the number of sides and that of its seam.
    edges : ndarray, shape (m, 2)
        Their vertices.
    holds, clamps : ndarray, shape (m,)
        Whether w, and the slope along the normal, are held.
    joints : ndarray, shape (m, 2)
        Joint at which each edge begins and ends: the same one for two edges that go on
        smoothly.
    senses : ndarray, shape (m, 2)
        1, or -1 where the joint counts against the edge's sense.
    ends : ndarray, shape (m, 2)
        Whether a run of edges ends there.
    tangents : ndarray, shape (m, 2, 2)
        Unit tangents held at the beginning and at the end: the edge's own, or at a bend
        that of both its edges, and on a circle the circle's.
    curvatures : ndarray, shape (m,)
        Of round edges that are followed, in 1/m, positive where they bulge out; else 0.
    """

    lines: Ints
    edges: Ints
    holds: Bools
    clamps: Bools
    joints: Ints
    senses: Floats
    ends: Bools
    tangents: Floats
    curvatures: Floats


def held_edges(plate: Plate, mesh: Mesh, arcs: Arcs | None = None) -> HeldEdges:
    """Held edges of sides, then of seams, and how they join.

    `arcs` are the round edges that are followed.
    """
    sides = len(mesh.side_names)
    edges = np.concatenate([mesh.boundary_edges, mesh.seam_edges])
    lines = np.concatenate([mesh.boundary_sides, sides + mesh.seam_numbers])
    names = [*mesh.side_names, *mesh.seam_names]
    holds = np.array([plate.support(name).holds_deflection for name in names])
    clamps = np.array([plate.support(name).holds_slope for name in names])
    joints = np.arange(2 * len(edges)).reshape(-1, 2)
    senses, ends = np.ones(joints.shape), np.ones(joints.shape, dtype=bool)
    held = np.empty((len(edges), 2, 2))
    arriving, leaving = mesh.boundary_joints.T
    tangents = side_tangents(plate, mesh)
    held[arriving, 1], held[leaving, 0] = tangents[:, 0], tangents[:, 1]
    one = np.abs(tangents[:, 0] - tangents[:, 1]).max(axis=1) < ONE
    first, second = lines[arriving], lines[leaving]
    one &= (holds[first] == holds[second]) & (clamps[first] == clamps[second])
    joints[leaving[one], 0] = joints[arriving[one], 1]
    ends[arriving[one], 1] = ends[leaving[one], 0] = False
    vertices, number, away, pairs = seam_tangents(plate, mesh)
    at = (mesh.seam_edges[number, 1] == vertices).astype(np.int64)
    number = len(mesh.boundary_edges) + number
    held[number, at] = np.where(at[:, None] == 1, -away, away)
    pairs = pairs[np.abs(away[pairs + 1] + away[pairs]).max(axis=1) < ONE]
    a, b = (number[pairs], at[pairs]), (number[pairs + 1], at[pairs + 1])
    joints[b] = joints[a]
    senses[b] = np.where(a[1] == b[1], -1.0, 1.0)
    ends[a] = ends[b] = False
    curvatures = np.zeros(len(edges))
    if arcs is not None and len(arcs):
        numbers = mesh.triangle_edges[arcs.rows, arcs.edges]
        bow = np.zeros(len(mesh.edges))
        bow[numbers] = arcs.curvatures
        own = slice(0, len(mesh.boundary_edges))
        curvatures[own] = bow[mesh.edge_numbers(mesh.boundary_edges)]
    kept = (holds | clamps)[lines]
    return HeldEdges(
        lines=lines[kept],
        edges=edges[kept],
        holds=holds[lines[kept]],
        clamps=clamps[lines[kept]],
        joints=joints[kept],
        senses=senses[kept],
        ends=ends[kept],
        tangents=held[kept],
        curvatures=curvatures[kept],
    )
