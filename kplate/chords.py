"""Runs of chords that stand for a curve, and vertices that are hardly off a line.

A drawing often brings a curve as many short straight pieces. Left as they are, its
supports would hold both slopes at every vertex and clamp the plate. A run of pieces is
taken for an arc where eight or more vertices lie on one circle and turn evenly by less
than `ARC_TURN`; from there to `ASK_TURN` it may be either, and whoever draws it has to
say so; an octagon is a polygon.
"""

import itertools
import math
from dataclasses import dataclass

import numpy as np

from kplate import curves
from kplate.arrays import Bools, Floats

# Fewer vertices on a circle than these are no curve.
FEWEST = 8
# A regular polygon of more than 36 sides turns by less and is a circle.
ARC_TURN = math.radians(10.0)
# One of 12 sides or fewer turns by at least this and is a polygon.
ASK_TURN = math.radians(30.0)
# Turns and lengths of one run may differ by this share: a drawing's last digit makes
# them differ where chords are short.
EVEN = 1 / 3
# Vertices lie on a circle to this share of the height of the arc over its chord, or of
# the radius: the last digit again.
CLOSE, ROUNDED = 0.1, 2e-4


@dataclass(frozen=True, eq=False, kw_only=True)
class Run:
    """Pieces in a row whose vertices lie evenly on one circle.

    Parameters
    ----------
    first : int
        Number of the first piece.
    pieces : int
        How many there are; all of a closed line where it is a full circle.
    turn : float
        Turn from one piece to the next in rad, positive to the left.
    radius : float
        Radius of the circle in m.
    """

    first: int
    pieces: int
    turn: float
    radius: float


def runs(
    points: Floats, sides: tuple[str, ...], bulges: Floats, turns: Floats
) -> list[Run]:
    """Runs of straight pieces of one side that stand for an arc, or may.

    Parameters
    ----------
    points : ndarray, shape (n, 2)
        Vertices of a closed line in m.
    sides : tuple of str
        Name of each piece.
    bulges : ndarray, shape (n,)
        Bulge of each piece; only straight ones make runs.
    turns : ndarray, shape (n,)
        Turn at each vertex in rad.

    Returns
    -------
    list of Run
        With turns of less than `ASK_TURN`, in order.
    """
    n = len(points)
    # Piece i and piece i - 1 may belong to one run where vertex i joins them.
    joins = np.array(
        [
            bulges[i] == 0.0 == bulges[i - 1]
            and sides[i] == sides[i - 1]
            and 1e-9 < abs(turns[i]) < ASK_TURN
            for i in range(n)
        ]
    )
    found = []
    for first, count in _stretches(joins, turns):
        pieces = n if count == n else count + 1
        if count + 2 < FEWEST:
            continue
        inside = [(first + 1 + k) % n for k in range(count)]
        turn = float(np.mean(turns[inside]))
        own = _vertices(points, first, pieces)
        circle = _circle(own, closed=pieces == n)
        if circle is not None and _is_arc(own, turn, circle):
            found.append(
                Run(first=first, pieces=pieces, turn=turn, radius=float(circle[2]))
            )
    return found


def as_arcs(
    points: Floats, sides: tuple[str, ...], bulges: Floats, found: list[Run]
) -> tuple[Floats, tuple[str, ...], Floats]:
    """Replace runs by arcs: one each, two half circles for a full circle."""
    n = len(points)
    drop = np.zeros(n, dtype=bool)
    bent = bulges.copy()
    for run in found:
        parts = 2 if run.pieces == n else 1
        cuts = [run.first + round(k * run.pieces / parts) for k in range(parts + 1)]
        for start, stop in itertools.pairwise(cuts):
            drop[[(start + k) % n for k in range(1, stop - start)]] = True
            # Through the vertices, whose places are better known than the turns.
            middle = (start + stop) // 2
            a, b, c = (points[i % n] for i in (start, middle, stop))
            bent[start % n] = curves.through(a, b, c)
    keep = np.flatnonzero(~drop)
    return points[keep], tuple(sides[i] for i in keep), bent[keep]


def lowest(off: Floats) -> Bools:
    """Vertices (n,) that are off less than both neighbours, or the one that is least.

    No two of them are next to each other, and at least three others are left.
    """
    least: Bools = (off < np.roll(off, 1)) & (off < np.roll(off, -1))
    if not 0 < least.sum() <= len(off) - 3:
        least = np.arange(len(off)) == np.argmin(off)
    return least


def flattened(
    points: Floats, sides: tuple[str, ...], bulges: Floats, flat: Bools
) -> tuple[Floats, tuple[str, ...], Floats]:
    """Drop vertices (n,) from straight lines; those between sides are put on them."""
    before, after = np.roll(points, 1, axis=0), np.roll(points, -1, axis=0)
    chord = (after - before)[flat]
    share = np.einsum("ij,ij->i", (points - before)[flat], chord)
    share /= np.einsum("ij,ij->i", chord, chord)
    moved = points.copy()
    moved[flat] = before[flat] + share[:, None] * chord
    between = np.array([sides[i] != sides[i - 1] for i in range(len(sides))])
    keep = np.flatnonzero(~flat | between)
    return moved[keep], tuple(sides[i] for i in keep), bulges[keep]


def _stretches(joins: Floats, turns: Floats) -> list[tuple[int, int]]:
    """First piece and number of joining vertices of each even stretch."""
    n = len(joins)
    even = np.array(
        [
            joins[i]
            and joins[i - 1]
            and abs(turns[i] - turns[i - 1]) <= EVEN * abs(turns[i])
            for i in range(n)
        ]
    )
    if even.all():
        return [(0, n)]
    found, i = [], 0
    # Begin where a stretch cannot run through the first vertex.
    offset = int(np.flatnonzero(~even)[0])
    while i < n:
        vertex = (offset + i) % n
        if not joins[vertex]:
            i += 1
            continue
        count = 1
        while count < n - i and even[(vertex + count) % n]:
            count += 1
        found.append(((vertex - 1) % n, count))
        i += count
    return found


def _vertices(points: Floats, first: int, pieces: int) -> Floats:
    """Vertices of a run in order; a full circle does not repeat its first."""
    n = len(points)
    last = pieces - 1 if pieces == n else pieces
    return points[[(first + k) % n for k in range(last + 1)]]


def _circle(own: Floats, *, closed: bool) -> Floats | None:
    """Centre x, y and radius through three vertices of a run, far apart."""
    n = len(own)
    a, b, c = own[[0, n // 3, 2 * n // 3]] if closed else own[[0, n // 2, n - 1]]
    bulge = curves.through(a, b, c)
    if bulge == 0.0:
        return None
    circle: Floats = curves.circles(a[None], c[None], np.array([bulge]))[0]
    return circle


def _is_arc(own: Floats, turn: float, circle: Floats) -> bool:
    """Whether the vertices of a run lie evenly on a circle."""
    x, y, radius = circle
    height = radius * (1.0 - math.cos(0.5 * turn))
    off = np.abs(np.hypot(*(own - (x, y)).T) - radius)
    steps = np.hypot(*np.diff(own, axis=0).T)
    allowed = max(CLOSE * height, ROUNDED * radius)
    return bool((off <= allowed).all() and np.ptp(steps) <= EVEN * steps.max())
