"""Runs of chords told from polygons, and what they are replaced by."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from kplate.chords import ARC_TURN, ASK_TURN, as_arcs, flattened, lowest, runs
from kplate.polygon import Polygon


def gon(n, radius=1.0, start=0.3):
    """Vertices of a regular polygon, (n, 2)."""
    angle = start + 2.0 * np.pi * np.arange(n) / n
    return radius * np.c_[np.cos(angle), np.sin(angle)]


def rounded(pieces, degrees=90.0, radius=0.2, shift=0):
    """A unit square, one corner rounded by chords of an arc that touches both sides."""
    angle = np.radians(np.linspace(-90.0, degrees - 90.0, pieces + 1))
    arc = (1 - radius, radius) + radius * np.c_[np.cos(angle), np.sin(angle)]
    return np.roll(np.vstack([(0, 0), arc, (1, 1), (0, 1)]), shift, axis=0)


def found(points, sides=None, bulges=None):
    """Runs of a closed line as it stands."""
    n = len(points)
    line = Polygon(points=points, sides=["rim"] * n, chords="polygon")
    sides = ("rim",) * n if sides is None else tuple(sides)
    bulges = np.zeros(n) if bulges is None else np.asarray(bulges, dtype=float)
    return runs(line.points, sides, bulges, line.turns)


@pytest.mark.parametrize("n", [13, 24, 36, 37, 48, 500])
def test_a_regular_polygon_of_more_than_twelve_sides_may_be_a_circle(n):
    (run,) = found(gon(n, radius=2.5))
    assert run.pieces == n
    assert run.radius == pytest.approx(2.5, rel=1e-12)
    assert run.turn == pytest.approx(2.0 * np.pi / n)


@pytest.mark.parametrize("n", [3, 4, 7, 8, 12])
def test_an_octagon_is_a_polygon(n):
    assert found(gon(n)) == []


@pytest.mark.parametrize("shift", range(12))
@pytest.mark.parametrize(("pieces", "number"), [(6, 0), (7, 1), (8, 1), (20, 1)])
def test_a_rounded_corner_of_eight_vertices_or_more_may_be_an_arc(
    pieces, number, shift
):
    points = rounded(pieces, shift=shift)
    runs_found = found(points)
    assert len(runs_found) == number
    for run in runs_found:
        assert run.pieces == pieces
        assert run.radius == pytest.approx(0.2)
        np.testing.assert_allclose(points[run.first], (0.8, 0.0), atol=1e-15)


def test_a_hollow_turns_to_the_right():
    angle = np.radians(np.linspace(180.0, 0.0, 21))
    notch = (0.5, 1.0) + 0.2 * np.c_[np.cos(angle), -np.sin(angle)]
    points = np.vstack([(0, 0), (1, 0), (1, 1), notch[::-1], (0, 1)])
    (run,) = found(points)
    assert run.pieces == 20
    assert run.turn == pytest.approx(-np.radians(9.0))


def test_pieces_of_other_sides_and_arcs_are_no_chords():
    points = gon(24)
    assert found(points, sides=[f"side-{k}" for k in range(24)]) == []
    halves = found(points, sides=["a"] * 12 + ["b"] * 12)
    assert sorted((run.first, run.pieces) for run in halves) == [(0, 12), (12, 12)]
    bulges = np.zeros(24)
    bulges[5] = 0.01
    (run,) = found(points, bulges=bulges)
    assert (run.first, run.pieces) == (6, 23)


def test_vertices_off_the_circle_or_uneven_are_no_arc():
    assert found(gon(24) * (1.0, 0.8)) == []  # an ellipse
    points = gon(24)
    points[7] *= 1.01
    assert all(run.pieces < 24 for run in found(points))
    angle = np.cumsum(np.tile([5.0, 25.0], 12))  # on the circle, unevenly
    angle = np.radians(angle)
    assert found(np.c_[np.cos(angle), np.sin(angle)]) == []


@given(st.integers(16, 200), st.integers(0, 10**6))
def test_coordinates_of_four_digits_are_still_an_arc(n, seed):
    """A drawing's last digit: 0.1 mm on a radius of 1 m."""
    noise = np.random.default_rng(seed).uniform(-0.5e-4, 0.5e-4, (n, 2))
    if (
        2.0 * np.pi / n < 0.05
    ):  # turns differ by more than a third where chords are short
        noise *= 0.1
    (run,) = found(gon(n) + noise)
    assert run.pieces == n
    assert run.radius == pytest.approx(1.0, rel=1e-3)


@pytest.mark.parametrize("n", [13, 24, 48, 49])
def test_a_full_circle_becomes_two_half_circles(n):
    points = gon(n)
    left, sides, bulges = as_arcs(points, ("rim",) * n, np.zeros(n), found(points))
    assert sides == ("rim", "rim")
    np.testing.assert_array_equal(left, points[[0, n // 2]])
    sweeps = 4.0 * np.arctan(bulges)
    np.testing.assert_allclose(sweeps, 2.0 * np.pi * np.array([n // 2, n - n // 2]) / n)


@pytest.mark.parametrize("shift", [0, 3, 11])
def test_a_rounded_corner_becomes_one_arc(shift):
    points = rounded(10, shift=shift)
    n = len(points)
    left, _, bulges = as_arcs(points, ("rim",) * n, np.zeros(n), found(points))
    assert len(left) == 5
    start = int(np.flatnonzero(bulges)[0])
    np.testing.assert_allclose(left[start], (0.8, 0.0), atol=1e-15)
    assert bulges[start] == pytest.approx(math.tan(np.pi / 8))


def test_an_arc_lies_on_the_vertices_whose_turns_were_rounded():
    """Rounded to a micrometre, turns are off by a thousandth, places are not."""
    points = np.round(rounded(100), 6)
    n = len(points)
    line = Polygon(points=points, sides=["rim"] * n)
    x, y, radius = line.circles[line.bulges != 0.0][0]
    off = np.abs(np.hypot(*(points[1:102] - (x, y)).T) - radius)
    assert off.max() < 3e-6


def test_limits_are_those_stated():
    """From ten degrees to thirty it may be either."""
    assert math.degrees(ARC_TURN) == pytest.approx(10.0)
    assert math.degrees(ASK_TURN) == pytest.approx(30.0)


@given(st.lists(st.floats(0.0, 1.0), min_size=4, max_size=40))
def test_the_lowest_are_apart_and_leave_three(off):
    least = lowest(np.array(off))
    assert least.any()
    assert not (least & np.roll(least, 1)).any()
    assert (~least).sum() >= 3


def test_a_flat_vertex_is_dropped_or_put_on_the_line_between_sides():
    points = np.array([(0, 0), (1, 1e-7), (2, 0), (2, 1), (1, 1 + 1e-7), (0, 1)])
    sides = ("a", "a", "b", "c", "d", "e")
    flat = np.array([False, True, False, False, True, False])
    left, names, bulges = flattened(points, sides, np.zeros(6), flat)
    assert names == ("a", "b", "c", "d", "e")
    assert left.tolist() == [[0, 0], [2, 0], [2, 1], [1, 1], [0, 1]]
    assert bulges.tolist() == [0.0] * 5
