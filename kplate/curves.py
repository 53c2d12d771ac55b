"""Straight pieces and circular arcs between two points.

A piece runs from a start to an end. Its *bulge* is the tangent of a quarter of the
angle it turns through: 0 is straight, positive turns to the left, 1 is a half circle.
The bulge is how drawings store arcs, has no special case on the way to a straight line,
and a part of an arc has the tangent of that part of the angle.

Arrays: n pieces, starts and ends (n, 2) in m, bulges (n,).
"""

import math

import numpy as np

from kplate.arrays import Floats, Ints

# Chords that stand for arcs in checks of crossing and distance turn by this (rad), the
# square root of it on shallow arcs: they stay within 1e-6 of the radius and the length.
FLAT_STEP = math.sqrt(8e-6)
# Pairs of arcs in each quarter of an ellipse.
ELLIPSE_PARTS = 12
_AXES = np.array([(1.0, 0.0), (0.0, 1.0), (-1.0, 0.0), (0.0, -1.0)])


def sweeps(bulges: Floats) -> Floats:
    """Angle each piece turns through in rad, positive to the left."""
    return 4.0 * np.arctan(bulges)


def chords(starts: Floats, ends: Floats) -> Floats:
    """Distance from start to end in m."""
    distance: Floats = np.hypot(*(ends - starts).T)
    return distance


def lengths(starts: Floats, ends: Floats, bulges: Floats) -> Floats:
    """Length along each piece in m."""
    half = 0.5 * np.abs(sweeps(bulges))
    return chords(starts, ends) / np.sinc(half / np.pi)


def circles(starts: Floats, ends: Floats, bulges: Floats) -> Floats:
    """Centre x, centre y and radius in m of each piece, nan where straight, (n, 3)."""
    bent = np.where(bulges == 0.0, np.nan, bulges)
    step = ends - starts
    left = np.column_stack([-step[:, 1], step[:, 0]])
    to_centre = (1.0 - bent**2) / (4.0 * bent)
    centre = 0.5 * (starts + ends) + to_centre[:, None] * left
    radius = chords(starts, ends) * (1.0 + bent**2) / (4.0 * np.abs(bent))
    return np.column_stack([centre, radius])


def tangents(starts: Floats, ends: Floats, bulges: Floats) -> tuple[Floats, Floats]:
    """Unit tangents at the start and at the end of each piece, both (n, 2)."""
    half = 0.5 * sweeps(bulges)
    return _turned(ends - starts, -half), _turned(ends - starts, half)


def points_at(starts: Floats, ends: Floats, bulges: Floats, share: Floats) -> Floats:
    """Points after a share (n,) of the length of each piece, (n, 2)."""
    half = 0.5 * sweeps(bulges)
    # The chord to the point is to the whole chord as the sines of half their angles.
    ratio = share * np.sinc(half * share / np.pi) / np.sinc(half / np.pi)
    direction = _turned(ends - starts, half * (share - 1.0))
    return starts + (ratio * chords(starts, ends))[:, None] * direction


def part(bulge: float, share: float) -> float:
    """Bulge of a share of a piece."""
    return math.tan(math.atan(bulge) * share)


def outermost(starts: Floats, ends: Floats, bulges: Floats) -> Floats:
    """Points of pieces that may lie outermost along x or y, (k, 2)."""
    found = [starts]
    bent = np.flatnonzero(bulges)
    for i, (x, y, radius) in zip(
        bent, circles(starts, ends, bulges)[bent], strict=True
    ):
        on_axes = (x, y) + radius * _AXES
        angle, sweep = _angle_along(on_axes, starts[i], ends[i], float(bulges[i]))
        found.append(on_axes[angle <= sweep])
    return np.concatenate(found)


def slivers(starts: Floats, ends: Floats, bulges: Floats) -> Floats:
    """Area in m2 between each piece and its chord, positive on the chord's right."""
    angle = sweeps(bulges)
    radius = np.nan_to_num(circles(starts, ends, bulges)[:, 2])
    return 0.5 * radius**2 * (angle - np.sin(angle))


def flattened(
    starts: Floats, ends: Floats, bulges: Floats, step: float | None = None
) -> tuple[Floats, Ints]:
    """Points along a run of pieces, chords for arcs, without the last end.

    Parameters
    ----------
    starts, ends, bulges : ndarray
        The pieces.
    step : float, optional
        Largest turn in rad from chord to chord; if left out, chords are within 1e-6 of
        the radius and of the length of each arc.

    Returns
    -------
    points : ndarray, shape (k, 2)
        The start of each piece and points between.
    owners : ndarray, shape (k,)
        The piece each point begins or lies on.
    """
    turn = np.abs(sweeps(bulges))
    if step is None:
        turn, step = np.maximum(turn, np.sqrt(turn)), FLAT_STEP
    counts = np.maximum(1, np.ceil(turn / step).astype(int))
    owners = np.repeat(np.arange(len(bulges)), counts)
    first = np.repeat(np.cumsum(counts) - counts, counts)
    share = (np.arange(len(owners)) - first) / counts[owners]
    points = points_at(starts[owners], ends[owners], bulges[owners], share)
    return points, owners


def distances(points: Floats, starts: Floats, ends: Floats, bulges: Floats) -> Floats:
    """Distance in m from points (k, 2) to each piece, (k, n)."""
    result = np.empty((len(points), len(bulges)))
    for i, bulge in enumerate(bulges):
        a, b = starts[i], ends[i]
        if bulge == 0.0:
            step = b - a
            share = np.clip((points - a) @ step / (step @ step), 0.0, 1.0)
            near = a + share[:, None] * step
            result[:, i] = np.hypot(*(points - near).T)
        else:
            result[:, i] = _arc_distance(points, a, b, float(bulge))
    return result


def nearest_share(point: Floats, start: Floats, end: Floats, bulge: float) -> float:
    """Share of a piece's length at its point nearest to a given one."""
    if bulge == 0.0:
        step = end - start
        return float(np.clip((point - start) @ step / (step @ step), 0.0, 1.0))
    angle, sweep = _angle_along(point[None], start, end, bulge)
    # Beyond both ends the nearer one is nearest.
    over = angle[0] - sweep
    if over <= 0.0:
        return float(angle[0] / sweep)
    return 1.0 if over < 2.0 * math.pi - angle[0] else 0.0


def through(start: Floats, middle: Floats, end: Floats) -> float:
    """Bulge of the arc from start through a point to the end.

    Returns
    -------
    float
        0 where the three lie on a line.
    """
    u, v = np.subtract(middle, start), np.subtract(end, middle)
    turn = math.atan2(u[0] * v[1] - u[1] * v[0], float(np.dot(u, v)))
    # The angle between the two chords is half the sweep.
    return math.tan(0.5 * turn)


def biarc(
    start: Floats, end: Floats, out: Floats, into: Floats
) -> list[tuple[Floats, float]]:
    """Two arcs with given unit tangents at start and end, one tangent where they meet.

    Returns
    -------
    list of (ndarray, float)
        Start and bulge of both.

    Notes
    -----
    The arcs have equal tangent lengths. Source: K. M. Bolton, "Biarc curves",
    Computer-Aided Design 7 (1975) 89-92 (from memory).
    """
    v, t = end - start, out + into
    a, b, c = 2.0 * (1.0 - float(out @ into)), 2.0 * float(v @ t), -float(v @ v)
    # The root that stays finite as the tangents turn parallel (a to 0).
    d = -2.0 * c / (b + math.sqrt(b * b - 4.0 * a * c))
    joint = 0.5 * (start + end + d * (out - into))
    return [
        (start, _bulge_from(out, joint - start)),
        (joint, -_bulge_from(-into, joint - end)),
    ]


def ellipse(axes: tuple[float, float]) -> tuple[Floats, Floats]:
    """Ellipse about the origin as arcs with one tangent where they meet.

    Parameters
    ----------
    axes : tuple of float
        Half axes along x and y in m.

    Returns
    -------
    points : ndarray, shape (n, 2)
        Starts of the arcs, counter-clockwise from the end of the x axis.
    bulges : ndarray, shape (n,)
        Their bulges. No point of an arc is off the ellipse by more than 1e-4 of the
        larger half axis, up to an aspect ratio of five.
    """
    a, b = axes
    angle = np.linspace(0.0, 2.0 * np.pi, 4 * ELLIPSE_PARTS + 1)[:-1]
    points = np.column_stack([a * np.cos(angle), b * np.sin(angle)])
    out = np.column_stack([-a * np.sin(angle), b * np.cos(angle)])
    out /= np.hypot(*out.T)[:, None]
    arcs = []
    for i in range(len(points)):
        j = (i + 1) % len(points)
        arcs += biarc(points[i], points[j], out[i], out[j])
    return np.array([p for p, _ in arcs]), np.array([bulge for _, bulge in arcs])


def _turned(vectors: Floats, angles: Floats) -> Floats:
    """Unit vectors along (n, 2), turned to the left by angles (n,); 0 for no length."""
    length = np.hypot(*vectors.T)
    unit = vectors / np.where(length > 0.0, length, 1.0)[:, None]
    c, s = np.cos(angles), np.sin(angles)
    return np.column_stack(
        [c * unit[:, 0] - s * unit[:, 1], s * unit[:, 0] + c * unit[:, 1]]
    )


def _bulge_from(out: Floats, chord: Floats) -> float:
    """Bulge of an arc that leaves along `out` and ends at a chord."""
    angle = math.atan2(out[0] * chord[1] - out[1] * chord[0], float(out @ chord))
    return math.tan(0.5 * angle)


def _arc_distance(points: Floats, start: Floats, end: Floats, bulge: float) -> Floats:
    """Distance from points (k, 2) to one arc."""
    x, y, radius = circles(start[None], end[None], np.array([bulge]))[0]
    angle, sweep = _angle_along(points, start, end, bulge)
    to_ends = np.minimum(np.hypot(*(points - start).T), np.hypot(*(points - end).T))
    to_circle = np.abs(np.hypot(*(points - (x, y)).T) - radius)
    distance: Floats = np.where(angle <= sweep, to_circle, to_ends)
    return distance


def _angle_along(
    points: Floats, start: Floats, end: Floats, bulge: float
) -> tuple[Floats, float]:
    """Angle of points about the centre, from the start along an arc, and its sweep."""
    x, y, _ = circles(start[None], end[None], np.array([bulge]))[0]
    first = math.atan2(start[1] - y, start[0] - x)
    sense = math.copysign(1.0, bulge)
    angle = np.arctan2(points[:, 1] - y, points[:, 0] - x) - first
    return (sense * angle) % (2.0 * np.pi), abs(4.0 * math.atan(bulge))
