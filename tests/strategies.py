"""Random input for hypothesis: triangles, rigidities, polynomials, unknowns."""

import math
from dataclasses import dataclass, replace

import numpy as np
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp

from kplate.arrays import Floats

_unit = st.floats(-1.0, 1.0)


def numbers(*shape):
    """Arrays of numbers between -1 and 1."""
    return hnp.arrays(float, shape, elements=_unit)


def points_in(*, count):
    """Barycentrics (count, 3) of points inside a triangle."""
    shares = hnp.arrays(float, (count, 3), elements=st.floats(0.01, 1.0))
    return shares.map(lambda s: s / s.sum(axis=1, keepdims=True))


@st.composite
def similarities(draw):
    """A turn (2, 2), a size and a shift (2,)."""
    turn = draw(st.floats(0.0, 2.0 * math.pi))
    c, s = math.cos(turn), math.sin(turn)
    size = 10.0 ** draw(st.floats(-2.0, 2.0))
    return np.array([[c, -s], [s, c]]), size, 3.0 * size * draw(numbers(2))


@st.composite
def triangles(draw):
    """A counter-clockwise triangle (3, 2) of any turn, place and size.

    Its angles are at least 11 degrees.
    """
    apex = draw(st.tuples(st.floats(-0.5, 1.5), st.floats(0.3, 1.5)))
    return placed(draw, [(0.0, 0.0), (1.0, 0.0), apex])


@st.composite
def kites(draw):
    """Two triangles that share an edge: points (4, 2) and their numbers (2, 3).

    The shared points are 0 and 1; either triangle may start with any of its vertices.
    """
    above = draw(st.tuples(st.floats(-0.5, 1.5), st.floats(0.3, 1.5)))
    below = draw(st.tuples(st.floats(-0.5, 1.5), st.floats(-1.5, -0.3)))
    points = placed(draw, [(0.0, 0.0), (1.0, 0.0), above, below])
    starts = draw(st.tuples(st.integers(0, 2), st.integers(0, 2)))
    first, second = np.roll([0, 1, 2], starts[0]), np.roll([1, 0, 3], starts[1])
    return points, np.array([first, second])


def rigidities(*, count):
    """Symmetric positive definite rigidities (count, 3, 3) of any size."""
    size = st.floats(-3.0, 7.0).map(lambda exponent: 10.0**exponent)
    return st.builds(
        lambda A, size: size * (A @ A.swapaxes(1, 2) + 0.2 * np.eye(3)),
        numbers(count, 3, 3),
        size,
    )


@dataclass(frozen=True, kw_only=True)
class Polynomial:
    """The polynomial ``sum of c x**i y**j`` with i + j up to the degree.

    x and y are measured from `origin` in units of `length`.
    """

    degree: int
    coefficients: Floats
    origin: Floats
    length: float

    def about(self, vertices):
        """Make it one of the same numbers, measured from a triangle in its size."""
        return replace(self, origin=vertices.mean(axis=0), length=size_of(vertices))

    def derivative(self, points, i, j):
        """Derivative i times by x and j times by y at points (..., 2)."""
        x, y = np.moveaxis((points - self.origin) / self.length, -1, 0)
        total = np.zeros(x.shape)
        for c, (a, b) in zip(self.coefficients, powers(self.degree), strict=True):
            if a >= i and b >= j:
                factor = math.perm(a, i) * math.perm(b, j)
                total = total + c * factor * x ** (a - i) * y ** (b - j)
        return total / self.length ** (i + j)

    def jet(self, points):
        """Value and slopes at points (..., 2), (..., 3)."""
        return np.stack(
            [self.derivative(points, *ij) for ij in ((0, 0), (1, 0), (0, 1))], axis=-1
        )

    def curvature(self, points):
        """Curvatures ``w,xx, w,yy, 2 w,xy`` at points (..., 2), (..., 3)."""
        xx, yy, xy = (self.derivative(points, *ij) for ij in ((2, 0), (0, 2), (1, 1)))
        return np.stack([xx, yy, 2.0 * xy], axis=-1)


def polynomials(degree):
    """Polynomials with coefficients between -1 and 1."""
    return st.builds(
        Polynomial,
        degree=st.just(degree),
        coefficients=numbers(len(powers(degree))),
        origin=st.just(np.zeros(2)),
        length=st.just(1.0),
    )


def powers(degree):
    """Exponents of x and y, lowest degree first."""
    return [(k - j, j) for k in range(degree + 1) for j in range(k + 1)]


def size_of(vertices):
    """Length of the longest edge of a triangle (3, 2)."""
    return float(np.hypot(*(vertices - np.roll(vertices, 1, axis=0)).T).max())


def placed(draw, corners):
    """Corners (k, 2) turned, scaled and shifted at random."""
    turn, size, shift = draw(similarities())
    return size * np.array(corners) @ turn.T + shift
