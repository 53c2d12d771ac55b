"""What the supports bring: along each side, at corners, and in all.

Everything comes from the discrete equations: the support forces are the stiffness times
the unknowns less the loads, so that with the loads they balance to round-off. At a
vertex they are a force R and two couples, paired with w and its slopes. A corner force
is the jump of m_ns there (arriving side less leaving side); the rest of R belongs to
the sides. Along a side, R is spread over its stations (`kplate.stations`).

Signs: forces and line reactions v_n positive when the support pushes the plate up; a
corner that must be held down has a negative force. Moments about the x and y axes
through the origin are right-handed: M_x = sum y F, M_y = -sum x F.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from kplate.arrays import Bools, Floats, Ints
from kplate.boundary import rigid_motions
from kplate.loads import PointForce
from kplate.mesh import Mesh
from kplate.polygon import SNAP
from kplate.recovery import SmoothedMoments
from kplate.singular import Corner, Excluded, Place, moment_ends, plate_corners
from kplate.solve.static import StaticState
from kplate.stations import along, stretches
from kplate.supports import Support
from kplate.values import Value


@dataclass(frozen=True, kw_only=True)
class Resultant:
    """A force and its moments about the origin's axes.

    Parameters
    ----------
    force : float
        N, positive up.
    moment_x, moment_y : float
        N m, right-handed about the x and y axes.
    """

    force: float
    moment_x: float
    moment_y: float

    def __add__(self, other: "Resultant") -> "Resultant":
        """Sum of two."""
        return Resultant(
            force=self.force + other.force,
            moment_x=self.moment_x + other.moment_x,
            moment_y=self.moment_y + other.moment_y,
        )


@dataclass(frozen=True, eq=False, kw_only=True)
class SideReaction:
    """What the support along one side or seam brings.

    Parameters
    ----------
    side : str
        Its name.
    support : Support
        How it is held.
    resultant : Resultant
        Of the side without its corner forces, clamping couples included.
    stations : ndarray, shape (k, 2)
        Vertices along the side in m, in order along each of its stretches.
    distance : ndarray, shape (k,)
        Distance in m along the side's stretches, one after the other.
    line_reaction : ndarray, shape (k,)
        Effective shear v_n in N/m at the stations; nan within the discs around places
        without a finite moment.
    line_moment : ndarray, shape (k,)
        Clamping moment m_nn in N; 0 where the slope is not held.
    """

    side: str
    support: Support
    resultant: Resultant
    stations: Floats
    distance: Floats
    line_reaction: Floats
    line_moment: Floats


@dataclass(frozen=True, kw_only=True)
class CornerForce:
    """The force at a corner.

    Parameters
    ----------
    corner : Corner
        Where.
    force : Value
        N, positive up; negative where the corner must be held down; nan with the
        reason where moments are unbounded.
    """

    corner: Corner
    force: Value


@dataclass(frozen=True, kw_only=True)
class PointReaction:
    """What a point support brings.

    Parameters
    ----------
    mark : str
        Its name.
    support : Support
        How it is held.
    force : Value
        N, positive up, with its place.
    resultant : Resultant
        The force, and the couples where the slopes are held, about the origin's axes.
    """

    mark: str
    support: Support
    force: Value
    resultant: Resultant


@dataclass(frozen=True, eq=False, kw_only=True)
class Reactions:
    """All support forces of one case, and their balance with the loads.

    Parameters
    ----------
    case : str
        The load case.
    sides : tuple of SideReaction
        Supported sides and seams.
    corners : tuple of CornerForce
        Corners at which a force can arise.
    points : tuple of PointReaction
        Point supports.
    load : Resultant
        The loads as integrated.
    total : Resultant
        All support forces.
    magnitude : float
        Sum of the magnitudes of all vertex forces, loads and supports, in N.
    imbalance : float
        Largest of the three sums of loads and support forces, as a share of the sum of
        magnitudes (moments over the size of the plate).
    """

    case: str
    sides: tuple[SideReaction, ...]
    corners: tuple[CornerForce, ...]
    points: tuple[PointReaction, ...]
    load: Resultant
    total: Resultant
    magnitude: float
    imbalance: float


def reactions(
    state: StaticState,
    smoothed: SmoothedMoments,
    index: int,
    excluded: Sequence[Excluded] = (),
) -> Reactions:
    """Support forces of case number `index`.

    Parameters
    ----------
    state : StaticState
        The solved plate.
    smoothed : SmoothedMoments
        Its moments, for the corner forces.
    index : int
        Which case.
    excluded : sequence of Excluded
        Discs in which line reactions have no finite value.

    Returns
    -------
    Reactions
    """
    numbering, mesh = state.constraints.numbering, state.mesh
    nodal = numbering.by_vertex(state.support_forces)[:, :, index]  # (n_points, 3)
    loads = numbering.by_vertex(state.forces)[:, :, index]
    motions = numbering.by_vertex(rigid_motions(numbering))
    found = _corner_forces(state, smoothed, index)
    rest = nodal.copy()
    for corner_force, vertex in found:
        rest[vertex, 0] -= np.nan_to_num(corner_force.force.value)
    points = _point_reactions(state, rest, motions, index)
    case = state.cases[index].name
    discs = [disc for disc in excluded if disc.case in ("", case)]
    return Reactions(
        case=state.cases[index].name,
        sides=tuple(_side_reactions(state, rest, motions, discs)),
        corners=tuple(corner_force for corner_force, _ in found),
        points=points,
        load=_resultant(motions, loads),
        total=_resultant(motions, nodal),
        magnitude=float(np.abs(nodal[:, 0]).sum() + np.abs(loads[:, 0]).sum()),
        imbalance=_imbalance(mesh, motions, nodal, loads),
    )


def _corner_forces(
    state: StaticState, smoothed: SmoothedMoments, index: int
) -> list[tuple[CornerForce, int]]:
    """Forces at the corners and their vertices."""
    mesh, case = state.mesh, state.cases[index]
    ends = moment_ends(state.plate, case)
    corner_size = state.plate.outline.size
    found = []
    for corner in plate_corners(state.plate):
        if not corner.carries_force:
            continue
        joint = _joint_at(mesh, corner)
        vertex = int(mesh.boundary_edges[joint, 1])
        jump, reason = np.nan, f"no finite value: {corner.words}"
        if corner.place in ends:
            reason = "no finite value: end of an edge moment"
        elif not corner.unbounded:
            edges = mesh.boundary_joints[joint]
            tangents = mesh.tangents(edges, np.full(2, vertex))
            # The arriving edge ends at the corner, the leaving one begins there.
            pairs = smoothed.nodes.of_edges(mesh, mesh.boundary_edges[edges])
            nodes = [pairs[0, 1], pairs[1, 0]]
            m_ns = _twist(smoothed.moments[nodes, :, index], tangents)
            jump, reason = float(m_ns[0] - m_ns[1]), ""
            # A force that acts at the corner itself goes straight into the support.
            jump -= sum(
                load.force
                for load in case.loads
                if isinstance(load, PointForce)
                and np.hypot(*np.subtract(load.at, corner.place)) < SNAP * corner_size
            )
        force = Value(
            value=jump, place=corner.place, case=state.cases[index].name, reason=reason
        )
        found.append((CornerForce(corner=corner, force=force), vertex))
    return found


def _joint_at(mesh: Mesh, corner: Corner) -> int:
    """Boundary joint at a corner of the outline."""
    ends = mesh.points[mesh.boundary_edges[:, 1]]
    return int(np.argmin(np.hypot(*(ends - corner.place).T)))


def _twist(moments: Floats, tangents: Floats) -> Floats:
    """m_ns of moments (k, 3) on edges of tangents (k, 2), outward on their right."""
    tx, ty = tangents.T
    nx, ny = ty, -tx
    m_xx, m_yy, m_xy = moments.T
    return nx * tx * m_xx + ny * ty * m_yy + (nx * ty + ny * tx) * m_xy


def _point_reactions(
    state: StaticState, rest: Floats, motions: Floats, index: int
) -> tuple[PointReaction, ...]:
    """Reactions of held marks, which are taken off what vertices bring."""
    mesh, found = state.mesh, []
    lined = np.zeros(len(mesh.points), dtype=bool)  # held by a line already
    for line in _held_lines(state):
        lined[line.edges] = True
    for name, vertex in zip(mesh.mark_names, mesh.mark_vertices, strict=True):
        support = state.plate.support(name)
        if not support.holds or lined[vertex]:
            continue
        own = np.zeros_like(rest)
        own[vertex], rest[vertex] = rest[vertex], 0.0
        x, y = mesh.points[vertex]
        force = Value(
            value=float(own[vertex, 0]),
            place=(float(x), float(y)),
            case=state.cases[index].name,
        )
        found.append(
            PointReaction(
                mark=name,
                support=support,
                force=force,
                resultant=_resultant(motions, own),
            )
        )
    return tuple(found)


@dataclass(frozen=True, eq=False, kw_only=True)
class _Line:
    """Edges of a held side or seam, with their lengths."""

    name: str
    support: Support
    edges: Ints
    lengths: Floats


def _held_lines(state: StaticState) -> list[_Line]:
    """Held sides, then held seams."""
    mesh, plate = state.mesh, state.plate
    sides = [
        (name, mesh.boundary_edges[mesh.boundary_sides == number])
        for number, name in enumerate(mesh.side_names)
    ]
    seams = [
        (name, mesh.seam_edges[mesh.seam_numbers == number])
        for number, name in enumerate(mesh.seam_names)
    ]
    found = []
    for name, edges in [*sides, *seams]:
        support = plate.support(name)
        if support.holds:
            start, end = np.moveaxis(mesh.points[edges], 1, 0)
            lengths = np.hypot(*(end - start).T)
            found.append(
                _Line(name=name, support=support, edges=edges, lengths=lengths)
            )
    return found


def _side_reactions(
    state: StaticState, rest: Floats, motions: Floats, discs: Sequence[Excluded]
) -> list[SideReaction]:
    """Reactions of held sides and seams from vertex forces less corner forces."""
    mesh = state.mesh
    lines = _held_lines(state)
    unbounded = np.zeros(len(mesh.points), dtype=bool)
    for disc in discs:
        reach = np.hypot(*(mesh.points - disc.place).T)
        unbounded |= reach <= disc.radius * (1.0 + 1e-9)
    owns = _shared(mesh, lines, rest)
    return [
        _line_reaction(mesh, line, own, (motions, unbounded))
        for line, own in zip(lines, owns, strict=True)
    ]


def _shared(mesh: Mesh, lines: list[_Line], rest: Floats) -> list[Floats]:
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


def _normal_at(mesh: Mesh, line: _Line, vertex: int) -> Floats:
    """Unit normal on the right of a line at one of its vertices, (2,)."""
    own = line.edges[(line.edges == vertex).any(axis=1)]
    step = (mesh.points[own[:, 1]] - mesh.points[own[:, 0]]).sum(axis=0)
    normal: Floats = np.array([step[1], -step[0]]) / np.hypot(*step)
    return normal


def _length_at(mesh: Mesh, line: _Line) -> Floats:
    """Length of a line's edges at each vertex, (n_points,)."""
    ends = line.edges.ravel()
    return np.bincount(
        ends, np.repeat(line.lengths, 2), minlength=len(mesh.points)
    ).astype(np.float64)


def _line_reaction(
    mesh: Mesh, line: _Line, own: Floats, shared: tuple[Floats, Bools]
) -> SideReaction:
    """Reaction of one side or seam from its share of what its vertices bring."""
    motions, unbounded = shared
    at = _length_at(mesh, line)
    chains = stretches(line.edges)
    parts = [along(mesh, chain, own, 0.5 * at, unbounded) for chain in chains]
    starts = np.cumsum([0.0, *(float(part[0][-1]) for part in parts[:-1])])
    return SideReaction(
        side=line.name,
        support=line.support,
        resultant=_resultant(motions, own),
        stations=mesh.points[np.concatenate(chains)],
        distance=np.concatenate(
            [part[0] + s for part, s in zip(parts, starts, strict=True)]
        ),
        line_reaction=np.concatenate([part[1] for part in parts])
        * line.support.holds_deflection,
        line_moment=np.concatenate([part[2] for part in parts])
        * line.support.holds_slope,
    )


def _resultant(motions: Floats, nodal: Floats) -> Resultant:
    force, by_x, by_y = np.einsum("vum,vu->m", motions, nodal)
    return Resultant(force=float(force), moment_x=float(by_y), moment_y=float(-by_x))


def _imbalance(mesh: Mesh, motions: Floats, nodal: Floats, loads: Floats) -> float:
    """Largest sum of loads and support forces over the sum of their magnitudes."""
    size = float(np.ptp(mesh.points, axis=0).max())
    sums = np.einsum("vum,vu->m", motions, nodal + loads)
    magnitude = np.abs(nodal).sum(axis=0) + np.abs(loads).sum(axis=0)
    scale = float(magnitude[0] + magnitude[1:].sum() / size)
    reach = np.array([1.0, size, size])
    return float(np.max(np.abs(sums) / reach) / scale) if scale > 0.0 else 0.0


def hold_down(forces: Sequence[CornerForce]) -> tuple[float, list[CornerForce]]:
    """Largest pull in N that a corner needs, and which need it within 1 %.

    Corners without a finite force are left out; the pull is nan where there are no
    others.
    """
    known = [f for f in forces if not np.isnan(f.force.value)]
    if forces and not known:
        return np.nan, []
    most = max((-f.force.value for f in known), default=0.0)
    if most <= 0.0:
        return 0.0, []
    return most, [f for f in known if -f.force.value >= 0.99 * most]


def side_uplift(sides: Sequence[SideReaction]) -> tuple[float, Place | None, str]:
    """Largest line force in N/m with which a side must be held down, where, and which.

    0 where every side only pushes the plate up.
    """
    most, place, name = 0.0, None, ""
    for side in sides:
        known = ~np.isnan(side.line_reaction)
        if not known.any():
            continue
        pull = np.where(known, -side.line_reaction, -np.inf)
        best = int(np.argmax(pull))
        if pull[best] > most:
            x, y = side.stations[best].tolist()
            most, place, name = float(pull[best]), (x, y), side.side
    return most, place, name
