"""Load vectors: what loads bring to the unknowns, through the shape functions.

A pressure is integrated by the element's own rule, a patch over the parts of triangles
it covers, a line along edges, a point where it is. Triangles go through in blocks,
which bounds the memory.
"""

from collections.abc import Callable, Sequence
from typing import Protocol

import numpy as np

from kplate import cutting
from kplate.arrays import Floats, Ints
from kplate.dofs import Numbering, add_up
from kplate.elements.arcs import Arcs
from kplate.elements.triangle import Geometry
from kplate.errors import InputError
from kplate.loads import (
    DiscPatch,
    EdgeMoment,
    Hydrostatic,
    LineForce,
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
from kplate.quadrature import Rule, gauss, triangle_rule
from kplate.sampling import Sampled, sampled

BLOCK = 1024  # triangles
# Share of a patch that may be missing, as round-off, before it is off the plate.
MISSING = 1e-9
FIELD_DEGREE = 12  # of the rule that looks for it in a stated function
FIELD_RULE = triangle_rule(FIELD_DEGREE)
_SLICES = 24  # of a triangle with a round edge that the edge of a load may cut


class Shape(Protocol):
    """What loads ask of an element or a dual; `elements.Element` says what it is."""

    @property
    def load_rule(self) -> Rule:
        """Quadrature of loads."""

    @property
    def pieces(self) -> Floats:
        """Pieces on which w is one polynomial."""

    @property
    def load(self) -> Callable[[Geometry, Floats], Floats]:
        """Consistent loads of a pressure."""

    @property
    def evaluate(self) -> Callable[[Floats, Floats, Arcs | None], Floats]:
        """Rows of w and slopes."""

    @property
    def round_rule(self) -> Callable[[Arcs], tuple[Floats, Floats]]:
        """Quadrature of triangles with round edges."""

    @property
    def arc_loads(self) -> Callable[[Arcs, Floats, Floats], Floats]:
        """Consistent loads of forces and moments along round edges."""


def load_vector(
    plate: Plate, element: Shape, numbering: Numbering, loads: Sequence[Load]
) -> Floats:
    """Consistent forces on all unknowns, (count,).

    Raises
    ------
    InputError
        If a patch or point force is not on the plate, a self-weight has no density, or
        a pressure function does not return finite numbers of the right shape.
    """
    forces = np.zeros((numbering.count, 1))
    for load in loads:
        match load:
            case RectanglePatch() | DiscPatch():
                _add_patch(forces, element, numbering, load)
            case PointForce() | PointMoment():
                _add_point(forces, element, numbering, load)
            case LineForce() | EdgeMoment():
                _add_line(forces, element, numbering, load)
            case _:
                _add_pressure(forces, element, numbering, plate, load)
    return forces[:, 0]


def _add_pressure(
    forces: Floats, element: Shape, numbering: Numbering, plate: Plate, load: Load
) -> None:
    mesh = numbering.mesh
    rule = element.load_rule
    chosen = np.arange(len(mesh.triangles))
    if isinstance(load, Pressure) and load.zone is not None:
        chosen = _zone_triangles(mesh, load.zone)
    if isinstance(load, Hydrostatic):
        chosen = _add_waterline(forces, element, numbering, load)
    if isinstance(load, PressureField):
        chosen = _add_rough(forces, element, numbering, load)
    for start in range(0, len(chosen), BLOCK):
        block = chosen[start : start + BLOCK]
        vertices = mesh.points[mesh.triangles[block]]
        points = rule.points @ vertices
        pressure = _pressure(load, plate, points, mesh.zones[block])
        own = element.load(Geometry(vertices=vertices, rule=rule), pressure)
        arcs = numbering.arcs.among(block)
        if len(arcs):
            points, weights = element.round_rule(arcs)
            alone = arcs.alone()
            rows = element.evaluate(arcs.vertices, points, alone)[:, :, 0]
            zones = mesh.zones[block[arcs.rows]]
            pressure = _pressure(load, plate, points @ arcs.vertices, zones)
            own[arcs.rows] = np.einsum("mq,mqd->md", pressure * weights, rows)
        add_up(forces, numbering.table[block], own[..., None])


def _pressure(load: Load, plate: Plate, points: Floats, zones: Ints) -> Floats:
    """Pressure in Pa at points (n, q, 2) of triangles in these zones (n,)."""
    match load:
        case Pressure(value=value):
            return np.full(points.shape[:-1], value)
        case SelfWeight(acceleration=acceleration):
            weights = np.array([_mass_per_area(plate, k) for k in np.unique(zones)])
            own = weights[np.searchsorted(np.unique(zones), zones)] * acceleration
            return np.broadcast_to(own[:, None], points.shape[:-1])
        case Hydrostatic():
            depth = depth_at(load, points)
            return np.where(depth > 0.0, load.specific_weight * depth, 0.0)
        case PressureField():
            return function_at(load, points)
    raise AssertionError(load)


def _mass_per_area(plate: Plate, section: int) -> float:
    """Mass per area in kg/m2 of a section."""
    h, material = plate.sections[section]
    if material.density is None:
        raise InputError(
            f"material {material.name!r} states no density; a self-weight needs one."
        )
    return material.density * h


def _zone_triangles(mesh: Mesh, zone: str) -> Ints:
    """Triangles of a zone that a load names."""
    if zone not in mesh.zone_names:
        raise InputError(
            f"a pressure acts on zone {zone!r}; the zones are "
            f"{', '.join(mesh.zone_names[1:]) or 'none'}."
        )
    return np.flatnonzero(mesh.zones == mesh.zone_names.index(zone))


def function_at(load: PressureField, points: Floats) -> Floats:
    """Pressure of a user's function at points (..., 2), checked."""
    value = load.function(points[..., 0], points[..., 1])
    result = np.asarray(value, dtype=float)
    if result.shape not in ((), points.shape[:-1]):
        raise InputError(
            f"a pressure function returned shape {result.shape} for points of shape "
            f"{points.shape[:-1]}; it must return one pressure a point."
        )
    result = np.broadcast_to(result, points.shape[:-1])
    bad = ~np.isfinite(result)
    if bad.any():
        x, y = points[bad][0]
        raise InputError(
            f"a pressure function returned {result[bad][0]} at ({x:.6g}, {y:.6g}) m; "
            "it must be finite all over the plate."
        )
    return result


def pieces_sampled(
    numbering: Numbering, element: Shape, load: PressureField
) -> tuple[Sampled, Ints]:
    """Where a stated pressure is not smooth, and the triangles of the owners."""
    pieces, owner = _pieces(numbering, element)
    return sampled(lambda points: function_at(load, points), pieces), owner


def _add_rough(
    forces: Floats, element: Shape, numbering: Numbering, load: PressureField
) -> Ints:
    """Add the triangles in which a stated pressure jumps; return the others."""
    mesh = numbering.mesh
    known, owner = pieces_sampled(numbering, element, load)
    chosen = np.ones(len(mesh.triangles), dtype=bool)
    if len(known.pieces):
        chosen[owner[known.owners]] = False
        whole, of = _pieces(numbering, element, np.flatnonzero(~chosen))
        smooth = ~np.isin(np.flatnonzero(np.isin(owner, of)), known.owners)
        pieces = np.concatenate([known.pieces, whole[smooth]])
        triangles = np.concatenate([owner[known.owners], of[smooth]])
        parts = cutting.Parts(
            triangles=triangles,
            points=FIELD_RULE.points @ pieces,
            weights=piece_areas(pieces)[:, None] * FIELD_RULE.weights,
        )
        everything = np.arange(len(mesh.triangles))
        _add_parts(
            forces,
            element,
            numbering,
            parts,
            everything,
            lambda points: function_at(load, points),
        )
    return np.flatnonzero(chosen)


def piece_areas(pieces: Floats) -> Floats:
    """Areas in m2 of triangles (n, 3, 2)."""
    a, b = np.moveaxis(pieces[:, 1:] - pieces[:, :1], 1, 0)
    areas: Floats = 0.5 * np.abs(a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0])
    return areas


def depth_at(load: Hydrostatic, points: Floats) -> Floats:
    """Depth in m below the liquid's surface."""
    up = np.asarray(load.up, dtype=float)
    return load.level - points @ (up / np.hypot(*up))


def _add_waterline(
    forces: Floats, element: Shape, numbering: Numbering, load: Hydrostatic
) -> Ints:
    """Add the triangles that the liquid's surface cuts; return those wholly wet."""
    mesh = numbering.mesh
    depth = depth_at(load, mesh.points[mesh.triangles])
    cut = np.flatnonzero((depth.min(axis=1) < 0.0) & (depth.max(axis=1) > 0.0))
    if cut.size:
        up = np.asarray(load.up, dtype=float)
        up /= np.hypot(*up)
        along = np.array([-up[1], up[0]])
        reach = 2.0 * float(np.abs(mesh.points).max() + abs(load.level))
        corners = [
            load.level * up - reach * along,
            load.level * up - reach * along - 2.0 * reach * up,
            load.level * up + reach * along - 2.0 * reach * up,
            load.level * up + reach * along,
        ]

        def pressure(points: Floats) -> Floats:
            return load.specific_weight * depth_at(load, points)

        pieces, owner = _pieces(numbering, element, cut)
        for parts in cutting.inside_polygon(pieces, corners):
            _add_parts(forces, element, numbering, parts, owner, pressure)
    return np.flatnonzero(depth.min(axis=1) >= 0.0)


def _add_patch(
    forces: Floats,
    element: Shape,
    numbering: Numbering,
    load: RectanglePatch | DiscPatch,
) -> None:
    pieces, owner = _pieces(numbering, element)
    if isinstance(load, RectanglePatch):
        groups = cutting.inside_polygon(pieces, load.corners)
        area = load.size[0] * load.size[1]
    else:
        groups = cutting.inside_disc(pieces, load.centre, load.radius)
        area = np.pi * load.radius**2

    def pressure(points: Floats) -> Floats:
        return np.full(points.shape[:-1], load.force / area)

    cut = (groups, pieces, owner)
    whole, missed = _add_round(forces, element, numbering, pressure, cut)
    covered = sum(float(parts.weights.sum()) for parts in groups) + missed
    if covered < (1.0 - MISSING) * area:
        x, y = load.centre
        raise InputError(
            f"only {100.0 * covered / area:.4g} % of the patch at ({x:.6g}, {y:.6g}) m "
            "lies on the plate; move or shrink it until it does not reach over an edge "
            "or a hole."
        )
    for parts in groups:
        kept = ~np.isin(owner[parts.triangles], whole)
        some = cutting.Parts(
            triangles=parts.triangles[kept],
            points=parts.points[kept],
            weights=parts.weights[kept],
        )
        _add_parts(forces, element, numbering, some, owner, pressure)


def _add_round(
    forces: Floats,
    element: Shape,
    numbering: Numbering,
    pressure: Callable[[Floats], Floats],
    cut: tuple[Sequence[cutting.Parts], Floats, Ints],
) -> tuple[Ints, float]:
    """Add a pressure on triangles with a round edge all of whose slices it covers.

    Returns these triangles, and by how much in m2 they are more than their slices.
    """
    arcs, (groups, pieces, owner) = numbering.arcs, cut
    if not len(arcs):
        return np.empty(0, dtype=np.int64), 0.0
    count = len(numbering.mesh.triangles)
    covered = np.zeros(count)
    for parts in groups:
        np.add.at(covered, owner[parts.triangles], parts.weights.sum(axis=1))
    size = np.bincount(owner, piece_areas(pieces), minlength=count)
    full = covered[arcs.rows] > (1.0 - MISSING) * size[arcs.rows]
    own = arcs.chosen(full)
    points, weights = element.round_rule(own)
    rows = element.evaluate(own.vertices, points, own.alone())[:, :, 0]
    found = np.einsum("mq,mqd->md", pressure(points @ own.vertices) * weights, rows)
    add_up(forces, numbering.table[own.rows], found[..., None])
    return own.rows, float(weights.sum() - size[own.rows].sum())


def _pieces(
    numbering: Numbering, element: Shape, triangles: Ints | None = None
) -> tuple[Floats, Ints]:
    """Pieces on which w is one polynomial, (m, 3, 2), and their triangles, (m,).

    A triangle with a round edge is cut into thin ones about its apex.
    """
    mesh = numbering.mesh
    chosen = np.arange(len(mesh.triangles)) if triangles is None else triangles
    arcs = numbering.arcs.among(chosen)
    straight = np.delete(chosen, arcs.rows)
    corners = mesh.points[mesh.triangles[straight]]
    pieces = np.einsum("skv,nvc->nskc", element.pieces, corners).reshape(-1, 3, 2)
    owner = np.repeat(straight, len(element.pieces))
    if len(arcs):
        along, _, _ = arcs.at(np.linspace(0.0, 1.0, _SLICES + 1))
        apex = np.broadcast_to(arcs.corners[0][:, None], along[:, 1:].shape)
        thin = np.stack([apex, along[:, :-1], along[:, 1:]], axis=2)
        pieces = np.concatenate([pieces, thin.reshape(-1, 3, 2)])
        owner = np.concatenate([owner, np.repeat(chosen[arcs.rows], _SLICES)])
    return pieces, owner


def _add_parts(
    forces: Floats,
    element: Shape,
    numbering: Numbering,
    parts: cutting.Parts,
    owner: Ints,
    pressure: object,
) -> None:
    """Add a pressure over parts of triangles."""
    assert callable(pressure)
    q = parts.points.shape[1]
    step = max(1, 8 * BLOCK // q)
    for start in range(0, len(parts.triangles), step):
        block = slice(start, start + step)
        triangles = owner[parts.triangles[block]]
        points = parts.points[block]
        rows = deflection_rows(numbering, element, triangles, points)
        weighted = pressure(points) * parts.weights[block]
        own = np.einsum("nq,nqd->nd", weighted, rows)
        add_up(forces, numbering.table[triangles], own[..., None])


def deflection_rows(
    numbering: Numbering, element: Shape, triangles: Ints, points: Floats
) -> Floats:
    """Rows of w at points (n, q, 2) of triangles (n,), (n, q, d)."""
    mesh, (n, q) = numbering.mesh, points.shape[:2]
    flat = mesh.barycentrics(np.repeat(triangles, q), points.reshape(-1, 2))
    return element.evaluate(
        mesh.points[mesh.triangles[triangles]],
        flat.reshape(n, q, 3),
        numbering.arcs.among(triangles),
    )[:, :, 0]


def _add_point(
    forces: Floats,
    element: Shape,
    numbering: Numbering,
    load: PointForce | PointMoment,
) -> None:
    mesh = numbering.mesh
    what = (
        f"a point force of {load.force:g} N"
        if isinstance(load, PointForce)
        else f"a couple of ({load.moment[0]:g}, {load.moment[1]:g}) N m"
    )
    try:
        triangle, barycentrics = mesh.locate([load.at])
    except InputError as error:
        raise InputError(f"{what}: {error}") from error
    if not mesh.covers([load.at])[0]:
        raise InputError(
            f"{what}: point ({load.at[0]:.6g}, {load.at[1]:.6g}) m is not on the "
            "plate; it lies in a hole."
        )
    rows = element.evaluate(
        mesh.points[mesh.triangles[triangle]],
        barycentrics[:, None],
        numbering.arcs.among(triangle),
    )
    if isinstance(load, PointForce):
        own = load.force * rows[:, 0, 0]
    else:
        # A couple about x turns the plate by dw/dy, one about y by -dw/dx.
        own = load.moment[0] * rows[:, 0, 2] - load.moment[1] * rows[:, 0, 1]
    add_up(forces, numbering.table[triangle], own[..., None])


def _add_line(
    forces: Floats,
    element: Shape,
    numbering: Numbering,
    load: LineForce | EdgeMoment,
) -> None:
    """Add a force or a moment along the edges of a side or a seam."""
    mesh = numbering.mesh
    seam = isinstance(load, LineForce) and load.along in mesh.seam_names
    if seam:
        edges = mesh.seam_edges[mesh.seam_numbers == mesh.seam_names.index(load.along)]
        stretch = np.ones(len(edges))
    elif load.along in mesh.side_names:
        own = np.flatnonzero(mesh.boundary_sides == mesh.side_names.index(load.along))
        if len(numbering.arcs):
            add_along_arcs(forces, element, numbering, load)
            own = own[mesh.boundary_circles[own] == STRAIGHT_EDGE]
        edges, stretch = mesh.boundary_edges[own], mesh.boundary_stretch[own]
    else:
        names = [*mesh.side_names, *(mesh.seam_names if not seam else ())]
        raise InputError(
            f"a load acts along {load.along!r}; the sides and seams are "
            f"{', '.join(names)}."
        )
    share, weights = gauss(3)
    start, end = np.moveaxis(mesh.points[edges], 1, 0)
    step = end - start
    lengths = np.hypot(*step.T)
    triangles = mesh.triangles_at(edges)
    points = start[:, None] + share[:, None] * step[:, None]
    flat = mesh.barycentrics(
        np.repeat(triangles, len(share)), points.reshape(-1, 2)
    ).reshape(len(edges), len(share), 3)
    rows = element.evaluate(
        mesh.points[mesh.triangles[triangles]], flat, numbering.arcs.among(triangles)
    )
    amount = (lengths * stretch)[:, None] * weights
    if isinstance(load, LineForce):
        own_forces = load.force * np.einsum("eq,eqd->ed", amount, rows[:, :, 0])
    else:
        normal = np.column_stack([step[:, 1], -step[:, 0]]) / lengths[:, None]
        turning = np.einsum("ec,eqcd->eqd", normal, rows[:, :, 1:])
        own_forces = load.moment * np.einsum("eq,eqd->ed", amount, turning)
    add_up(forces, numbering.table[triangles], own_forces[..., None])


def add_along_arcs(
    forces: Floats,
    element: Shape,
    numbering: Numbering,
    load: LineForce | EdgeMoment,
) -> None:
    """Add a force or a moment along the round edges of a side to forces (count, 1)."""
    mesh, arcs = numbering.mesh, numbering.arcs
    side = mesh.boundary_sides == mesh.side_names.index(load.along)
    edges = mesh.boundary_edges[side & (mesh.boundary_circles != STRAIGHT_EDGE)]
    triangles = mesh.triangles_at(edges)
    own = arcs.among(triangles)
    force = load.force if isinstance(load, LineForce) else 0.0
    moment = load.moment if isinstance(load, EdgeMoment) else 0.0
    ones = np.ones(len(own))
    found = element.arc_loads(own, force * ones, moment * ones)
    add_up(forces, numbering.table[triangles[own.rows]], found[..., None])
