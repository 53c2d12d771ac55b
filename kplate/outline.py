"""The outline of a plate: its sides and holes, checked before anything is meshed.

A closed line is a `Polygon` or a `Circle`. Both run counter-clockwise as stated; the
sides of a polygon run from each point to the next. Turns at the vertices are recorded
here; whether a turn is a corner or a bend of a curve is decided where supports meet it.
"""

import contextlib
import math
import reprlib
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from itertools import combinations
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from kplate.arrays import Bools, Floats, read_only_floats
from kplate.errors import InputError

# Lengths below this share of the plate's size are no lengths: points coincide, a hole
# touches, a vertex is not meant to be off the straight line between its neighbours.
SNAP = 1e-6
# A vertex that is off the line by no more than this share is on it, but for round-off.
STRAIGHT = 1e-12
# Nobody draws a plate farther from its origin; beyond, products of lengths overflow.
FARTHEST = 1e9  # m
# Between sides held alike, a smaller turn is a bend of a curve, not a corner (a simply
# supported square with mid-side vertices 0.1 mm out would otherwise lose a third of w).
BEND_TURN = math.radians(10.0)


@dataclass(frozen=True, eq=False, kw_only=True)
class Polygon:
    """A closed line of straight pieces.

    Parameters
    ----------
    points : array_like, shape (n, 2)
        Vertices in m, counter-clockwise, the first not repeated at the end.
    sides : sequence of str
        Names of the pieces, the first from point 0 to point 1; several pieces may
        share a name and make one side.

    Raises
    ------
    InputError
        If it has fewer than three points, points that coincide, a vertex that is
        nearly but not quite straight, crosses itself, or runs clockwise.
    """

    points: Floats
    sides: tuple[str, ...]

    def __post_init__(self) -> None:
        """Check the line."""
        points = _as_points(self.points)
        object.__setattr__(self, "points", points)
        object.__setattr__(self, "sides", _as_names(self.sides))
        if points.ndim != 2 or points.shape[1:] != (2,) or len(points) < 3:
            raise InputError(
                f"{self._label} has points of shape {points.shape}; it takes at least "
                "three pairs (x, y)."
            )
        far = ~(np.abs(points) <= FARTHEST).all(axis=1)
        for i in np.flatnonzero(far):
            raise InputError(
                f"{self._label}: point {i + 1} is {_at(points[i])}; coordinates must "
                f"be numbers in m, no larger than {FARTHEST:g}."
            )
        if len(self.sides) != len(points):
            raise InputError(
                f"{self._label} has {len(points)} points and {len(self.sides)} side "
                "names; name each piece, from each point to the next."
            )
        self._check_points()
        self._check_crossing()

    @property
    def size(self) -> float:
        """Diagonal of the box around it in m."""
        return float(np.hypot(*np.ptp(self.points, axis=0)))

    @property
    def area(self) -> float:
        """Enclosed area in m2."""
        x, y = (self.points - self.points[0]).T  # coordinates may be a site's
        return 0.5 * float(np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y))

    @property
    def perimeter(self) -> float:
        """Length in m."""
        return float(
            np.hypot(*(np.roll(self.points, -1, axis=0) - self.points).T).sum()
        )

    @cached_property
    def turns(self) -> Floats:
        """Turn to the left at each vertex in rad, in (-pi, pi), (n,)."""
        ahead = np.roll(self.points, -1, axis=0) - self.points
        behind = np.roll(ahead, 1, axis=0)
        cross = behind[:, 0] * ahead[:, 1] - behind[:, 1] * ahead[:, 0]
        turn: Floats = np.arctan2(cross, np.einsum("ij,ij->i", behind, ahead))
        return turn

    @cached_property
    def straight(self) -> Bools:
        """Vertices on the line through their neighbours but for round-off, (n,)."""
        return self._offset() <= STRAIGHT * self.size

    @cached_property
    def region(self) -> Any:
        """The enclosed area as a shapely polygon."""
        import shapely

        return shapely.Polygon(self.points)

    @property
    def _label(self) -> str:
        return f"the polygon with side {self.sides[0]!r}" if self.sides else "a polygon"

    def _offset(self) -> Floats:
        """Distance of each vertex from the line through its neighbours in m."""
        before, after = (
            np.roll(self.points, 1, axis=0),
            np.roll(self.points, -1, axis=0),
        )
        chord = after - before
        arm = self.points - before
        cross = chord[:, 0] * arm[:, 1] - chord[:, 1] * arm[:, 0]
        length = np.hypot(*chord.T)
        return np.abs(cross) / np.where(length > 0.0, length, np.inf)

    def _check_points(self) -> None:
        n = len(self.points)
        ahead = np.roll(self.points, -1, axis=0) - self.points
        for i in np.flatnonzero(np.hypot(*ahead.T) <= SNAP * self.size):
            j = (i + 1) % n
            raise InputError(
                f"{self._label}: points {i + 1} and {j + 1} coincide near "
                f"{_at(self.points[i])}; drop one of them."
            )
        for i in np.flatnonzero(np.abs(self.turns) > math.pi - SNAP):
            raise InputError(
                f"{self._label}: the line turns back on itself at point {i + 1}, "
                f"{_at(self.points[i])}; take the spike out."
            )
        off = self._offset()
        near = (off > STRAIGHT * self.size) & (off < SNAP * self.size)
        for i in np.flatnonzero(near & (np.abs(self.turns) < BEND_TURN)):
            raise InputError(
                f"{self._label}: point {i + 1}, {_at(self.points[i])}, is nearly "
                f"straight, {off[i]:.2g} m off the line between its neighbours; drop "
                "it or move it onto the line."
            )

    def _check_crossing(self) -> None:
        import shapely
        from shapely.validation import explain_validity

        if not self.region.is_valid:
            where = explain_validity(self.region).partition("[")[2].rstrip("]")
            x, y, *_ = (float(word) for word in where.split())
            raise InputError(
                f"{self._label} crosses or touches itself at {_at((x, y))}; list its "
                "points in the order in which a pencil would draw it."
            )
        if self.area < 0.0:
            raise InputError(
                f"{self._label} runs clockwise from {_at(self.points[0])}; list its "
                "points counter-clockwise, with their side names."
            )
        neck = shapely.minimum_clearance_line(self.region)
        if neck.length <= SNAP * self.size:
            raise InputError(
                f"{self._label} comes within {neck.length:.2g} m of itself at "
                f"{_at(neck.coords[0])}; part it there, or leave a gap."
            )


@dataclass(frozen=True, kw_only=True)
class Circle:
    """A full circle: one side without corners.

    Parameters
    ----------
    centre : tuple of float
        Centre in m.
    radius : float
        Radius in m.
    name : str
        Name of the side.

    Raises
    ------
    InputError
        If a number is no number, not finite, or the radius not positive.
    """

    centre: tuple[float, float]
    radius: float
    name: str

    def __post_init__(self) -> None:
        """Check the numbers."""
        try:
            # Adding 0.0 keeps text from being read as a number.
            x, y, radius = (float(c + 0.0) for c in (*self.centre, self.radius))
        except (TypeError, ValueError) as error:
            raise InputError(
                f"circle {self.name!r} has centre {self.centre!r} and radius "
                f"{self.radius!r}; give a pair (x, y) and a number in m."
            ) from error
        object.__setattr__(self, "centre", (x, y))
        object.__setattr__(self, "radius", radius)
        if not all(abs(c) <= FARTHEST for c in (x, y, radius)):
            raise InputError(
                f"circle {self.name!r} has centre {_at(self.centre)} and radius "
                f"{self.radius:g} m; its numbers must be finite, no larger than "
                f"{FARTHEST:g}."
            )
        if self.radius <= 0.0:
            raise InputError(
                f"circle {self.name!r} has radius {self.radius:g} m; it must be "
                "positive."
            )

    @property
    def sides(self) -> tuple[str, ...]:
        """Its one side."""
        return (self.name,)

    @property
    def size(self) -> float:
        """Diagonal of the box around it in m."""
        return 2.0 * math.sqrt(2.0) * self.radius

    @property
    def area(self) -> float:
        """Enclosed area in m2."""
        return math.pi * self.radius**2

    @property
    def perimeter(self) -> float:
        """Length in m."""
        return 2.0 * math.pi * self.radius


ClosedLine = Polygon | Circle


@dataclass(frozen=True, eq=False, kw_only=True)
class Outline:
    """The whole boundary of a plate.

    Build one with `Outline.polygon` or `Outline.circle`, then `cut` the holes.

    Parameters
    ----------
    rim : Polygon or Circle
        The outer boundary.
    holes : tuple of Polygon or Circle
        Openings, strictly inside the rim and apart from each other.

    Raises
    ------
    InputError
        If a hole is outside, touches or crosses the rim or another hole, or a side name
        stands on two closed lines.
    """

    rim: ClosedLine
    holes: tuple[ClosedLine, ...] = ()

    def __post_init__(self) -> None:
        """Check names, and that the holes lie inside and apart."""
        object.__setattr__(self, "holes", tuple(self.holes))
        for line in self.lines:
            if not isinstance(line, Polygon | Circle):
                raise InputError(
                    f"{line!r} is no closed line; a rim or a hole is a Polygon or a "
                    "Circle."
                )
        self._check_names()
        for number, hole in enumerate(self.holes, start=1):
            _check_inside(self.rim, hole, number)
        for (i, a), (j, b) in combinations(enumerate(self.holes, start=1), 2):
            _check_apart(a, b, (i, j), SNAP * self.size)

    @classmethod
    def polygon(
        cls, points: ArrayLike, *, sides: Sequence[str] | None = None
    ) -> "Outline":
        """Outline with straight sides.

        Parameters
        ----------
        points : array_like, shape (n, 2)
            Vertices in m, counter-clockwise.
        sides : sequence of str, optional
            A name for each piece, the first from point 0 to point 1; "side-1",
            "side-2", ... if left out.

        Returns
        -------
        Outline
        """
        array = _as_points(points)
        if sides is None:
            sides = [f"side-{i + 1}" for i in range(len(np.atleast_1d(array)))]
        return cls(rim=Polygon(points=array, sides=_as_names(sides)))

    @classmethod
    def circle(
        cls, centre: tuple[float, float], *, radius: float, side: str = "rim"
    ) -> "Outline":
        """Round outline: one side, a true circle."""
        return cls(rim=Circle(centre=centre, radius=radius, name=side))

    def cut(self, *holes: ClosedLine) -> "Outline":
        """Return the outline with these openings cut into it."""
        return replace(self, holes=(*self.holes, *holes))

    @property
    def lines(self) -> tuple[ClosedLine, ...]:
        """The rim, then the holes."""
        return (self.rim, *self.holes)

    @property
    def side_names(self) -> tuple[str, ...]:
        """Names of all sides, rim first, each once."""
        return tuple(dict.fromkeys(name for line in self.lines for name in line.sides))

    @property
    def size(self) -> float:
        """Diagonal of the box around it in m."""
        return self.rim.size

    @property
    def box(self) -> tuple[float, float, float, float]:
        """Smallest x, smallest y, largest x, largest y in m."""
        if isinstance(self.rim, Circle):
            (x, y), r = self.rim.centre, self.rim.radius
            return x - r, y - r, x + r, y + r
        (x0, y0), (x1, y1) = self.rim.points.min(axis=0), self.rim.points.max(axis=0)
        return float(x0), float(y0), float(x1), float(y1)

    @property
    def area(self) -> float:
        """Area of the plate, holes taken off, in m2."""
        return self.rim.area - sum(hole.area for hole in self.holes)

    @cached_property
    def span(self) -> float:
        """Diameter in m of the largest circle inside the rim, holes disregarded.

        The short side of a rectangle, the diameter of a disc: the length L that a
        plate's thickness is held against.
        """
        if isinstance(self.rim, Circle):
            return 2.0 * self.rim.radius
        import shapely

        region = self.rim.region
        line = shapely.maximum_inscribed_circle(region, tolerance=1e-4 * self.size)
        return 2.0 * float(shapely.length(line))

    def side_length(self, name: str) -> float:
        """Length in m of a side.

        Raises
        ------
        InputError
            If there is no such side.
        """
        for line in self.lines:
            if name in line.sides:
                if isinstance(line, Circle):
                    return line.perimeter
                pieces = np.roll(line.points, -1, axis=0) - line.points
                own = np.array([side == name for side in line.sides])
                return float(np.hypot(*pieces[own].T).sum())
        raise InputError(
            f"there is no side {name!r}; the sides are {', '.join(self.side_names)}."
        )

    def _check_names(self) -> None:
        seen: dict[str, int] = {}
        for number, line in enumerate(self.lines):
            for name in line.sides:
                if not isinstance(name, str) or not name or name != name.strip():
                    raise InputError(
                        f"a side is called {name!r}; a name is text of at least one "
                        "character, with no space around it."
                    )
                if seen.setdefault(name, number) != number:
                    raise InputError(
                        f"side name {name!r} stands on two closed lines; the rim and "
                        "each hole need names of their own."
                    )


def _check_inside(rim: ClosedLine, hole: ClosedLine, number: int) -> None:
    """Refuse a hole that is not strictly inside the rim."""
    gap, place = _gap_inside(rim, hole)
    if gap > SNAP * rim.size:
        return
    how = "touches" if abs(gap) <= SNAP * rim.size else "crosses or lies outside"
    raise InputError(
        f"hole {number} ({hole.sides[0]!r}) {how} the outline near {_at(place)}; a "
        "hole must lie strictly inside the plate. Move or shrink it, or cut the notch "
        "into the outline."
    )


def _gap_inside(rim: ClosedLine, hole: ClosedLine) -> tuple[float, Any]:
    """Smallest distance from hole to rim (negative: outside) and where, both in m."""
    import shapely

    if isinstance(rim, Circle):
        points = _support_points(hole, rim.centre)
        reach = np.hypot(*(points - rim.centre).T)
        k = int(reach.argmax())
        return rim.radius - float(reach[k]), points[k]
    if isinstance(hole, Circle):
        centre = shapely.Point(hole.centre)
        line = shapely.shortest_line(rim.region.exterior, centre)
        sign = 1.0 if rim.region.contains(centre) else -1.0
        return sign * line.length - hole.radius, line.coords[0]
    line = shapely.shortest_line(rim.region.exterior, hole.region.exterior)
    if rim.region.contains(hole.region):
        return line.length, line.coords[0]
    touches = rim.region.contains(hole.region.buffer(-SNAP * rim.size))
    return 0.0 if touches else -rim.size, line.coords[0]


def _support_points(line: ClosedLine, away_from: tuple[float, float]) -> Floats:
    """Points of a closed line that may be its farthest from a point, (k, 2)."""
    if isinstance(line, Polygon):
        return line.points
    arm = np.subtract(line.centre, away_from)
    length = float(np.hypot(*arm))
    direction = arm / length if length > 0.0 else np.array([1.0, 0.0])
    return (np.asarray(line.centre) + line.radius * direction)[None]


def _check_apart(
    a: ClosedLine, b: ClosedLine, numbers: tuple[int, int], least: float
) -> None:
    """Refuse two holes that overlap or touch."""
    import shapely

    shapes = [
        shapely.Point(line.centre) if isinstance(line, Circle) else line.region
        for line in (a, b)
    ]
    radii = [line.radius if isinstance(line, Circle) else 0.0 for line in (a, b)]
    line = shapely.shortest_line(*shapes)
    if line.length - sum(radii) > least:
        return
    # In the middle of what both cover of the line between them.
    share = 0.5 * (line.length + radii[0] - radii[1])
    place = line.interpolate(min(max(share, 0.0), line.length)).coords[0]
    raise InputError(
        f"holes {numbers[0]} ({a.sides[0]!r}) and {numbers[1]} ({b.sides[0]!r}) "
        f"overlap or touch near {_at(place)}; move them apart, or draw them as one "
        "hole."
    )


def _as_points(points: ArrayLike) -> Floats:
    """Copy what a user gives for points."""
    with contextlib.suppress(TypeError, ValueError):
        if np.asarray(points).dtype.kind in "iufO":  # no text, no complex numbers
            return read_only_floats(points)
    raise InputError(
        f"the points of a polygon are {reprlib.repr(points)}; give pairs (x, y) of "
        "numbers in m."
    )


def _as_names(names: Sequence[str]) -> tuple[str, ...]:
    """Copy what a user gives for the names of the sides."""
    if isinstance(names, str) or not isinstance(names, Iterable):
        raise InputError(
            f"the side names of a polygon are {names!r}; give a list with a name for "
            "each piece."
        )
    # Names from a numpy array are made plain: messages show them.
    return tuple(str(name) if isinstance(name, str) else name for name in names)


def _at(point: Any) -> str:
    return f"({point[0]:.6g}, {point[1]:.6g}) m"
