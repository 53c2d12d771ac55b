"""How judged numbers change with thickness, stiffness and loads, by adjoint solves.

A number J depends on the unknowns u, which obey K u = f, and on a parameter p itself:

    dJ/dp = dJ/dp at fixed u  +  v . (df/dp - dK/dp u),   K v = dJ/du,

one solve with the factored stiffness for each J, none for a parameter. Of the force of
a support J = s . (K u - f), v settles with the support: dJ/dp = v . (dK/dp u - df/dp).
The stiffness of each part of the plate goes with E h^3, its self-weight with h.

Peaks are differentiated where they are. Of a summit inside that is all there is to it;
of a peak on the rim of an excluded disc, whose radius is the thickness, the place is
taken as fixed.

Source: common practice in structural optimization.
"""

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Literal

import numpy as np

from kplate import assembly
from kplate.arrays import Bools, Floats, Ints
from kplate.errors import InputError
from kplate.functionals import settled_vertices
from kplate.linalg import Factor
from kplate.loads import Load, PointForce, Pressure, SelfWeight
from kplate.polygon import SNAP
from kplate.raw import corner_places
from kplate.reactions import CornerForce, corner_edges
from kplate.recovery import principal_moments, von_mises
from kplate.solution import Solution
from kplate.solve.static import StaticSystem
from kplate.values import Value

COMPONENTS = ("m_xx", "m_yy", "m_xy")
Kind = Literal["thickness", "modulus", "load"]


@dataclass(frozen=True, kw_only=True)
class Parameter:
    """Something a number depends on.

    Parameters
    ----------
    kind : {"thickness", "modulus", "load"}
        A thickness h in m, a Young's modulus E in Pa, or the factor 1 of a load.
    of : str
        The zone, if it has a thickness of its own, or empty for the plate; the
        material; or the case.
    number : int
        Which of the case's loads, from 0.
    value : float
        What it is, in m, Pa, or 1 as a share.
    """

    kind: Kind
    of: str = ""
    number: int = 0
    value: float = 1.0


@dataclass(frozen=True, kw_only=True)
class Sensitivity:
    """How a number changes with a parameter.

    Parameters
    ----------
    quantity : str
        What number it is.
    value : Value
        The number, with its place and case.
    parameter : Parameter
        What is changed.
    derivative : float
        Change of the number, in its unit, for a unit change of the parameter.
    """

    quantity: str
    value: Value
    parameter: Parameter
    derivative: float

    @property
    def relative(self) -> float:
        """Change of the number in per cent where the parameter grows by 1 %."""
        if self.value.value == 0.0:
            return float("nan")
        return self.derivative * self.parameter.value / self.value.value


@dataclass(frozen=True, eq=False, kw_only=True)
class _Reading:
    """A number at a place, as it depends on the unknowns.

    It is the deflection at a point, a function of moments at points, or the force of a
    support that settles.
    """

    quantity: str
    value: Value
    index: int
    at: Floats | None = None
    triangles: Ints = field(default_factory=lambda: np.empty(0, dtype=np.int64))
    inside: Floats = field(default_factory=lambda: np.empty((0, 3)))
    slopes: Floats = field(default_factory=lambda: np.empty((0, 3)))  # by the moments
    falls: float = 0.0  # dJ/dh times h of what is not the moments'
    settled: str = ""
    given: tuple[tuple[int, float], ...] = ()  # loads that J holds themselves


def sensitivities(
    solution: Solution,
    *,
    quantities: Sequence[str] = ("deflection", "von Mises"),
    supports: Sequence[str] = (),
    hold_down: bool = True,
) -> tuple[Sensitivity, ...]:
    """Derivatives of numbers of a solved plate to everything it was given.

    Parameters
    ----------
    solution : Solution
        A plate solved with C1 elements.
    quantities : sequence of str
        Peaks, each in every case: "deflection", "von Mises", "largest principal",
        "smallest principal", "m_xx", "m_yy" or "m_xy".
    supports : sequence of str
        Sides, seams and marks whose forces are wanted; of those that meet others the
        whole of what they bring as they stand, corners included.
    hold_down : bool
        Whether the largest pull at a corner is wanted, in every case.

    Returns
    -------
    tuple of Sensitivity
        Number by number, each to the plate's thickness, to those of zones with their
        own, to each material's E and to each load of the case.

    Raises
    ------
    InputError
        If the elements are not C1, or there is no such quantity or support.
    """
    if not solution.state.element.conforming:
        raise InputError(
            f"{solution.state.element.name} has no moments of its own to "
            'differentiate; solve with element "auto", "quintic" or "hct".'
        )
    readings = _readings(solution, quantities, supports, hold_down)
    return _Problem(solution).found(readings)


class _Problem:
    """The factored plate, and what each parameter does to stiffness and loads."""

    def __init__(self, solution: Solution) -> None:
        self.solution, self.state = solution, solution.state
        state, plate = self.state, solution.plate
        self.system = StaticSystem(
            plate=plate,
            element=state.element,
            constraints=state.constraints,
            factor=Factor(assembly.stiffness(plate, state.element, state.constraints)),
        )
        self.forces: dict[tuple[int, int], Floats] = {}
        own = np.array([name in _own_thickness(solution) for name in _names(solution)])
        groups = [(Parameter(kind="thickness", value=plate.thickness), ~own)]
        for k in np.flatnonzero(own):
            one = np.zeros(len(own), dtype=bool)
            one[k] = True
            name, h = _names(solution)[k], plate.sections[k][0]
            groups.append((Parameter(kind="thickness", of=name, value=h), one))
        for material in dict.fromkeys(m for _, m in plate.sections):
            alike = np.array([m == material for _, m in plate.sections])
            parameter = Parameter(kind="modulus", of=material.name, value=material.E)
            groups.append((parameter, alike))
        self.groups = groups
        self.pulls = [self._pull(*group) for group in groups]

    def found(self, readings: Sequence[_Reading]) -> tuple[Sensitivity, ...]:
        """All derivatives of all readings."""
        numbering = self.system.numbering
        right = np.zeros((numbering.count, len(readings)))
        settled = np.zeros_like(right)
        for j, reading in enumerate(readings):
            if reading.settled:
                vertices, _ = settled_vertices(self.solution.mesh, reading.settled)
                settled[numbering.at_vertices(vertices)[:, 0], j] = 1.0
            else:
                right[:, j] = self._row(reading)
        adjoint = self.system.solve(right, settled)
        result: list[Sensitivity] = []
        for j, reading in enumerate(readings):
            v = -adjoint[:, j] if reading.settled else adjoint[:, j]
            changes = [
                (
                    parameter,
                    float(v @ pull[:, reading.index]) + self._direct(reading, k),
                )
                for k, ((parameter, _), pull) in enumerate(
                    zip(self.groups, self.pulls, strict=True)
                )
            ]
            case = self.state.cases[reading.index]
            for i, load in enumerate(case.loads):
                change = float(v @ self._force(reading.index, i, load))
                change += sum(own for number, own in reading.given if number == i)
                changes.append((Parameter(kind="load", of=case.name, number=i), change))
            result += [
                Sensitivity(
                    quantity=reading.quantity,
                    value=reading.value,
                    parameter=parameter,
                    derivative=change,
                )
                for parameter, change in changes
            ]
        return tuple(result)

    def _row(self, reading: _Reading) -> Floats:
        """How a reading changes with the unknowns, (count,)."""
        mesh, element = self.solution.mesh, self.state.element
        table, arcs = self.system.numbering.table, self.system.numbering.arcs
        row = np.zeros(self.system.numbering.count)
        if reading.at is not None:
            triangles, inside = mesh.locate([reading.at])
            vertices = mesh.points[mesh.triangles[triangles]]
            own = element.evaluate(vertices, inside, arcs.among(triangles))[0, 0, 0]
            np.add.at(row, table[triangles[0]], own)
        if len(reading.triangles):
            vertices = mesh.points[mesh.triangles[reading.triangles]]
            own_arcs = arcs.among(reading.triangles)
            bent = element.curvature(vertices, reading.inside[:, None], own_arcs)[:, 0]
            rigidity = self.solution.plate.rigidities[mesh.zones[reading.triangles]]
            own = np.einsum("ka,kab,kbd->kd", reading.slopes, rigidity, bent)
            np.add.at(row, table[reading.triangles], own)
        return row

    def _direct(self, reading: _Reading, group: int) -> float:
        """What a parameter does to a reading at fixed unknowns."""
        if not len(reading.triangles):
            return 0.0
        parameter, sections = self.groups[group]
        inside = sections[self.solution.mesh.zones[reading.triangles]]
        moments = _moments(self.solution, reading.triangles, reading.inside)
        own = np.einsum("ka,ka->k", reading.slopes, moments[..., reading.index])
        if parameter.kind == "modulus":
            return float(own[inside].sum()) / parameter.value
        falls = reading.falls if inside[0] else 0.0
        return (3.0 * float(own[inside].sum()) + falls) / parameter.value

    def _pull(self, parameter: Parameter, sections: Bools) -> Floats:
        """df/dp - dK/dp u of every case, (count, c)."""
        state, mesh, plate = self.state, self.solution.mesh, self.solution.plate
        triangles = np.flatnonzero(sections[mesh.zones])
        power = 3.0 if parameter.kind == "thickness" else 1.0
        inner = assembly.internal_forces(
            plate, state.element, self.system.numbering, state.unknowns, triangles
        )
        pull = -power / parameter.value * inner
        if parameter.kind == "thickness":
            pull += self._weights(sections)
        return pull

    def _weights(self, sections: Bools) -> Floats:
        """Change of the weight of some sections with their thickness, (count, c)."""
        change = np.zeros_like(self.state.forces)
        pulled = [
            sum(own.acceleration for own in case.loads if isinstance(own, SelfWeight))
            for case in self.state.cases
        ]
        if not any(pulled):
            return change
        names = _names(self.solution)
        parts = [self._even(None), *(self._even(name) for name in names[1:])]
        parts[0] = parts[0] - sum(parts[1:], np.zeros_like(parts[0]))
        for part, (_, material), chosen in zip(
            parts, self.solution.plate.sections, sections, strict=True
        ):
            if chosen:
                change += np.outer((material.density or 0.0) * part, pulled)
        return change

    def _even(self, zone: str | None) -> Floats:
        """Forces of a pressure of 1 Pa."""
        return self.system.forces([Pressure(1.0, zone=zone)])

    def _force(self, index: int, number: int, load: Load) -> Floats:
        if (index, number) not in self.forces:
            self.forces[index, number] = self.system.forces([load])
        return self.forces[index, number]


def _names(solution: Solution) -> tuple[str, ...]:
    """Names of the sections; the plate's own has none."""
    return ("", *solution.plate.outline.zone_names)


def _own_thickness(solution: Solution) -> set[str]:
    zones = solution.plate.zones
    return {name for name, section in zones.items() if section.thickness is not None}


def _moments(solution: Solution, triangles: Ints, inside: Floats) -> Floats:
    """Moments of all cases at one point in each triangle, (k, 3, c)."""
    return solution.fields_on(triangles, inside[:, None])[0][:, 0]


def _readings(
    solution: Solution,
    quantities: Sequence[str],
    supports: Sequence[str],
    hold_down: bool,
) -> list[_Reading]:
    found = []
    for index, case in enumerate(solution.cases):
        for quantity in quantities:
            value = solution.peak(quantity, case=case)
            if value.place is None or not value.value:
                continue
            name = f"peak {quantity}"
            if quantity == "deflection":
                at = np.asarray(value.place)
                found.append(_Reading(quantity=name, value=value, index=index, at=at))
            else:
                found.append(_stress_reading(solution, quantity, value, index))
        if hold_down:
            pull, forces = solution.hold_down(case=case)
            if forces:
                worst = min(forces, key=lambda own: own.force.value)
                found.append(_corner_reading(solution, worst, pull, index))
        found += [_support_reading(solution, name, index) for name in supports]
    return found


def _stress_reading(
    solution: Solution, quantity: str, value: Value, index: int
) -> _Reading:
    """Read a peak of moments or stresses where it is."""
    mesh, plate = solution.mesh, solution.plate
    assert value.place is not None
    every = np.arange(len(mesh.triangles))
    place = np.asarray(value.place)
    inside = mesh.barycentrics(every, np.broadcast_to(place, (len(every), 2)))
    near = np.flatnonzero(inside.min(axis=1) > -SNAP)
    if not len(near):
        near, inside_near = mesh.locate([value.place])
    else:
        inside_near = inside[near]
    moments = _moments(solution, near, inside_near)[..., index]
    h = plate.thicknesses[mesh.zones[near]]
    sizes = np.array([_size(quantity, m, value) for m in moments])
    if quantity not in COMPONENTS:
        sizes = 6.0 / h**2 * sizes
    own = int(np.argmin(np.abs(sizes - value.value)))  # of those that meet there
    slopes = _slopes(quantity, moments[own], value)
    falls = 0.0
    if quantity not in COMPONENTS:
        slopes, falls = 6.0 / h[own] ** 2 * slopes, -2.0 * float(sizes[own])
    return _Reading(
        quantity=f"peak {quantity}",
        value=value,
        index=index,
        triangles=near[[own]],
        inside=inside_near[[own]],
        slopes=slopes[None],
        falls=falls,
    )


def _size(quantity: str, moments: Floats, value: Value) -> float:
    """What a quantity is made of, before 6/h^2 makes a stress of it."""
    sign = -1.0 if value.face == "top" else 1.0
    if quantity == "von Mises":
        return float(von_mises(moments))
    if quantity in COMPONENTS:
        return float(moments[COMPONENTS.index(quantity)])
    larger, smaller = principal_moments(sign * moments)[0]
    return float(larger if quantity == "largest principal" else smaller)


def _slopes(quantity: str, moments: Floats, value: Value) -> Floats:
    """Derivatives of that by the three moments."""
    xx, yy, xy = moments
    sign = -1.0 if value.face == "top" else 1.0
    if quantity == "von Mises":
        own = np.array([2.0 * xx - yy, 2.0 * yy - xx, 6.0 * xy])
        return own / (2.0 * von_mises(moments))
    if quantity in COMPONENTS:
        return np.eye(3)[COMPONENTS.index(quantity)]
    if quantity not in ("largest principal", "smallest principal"):
        raise InputError(
            f"a peak of {quantity} is not differentiated; ask for deflection, von "
            f"Mises, largest principal, smallest principal or {', '.join(COMPONENTS)}."
        )
    _, angle = principal_moments(sign * moments)
    if quantity == "smallest principal":
        angle = angle + 0.5 * np.pi
    c, s = np.cos(angle), np.sin(angle)
    return sign * np.array([c * c, s * s, 2.0 * c * s])


def _corner_reading(
    solution: Solution, worst: CornerForce, pull: Value, index: int
) -> _Reading:
    """Read how hard a corner pulls: minus the jump of m_ns."""
    mesh = solution.mesh
    edges, tangents = corner_edges(mesh, worst.corner)
    triangles, inside = corner_places(mesh, edges, np.array([1, 0]))
    (tx, ty), (nx, ny) = tangents.T, (tangents[:, 1], -tangents[:, 0])
    twist = np.stack([nx * tx, ny * ty, nx * ty + ny * tx], axis=1)
    size = SNAP * solution.plate.outline.size
    given = tuple(
        (i, load.force)
        for i, load in enumerate(solution.state.cases[index].loads)
        if isinstance(load, PointForce)
        and np.hypot(*np.subtract(load.at, worst.corner.place)) < size
    )
    return _Reading(
        quantity="corner hold-down",
        value=pull,
        index=index,
        triangles=triangles,
        inside=inside,
        slopes=np.array([[-1.0], [1.0]]) * twist,
        given=given,
    )


def _support_reading(solution: Solution, name: str, index: int) -> _Reading:
    """Read all that a support brings."""
    if not (
        name in solution.plate.supports
        and solution.plate.support(name).holds_deflection
    ):
        held = [n for n, s in solution.plate.supports.items() if s.holds_deflection]
        raise InputError(
            f"there is no support {name!r} that holds the deflection; they are "
            f"{', '.join(held)}."
        )
    vertices, _ = settled_vertices(solution.mesh, name)
    own = solution.state.constraints.numbering.at_vertices(vertices)[:, 0]
    force = float(solution.state.support_forces[own, index].sum())
    value = Value(value=force, case=solution.cases[index])
    return _Reading(quantity=f"force of {name}", value=value, index=index, settled=name)
