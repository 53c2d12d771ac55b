"""What lies inside an outline: zones, seams and marks.

Zones are areas with a thickness, material or load of their own; seams are lines that
the mesh follows; marks are single points of it.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Any

import numpy as np

from kplate import curves, joining
from kplate.arrays import Floats
from kplate.errors import InputError
from kplate.given import FARTHEST, as_bulges, as_pair, as_points
from kplate.polygon import MOST_BULGE, SNAP, Polygon, at
from kplate.shapes import ClosedLine


@dataclass(frozen=True, eq=False, kw_only=True)
class Zone:
    """An area of the plate with a name.

    Parameters
    ----------
    shape : Polygon, Circle, Slot, Rectangle or Ellipse
        Its boundary; it may share edges with the rim, with holes and with other zones.
    name : str
        Its name.
    """

    shape: ClosedLine
    name: str


@dataclass(frozen=True, eq=False, kw_only=True)
class Seam:
    """A line on the plate that the mesh follows.

    Parameters
    ----------
    points : array_like, shape (n, 2)
        Its vertices in m, from end to end.
    name : str
        Its name.
    bulges : array_like, shape (n - 1,), optional
        Tangent of a quarter of the angle each piece turns through; all straight if
        left out.

    Raises
    ------
    InputError
        If it has fewer than two points, or points that coincide.
    """

    points: Floats
    name: str
    bulges: Floats = ()  # type: ignore[assignment]  # filled when built

    def __post_init__(self) -> None:
        """Check the line."""
        points = as_points(self.points, f"the points of seam {self.name!r}")
        object.__setattr__(self, "points", points)
        if points.ndim != 2 or points.shape[1:] != (2,) or len(points) < 2:
            raise InputError(
                f"seam {self.name!r} has points of shape {points.shape}; it takes at "
                "least two pairs (x, y)."
            )
        for i in np.flatnonzero(~(np.abs(points) <= FARTHEST).all(axis=1)):
            raise InputError(
                f"seam {self.name!r}: point {i + 1} is {at(points[i])}; coordinates "
                f"must be numbers in m, no larger than {FARTHEST:g}."
            )
        object.__setattr__(self, "bulges", as_bulges(self.bulges, len(points) - 1))
        if len(self.bulges) != len(points) - 1:
            raise InputError(
                f"seam {self.name!r} has {len(points) - 1} pieces and "
                f"{len(self.bulges)} bulges; give one for each."
            )
        for i in np.flatnonzero(~(np.abs(self.bulges) <= MOST_BULGE)):
            raise InputError(
                f"seam {self.name!r}: piece {i + 1} has bulge {self.bulges[i]:g}; it "
                f"must lie between -{MOST_BULGE:g} and {MOST_BULGE:g}."
            )
        size = float(np.hypot(*np.ptp(points, axis=0)))
        for i in np.flatnonzero(self.chords <= SNAP * size):
            raise InputError(
                f"seam {self.name!r}: points {i + 1} and {i + 2} coincide near "
                f"{at(points[i])}; drop one of them."
            )

    @property
    def chords(self) -> Floats:
        """Distance from end to end of each piece in m."""
        return curves.chords(self.points[:-1], self.points[1:])

    @property
    def turns(self) -> Floats:
        """Turn to the left at each vertex between two pieces in rad, (n - 2,)."""
        return self._turns[1:]

    @property
    def closing_turn(self) -> float:
        """Turn to the left in rad where a closed seam begins; 0 of an open one."""
        closed = np.array_equal(self.points[0], self.points[-1])
        return float(self._turns[0]) if closed else 0.0

    @property
    def _turns(self) -> Floats:
        """Turns from the last piece to the first, then at the vertices between."""
        out, into = curves.tangents(self.points[:-1], self.points[1:], self.bulges)
        into = np.roll(into, 1, axis=0)
        cross = into[:, 0] * out[:, 1] - into[:, 1] * out[:, 0]
        turn: Floats = np.arctan2(cross, np.einsum("ij,ij->i", into, out))
        return turn

    @cached_property
    def path(self) -> Any:
        """The seam as a shapely line, chords for arcs."""
        import shapely

        flat, _ = curves.flattened(self.points[:-1], self.points[1:], self.bulges)
        return shapely.LineString(np.vstack([flat, self.points[-1:]]))


@dataclass(frozen=True, kw_only=True)
class Mark:
    """A point of the plate that is a vertex of the mesh.

    Parameters
    ----------
    at : tuple of float
        Where, in m.
    name : str
        Its name.

    Raises
    ------
    InputError
        If the place is no pair of finite numbers.
    """

    at: tuple[float, float]
    name: str

    def __post_init__(self) -> None:
        """Check the numbers."""
        place = as_pair(f"mark {self.name!r}", "place", self.at)
        object.__setattr__(self, "at", place)


def joined(
    inside: tuple[Sequence[Zone], Sequence[Seam], Sequence[Mark]],
    boundaries: Sequence[Polygon],
    size: float,
) -> tuple[list[Zone], list[Seam], list[Mark], list[str]]:
    """Put zones, seams and marks on lines that they nearly touch.

    Parameters
    ----------
    inside : tuple of sequences
        Zones, seams and marks; each is joined to the boundaries and to those before it.
    boundaries : sequence of Polygon
        The rim and the holes.
    size : float
        Diagonal of the box around the plate in m.

    Returns
    -------
    tuple
        Zones, seams and marks, and notes on what was moved.
    """
    lines = joining.lines(boundaries, size)
    zones, seams, marks = inside
    notes: list[str] = []
    new_zones, new_seams, new_marks = [], [], []
    for zone in zones:
        own, found = _joined_zone(zone, lines)
        line, notes = own.shape.line, notes + found
        lines = lines.and_also(
            line.points, line.ends, line.bulges, f"zone {zone.name!r}"
        )
        new_zones.append(own)
    for seam in seams:
        path, found = _joined_seam(seam, lines)
        starts, ends, notes = path.points[:-1], path.points[1:], notes + found
        lines = lines.and_also(starts, ends, path.bulges, f"seam {seam.name!r}")
        new_seams.append(path)
    for mark in marks:
        places, found = joining.moved(np.array([mark.at]), lines, f"mark {mark.name!r}")
        x, y = places[0].tolist()
        new_marks.append(replace(mark, at=(x, y)))
        notes = notes + found
    return new_zones, new_seams, new_marks, notes


def _joined_zone(zone: Zone, lines: joining.Lines) -> tuple[Zone, list[str]]:
    """Join a zone to lines; its shape is then a polygon."""
    line = zone.shape.line
    points, notes = joining.moved(line.points, lines, f"zone {zone.name!r}")
    ends = np.roll(points, -1, axis=0)
    points, bulges, owners = joining.threaded(points, ends, line.bulges, lines)
    bulges = joining.followed(points, np.roll(points, -1, axis=0), bulges, lines)
    if np.array_equal(points, line.points) and np.array_equal(bulges, line.bulges):
        return zone, []
    sides = tuple(line.sides[i] for i in owners)
    # Nothing is merged, or a vertex put on a line would be taken off it again.
    shape = replace(line, points=points, sides=sides, bulges=bulges, snap=0.0)
    return replace(zone, shape=shape), notes


def _joined_seam(seam: Seam, lines: joining.Lines) -> tuple[Seam, list[str]]:
    """Join a seam to lines."""
    points, notes = joining.moved(seam.points, lines, f"seam {seam.name!r}")
    starts, bulges, _ = joining.threaded(points[:-1], points[1:], seam.bulges, lines)
    points = np.concatenate([starts, points[-1:]])
    bulges = joining.followed(points[:-1], points[1:], bulges, lines)
    return replace(seam, points=points, bulges=bulges), notes
