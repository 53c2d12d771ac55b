"""The outline of a plate: sides, holes, zones, seams and marks, checked before meshing.

The rim and the holes are closed lines that run counter-clockwise as stated, with a name
for each side. Zones are areas inside with a thickness, material or load of their own;
seams are lines inside that the mesh follows; marks are single points of it.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from itertools import combinations
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from kplate import curves
from kplate.arrays import Floats, read_only_floats
from kplate.errors import InputError
from kplate.polygon import FARTHEST, SNAP, Chords, Polygon, as_names, as_points, at
from kplate.shapes import Circle, ClosedLine, Ellipse, Rectangle, Slot

_SHAPES = (Polygon, Circle, Slot, Rectangle, Ellipse)


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
        points = as_points(self.points)
        object.__setattr__(self, "points", points)
        if points.ndim != 2 or points.shape[1:] != (2,) or len(points) < 2:
            raise InputError(
                f"seam {self.name!r} has points of shape {points.shape}; it takes at "
                "least two pairs (x, y)."
            )
        if not (np.abs(points) <= FARTHEST).all():
            raise InputError(f"seam {self.name!r} has points that are not finite.")
        bulges = np.zeros(len(points) - 1) if len(self.bulges) == 0 else self.bulges
        object.__setattr__(self, "bulges", read_only_floats(bulges))
        if len(self.bulges) != len(points) - 1:
            raise InputError(
                f"seam {self.name!r} has {len(points) - 1} pieces and "
                f"{len(self.bulges)} bulges; give one for each."
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
        out, into = curves.tangents(self.points[:-1], self.points[1:], self.bulges)
        out, into = out[1:], into[:-1]
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
    """

    at: tuple[float, float]
    name: str


@dataclass(frozen=True, eq=False, kw_only=True)
class Outline:
    """The whole boundary of a plate and the lines the mesh follows inside.

    Build one with `Outline.polygon`, `Outline.circle` or `Outline.of`, then `cut` holes
    and add zones, seams and marks.

    Parameters
    ----------
    rim : Polygon, Circle, Slot, Rectangle or Ellipse
        The outer boundary.
    holes : tuple of the same
        Openings, strictly inside the rim and apart from each other.
    zones : tuple of Zone
        Areas inside the rim that do not overlap.
    seams : tuple of Seam
        Lines on the plate; they may cross, and end on sides.
    marks : tuple of Mark
        Points on the plate.

    Raises
    ------
    InputError
        If a hole is outside, touches or crosses the rim or another hole, a zone, seam
        or mark is not on the plate, zones overlap, or a name stands twice.
    """

    rim: ClosedLine
    holes: tuple[ClosedLine, ...] = ()
    zones: tuple[Zone, ...] = ()
    seams: tuple[Seam, ...] = ()
    marks: tuple[Mark, ...] = ()

    def __post_init__(self) -> None:
        """Check names, and that everything lies where it may."""
        for key in ("holes", "zones", "seams", "marks"):
            object.__setattr__(self, key, tuple(getattr(self, key)))
        shapes = [self.rim, *self.holes, *(zone.shape for zone in self.zones)]
        for shape in shapes:
            if not isinstance(shape, _SHAPES):
                raise InputError(
                    f"{shape!r} is no closed line; a rim, hole or zone is a Polygon, "
                    "Circle, Slot, Rectangle or Ellipse."
                )
        self._check_names()
        least = SNAP * self.size
        for number, hole in enumerate(self.boundaries[1:], start=1):
            _check_inside(self.boundaries[0], hole, number, least)
        for (i, a), (j, b) in combinations(enumerate(self.boundaries[1:], start=1), 2):
            _check_apart(a, b, (i, j), least)
        self._check_zones(least)
        self._check_seams_and_marks(least)

    @classmethod
    def polygon(
        cls,
        points: ArrayLike,
        *,
        sides: Sequence[str] | None = None,
        bulges: ArrayLike = (),
        chords: Chords = "ask",
    ) -> "Outline":
        """Outline of straight sides and arcs.

        Parameters
        ----------
        points : array_like, shape (n, 2)
            Vertices in m, counter-clockwise.
        sides : sequence of str, optional
            A name for each piece, the first from point 0 to point 1; "side-1",
            "side-2", ... if left out.
        bulges, chords
            As in `Polygon`.

        Returns
        -------
        Outline
        """
        array = as_points(points)
        if sides is None:
            sides = [f"side-{i + 1}" for i in range(len(np.atleast_1d(array)))]
        return cls(
            rim=Polygon(
                points=array,
                sides=as_names(sides),
                bulges=as_points(bulges),
                chords=chords,
            )
        )

    @classmethod
    def circle(
        cls, centre: tuple[float, float], *, radius: float, side: str = "rim"
    ) -> "Outline":
        """Round outline: one side, a true circle."""
        return cls(rim=Circle(centre=centre, radius=radius, name=side))

    @classmethod
    def of(cls, shape: ClosedLine) -> "Outline":
        """Outline with any shape for its rim."""
        return cls(rim=shape)

    def cut(self, *holes: ClosedLine) -> "Outline":
        """Return the outline with these openings cut into it."""
        return replace(self, holes=(*self.holes, *holes))

    def zone(self, shape: ClosedLine, *, name: str) -> "Outline":
        """Return the outline with a zone added."""
        return replace(self, zones=(*self.zones, Zone(shape=shape, name=name)))

    def seam(
        self, points: ArrayLike, *, name: str, bulges: ArrayLike = ()
    ) -> "Outline":
        """Return the outline with a seam added."""
        seam = Seam(points=as_points(points), name=name, bulges=as_points(bulges))
        return replace(self, seams=(*self.seams, seam))

    def mark(self, place: tuple[float, float], *, name: str) -> "Outline":
        """Return the outline with a marked point added."""
        x, y = as_points([place])[0]
        mark = Mark(at=(float(x), float(y)), name=name)
        return replace(self, marks=(*self.marks, mark))

    def fillet(
        self, first: str, second: str, *, radius: float, name: str | None = None
    ) -> "Outline":
        """Return the outline with the corner between two sides rounded.

        Parameters
        ----------
        first, second : str
            The sides that meet there, straight, in either order.
        radius : float
            Radius in m of the arc that touches both.
        name : str, optional
            Name of the arc's side; "fillet of A and B" if left out.
        """
        line = self._line_with((first, second)).fillet((first, second), radius, name)
        return self._replaced(line, (first, second))

    def relieve(
        self, first: str, second: str, *, radius: float, name: str | None = None
    ) -> "Outline":
        """Return the outline with a round relief cut at the corner of two sides.

        Parameters are those of `fillet`; material within the radius is taken off.
        """
        line = self._line_with((first, second)).relieve((first, second), radius, name)
        return self._replaced(line, (first, second))

    def part(
        self,
        side: str,
        *,
        name: str,
        fractions: tuple[float, float] | None = None,
        between: tuple[tuple[float, float], tuple[float, float]] | None = None,
    ) -> "Outline":
        """Return the outline with a part of a side made a side of its own.

        Parameters
        ----------
        side : str
            A side in one stretch.
        name : str
            Name of the part; the rest keeps the side's.
        fractions : tuple of float, optional
            Where it begins and ends, as shares of the side's length in the sense in
            which the line was stated.
        between : tuple of points, optional
            Two points in m instead; the nearest of the side are taken.

        Returns
        -------
        Outline

        Raises
        ------
        InputError
            If there is no such side, it is in several stretches, or the part has no
            length.
        """
        line = self._line_with((side,))
        if (fractions is None) == (between is None):
            raise InputError(
                f"a part of side {side!r} is given by fractions or between two points; "
                "give one of them."
            )
        if between is not None:
            fractions = line.fractions(side, between)
        assert fractions is not None
        return self._replaced(line.parted(side, name, fractions), (side,))

    @property
    def lines(self) -> tuple[ClosedLine, ...]:
        """The rim, then the holes, as they were stated."""
        return (self.rim, *self.holes)

    @cached_property
    def boundaries(self) -> tuple[Polygon, ...]:
        """Their pieces: the boundary of the rim, then of each hole."""
        return tuple(shape.line for shape in self.lines)

    @property
    def notes(self) -> tuple[str, ...]:
        """What was tidied, in words."""
        return tuple(note for line in self.boundaries for note in line.notes)

    @property
    def side_names(self) -> tuple[str, ...]:
        """Names of all sides, rim first, each once."""
        return tuple(
            dict.fromkeys(name for line in self.boundaries for name in line.sides)
        )

    @property
    def names(self) -> tuple[str, ...]:
        """Names of all that can be held: sides, seams, marks."""
        seams = (seam.name for seam in self.seams)
        return (*self.side_names, *seams, *(mark.name for mark in self.marks))

    @property
    def zone_names(self) -> tuple[str, ...]:
        """Names of the zones."""
        return tuple(zone.name for zone in self.zones)

    @property
    def size(self) -> float:
        """Diagonal of the box around it in m."""
        return self.boundaries[0].size

    @property
    def box(self) -> tuple[float, float, float, float]:
        """Smallest x, smallest y, largest x, largest y in m."""
        return self.boundaries[0].box

    @property
    def area(self) -> float:
        """Area of the plate, holes taken off, in m2."""
        return self.boundaries[0].area - sum(line.area for line in self.boundaries[1:])

    @cached_property
    def region(self) -> Any:
        """The plate as a shapely polygon with holes, chords for arcs."""
        import shapely

        rim, *holes = (line.region.exterior.coords for line in self.boundaries)
        return shapely.Polygon(rim, holes)

    @cached_property
    def span(self) -> float:
        """Diameter in m of the largest circle inside the rim, holes disregarded.

        The short side of a rectangle, the diameter of a disc: the length L that a
        plate's thickness is held against.
        """
        if isinstance(self.rim, Circle):
            return 2.0 * self.rim.radius
        import shapely

        region = self.boundaries[0].region
        line = shapely.maximum_inscribed_circle(region, tolerance=1e-4 * self.size)
        return 2.0 * float(shapely.length(line))

    @property
    def smallest_radius(self) -> float | None:
        """Smallest radius in m of an arc of a hole or of a hollow in the rim.

        ``None`` where there is none; the rim's own bulging arcs do not count.
        """
        radii: list[float] = []
        for number, line in enumerate(self.boundaries):
            hollow = line.bulges > 0.0 if number else line.bulges < 0.0
            radii += line.circles[hollow, 2].tolist()
        return min(radii, default=None)

    def zone_area(self, name: str) -> float:
        """Area in m2 of a zone, holes taken off."""
        zone = next(zone for zone in self.zones if zone.name == name)
        return float(zone.shape.line.region.intersection(self.region).area)

    def side_length(self, name: str) -> float:
        """Length in m of a side.

        Raises
        ------
        InputError
            If there is no such side.
        """
        line = self._line_with((name,))
        own = np.array([side == name for side in line.sides])
        return float(line.lengths[own].sum())

    def _line_with(self, sides: tuple[str, ...]) -> Polygon:
        for line in self.boundaries:
            if all(side in line.sides for side in sides):
                return line
        missing = [side for side in sides if side not in self.side_names]
        what = (
            f"there is no side {missing[0]!r}"
            if missing
            else (f"sides {sides[0]!r} and {sides[-1]!r} are not on one line")
        )
        raise InputError(f"{what}; the sides are {', '.join(self.side_names)}.")

    def _replaced(self, line: Polygon, sides: tuple[str, ...]) -> "Outline":
        old = self._line_with(sides)
        number = next(i for i, own in enumerate(self.boundaries) if own is old)
        if number == 0:
            return replace(self, rim=line)
        holes = list(self.holes)
        holes[number - 1] = line
        return replace(self, holes=tuple(holes))

    def _check_names(self) -> None:
        seen: dict[str, object] = {}
        named: list[tuple[str, object, str]] = []
        for number, line in enumerate(self.boundaries):
            named += [(name, number, "side") for name in line.sides]
        inside: list[tuple[str, Sequence[Zone | Seam | Mark]]] = [
            ("zone", self.zones),
            ("seam", self.seams),
            ("mark", self.marks),
        ]
        for kind, items in inside:
            named += [(item.name, (kind, i), kind) for i, item in enumerate(items)]
        for name, owner, kind in named:
            if not isinstance(name, str) or not name or name != name.strip():
                raise InputError(
                    f"a {kind} is called {name!r}; a name is text of at least one "
                    "character and no space around it."
                )
            if seen.setdefault(name, owner) == owner:
                continue
            if kind == "side" and isinstance(seen[name], int):
                raise InputError(
                    f"side name {name!r} stands on two closed lines; the rim and each "
                    "hole need names of their own."
                )
            raise InputError(
                f"{kind} {name!r} has the name of something else; sides, zones, seams "
                "and marks need names of their own."
            )

    def _check_zones(self, least: float) -> None:
        rim = self.boundaries[0].region.buffer(least)
        for zone in self.zones:
            region = zone.shape.line.region
            if not rim.covers(region):
                outside = region.difference(rim).representative_point().coords[0]
                raise InputError(
                    f"zone {zone.name!r} lies outside the outline near {at(outside)}; "
                    "draw it within."
                )
            if region.intersection(self.region).area <= least * self.size:
                raise InputError(f"zone {zone.name!r} lies in a hole; move it.")
        for a, b in combinations(self.zones, 2):
            common = a.shape.line.region.intersection(b.shape.line.region)
            if common.area > least * self.size:
                place = common.representative_point().coords[0]
                raise InputError(
                    f"zones {a.name!r} and {b.name!r} overlap near {at(place)}; zones "
                    "may share edges but not areas."
                )

    def _check_seams_and_marks(self, least: float) -> None:
        import shapely

        plate = self.region.buffer(least)
        for seam in self.seams:
            if not seam.path.is_simple:
                raise InputError(
                    f"seam {seam.name!r} crosses itself; draw it as two seams."
                )
            if not plate.covers(seam.path):
                outside = seam.path.difference(plate).interpolate(0.5, normalized=True)
                raise InputError(
                    f"seam {seam.name!r} leaves the plate near {at(outside.coords[0])};"
                    " end it on the boundary."
                )
        for mark in self.marks:
            if not all(math.isfinite(c) for c in mark.at) or not plate.covers(
                shapely.Point(mark.at)
            ):
                raise InputError(
                    f"mark {mark.name!r} at {at(mark.at)} is not on the plate; it lies "
                    "outside the outline or in a hole."
                )


def _check_inside(rim: Polygon, hole: Polygon, number: int, least: float) -> None:
    """Refuse a hole that is not strictly inside the rim."""
    import shapely

    gap = shapely.shortest_line(rim.region.exterior, hole.region.exterior)
    inside = rim.region.contains(hole.region)
    if inside and gap.length > least:
        return
    touches = rim.region.buffer(least).contains(hole.region)
    how = "touches" if touches else "crosses or lies outside"
    raise InputError(
        f"hole {number} ({hole.sides[0]!r}) {how} the outline near {at(gap.coords[0])};"
        " a hole must lie strictly inside the plate. Move or shrink it, or cut the "
        "notch into the outline."
    )


def _check_apart(
    a: Polygon, b: Polygon, numbers: tuple[int, int], least: float
) -> None:
    """Refuse two holes that overlap or touch."""
    import shapely

    line = shapely.shortest_line(a.region, b.region)
    if line.length > least:
        return
    raise InputError(
        f"holes {numbers[0]} ({a.sides[0]!r}) and {numbers[1]} ({b.sides[0]!r}) "
        f"overlap or touch near {at(line.coords[0])}; move them apart, or draw them as "
        "one hole."
    )
