"""The outline of a plate: sides, holes, zones, seams and marks, checked before meshing.

The rim and the holes are closed lines that run counter-clockwise as stated, with a name
for each side. Zones are areas inside with a thickness, material or load of their own;
seams are lines inside that the mesh follows; marks are single points of it.
"""

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from functools import cached_property
from itertools import combinations
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from kplate import placement, rounding
from kplate.errors import InputError
from kplate.given import as_bulges, as_names, as_points
from kplate.interior import Mark, Seam, Zone, joined
from kplate.polygon import SNAP, Chords, Polygon
from kplate.shapes import Circle, ClosedLine, Ellipse, Rectangle, Slot

__all__ = ["Mark", "Outline", "Seam", "Zone"]

# What is not in a zone.
PLATE = "plate"
_SHAPES = (Polygon, Circle, Slot, Rectangle, Ellipse)


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

    Attributes
    ----------
    joints : tuple of str
        What of zones, seams and marks was moved onto lines that it nearly touched, in
        words.

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
    joints: tuple[str, ...] = field(init=False, default=())

    def __post_init__(self) -> None:
        """Check names, join what nearly touches, check that all lies where it may."""
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
        self._join()
        self._check_places()

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
                bulges=as_bulges(bulges, len(np.atleast_1d(array))),
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
        return self._changed(holes=(*self.holes, *holes))

    def zone(self, shape: ClosedLine, *, name: str) -> "Outline":
        """Return the outline with a zone added."""
        return self._changed(zones=(*self.zones, Zone(shape=shape, name=name)))

    def seam(
        self, points: ArrayLike, *, name: str, bulges: ArrayLike = ()
    ) -> "Outline":
        """Return the outline with a seam added."""
        array = as_points(points, f"the points of seam {name!r}")
        bent = as_bulges(bulges, max(len(np.atleast_1d(array)) - 1, 0))
        seam = Seam(points=array, name=name, bulges=bent)
        return self._changed(seams=(*self.seams, seam))

    def mark(self, place: tuple[float, float], *, name: str) -> "Outline":
        """Return the outline with a marked point added."""
        return self._changed(marks=(*self.marks, Mark(at=place, name=name)))

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
        sides = (first, second)
        line = rounding.filleted(self._line_with(sides), sides, radius, name)
        return self._replaced(line, sides)

    def relieve(
        self, first: str, second: str, *, radius: float, name: str | None = None
    ) -> "Outline":
        """Return the outline with a round relief cut at the corner of two sides.

        Parameters are those of `fillet`; material within the radius is taken off.
        """
        sides = (first, second)
        line = self._line_with(sides)
        hole = line is not self.boundaries[0]
        cut = rounding.relieved(line, sides, radius, name, around_hole=hole)
        return self._replaced(cut, sides)

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
        """What was tidied and moved, in words."""
        tidied = (note for line in self.boundaries for note in line.notes)
        return (*tidied, *self.joints)

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

    def covers(self, place: tuple[float, float]) -> bool:
        """Whether a place in m is on the plate, its rim included."""
        import shapely

        off = self.region.distance(shapely.Point(place))
        return bool(off <= SNAP * self.size)

    def crossed(
        self, start: tuple[float, float], end: tuple[float, float]
    ) -> list[list[tuple[float, float]]]:
        """Pieces of a segment (ends in m) that lie on the plate, but for round-off."""
        import shapely

        cut = self.region.intersection(shapely.LineString([start, end]))
        return [
            [(float(x), float(y)) for x, y in part.coords]
            for part in getattr(cut, "geoms", [cut])
            if part.geom_type == "LineString" and part.length > SNAP * self.size
        ]

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
        """Area in m2 of a zone, holes taken off.

        Raises
        ------
        InputError
            If there is no such zone.
        """
        for zone in self.zones:
            if zone.name == name:
                break
        else:
            known = ", ".join(self.zone_names) or "none"
            raise InputError(f"there is no zone {name!r}; the zones are {known}.")
        own = zone.shape.line
        holes = [h for h in self.boundaries[1:] if h.region.intersects(own.region)]
        if all(own.region.covers(hole.region) for hole in holes):
            return own.area - sum(hole.area for hole in holes)
        return float(own.region.intersection(self.region).area)

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
            return self._changed(rim=line)
        holes = list(self.holes)
        holes[number - 1] = line
        return self._changed(holes=tuple(holes))

    def _changed(self, **changes: Any) -> "Outline":
        """Variant that keeps the notes."""
        outline = replace(self, **changes)
        joints = dict.fromkeys((*self.joints, *outline.joints))
        object.__setattr__(outline, "joints", tuple(joints))
        return outline

    def _join(self) -> None:
        """Put zones, seams and marks on lines that they nearly touch."""
        if not (self.zones or self.seams or self.marks):
            return
        inside = (self.zones, self.seams, self.marks)
        zones, seams, marks, notes = joined(inside, self.boundaries, self.size)
        object.__setattr__(self, "zones", tuple(zones))
        object.__setattr__(self, "seams", tuple(seams))
        object.__setattr__(self, "marks", tuple(marks))
        object.__setattr__(self, "joints", tuple(notes))

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
                    "character, with no space around it."
                )
            if kind == "zone" and name == PLATE:
                raise InputError(
                    f"a zone is called {name!r}; that is the name of the plate around "
                    "the zones, give it another."
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

    def _check_places(self) -> None:
        """Check that holes, zones, seams and marks lie where they may."""
        rim, *holes = self.boundaries
        least = SNAP * self.size
        for number, hole in enumerate(holes, start=1):
            placement.check_hole(rim, hole, number, least)
        placement.check_apart(holes, least)
        zones = [(zone.name, zone.shape.line.region) for zone in self.zones]
        grown = rim.region.buffer(least) if zones else None
        for name, region in zones:
            placement.check_zone(name, region, grown, self.region)
        for (first, c), (second, d) in combinations(zones, 2):
            placement.check_zones_apart((first, second), c, d, least)
        plate = self.region.buffer(least) if self.seams or self.marks else None
        for seam in self.seams:
            placement.check_seam(seam.name, seam.path, plate)
        for mark in self.marks:
            placement.check_mark(mark.name, mark.at, plate)
