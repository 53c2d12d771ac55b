"""Corners of a closed line rounded, or relieved by a cut of a hole's radius."""

import math

import numpy as np

from kplate.errors import InputError
from kplate.polygon import SNAP, Polygon, at


def filleted(
    line: Polygon, sides: tuple[str, str], radius: float, name: str | None = None
) -> Polygon:
    """Round the corner between two sides by an arc that touches both.

    Parameters
    ----------
    line : Polygon
        The closed line.
    sides : tuple of str
        The two sides, straight where they meet, in either order.
    radius : float
        Radius of the arc in m.
    name : str, optional
        Name of the arc's side; "fillet of A and B" if left out.

    Returns
    -------
    Polygon

    Raises
    ------
    InputError
        If they do not meet once, or the arc is longer than a side allows.
    """
    i = corner(line, sides)
    turn = float(line.turns[i])
    cut = radius * math.tan(0.5 * abs(turn))
    label = name or f"fillet of {line.sides[i - 1]} and {line.sides[i]}"
    return _rounded(line, i, (cut, math.tan(0.25 * turn)), (label, "fillet"))


def relieved(
    line: Polygon,
    sides: tuple[str, str],
    radius: float,
    name: str | None = None,
    *,
    around_hole: bool = False,
) -> Polygon:
    """Cut a relief of this radius around the corner between two sides.

    The material within the radius of the corner is taken off, so that a re-entrant
    corner becomes the rim of a hole.

    Parameters
    ----------
    line, sides, radius, name
        As in `filleted`.
    around_hole : bool
        Whether the line bounds a hole, and the material lies outside it.

    Returns
    -------
    Polygon

    Raises
    ------
    InputError
        As in `filleted`.
    """
    i = corner(line, sides)
    turn = float(line.turns[i])
    label = name or f"relief of {line.sides[i - 1]} and {line.sides[i]}"
    bulge = -math.tan(0.25 * (math.pi - turn))
    if around_hole:
        bulge = math.tan(0.25 * (math.pi + turn))
    return _rounded(line, i, (radius, bulge), (label, "relief"))


def corner(line: Polygon, sides: tuple[str, str]) -> int:
    """Find the vertex at which two sides meet, in either order.

    Raises
    ------
    InputError
        If they meet nowhere, or more than once.
    """
    corners = [i for i in range(len(line.sides)) if not line.straight[i]]
    found = [i for i in corners if {line.sides[i - 1], line.sides[i]} == set(sides)]
    if len(found) != 1:
        how = "do not meet at a corner" if not found else "meet more than once"
        words = [f"{line.sides[i - 1]}/{line.sides[i]}" for i in corners]
        raise InputError(
            f"sides {sides[0]!r} and {sides[1]!r} {how}; the corners are "
            f"{', '.join(words)}."
        )
    return found[0]


def _rounded(
    line: Polygon, i: int, piece: tuple[float, float], words: tuple[str, str]
) -> Polygon:
    """Replace vertex i by a piece: how much it cuts off both sides, and its bulge."""
    (cut, bulge), (label, what) = piece, words
    both = [(i - 1) % len(line.sides), i]
    place = line.points[i]
    if not math.isfinite(cut) or cut <= 0.0:
        raise InputError(
            f"the radius of the {what} at {at(place)} must be positive and finite."
        )
    if (line.bulges[both] != 0.0).any():
        raise InputError(
            f"the corner at {at(place)} is not between straight pieces; a {what} "
            "needs two."
        )
    if cut > line.lengths[both].min() - SNAP * line.size:
        raise InputError(
            f"the {what} at {at(place)} takes {cut:.6g} m of both sides but the "
            f"shorter has {line.lengths[both].min():.6g} m; take a smaller radius."
        )
    into, out = place - line.points[i - 1], line.ends[i] - place
    points = np.insert(line.points, i + 1, place + cut * out / np.hypot(*out), axis=0)
    points[i] = place - cut * into / np.hypot(*into)
    return line.changed(
        points=points,
        sides=(*line.sides[:i], label, *line.sides[i:]),
        bulges=np.insert(line.bulges, i, bulge),
    )
