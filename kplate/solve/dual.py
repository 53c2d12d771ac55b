"""The dual of static bending: moments in balance with the loads on a given mesh.

For pressures of degree k - 2 on each triangle, forces at vertices, constant forces
along edges and moments along sides, the moments are exactly in balance, and so have no
less complementary energy than the true ones. Other loads, such as a patch that cuts
triangles or a force inside one, are balanced on the average of each triangle only.

The stiffness is factored once. Where triangles are small and the deflection is not,
moments taken from it are spoilt by round-off of about ``w / h^2``; so the moments are
what is kept. The forces they fail to balance, triangle by triangle, are solved for and
what follows is added to them, until it is no more than round-off.

Axes: n triangles, o ordinates of moments, *whole* unknowns of a triangle, c cases.
"""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from kplate import loading
from kplate.arrays import Floats, Ints
from kplate.assembly import BLOCK
from kplate.boundary import Constraints, check_held, constrain
from kplate.dofs import Numbering, add_up
from kplate.elements.arcs import Arcs, no_arcs
from kplate.elements.dual import DUALS, Condensed, Dual
from kplate.errors import InputError, SolveError
from kplate.linalg import Factor
from kplate.loads import Case, EdgeMoment, Load, PointMoment
from kplate.mesh import STRAIGHT_EDGE, Mesh
from kplate.pattern import Pattern
from kplate.plate import Plate
from kplate.quadrature import gauss
from kplate.solve.static import check_cases

# Corrections end when one is this small a share of the first solution, in the norm of
# the energy; a next one would be smaller by as much as this was than that before. On
# usual meshes the first correction is, at 1e-12. At the free corner of a cantilever,
# triangles of 1e-5 of its side take four, of 1e-6 ten; with 1e-7 there is no end.
SMALL, MOST = 1e-9, 20


@dataclass(frozen=True, eq=False, kw_only=True)
class DualState:
    """Balanced moments of a plate in its load cases.

    Parameters
    ----------
    plate : Plate
        The statement.
    cases : tuple of Case
        The load cases, in the order of the last axis below.
    order : int
        Degree k of the moments.
    constraints : Constraints
        The numbering of the unknowns and what the supports hold.
    unknowns : ndarray, shape (count, c)
        Deflections in m and slopes on the edges.
    inside : ndarray, shape (n, i, c)
        Deflections in m that belong to one triangle alone.
    moments : ndarray, shape (n, o, 3, c)
        Bernstein ordinates of m_xx, m_yy, m_xy in N.
    forces : ndarray, shape (n, whole, c)
        Consistent loads of each triangle in N and N m.
    support_forces : ndarray, shape (count, c)
        What the supports bring to the unknowns they hold, zero elsewhere; N, positive
        up, and the couples in N m that work on the slopes.
    """

    plate: Plate
    cases: tuple[Case, ...]
    order: int
    constraints: Constraints
    unknowns: Floats
    inside: Floats
    moments: Floats
    forces: Floats
    support_forces: Floats

    @property
    def mesh(self) -> Mesh:
        """The triangles."""
        return self.constraints.numbering.mesh

    @property
    def dual(self) -> Dual:
        """What the unknowns belong to."""
        return DUALS[self.order]

    @cached_property
    def energies(self) -> Floats:
        """Complementary energy of each triangle in J, (n, c)."""
        mesh = self.mesh
        return self.dual.energy(
            mesh.points[mesh.triangles],
            self.plate.rigidities[mesh.zones],
            self.moments,
            self.constraints.numbering.arcs,
        )

    @property
    def energy(self) -> Floats:
        """Complementary energy of each case in J, (c,)."""
        return self.energies.sum(axis=0)

    @cached_property
    def whole(self) -> Floats:
        """Unknowns of each triangle with those inside, (n, whole, c)."""
        own = self.unknowns[self.constraints.numbering.table]
        return np.concatenate([own, self.inside], axis=1)

    @property
    def load_work(self) -> Floats:
        """Loads times deflections of each case in J, twice the energy, (c,)."""
        return np.einsum("ndc,ndc->c", self.whole, self.forces)

    def moments_at(self, triangles: Ints, barycentrics: Floats) -> Floats:
        """Moments in N at points (n, q, 3) of some triangles (n,), (n, q, 3, c)."""
        return self.dual.moments(self.moments[triangles], barycentrics)

    def shears_at(self, triangles: Ints, barycentrics: Floats) -> Floats:
        """Transverse shears q_x, q_y in N/m at the same, (n, q, 2, c)."""
        return self.dual.shears(
            self._vertices(triangles), self.moments[triangles], barycentrics
        )

    def carried_at(self, triangles: Ints, barycentrics: Floats) -> Floats:
        """Pressure in Pa that the moments carry at the same, (n, q, c)."""
        return self.dual.carried(
            self._vertices(triangles), self.moments[triangles], barycentrics
        )

    def deflections_at(self, triangles: Ints, barycentrics: Floats) -> Floats:
        """Deflection in m at the same, (n, q, c)."""
        rows = self.dual.evaluate(self._vertices(triangles), barycentrics)
        deflections: Floats = rows[:, :, 0] @ self.whole[triangles]
        return deflections

    def _vertices(self, triangles: Ints) -> Floats:
        return self.mesh.points[self.mesh.triangles[triangles]]


@dataclass(frozen=True, eq=False, kw_only=True)
class DualSystem:
    """The dual of a plate on a mesh, factored: any number of loads, one by one.

    Parameters
    ----------
    plate : Plate
        The statement.
    dual : Dual
        What the unknowns belong to.
    constraints : Constraints
        Their numbering and what the supports hold.
    factor : Factor
        Of the condensed stiffness of the free unknowns.
    """

    plate: Plate
    dual: Dual
    constraints: Constraints
    factor: Factor

    @classmethod
    def of(
        cls, plate: Plate, mesh: Mesh, order: int = 3, arcs: Arcs | None = None
    ) -> "DualSystem":
        """Assemble and factor; `arcs` are the round edges to follow, if any.

        Raises
        ------
        InputError
            If there is no dual of that order.
        SolveError
            If the plate can still move as a rigid body.
        """
        if order not in DUALS:
            raise InputError(f"order = {order}; the dual has the orders 2 and 3.")
        dual = DUALS[order]
        check_held(plate, mesh)
        numbering = Numbering(
            mesh=mesh,
            per_vertex=dual.per_vertex,
            per_edge=dual.per_edge,
            edge_deflections=dual.edge_deflections,
            arcs=no_arcs() if arcs is None else arcs,
        )
        constraints = constrain(plate, numbering)
        stiffnesses = (
            (block, parts.stiffness)
            for block, parts in _condensed(plate, numbering, dual)
        )
        matrix = Pattern(numbering=numbering).matrix(stiffnesses, constraints.free)
        return cls(
            plate=plate, dual=dual, constraints=constraints, factor=Factor(matrix)
        )

    @property
    def mesh(self) -> Mesh:
        """The triangles."""
        return self.constraints.numbering.mesh

    def forces(self, loads: Sequence[Load]) -> Floats:
        """Consistent forces of each triangle under loads that act together, (n, whole).

        Raises
        ------
        InputError
            If a load is a couple at a point, whose moments have no finite energy.
        """
        return _loads(self.plate, self.constraints.numbering, self.dual, loads)

    def state(self, cases: Sequence[Case], forces: Floats) -> DualState:
        """Balance the forces (n, whole, c) of load cases."""
        return self.state_of(cases, forces, self.balance(forces))

    def state_of(
        self,
        cases: Sequence[Case],
        forces: Floats,
        solved: tuple[Floats, Floats, Floats, Floats],
    ) -> DualState:
        """State of load cases that `balance` has solved."""
        unknowns, inside, moments, defect = solved
        return DualState(
            plate=self.plate,
            cases=tuple(cases),
            order=self.dual.order,
            constraints=self.constraints,
            unknowns=unknowns,
            inside=inside,
            moments=moments,
            forces=forces,
            support_forces=np.where(self.constraints.free[:, None], 0.0, -defect),
        )

    def balance(
        self, forces: Floats, settled: Floats | None = None
    ) -> tuple[Floats, Floats, Floats, Floats]:
        """Solve, and correct until the moments balance the forces (n, whole, c).

        `settled` (count, c), if given, are unknowns that have the values wanted of the
        held ones.

        Returns
        -------
        unknowns, inside, moments : ndarray
            As in `DualState`.
        defect : ndarray, shape (count, c)
            Forces that remain: round-off, and what the supports take.

        Raises
        ------
        SolveError
            If triangles are so small beside the plate that round-off leaves the moments
            unbalanced.
        """
        numbering, free = self.constraints.numbering, self.constraints.free
        n, _, c = forces.shape
        unknowns = np.zeros((numbering.count, c)) if settled is None else settled.copy()
        moments = np.zeros((n, self.dual.ordinates, 3, c))
        given = (self.plate, numbering, self.dual)
        inside, moments, defect = _follow(*given, unknowns, forces, moments)
        first = np.zeros(c)
        for correction in range(1 + MOST):
            step = np.zeros_like(unknowns)
            step[free] = self.factor.solve(defect[free])
            size = np.sqrt(np.abs(np.einsum("ic,ic->c", step, defect)))
            if not np.isfinite(size).all():
                raise SolveError(
                    "the moments are not finite; check the loads and the material."
                )
            moved, moments, defect = _follow(*given, step, forces, moments)
            unknowns, inside = unknowns + step, inside + moved
            if correction == 0:
                first = size
            elif (size <= SMALL * first).all():
                return unknowns, inside, moments, defect
        raise _unbalanced(numbering.mesh)


def solve_dual(
    plate: Plate,
    mesh: Mesh,
    cases: Sequence[Case],
    *,
    order: int = 3,
    arcs: Arcs | None = None,
) -> DualState:
    """Find the balanced moments of least complementary energy on a given mesh.

    Parameters
    ----------
    plate : Plate
        The statement.
    mesh : Mesh
        Triangles over its outline.
    cases : sequence of Case
        At least one.
    order : int
        Degree of the moments, 2 or 3.
    arcs : Arcs, optional
        Round edges to follow (`kplate.roundedges`); chords stand for them if left out.

    Returns
    -------
    DualState

    Raises
    ------
    InputError
        If there is no dual of that order, or a load is a couple at a point, whose
        moments have no finite energy.
    SolveError
        If the plate can still move as a rigid body, or triangles are so small beside
        it that round-off leaves the moments unbalanced.
    """
    check_cases(cases)
    system = DualSystem.of(plate, mesh, order, arcs)
    forces = np.stack([system.forces(case.loads) for case in cases], axis=-1)
    return system.state(cases, forces)


def _follow(
    plate: Plate,
    numbering: Numbering,
    dual: Dual,
    step: Floats,
    forces: Floats,
    moments: Floats,
) -> tuple[Floats, Floats, Floats]:
    """Let moments and unknowns inside follow a step (count, c) of the others.

    Returns
    -------
    moved : ndarray, shape (n, i, c)
        Step of the unknowns inside; it balances the forces inside.
    moments : ndarray, shape (n, o, 3, c)
        What the moments have become.
    defect : ndarray, shape (count, c)
        Forces that these do not balance.
    """
    moments = moments.copy()
    moved = np.empty((len(forces), dual.whole - dual.left, step.shape[1]))
    defect = np.zeros_like(step)
    for block, parts in _condensed(plate, numbering, dual):
        missing = forces[block] - parts.internal_forces(moments[block])
        whole = parts.whole(step[numbering.table[block]], missing)
        moments[block] += parts.moments(whole)
        moved[block] = whole[:, dual.left :]
        missing = forces[block] - parts.internal_forces(moments[block])
        add_up(defect, numbering.table[block], parts.forces(missing))
    return moved, moments, defect


def _condensed(
    plate: Plate, numbering: Numbering, dual: Dual
) -> Iterator[tuple[Ints, Condensed]]:
    """Condensed triangles, block by block; making them again is cheap, memory not."""
    mesh = numbering.mesh
    for start in range(0, len(mesh.triangles), BLOCK):
        block = np.arange(start, min(start + BLOCK, len(mesh.triangles)))
        rigidity = plate.rigidities[mesh.zones[block]]
        vertices = mesh.points[mesh.triangles[block]]
        yield block, dual.condense(vertices, rigidity, numbering.arcs.among(block))


@dataclass(frozen=True, eq=False, kw_only=True)
class _Apart(Numbering):
    """Every triangle with unknowns of its own, so that each keeps its loads."""

    whole: int

    @property
    def count(self) -> int:
        return self.whole * len(self.mesh.triangles)

    @cached_property
    def table(self) -> Ints:
        return np.arange(self.count).reshape(-1, self.whole)


def _loads(
    plate: Plate, numbering: Numbering, dual: Dual, loads: Sequence[Load]
) -> Floats:
    """Consistent loads of each triangle, (n, whole)."""
    apart = _Apart(
        mesh=numbering.mesh,
        per_vertex=0,
        per_edge=0,
        whole=dual.whole,
        arcs=numbering.arcs,
    )
    for load in loads:
        if isinstance(load, PointMoment):
            raise InputError(
                f"a couple acts at ({load.at[0]:g}, {load.at[1]:g}) m; the moments of "
                "a couple at a point have no finite energy and no bound. Let it act "
                "as a pair of forces or over a patch."
            )
    turning = [load for load in loads if isinstance(load, EdgeMoment)]
    others = [load for load in loads if not isinstance(load, EdgeMoment)]
    forces = loading.load_vector(plate, dual, apart, others)
    for moment in turning:
        _add_edge_moment(forces, apart, dual, moment)
    return forces.reshape(-1, dual.whole)


def _add_edge_moment(
    forces: Floats, apart: Numbering, dual: Dual, load: EdgeMoment
) -> None:
    """Add a moment along a side; it works on the edges' own slopes."""
    mesh = apart.mesh
    if load.along not in mesh.side_names:
        raise InputError(
            f"a moment acts along {load.along!r}; the sides are "
            f"{', '.join(mesh.side_names)}."
        )
    side = mesh.boundary_sides == mesh.side_names.index(load.along)
    if len(apart.arcs):
        side &= mesh.boundary_circles == STRAIGHT_EDGE
        loading.add_along_arcs(forces[:, None], dual, apart, load)
    edges = mesh.boundary_edges[side]
    triangles = mesh.triangles_at(edges)
    own = mesh.triangle_edges[triangles] == mesh.edge_numbers(edges)[:, None]
    share, weights = gauss(dual.order + 1)
    rows = dual.outward_slopes(
        mesh.points[mesh.triangles[triangles]], own.argmax(axis=1), share
    )
    amount = load.moment * (mesh.boundary_lengths * mesh.boundary_stretch)[side]
    couples = amount[:, None] * np.einsum("q,nqd->nd", weights, rows)
    np.add.at(forces, apart.table[triangles], couples)


def _unbalanced(mesh: Mesh) -> SolveError:
    size = float(np.ptp(mesh.points, axis=0).max())
    least = int(mesh.areas.argmin())
    x, y = mesh.points[mesh.triangles[least]].mean(axis=0)
    return SolveError(
        f"round-off leaves the moments unbalanced: the triangle at ({x:.6g}, {y:.6g}) "
        f"m is {np.sqrt(mesh.areas[least]) / size:.1g} of the plate; make triangles "
        "where the deflection is large no smaller than 1e-6 of it."
    )
