"""The outline that a mesh was made of.

A mesh that comes from a file knows its sides by name but not its curves. Its boundary
is walked round; vertices stay where the side changes or the boundary turns, and runs of
edges on a circle are taken for arcs by the rule that holds for drawings.
"""

from dataclasses import replace

import numpy as np

from kplate import curves
from kplate.arrays import Bools, Floats, Ints
from kplate.errors import InputError
from kplate.mesh import STRAIGHT_EDGE, Mesh
from kplate.outline import Outline
from kplate.polygon import Chords, Polygon, at

# A vertex closer to the line through its neighbours, as a share of the mesh's size, is
# on it: a file's last digit.
ON_LINE = 1e-9


def outline_of(mesh: Mesh, *, chords: Chords = "ask") -> Outline:
    """Trace the outline of a mesh.

    Parameters
    ----------
    mesh : Mesh
        Its boundary edges, with their sides, are walked round; circles that it knows
        are kept, others are found.
    chords : {"ask", "arc", "polygon"}
        What runs of edges on a circle are, as in `Polygon`.

    Returns
    -------
    Outline
        Rim and holes, holes in the order of their first edge; zones are not traced.

    Raises
    ------
    InputError
        If the mesh is in several parts, or a side lies on two closed lines.
    """
    lines = []
    for walk in _walks(mesh):
        points = mesh.points[mesh.boundary_edges[walk, 0]]
        sides = np.array(mesh.side_names, dtype=object)[mesh.boundary_sides[walk]]
        # The plate is on the left: round a hole that is clockwise.
        rim = _signed_area(points) > 0.0
        line = _line(mesh, walk if rim else walk[::-1], rim=rim)
        lines.append(
            (rim, _polygon(*line, tuple(sides if rim else sides[::-1]), chords))
        )
    rims = [line for rim, line in lines if rim]
    if len(rims) != 1:
        raise InputError(
            f"the mesh is in {len(rims)} parts, one of them near "
            f"{at(rims[-1].points[0])}; a panel is in one."
        )
    return Outline(rim=rims[0], holes=tuple(line for rim, line in lines if not rim))


def with_circles(mesh: Mesh, outline: Outline) -> Mesh:
    """Give boundary edges the circles of the outline's arcs.

    Parameters
    ----------
    mesh : Mesh
        A mesh of the outline.
    outline : Outline
        As `outline_of` traces it.

    Returns
    -------
    Mesh
        The same mesh; edges whose middle is nearest to an arc are chords of its circle.
    """
    lines = outline.boundaries
    bulges = np.concatenate([line.bulges for line in lines])
    if not bulges.any():
        return mesh
    starts = np.concatenate([line.points for line in lines])
    ends = np.concatenate([line.ends for line in lines])
    names = np.array([name for line in lines for name in line.sides], dtype=object)
    middles = mesh.points[mesh.boundary_edges].mean(axis=1)
    nearest = np.empty(len(middles), dtype=np.int64)
    for number, name in enumerate(mesh.side_names):
        edges = np.flatnonzero(mesh.boundary_sides == number)
        own = np.flatnonzero(names == name)
        off = curves.distances(middles[edges], starts[own], ends[own], bulges[own])
        nearest[edges] = own[np.argmin(off, axis=1)]
    arcs = np.flatnonzero(bulges)
    circle = np.full(len(bulges), STRAIGHT_EDGE)
    circle[arcs] = np.arange(len(arcs))
    return replace(
        mesh,
        boundary_circles=circle[nearest],
        circles=curves.circles(starts, ends, bulges)[arcs],
    )


def _walks(mesh: Mesh) -> list[Ints]:
    """Boundary edges of every closed line, in the sense in which they run."""
    after = mesh.boundary_joints[:, 1]
    seen = np.zeros(len(after), dtype=bool)
    walks = []
    for first in range(len(after)):
        walk, edge = [], first
        while not seen[edge]:
            seen[edge] = True
            walk.append(edge)
            edge = int(after[edge])
        if walk:
            walks.append(np.array(walk))
    return walks


def _signed_area(points: Floats) -> float:
    x, y = (points - points[0]).T
    return 0.5 * float(np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y))


def _line(mesh: Mesh, walk: Ints, *, rim: bool) -> tuple[Floats, Floats]:
    """Starts and bulges of the edges of a walk, counter-clockwise."""
    edges = mesh.boundary_edges[walk] if rim else mesh.boundary_edges[walk, ::-1]
    starts, ends = np.moveaxis(mesh.points[edges], 1, 0)
    circle = mesh.boundary_circles[walk]
    curved = circle != STRAIGHT_EDGE
    bulges = np.zeros(len(walk))
    x, y, radius = mesh.circles[circle[curved]].T
    step = ends[curved] - starts[curved]
    arm = np.column_stack([x, y]) - starts[curved]
    left = np.sign(step[:, 0] * arm[:, 1] - step[:, 1] * arm[:, 0])
    half = np.arcsin(np.minimum(0.5 * np.hypot(*step.T) / radius, 1.0))
    bulges[curved] = left * np.tan(0.5 * half)
    return starts, bulges


def _polygon(
    points: Floats, bulges: Floats, sides: tuple[str, ...], chords: Chords
) -> Polygon:
    """Polygon of the edges, those in one line or on one circle taken together."""
    names = np.array(sides, dtype=object)
    drop = (names == np.roll(names, 1)) & _goes_on(points, bulges)
    if drop.all():  # one circle of one side: two half circles
        drop[[0, len(drop) // 2]] = False
    first = int(np.argmin(drop))
    order = np.roll(np.arange(len(points)), -first)
    kept = ~drop[order]
    group = np.cumsum(kept) - 1
    # A part of an arc has the tangent of that part of the angle.
    angles = np.bincount(group, weights=np.arctan(bulges[order]))
    keep = order[kept]
    return Polygon(
        points=points[keep],
        sides=tuple(sides[i] for i in keep),
        bulges=np.tan(angles),
        chords=chords,
    )


def _goes_on(points: Floats, bulges: Floats) -> Bools:
    """Vertices at which the piece before goes on, in a line or on its circle, (n,)."""
    before, after = np.roll(points, 1, axis=0), np.roll(points, -1, axis=0)
    size = float(np.hypot(*np.ptp(points, axis=0)))
    chord, arm = after - before, points - before
    cross = chord[:, 0] * arm[:, 1] - chord[:, 1] * arm[:, 0]
    ahead = np.einsum("ij,ij->i", points - before, after - points) > 0.0
    on_line = ahead & (np.abs(cross) <= ON_LINE * size * np.hypot(*chord.T))
    circle = curves.circles(points, after, bulges)
    same = np.abs(circle - np.roll(circle, 1, axis=0)).max(axis=1) <= ON_LINE * size
    straight = (bulges == 0.0) & (np.roll(bulges, 1) == 0.0)
    return np.where(straight, on_line, same & (bulges * np.roll(bulges, 1) > 0.0))
