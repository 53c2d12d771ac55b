"""Where a support word becomes held unknowns.

At each vertex the supported edges that meet there hold directions in the space of the
vertex's unknowns, w and its slopes: w itself, the slope along the edge's tangent t, and
where the slope is held that along its normal n. An element whose second derivatives are
unknowns too holds ``w,tt`` and ``w,tn`` likewise: what is held along an edge has held
derivatives along it. The unknowns are turned into a frame, orthonormal among those of
one order, whose first directions are the held ones, and those are left out of the
equations: no penalty numbers. Unknowns on the edges themselves are deflections, held
where w is, and slopes along the normal, held where the slope is.

Between sides held alike, a turn smaller than the plate's `bend_turn` is a bend with ONE
tangent: two tangents there would hold both slopes and clamp a plate that is free to
turn. Chords of a circle take the circle's tangent.
"""

from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise

import numpy as np

from kplate.arrays import Bools, Floats, Ints
from kplate.dofs import Numbering
from kplate.elements.triangle import edge_normals
from kplate.errors import SolveError
from kplate.mesh import STRAIGHT_EDGE, Mesh
from kplate.plate import Plate

# Directions held to less than this share of the strongest are round-off. Two tangents
# that differ by a turn t hold a second direction to about t, and a clamped one beside a
# simply supported one w,nn to t^2.
RANK_CUT = 1e-9


@dataclass(frozen=True, eq=False, kw_only=True)
class Constraints:
    """Turned and held unknowns at the supported vertices.

    Parameters
    ----------
    numbering : Numbering
        The unknowns.
    vertices : ndarray, shape (k,)
        Supported vertices.
    frames : ndarray, shape (k, p, p)
        Columns: the orthonormal directions of each vertex's turned unknowns.
    held : ndarray, shape (k, p)
        Which of them are held at zero.
    on_edges : ndarray, shape (m,)
        Unknowns on edges that are held.
    """

    numbering: Numbering
    vertices: Ints
    frames: Floats
    held: Bools
    on_edges: Ints

    @cached_property
    def free(self) -> Bools:
        """Which turned unknowns are free, (count,)."""
        free = np.ones(self.numbering.count, dtype=bool)
        free[self.numbering.at_vertices(self.vertices)] = ~self.held
        free[self.on_edges] = False
        return free

    @cached_property
    def supported(self) -> Ints:
        """Unknowns that supports may work on."""
        own = self.numbering.at_vertices(self.vertices).ravel()
        return np.concatenate([own, self.on_edges])

    def turn(self, values: Floats) -> Floats:
        """Turn forces or values (count, c) of the unknowns into the frames."""
        return self._rotate(values, self.frames.swapaxes(-1, -2))

    def turn_back(self, values: Floats) -> Floats:
        """Turn values (count, c) in the frames back into those of the unknowns."""
        return self._rotate(values, self.frames)

    def _rotate(self, values: Floats, frames: Floats) -> Floats:
        result = values.copy()
        own = self.numbering.at_vertices(self.vertices)
        result[own] = frames @ values[own]
        return result


def constrain(plate: Plate, numbering: Numbering) -> Constraints:
    """Hold what the plate's supports hold.

    Parameters
    ----------
    plate : Plate
        The statement.
    numbering : Numbering
        Unknowns on a mesh of the plate's outline: at each vertex w alone, or w and its
        slopes, or those and ``w,xx, w,xy, w,yy``.

    Returns
    -------
    Constraints
    """
    mesh = numbering.mesh
    found = [
        *_side_rows(plate, mesh),
        *_seam_rows(plate, mesh),
        _mark_rows(plate, mesh),
    ]
    vertices = np.concatenate([own for own, _ in found])
    rows = np.concatenate([own for _, own in found])
    at, stacked = _stacked(vertices, rows)
    parts = [_frames(own) for own in _by_order(stacked, numbering.per_vertex)]
    frames = np.zeros((len(at), numbering.per_vertex, numbering.per_vertex))
    first = 0
    for part, _ in parts:
        own = slice(first, first + part.shape[-1])
        frames[:, own, own] = part
        first = own.stop
    return Constraints(
        numbering=numbering,
        vertices=at,
        frames=frames,
        held=np.concatenate([held for _, held in parts], axis=1),
        on_edges=_on_edges(plate, numbering),
    )


def turns(tangents: Floats) -> Floats:
    """Turn to the left in rad from arriving to leaving tangents (k, 2, 2), (k,)."""
    a, b = tangents[:, 0], tangents[:, 1]
    cross = a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0]
    turn: Floats = np.arctan2(cross, np.einsum("kc,kc->k", a, b))
    return turn


def free_motions(constraints: Constraints) -> list[str]:
    """Name the rigid motions that the supports leave to the plate.

    Returns
    -------
    list of str
        Such as "tilt about x = 0 m"; empty where the plate is held.
    """
    mesh = constraints.numbering.mesh
    centre, size = mesh.points.mean(axis=0), float(np.ptp(mesh.points, axis=0).max())
    motions = _rigid(mesh, constraints.vertices, centre, size)  # (k, 3, motion)
    frames = (constraints.frames * constraints.held[:, None, :])[:, :3]
    held = frames @ frames.swapaxes(-1, -2) @ motions  # what the supports see of them
    held[:, 1:] *= size  # slopes count as much as deflections, whatever the size
    held = held.reshape(-1, 3)
    values, vectors = np.linalg.eigh(held.T @ held)
    loose = vectors[:, values <= RANK_CUT * float(values[-1])]
    return _name_motions(loose, centre, size)


def check_held(plate: Plate, mesh: Mesh) -> None:
    """Refuse a plate that can still move as a rigid body.

    Raises
    ------
    SolveError
        Naming the motions.
    """
    loose = free_motions(
        constrain(plate, Numbering(mesh=mesh, per_vertex=3, per_edge=0))
    )
    if loose:
        plural = "s" if len(loose) > 1 else ""
        raise SolveError(
            f"the plate can still move as a rigid body ({len(loose)} free "
            f"motion{plural}: {', '.join(dict.fromkeys(loose))}); add a support."
        )


def rigid_motions(numbering: Numbering) -> Floats:
    """Unknowns of the motions w = 1, x and y, (count, 3).

    For unknowns at vertices that are w, slopes and second derivatives, and slopes in
    the middle of edges.
    """
    mesh = numbering.mesh
    motions = np.zeros((numbering.count, 3))
    own = _rigid(mesh, np.arange(len(mesh.points)), np.zeros(2), 1.0)
    by_vertex = numbering.by_vertex(motions)  # a view
    by_vertex[:, :3] = own
    if numbering.per_edge:
        normals = np.empty((len(mesh.edges), 2))
        normals[mesh.triangle_edges] = edge_normals(mesh.points[mesh.triangles])
        motions[numbering.on_edges(np.arange(len(normals)))[:, 0], 1:] = normals
    return motions


def _rigid(mesh: Mesh, vertices: Ints, centre: Floats, size: float) -> Floats:
    """Unknowns of w = 1, (x - centre)/size, (y - centre)/size, (k, 3, 3)."""
    motions = np.zeros((len(vertices), 3, 3))
    motions[:, 0, 0] = 1.0
    motions[:, 0, 1:] = (mesh.points[vertices] - centre) / size
    motions[:, 1, 1] = motions[:, 2, 2] = 1.0 / size
    return motions


def side_tangents(plate: Plate, mesh: Mesh) -> Floats:
    """Tangents of the arriving and the leaving edge at boundary joints, (k, 2, 2).

    In the order of `mesh.boundary_joints`; at a bend they are one and the same.
    """
    joints = mesh.boundary_joints
    holds, clamps = _side_supports(plate, mesh)
    vertices = mesh.boundary_edges[:, 1]
    tangents = np.stack([mesh.tangents(joints[:, k], vertices) for k in (0, 1)], axis=1)
    alike = (holds[joints[:, 0]] == holds[joints[:, 1]]) & (
        clamps[joints[:, 0]] == clamps[joints[:, 1]]
    )
    return _one_tangent(tangents, alike, plate.bend_turn)


def seam_tangents(plate: Plate, mesh: Mesh) -> tuple[Ints, Ints, Floats, Ints]:
    """Ends of the edges of held seams, and the tangents away from each.

    Returns
    -------
    vertices : ndarray, shape (k,)
        Vertices at which the edges end.
    edges : ndarray, shape (k,)
        Which of `mesh.seam_edges` each is an end of.
    away : ndarray, shape (k, 2)
        Unit vectors along the edges away from the vertex; at a bend one the reverse of
        the other.
    pairs : ndarray, shape (m,)
        Ends that go on, held alike, as the next one in the list: two of one seam, or
        the only two at the vertex.
    """
    holds, clamps = _seam_supports(plate, mesh)
    number = np.tile(np.flatnonzero(holds | clamps), 2)
    m = len(number) // 2
    vertices = mesh.seam_edges[number, np.repeat([0, 1], m)]
    others = mesh.seam_edges[number, np.repeat([1, 0], m)]
    order = np.lexsort((mesh.seam_numbers[number], vertices))
    vertices, others, number = vertices[order], others[order], number[order]
    away = mesh.points[others] - mesh.points[vertices]
    away /= np.hypot(*away.T)[:, None]
    first, second = number[:-1], number[1:]
    seams = mesh.seam_numbers
    both = vertices * (len(mesh.seam_names) + 1) + seams[number]
    own = np.unique(both, return_inverse=True, return_counts=True)
    of_seam = own[2][own[1]][1:] == 2
    alone = np.bincount(vertices)[vertices[1:]] == 2
    pairs = np.flatnonzero(
        (vertices[1:] == vertices[:-1])
        & (holds[first] == holds[second])
        & (clamps[first] == clamps[second])
        & (alone | (of_seam & (seams[first] == seams[second])))
    )
    two = np.stack([-away[pairs], away[pairs + 1]], axis=1)
    two = _one_tangent(two, np.ones(len(pairs), dtype=bool), plate.bend_turn)
    away[pairs], away[pairs + 1] = -two[:, 0], two[:, 1]
    return vertices, number, away, pairs


def _seam_supports(plate: Plate, mesh: Mesh) -> tuple[Bools, Bools]:
    """Whether each seam edge holds the deflection, and the slope, (k,) each."""
    supports = [plate.support(name) for name in mesh.seam_names]
    holds = np.array([s.holds_deflection for s in supports], dtype=bool)
    clamps = np.array([s.holds_slope for s in supports], dtype=bool)
    return holds[mesh.seam_numbers], clamps[mesh.seam_numbers]


def _side_supports(plate: Plate, mesh: Mesh) -> tuple[Bools, Bools]:
    """Whether each boundary edge holds the deflection, and the slope, (k,) each."""
    supports = [plate.support(name) for name in mesh.side_names]
    holds = np.array([s.holds_deflection for s in supports])[mesh.boundary_sides]
    clamps = np.array([s.holds_slope for s in supports])[mesh.boundary_sides]
    return holds, clamps


def _side_rows(plate: Plate, mesh: Mesh) -> list[tuple[Ints, Floats]]:
    """Vertices of the boundary and what the sides that meet there hold."""
    joints, tangents = mesh.boundary_joints, side_tangents(plate, mesh)
    holds, clamps = _side_supports(plate, mesh)
    vertices = mesh.boundary_edges[:, 1]
    found = []
    for k in (0, 1):
        edges = joints[:, k]
        rows = _rows(tangents[:, k], holds[edges], clamps[edges])
        # Along an arc w,tt is not zero where the slope across it is free.
        rows[(mesh.boundary_circles[edges] != STRAIGHT_EDGE) & ~clamps[edges], 3] = 0.0
        found.append((vertices, rows))
    return found


def _seam_rows(plate: Plate, mesh: Mesh) -> list[tuple[Ints, Floats]]:
    """Vertices of held seams and what they hold there."""
    holds, clamps = _seam_supports(plate, mesh)
    vertices, edges, away, _ = seam_tangents(plate, mesh)
    return [(vertices, _rows(away, holds[edges], clamps[edges]))]


def _mark_rows(plate: Plate, mesh: Mesh) -> tuple[Ints, Floats]:
    """Marked vertices and what is held there: w, or both slopes, or all."""
    rows = np.zeros((len(mesh.mark_names), 5, 6))
    for number, name in enumerate(mesh.mark_names):
        support = plate.support(name)
        rows[number, 0, 0] = support.holds_deflection
        rows[number, 1, 1] = rows[number, 2, 2] = support.holds_slope
    return mesh.mark_vertices, rows


def _one_tangent(tangents: Floats, alike: Bools, limit: float) -> Floats:
    """Give pairs of tangents (k, 2, 2) that turn by less than a limit their mean."""
    bends = alike & (np.abs(turns(tangents)) < limit)
    mean = tangents.sum(axis=1)
    mean /= np.maximum(np.hypot(*mean.T), np.finfo(float).tiny)[:, None]
    return np.where(bends[:, None, None], mean[:, None], tangents)


def _rows(tangent: Floats, holds: Bools, clamps: Bools) -> Floats:
    """Directions one edge each holds at k vertices, zero where none, (k, 5, 6).

    They act on ``w, w,x, w,y, w,xx, w,xy, w,yy``.
    """
    rows = np.zeros((len(tangent), 5, 6))
    normal = np.column_stack([tangent[:, 1], -tangent[:, 0]])
    rows[:, 0, 0] = holds
    rows[:, 1, 1:3] = tangent * holds[:, None]
    rows[:, 2, 1:3] = normal * clamps[:, None]
    rows[:, 3, 3:] = second_derivative(tangent, tangent) * holds[:, None]
    rows[:, 4, 3:] = second_derivative(tangent, normal) * clamps[:, None]
    return rows


def second_derivative(a: Floats, b: Floats) -> Floats:
    """Row of ``w,xx, w,xy, w,yy`` that is the derivative along a and b, (k, 3)."""
    return np.column_stack(
        [a[:, 0] * b[:, 0], a[:, 0] * b[:, 1] + a[:, 1] * b[:, 0], a[:, 1] * b[:, 1]]
    )


def _on_edges(plate: Plate, numbering: Numbering) -> Ints:
    """Unknowns on held edges that are held."""
    mesh, deflections = numbering.mesh, numbering.edge_deflections
    if not numbering.per_edge:
        return np.empty(0, dtype=np.int64)
    lines = [
        (plate.support(name), mesh.boundary_edges[mesh.boundary_sides == number])
        for number, name in enumerate(mesh.side_names)
    ]
    lines += [
        (plate.support(name), mesh.seam_edges[mesh.seam_numbers == number])
        for number, name in enumerate(mesh.seam_names)
    ]
    found = [np.empty(0, dtype=np.int64)]
    for support, edges in lines:
        own = numbering.on_edges(mesh.edge_numbers(edges))
        if support.holds_deflection:
            found.append(own[:, :deflections].ravel())
        if support.holds_slope:
            found.append(own[:, deflections:].ravel())
    return np.unique(np.concatenate(found))


def _stacked(vertices: Ints, rows: Floats) -> tuple[Ints, Floats]:
    """Held vertices, each once, and all that is held there, (k, most rows, 6)."""
    owners, flat = np.repeat(vertices, rows.shape[1]), rows.reshape(-1, rows.shape[2])
    some = (flat != 0.0).any(axis=1)
    owners, flat = owners[some], flat[some]
    order = np.argsort(owners, kind="stable")
    owners, flat = owners[order], flat[order]
    at, first, counts = np.unique(owners, return_index=True, return_counts=True)
    stacked = np.zeros((len(at), int(counts.max(initial=1)), rows.shape[2]))
    within = np.arange(len(owners)) - np.repeat(first, counts)
    stacked[np.repeat(np.arange(len(at)), counts), within] = flat
    return at, stacked


def _by_order(rows: Floats, count: int) -> list[Floats]:
    """Rows cut into deflection, slopes and second derivatives, as far as they count.

    No row mixes orders, whose units differ.
    """
    ends = (0, 1, 3, 6)
    return [rows[:, :, a:b] for a, b in pairwise(ends) if b <= count]


def _frames(rows: Floats) -> tuple[Floats, Bools]:
    """Orthonormal frames that begin with the row space, and what of them is held."""
    k, _, p = rows.shape
    padded = np.concatenate([rows, np.zeros((k, p, p))], axis=1)
    _, strength, right = np.linalg.svd(padded, full_matrices=False)
    held = strength > RANK_CUT * np.maximum(strength[:, :1], np.finfo(float).tiny)
    return right.swapaxes(-1, -2), held


def _name_motions(loose: Floats, centre: Floats, size: float) -> list[str]:
    """Words for rigid motions a + b (x - centre)/size + c (y - centre)/size, (3, m)."""
    m = loose.shape[1]
    if m == 0:
        return []
    if m == 3:
        return [
            "move up and down",
            "tilt about any line in x",
            "tilt about any line in y",
        ]
    if m == 2:
        a, b, c = np.linalg.svd(loose.T)[2][2]  # w = 0 at one point in all of them
        if abs(a) < 1e-9 * np.hypot(b, c):  # far away: all lines of one direction
            axis = "x" if abs(c) < 1e-9 else "y" if abs(b) < 1e-9 else ""
            way = f"parallel to {axis}" if axis else f"along ({b:.3g}, {c:.3g})"
            return ["move up and down", f"tilt about any line {way}"]
        x, y = centre + size * np.array([b, c]) / a
        return [f"tilt about any line through ({x:.6g}, {y:.6g}) m"] * 2
    a, b, c = loose[:, 0]
    slope = np.array([b, c])
    if np.hypot(b, c) < 1e-9:
        return ["move up and down"]
    foot = centre - size * a * slope / (slope @ slope)
    if abs(c) < 1e-9 * abs(b):
        return [f"tilt about x = {_clean(foot[0], size)} m"]
    if abs(b) < 1e-9 * abs(c):
        return [f"tilt about y = {_clean(foot[1], size)} m"]
    other = foot + size * np.array([-c, b]) / np.hypot(b, c)
    ends = [f"({p[0]:.4g}, {p[1]:.4g})" for p in (foot, other)]
    return [f"tilt about the line through {ends[0]} and {ends[1]} m"]


def _clean(coordinate: float, size: float) -> str:
    return f"{0.0 if abs(coordinate) < 1e-9 * size else coordinate:.6g}"
