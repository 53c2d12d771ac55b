"""What supports hold at a vertex, and the rigid motions they leave."""

import itertools
import math
import re
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from plates import SIDES, grid, rectangle

from kplate.boundary import Constraints, constrain, free_motions, rigid_motions, turns
from kplate.dofs import Numbering
from kplate.elements import ELEMENTS
from kplate.elements.triangle import edge_normals
from kplate.materials import STEEL
from kplate.mesh import Mesh
from kplate.outline import Outline
from kplate.plate import Plate
from kplate.shapes import Circle
from kplate.supports import CLAMPED, FREE, GUIDED, SIMPLY_SUPPORTED

C, S, F, G = CLAMPED, SIMPLY_SUPPORTED, FREE, GUIDED
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


def hold(outline, mesh, supports, *, unknowns=(3, 0), **changes):
    """Constraints for so many unknowns per vertex, per edge and deflections there."""
    plate = Plate(
        outline=outline, thickness=0.01, material=STEEL, supports=supports, **changes
    )
    names = ("per_vertex", "per_edge", "edge_deflections")
    numbering = Numbering(mesh=mesh, **dict(zip(names, unknowns, strict=False)))
    return constrain(plate, numbering)


def held_at(constraints, vertex):
    """Projector on the directions held at a vertex, (p, p); 0 where nothing is."""
    found = np.flatnonzero(constraints.vertices == vertex)
    if not found.size:
        return np.zeros((constraints.numbering.per_vertex,) * 2)
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


# Six unknowns at a vertex

SIX = (6, 1)
TURNED = (45.0, 90.0, 135.0, 180.0, 225.0, 270.0, 330.0)
SLIGHT = (0.01, 0.1, 1.0, 10.0, -0.01, -0.1, -1.0, -10.0)
PAIRS = list(itertools.product([C, S, F, G], repeat=2))
# Directions that stay free at an angle, at a right angle and on a straight side. A
# guided side is a line of symmetry, where at a right angle another can start.
STAY_FREE = {
    (C, C): (0, 0, 1),  # w,nn
    (C, S): (0, 0, 1),
    (S, S): (1, 1, 3),  # w,xy, which makes the corner force; w,n, w,nn, w,tn
    (C, F): (1, 1, 1),
    (S, F): (3, 3, 3),
    (F, F): (6, 6, 6),
    (G, F): (4, 4, 4),  # w, w,t, w,tt, w,nn
    (G, G): (2, 3, 4),  # w and one curvature all round; both, at a right angle
    (G, S): (1, 2, 1),
    (G, C): (0, 1, 1),
}


def stay_free(pair, degrees):
    """How many of the six, by the table."""
    kind = 2 if degrees == 180.0 else int(degrees in (90.0, 270.0))
    return STAY_FREE.get(pair, STAY_FREE.get(pair[::-1]))[kind]


def held_along(*rays):
    """Projector on what a quadratic w must not have, (6, 6).

    Along each ray, a unit vector and its support, it vanishes, or its slope across the
    ray does, or both do: at three points, which is everywhere.
    """
    rows = [np.zeros(6)]
    for (a, b), support in rays:
        for x, y in np.outer((0.4, 1.0, 1.6), (a, b)):
            w = np.array([1.0, x, y, 0.5 * x * x, x * y, 0.5 * y * y])
            slopes = np.array([[0.0, 1.0, 0.0, x, y, 0.0], [0.0, 0.0, 1.0, 0.0, x, y]])
            rows.append(support.holds_deflection * w)
            rows.append(support.holds_slope * (b * slopes[0] - a * slopes[1]))
    _, strength, right = np.linalg.svd(np.array(rows), full_matrices=False)
    directions = right[strength > 1e-10 * max(strength[0], 1e-10)]
    return directions.T @ directions


def at_six(degrees, arriving, leaving, **changes):
    """What is held of six at the corner of a sector."""
    return at_corner(degrees, arriving, leaving, unknowns=SIX, **changes)


def corner_rays(degrees, arriving, leaving):
    return (arriving_tangent(degrees), arriving), (LEAVING, leaving)


@pytest.mark.parametrize("degrees", TURNED)
@pytest.mark.parametrize("pair", PAIRS, ids=lambda p: f"{p[0].name}-{p[1].name}")
def test_of_six_unknowns_just_so_many_stay_free(pair, degrees):
    """Those of the quadratics that do along both sides what their supports ask."""
    found = at_six(degrees, *pair)
    np.testing.assert_allclose(
        found, held_along(*corner_rays(degrees, *pair)), atol=1e-11
    )
    assert 6 - np.trace(found) == pytest.approx(stay_free(pair, degrees))


@pytest.mark.parametrize("turn", SLIGHT)
@pytest.mark.parametrize("pair", PAIRS, ids=lambda p: f"{p[0].name}-{p[1].name}")
def test_a_slight_turn_is_a_corner_where_bends_are_smaller(pair, turn):
    """What a small angle holds is held, though by as little as the angle squared."""
    found = at_six(180.0 - turn, *pair, bend_turn=1e-5)
    expected = held_along(*corner_rays(180.0 - turn, *pair))
    np.testing.assert_allclose(found, expected, atol=1e-9)
    assert 6 - np.trace(found) == pytest.approx(stay_free(pair, 180.0 - turn))


@pytest.mark.parametrize("turn", [1e-13, -1e-13])
@pytest.mark.parametrize("pair", PAIRS, ids=lambda p: f"{p[0].name}-{p[1].name}")
def test_a_turn_of_round_off_is_none(pair, turn):
    found = at_six(180.0 - turn, *pair, bend_turn=0.0)
    np.testing.assert_allclose(found, at_six(180.0, *pair), atol=1e-11)
    assert 6 - np.trace(found) == pytest.approx(stay_free(pair, 180.0))


@pytest.mark.parametrize("turn", [0.01, 1.0, 9.9, -0.01, -1.0, -9.9])
@pytest.mark.parametrize("support", [C, S, F, G], ids=lambda s: s.name)
def test_a_bend_holds_what_a_straight_side_along_its_mean_does(support, turn):
    expected = held_along((unit(20.0 - 0.5 * turn), support))
    found = at_six(180.0 - turn, support, support)
    np.testing.assert_allclose(found, expected, atol=1e-12)


def test_what_stays_free_at_the_edges_of_a_rectangle():
    """South along x: the names of what the table counts."""
    plate, mesh = rectangle({"south": S, "east": S, "north": C, "west": G}), grid(2)
    held = constrain(plate, Numbering(mesh=mesh, per_vertex=6, per_edge=1))
    #                      w  x  y xx xy yy
    for place, expected in {
        (0.5, 0.0): (1, 1, 0, 1, 0, 0),  # simply supported
        (1.0, 0.5): (1, 0, 1, 0, 0, 1),
        (0.5, 1.0): (1, 1, 1, 1, 1, 0),  # clamped
        (0.0, 0.5): (0, 1, 0, 0, 1, 0),  # guided
        (1.0, 0.0): (1, 1, 1, 1, 0, 1),  # the twist of a corner on two supports
        (1.0, 1.0): (1, 1, 1, 1, 1, 1),
        (0.0, 0.0): (1, 1, 0, 1, 1, 0),  # symmetric about x = 0
        (0.0, 1.0): (1, 1, 1, 1, 1, 0),
    }.items():
        (vertex,) = np.flatnonzero((mesh.points == place).all(axis=1))
        np.testing.assert_allclose(held_at(held, vertex), np.diag(expected), atol=1e-12)


@pytest.mark.parametrize("pair", [(C, C), (S, F), (G, G), (S, S)])
@pytest.mark.parametrize("size", SIZES)
def test_what_is_held_of_six_does_not_depend_on_the_size(size, pair):
    supports = dict(zip(("arriving", "leaving"), pair, strict=True))
    for degrees in (90.0, 160.0, 180.0, 300.0):
        outline, mesh = sector(degrees, size)
        found = held_at(hold(outline, mesh, supports, unknowns=SIX), 0)
        np.testing.assert_allclose(found, at_six(degrees, *pair), atol=1e-9)


@given(st.floats(20.0, 340.0), st.sampled_from(PAIRS))
def test_frames_of_six_are_orthonormal_order_by_order(degrees, pair):
    """Neither w nor slopes nor second derivatives mix, whose units differ."""
    outline, mesh = sector(degrees)
    supports = dict(zip(("arriving", "leaving"), pair, strict=True))
    frames = hold(outline, mesh, supports, unknowns=SIX).frames
    np.testing.assert_allclose(
        frames.swapaxes(-1, -2) @ frames,
        np.broadcast_to(np.eye(6), frames.shape),
        atol=1e-12,
    )
    order = np.repeat([0, 1, 2], [1, 2, 3])
    mixed = order[:, None] != order
    np.testing.assert_array_equal(frames[:, mixed], 0.0)


# Seams that meet inside


def wheel(spokes, rim=()):
    """Outline and mesh of a polygon about vertex 0, seams along lines from there.

    Parameters
    ----------
    spokes : dict of str to tuple
        Angles in degrees at which each seam leaves vertex 0: one, or two for a seam
        that runs through it.
    rim : tuple
        Angles of more vertices of the rim.
    """
    inside = [angle % 360.0 for own in spokes.values() for angle in own]
    angles = sorted({*np.arange(15.0, 375.0, 45.0), *rim, *inside})
    n = len(angles)
    points = np.vstack([(0.0, 0.0), unit(np.array(angles))])
    around = np.arange(1, n + 1)
    ends = {angle: 1 + k for k, angle in enumerate(angles)}
    outline = Outline.polygon(points[1:], sides=["rim"] * n)
    edges, of = [], []
    for number, (name, own) in enumerate(spokes.items()):
        far = [ends[angle % 360.0] for angle in own]
        outline = outline.seam(points[[far[0], 0, *far[1:]]], name=name)
        edges += [(far[0], 0), *[(0, end) for end in far[1:]]]
        of += [number] * len(own)
    mesh = Mesh(
        points=points,
        triangles=np.c_[0 * around, around, np.roll(around, -1)],
        boundary_edges=np.c_[around, np.roll(around, -1)],
        boundary_sides=np.zeros(n, dtype=int),
        side_names=("rim",),
        seam_edges=edges,
        seam_numbers=of,
        seam_names=tuple(spokes),
    )
    return outline, mesh


MEETINGS = {
    "a wall that ends inside": ({"a": (S, 20)}, 3),
    "a rail that ends inside": ({"a": (C, 20)}, 1),
    "a wall straight through": ({"a": (S, 20, 200)}, 3),
    "a wall with a corner": ({"a": (S, 20, 150)}, 1),
    "two walls in one line": ({"a": (S, 20), "b": (S, 200)}, 3),
    "two walls at a right angle": ({"a": (S, 20), "b": (S, 110)}, 1),
    "two walls that cross": ({"a": (S, 20, 200), "b": (S, 110, 290)}, 1),
    "three walls": ({"a": (S, 20), "b": (S, 140), "c": (S, 260)}, 0),
    "three walls, two in line": ({"a": (S, 20, 200), "b": (S, 75)}, 1),
    "a wall and a rail": ({"a": (S, 20), "b": (C, 75)}, 0),
    "a wall that goes on as a rail": ({"a": (S, 20), "b": (C, 200)}, 1),
    "a wall across a line of symmetry": ({"a": (S, 20, 200), "b": (G, 110)}, 2),
    "a wall askew to a line of symmetry": ({"a": (S, 20), "b": (G, 75)}, 1),
    "lines of symmetry of a hexagon": ({"a": (G, 0), "b": (G, 60), "c": (G, 120)}, 2),
    "a wall and a free seam": ({"a": (S, 20), "b": (F, 110)}, 3),
}


@pytest.mark.parametrize("name", MEETINGS)
def test_seams_that_meet_inside_hold_what_each_of_them_does(name):
    stated, free = MEETINGS[name]
    supports = {key: support for key, (support, *_) in stated.items()}
    spokes = {key: tuple(map(float, angles)) for key, (_, *angles) in stated.items()}
    held = hold(*wheel(spokes), supports, unknowns=SIX)
    rays = [(unit(a), supports[key]) for key, own in spokes.items() for a in own]
    found = held_at(held, 0)
    np.testing.assert_allclose(found, held_along(*rays), atol=1e-11)
    assert 6 - np.trace(found) == pytest.approx(free)


@pytest.mark.parametrize("support", [C, S, G], ids=lambda s: s.name)
@pytest.mark.parametrize("turn", [0.01, 5.0, 9.9])
def test_a_seam_bends_as_a_side_does(support, turn):
    """With its mean tangent, where the turn is less than the plate's own limit."""
    outline, mesh = wheel({"a": (20.0, 200.0 - turn)})
    found = held_at(hold(outline, mesh, {"a": support}, unknowns=SIX), 0)
    expected = held_along((unit(20.0 - 0.5 * turn), support))
    np.testing.assert_allclose(found, expected, atol=1e-11)
    sharp = hold(outline, mesh, {"a": support}, unknowns=SIX, bend_turn=1e-5)
    expected = held_along((unit(20.0), support), (unit(200.0 - turn), support))
    np.testing.assert_allclose(held_at(sharp, 0), expected, atol=1e-9)


def test_a_mark_holds_w_alone_whatever_else_is_held_there():
    for spokes, supports, free in (
        ({}, {}, 5),
        ({"a": (20.0,)}, {"a": G}, 3),
        ({"a": (20.0, 200.0)}, {"a": S}, 3),
    ):
        outline, mesh = wheel(spokes)
        outline = outline.mark((0.0, 0.0), name="post")
        mesh = replace(mesh, mark_vertices=[0], mark_names=("post",))
        found = held_at(hold(outline, mesh, {"post": S, **supports}, unknowns=SIX), 0)
        rays = [(unit(a), supports["a"]) for own in spokes.values() for a in own]
        expected = held_along(*rays)
        expected[0, 0] = 1.0
        np.testing.assert_allclose(found, expected, atol=1e-12)
        assert 6 - np.trace(found) == pytest.approx(free)


# Unknowns on edges


@pytest.mark.parametrize(
    ("unknowns", "deflections"), [((3, 1), 0), ((6, 1), 0), ((1, 7, 3), 3)]
)
def test_on_edges_deflections_and_slopes_are_held_as_the_support_says(
    unknowns, deflections
):
    """Those of supported sides and seams, and no others."""
    outline = Outline.polygon([(0, 0), (1, 0), (1, 1), (0, 1)], sides=SIDES)
    outline = outline.seam([(0.25, 0.5), (0.75, 0.5)], name="wall")
    outline = outline.seam([(0.5, 0.75), (0.5, 0.5)], name="rail")
    regular = grid(4)
    number = {tuple(p): k for k, p in enumerate(regular.points.tolist())}
    wall = [((0.25, 0.5), (0.5, 0.5)), ((0.5, 0.5), (0.75, 0.5))]
    lines = {"wall": wall, "rail": [((0.5, 0.75), (0.5, 0.5))]}
    mesh = Mesh(
        points=regular.points,
        triangles=regular.triangles,
        boundary_edges=regular.boundary_edges,
        boundary_sides=regular.boundary_sides,
        side_names=SIDES,
        seam_edges=[
            [number[p] for p in edge] for own in lines.values() for edge in own
        ],
        seam_numbers=[0, 0, 1],
        seam_names=tuple(lines),
    )
    supports = {"south": S, "east": C, "north": G, "wall": S, "rail": C}
    held = hold(outline, mesh, supports, unknowns=unknowns)
    p, q = unknowns[:2]
    found = ~held.free[p * len(mesh.points) :].reshape(len(mesh.edges), q)
    expected = np.zeros_like(found)
    middles = mesh.points[mesh.edges].mean(axis=1)
    along = np.diff(mesh.points[mesh.edges], axis=1)[:, 0]
    for edge, ((x, y), (a, b)) in enumerate(zip(middles, along, strict=True)):
        upright, level = a == 0.0, b == 0.0
        support = F
        if y == 0.0 or (level and y == 0.5 and 0.25 < x < 0.75):
            support = S
        elif x == 1.0 or (upright and x == 0.5 and 0.5 < y < 0.75):
            support = C
        elif y == 1.0:
            support = G
        expected[edge, :deflections] = support.holds_deflection
        expected[edge, deflections:] = support.holds_slope
    np.testing.assert_array_equal(found, expected)
    assert len(np.unique(held.on_edges)) == len(held.on_edges) == expected.sum()


def test_where_w_alone_is_at_the_vertices_a_slope_holds_none_of_it():
    outline, mesh = sector(90.0)
    for arriving, leaving in PAIRS:
        supports = {"arriving": arriving, "leaving": leaving}
        held = hold(outline, mesh, supports, unknowns=(1, 7, 3))
        for vertex, ends in ((0, (arriving, leaving)), (1, (leaving,)), (2, ())):
            expected = float(any(support.holds_deflection for support in ends))
            np.testing.assert_allclose(held_at(held, vertex), [[expected]], atol=1e-15)


# What is held is what vanishes along the supported edges


def traces(element, mesh, supports):
    """Rows of all that must vanish along the supported edges, (m, unknowns).

    w and the slope across the edge, at more points than fix them.
    """
    numbering = Numbering(
        mesh=mesh, per_vertex=element.per_vertex, per_edge=element.per_edge
    )
    lines = [
        (supports.get(names[number], F), edge)
        for names, numbers, edges in (
            (mesh.side_names, mesh.boundary_sides, mesh.boundary_edges),
            (mesh.seam_names, mesh.seam_numbers, mesh.seam_edges),
        )
        for number, edge in zip(numbers, edges, strict=True)
    ]
    s = np.linspace(0.0, 1.0, 8)
    rows = [np.zeros((1, numbering.count))]
    for support, edge in lines:
        (k,) = mesh.triangles_at(edge[None])
        corners = mesh.triangles[k]
        start, end = (np.eye(3)[list(corners).index(v)] for v in edge)
        barycentrics = np.outer(1.0 - s, start) + np.outer(s, end)
        jet = element.evaluate(mesh.points[corners][None], barycentrics)[0]
        a, b = mesh.points[edge[1]] - mesh.points[edge[0]]
        own = np.zeros((2, len(s), numbering.count))
        own[0][:, numbering.table[k]] = jet[:, 0] * support.holds_deflection
        across = (b * jet[:, 1] - a * jet[:, 2]) / np.hypot(a, b)
        own[1][:, numbering.table[k]] = across * support.holds_slope
        rows += list(own)
    return np.vstack(rows)


def assert_just_conforming(element, outline, mesh, supports):
    """Of the free space nothing is seen on the supported edges; of all else, all is."""
    unknowns = (element.per_vertex, element.per_edge)
    held = hold(outline, mesh, supports, unknowns=unknowns, bend_turn=0.0)
    T = traces(element, mesh, supports)
    free = np.eye(held.numbering.count)[:, held.free]
    seen = T @ held.turn_back(free)
    np.testing.assert_allclose(seen, 0.0, atol=1e-11 * max(np.abs(T).max(), 1.0))
    strength = np.linalg.svd(T, compute_uv=False)
    rank = np.count_nonzero(strength > 1e-8 * max(strength[0], 1e-8))
    assert rank == np.count_nonzero(~held.free)


conforming = pytest.mark.parametrize("name", ["hct", "quintic"])


@conforming
@pytest.mark.parametrize("degrees", TURNED)
def test_what_is_held_at_a_corner_is_what_vanishes_on_its_sides(name, degrees):
    outline, mesh = sector(degrees)
    for arriving, leaving in PAIRS:
        supports = {"arriving": arriving, "leaving": leaving}
        assert_just_conforming(ELEMENTS[name], outline, mesh, supports)


@conforming
@pytest.mark.parametrize("meeting", MEETINGS)
def test_what_is_held_along_seams_is_what_vanishes_there(name, meeting):
    """With a rim that is free, simply supported, clamped or guided."""
    stated, _ = MEETINGS[meeting]
    supports = {key: support for key, (support, *_) in stated.items()}
    spokes = {key: tuple(map(float, angles)) for key, (_, *angles) in stated.items()}
    outline, mesh = wheel(spokes)
    for rim in (F, S, C, G):
        assert_just_conforming(ELEMENTS[name], outline, mesh, {"rim": rim, **supports})


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


def motions(supports, per_vertex, per_edge):
    """Free motions of a rectangle 2 x 1."""
    plate, mesh = rectangle(supports, a=2.0), grid(4, m=2, a=2.0)
    numbering = Numbering(mesh=mesh, per_vertex=per_vertex, per_edge=per_edge)
    return free_motions(constrain(plate, numbering))


@pytest.mark.parametrize("unknowns", [(3, 0), (3, 1), (6, 1)])
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
def test_free_motions_are_named(supports, words, unknowns):
    assert motions(supports, *unknowns) == words


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
