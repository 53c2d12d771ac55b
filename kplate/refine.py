"""Finer meshes by bisection; new points on curved sides lie on their circles.

A triangle is parted from the middle of its longest edge to the vertex opposite. Where
another of its edges is parted too, the half at that edge is parted once more, so that
no vertex is left hanging on an edge. Angles stay at least half as large as they were.

Source: M. C. Rivara, "Algorithms for refining triangular grids suitable for adaptive
and multigrid techniques", Int. J. Numer. Meth. Engng 20 (1984) 745-756 (from memory).
"""

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import ArrayLike

from kplate.arrays import Bools, Floats, Ints
from kplate.errors import InputError
from kplate.mesh import STRAIGHT_EDGE, Mesh
from kplate.polygon import SNAP


def refined(mesh: Mesh, marked: ArrayLike) -> Mesh:
    """Bisect the marked triangles, and as many others as that takes.

    Parameters
    ----------
    mesh : Mesh
        What to refine.
    marked : array_like of bool, shape (n_triangles,)
        Triangles to part.

    Returns
    -------
    Mesh
        Sides, circles, zones, seams and marks are kept.

    Raises
    ------
    InputError
        If `marked` does not name triangles one by one.
    """
    wanted = np.asarray(marked)
    if wanted.shape != (len(mesh.triangles),) or wanted.dtype != np.bool_:
        raise InputError(
            f"marked has shape {wanted.shape} and type {wanted.dtype}; give one True "
            f"or False for each of {len(mesh.triangles)} triangles."
        )
    turned = _longest_first(mesh)
    parted = _closure(mesh, turned, wanted)
    middle = np.full(len(mesh.edges), -1)
    middle[parted] = len(mesh.points) + np.arange(int(parted.sum()))
    triangles, owners = _children(mesh, turned, middle)
    sides, side_owners = _split(mesh, mesh.boundary_edges, middle)
    seams, seam_owners = _split(mesh, mesh.seam_edges, middle)
    return replace(
        mesh,
        points=np.vstack([mesh.points, _middles(mesh)[parted]]),
        triangles=triangles,
        zones=mesh.zones[owners],
        boundary_edges=sides,
        boundary_sides=mesh.boundary_sides[side_owners],
        boundary_circles=mesh.boundary_circles[side_owners],
        seam_edges=seams,
        seam_numbers=mesh.seam_numbers[seam_owners],
    )


def parted_at_middles(mesh: Mesh, wanted: Bools) -> Mesh:
    """Part some triangles in three, from their middles."""
    old = mesh.triangles[wanted]
    new = len(mesh.points) + np.arange(len(old))
    a, b, c = old.T
    parts = [np.column_stack(own) for own in ((a, b, new), (b, c, new), (c, a, new))]
    return replace(
        mesh,
        points=np.vstack([mesh.points, mesh.points[old].mean(axis=1)]),
        triangles=np.concatenate([mesh.triangles[~wanted], *parts]),
        zones=np.concatenate([mesh.zones[~wanted], np.tile(mesh.zones[wanted], 3)]),
    )


def refined_towards(
    mesh: Mesh, places: Sequence[tuple[tuple[float, float], float, float]]
) -> Mesh:
    """Bisect the triangles at some places until their edges are short enough.

    Parameters
    ----------
    mesh : Mesh
        What to refine.
    places : sequence of tuple
        Each a place in m, the length in m that no edge of the triangles there is to
        exceed, and the distance in m from the place up to which they count as there.

    Returns
    -------
    Mesh
        Sizes double from triangle to triangle around each place.
    """
    snap = SNAP * float(np.sqrt(mesh.area))
    while places:
        corners = mesh.points[mesh.triangles]
        sides = corners - np.roll(corners, 1, axis=1)
        longest = np.hypot(sides[..., 0], sides[..., 1]).max(axis=1)
        marked = np.zeros(len(mesh.triangles), dtype=bool)
        for place, least, within in places:
            near = np.hypot(*(mesh.points - place).T) <= within + snap
            at = near[mesh.triangles].any(axis=1)
            if not at.any() and mesh.covers([place])[0]:
                at[mesh.locate([place])[0]] = True
            marked |= at & (longest > least)
        if not marked.any():
            break
        mesh = refined(mesh, marked)
    return mesh


def _longest_first(mesh: Mesh) -> Ints:
    """Local number of the vertex opposite each triangle's longest edge, (n,).

    Of equally long edges the one of the smaller number is taken, in both triangles.
    """
    a, b = np.moveaxis(mesh.points[mesh.edges], 1, 0)
    lengths = np.hypot(*(b - a).T)
    rank = np.empty(len(lengths), dtype=np.int64)
    rank[np.lexsort((-np.arange(len(lengths)), np.round(lengths, 12)))] = np.arange(
        len(lengths)
    )
    return np.argmax(rank[mesh.triangle_edges], axis=1)


def _closure(mesh: Mesh, longest: Ints, wanted: Bools) -> Bools:
    """Edges to part: the longest of every triangle that has one of its edges parted."""
    own = np.take_along_axis(mesh.triangle_edges, longest[:, None], axis=1)[:, 0]
    parted = np.zeros(len(mesh.edges), dtype=bool)
    parted[own[wanted]] = True
    while True:
        more = parted[mesh.triangle_edges].any(axis=1) & ~parted[own]
        if not more.any():
            return parted
        parted[own[more]] = True


def _middles(mesh: Mesh) -> Floats:
    """Middle of each edge, on the circle where the edge is a chord of one."""
    middles = mesh.points[mesh.edges].mean(axis=1)
    curved = np.flatnonzero(mesh.boundary_circles != STRAIGHT_EDGE)
    if curved.size:
        number = edge_numbers(mesh, mesh.boundary_edges[curved])
        circle = mesh.circles[mesh.boundary_circles[curved]]
        arm = middles[number] - circle[:, :2]
        arm *= (circle[:, 2] / np.hypot(*arm.T))[:, None]
        middles[number] = circle[:, :2] + arm
    return middles


def edge_numbers(mesh: Mesh, pairs: Ints) -> Ints:
    """Numbers of edges (k, 2) given by their vertices, (k,)."""
    n = len(mesh.points)
    key = mesh.edges[:, 0] * n + mesh.edges[:, 1]
    given = np.sort(pairs, axis=1)
    return np.searchsorted(key, given[:, 0] * n + given[:, 1])


def _children(mesh: Mesh, longest: Ints, middle: Ints) -> tuple[Ints, Ints]:
    """Triangles after bisection and the triangle each came from."""
    order = (longest[:, None] + np.arange(3)) % 3
    top, left, right = np.take_along_axis(mesh.triangles, order, axis=1).T
    base, at_right, at_left = np.take_along_axis(mesh.triangle_edges, order, axis=1).T
    # Edges opposite top, left and right; the one opposite right joins top and left.
    foot = middle[base]
    whole = foot < 0
    number = np.arange(len(top))
    found = [mesh.triangles[whole]]
    owners = [number[whole]]
    for halves, edge in (
        ((top, left, foot), at_left),
        ((foot, right, top), at_right),
    ):
        side = middle[edge]
        once, twice = ~whole & (side < 0), ~whole & (side >= 0)
        a, b, c = halves
        found.append(np.column_stack([a, b, c])[once])
        owners.append(number[once])
        # The parted edge of the first half is (a, b), of the second (b, c).
        if edge is at_left:
            parts = ((a, side, c), (side, b, c))
        else:
            parts = ((a, b, side), (a, side, c))
        for part in parts:
            found.append(np.column_stack(part)[twice])
            owners.append(number[twice])
    return np.concatenate(found), np.concatenate(owners)


def _split(mesh: Mesh, edges: Ints, middle: Ints) -> tuple[Ints, Ints]:
    """Edges (k, 2), those that are parted twice over, and which each came from."""
    between = middle[edge_numbers(mesh, edges)]
    whole, number = between < 0, np.arange(len(edges))
    first = np.column_stack([edges[:, 0], between])[~whole]
    second = np.column_stack([between, edges[:, 1]])[~whole]
    owners = np.concatenate([number[whole], number[~whole], number[~whole]])
    return np.concatenate([edges[whole], first, second]), owners
