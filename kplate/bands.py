"""Two-sided bands on any linear functional of the deflection.

The gap G between the moments of the plate's elements (compatible with a deflection
that the supports allow) and those of the dual (in balance with the loads) bounds both
errors in the norm of the energy, with no constant: the two errors are orthogonal. With
the gaps G0 of a load case and Gj of a goal's adjoint problem,

    J = J_h + (G0, Gj) / 2  +-  ||G0|| ||Gj|| / 2,

where J_h = l_j(u_0) + [l_0(u_j) - a(u_0, u_j)] is taken triangle by triangle, which
keeps round-off out. A part of the pressure that the dual cannot carry on a triangle,
p - Pp with P the projection on linear functions, adds to each norm the oscillation
(h/pi)^2 |p - Pp| / sqrt(least bending stiffness). The dual is loaded by the moments of
p with quartics, not by Pp itself; computed over triangles of many shapes, slim ones
too, what that needs is less than a tenth of it.

The band is a bound where the deflection is conforming and the moments balance: with the
C1 elements on straight sides, and on arcs of circles that they follow. There the
moments balance but for what is left of m_nn and v_n along arcs, r; a bound rho of its
work on a deflection of unit energy (`elements.dual_arcs`) makes half the width
``(||G0|| + rho0) (||Gj|| + rhoj) - ||G0|| ||Gj|| / 2``.

Source: W. Prager, J. L. Synge, "Approximations in elasticity based on the concept of
function space", Quarterly of Applied Mathematics 5 (1947) 241-269 (from memory).
"""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from kplate import assembly
from kplate.arrays import Floats, Ints
from kplate.brackets import SUMMED, Brackets
from kplate.elements import bernstein
from kplate.elements.arcs import Arcs
from kplate.elements.dual_arcs import RoundDual
from kplate.errors import SolveError
from kplate.functionals import Functional, local_pressure, settled_vertices
from kplate.kernelled import (
    Kernelled,
    kernel_balance,
    kernel_error,
    kernel_forces,
    kernelled_on,
)
from kplate.loads import (
    Case,
    EdgeMoment,
    LineForce,
    PressureField,
)
from kplate.mesh import STRAIGHT_EDGE, Mesh
from kplate.plate import Plate
from kplate.quadrature import composite, triangle_rule
from kplate.solve.dual import DualState, DualSystem
from kplate.solve.static import StaticState, StaticSystem, check_cases
from kplate.unbalanced import field_doubts, unbalanced
from kplate.values import Value
from kplate.worth import CHORDS, drawn_share, misplaced, worth

BLOCK = 512  # triangles
ORDER = 3  # of the dual: it carries linear pressures exactly
# The primal energy may exceed the dual's by this share, as round-off.
CROSSING = 1e-9
# Energies of loads that supports take at once are round-off: so small a share of what
# the loads could do.
ROUND_OFF = 1e-20


@dataclass(frozen=True, eq=False, kw_only=True)
class Certified:
    """A plate solved with its dual on one mesh, and bands for its goals.

    Parameters
    ----------
    state : StaticState
        The plate's deflection in its cases.
    dual : DualState
        Its balanced moments.
    functionals : tuple of Functional
        The goals.
    values : tuple of tuple of Value
        The value and band of each goal, for each case.
    energies : tuple of Value
        Strain energy of each case in J.
    brackets : Brackets
        What those bands are made of, and those of combinations of the cases.
    case_gaps : ndarray, shape (n_triangles, c)
        Squared norm of each case's gap on each triangle, oscillation included.
    goal_gaps : ndarray, shape (n_triangles, g)
        The same of each goal's adjoint problem.
    """

    state: StaticState
    dual: DualState
    functionals: tuple[Functional, ...]
    values: tuple[tuple[Value, ...], ...]
    energies: tuple[Value, ...]
    brackets: Brackets
    case_gaps: Floats
    goal_gaps: Floats

    @property
    def relative_gap(self) -> Floats:
        """Squared norm of each case's gap as a share of twice its energy, (c,)."""
        twice = np.array([2.0 * energy.value for energy in self.energies])
        return self.case_gaps.sum(axis=0) / np.maximum(twice, np.finfo(float).tiny)


def certify(
    plate: Plate,
    mesh: Mesh,
    cases: Sequence[Case],
    functionals: Sequence[Functional],
    *,
    element: str,
) -> Certified:
    """Solve a plate and its dual for cases and goals, and put bands on the goals.

    Parameters
    ----------
    plate : Plate
        The statement.
    mesh : Mesh
        Triangles over it; deflection goals and point forces at vertices.
    cases : sequence of Case
        The load cases.
    functionals : sequence of Functional
        The goals; one with a reason gets no band.
    element : str
        A C1 element.

    Returns
    -------
    Certified

    Raises
    ------
    InputError
        If a load has moments of no finite energy.
    SolveError
        If the plate can move, or round-off made the energies of a bound cross.
    """
    check_cases(cases)
    system = StaticSystem.of(plate, mesh, element)
    balance = DualSystem.of(plate, mesh, ORDER, system.numbering.arcs)
    adjoint = [f for f in functionals if not f.reason]
    kernelled = {
        j: kernelled_on(mesh, f.kernel, ORDER)
        for j, f in enumerate(adjoint)
        if f.kernel is not None
    }
    right = _right_sides(system, balance, cases, adjoint, kernelled)
    unknowns = system.solve(right.forces, right.settled)
    sunk, inside, moments, defect = balance.balance(right.balanced, right.sunk)
    c = len(cases)
    osc = _oscillations(plate, mesh, cases, adjoint, kernelled)
    gaps, cross, work = _gaps(system, balance, (unknowns, moments), kernelled, c)
    rims = _left_on_arcs(balance, moments, cases)
    state = system.state_of(cases, right.forces[:, :c], unknowns[:, :c])
    dual = balance.state_of(
        cases,
        right.balanced[:, :, :c],
        (sunk[:, :c], inside[..., :c], moments[..., :c], defect[:, :c]),
    )
    kind, reason = worth(plate, mesh, cases, system.numbering.arcs)
    if kind == "bound":
        _check_energies(state, dual, osc[:, :c] + rims[:, :c])
    pulls = right.forces[:, :c].T @ unknowns  # l_0(u_j)
    given = unknowns[:, :c].T @ right.forces  # l_j(u_0)
    size = np.abs(right.forces[:, :c]).T @ np.abs(unknowns)
    size += np.abs(unknowns[:, :c]).T @ np.abs(right.forces)
    centres = (pulls - work + 0.5 * cross)[:, c:].T
    doubts = _doubts(system, cases, unknowns)
    spare = (SUMMED * size + doubts)[:, c:].T
    for j, f in enumerate(adjoint):
        if f.settled:
            centres[j] *= -1.0
            continue
        centres[j] += given[:, c + j]
        if f.kernel is not None:
            for k, case in enumerate(cases):
                p, gradient = local_pressure(plate, mesh, case, f.kernel)
                centres[j, k] += f.kernel.constant(p, gradient)
                spare[j, k] += kernel_error(state, kernelled[j], k)
    norms = np.sqrt(gaps.sum(axis=0))
    off = np.sqrt((osc**2).sum(axis=0)) + np.sqrt(rims.sum(axis=0))
    brackets = Brackets(
        kind=kind,
        reason=reason,
        functionals=tuple(functionals),
        put=tuple("" if reason else misplaced(plate, mesh, f.loads) for f in adjoint),
        products=cross[:, :c],
        oscillations=off[:c],
        goal_norms=norms[c:],
        goal_oscillations=off[c:],
        centres=centres,
        spare=spare,
        doubts=doubts[:, :c],
        drawn=_share_drawn(plate, mesh, cases, system.numbering.arcs),
    )
    names, alone = [case.name for case in cases], np.eye(c)
    values = brackets.values(alone, names)
    energies = brackets.energies(alone, names, state.strain_energy)
    local = gaps + osc**2 + rims
    return Certified(
        state=state,
        dual=dual,
        functionals=tuple(functionals),
        values=values,
        energies=energies,
        brackets=brackets,
        case_gaps=local[:, :c],
        goal_gaps=local[:, c:],
    )


def _share_drawn(plate: Plate, mesh: Mesh, cases: Sequence[Case], arcs: Arcs) -> float:
    """Share by which estimates are wider for what is round and drawn otherwise."""
    loads = [load for case in cases for load in case.loads]
    if "chords" in misplaced(plate, mesh, loads):
        return CHORDS
    return drawn_share(plate, mesh, arcs)


@dataclass(frozen=True, eq=False, kw_only=True)
class _RightSides:
    """Right-hand sides of the cases, then of the goals."""

    forces: Floats
    settled: Floats
    balanced: Floats
    sunk: Floats


def _right_sides(
    system: StaticSystem,
    balance: DualSystem,
    cases: Sequence[Case],
    adjoint: Sequence[Functional],
    kernelled: Mapping[int, Kernelled],
) -> _RightSides:
    mesh = balance.mesh
    columns = len(cases) + len(adjoint)
    forces = np.zeros((system.numbering.count, columns))
    settled = np.zeros_like(forces)
    balanced = np.zeros((len(mesh.triangles), balance.dual.whole, columns))
    sunk = np.zeros((balance.constraints.numbering.count, columns))
    for k, case in enumerate(cases):
        forces[:, k] = system.forces(case.loads)
        balanced[:, :, k] = balance.forces(case.loads)
    for j, f in enumerate(adjoint):
        column = len(cases) + j
        if f.kernel is not None:
            own = kernelled[j]
            forces[:, column] = kernel_forces(system, own)
            balanced[:, :, column] = kernel_balance(balance, own)
        elif f.settled:
            vertices, edges = settled_vertices(mesh, f.settled)
            settled[system.numbering.at_vertices(vertices)[:, 0], column] = 1.0
            numbering = balance.constraints.numbering
            sunk[numbering.at_vertices(vertices)[:, 0], column] = 1.0
            on = numbering.on_edges(mesh.edge_numbers(edges))
            sunk[on[:, : numbering.edge_deflections], column] = 1.0
            # Of a round edge the first is the constant, the others change its form.
            curved = np.isin(
                mesh.edge_numbers(edges),
                mesh.triangle_edges[numbering.arcs.rows, numbering.arcs.edges],
            )
            sunk[on[curved, 1 : numbering.edge_deflections], column] = 0.0
        else:
            forces[:, column] = system.forces(f.loads)
            balanced[:, :, column] = balance.forces(f.loads)
    return _RightSides(forces=forces, settled=settled, balanced=balanced, sunk=sunk)


def _gaps(
    system: StaticSystem,
    balance: DualSystem,
    fields: tuple[Floats, Floats],
    kernelled: Mapping[int, Kernelled],
    cases: int,
) -> tuple[Floats, Floats, Floats]:
    """Gaps of all columns, their products with the cases', and the cases' works.

    Returns
    -------
    gaps : ndarray, shape (n_triangles, columns)
        Squared norms on each triangle.
    cross : ndarray, shape (cases, columns)
        Inner products of a case's gap with each column's.
    work : ndarray, shape (cases, columns)
        a(u_0, u_j) of the deflections.
    """
    mesh, (unknowns, moments) = balance.mesh, fields
    degree = 2 * max(balance.dual.order, system.element.curvature_degree)
    rule = composite(system.element.pieces, triangle_rule(degree))
    columns = unknowns.shape[1]
    gaps = np.empty((len(mesh.triangles), columns))
    cross, work = np.zeros((cases, columns)), np.zeros((cases, columns))
    for start in range(0, len(mesh.triangles), BLOCK):
        block = np.arange(start, min(start + BLOCK, len(mesh.triangles)))
        bent = _bent(system, unknowns, block, rule.points)
        gap = balance.dual.moments(moments[block], rule.points) - bent
        soft = np.linalg.inv(system.plate.rigidities)[mesh.zones[block]]
        weights = mesh.areas[block][:, None] * rule.weights
        weights[system.numbering.arcs.among(block).rows] = 0.0
        strain = soft[:, None] @ gap * weights[..., None, None]
        gaps[block] = np.einsum("nqaj,nqaj->nj", gap, strain)
        cross += np.einsum("nqak,nqaj->kj", gap[..., :cases], strain, optimize=True)
        own = soft[:, None] @ bent * weights[..., None, None]
        work += np.einsum("nqak,nqaj->kj", bent[..., :cases], own, optimize=True)
    arcs = system.numbering.arcs
    if len(arcs):
        points, weights = system.element.round_rule(arcs)
        bent = _bent(system, unknowns, arcs.rows, points)
        gap = balance.dual.moments(moments[arcs.rows], points) - bent
        soft = np.linalg.inv(system.plate.rigidities)[mesh.zones[arcs.rows]]
        strain = soft[:, None] @ gap * weights[..., None, None]
        gaps[arcs.rows] = np.einsum("nqaj,nqaj->nj", gap, strain)
        cross += np.einsum("nqak,nqaj->kj", gap[..., :cases], strain, optimize=True)
        own = soft[:, None] @ bent * weights[..., None, None]
        work += np.einsum("nqak,nqaj->kj", bent[..., :cases], own, optimize=True)
    for j, kernel in kernelled.items():
        part, column = kernel.triangles, cases + j
        chosen = [*range(cases), column]
        bent = _bent(system, unknowns[:, chosen], part, kernel.points)
        own_moments = np.ascontiguousarray(moments[part][..., chosen])
        gap = balance.dual.moments(own_moments, kernel.points) - bent
        # What the dual's polynomials cannot be of the kernel's own moments.
        shape = bernstein.values(balance.dual.order, kernel.points)
        left = kernel.moments - shape @ kernel.projected
        rigidity = system.plate.rigidities[mesh.zones[part]][:, None]
        energy = np.einsum("kqa,kqab,kqb->kq", left, rigidity, left, optimize=True)
        # Moments D left against a gap with the softness: gap . left.
        meets = np.einsum("kqac,kqa->kqc", gap, left)
        weights = mesh.areas[part][:, None] * kernel.weights
        gaps[part, column] += np.einsum(
            "kq,kq->k", weights, 2.0 * meets[..., -1] + energy
        )
        cross[:, column] += np.einsum("kq,kqc->c", weights, meets[..., :-1])
    return np.maximum(gaps, 0.0), cross, work


def _bent(
    system: StaticSystem, unknowns: Floats, triangles: Ints, points: Floats
) -> Floats:
    """Moments of the elements at points (q, 3) or (n, q, 3), (n, q, 3, c)."""
    numbering = system.numbering
    mesh = numbering.mesh
    vertices = mesh.points[mesh.triangles[triangles]]
    own = assembly.without_rigid_motion(
        unknowns[numbering.table[triangles]], vertices, numbering
    )
    arcs = numbering.arcs.among(triangles)
    strain = system.element.shape.fields(vertices, points, own, 2, arcs)
    moments: Floats = system.plate.rigidities[mesh.zones[triangles]][:, None] @ strain
    return moments


def _left_on_arcs(
    balance: DualSystem, moments: Floats, cases: Sequence[Case]
) -> Floats:
    """Squares of what is left of m_nn and v_n along arcs, (n_triangles, columns).

    In the norm of the energy: what its work on a deflection of unit energy may be.
    """
    mesh, arcs = balance.mesh, balance.constraints.numbering.arcs
    left = np.zeros((len(mesh.triangles), moments.shape[-1]))
    if not len(arcs):
        return left
    force, moment = (np.zeros((len(arcs), moments.shape[-1])) for _ in range(2))
    sides = np.full(len(mesh.triangles), -1)
    curved = mesh.boundary_circles != STRAIGHT_EDGE
    at = mesh.triangles_at(mesh.boundary_edges[curved])
    sides[at] = mesh.boundary_sides[curved]
    for k, case in enumerate(cases):
        for load in case.loads:
            if isinstance(load, LineForce | EdgeMoment):
                own = sides[arcs.rows] == _side_number(mesh, load.along)
                given = force if isinstance(load, LineForce) else moment
                amount = load.force if isinstance(load, LineForce) else load.moment
                given[own, k] += amount
    found = RoundDual(order=balance.dual.order, arcs=arcs)
    squares = found.residuals(moments[arcs.rows], force, moment)
    stiff = np.array([_least_stiffness(D) for D in balance.plate.rigidities])
    left[arcs.rows] = squares / stiff[mesh.zones[arcs.rows]][:, None]
    return left


def _side_number(mesh: Mesh, name: str) -> int:
    """Number of a side; -2 for a seam."""
    return mesh.side_names.index(name) if name in mesh.side_names else -2


def _oscillations(
    plate: Plate,
    mesh: Mesh,
    cases: Sequence[Case],
    adjoint: Sequence[Functional],
    kernelled: Mapping[int, Kernelled],
) -> Floats:
    """Oscillation of cases, then of goals, on each triangle, (n_triangles, columns)."""
    rest = np.zeros((len(mesh.triangles), len(cases) + len(adjoint)))
    for k, case in enumerate(cases):
        for load in case.loads:
            rest[:, k] += np.sqrt(unbalanced(mesh, load))
    for j, own in kernelled.items():
        if own.pressure.any():
            shape, part = own.points, own.triangles
            mean = np.einsum("q,qv,kq->kv", own.weights, shape, own.pressure)
            best = np.linalg.solve(bernstein.masses(1), mean[..., None])[..., 0]
            off = own.pressure - best @ shape.T
            squared = mesh.areas[part] * (off**2 @ own.weights)
            rest[part, len(cases) + j] += np.sqrt(squared)
    corners = mesh.points[mesh.triangles]
    sides = corners - np.roll(corners, 1, axis=1)
    longest = np.hypot(sides[..., 0], sides[..., 1]).max(axis=1)
    stiff = np.array([_least_stiffness(D) for D in plate.rigidities])[mesh.zones]
    scale = (longest / np.pi) ** 2 / np.sqrt(stiff)
    return rest * scale[:, None]


def _doubts(system: StaticSystem, cases: Sequence[Case], unknowns: Floats) -> Floats:
    """What is not known of the work of cases' stated pressures, (cases, columns)."""
    found = np.zeros((len(cases), unknowns.shape[1]))
    for k, case in enumerate(cases):
        for load in case.loads:
            if isinstance(load, PressureField):
                found[k] += field_doubts(
                    system.element, system.numbering, load, unknowns
                )
    return found


def _least_stiffness(rigidity: Floats) -> float:
    """Least energy, twice, of second derivatives of the size of one."""
    return float(min(np.linalg.eigvalsh(rigidity[:2, :2])[0], 2.0 * rigidity[2, 2]))


def _check_energies(state: StaticState, dual: DualState, osc: Floats) -> None:
    """Raise where round-off or a constraint has made the energies cross."""
    primal, above = state.strain_energy, dual.energy
    exact = ~osc.any(axis=0)
    # What the same forces could do to a plate of its size that is held at its rim.
    force = np.abs(state.forces).sum(axis=0) * state.plate.outline.size
    nothing = ROUND_OFF * force**2 / state.plate.rigidity[0, 0]
    crossed = exact & (primal > above * (1.0 + CROSSING) + nothing)
    if crossed.any():
        k = int(np.flatnonzero(crossed)[0])
        raise SolveError(
            f"case {state.cases[k].name}: the energy of the deflection, "
            f"{primal[k]:.12g} J, exceeds that of the balanced moments, "
            f"{above[k]:.12g} J, so that no band can be given; use a coarser mesh, or "
            "straight sides without bends."
        )
