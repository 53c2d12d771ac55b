"""Arcs by bulge: against circles, fine chords, and their own ends.

Relations of arcs, chords and segments are elementary geometry.
"""

import math

import numpy as np
import pytest
import shapely
from hypothesis import assume, given
from hypothesis import strategies as st
from strategies import numbers

from kplate import curves


@st.composite
def arcs(draw):
    """Start (1, 2), end (1, 2) and bulge (1,) of an arc of any sweep to 350 degrees."""
    start, end = draw(numbers(2)), draw(numbers(2))
    assume(np.hypot(*(end - start)) > 1e-2)
    sweep = math.radians(draw(st.floats(1.0, 350.0))) * draw(st.sampled_from([-1, 1]))
    return start[None], end[None], np.array([math.tan(0.25 * sweep)])


def along(arc, n=2001):
    """Points (n, 2) at even shares of an arc, from its circle alone."""
    start, _, bulge = arc
    sweep = 4.0 * math.atan(bulge[0])
    x, y, radius = curves.circles(*arc)[0]
    first = math.atan2(start[0, 1] - y, start[0, 0] - x)
    angle = first + np.linspace(0.0, sweep, n)
    return np.array([x, y]) + radius * np.c_[np.cos(angle), np.sin(angle)]


@given(arcs())
def test_a_circle_goes_through_both_ends_and_the_height_of_the_bulge(arc):
    """The height of an arc over its chord is the bulge times half the chord."""
    start, end, bulge = (value[0] for value in arc)
    x, y, radius = curves.circles(*arc)[0]
    chord = end - start
    top = 0.5 * (start + end) + 0.5 * bulge * np.array([chord[1], -chord[0]])
    for point in (start, end, top):
        assert np.hypot(*(point - (x, y))) == pytest.approx(radius, rel=1e-9)


@given(arcs())
def test_points_lie_at_their_share_of_the_length(arc):
    share = np.linspace(0.0, 1.0, 2001)
    start, end, bulge = (np.repeat(value, len(share), axis=0) for value in arc)
    points = curves.points_at(start, end, bulge, share)
    size = curves.circles(*arc)[0, 2]
    np.testing.assert_allclose(points, along(arc), atol=1e-9 * (1.0 + size))
    flat = np.hypot(*np.diff(points, axis=0).T).sum()
    assert curves.lengths(*arc)[0] == pytest.approx(flat, rel=1e-5)


@given(arcs())
def test_tangents_are_those_of_the_first_and_last_steps(arc):
    out, into = curves.tangents(*arc)
    steps = np.diff(along(arc, 20_001), axis=0)
    steps /= np.hypot(*steps.T)[:, None]
    np.testing.assert_allclose(out[0], steps[0], atol=1e-3)
    np.testing.assert_allclose(into[0], steps[-1], atol=1e-3)


@given(arcs())
def test_a_sliver_is_the_area_of_the_fine_chords(arc):
    x, y = (along(arc) - arc[0]).T
    area = 0.5 * np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y)
    radius = curves.circles(*arc)[0, 2]
    assert curves.slivers(*arc)[0] == pytest.approx(area, abs=1e-4 * radius**2)
    assert np.sign(curves.slivers(*arc)[0]) == np.sign(arc[2][0])


def test_straight_pieces_have_no_circle_and_no_sliver():
    pieces = np.array([(0.0, 0.0)]), np.array([(3.0, 4.0)]), np.array([0.0])
    assert np.isnan(curves.circles(*pieces)).all()
    assert curves.slivers(*pieces).tolist() == [0.0]
    assert curves.lengths(*pieces).tolist() == [5.0]
    np.testing.assert_allclose(curves.tangents(*pieces), [[(0.6, 0.8)]] * 2)


def test_a_piece_without_length_has_no_direction():
    point = np.array([(1.0, 2.0)])
    out, into = curves.tangents(point, point, np.array([0.0]))
    assert out.tolist() == into.tolist() == [[0.0, 0.0]]


@given(arcs(), st.floats(0.05, 0.95))
def test_the_parts_of_an_arc_lie_on_it(arc, share):
    start, end, bulge = arc
    middle = curves.points_at(*arc, np.array([share]))
    for a, b, part in ((start, middle, share), (middle, end, 1.0 - share)):
        own = np.array([curves.part(float(bulge[0]), part)])
        np.testing.assert_allclose(
            curves.circles(a, b, own), curves.circles(*arc), rtol=1e-6, atol=1e-6
        )


@given(arcs(), st.floats(0.05, 0.95))
def test_the_arc_through_three_of_its_points_is_itself(arc, share):
    start, end, bulge = arc
    middle = curves.points_at(*arc, np.array([share]))[0]
    assert curves.through(start[0], middle, end[0]) == pytest.approx(bulge[0], rel=1e-6)


def test_three_points_on_a_line_are_no_arc():
    assert curves.through(*np.array([(0.0, 0.0), (1.0, 0.0), (3.0, 0.0)])) == 0.0


@given(arcs(), numbers(2))
def test_distance_and_share_are_those_of_the_nearest_fine_point(arc, point):
    radius = curves.circles(*arc)[0, 2]
    assume(abs(np.hypot(*(point - curves.circles(*arc)[0, :2]))) > 1e-2 * radius)
    fine = along(arc)
    off = np.hypot(*(fine - point).T)
    step = curves.lengths(*arc)[0] / (len(fine) - 1)
    assert curves.distances(point[None], *arc)[0, 0] == pytest.approx(
        off.min(), abs=step
    )
    start, end, bulge = (value[0] for value in arc)
    share = curves.nearest_share(point, start, end, float(bulge))
    nearest = curves.points_at(*arc, np.array([share]))[0]
    assert np.hypot(*(nearest - point)) == pytest.approx(off.min(), abs=step)


def test_the_nearest_point_beyond_a_straight_end_is_the_end():
    a, b = np.array([0.0, 0.0]), np.array([2.0, 0.0])
    assert curves.nearest_share(np.array([5.0, 1.0]), a, b, 0.0) == 1.0
    assert curves.nearest_share(np.array([-5.0, 1.0]), a, b, 0.0) == 0.0
    found = curves.distances(np.array([(5.0, 4.0)]), a[None], b[None], np.zeros(1))
    assert found.tolist() == [[5.0]]


@given(arcs())
def test_chords_for_arcs_are_within_a_millionth(arc):
    """Of the radius and of the length: shallow arcs of huge circles as well."""
    points, owners = curves.flattened(*arc)
    assert (owners == 0).all()
    corners = np.vstack([points, arc[1]])
    chord = np.hypot(*np.diff(corners, axis=0).T)
    radius = curves.circles(*arc)[0, 2]
    height = radius - np.sqrt(radius**2 - 0.25 * chord**2)
    allowed = 1.01e-6 * min(radius, curves.lengths(*arc)[0])
    assert height.max() <= allowed + 1e-9 * radius
    assert len(points) < 2500


def test_a_coarser_step_can_be_asked_for():
    half = np.array([(1.0, 0.0)]), np.array([(-1.0, 0.0)]), np.array([1.0])
    points, _ = curves.flattened(*half, step=math.radians(45.0))
    np.testing.assert_allclose(
        points, [(1, 0), (0.5**0.5, 0.5**0.5), (0, 1), (-(0.5**0.5), 0.5**0.5)],
        atol=1e-15,
    )  # fmt: skip


@given(arcs())
def test_outermost_points_give_the_box_of_the_fine_points(arc):
    fine = along(arc)
    found = np.vstack([curves.outermost(*arc), arc[1]])
    for end in (np.min, np.max):
        np.testing.assert_allclose(
            end(found, axis=0),
            end(fine, axis=0),
            atol=2e-6 * curves.circles(*arc)[0, 2],
        )


@given(arcs(), arcs())
def test_a_biarc_has_the_tangents_asked_for_and_one_where_it_joins(first, second):
    start, end = first[0][0], first[1][0]
    out, into = curves.tangents(*first)[0][0], curves.tangents(*second)[1][0]
    chord = (end - start) / np.hypot(*(end - start))
    assume(out @ chord > -0.7 and into @ chord > -0.7)
    (_, b1), (joint, b2) = curves.biarc(start, end, out, into)
    starts, ends = np.array([start, joint]), np.array([joint, end])
    found = curves.tangents(starts, ends, np.array([b1, b2]))
    np.testing.assert_allclose(found[0][0], out, atol=1e-6)
    np.testing.assert_allclose(found[1][0], found[0][1], atol=1e-6)
    np.testing.assert_allclose(found[1][1], into, atol=1e-6)


@pytest.mark.parametrize("b", [1.0, 0.5, 0.2, 3.0])
def test_an_ellipse_is_off_by_no_more_than_is_said(b):
    """Area pi a b; every point against x^2/a^2 + y^2/b^2 = 1, by Newton's distance."""
    points, bulges = curves.ellipse((1.0, b))
    ends = np.roll(points, -1, axis=0)
    flat, _ = curves.flattened(points, ends, bulges)
    angle = np.linspace(0.0, 2.0 * np.pi, 20_001)
    exact = shapely.LineString(np.c_[np.cos(angle), b * np.sin(angle)])
    off = shapely.distance(exact, shapely.points(flat[::37]))
    assert off.max() < 1e-4 * max(1.0, b)
    out, into = curves.tangents(points, ends, bulges)
    np.testing.assert_allclose(out, np.roll(into, 1, axis=0), atol=1e-9)
    area = shapely.Polygon(points).area + curves.slivers(points, ends, bulges).sum()
    assert area == pytest.approx(np.pi * b, rel=1e-4)
