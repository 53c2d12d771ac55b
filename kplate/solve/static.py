"""Static bending: one factorisation, any number of load cases."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from kplate import assembly, loading
from kplate.arrays import Floats
from kplate.boundary import Constraints, check_held, constrain
from kplate.dofs import Numbering
from kplate.elements import ELEMENTS, Element
from kplate.errors import InputError, SolveError
from kplate.linalg import Factor
from kplate.loads import Case
from kplate.mesh import Mesh
from kplate.plate import Plate

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
        for block, K in assembly.element_stiffness(self.plate, self.mesh, self.element):
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
    if element not in ELEMENTS:
        raise InputError(
            f"there is no element {element!r}; the elements are {', '.join(ELEMENTS)}."
        )
    _check_cases(cases)
    report = progress or _silent
    chosen = ELEMENTS[element]
    numbering = Numbering(
        mesh=mesh, per_vertex=chosen.per_vertex, per_edge=chosen.per_edge
    )
    check_held(plate, mesh)
    constraints = constrain(plate, numbering)
    report("loads", 0.1)
    forces = np.column_stack(
        [loading.load_vector(plate, chosen, numbering, case.loads) for case in cases]
    )
    report("stiffness", 0.2)
    matrix = assembly.stiffness(plate, chosen, constraints)
    report("factorisation", 0.4)
    unknowns = _solve(plate, chosen, constraints, Factor(matrix), forces)
    if not np.isfinite(unknowns).all():
        raise SolveError(
            "the solution is not finite; check the loads and the material."
        )
    report("support forces", 0.9)
    return StaticState(
        plate=plate,
        cases=tuple(cases),
        element=chosen,
        constraints=constraints,
        unknowns=unknowns,
        forces=forces,
        support_forces=_support_forces(plate, chosen, constraints, unknowns, forces),
    )


def _solve(
    plate: Plate,
    element: Element,
    constraints: Constraints,
    factor: Factor,
    forces: Floats,
) -> Floats:
    """Solve, and refine once with a residual summed element by element.

    The residual of the matrix is spoilt by the round-off of its entries where small
    triangles meet a large deflection; the elements' own, free of rigid motion, is not.
    It takes loads and support forces into balance to round-off.
    """

    def back(right: Floats) -> Floats:
        turned = np.zeros_like(right)
        turned[constraints.free] = factor.solve(
            constraints.turn(right)[constraints.free]
        )
        return constraints.turn_back(turned)

    unknowns = back(forces)
    inner = assembly.internal_forces(plate, element, constraints.numbering, unknowns)
    return unknowns + back(forces - inner)


def _support_forces(
    plate: Plate,
    element: Element,
    constraints: Constraints,
    unknowns: Floats,
    forces: Floats,
) -> Floats:
    """Residual at the supported unknowns, zero elsewhere, (count, c)."""
    numbering = constraints.numbering
    supported = np.zeros(numbering.count, dtype=bool)
    supported[constraints.supported] = True
    near = np.flatnonzero(supported[numbering.table].any(axis=1))
    inner = assembly.internal_forces(plate, element, numbering, unknowns, near)
    result = np.zeros_like(forces)
    result[supported] = inner[supported] - forces[supported]
    return result


def _check_cases(cases: Sequence[Case]) -> None:
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
