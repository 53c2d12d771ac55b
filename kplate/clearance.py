"""How far around a round rim the plate is smooth: room for the ring of a kernel.

Smooth is a plate of one stiffness, with no side, seam or support, under a pressure that
is linear. All distances are from the centre of the rim's circle; the plate lies outside
the circle (a hole) or inside it (a disc).
"""

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from kplate.arrays import Bools, Floats, Ints
from kplate.errors import InputError
from kplate.loads import (
    Case,
    DiscPatch,
    EdgeMoment,
    Hydrostatic,
    LineForce,
    Load,
    PointForce,
    PointMoment,
    PressureField,
    RectanglePatch,
)
from kplate.mesh import STRAIGHT_EDGE, Mesh
from kplate.plate import Plate
from kplate.polygon import SNAP

# A ring narrower than this share of the rim's radius is no use.
NARROWEST = 0.3
COARSE = "the triangles at the rim leave no room for a ring around them"
# A rim is whole where its edges turn through a full circle but for this, in rad.
_WHOLE = 1e-6

# Nearest and farthest distance from a centre of something, and what it is.
Span = tuple[float, float, str]


@dataclass(frozen=True, eq=False, kw_only=True)
class RoundRim:
    """A free rim that is a whole circle.

    Parameters
    ----------
    circle : ndarray, shape (3,)
        Centre and radius in m.
    hole : bool
        Whether the plate lies outside the circle.
    edges : ndarray, shape (n_boundary,)
        Which boundary edges of the mesh belong to it.
    triangles : ndarray, shape (k,)
        The triangles at them.
    """

    circle: Floats
    hole: bool
    edges: Bools
    triangles: Ints


def round_rim(plate: Plate, mesh: Mesh, at: tuple[float, float]) -> RoundRim:
    """The free round rim on which a place lies.

    Parameters
    ----------
    plate : Plate
        The statement.
    mesh : Mesh
        Triangles over it.
    at : tuple of float
        The place in m.

    Returns
    -------
    RoundRim

    Raises
    ------
    InputError
        If it does not lie on one.
    """
    off = np.hypot(*(mesh.circles[:, :2] - at).T) - mesh.circles[:, 2]
    near = np.abs(off) <= SNAP * plate.outline.size
    here = f"({at[0]:g}, {at[1]:g}) m"
    for number in np.flatnonzero(near).tolist():
        circle = mesh.circles[number]
        alike = np.abs(mesh.circles - circle).max(axis=1) <= SNAP * plate.outline.size
        curved = mesh.boundary_circles != STRAIGHT_EDGE
        edges = curved & alike[mesh.boundary_circles]
        start, end = np.moveaxis(mesh.points[mesh.boundary_edges[edges]], 1, 0)
        a, b = start - circle[:2], end - circle[:2]
        turns = np.arctan2(
            a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0], np.einsum("kc,kc->k", a, b)
        )
        if abs(abs(float(turns.sum())) - 2.0 * math.pi) > _WHOLE:
            continue
        for side in np.unique(mesh.boundary_sides[edges]).tolist():
            name = mesh.side_names[side]
            if plate.support(name).holds:
                raise InputError(
                    f"{here} lies on a round rim of which side {name!r} is "
                    f"{plate.support(name).name}; ask for this where the whole rim is "
                    "free."
                )
        return RoundRim(
            circle=circle,
            hole=float(turns.sum()) < 0.0,
            edges=edges,
            triangles=mesh.triangles_at(mesh.boundary_edges[edges]),
        )
    raise InputError(
        f"{here} does not lie on a side that is a whole circle; ask for this on the "
        "rim of a round hole or disc."
    )


def ring_room(
    plate: Plate, mesh: Mesh, rim: RoundRim, cases: Sequence[Case], reach: float
) -> tuple[float, float, str]:
    """Radii of a ring around a rim, clear of its triangles and of all not smooth.

    Parameters
    ----------
    plate : Plate
        The statement.
    mesh : Mesh
        Triangles over it.
    rim : RoundRim
        Which rim.
    cases : sequence of Case
        The load cases.
    reach : float
        The ring keeps this share of the way to what is not smooth.

    Returns
    -------
    near, far : float
        Radii in m of the ring's edge next to the rim and of the other one.
    reason : str
        What leaves no room for it; empty where there is room.
    """
    names = {mesh.side_names[k] for k in np.unique(mesh.boundary_sides[rim.edges])}
    for case in cases:
        for load in case.loads:
            if isinstance(load, LineForce | EdgeMoment) and load.along in names:
                return math.nan, math.nan, f"a load acts along {load.along}"
    radius = float(rim.circle[2])
    close = SNAP * plate.outline.size
    own = _triangles(mesh, rim.triangles, rim.circle[:2])
    others = list(_spans(plate, mesh, rim, cases))
    if rim.hole:
        off = [(low, what) for low, high, what in others if high > radius - close]
        far, what = min(off)
        near, far = max(radius, own[1]), reach * far
    else:
        off = [(high, what) for low, high, what in others if low < radius + close]
        far, what = max(off, default=(0.0, "nothing"))
        near, far = min(radius, own[0]), far / reach
    outward = 1.0 if rim.hole else -1.0
    if outward * (far - radius) < NARROWEST * radius:
        return near, far, f"{what} leaves no room at the rim"
    if outward * (far - near) < NARROWEST * radius:
        return near, far, COARSE
    return near, far, ""


def zone_edges(mesh: Mesh) -> Ints:
    """Edges between triangles of different zones, (k, 2)."""
    low = np.full(len(mesh.edges), np.iinfo(np.int64).max)
    high = np.full(len(mesh.edges), -1)
    np.minimum.at(low, mesh.triangle_edges, mesh.zones[:, None])
    np.maximum.at(high, mesh.triangle_edges, mesh.zones[:, None])
    return mesh.edges[low != high]


def bearing(plate: Plate, mesh: Mesh, cases: Sequence[Case]) -> Bools:
    """Seam edges that are held or carry a force; nothing happens at the others."""
    loaded = {
        load.along
        for case in cases
        for load in case.loads
        if isinstance(load, LineForce)
    }
    bears = [name in loaded or plate.support(name).holds for name in mesh.seam_names]
    found: Bools = np.array(bears, dtype=bool)[mesh.seam_numbers]
    return found


def distances(place: Floats, start: Floats, end: Floats) -> Floats:
    """Distance from a place to segments, (k,)."""
    step = end - start
    share = np.einsum("kc,kc->k", place - start, step)
    share = np.clip(share / np.einsum("kc,kc->k", step, step), 0.0, 1.0)
    foot = start + share[:, None] * step
    away: Floats = np.hypot(*(foot - place).T)
    return away


def _spans(
    plate: Plate, mesh: Mesh, rim: RoundRim, cases: Sequence[Case]
) -> Iterator[Span]:
    """Everything at which the plate is not smooth, but for the rim."""
    centre = rim.circle[:2]
    curved = mesh.boundary_circles != STRAIGHT_EDGE
    lines = [
        (mesh.boundary_edges[~curved], "a side"),
        (mesh.seam_edges[bearing(plate, mesh, cases)], "a seam"),
        (zone_edges(mesh), "the edge of a zone"),
    ]
    for edges, what in lines:
        if len(edges):
            start, end = np.moveaxis(mesh.points[edges], 1, 0)
            yield *_segments(centre, start, end), what
    others = curved & ~rim.edges
    if others.any():
        edges = mesh.boundary_edges[others]
        low, high = _triangles(mesh, mesh.triangles_at(edges), centre)
        a, b = np.moveaxis(mesh.points[edges], 1, 0)
        radius = mesh.circles[mesh.boundary_circles[others], 2]
        half = 0.5 * np.hypot(*(b - a).T)
        rise = float((radius - np.sqrt(np.maximum(radius**2 - half**2, 0.0))).max())
        yield low - rise, high + rise, "a round side"
    for name, vertex in zip(mesh.mark_names, mesh.mark_vertices, strict=True):
        if plate.support(name).holds:
            yield _point(centre, mesh.points[vertex], f"the support {name}")
    for case in cases:
        for load in case.loads:
            yield from _of_load(load, centre)


def _of_load(load: Load, centre: Floats) -> Iterator[Span]:
    """Where a load is not linear."""
    match load:
        case PointForce(at=at) | PointMoment(at=at):
            yield _point(centre, at, "a point load")
        case RectanglePatch():
            corners = np.asarray(load.corners)
            ends = np.roll(corners, -1, axis=0)
            yield *_segments(centre, corners, ends), "the edge of a patch"
        case DiscPatch(centre=(x, y), radius=radius):
            yield *_circle(centre, x, y, radius), "the edge of a patch"
        case Hydrostatic(level=level, up=up):
            unit = np.asarray(up, dtype=float) / np.hypot(*up)
            off = abs(float(level - centre @ unit))
            yield off, math.inf, "the surface of the liquid"
        case PressureField():
            yield 0.0, math.inf, "a pressure that may not be linear"


def _point(centre: Floats, place: Any, what: str) -> Span:
    off = float(np.hypot(*(centre - place)))
    return off, off, what


def _circle(centre: Floats, x: float, y: float, radius: float) -> tuple[float, float]:
    """Nearest and farthest distance of a circle."""
    off = float(np.hypot(centre[0] - x, centre[1] - y))
    return abs(off - radius), off + radius


def _segments(centre: Floats, start: Floats, end: Floats) -> tuple[float, float]:
    """Nearest and farthest distance of some segments (k, 2)."""
    low = float(distances(centre, start, end).min())
    ends = np.concatenate([start, end]) - centre
    return low, float(np.hypot(*ends.T).max())


def _triangles(mesh: Mesh, own: Ints, centre: Floats) -> tuple[float, float]:
    """Nearest and farthest distance of some triangles (k,), round edges as chords."""
    corners = mesh.points[mesh.triangles[own]]
    ends = np.roll(corners, -1, axis=1)
    low, high = _segments(centre, corners.reshape(-1, 2), ends.reshape(-1, 2))
    turned = ends - corners
    arm = centre - corners
    left = turned[..., 0] * arm[..., 1] - turned[..., 1] * arm[..., 0]
    return (0.0 if (left > 0.0).all(axis=1).any() else low), high
