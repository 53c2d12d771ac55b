"""Lines and arcs of the entities of a DXF drawing, in its own unit.

Each function takes an entity and returns its pieces from end to end, seen from above;
an entity that is not parallel to the xy plane is refused. Arcs turn through half a
circle at most.
"""

import math
from collections.abc import Callable, Sequence
from itertools import pairwise
from typing import Any

import numpy as np

from kplate.chaining import Point
from kplate.errors import InputError
from kplate.fitting import Arc, as_arcs

# Directions are level to this, as unit vectors.
LEVEL = 1e-9
# Heights of a flat entity agree to this share of its size.
FLAT = 1e-6


def _side_up(entity: Any) -> float:
    """1 where an entity's own plane is seen from above, -1 where it is mirrored."""
    x, y, z = entity.dxf.get("extrusion", (0.0, 0.0, 1.0))
    if math.hypot(x, y) > LEVEL * abs(z):
        raise InputError(_NOT_FLAT)
    return math.copysign(1.0, z)


_NOT_FLAT = "it is not parallel to the xy plane; draw the panel flat."


def _check_level(heights: Any, points: Any) -> None:
    """Refuse points of different height."""
    heights, points = np.asarray(heights), np.asarray(points)
    if np.ptp(heights) > FLAT * max(float(np.ptp(points, axis=0).max()), 1e-300):
        raise InputError(_NOT_FLAT)


def _line(entity: Any) -> list[Arc]:
    start, end = entity.dxf.start, entity.dxf.end
    _check_level([start.z, end.z], [(start.x, start.y), (end.x, end.y)])
    return [((start.x, start.y), (end.x, end.y), 0.0)]


def _circle(entity: Any) -> list[Arc]:
    return _round(entity, 0.0, 360.0)


def _arc(entity: Any) -> list[Arc]:
    first = float(entity.dxf.start_angle)
    sweep = (float(entity.dxf.end_angle) - first) % 360.0
    return _round(entity, first, sweep or 360.0)


def _round(entity: Any, first: float, sweep: float) -> list[Arc]:
    """Arcs of no more than half a circle, from an angle over another, in degrees."""
    side, radius = _side_up(entity), abs(float(entity.dxf.radius))
    x, y = float(entity.dxf.center.x), float(entity.dxf.center.y)
    if radius == 0.0:
        return []
    parts = 2 if sweep > 180.0 else 1
    angles = [math.radians(first + sweep * k / parts) for k in range(parts + 1)]
    points = [
        (side * (x + radius * math.cos(a)), y + radius * math.sin(a)) for a in angles
    ]
    if sweep == 360.0:
        points[-1] = points[0]
    bulge = side * math.tan(math.radians(sweep) / parts / 4.0)
    return [(a, b, bulge) for a, b in pairwise(points)]


def _lwpolyline(entity: Any) -> list[Arc]:
    rows = [(x, y, b) for x, y, b in entity.get_points("xyb")]
    return _polyline_arcs(rows, _side_up(entity), closed=bool(entity.closed))


def is_line(entity: Any) -> bool:
    """Whether a POLYLINE is a line, not a mesh."""
    return bool(entity.is_2d_polyline or entity.is_3d_polyline)


def _polyline(entity: Any) -> list[Arc]:
    # Vertices with flag 16 only control a curve; the curve's own follow them.
    own = [v for v in entity.vertices if not v.dxf.flags & 16]
    places = [(float(v.dxf.location.x), float(v.dxf.location.y)) for v in own]
    _check_level([v.dxf.location.z for v in own], places)
    flat = bool(entity.is_2d_polyline)
    rows = [
        (x, y, float(v.dxf.get("bulge", 0.0)) if flat else 0.0)
        for (x, y), v in zip(places, own, strict=True)
    ]
    side = _side_up(entity) if flat else 1.0
    return _polyline_arcs(rows, side, closed=bool(entity.is_closed))


def _polyline_arcs(
    rows: Sequence[tuple[float, float, float]], side: float, *, closed: bool
) -> list[Arc]:
    """Pieces between vertices; vertices that are repeated are dropped."""
    arcs: list[Arc] = []
    last = len(rows) if closed else len(rows) - 1
    for i in range(last):
        (x, y, bulge), (u, v, _) = rows[i], rows[(i + 1) % len(rows)]
        if (x, y) != (u, v):
            arcs += _halved((side * x, y), (side * u, v), side * bulge)
    return arcs


def _halved(start: Point, end: Point, bulge: float) -> list[Arc]:
    """An arc of more than half a circle as two."""
    if abs(bulge) <= 1.0:
        return [(start, end, bulge)]
    # The top of an arc is half the bulge times the chord off the chord's middle, on
    # the right of an arc that turns to the left.
    x = 0.5 * (start[0] + end[0] + bulge * (end[1] - start[1]))
    y = 0.5 * (start[1] + end[1] - bulge * (end[0] - start[0]))
    half = math.tan(0.5 * math.atan(bulge))
    return [(start, (x, y), half), ((x, y), end, half)]


def _ellipse(entity: Any) -> list[Arc]:
    tool = entity.construction_tool()
    first = float(tool.start_param)
    sweep = (float(tool.end_param) - first) % (2.0 * math.pi) or 2.0 * math.pi
    parts = max(1, math.ceil(sweep / (0.5 * math.pi) - 1e-9))
    arcs = _from_curve(
        lambda t: list(tool.vertices(t)),
        lambda t: list(tool.tangents(t)),
        np.linspace(first, first + sweep, parts + 1),
    )
    return _closed(arcs) if math.isclose(sweep, 2.0 * math.pi) else arcs


def _spline(entity: Any) -> list[Arc]:
    tool = entity.construction_tool()
    # Outside these knots the curve is not defined by all its control points.
    first, last = tool.knots()[tool.degree], tool.knots()[tool.count]
    stops = np.unique([t for t in tool.knots() if first <= t <= last])

    def derivatives(t: Any) -> list[Any]:
        return [rows[1] for rows in tool.derivatives(t, n=1)]

    arcs = _from_curve(lambda t: list(tool.points(t)), derivatives, stops)
    return _closed(arcs) if entity.closed else arcs


def _from_curve(points: Any, tangents: Any, stops: Any) -> list[Arc]:
    """Arcs along one of ezdxf's curves, which must be level."""
    samples = points(np.linspace(stops[0], stops[-1], 65))
    _check_level([p.z for p in samples], [(p.x, p.y) for p in samples])
    return as_arcs(
        lambda t: (
            np.array([(p.x, p.y) for p in points(t)]),
            np.array([(p.x, p.y) for p in tangents(t)]),
        ),
        np.asarray(stops, dtype=float),
    )


def _closed(arcs: list[Arc]) -> list[Arc]:
    """End where the first arc starts, where round-off parts the two."""
    start = arcs[0][0]
    size = max(math.dist(start, end) for _, end, _ in arcs)
    if math.dist(arcs[-1][1], start) <= LEVEL * size:
        arcs[-1] = (arcs[-1][0], start, arcs[-1][2])
    return arcs


# What can bound a panel, by its kind.
TAKEN: dict[str, Callable[[Any], list[Arc]]] = {
    "LINE": _line,
    "ARC": _arc,
    "CIRCLE": _circle,
    "LWPOLYLINE": _lwpolyline,
    "POLYLINE": _polyline,
    "ELLIPSE": _ellipse,
    "SPLINE": _spline,
}
