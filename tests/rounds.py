"""Triangles with a round edge: random ones, and what is known of them exactly."""

import math

import numpy as np
from hypothesis import strategies as st
from strategies import placed

from kplate.elements.arcs import Arcs

# How an arc is held: along it w, and the slope across.
FREE, HELD, CLAMPED = (False, False), (True, False), (True, True)
STATES = (FREE, HELD, CLAMPED)
ALONG, WEIGHT = np.polynomial.legendre.leggauss(40)
ALONG, WEIGHT = 0.5 + 0.5 * ALONG, 0.5 * WEIGHT
turns = st.one_of(st.floats(0.05, 1.0), st.floats(-1.0, -0.05))


def arc_on(X, edge, turn, state=FREE, rows=(0,)):
    """The arc of this turn, positive outwards, on an edge of one triangle (3, 2)."""
    a, b = X[(edge + 1) % 3], X[(edge + 2) % 3]
    chord = b - a
    length = np.hypot(*chord)
    left = np.array([-chord[1], chord[0]]) / length
    radius = 0.5 * length / math.sin(0.5 * abs(turn))
    away = math.copysign(radius * math.cos(0.5 * turn), turn)
    centre = 0.5 * (a + b) + away * left
    return Arcs(
        rows=np.array(rows),
        vertices=X[None],
        edges=np.array([edge]),
        circles=np.array([[*centre, radius]]),
        holds=np.array([state[0]]),
        clamps=np.array([state[1]]),
    )


@st.composite
def round_triangles(draw, *, apexes=((0.0, 1.0), (0.7, 1.3)), state=None):
    """One round edge, of any number and bulging either way, of any turn and size."""
    x, y = (draw(st.floats(*span)) for span in apexes)
    edge, turn = draw(st.integers(0, 2)), draw(turns)
    corners = np.roll([(x, y), (0.0, 0.0), (1.0, 0.0)], edge, axis=0)
    held = draw(st.sampled_from(STATES)) if state is None else state
    return arc_on(placed(draw, corners), edge, turn, held)


def true_area(arcs):
    """Area of the true region: the triangle, and the segment of the circle or less."""
    (a, b, c), turn = arcs.vertices[0], arcs.turn[0]
    u, v = b - a, c - a
    segment = 0.5 * arcs.circles[0, 2] ** 2 * (turn - math.sin(turn))
    return 0.5 * (u[0] * v[1] - u[1] * v[0]) + segment


def around(arcs, shares=ALONG):
    """Points of the three edges, and their derivatives, (3, q, 2), the arc last.

    From the circle's centre and the vertices alone.
    """
    X, edge = arcs.vertices[0], int(arcs.edges[0])
    x, y, radius = arcs.circles[0]
    apex, start, end = (X[(edge + k) % 3] for k in range(3))
    first, last = (math.atan2(p[1] - y, p[0] - x) for p in (start, end))
    turn = math.remainder(last - first, 2.0 * math.pi)
    angle = first + turn * shares
    out = np.column_stack([np.cos(angle), np.sin(angle)])
    along = np.column_stack([-out[:, 1], out[:, 0]])
    points, steps = [], []
    for a, b in ((end, apex), (apex, start)):
        points.append(a + shares[:, None] * (b - a))
        steps.append(np.broadcast_to(b - a, (len(shares), 2)))
    points.append((x, y) + radius * out)
    steps.append(radius * turn * along)
    return np.array(points), np.array(steps)


def from_shares(arcs, t, s):
    """Points (q, 2) at t along the ray to the point s of the arc."""
    apex = arcs.vertices[0, arcs.edges[0]]
    return apex + np.asarray(t)[:, None] * (around(arcs, np.asarray(s))[0][2] - apex)


def fine_rule(arcs):
    """Points (q, 2) of the true region, and weights in m2, of a fine tensor rule."""
    t, s = (own.ravel() for own in np.meshgrid(ALONG, ALONG, indexing="ij"))
    rims, steps = around(arcs, s)
    ray = rims[2] - arcs.vertices[0, arcs.edges[0]]
    cross = ray[:, 0] * steps[2][:, 1] - ray[:, 1] * steps[2][:, 0]
    return from_shares(arcs, t, s), np.outer(WEIGHT, WEIGHT).ravel() * t * cross
