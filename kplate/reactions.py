"""What the supports bring: along each side, at corners, and in all.

Everything comes from the discrete equations: the support forces are the stiffness times
the unknowns less the loads, so that with the loads they balance to round-off. At a
vertex they are a force R and two couples, paired with w and its slopes. A corner force
is the jump of m_ns there (arriving side less leaving side); the rest of R belongs to
the sides. Line reactions of C1 elements are found in the space of their edge traces
(`kplate.traces`); those of DKT, and of HCT where a held side is round, from windows of
vertices (`kplate.stations`).

Signs: forces and line reactions v_n positive when the support pushes the plate up; a
corner that must be held down has a negative force. Moments about the x and y axes
through the origin are right-handed: M_x = sum y F, M_y = -sum x F.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from kplate.arrays import Floats, Ints
from kplate.boundary import rigid_motions
from kplate.dualforces import edge_moments
from kplate.loads import PointForce
from kplate.mesh import STRAIGHT_EDGE, Mesh
from kplate.polygon import SNAP
from kplate.raw import RawMoments
from kplate.recovery import SmoothedMoments
from kplate.singular import Corner, Excluded, Place, moment_ends, plate_corners
from kplate.solve.dual import DualState
from kplate.solve.static import StaticState
from kplate.stations import held_lines, windowed
from kplate.supports import Support
from kplate.tracelines import traced
from kplate.values import Value

# Beside a place without a finite shear the reaction swings over two edges.
UNRESOLVED = 2.0


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
        Places along the side in m, in order along each of its stretches.
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
        The force and its moments about the origin's axes.
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
    recovered: SmoothedMoments | RawMoments,
    index: int,
    excluded: Sequence[Excluded] = (),
    dual: DualState | None = None,
) -> Reactions:
    """Support forces of case number `index`.

    Parameters
    ----------
    state : StaticState
        The solved plate.
    recovered : SmoothedMoments or RawMoments
        Its moments, for the corner forces.
    index : int
        Which case.
    excluded : sequence of Excluded
        Discs in which line reactions have no finite value.
    dual : DualState, optional
        Balanced moments, whose corner forces give those here a band of kind
        "indicator".

    Returns
    -------
    Reactions
    """
    motions = rigid_motions(state.constraints.numbering)
    found = _corner_forces(state, recovered, index, dual)
    brought, loads = state.support_forces[:, index], state.forces[:, index]
    case = state.cases[index].name
    return Reactions(
        case=case,
        sides=tuple(_side_reactions(state, recovered, index, (found, excluded))),
        corners=tuple(corner_force for corner_force, _ in found),
        points=_point_reactions(state, recovered, motions, index),
        load=_resultant(motions.T @ loads),
        total=_resultant(motions.T @ brought),
        **_balance(state, motions, brought, loads),
    )


def _corner_forces(
    state: StaticState,
    recovered: SmoothedMoments | RawMoments,
    index: int,
    dual: DualState | None,
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
        off = np.nan
        jump, reason = np.nan, f"no finite value: {corner.words}"
        if corner.place in ends:
            reason = "no finite value: end of an edge moment"
        elif not corner.unbounded:
            edges, tangents = corner_edges(mesh, corner)
            # The arriving edge ends at the corner, the leaving one begins there.
            moments = recovered.corner_moments(edges, np.array([1, 0]))[:, :, index]
            m_ns = _twist(moments, tangents)
            jump, reason = float(m_ns[0] - m_ns[1]), ""
            if dual is not None:
                both = edge_moments(dual, edges, np.array([0.0, 1.0]))[..., index]
                other = _twist(np.stack([both[0, 1], both[1, 0]]), tangents)
                off = abs(float(other[0] - other[1]) - jump)
            # A force that acts at the corner itself goes straight into the support.
            jump -= sum(
                load.force
                for load in case.loads
                if isinstance(load, PointForce)
                and np.hypot(*np.subtract(load.at, corner.place)) < SNAP * corner_size
            )
        force = Value(value=jump, place=corner.place, case=case.name, reason=reason)
        if not np.isnan(off):
            force = replace(force, lower=jump - off, upper=jump + off, kind="indicator")
        found.append((CornerForce(corner=corner, force=force), vertex))
    return found


def corner_edges(mesh: Mesh, corner: Corner) -> tuple[Ints, Floats]:
    """Boundary edges that arrive at a corner and leave it, and their tangents there."""
    joint = _joint_at(mesh, corner)
    edges = mesh.boundary_joints[joint]
    vertex = mesh.boundary_edges[joint, 1]
    return edges, mesh.tangents(edges, np.full(2, vertex))


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
    state: StaticState,
    recovered: SmoothedMoments | RawMoments,
    motions: Floats,
    index: int,
) -> tuple[PointReaction, ...]:
    """Reactions of held marks that lie on no held line.

    Less what a held round edge opposite brings to the vertex.
    """
    mesh, numbering = state.mesh, state.constraints.numbering
    found = []
    for name, vertex in _point_supports(state):
        support = state.plate.support(name)
        own = int(numbering.at_vertices(np.array(vertex))[0])
        brought = float(state.support_forces[own, index])  # couples are a line's
        if (
            isinstance(recovered, RawMoments)
            and state.constraints.numbering.arcs.held.any()
        ):
            brought -= float(recovered.traces.brought_to(own)[index])
        x, y = mesh.points[vertex]
        force = Value(
            value=brought, place=(float(x), float(y)), case=state.cases[index].name
        )
        found.append(
            PointReaction(
                mark=name,
                support=support,
                force=force,
                resultant=_resultant(motions[own] * brought),
            )
        )
    return tuple(found)


def _point_supports(state: StaticState) -> list[tuple[str, int]]:
    """Held marks, and their vertices, that lie on no line that holds w already."""
    mesh = state.mesh
    lined = np.zeros(len(mesh.points), dtype=bool)
    for line in held_lines(state.plate, mesh):
        if line.support.holds_deflection:
            lined[line.edges] = True
    return [
        (name, int(vertex))
        for name, vertex in zip(mesh.mark_names, mesh.mark_vertices, strict=True)
        if state.plate.support(name).holds and not lined[vertex]
    ]


def _side_reactions(
    state: StaticState,
    recovered: SmoothedMoments | RawMoments,
    index: int,
    corners_and_discs: tuple[list[tuple[CornerForce, int]], Sequence[Excluded]],
) -> list[SideReaction]:
    """Reactions of held sides and seams, less the corner forces."""
    mesh, (corners, excluded) = state.mesh, corners_and_discs
    lines = held_lines(state.plate, mesh)
    if not lines:
        return []
    at_corners = np.zeros(len(mesh.points))
    for corner_force, vertex in corners:
        at_corners[vertex] += np.nan_to_num(corner_force.force.value)
    if isinstance(recovered, RawMoments) and _straight(state):
        parts = traced(recovered.traces, lines, at_corners, index)
    else:
        parts = windowed(mesh, lines, *_at_vertices(state, at_corners, index))
    case = state.cases[index].name
    discs = [disc for disc in excluded if disc.case in ("", case)]
    for disc in discs:
        radius = max(disc.radius * (1.0 + 1e-9), UNRESOLVED * _edge_at(mesh, disc))
        for part in parts:
            reach = np.hypot(*(part.stations - disc.place).T)
            part.reaction[reach <= radius] = np.nan
    return [
        SideReaction(
            side=line.name,
            support=line.support,
            resultant=_resultant(part.resultant),
            stations=part.stations,
            distance=part.distance,
            line_reaction=part.reaction,
            line_moment=part.moment,
        )
        for line, part in zip(lines, parts, strict=True)
    ]


def _edge_at(mesh: Mesh, disc: Excluded) -> float:
    """Length of the longest boundary edge at the centre of a disc, or 0."""
    start, end = np.moveaxis(mesh.points[mesh.boundary_edges], 1, 0)
    off = [np.hypot(*(ends - disc.place).T) for ends in (start, end)]
    at = np.minimum(*off) < SNAP * np.sqrt(mesh.area)
    return float(mesh.boundary_lengths[at].max(initial=0.0))


def _straight(state: StaticState) -> bool:
    """Whether no held side is drawn by chords, beside which traces swing."""
    mesh = state.mesh
    if len(state.constraints.numbering.arcs):
        return True
    curved = mesh.boundary_sides[mesh.boundary_circles != STRAIGHT_EDGE]
    return not any(
        state.plate.support(mesh.side_names[side]).holds for side in np.unique(curved)
    )


def _at_vertices(
    state: StaticState, at_corners: Floats, index: int
) -> tuple[Floats, Floats]:
    """What lines bring at vertices, (n_points, 3), and the rigid motions there."""
    numbering, mesh = state.constraints.numbering, state.mesh
    rest = numbering.by_vertex(state.support_forces)[:, :3, index].copy()
    rest[:, 0] -= at_corners
    motions = numbering.by_vertex(rigid_motions(numbering))[:, :3]
    if numbering.per_edge:  # couples in the middle of edges, to both their ends
        own = numbering.on_edges(np.arange(len(mesh.edges)))[:, 0]
        normals = rigid_motions(numbering)[own, 1:]
        couples = 0.5 * state.support_forces[own, index, None] * normals
        for end in (0, 1):
            np.add.at(rest[:, 1:], mesh.edges[:, end], couples)
    lined = np.zeros(len(mesh.points), dtype=bool)
    for line in held_lines(state.plate, mesh):
        lined[line.edges] = True
    rest[~lined] = 0.0  # what point supports bring
    for _, vertex in _point_supports(state):
        rest[vertex, 0] = 0.0
    return rest, motions


def _resultant(work: Floats) -> Resultant:
    """Resultant that does this work on w = 1, x and y."""
    force, by_x, by_y = work
    return Resultant(force=float(force), moment_x=float(by_y), moment_y=float(-by_x))


def _balance(
    state: StaticState, motions: Floats, brought: Floats, loads: Floats
) -> dict[str, float]:
    """Sum of magnitudes of all forces, and the largest sum of all as a share of it."""
    numbering = state.constraints.numbering
    size = float(np.ptp(state.mesh.points, axis=0).max())
    magnitudes = numbering.by_vertex(np.abs(brought) + np.abs(loads))[:, :3, 0].sum(0)
    scale = float(magnitudes[0] + magnitudes[1:].sum() / size)
    sums = np.abs(motions.T @ (brought + loads)) / [1.0, size, size]
    return {
        "magnitude": float(magnitudes[0]),
        "imbalance": float(sums.max()) / scale if scale > 0.0 else 0.0,
    }


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
