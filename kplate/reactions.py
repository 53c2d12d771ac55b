"""What the supports bring: along each side, at corners, and in all.

Everything comes from the discrete equations: the support forces are the stiffness times
the unknowns less the loads, so that with the loads they balance to round-off. At a
vertex they are a force R and two couples, paired with w and its slopes. A corner force
is the jump of m_ns there (arriving side less leaving side); the rest of R belongs to
the sides. Along a side, R is spread over the lengths around three neighbouring
vertices, which smooths what single vertices of a low-degree element get 50 % wrong.

Signs: forces and line reactions v_n positive when the support pushes the plate up; a
corner that must be held down has a negative force. Moments about the x and y axes
through the origin are right-handed: M_x = sum y F, M_y = -sum x F.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from kplate.arrays import Floats, Ints
from kplate.boundary import rigid_motions
from kplate.mesh import Mesh
from kplate.recovery import SmoothedMoments
from kplate.singular import Corner, plate_corners
from kplate.solve.static import StaticState
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
    """What one side's support brings.

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
        Effective shear v_n in N/m at the stations; nan at an unbounded corner.
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


@dataclass(frozen=True, eq=False, kw_only=True)
class Reactions:
    """All support forces of one case, and their balance with the loads.

    Parameters
    ----------
    case : str
        The load case.
    sides : tuple of SideReaction
        Supported sides.
    corners : tuple of CornerForce
        Corners at which a force can arise.
    load : Resultant
        The loads as integrated.
    total : Resultant
        All support forces.
    imbalance : float
        Largest of the three sums of loads and support forces, as a share of the sum of
        magnitudes (moments over the size of the plate).
    """

    case: str
    sides: tuple[SideReaction, ...]
    corners: tuple[CornerForce, ...]
    load: Resultant
    total: Resultant
    imbalance: float


def reactions(state: StaticState, smoothed: SmoothedMoments, index: int) -> Reactions:
    """Support forces of case number `index`."""
    numbering, mesh = state.constraints.numbering, state.mesh
    nodal = numbering.by_vertex(state.support_forces)[:, :, index]  # (n_points, 3)
    loads = numbering.by_vertex(state.forces)[:, :, index]
    motions = rigid_motions(mesh)
    found = _corner_forces(state, smoothed, index)
    rest = nodal.copy()
    for corner_force, vertex in found:
        rest[vertex, 0] -= np.nan_to_num(corner_force.force.value)
    return Reactions(
        case=state.cases[index].name,
        sides=tuple(_side_reactions(state, rest, motions)),
        corners=tuple(corner_force for corner_force, _ in found),
        load=_resultant(motions, loads),
        total=_resultant(motions, nodal),
        imbalance=_imbalance(mesh, motions, nodal, loads),
    )


def _corner_forces(
    state: StaticState, smoothed: SmoothedMoments, index: int
) -> list[tuple[CornerForce, int]]:
    """Forces at the corners and their vertices."""
    mesh = state.mesh
    found = []
    for corner in plate_corners(state.plate):
        if not corner.carries_force:
            continue
        joint = _joint_at(mesh, corner)
        vertex = int(mesh.boundary_edges[joint, 1])
        jump, reason = np.nan, f"no finite value: {corner.words}"
        if not corner.unbounded:
            edges = mesh.boundary_joints[joint]
            tangents = mesh.tangents(edges, np.full(2, vertex))
            m_ns = _twist(smoothed.moments[vertex, :, index], tangents)
            jump, reason = float(m_ns[0] - m_ns[1]), ""
        force = Value(
            value=jump, place=corner.place, case=state.cases[index].name, reason=reason
        )
        found.append((CornerForce(corner=corner, force=force), vertex))
    return found


def _joint_at(mesh: Mesh, corner: Corner) -> int:
    """Boundary joint at a corner of the outline."""
    ends = mesh.points[mesh.boundary_edges[:, 1]]
    return int(np.argmin(np.hypot(*(ends - corner.place).T)))


def _twist(moment: Floats, tangents: Floats) -> Floats:
    """m_ns of a moment (3,) on edges of tangents (k, 2), outward on their right."""
    tx, ty = tangents.T
    nx, ny = ty, -tx
    return nx * tx * moment[0] + ny * ty * moment[1] + (nx * ty + ny * tx) * moment[2]


def _side_reactions(
    state: StaticState, rest: Floats, motions: Floats
) -> list[SideReaction]:
    """Reactions of the supported sides from vertex forces less corner forces."""
    mesh, plate = state.mesh, state.plate
    holds = np.array([plate.support(name).holds_deflection for name in mesh.side_names])
    held_length = np.zeros(len(mesh.points))  # of the supported edges at each vertex
    for end in (0, 1):
        lengths = mesh.boundary_lengths * holds[mesh.boundary_sides]
        np.add.at(held_length, mesh.boundary_edges[:, end], lengths)
    unbounded = {
        int(mesh.boundary_edges[_joint_at(mesh, corner), 1])
        for corner in plate_corners(plate)
        if corner.unbounded
    }
    found = []
    for number, name in enumerate(mesh.side_names):
        if not holds[number]:
            continue
        edges = np.flatnonzero(mesh.boundary_sides == number)
        share = np.zeros(len(mesh.points))
        for end in (0, 1):
            np.add.at(
                share, mesh.boundary_edges[edges, end], mesh.boundary_lengths[edges]
            )
        length = 0.5 * share
        used = share > 0.0
        share[used] /= held_length[used]
        own = share[:, None] * rest
        chains = _stretches(mesh, edges)
        parts = [_along(mesh, chain, own, length, unbounded) for chain in chains]
        support = plate.support(name)
        starts = np.cumsum([0.0, *(float(part[0][-1]) for part in parts[:-1])])
        found.append(
            SideReaction(
                side=name,
                support=support,
                resultant=_resultant(motions, own),
                stations=mesh.points[np.concatenate(chains)],
                distance=np.concatenate(
                    [part[0] + s for part, s in zip(parts, starts, strict=True)]
                ),
                line_reaction=np.concatenate([part[1] for part in parts]),
                line_moment=np.concatenate([part[2] for part in parts])
                * support.holds_slope,
            )
        )
    return found


def _stretches(mesh: Mesh, edges: Ints) -> list[Ints]:
    """Vertices along each connected stretch of some boundary edges, in order.

    A closed stretch repeats its first vertex at the end.
    """
    follow = dict(mesh.boundary_edges[edges].tolist())
    ends = set(follow.values())
    heads = [v for v in follow if v not in ends]
    chains = []
    while follow:
        first = heads.pop(0) if heads else next(iter(follow))
        chain = [first]
        while chain[-1] in follow:
            chain.append(follow.pop(chain[-1]))
        chains.append(np.array(chain))
    return chains


def _along(
    mesh: Mesh, chain: Ints, own: Floats, length: Floats, unbounded: set[int]
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
    along = np.einsum("kc,kc->k", tangent, own[chain, 1:]) / length[chain]
    spans = _three(length[chain], closed)
    force = _three(own[chain, 0], closed) - _gain(along, closed)
    reaction = force / spans
    moment = _three(across, closed) / spans
    reaction[[int(v) in unbounded for v in chain]] = np.nan
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


def _resultant(motions: Floats, nodal: Floats) -> Resultant:
    force, by_x, by_y = np.einsum("vum,vu->m", motions, nodal)
    return Resultant(force=float(force), moment_x=float(by_y), moment_y=float(-by_x))


def _imbalance(mesh: Mesh, motions: Floats, nodal: Floats, loads: Floats) -> float:
    """Largest sum of loads and support forces over the sum of their magnitudes."""
    size = float(np.ptp(mesh.points, axis=0).max())
    sums = np.einsum("vum,vu->m", motions, nodal + loads)
    scale = float(np.abs(nodal[:, 0]).sum() + np.abs(loads[:, 0]).sum())
    reach = np.array([1.0, size, size])
    return float(np.max(np.abs(sums) / reach) / scale) if scale > 0.0 else 0.0


def hold_down(forces: Sequence[CornerForce]) -> tuple[float, list[CornerForce]]:
    """Largest pull in N that a corner needs, and which need it within 0.1 %."""
    known = [f for f in forces if not np.isnan(f.force.value)]
    most = max((-f.force.value for f in known), default=0.0)
    if most <= 0.0:
        return 0.0, []
    return most, [f for f in known if -f.force.value >= 0.999 * most]
