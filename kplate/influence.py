"""Influence surfaces: what a force anywhere makes of one result.

By reciprocity (Betti, Maxwell) the deflection that belongs to a result is its influence
surface, so that one adjoint solve gives it for all places of a force. On the same mesh
the surface under a load and the result of the load solved directly are one number to
round-off, whatever the mesh, since the stiffness is symmetric.

Deflections, slopes, moments, clamping moments and shears are those of the element
itself at the place. Of a line reaction it is a mean-value kernel's (`kplate.kernels`),
which knows loads on its half disc only where they are linear all over it.

Source: S. Timoshenko and S. Woinowsky-Krieger, "Theory of Plates and Shells", 2nd ed.,
McGraw-Hill, 1959, art. 77 (from memory).
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from kplate.arrays import Floats
from kplate.dofs import add_up
from kplate.errors import InputError
from kplate.functionals import functional, local_pressure, settled_vertices
from kplate.goals import (
    ClampingMoment,
    Component,
    Deflection,
    Goal,
    LineReaction,
    MeanDeflection,
    Moment,
    Place,
    Resultant,
    Shear,
    Slope,
)
from kplate.kernelled import kernel_forces, kernelled_on
from kplate.kernels import Kernel
from kplate.loads import (
    Case,
    DiscPatch,
    Hydrostatic,
    Load,
    PointForce,
    PointMoment,
    PressureField,
    RectanglePatch,
)
from kplate.mesh import Mesh
from kplate.plate import Plate
from kplate.samples import Lattice
from kplate.solve.static import StaticSystem
from kplate.solved import Solved

ORDER = 3  # of a kernel's quadrature
STEPS = 4  # of the lattice on each triangle for pictures
COMPONENTS: tuple[Component, ...] = ("m_xx", "m_yy", "m_xy")


@dataclass(frozen=True, eq=False, kw_only=True)
class InfluenceSurface:
    """The influence surface of one result.

    Parameters
    ----------
    goal : Goal
        The result.
    system : StaticSystem
        The plate's stiffness on its mesh.
    unknowns : ndarray, shape (count,)
        The surface, as unknowns of the elements: the result in SI units per N.
    kernel : Kernel, optional
        Whose disc a load must not touch, or press evenly all over.
    """

    goal: Goal
    system: StaticSystem
    unknowns: Floats
    kernel: Kernel | None = None

    @property
    def plate(self) -> Plate:
        """The plate."""
        return self.system.plate

    @property
    def mesh(self) -> Mesh:
        """Its triangles."""
        return self.system.numbering.mesh

    def at(self, points: ArrayLike) -> Floats:
        """The result of a force of 1 N, up, at each of some points (k, 2), (k,).

        In the result's SI unit per N. On a kernel's disc it is smoothed.
        """
        triangles, barycentrics = self.mesh.locate(points)
        rows = self.system.element.evaluate(
            self.mesh.points[self.mesh.triangles[triangles]], barycentrics[:, None]
        )[:, 0, 0]
        table = self.system.numbering.table[triangles]
        found: Floats = np.einsum("kd,kd->k", rows, self.unknowns[table])
        return found

    def under(self, loads: Sequence[Load]) -> float:
        """The result in SI units under loads that act together.

        Raises
        ------
        InputError
            If a load does not fit the plate, or touches a kernel's disc without
            pressing evenly all over it.
        """
        total = float(self.system.forces(loads) @ self.unknowns)
        if self.kernel is None:
            return total
        for load in loads:
            if _cut_by(self.kernel, load):
                x, y = self.kernel.centre
                raise InputError(
                    f"a load ends, or acts at a point, within "
                    f"{self.kernel.radius:.4g} m of ({x:.6g}, {y:.6g}) m, where "
                    f"{type(self.goal).__name__} is asked for; solve for it directly."
                )
        case = Case(name="load", loads=loads)
        p, gradient = local_pressure(self.plate, self.mesh, case, self.kernel)
        return total + self.kernel.constant(p, gradient)

    def sampled(self) -> tuple[Floats, Floats, np.ndarray]:
        """Points (n, 2) in m, values (n,) and small triangles (m, 3), for pictures."""
        mesh, lattice = self.mesh, Lattice.of(STEPS)
        vertices = mesh.points[mesh.triangles]
        at = np.broadcast_to(
            lattice.barycentrics, (len(vertices), *lattice.barycentrics.shape)
        )
        rows = self.system.element.evaluate(vertices, at)[:, :, 0]
        table = self.system.numbering.table
        values = np.einsum("nqd,nd->nq", rows, self.unknowns[table])
        points = lattice.barycentrics @ vertices
        first = len(lattice.barycentrics) * np.arange(len(vertices))
        small = first[:, None, None] + lattice.triangles
        return points.reshape(-1, 2), values.ravel(), small.reshape(-1, 3)


def influence(solution: Solved, goal: Goal) -> InfluenceSurface:
    """Find the influence surface of a result by one adjoint solve.

    Parameters
    ----------
    solution : Solution
        A solved plate: its mesh and its elements are used again, its loads are not.
    goal : Goal
        Any but a peak.

    Returns
    -------
    InfluenceSurface

    Raises
    ------
    InputError
        If the goal names a place or a support that is not there, or is no result
        that follows from forces linearly.
    """
    system, mesh = solution.system, solution.mesh
    numbering = system.numbering
    forces, settled, kernel = np.zeros((numbering.count, 1)), None, None
    match goal:
        case Deflection() | MeanDeflection():
            own = functional(system.plate, mesh, goal, ())
            forces[:, 0] = system.forces(own.loads)
        case Resultant(of=name):
            own = functional(system.plate, mesh, goal, ())
            if own.reason:
                raise InputError(
                    f"the force of {name!r} has no influence surface: {own.reason}."
                )
            vertices, _ = settled_vertices(mesh, name)
            settled = np.zeros_like(forces)
            settled[numbering.at_vertices(vertices)[:, 0]] = 1.0
        case Slope() | Moment() | Shear() | ClampingMoment():
            _add_row(forces, system, goal)
        case LineReaction():
            own = functional(system.plate, mesh, goal, ())
            if own.kernel is None:
                raise InputError(f"{goal}: {own.reason}; ask for it elsewhere.")
            kernel = own.kernel
            forces[:, 0] = kernel_forces(system, kernelled_on(mesh, kernel, ORDER))
        case _:
            raise InputError(
                f"{goal} does not follow from forces linearly and has no influence "
                "surface; ask for a deflection, a moment, a shear or a reaction."
            )
    unknowns = system.solve(forces, settled)[:, 0]
    # A support's push is minus the loads' work on the deflection its settlement brings.
    sign = 1.0 if settled is None else -1.0
    return InfluenceSurface(
        goal=goal, system=system, unknowns=sign * unknowns, kernel=kernel
    )


def _add_row(
    forces: Floats, system: StaticSystem, goal: Slope | Moment | Shear | ClampingMoment
) -> None:
    """Add what an element's own field at a place is made of."""
    element, mesh = system.element, system.numbering.mesh
    if not element.conforming:
        raise InputError(
            f"{goal}: the moments of a {element.name} are smoothed and have no "
            'influence surface; take element "quintic" or "hct".'
        )
    triangles, barycentrics = mesh.locate([goal.at])
    vertices = mesh.points[mesh.triangles[triangles]]
    at = barycentrics[:, None]
    rigidity = system.plate.rigidities[mesh.zones[triangles[0]]]
    match goal:
        case Slope(direction=direction):
            own = np.asarray(direction) @ element.evaluate(vertices, at)[0, 0, 1:]
        case Moment(component=component):
            which = COMPONENTS.index(component)
            own = rigidity[which] @ element.curvature(vertices, at)[0, 0]
        case ClampingMoment():
            n_x, n_y = _normal(system.plate, mesh, goal)
            turn = np.array([n_x**2, n_y**2, 2.0 * n_x * n_y])
            own = turn @ rigidity @ element.curvature(vertices, at)[0, 0]
        case Shear(direction=direction):
            if element.curvature_degree < 2:
                raise InputError(
                    f"{goal}: the shears of a {element.name} are smoothed and have no "
                    'influence surface; take element "quintic".'
                )
            third = element.third_derivatives(vertices, at)[0, 0]
            by_x, by_y = rigidity @ third
            shears = -np.stack([by_x[0] + by_y[2], by_x[2] + by_y[1]])
            own = np.asarray(direction) @ shears
    add_up(forces, system.numbering.table[triangles], own[None, :, None])


def _normal(plate: Plate, mesh: Mesh, goal: ClampingMoment) -> Place:
    """Unit normal of the clamped side a place lies on."""
    functional(plate, mesh, goal, ())  # checks the place
    start, end = np.moveaxis(mesh.points[mesh.boundary_edges], 1, 0)
    step = end - start
    share = np.einsum("kc,kc->k", np.asarray(goal.at) - start, step)
    share = np.clip(share / np.einsum("kc,kc->k", step, step), 0.0, 1.0)
    off = np.hypot(*(start + share[:, None] * step - goal.at).T)
    x, y = step[off.argmin()] / np.hypot(*step[off.argmin()])
    return float(y), float(-x)


def _cut_by(kernel: Kernel, load: Load) -> bool:
    """Whether a load is not linear all over a kernel's disc."""
    centre, radius = np.asarray(kernel.centre), kernel.radius
    match load:
        case PointForce(at=at) | PointMoment(at=at):
            return bool(np.hypot(*(centre - at)) < radius)
        case RectanglePatch():
            corners = np.asarray(load.corners)
            step = np.roll(corners, -1, axis=0) - corners
            length = np.einsum("kc,kc->k", step, step)
            share = np.einsum("kc,kc->k", centre - corners, step) / length
            foot = corners + np.clip(share, 0.0, 1.0)[:, None] * step
            return bool(np.hypot(*(foot - centre).T).min() < radius)
        case DiscPatch(centre=middle, radius=own):
            return bool(abs(np.hypot(*(centre - middle)) - own) < radius)
        case Hydrostatic(level=level, up=up):
            unit = np.asarray(up, dtype=float) / np.hypot(*up)
            return bool(abs(level - centre @ unit) < radius)
        case PressureField():
            return True  # what is not linear of it is not known
    return False
