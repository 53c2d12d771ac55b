"""Triangles cut by a rectangle or a disc: quadrature over the part inside.

What is left of a triangle is parted into straight triangles and cones over circular
arcs, on which polynomials are integrated to round-off. Results come as groups: for each
of m parts the triangle it belongs to, q points (m, q, 2) and weights (m, q) in m2.
"""

import math
from dataclasses import dataclass
from typing import Any

import numpy as np

from kplate.arrays import Floats, Ints
from kplate.quadrature import gauss, triangle_rule

_RULE = triangle_rule(5)
# Points along an arc of at most a right angle; a quartic in x, y is a polynomial of
# degree four in sine and cosine there, which 14 points integrate to round-off.
_ARC_POINTS = 14
# An arc that runs back by less (rad) is round-off where two edges meet. The shortest
# chord in double precision, of an edge all but touching the circle, takes 3e-8 from it.
ROUND_OFF = 1e-8


@dataclass(frozen=True, eq=False, kw_only=True)
class Parts:
    """Quadrature over parts of triangles.

    Parameters
    ----------
    triangles : ndarray, shape (m,)
        Number of the triangle each part lies in.
    points : ndarray, shape (m, q, 2)
        Points in m.
    weights : ndarray, shape (m, q)
        Weights in m2.
    """

    triangles: Ints
    points: Floats
    weights: Floats


def inside_polygon(vertices: Floats, corners: Any) -> list[Parts]:
    """Parts of triangles (n, 3, 2) inside a convex polygon of these corners (k, 2)."""
    import shapely

    corners = np.asarray(corners, dtype=float)
    near = _boxes_meet(vertices, corners.min(axis=0), corners.max(axis=0))
    shapes = shapely.intersection(
        shapely.polygons(vertices[near]), shapely.Polygon(corners)
    )
    shapes, owner = shapely.get_parts(shapes, return_index=True)
    solid = shapely.area(shapes) > 0.0
    rings = shapely.get_exterior_ring(shapes[solid])
    owner = near[owner[solid]]
    xy, ring = shapely.get_coordinates(rings, return_index=True)
    first = np.searchsorted(ring, np.arange(len(rings)))
    i = np.arange(len(xy) - 2)
    # Fans of a convex ring: its first point with each piece that does not touch it.
    i = i[(ring[i] == ring[i + 2]) & (i != first[ring[i]])]
    fan = np.stack([xy[first[ring[i]]], xy[i], xy[i + 1]], axis=1)
    return [_straight(owner[ring[i]], fan)]


def inside_disc(
    vertices: Floats, centre: tuple[float, float], radius: float
) -> list[Parts]:
    """Parts of triangles (n, 3, 2) inside a disc."""
    middle = np.asarray(centre, dtype=float)
    near = _boxes_meet(vertices, middle - radius, middle + radius)
    reach = np.hypot(*np.moveaxis(vertices[near] - middle, -1, 0))
    whole = (reach <= radius).all(axis=1)
    parts = [_straight(near[whole], vertices[near[whole]])]
    straight: list[tuple[int, Floats]] = []
    curved: list[tuple[int, Floats]] = []
    for k in near[~whole]:
        segments, arcs = _boundary(vertices[k], middle, radius)
        if not segments and not arcs:
            continue
        apex = _apex(segments, arcs, middle, radius)
        straight += [(int(k), np.array([apex, a, b])) for a, b in segments]
        curved += [(int(k), np.array([*apex, a, b])) for a, b in arcs]
    if straight:
        owner, corners = zip(*straight, strict=True)
        parts.append(_straight(np.array(owner), np.array(corners)))
    if curved:
        owner, cones = zip(*curved, strict=True)
        parts.append(_cones(np.array(owner), np.array(cones), middle, radius))
    return parts


def _straight(triangles: Ints, corners: Floats) -> Parts:
    """Rule on straight triangles (m, 3, 2)."""
    u, v = corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]
    areas = 0.5 * np.abs(u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0])
    points = np.einsum("qv,mvc->mqc", _RULE.points, corners)
    return Parts(
        triangles=triangles, points=points, weights=areas[:, None] * _RULE.weights
    )


def _cones(triangles: Ints, cones: Floats, middle: Floats, radius: float) -> Parts:
    """Rule on cones (m, 4) of apex x, y and the arc from angle a to angle b.

    A point is ``apex + t (arc(s) - apex)``; its area element is t times the cross
    product of the arm and the tangent.
    """
    t, wt = gauss(4)
    s, ws = gauss(_ARC_POINTS)
    apex, start, opening = cones[:, :2], cones[:, 2], cones[:, 3] - cones[:, 2]
    angle = start[:, None] + opening[:, None] * s
    direction = np.stack([np.cos(angle), np.sin(angle)], axis=-1)  # (m, s, 2)
    arm = middle + radius * direction - apex[:, None]
    # Tangent radius (-sin, cos); crossed with the arm that is radius (arm . direction).
    element = radius * opening[:, None] * np.einsum("msc,msc->ms", arm, direction)
    points = apex[:, None, None] + t[:, None, None] * arm[:, None]
    weights = (t * wt)[:, None] * (element * ws)[:, None]
    m = len(cones)
    return Parts(
        triangles=triangles,
        points=points.reshape(m, -1, 2),
        weights=weights.reshape(m, -1),
    )


def _boundary(
    corners: Floats, middle: Floats, radius: float
) -> tuple[list[tuple[Floats, Floats]], list[tuple[float, float]]]:
    """Segments and arcs around the part of one triangle inside a disc."""
    segments = []
    for i in range(3):
        a, b = corners[i], corners[(i + 1) % 3]
        span = _within(a - middle, b - a, radius)
        if span is not None:
            # The vertex itself where it reaches it: the next one starts from there.
            end = b if span[1] == 1.0 else a + span[1] * (b - a)
            segments.append((a + span[0] * (b - a), end))
    if not segments:
        return [], _arcs(0.0, 2.0 * math.pi) if _holds(corners, middle) else []
    arcs: list[tuple[float, float]] = []
    for k, (_, end) in enumerate(segments):
        start = segments[(k + 1) % len(segments)][0]
        a, b = (math.atan2(*(point - middle)[::-1]) for point in (end, start))
        opening = (b - a + ROUND_OFF) % (2.0 * math.pi) - ROUND_OFF
        if opening != 0.0:
            arcs += _arcs(a, a + opening)
    return segments, arcs


def _within(start: Floats, step: Floats, radius: float) -> tuple[float, float] | None:
    """Span of t in [0, 1] for which start + t step is inside the circle."""
    length = math.hypot(*step)
    off = abs(float(start[0] * step[1] - start[1] * step[0])) / length
    if off >= radius:
        return None
    foot = -float(start @ step) / length
    half = math.sqrt((radius - off) * (radius + off))
    low, high = max((foot - half) / length, 0.0), min((foot + half) / length, 1.0)
    return (low, high) if high > low else None


def _arcs(start: float, end: float) -> list[tuple[float, float]]:
    """An arc in parts of at most a right angle."""
    n = max(1, math.ceil((end - start) / (0.5 * math.pi) - 1e-12))
    ends = np.linspace(start, end, n + 1)
    return list(zip(ends[:-1].tolist(), ends[1:].tolist(), strict=True))


def _apex(segments: Any, arcs: Any, middle: Floats, radius: float) -> Floats:
    """A point inside the convex part: the mean of the ends of its boundary pieces."""
    ends = [np.mean(pair, axis=0) for pair in segments]
    for a, b in arcs:
        ends += [middle + radius * np.array([math.cos(t), math.sin(t)]) for t in (a, b)]
    return np.mean(ends, axis=0)


def _holds(corners: Floats, point: Floats) -> bool:
    """Whether a counter-clockwise triangle holds a point."""
    edge = np.roll(corners, -1, axis=0) - corners
    arm = point - corners
    return bool((edge[:, 0] * arm[:, 1] - edge[:, 1] * arm[:, 0] > 0.0).all())


def _boxes_meet(vertices: Floats, low: Floats, high: Floats) -> Ints:
    """Numbers of the triangles whose boxes meet a box."""
    apart = (vertices.max(axis=1) < low) | (vertices.min(axis=1) > high)
    return np.flatnonzero(~apart.any(axis=1))
