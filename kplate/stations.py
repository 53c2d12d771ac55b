"""Line reactions of elements of low degree, from the forces at their vertices.

The force R at a vertex is spread over the lengths around three neighbouring vertices,
twice over, with the gain of the couples along the side. That smooths what single
vertices of a low-degree element get 50 % wrong: line reactions then scatter by about
1 % around their mean on straight sides and discs, 3 % on a small clamped rim.
"""

from dataclasses import dataclass

import numpy as np

from kplate.arrays import Floats, Ints
from kplate.mesh import Mesh
from kplate.plate import Plate
from kplate.supports import Support


@dataclass(frozen=True, eq=False, kw_only=True)
class HeldLine:
    """A held side or seam.

    Parameters
    ----------
    name : str
        Its name.
    number : int
        Its number among sides, then seams.
    support : Support
        How it is held.
    edges : ndarray, shape (m, 2)
        Vertices of its edges.
    lengths : ndarray, shape (m,)
        Their lengths in m.
    """

    name: str
    number: int
    support: Support
    edges: Ints
    lengths: Floats


@dataclass(frozen=True, eq=False, kw_only=True)
class LinePart:
    """What a held line brings.

    Parameters
    ----------
    stations : ndarray, shape (k, 2)
        Places along it in m.
    distance : ndarray, shape (k,)
        Distance in m along its stretches, one after the other.
    reaction, moment : ndarray, shape (k,)
        v_n in N/m and m_nn in N there.
    resultant : ndarray, shape (3,)
        Work of all it brings on w = 1, x and y, in N and N m.
    """

    stations: Floats
    distance: Floats
    reaction: Floats
    moment: Floats
    resultant: Floats


def held_lines(plate: Plate, mesh: Mesh) -> list[HeldLine]:
    """Held sides, then held seams."""
    sides = [
        (name, mesh.boundary_edges[mesh.boundary_sides == number])
        for number, name in enumerate(mesh.side_names)
    ]
    seams = [
        (name, mesh.seam_edges[mesh.seam_numbers == number])
        for number, name in enumerate(mesh.seam_names)
    ]
    found = []
    for number, (name, edges) in enumerate([*sides, *seams]):
        support = plate.support(name)
        if support.holds:
            start, end = np.moveaxis(mesh.points[edges], 1, 0)
            found.append(
                HeldLine(
                    name=name,
                    number=number,
                    support=support,
                    edges=edges,
                    lengths=np.hypot(*(end - start).T),
                )
            )
    return found


def windowed(
    mesh: Mesh, lines: list[HeldLine], rest: Floats, motions: Floats
) -> list[LinePart]:
    """What lines bring, from what their vertices bring without the corner forces.

    `rest` (n_points, 3) are forces and couples, `motions` (n_points, 3, 3) the
    vertices' unknowns of w = 1, x and y.
    """
    parts = []
    for line, own in zip(lines, _shared(mesh, lines, rest), strict=True):
        at = 0.5 * _length_at(mesh, line)
        chains = stretches(line.edges)
        found = [along(mesh, chain, own, at) for chain in chains]
        starts = np.cumsum([0.0, *(float(part[0][-1]) for part in found[:-1])])
        parts.append(
            LinePart(
                stations=mesh.points[np.concatenate(chains)],
                distance=np.concatenate(
                    [part[0] + s for part, s in zip(found, starts, strict=True)]
                ),
                reaction=np.concatenate([part[1] for part in found])
                * line.support.holds_deflection,
                moment=np.concatenate([part[2] for part in found])
                * line.support.holds_slope,
                resultant=np.einsum("vum,vu->m", motions, own),
            )
        )
    return parts


def stretches(edges: Ints) -> list[Ints]:
    """Vertices along each connected stretch of edges, in order.

    Stretches follow the first edge's sense; a closed one repeats its first vertex.
    """
    neighbours: dict[int, list[int]] = {}
    for a, b in edges.tolist():
        neighbours.setdefault(a, []).append(b)
        neighbours.setdefault(b, []).append(a)
    left = dict.fromkeys(map(tuple, edges.tolist()))
    ends = [v for v in edges[:, 0].tolist() if len(neighbours[v]) == 1]
    others = [v for v in edges[:, 1].tolist() if len(neighbours[v]) == 1]
    chains = []
    while left:
        heads = [v for v in (*ends, *others) if _open(v, neighbours, left)]
        chain = [heads[0] if heads else next(iter(left))[0]]
        while True:
            step = next(
                (
                    (pair, v)
                    for v in neighbours[chain[-1]]
                    for pair in ((chain[-1], v), (v, chain[-1]))
                    if pair in left
                ),
                None,
            )
            if step is None:
                break
            del left[step[0]]
            chain.append(step[1])
        chains.append(np.array(chain))
    return chains


def _open(
    vertex: int,
    neighbours: dict[int, list[int]],
    left: dict[tuple[int, ...], None],
) -> bool:
    """Whether an edge at a vertex is still left."""
    return any((vertex, v) in left or (v, vertex) in left for v in neighbours[vertex])


def along(
    mesh: Mesh, chain: Ints, own: Floats, length: Floats
) -> tuple[Floats, Floats, Floats]:
    """Distance, line reaction and line moment at the vertices of a stretch."""
    step = np.diff(mesh.points[chain], axis=0)
    distance = np.concatenate([[0.0], np.cumsum(np.hypot(*step.T))])
    tangent = np.empty((len(chain), 2))  # mean of the edges at each vertex
    unit = step / np.hypot(*step.T)[:, None]
    closed = chain[0] == chain[-1]
    tangent[1:-1] = unit[:-1] + unit[1:]
    tangent[0] = unit[0] + unit[-1] if closed else unit[0]
    tangent[-1] = tangent[0] if closed else unit[-1]
    tangent /= np.hypot(*tangent.T)[:, None]
    normal = np.column_stack([tangent[:, 1], -tangent[:, 0]])
    across = np.einsum("kc,kc->k", normal, own[chain, 1:])
    lengthwise = np.einsum("kc,kc->k", tangent, own[chain, 1:]) / length[chain]
    spans = _three(_three(length[chain], closed), closed)
    force = _three(own[chain, 0], closed) - _gain(lengthwise, closed)
    reaction = _three(force, closed) / spans
    moment = _three(_three(across, closed), closed) / spans
    return distance, reaction, moment


def _three(values: Floats, closed: bool) -> Floats:
    """Sum over each vertex of a stretch and its neighbours on it."""
    if closed:
        ring = values[:-1]
        total = ring + np.roll(ring, 1) + np.roll(ring, -1)
        return np.append(total, total[0])
    total = values.copy()
    total[1:] += values[:-1]
    total[:-1] += values[1:]
    return total


def _gain(couple: Floats, closed: bool) -> Floats:
    """Gain of a line couple along the three vertices around each of a stretch.

    Couples that work on the slope along the side act as a pair of forces; it is taken
    half-way to the next vertex, and as nothing next to the ends.
    """
    if closed:
        ring = couple[:-1]
        ahead = np.roll(ring, -1) + np.roll(ring, -2)
        behind = np.roll(ring, 1) + np.roll(ring, 2)
        gain = 0.5 * (ahead - behind)
        return np.append(gain, gain[0])
    gain = np.zeros_like(couple)
    if len(couple) > 4:
        gain[2:-2] = 0.5 * (couple[3:-1] + couple[4:] - couple[1:-3] - couple[:-4])
    return gain


def _shared(mesh: Mesh, lines: list[HeldLine], rest: Floats) -> list[Floats]:
    """What vertices bring, shared among the lines that hold them, (n_points, 3) each.

    Forces go by the length of the lines that hold w. Of couples, lines that hold the
    slope take the parts along their normals; what is left goes by length.
    """
    lengths = np.array([_length_at(mesh, line) for line in lines])
    carries = np.array([line.support.holds_deflection for line in lines])
    total = np.maximum(lengths.sum(axis=0), np.finfo(float).tiny)
    pushing = lengths * carries[:, None]
    by_force = pushing / np.maximum(pushing.sum(axis=0), np.finfo(float).tiny)
    owns = [np.zeros_like(rest) for _ in lines]
    for k, own in enumerate(owns):
        own[:, 0] = by_force[k] * rest[:, 0]
        own[:, 1:] = (lengths[k] / total)[:, None] * rest[:, 1:]
    for vertex in np.flatnonzero((lengths > 0.0).sum(axis=0) > 1).tolist():
        at = np.flatnonzero(lengths[:, vertex] > 0.0).tolist()
        turning = [k for k in at if lines[k].support.holds_slope]
        normals = np.array([_normal_at(mesh, lines[k], vertex) for k in turning])
        if not len(normals):
            continue
        parts = np.linalg.pinv(normals.T) @ rest[vertex, 1:]
        left = rest[vertex, 1:] - normals.T @ parts
        for k in at:
            owns[k][vertex, 1:] = lengths[k, vertex] / total[vertex] * left
        for k, normal, part in zip(turning, normals, parts, strict=True):
            owns[k][vertex, 1:] += part * normal
    return owns


def _normal_at(mesh: Mesh, line: HeldLine, vertex: int) -> Floats:
    """Unit normal on the right of a line at one of its vertices, (2,)."""
    own = line.edges[(line.edges == vertex).any(axis=1)]
    step = (mesh.points[own[:, 1]] - mesh.points[own[:, 0]]).sum(axis=0)
    normal: Floats = np.array([step[1], -step[0]]) / np.hypot(*step)
    return normal


def _length_at(mesh: Mesh, line: HeldLine) -> Floats:
    """Length of a line's edges at each vertex, (n_points,)."""
    ends = line.edges.ravel()
    return np.bincount(
        ends, np.repeat(line.lengths, 2), minlength=len(mesh.points)
    ).astype(np.float64)
