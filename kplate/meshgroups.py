"""Meshes from the cells of a file and their named groups.

Groups of lines on the boundary are sides, those inside are seams; groups of triangles
are zones, of single points marks. Every boundary edge has to be in one group.
"""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from kplate.arrays import Floats, Ints
from kplate.errors import InputError
from kplate.mesh import Mesh
from kplate.polygon import at


@dataclass(frozen=True, eq=False, kw_only=True)
class Cells:
    """Cells of one kind, and the names of their groups with the cells in them.

    Parameters
    ----------
    nodes : ndarray, shape (n, 1), (n, 2) or (n, 3)
        Points of each single point, line or triangle.
    groups : mapping of str to ndarray
        Numbers of the cells of each group.
    """

    nodes: Ints
    groups: Mapping[str, Ints]


def mesh_of(points: Floats, cells: Mapping[int, Cells]) -> Mesh:
    """Mesh of a file's cells; points that no triangle uses are left out.

    Parameters
    ----------
    points : ndarray, shape (n, 2)
        Points in m.
    cells : mapping of int to Cells
        Single points under 0, lines under 1, triangles under 2.

    Returns
    -------
    Mesh
        All its boundary edges straight.

    Raises
    ------
    InputError
        If there are no triangles, or a boundary edge belongs to no group or to two.
    MeshError
        If the triangles are no mesh of a plate.
    """
    triangles = cells[2].nodes
    if not len(triangles):
        raise InputError(
            "the mesh holds no triangles; where lines have names, so must surfaces, or "
            "they are not saved."
        )
    used = np.unique(triangles)
    number = np.full(len(points), -1)
    number[used] = np.arange(len(used))
    points, triangles = points[used], _counter_clockwise(points, triangles)
    triangles = number[triangles]
    edges = _edges_used_once(triangles)
    lines = Cells(nodes=number[cells[1].nodes], groups=cells[1].groups)
    sides, names, seams = _sides_and_seams(points, edges, lines)
    zones, zone_names = _zones(points[triangles].mean(axis=1), cells[2].groups)
    marks = {
        name if len(rows) == 1 else f"{name}-{k}": int(number[cells[0].nodes[row, 0]])
        for name, rows in cells[0].groups.items()
        for k, row in enumerate(rows, start=1)
    }
    return Mesh(
        points=points,
        triangles=triangles,
        boundary_edges=edges,
        boundary_sides=sides,
        side_names=names,
        zones=zones,
        zone_names=("plate", *zone_names),
        seam_edges=np.concatenate([*seams.values(), np.empty((0, 2), dtype=np.int64)]),
        seam_numbers=np.repeat(np.arange(len(seams)), [len(s) for s in seams.values()]),
        seam_names=tuple(seams),
        mark_vertices=np.array(list(marks.values()), dtype=np.int64),
        mark_names=tuple(marks),
    )


def _counter_clockwise(points: Floats, triangles: Ints) -> Ints:
    """Turn round triangles that run clockwise: a file's normals may point down."""
    a, b, c = np.moveaxis(points[triangles], 1, 0)
    u, v = b - a, c - a
    clockwise = u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0] < 0.0
    return np.where(clockwise[:, None], triangles[:, ::-1], triangles)


def _edges_used_once(triangles: Ints) -> Ints:
    """Edges of one triangle only, as they run in it, (k, 2)."""
    around = triangles[:, [[0, 1], [1, 2], [2, 0]]].reshape(-1, 2)
    n = int(triangles.max()) + 1
    low, high = np.sort(around, axis=1).T
    _, first, uses = np.unique(low * n + high, return_index=True, return_counts=True)
    return around[np.sort(first[uses == 1])]


def _sides_and_seams(
    points: Floats, edges: Ints, lines: Cells
) -> tuple[Ints, tuple[str, ...], dict[str, Ints]]:
    """Side of each boundary edge, names of the sides, and edges of the seams."""
    n = len(points)
    low, high = np.sort(edges, axis=1).T
    at_key = {key: i for i, key in enumerate((low * n + high).tolist())}
    low, high = np.sort(lines.nodes, axis=1).T
    keys = np.where(low < 0, -1, low * n + high).tolist()
    names: list[str] = []
    seams: dict[str, Ints] = {}
    sides = np.full(len(edges), -1)
    for name, rows in lines.groups.items():
        own = np.array([at_key.get(keys[row], -1) for row in rows])
        if (own < 0).any():
            if (own >= 0).any():
                raise InputError(
                    f"group {name!r} has lines on the boundary and inside; name them "
                    "apart."
                )
            seams[name] = lines.nodes[rows]
            continue
        taken = own[sides[own] >= 0]
        if taken.size:
            raise InputError(
                f"the boundary edge at {at(points[edges[taken[0]]].mean(axis=0))} is "
                f"in the groups {names[sides[taken[0]]]!r} and {name!r}; it belongs to "
                "one."
            )
        sides[own] = len(names)
        names.append(name)
    bare = np.flatnonzero(sides < 0)
    if bare.size:
        raise InputError(
            f"{len(bare)} of {len(edges)} boundary edges belong to no named group of "
            f"lines, the first near {at(points[edges[bare[0]]].mean(axis=0))}; name "
            "every side, or close the crack where nodes are double."
        )
    return sides, tuple(names), seams


def _zones(middles: Floats, groups: Mapping[str, Ints]) -> tuple[Ints, tuple[str, ...]]:
    """Zone of each triangle, 0 where it has none, and the names from 1."""
    zones = np.zeros(len(middles), dtype=np.int64)
    names = tuple(groups)
    for number, (name, rows) in enumerate(groups.items(), start=1):
        taken = rows[zones[rows] > 0]
        if taken.size:
            raise InputError(
                f"the triangle at {at(middles[taken[0]])} is in the groups "
                f"{names[zones[taken[0]] - 1]!r} and {name!r}; it belongs to one."
            )
        zones[rows] = number
    return zones, names
