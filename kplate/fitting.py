"""Curves of drawings (ellipses, splines) as arcs.

A curve is parted until two arcs with one tangent where they meet follow each part, so
that the chain of arcs has the tangents of the curve at every joint.
"""

import math
from collections.abc import Callable
from itertools import pairwise

import numpy as np

from kplate import curves
from kplate.arrays import Floats
from kplate.errors import InputError

# No point of a curve is off its arcs by more than this share of its size.
CLOSE = 1e-4
# A part turns from its chord by less than this at both ends, so that two arcs fit.
MOST_TURN = math.radians(40.0)
# A part this flat, as a share of its length, is straight.
FLAT = 1e-9
# Halvings before a curve counts as one that no arcs follow, such as one with cusps.
DEEPEST = 16
_INSIDE = np.linspace(0.0, 1.0, 11)[1:-1]
# Tangents are taken this share of a part inside it: at a kink a part has its own.
_NUDGE = 1e-9

Points = tuple[float, float]
Arc = tuple[Points, Points, float]
Curve = Callable[[Floats], tuple[Floats, Floats]]


def as_arcs(curve: Curve, stops: Floats) -> list[Arc]:
    """Follow a curve by arcs.

    Parameters
    ----------
    curve : callable
        Takes parameters (n,); returns points (n, 2) in m and derivatives (n, 2).
    stops : ndarray, shape (k,)
        Parameters of both ends and of what must be joints: kinks, knots of a spline.

    Returns
    -------
    list of (start, end, bulge)
        Lines and arcs from end to end, within 1e-4 of the curve's size.

    Raises
    ------
    InputError
        If arcs cannot follow it.
    """
    shares = np.linspace(0.0, 1.0, 9)
    every = np.unique(np.concatenate([a + shares * (b - a) for a, b in _spans(stops)]))
    points = curve(every)[0]
    size = float(np.hypot(*np.ptp(points, axis=0)))
    if not (np.isfinite(points).all() and size > 0.0):
        raise InputError("a curve has no length, or points that are not finite.")
    return [
        arc for a, b in _spans(stops) for arc in _follow(curve, (a, b), CLOSE * size, 0)
    ]


def _spans(stops: Floats) -> list[tuple[float, float]]:
    ends = [float(stop) for stop in stops]
    return list(pairwise(ends))


def _follow(
    curve: Curve, span: tuple[float, float], close: float, depth: int
) -> list[Arc]:
    """Two arcs over a span, or those of its halves."""
    a, b = span
    nudge = _NUDGE * (b - a)
    start, end = curve(np.array([a, b]))[0]
    between = curve(a + _INSIDE * (b - a))[0]
    out, into = (_unit(d) for d in curve(np.array([a + nudge, b - nudge]))[1])
    chord = end - start
    span_length = float(np.hypot(*chord))
    if span_length > 0.0:
        off = _off(between, [(start, end, 0.0)])
        if off <= FLAT * span_length:
            return [(_pair(start), _pair(end), 0.0)]
        along = chord / span_length
        if min(along @ out, along @ into) > math.cos(MOST_TURN):
            (_, first), (joint, second) = curves.biarc(start, end, out, into)
            arcs = [(start, joint, first), (joint, end, second)]
            if _off(between, arcs) <= close:
                return [(_pair(p), _pair(q), float(bulge)) for p, q, bulge in arcs]
    if depth == DEEPEST:
        raise InputError("no arcs follow a curve; it may have a cusp.")
    middle = 0.5 * (a + b)
    return [
        arc
        for half in ((a, middle), (middle, b))
        for arc in _follow(curve, half, close, depth + 1)
    ]


def _unit(vector: Floats) -> Floats:
    size = float(np.hypot(*vector))
    return vector / size if size > 0.0 else vector


def _off(points: Floats, arcs: list[tuple[Floats, Floats, float]]) -> float:
    """Largest distance of points from the nearest of some arcs."""
    starts = np.array([start for start, _, _ in arcs])
    ends = np.array([end for _, end, _ in arcs])
    bulges = np.array([bulge for _, _, bulge in arcs])
    return float(curves.distances(points, starts, ends, bulges).min(axis=1).max())


def _pair(point: Floats) -> Points:
    return float(point[0]), float(point[1])
