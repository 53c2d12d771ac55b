"""Goals as right-hand sides of the plate's equations and of its dual's.

A functional J is one of three things: the work of loads on w (a force of 1 N gives a
deflection), an integral of w and its moments with weights (a mean-value kernel,
`kplate.kernels`), or minus the work of the loads on the deflection that a unit
settlement of a support brings (its reaction). For each there is an adjoint problem of
the plate and one of the dual.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from kplate import kernels
from kplate.arrays import Bools, Floats, Ints
from kplate.clearance import (
    COARSE,
    bearing,
    distances,
    ring_room,
    round_rim,
    zone_edges,
)
from kplate.errors import InputError
from kplate.goals import (
    ClampingMoment,
    Deflection,
    Goal,
    LineReaction,
    MeanDeflection,
    Moment,
    Place,
    Resultant,
    RimMoment,
    Shear,
    Slope,
)
from kplate.loads import (
    Case,
    DiscPatch,
    EdgeMoment,
    Hydrostatic,
    Load,
    PointForce,
    PointMoment,
    Pressure,
    PressureField,
    RectanglePatch,
    SelfWeight,
)
from kplate.mesh import STRAIGHT_EDGE, Mesh
from kplate.plate import Plate
from kplate.polygon import SNAP
from kplate.rimkernels import rim_moment_kernel

# A kernel's disc keeps this share of the way to what it must not touch.
REACH = 0.95
COMPONENTS = {"m_xx": (1.0, 0.0, 0.0), "m_yy": (0.0, 1.0, 0.0), "m_xy": (0.0, 0.0, 1.0)}
# A disc that is left less than this share of the plate's size is no use.
LEAST = 1e-3
# A load ends along a side where it is off by no more than this share of the size.
ROUND_OFF = 1e-12


@dataclass(frozen=True, eq=False, kw_only=True)
class Functional:
    """A goal on a plate.

    Parameters
    ----------
    goal : Goal
        What is wanted.
    loads : tuple of Load
        Loads whose work it is, if any.
    kernel : Kernel, optional
        Weights whose integral it is, if any.
    settled : str
        Name of the support that settles by 1 m, if any.
    reason : str
        Why it is no bounded functional; empty where it is one.
    too_large : ndarray, shape (k,)
        Triangles to be parted for it to become one, if that is why.
    """

    goal: Goal
    loads: tuple[Load, ...] = ()
    kernel: kernels.Kernel | None = None
    settled: str = ""
    reason: str = ""
    too_large: Ints = field(default_factory=lambda: np.empty(0, dtype=np.int64))


def functional(
    plate: Plate, mesh: Mesh, goal: Goal, cases: Sequence[Case]
) -> Functional:
    """Make a goal a functional.

    Parameters
    ----------
    plate : Plate
        The statement.
    mesh : Mesh
        Triangles over it.
    goal : Goal
        Any but a peak.
    cases : sequence of Case
        Their loads keep kernels away.

    Returns
    -------
    Functional

    Raises
    ------
    InputError
        If the goal names a place or a support that is not there.
    """
    match goal:
        case Deflection(at=place):
            mesh.locate([place])
            return Functional(goal=goal, loads=(PointForce(force=1.0, at=place),))
        case MeanDeflection(zone=zone):
            whole = plate.outline.area
            size = whole if zone is None else plate.outline.zone_area(zone)
            return Functional(goal=goal, loads=(Pressure(1.0 / size, zone=zone),))
        case Resultant(of=name):
            return _settlement(plate, mesh, goal, name)
        case Slope() | Moment() | Shear() | ClampingMoment() | LineReaction():
            return _kernel(plate, mesh, goal, cases)
        case RimMoment():
            return _ring_kernel(plate, mesh, goal, cases)
    raise InputError(f"{goal} is not a number at a place; ask for it as a peak.")


def settled_vertices(mesh: Mesh, name: str) -> tuple[Ints, Ints]:
    """Vertices and edges (k, 2) of a side, seam or mark."""
    if name in mesh.mark_names:
        vertex = mesh.mark_vertices[mesh.mark_names.index(name)]
        return np.array([vertex]), np.empty((0, 2), dtype=np.int64)
    if name in mesh.side_names:
        own = mesh.boundary_sides == mesh.side_names.index(name)
        edges = mesh.boundary_edges[own]
    elif name in mesh.seam_names:
        edges = mesh.seam_edges[mesh.seam_numbers == mesh.seam_names.index(name)]
    else:
        names = [*mesh.side_names, *mesh.seam_names, *mesh.mark_names]
        raise InputError(
            f"there is no side, seam or mark {name!r}; they are {', '.join(names)}."
        )
    return np.unique(edges), edges


def _settlement(plate: Plate, mesh: Mesh, goal: Goal, name: str) -> Functional:
    """A support's resultant, by its unit settlement."""
    vertices, _ = settled_vertices(mesh, name)
    if not plate.support(name).holds_deflection:
        return Functional(goal=goal, reason=f"{name} does not hold the deflection")
    for other in (*mesh.side_names, *mesh.seam_names, *mesh.mark_names):
        held = other != name and plate.support(other).holds_deflection
        if held and np.isin(settled_vertices(mesh, other)[0], vertices).any():
            return Functional(
                goal=goal, settled=name, reason=f"{name} meets the support {other}"
            )
    return Functional(goal=goal, settled=name)


def _kernel(plate: Plate, mesh: Mesh, goal: Any, cases: Sequence[Case]) -> Functional:
    """A point value by a mean-value kernel."""
    on_edge = isinstance(goal, ClampingMoment | LineReaction)
    edge = _edge_under(plate, mesh, goal) if on_edge else None
    triangle = int(mesh.locate([goal.at])[0][0])
    h, material = plate.sections[mesh.zones[triangle]]
    D, nu = material.bending_stiffness(h), material.nu
    radius, near = _room(plate, mesh, goal.at, cases, edge)
    if radius < LEAST * plate.outline.size:
        return Functional(goal=goal, reason=f"{near} leaves no room around it")
    radius *= REACH
    match goal:
        case Moment(component=component):
            kernel = kernels.moment_kernel(goal.at, radius, COMPONENTS[component])
        case Shear(direction=direction):
            kernel = kernels.shear_kernel(goal.at, radius, direction, nu=nu)
        case Slope(direction=direction):
            kernel = kernels.slope_kernel(goal.at, radius, direction, D=D)
        case _:
            assert edge is not None
            inward = _inward(mesh, edge)
            if isinstance(goal, ClampingMoment):
                kernel = kernels.clamping_kernel(goal.at, radius, inward, D=D)
            else:
                kernel = kernels.line_reaction_kernel(goal.at, radius, inward, nu=nu)
    return Functional(goal=goal, kernel=kernel)


def _ring_kernel(
    plate: Plate, mesh: Mesh, goal: RimMoment, cases: Sequence[Case]
) -> Functional:
    """The moment along a free round rim by the kernel of a ring around it."""
    rim = round_rim(plate, mesh, goal.at)
    near, far, reason = ring_room(plate, mesh, rim, cases, REACH)
    if reason == COARSE:
        return Functional(goal=goal, reason=reason, too_large=rim.triangles)
    if reason:
        return Functional(goal=goal, reason=reason)
    h, material = plate.sections[mesh.zones[mesh.locate([goal.at])[0][0]]]
    kernel = rim_moment_kernel(
        goal.at,
        rim.circle,
        (near, far),
        D=material.bending_stiffness(h),
        nu=material.nu,
    )
    return Functional(goal=goal, kernel=kernel)


def _edge_under(plate: Plate, mesh: Mesh, goal: Any) -> int:
    """Boundary edge on which a goal lies; it must be held as the goal wants it."""
    at = np.asarray(goal.at, dtype=float)
    start, end = np.moveaxis(mesh.points[mesh.boundary_edges], 1, 0)
    off = distances(at, start, end)
    edge = int(off.argmin())
    name = mesh.side_names[mesh.boundary_sides[edge]]
    support = plate.support(name)
    wanted = isinstance(goal, ClampingMoment)
    if off[edge] > SNAP * plate.outline.size:
        raise InputError(f"({at[0]:g}, {at[1]:g}) m does not lie on a side.")
    if not support.holds_deflection or support.holds_slope != wanted:
        kind = "clamped" if wanted else "simply supported"
        raise InputError(
            f"({at[0]:g}, {at[1]:g}) m lies on side {name!r}, which is {support.name}; "
            f"ask for this on a {kind} side."
        )
    if mesh.boundary_circles[edge] != STRAIGHT_EDGE:
        raise InputError(f"side {name!r} is round; ask for this on a straight side.")
    return edge


def _inward(mesh: Mesh, edge: int) -> Place:
    """Unit normal of a boundary edge into the plate."""
    start, end = mesh.points[mesh.boundary_edges[edge]]
    x, y = (end - start) / np.hypot(*(end - start))
    return float(-y), float(x)


def _room(
    plate: Plate, mesh: Mesh, at: Place, cases: Sequence[Case], edge: int | None
) -> tuple[float, str]:
    """Radius of the disc around a place in which the plate is smooth, and what ends it.

    Sides (but for the straight piece the place lies on), seams that are held or carry a
    force, steps, point supports and whatever of the loads is not linear there. Along
    that straight piece loads may end: a kernel's disc is only its half inside.
    """
    place = np.asarray(at, dtype=float)
    found = [(math.inf, "nothing")]
    start, end = np.moveaxis(mesh.points[mesh.boundary_edges], 1, 0)
    straight = mesh.boundary_circles == STRAIGHT_EDGE
    keep, line = straight.copy(), None
    if edge is not None:
        line = _line(plate, mesh, edge)
        keep &= ~_same_line(plate, mesh, edge) | _turned(mesh, cases)
    if not straight.all():
        found.append((_off_round_edges(mesh, place), "a round side"))
    if keep.any():
        found.append((float(distances(place, start[keep], end[keep]).min()), "a side"))
    seams = mesh.seam_edges[bearing(plate, mesh, cases)]
    lines = [(seams, "a seam"), (zone_edges(mesh), "the edge of a zone")]
    for edges, words in lines:
        if len(edges):
            a, b = np.moveaxis(mesh.points[edges], 1, 0)
            found.append((float(distances(place, a, b).min()), words))
    for name, vertex in zip(mesh.mark_names, mesh.mark_vertices, strict=True):
        if plate.support(name).holds:
            off = float(np.hypot(*(mesh.points[vertex] - place)))
            found.append((off, f"the support {name}"))
    for case in cases:
        found += [_load_room(load, place, line) for load in case.loads]
    return min(found)


@dataclass(frozen=True, eq=False, kw_only=True)
class _Line:
    """The straight line of a side of a plate of some size: a point and the normal."""

    start: Floats
    normal: Floats
    size: float

    def holds(self, points: ArrayLike, within: float) -> Bools:
        """Whether points (k, 2) are within a share of the size from it."""
        off = (np.asarray(points, dtype=float) - self.start) @ self.normal
        on: Bools = np.abs(off) < within * self.size
        return on


def _line(plate: Plate, mesh: Mesh, edge: int) -> _Line:
    """The straight line on which a boundary edge lies."""
    return _Line(
        start=mesh.points[mesh.boundary_edges[edge, 0]],
        normal=np.array(_inward(mesh, edge)),
        size=plate.outline.size,
    )


def _off_round_edges(mesh: Mesh, place: Floats) -> float:
    """Distance from a place to the triangles at round edges, or less."""
    curved = mesh.boundary_circles != STRAIGHT_EDGE
    triangles = mesh.triangles_at(mesh.boundary_edges[curved])
    corners = mesh.points[mesh.triangles[triangles]]
    x, y, radius = mesh.circles[mesh.boundary_circles[curved]].T
    off = np.abs(np.hypot(place[0] - x, place[1] - y) - radius)
    for k in range(3):
        off = np.minimum(off, distances(place, corners[:, k - 1], corners[:, k]))
    return float(off.min())


def _same_line(plate: Plate, mesh: Mesh, edge: int) -> Bools:
    """Boundary edges on the straight line of one that are held as it is."""
    start, end = np.moveaxis(mesh.points[mesh.boundary_edges], 1, 0)
    line = _line(plate, mesh, edge)
    on = line.holds(start, SNAP) & line.holds(end, SNAP)
    supports = [plate.support(name) for name in mesh.side_names]
    own = supports[mesh.boundary_sides[edge]]
    alike = np.array([support == own for support in supports])
    return on & alike[mesh.boundary_sides]


def _turned(mesh: Mesh, cases: Sequence[Case]) -> Bools:
    """Boundary edges along which a moment is applied; m_nn is not zero there."""
    along = {
        load.along
        for case in cases
        for load in case.loads
        if isinstance(load, EdgeMoment)
    }
    named = np.array([name in along for name in mesh.side_names])
    turned: Bools = named[mesh.boundary_sides]
    return turned


def _load_room(load: Load, place: Floats, line: _Line | None) -> tuple[float, str]:
    """Distance from a place, on a line if any, to where a load is not linear."""
    match load:
        case PointForce(at=at) | PointMoment(at=at):
            return float(np.hypot(*(place - at))), "a point load"
        case RectanglePatch():
            start = np.asarray(load.corners)
            end = np.roll(start, -1, axis=0)
            sides = distances(place, start, end)
            if line is not None:
                along = line.holds(start, ROUND_OFF) & line.holds(end, ROUND_OFF)
                sides[along] = math.inf
            return float(sides.min()), "the edge of a patch"
        case DiscPatch(centre=centre, radius=radius):
            off = abs(float(np.hypot(*(place - centre))) - radius)
            return off, "the edge of a patch"
        case Hydrostatic(level=level, up=up):
            unit = np.asarray(up, dtype=float) / np.hypot(*up)
            foot = level * unit
            surface = [foot, np.add(foot, (-unit[1], unit[0]))]
            if line is not None and line.holds(surface, ROUND_OFF).all():
                return math.inf, "nothing"
            return abs(float(level - place @ unit)), "the surface of the liquid"
        case PressureField():
            return 0.0, "a pressure that may not be linear"
    return math.inf, "nothing"


def local_pressure(
    plate: Plate, mesh: Mesh, case: Case, kernel: kernels.Kernel
) -> tuple[float, tuple[float, float]]:
    """Pressure in Pa at a kernel's centre and its gradient in Pa/m; it is linear there.

    Where the centre is on a side, at which loads may end, or the kernel is a ring, it
    is looked at inside and continued.
    """
    back = np.zeros(2)
    if kernel.inward is not None:
        back = -0.5 * kernel.radius * kernel.inward
    elif kernel.inner:
        back = np.array([-0.5 * (kernel.inner + kernel.radius), 0.0])
    place = kernel.centre - back
    zone = int(mesh.zones[mesh.locate([place])[0][0]])
    total, gradient = 0.0, np.zeros(2)
    for load in case.loads:
        match load:
            case Pressure(value=value, zone=name):
                if name is None or mesh.zone_names[zone] == name:
                    total += value
            case SelfWeight(acceleration=acceleration):
                h, material = plate.sections[zone]
                total += (material.density or 0.0) * h * acceleration
            case Hydrostatic(level=level, specific_weight=weight, up=up):
                unit = np.asarray(up, dtype=float) / np.hypot(*up)
                depth = level - float(place @ unit)
                if depth > 0.0:
                    total += weight * depth
                    gradient = gradient - weight * unit
            case RectanglePatch(force=force, size=size):
                if _inside(place, np.asarray(load.corners)):
                    total += force / (size[0] * size[1])
            case DiscPatch(force=force, centre=centre, radius=radius):
                if np.hypot(*(place - centre)) < radius:
                    total += force / (math.pi * radius**2)
    total += float(gradient @ back)
    return total, (float(gradient[0]), float(gradient[1]))


def _inside(place: Floats, corners: Floats) -> bool:
    """Whether a place lies in a convex polygon run counter-clockwise or clockwise."""
    step = np.roll(corners, -1, axis=0) - corners
    arm = place - corners
    cross = step[:, 0] * arm[:, 1] - step[:, 1] * arm[:, 0]
    return bool((cross > 0.0).all() or (cross < 0.0).all())
