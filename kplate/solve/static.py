"""Static bending: one factorisation, any number of load cases."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from kplate import assembly, loading
from kplate.arrays import Floats, Ints
from kplate.boundary import Constraints, check_held, constrain
from kplate.dofs import Numbering, add_up
from kplate.elements import ELEMENTS, Element
from kplate.elements.arcs import Arcs, no_arcs
from kplate.errors import InputError, SolveError
from kplate.linalg import Factor
from kplate.loads import Case, Load
from kplate.mesh import Mesh
from kplate.plate import Plate
from kplate.roundedges import check_room, round_edges

Progress = Callable[[str, float], None]


@dataclass(frozen=True, eq=False, kw_only=True)
class StaticState:
    """The unknowns of a plate in its load cases.

    Parameters
    ----------
    plate : Plate
        The statement.
    cases : tuple of Case
        The load cases, in the order of the last axis below.
    element : Element
        What the unknowns belong to.
    constraints : Constraints
        Their numbering and what the supports hold.
    unknowns : ndarray, shape (count, c)
        Deflections in m and slopes.
    forces : ndarray, shape (count, c)
        Consistent loads in N and N m.
    support_forces : ndarray, shape (count, c)
        What the supports bring: stiffness times unknowns less loads, at the supported
        vertices; N, positive up, and the couples in N m that work on the slopes.
    """

    plate: Plate
    cases: tuple[Case, ...]
    element: Element
    constraints: Constraints
    unknowns: Floats
    forces: Floats
    support_forces: Floats

    @property
    def mesh(self) -> Mesh:
        """The triangles."""
        return self.constraints.numbering.mesh

    @cached_property
    def strain_energy(self) -> Floats:
        """Strain energy of each case in J, summed over the triangles, (c,)."""
        numbering, total = self.constraints.numbering, np.zeros(len(self.cases))
        for block, K in assembly.element_stiffness(self.plate, numbering, self.element):
            bent = assembly.without_rigid_motion(
                self.unknowns[numbering.table[block]],
                self.mesh.points[self.mesh.triangles[block]],
                numbering,
            )
            total += 0.5 * np.einsum("nic,nic->c", bent, K @ bent)
        return total

    @property
    def load_work(self) -> Floats:
        """Loads times deflections of each case in J, twice the energy, (c,)."""
        return np.einsum("ic,ic->c", self.unknowns, self.forces)


@dataclass(frozen=True, eq=False, kw_only=True)
class StaticSystem:
    """A plate's stiffness on a mesh, factored: any number of loads, one by one.

    Parameters
    ----------
    plate : Plate
        The statement.
    element : Element
        What the unknowns belong to.
    constraints : Constraints
        Their numbering and what the supports hold.
    factor : Factor
        Of the stiffness of the free unknowns.
    """

    plate: Plate
    element: Element
    constraints: Constraints
    factor: Factor

    @classmethod
    def of(cls, plate: Plate, mesh: Mesh, element: str) -> "StaticSystem":
        """Assemble and factor.

        Raises
        ------
        InputError
            If there is no such element.
        SolveError
            If the plate can still move as a rigid body.
        """
        if element not in ELEMENTS:
            raise InputError(
                f"there is no element {element!r}; the elements are "
                f"{', '.join(ELEMENTS)}."
            )
        chosen = ELEMENTS[element]
        numbering = Numbering(
            mesh=mesh,
            per_vertex=chosen.per_vertex,
            per_edge=chosen.per_edge,
            arcs=arcs_followed(plate, mesh, chosen),
        )
        check_held(plate, mesh)
        constraints = constrain(plate, numbering)
        matrix = assembly.stiffness(plate, chosen, constraints)
        return cls(
            plate=plate, element=chosen, constraints=constraints, factor=Factor(matrix)
        )

    @property
    def numbering(self) -> Numbering:
        """The unknowns."""
        return self.constraints.numbering

    def forces(self, loads: Sequence[Load]) -> Floats:
        """Consistent forces of loads that act together, (count,)."""
        return loading.load_vector(self.plate, self.element, self.numbering, loads)

    def solve(self, forces: Floats, settled: Floats | None = None) -> Floats:
        """Unknowns (count, c) under forces (count, c).

        Solves, and refines once with a residual summed element by element: that of the
        matrix is spoilt by the round-off of its entries where small triangles meet a
        large deflection; the elements' own, free of rigid motion, is not. It takes
        loads and support forces into balance to round-off.

        `settled` (count, c), if given, are unknowns that have the values wanted of the
        held ones.
        """
        unknowns = self._back(forces) if settled is None else settled.copy()
        for _ in range(1 if settled is None else 2):
            unknowns = unknowns + self._back(forces - self._inner(unknowns))
        if not np.isfinite(unknowns).all():
            raise SolveError(
                "the solution is not finite; check the loads and the material."
            )
        return unknowns

    def state(self, cases: Sequence[Case], forces: Floats) -> StaticState:
        """Solve for the forces (count, c) of load cases."""
        return self.state_of(cases, forces, self.solve(forces))

    def state_of(
        self, cases: Sequence[Case], forces: Floats, unknowns: Floats
    ) -> StaticState:
        """State of load cases whose unknowns are known."""
        return StaticState(
            plate=self.plate,
            cases=tuple(cases),
            element=self.element,
            constraints=self.constraints,
            unknowns=unknowns,
            forces=forces,
            support_forces=self._support_forces(cases, unknowns, forces),
        )

    def _back(self, right: Floats) -> Floats:
        constraints = self.constraints
        turned = np.zeros_like(right)
        turned[constraints.free] = self.factor.solve(
            constraints.turn(right)[constraints.free]
        )
        return constraints.turn_back(turned)

    def _inner(self, unknowns: Floats, triangles: Ints | None = None) -> Floats:
        return assembly.internal_forces(
            self.plate, self.element, self.numbering, unknowns, triangles
        )

    def _support_forces(
        self, cases: Sequence[Case], unknowns: Floats, forces: Floats
    ) -> Floats:
        """Residual at the supported unknowns, zero elsewhere, (count, c).

        At held round edges it is that of plain polynomials, which do not vanish along
        them, so that line reactions do work; they work a little on free unknowns too.
        """
        supported = np.zeros(self.numbering.count, dtype=bool)
        supported[self.constraints.supported] = True
        near = np.flatnonzero(supported[self.numbering.table].any(axis=1))
        inner = self._inner(unknowns, near)
        result = np.zeros_like(forces)
        result[supported] = inner[supported] - forces[supported]
        if self.numbering.arcs.held.any():
            result += self._plain_work(unknowns)
            plain = replace(self.numbering, arcs=self.numbering.arcs.unheld())
            for k, case in enumerate(cases):
                own = loading.load_vector(self.plate, self.element, plain, case.loads)
                result[:, k] -= own - forces[:, k]
        return result

    def _plain_work(self, unknowns: Floats) -> Floats:
        """Work of the moments on what is taken off in triangles at held arcs."""
        numbering = self.numbering
        arcs = numbering.arcs.chosen(numbering.arcs.held)
        points, weights = self.element.round_rule(arcs)
        table = numbering.table[arcs.rows]
        bent = assembly.without_rigid_motion(unknowns[table], arcs.vertices, numbering)
        held, free = (
            self.element.curvature(arcs.vertices, points, own)
            for own in (arcs.alone(), arcs.unheld().alone())
        )
        rigidity = self.plate.rigidities[numbering.mesh.zones[arcs.rows]][:, None]
        moments = rigidity @ (held @ bent[:, None]) * weights[..., None, None]
        result = np.zeros_like(unknowns)
        add_up(result, table, np.einsum("mqad,mqac->mdc", free - held, moments))
        return result


def solve_static(
    plate: Plate,
    mesh: Mesh,
    cases: Sequence[Case],
    *,
    element: str = "dkt",
    progress: Progress | None = None,
) -> StaticState:
    """Solve static bending of a plate on a given mesh.

    Parameters
    ----------
    plate : Plate
        The statement.
    mesh : Mesh
        Triangles over its outline.
    cases : sequence of Case
        At least one, of different names.
    element : str
        Name in the table of elements.
    progress : callable, optional
        Called with a stage and the fraction done.

    Returns
    -------
    StaticState

    Raises
    ------
    InputError
        If there is no such element, no case, or two cases share a name.
    SolveError
        If the plate can still move as a rigid body.
    """
    check_cases(cases)
    report = progress or _silent
    report("factorisation", 0.1)
    system = StaticSystem.of(plate, mesh, element)
    report("loads", 0.6)
    forces = np.column_stack([system.forces(case.loads) for case in cases])
    report("solution", 0.7)
    return system.state(cases, forces)


def arcs_followed(plate: Plate, mesh: Mesh, element: Element) -> Arcs:
    """Round edges of a mesh that an element follows; chords stand for the others.

    An element of several pieces has no second derivatives to hold at the ends of an
    arc, and its slope across a clamped one would not vanish: it follows all or none.
    """
    if not (element.shape.follows and element.conforming):
        return no_arcs()
    arcs = round_edges(plate, mesh)
    if len(element.shape.pieces) > 1 and arcs.clamps.any():
        return no_arcs()
    check_room(element.shape.cones(arcs))
    return arcs


def check_cases(cases: Sequence[Case]) -> None:
    """Refuse no case, or two of one name."""
    if not cases:
        raise InputError("there is no load case; give at least one.")
    names = [case.name for case in cases]
    for name in names:
        if names.count(name) > 1:
            raise InputError(
                f"{names.count(name)} load cases are called {name!r}; each needs a "
                "name of its own."
            )


def _silent(stage: str, done: float) -> None:
    """Report nothing."""
