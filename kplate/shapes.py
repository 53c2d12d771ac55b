"""Shapes that rims and holes have: each gives its boundary as a `Polygon`."""

import math
from abc import ABC, abstractmethod
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike

from kplate import curves
from kplate.arrays import read_only_floats
from kplate.errors import InputError
from kplate.given import as_number, as_pair, as_positive
from kplate.polygon import Polygon


class Shape(ABC):
    """What all shapes take from their boundary."""

    @property
    @abstractmethod
    def line(self) -> Polygon:
        """Its boundary."""

    @property
    def sides(self) -> tuple[str, ...]:
        """Names of its sides, each once."""
        return tuple(dict.fromkeys(self.line.sides))

    @property
    def area(self) -> float:
        """Enclosed area in m2."""
        return self.line.area

    @property
    def perimeter(self) -> float:
        """Length in m."""
        return self.line.perimeter


@dataclass(frozen=True, kw_only=True)
class Circle(Shape):
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
        what = f"circle {self.name!r}"
        _put(self, "centre", as_pair(what, "centre", self.centre))
        _put(self, "radius", as_positive(what, "radius", self.radius))

    @cached_property
    def line(self) -> Polygon:
        """Its boundary: two half circles of one side."""
        (x, y), r = self.centre, self.radius
        return Polygon(
            points=read_only_floats([(x + r, y), (x - r, y)]),
            sides=(self.name, self.name),
            bulges=read_only_floats([1.0, 1.0]),
        )


@dataclass(frozen=True, kw_only=True)
class Slot(Shape):
    """A straight slot with round ends.

    Parameters
    ----------
    centre : tuple of float
        Its middle in m.
    length : float
        From end to end in m, more than the width.
    width : float
        Its width in m.
    name : str
        Name of its rim.
    angle : float
        By how much its length is turned from the x axis, in rad.

    Raises
    ------
    InputError
        If a number is not finite or not positive, or it is no longer than wide.
    """

    centre: tuple[float, float]
    length: float
    width: float
    name: str
    angle: float = 0.0

    def __post_init__(self) -> None:
        """Check the numbers."""
        what = f"slot {self.name!r}"
        _put(self, "centre", as_pair(what, "centre", self.centre))
        _put(self, "angle", as_number(what, "angle", self.angle))
        for key in ("length", "width"):
            _put(self, key, as_positive(what, key, getattr(self, key)))
        if self.length <= self.width:
            raise InputError(
                f"{what} is {self.length:g} m long and {self.width:g} m wide; its "
                "length, from end to end, must be more than its width."
            )

    @cached_property
    def line(self) -> Polygon:
        """Its boundary."""
        half, r = 0.5 * (self.length - self.width), 0.5 * self.width
        points = [(-half, -r), (half, -r), (half, r), (-half, r)]
        return _placed(self, points, [0.0, 1.0, 0.0, 1.0])


@dataclass(frozen=True, kw_only=True)
class Rectangle(Shape):
    """A rectangle, its corners sharp or round.

    Parameters
    ----------
    centre : tuple of float
        Its middle in m.
    size : tuple of float
        Its two lengths in m.
    name : str
        Name of its rim.
    corner_radius : float
        Radius of its corners in m; sharp if 0.
    angle : float
        By how much its first length is turned from the x axis, in rad.

    Raises
    ------
    InputError
        If a number is not finite or not positive, or the corners are too round.
    """

    centre: tuple[float, float]
    size: tuple[float, float]
    name: str
    corner_radius: float = 0.0
    angle: float = 0.0

    def __post_init__(self) -> None:
        """Check the numbers."""
        what = f"rectangle {self.name!r}"
        a, b = _check_box(self, what)
        r = as_number(what, "corner radius", self.corner_radius)
        _put(self, "corner_radius", r)
        if not 0.0 <= r < 0.5 * min(a, b):
            raise InputError(
                f"{what} has corners of radius {r:g} m; it must be at least 0 and less "
                "than half its smaller length."
            )

    @cached_property
    def line(self) -> Polygon:
        """Its boundary."""
        a, b, r = 0.5 * self.size[0], 0.5 * self.size[1], self.corner_radius
        if r == 0.0:
            return _placed(self, [(-a, -b), (a, -b), (a, b), (-a, b)], [0.0] * 4)
        points = [
            (-a + r, -b), (a - r, -b), (a, -b + r), (a, b - r),
            (a - r, b), (-a + r, b), (-a, b - r), (-a, -b + r),
        ]  # fmt: skip
        return _placed(self, points, [0.0, math.tan(math.pi / 8)] * 4)


@dataclass(frozen=True, kw_only=True)
class Ellipse(Shape):
    """An ellipse, as arcs with one tangent where they meet.

    Parameters
    ----------
    centre : tuple of float
        Its middle in m.
    size : tuple of float
        Its two lengths in m.
    name : str
        Name of its rim.
    angle : float
        By how much its first length is turned from the x axis, in rad.
    """

    centre: tuple[float, float]
    size: tuple[float, float]
    name: str
    angle: float = 0.0

    def __post_init__(self) -> None:
        """Check the numbers."""
        _check_box(self, f"ellipse {self.name!r}")

    @cached_property
    def line(self) -> Polygon:
        """Its boundary."""
        points, bulges = curves.ellipse((0.5 * self.size[0], 0.5 * self.size[1]))
        return _placed(self, points, bulges)


ClosedLine = Polygon | Circle | Slot | Rectangle | Ellipse


def _placed(
    shape: Slot | Rectangle | Ellipse, points: ArrayLike, bulges: ArrayLike
) -> Polygon:
    """Polygon of one name from points about the middle of a shape."""
    local = np.asarray(points, dtype=float)
    c, s = math.cos(shape.angle), math.sin(shape.angle)
    turned = local @ np.array([[c, s], [-s, c]])
    return Polygon(
        points=turned + shape.centre,
        sides=(shape.name,) * len(local),
        bulges=read_only_floats(bulges),
        chords="polygon",
    )


def _check_box(shape: Rectangle | Ellipse, what: str) -> tuple[float, float]:
    """Check centre, size and angle of a shape; return its two lengths."""
    _put(shape, "centre", as_pair(what, "centre", shape.centre))
    a, b = (as_positive(what, "size", c) for c in as_pair(what, "size", shape.size))
    _put(shape, "size", (a, b))
    _put(shape, "angle", as_number(what, "angle", shape.angle))
    return a, b


def _put(shape: object, key: str, value: object) -> None:
    object.__setattr__(shape, key, value)
