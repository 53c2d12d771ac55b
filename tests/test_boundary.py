"""What supports hold at a vertex, and the rigid motions they leave."""

import math
import re

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from plates import SIDES, grid, rectangle

from kplate.boundary import Constraints, constrain, free_motions, rigid_motions, turns
from kplate.dofs import Numbering
from kplate.elements.triangle import edge_normals
from kplate.materials import STEEL
from kplate.mesh import Mesh
from kplate.outline import Outline
from kplate.plate import Plate
from kplate.shapes import Circle
from kplate.supports import CLAMPED, FREE, SIMPLY_SUPPORTED

C, S, F = CLAMPED, SIMPLY_SUPPORTED, FREE
ANGLES = (45.0, 90.0, 135.0, 225.0, 270.0, 315.0)
SIZES = (1e-6, 1e-3, 1.0, 1e3, 1e6)


def unit(degrees):
    """Unit vectors at angles from the x axis."""
    radians = np.radians(degrees)
    return np.stack([np.cos(radians), np.sin(radians)], axis=-1)


def sector(degrees, size=1.0, turned=20.0):
    """Outline and mesh of a fan of triangles around vertex 0 with this angle there.

    Side "leaving" leaves vertex 0, side "arriving" ends there, "far" lies opposite.
    """
    n = 2 + int(degrees / 30.0)
    points = size * np.vstack([(0, 0), unit(turned + np.linspace(0, degrees, n))])
    k = np.arange(1, n)
    loop = np.arange(n + 1)
    sides = ["leaving", *["far"] * (n - 1), "arriving"]
    mesh = Mesh(
        points=points,
        triangles=np.c_[np.zeros(n - 1, dtype=int), k, k + 1],
        boundary_edges=np.c_[loop, np.roll(loop, -1)],
        boundary_sides=[0, *[1] * (n - 1), 2],
        side_names=("leaving", "far", "arriving"),
    )
    return Outline.polygon(points, sides=sides), mesh


def ring(n, inner, outer):
    """Outline and mesh of a round plate with a round hole."""
    around = unit(360.0 * np.arange(n) / n)
    p, q = np.arange(n), n + np.arange(n)
    r, s = np.roll(q, -1), np.roll(p, -1)
    mesh = Mesh(
        points=np.vstack([inner * around, outer * around]),
        triangles=np.vstack([np.c_[p, q, r], np.c_[p, r, s]]),
        boundary_edges=np.vstack([np.c_[q, r], np.c_[s, p]]),
        boundary_sides=np.repeat([0, 1], n),
        side_names=("rim", "hole"),
        boundary_circles=np.repeat([0, 1], n),
        circles=[(0, 0, outer), (0, 0, inner)],
    )
    hole = Circle(centre=(0, 0), radius=inner, name="hole")
    return Outline.circle((0, 0), radius=outer).cut(hole), mesh


def hold(outline, mesh, supports, **changes):
    plate = Plate(
        outline=outline, thickness=0.01, material=STEEL, supports=supports, **changes
    )
    return constrain(plate, Numbering(mesh=mesh, per_vertex=3, per_edge=0))


def held_at(constraints, vertex):
    """Projector on the directions held at a vertex, (3, 3); 0 where nothing is."""
    found = np.flatnonzero(constraints.vertices == vertex)
    if not found.size:
        return np.zeros((3, 3))
    i = int(found[0])
    directions = constraints.frames[i][:, constraints.held[i]]
    return directions @ directions.T


def deflection_and_slope_along(*tangents):
    """Projector on w and the slopes along tangents that are square to each other."""
    projector = np.diag([1.0, 0.0, 0.0])
    for t in tangents:
        projector[1:, 1:] += np.outer(t, t)
    return projector


def at_corner(degrees, arriving, leaving, **changes):
    outline, mesh = sector(degrees)
    held = hold(outline, mesh, {"arriving": arriving, "leaving": leaving}, **changes)
    return held_at(held, 0)


LEAVING = unit(20.0)


def arriving_tangent(degrees):
    return -unit(20.0 + degrees)


# The vertex rule


@pytest.mark.parametrize("degrees", ANGLES)
@pytest.mark.parametrize("pair", [(C, C), (S, S), (C, F), (F, C), (S, C), (C, S)])
def test_at_a_corner_these_pairs_hold_everything(pair, degrees):
    """Clamped sides do; so do the two tangents of hard simple supports."""
    np.testing.assert_allclose(at_corner(degrees, *pair), np.eye(3), atol=1e-12)


@pytest.mark.parametrize("degrees", [*ANGLES, 180.0, 179.0, 185.0])
def test_beside_a_free_side_a_simple_support_holds_w_and_its_own_slope(degrees):
    """Not the mean of both tangents, however small the turn."""
    expected = deflection_and_slope_along(LEAVING)
    np.testing.assert_allclose(at_corner(degrees, F, S), expected, atol=1e-12)
    expected = deflection_and_slope_along(arriving_tangent(degrees))
    np.testing.assert_allclose(at_corner(degrees, S, F), expected, atol=1e-12)


@pytest.mark.parametrize("degrees", [*ANGLES, 180.0])
def test_between_free_sides_nothing_is_held(degrees):
    np.testing.assert_array_equal(at_corner(degrees, F, F), np.zeros((3, 3)))


def test_along_a_simple_support_the_slope_across_is_free():
    expected = deflection_and_slope_along(LEAVING)
    np.testing.assert_allclose(at_corner(180.0, S, S), expected, atol=1e-12)


@pytest.mark.parametrize("pair", [(C, C), (C, F), (F, C), (S, C), (C, S)])
def test_on_a_straight_side_a_clamp_holds_everything(pair):
    np.testing.assert_allclose(at_corner(180.0, *pair), np.eye(3), atol=1e-12)


@pytest.mark.parametrize("turn", [0.023, 1.0, 5.0, 9.9, -0.023, -1.0, -5.0, -9.9])
def test_a_bend_has_one_tangent(turn):
    """The mean one; what is square to it stays free."""
    expected = deflection_and_slope_along(unit(20.0 - 0.5 * turn))
    found = at_corner(180.0 - turn, S, S)
    np.testing.assert_allclose(found, expected, atol=1e-12)


@pytest.mark.parametrize("turn", [10.1, -10.1, 30.0])
def test_a_sharper_turn_is_a_corner_and_holds_both_slopes(turn):
    np.testing.assert_allclose(at_corner(180.0 - turn, S, S), np.eye(3), atol=1e-12)


@pytest.mark.parametrize(("turn", "limit", "held"), [(7, 5, 3), (7, 8, 2), (20, 25, 2)])
def test_the_turn_of_a_bend_is_the_plate_s(turn, limit, held):
    found = at_corner(180.0 - turn, S, S, bend_turn=math.radians(limit))
    assert np.trace(found) == pytest.approx(held)


@pytest.mark.parametrize("turn", [0.0, 1e-13, 0.01])
def test_without_bends_a_turn_of_round_off_holds_no_second_slope(turn):
    held = 3.0 if turn > 1e-9 else 2.0
    found = at_corner(180.0 - turn, S, S, bend_turn=0.0)
    assert np.trace(found) == pytest.approx(held)


def test_sides_held_alike_are_one_curve_whatever_their_names():
    """And a bend from one support to another is none."""
    outline, mesh = sector(179.0)
    alike = hold(outline, mesh, {"arriving": S, "leaving": S, "far": C})
    assert np.trace(held_at(alike, 0)) == pytest.approx(2.0)
    mixed = hold(outline, mesh, {"arriving": S, "leaving": C})
    assert np.trace(held_at(mixed, 0)) == pytest.approx(3.0)


@pytest.mark.parametrize("bend_turn", [math.radians(10.0), 0.0])
@pytest.mark.parametrize(("side", "first"), [("rim", 12), ("hole", 0)])
def test_a_circle_holds_the_slope_along_its_true_tangent(side, first, bend_turn):
    """The angle between its chords, 30 degrees here, does not matter."""
    outline, mesh = ring(12, 1.0, 2.0)
    held = hold(outline, mesh, {side: S}, bend_turn=bend_turn)
    assert len(held.vertices) == 12
    for vertex in range(first, first + 12):
        x, y = mesh.points[vertex] / np.hypot(*mesh.points[vertex])
        expected = deflection_and_slope_along((-y, x))
        np.testing.assert_allclose(held_at(held, vertex), expected, atol=1e-12)


def test_a_clamped_circle_holds_everything():
    outline, mesh = ring(12, 1.0, 2.0)
    held = hold(outline, mesh, {"hole": C})
    assert held.held.all()
    assert sorted(held.vertices) == list(range(12))


pairs = st.tuples(st.sampled_from([C, S, F]), st.sampled_from([C, S, F]))


@given(st.floats(20.0, 340.0), pairs)
def test_frames_are_orthonormal_and_begin_with_what_is_held(degrees, pair):
    outline, mesh = sector(degrees)
    held = hold(outline, mesh, {"arriving": pair[0], "leaving": pair[1]})
    products = held.frames.swapaxes(-1, -2) @ held.frames
    np.testing.assert_allclose(
        products, np.broadcast_to(np.eye(3), products.shape), atol=1e-12
    )
    assert (np.diff(held.held.astype(int), axis=1) <= 0).all()


@pytest.mark.parametrize("size", SIZES)
def test_what_is_held_does_not_depend_on_the_size(size):
    for degrees in (90.0, 175.0, 180.0, 300.0):
        outline, mesh = sector(degrees, size)
        small = hold(outline, mesh, {"arriving": S, "leaving": S, "far": F})
        expected = at_corner(degrees, S, S)
        np.testing.assert_allclose(held_at(small, 0), expected, atol=1e-9)


# Turned unknowns


def test_turning_there_and_back_changes_nothing():
    outline, mesh = sector(160.0)
    held = hold(outline, mesh, {"arriving": S, "far": C})
    values = np.random.default_rng(5).normal(size=(3 * len(mesh.points), 2))
    turned = held.turn(values)
    np.testing.assert_allclose(held.turn_back(turned), values, atol=1e-14)
    # Lengths stay: the work of forces on values does too.
    np.testing.assert_allclose(turned.T @ turned, values.T @ values)


def test_turned_unknowns_are_measured_along_the_frames():
    outline, mesh = sector(90.0)
    held = hold(outline, mesh, {"leaving": S})
    values = np.zeros((3 * len(mesh.points), 1))
    i = int(np.flatnonzero(held.vertices == 0)[0])
    values[0:3, 0] = held.frames[i][:, 1]
    np.testing.assert_allclose(held.turn(values)[0:3, 0], [0, 1, 0], atol=1e-14)


def test_what_is_not_held_is_free():
    plate, mesh = rectangle({"south": S}), grid(2)
    held = constrain(plate, Numbering(mesh=mesh, per_vertex=3, per_edge=1))
    count = 3 * 9 + len(mesh.edges)
    assert held.free.shape == (count,)
    assert np.count_nonzero(~held.free) == 3 * 2  # w and the slope along, three times
    south = np.flatnonzero(mesh.points[:, 1] == 0.0)
    assert set(np.flatnonzero(~held.free) // 3) == set(south)


def test_turns_are_positive_to_the_left():
    tangents = np.stack([[unit(10.0), unit(10.0 + turn)] for turn in (30, -170, 179)])
    np.testing.assert_allclose(np.degrees(turns(tangents)), [30, -170, 179])


# Rigid motions


def motions(supports, **changes):
    """Free motions of a rectangle 2 x 1."""
    plate, mesh = rectangle(supports, a=2.0), grid(4, m=2, a=2.0)
    return free_motions(
        constrain(plate, Numbering(mesh=mesh, per_vertex=3, per_edge=0))
    )


@pytest.mark.parametrize(
    ("supports", "words"),
    [
        (
            {},
            [
                "move up and down",
                "tilt about any line in x",
                "tilt about any line in y",
            ],
        ),
        ({"west": S}, ["tilt about x = 0 m"]),
        ({"east": S}, ["tilt about x = 2 m"]),
        ({"south": S}, ["tilt about y = 0 m"]),
        ({"north": S}, ["tilt about y = 1 m"]),
        ({"west": C}, []),
        ({"west": S, "east": S}, []),
        ({"west": S, "north": S}, []),
        (dict.fromkeys(SIDES, S), []),
        (dict.fromkeys(SIDES, C), []),
    ],
)
def test_free_motions_are_named(supports, words):
    assert motions(supports) == words


@pytest.mark.parametrize("size", SIZES)
def test_free_motions_do_not_depend_on_the_size(size):
    """Nor does what a clamped side holds by its slopes alone."""
    points = size * np.array([(0, 0), (1, 0), (1, 1), (0, 1)])
    outline = Outline.polygon(points, sides=SIDES)
    mesh = grid(4, a=size, b=size)
    for supports, words in (
        ({"north": S}, [f"tilt about y = {size:.6g} m"]),
        ({"west": S}, ["tilt about x = 0 m"]),
        ({"west": C}, []),
        ({"west": S, "south": S}, []),
    ):
        assert free_motions(hold(outline, mesh, supports)) == words
    assert len(free_motions(hold(outline, mesh, {}))) == 3


def test_a_short_side_holds_as_a_long_one():
    """A simple support of a thousandth of the length still holds two motions."""
    outline = Outline.polygon([(0, 0), (1000, 0), (1000, 1), (0, 1)], sides=SIDES)
    mesh = grid(50, m=1, a=1000.0)
    assert free_motions(hold(outline, mesh, {"west": S})) == ["tilt about x = 0 m"]
    assert free_motions(hold(outline, mesh, {"west": C})) == []


def test_a_motion_about_an_oblique_side_names_two_points_of_it():
    outline, mesh = sector(120.0)
    (words,) = free_motions(hold(outline, mesh, {"leaving": S}))
    number = r"(-?[\d.e-]+)"
    found = re.fullmatch(
        rf"tilt about the line through \({number}, {number}\) and "
        rf"\({number}, {number}\) m",
        words,
    )
    first, second = np.array(found.groups(), dtype=float).reshape(2, 2)
    nx, ny = unit(110.0)
    assert np.hypot(*(second - first)) > 0.1
    for point in (first, second):
        assert point @ (nx, ny) == pytest.approx(0.0, abs=1e-3)  # printed to 4 digits


def test_two_sides_in_one_line_leave_the_tilt_about_it():
    points = [(0, 0), (1, 0), (1, 1), (2, 1), (2, 0), (3, 0), (3, 2), (0, 2)]
    sides = ["left", "e", "arch", "w", "right", "east", "north", "west"]
    number = [0, 1, 2, 3, 4, 5, 6, 7]
    triangles = [(0, 1, 2), (0, 2, 7), (2, 3, 7), (3, 6, 7), (3, 5, 6), (3, 4, 5)]
    mesh = Mesh(
        points=points,
        triangles=triangles,
        boundary_edges=np.c_[number, np.roll(number, -1)],
        boundary_sides=number,
        side_names=tuple(sides),
    )
    outline = Outline.polygon(points, sides=sides)
    both = hold(outline, mesh, {"left": S, "right": S})
    assert free_motions(both) == ["tilt about y = 0 m"]
    assert free_motions(hold(outline, mesh, {"left": S, "arch": S})) == []


@pytest.mark.parametrize("turn", [0.2, 1.0])
def test_a_support_line_with_a_slight_bend_holds_the_plate(turn):
    outline, mesh = sector(180.0 - turn)
    held = hold(outline, mesh, {"arriving": S, "leaving": S})
    assert free_motions(held) == []


def test_a_supported_circle_holds_the_plate():
    outline, mesh = ring(12, 1.0, 2.0)
    assert free_motions(hold(outline, mesh, {"hole": S})) == []


def test_a_single_point_leaves_the_tilts_about_it():
    """No side of this version is a point; what is held is stated by hand."""
    mesh = grid(3, a=2.0)
    held = Constraints(
        numbering=Numbering(mesh=mesh, per_vertex=3, per_edge=0),
        vertices=np.array([5]),
        frames=np.eye(3)[None],
        held=np.array([[True, False, False]]),
        on_edges=np.empty(0, dtype=int),
    )
    x, y = mesh.points[5]
    assert (
        free_motions(held) == [f"tilt about any line through ({x:.6g}, {y:.6g}) m"] * 2
    )


@given(st.tuples(*[st.floats(-2, 2)] * 3))
def test_rigid_motions_have_the_unknowns_of_their_plane(plane):
    """A plane a + b x + c y has the slopes b and c everywhere."""
    mesh = grid(2, a=3.0)
    numbering = Numbering(mesh=mesh, per_vertex=6, per_edge=1)
    motions = rigid_motions(numbering) @ plane
    a, b, c = plane
    found = numbering.by_vertex(motions)[..., 0]
    np.testing.assert_allclose(found[:, 0], a + mesh.points @ (b, c), atol=1e-14)
    np.testing.assert_allclose(found[:, 1:3], np.tile((b, c), (9, 1)), atol=1e-14)
    np.testing.assert_allclose(found[:, 3:], 0.0, atol=1e-14)
    normals = edge_normals(mesh.points[mesh.triangles])
    own = numbering.on_edges(mesh.triangle_edges)[..., 0]
    np.testing.assert_allclose(motions[own], normals @ (b, c), atol=1e-14)
