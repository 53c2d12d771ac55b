"""Triangles cut by rectangles and discs, against exact areas and moments.

A rectangle a x b has the second moments a^3 b/12 and a b^3/12 about its own axes, a
disc pi r^4/4 about every diameter; of the fourth degree a disc has the integrals
pi r^6/8 of x^4 and pi r^6/24 of x^2 y^2.
"""

import math

import numpy as np
import pytest
import shapely
from plates import grid
from scipy.spatial import Delaunay

from kplate import cutting

SEEDS = range(50)
TURN = np.array([[0.8, -0.6], [0.6, 0.8]])


def scattered(seed, *, points=40):
    """Triangles over a turned square of random size and place, and a random source."""
    random = np.random.default_rng(seed)
    square = np.array([(0, 0), (1, 0), (1, 1), (0, 1)])
    xy = np.vstack([square, 0.02 + 0.96 * random.random((points, 2))])
    corners = xy[Delaunay(xy).simplices]
    u, v = corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]
    clockwise = u[:, 0] * v[:, 1] < u[:, 1] * v[:, 0]
    corners[clockwise] = corners[clockwise, ::-1]
    return placed(corners, random), random


def placed(corners, random):
    turn, size = random.random() * 2 * math.pi, 10 ** random.uniform(-1, 1)
    c, s = math.cos(turn), math.sin(turn)
    shift = 3 * size * random.random(2)
    return size * corners @ np.array([[c, s], [-s, c]]) + shift


def within(triangles, random, share):
    """A point at least this share of the square's side off its edges."""
    points = triangles.reshape(-1, 2)
    middle = 0.5 * (points.min(axis=0) + points.max(axis=0))
    side = math.sqrt(areas(triangles).sum())
    reach = math.sqrt(0.5) * (0.5 - share) * side
    return middle + random.uniform(-reach, reach, 2), side


def areas(triangles):
    u = triangles[:, 1] - triangles[:, 0]
    v = triangles[:, 2] - triangles[:, 0]
    return 0.5 * (u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0])


def rectangle(centre, size, turn):
    c, s = math.cos(turn), math.sin(turn)
    half = 0.5 * np.array([(-1, -1), (1, -1), (1, 1), (-1, 1)]) * size
    return centre + half @ np.array([[c, s], [-s, c]])


def flat(groups):
    """Triangle, point and weight of every quadrature point."""
    owner = [np.repeat(g.triangles, g.weights.shape[1]) for g in groups]
    points = [g.points.reshape(-1, 2) for g in groups]
    weights = [g.weights.ravel() for g in groups]
    return np.concatenate(owner), np.concatenate(points), np.concatenate(weights)


def by_triangle(groups, count):
    owner, _, weights = flat(groups)
    return np.bincount(owner, weights, minlength=count)


def assert_moments(groups, centre, area, second, size):
    """Area, first and second moments about the centre of a patch of this size."""
    _, points, weights = flat(groups)
    arm = (points - centre) / size
    found = [weights.sum(), *(weights @ arm)]
    np.testing.assert_allclose(
        np.array(found) / area, [1.0, 0.0, 0.0], rtol=0.0, atol=1e-12
    )
    moment = np.einsum("q,qa,qb->ab", weights, arm, arm) / area
    np.testing.assert_allclose(moment, second / (area * size**2), rtol=0.0, atol=1e-12)


def assert_disc(groups, centre, r):
    """Area and moments to the fifth degree of a whole disc."""
    area = math.pi * r**2
    assert_moments(groups, centre, area, np.eye(2) * area * r**2 / 4, r)
    _, points, weights = flat(groups)
    x, y = ((points - centre) / r).T
    fourth = np.array([x**4, x**2 * y**2, y**4, x**3 * y, x * y**3]) @ weights
    exact = [1 / 8, 1 / 24, 1 / 8, 0.0, 0.0]
    np.testing.assert_allclose(fourth / area, exact, rtol=0.0, atol=1e-12)
    fifth = np.array([x**a * y ** (5 - a) for a in range(6)]) @ weights
    np.testing.assert_allclose(fifth / area, 0.0, rtol=0.0, atol=1e-12)


def disc_area(triangle, centre, r):
    """Area of a triangle inside a disc: over each edge, sectors and a triangle."""
    total = 0.0
    around = triangle - centre
    for a, b in zip(around, np.roll(around, -1, axis=0), strict=True):
        step = b - a
        length = np.hypot(*step)
        foot = -(a @ step) / length  # along the edge
        off = (a[0] * step[1] - a[1] * step[0]) / length
        half = math.sqrt(max(r**2 - off**2, 0.0))
        low, high = np.clip([foot - half, foot + half], 0.0, length)
        reach = np.arctan2([0.0, low, high, length] - foot, abs(off))
        sectors = (reach[1] - reach[0]) + (reach[3] - reach[2])
        total += 0.5 * math.copysign(r**2 * sectors + abs(off) * (high - low), off)
    return total


@pytest.mark.parametrize("seed", SEEDS)
def test_rectangles_have_their_area_and_moments(seed):
    triangles, random = scattered(seed)
    centre, side = within(triangles, random, 0.22)
    size = side * np.array([random.uniform(0.02, 0.3), random.uniform(0.02, 0.3)])
    turn = random.uniform(0.0, math.pi)
    corners = rectangle(centre, size, turn)
    groups = cutting.inside_polygon(triangles, corners[:: random.choice([1, -1])])
    c, s = math.cos(turn), math.sin(turn)
    Q = np.array([[c, -s], [s, c]])
    second = Q @ np.diag(size**2) @ Q.T * np.prod(size) / 12.0
    assert_moments(groups, centre, np.prod(size), second, size.max())
    each = shapely.area(
        shapely.intersection(shapely.polygons(triangles), shapely.Polygon(corners))
    )
    found = by_triangle(groups, len(triangles))
    np.testing.assert_allclose(found, each, rtol=0.0, atol=1e-12 * np.prod(size))
    assert_inside(groups, triangles, size.max())
    assert all((group.weights.sum(axis=1) > 0.0).all() for group in groups)


@pytest.mark.parametrize("seed", SEEDS)
def test_discs_have_their_area_and_moments(seed):
    triangles, random = scattered(1000 + seed)
    centre, side = within(triangles, random, 0.31)
    r = side * 10.0 ** random.uniform(-3.0, -0.51)
    groups = cutting.inside_disc(triangles, tuple(centre), r)
    assert_disc(groups, centre, r)
    each = [disc_area(triangle, centre, r) for triangle in triangles]
    found = by_triangle(groups, len(triangles))
    np.testing.assert_allclose(found, each, rtol=0.0, atol=1e-11 * r**2)
    assert_inside(groups, triangles, r)
    _, points, _ = flat(groups)
    assert np.hypot(*(points - centre).T).max() < r * (1.0 + 1e-12)


def assert_inside(groups, triangles, size):
    """Points lie in their triangle, and weights are not negative."""
    owner, points, weights = flat(groups)
    assert weights.min() > -1e-14 * size**2
    corners = triangles[owner]
    for k in range(3):
        a, b = corners[:, k], corners[:, k - 2]
        edge, arm = b - a, points - a
        off = (edge[:, 0] * arm[:, 1] - edge[:, 1] * arm[:, 0]) / np.hypot(*edge.T)
        assert off[weights > 1e-14 * size**2].min() > -1e-9 * size


@pytest.mark.parametrize("seed", range(10))
def test_discs_that_reach_over_the_edge_lose_what_is_outside(seed):
    triangles, random = scattered(2000 + seed)
    centre, side = within(triangles, random, 0.0)
    r = side * random.uniform(0.3, 1.0)
    found = by_triangle(cutting.inside_disc(triangles, centre, r), len(triangles))
    each = [disc_area(triangle, centre, r) for triangle in triangles]
    np.testing.assert_allclose(found, each, rtol=0.0, atol=1e-12 * r**2)


SPECIAL_DISCS = {
    "inside one triangle": ((0.4, 0.15), 0.05),
    "around a vertex": ((0.5, 0.5), 0.01),
    "around a vertex, through its neighbours": ((0.5, 0.5), 0.25),
    "on an edge": ((0.5, 0.375), 0.05),
    "touching edges from both sides": ((0.5, 0.375), 0.125),
    "touching an edge": ((0.55, 0.375), 0.05),
    "through a vertex": ((0.55, 0.5), 0.05),
    "covering triangles": ((0.5, 0.5), 0.45),
    "through vertices, covering triangles": ((0.5, 0.5), math.sqrt(0.125)),
    "touching the sides": ((0.5, 0.5), 0.5),
    "touching the corner of the square it is in": ((0.125, 0.125), 0.125),
}


@pytest.mark.parametrize(
    ("size", "shift"),
    [(1.0, (0.0, 0.0)), (3.7, (0.1, -0.3)), (0.05, (7.3, 11.9)), (900.0, (1.0, 2.0))],
)
@pytest.mark.parametrize("turned", [np.eye(2), TURN], ids=["straight", "turned"])
@pytest.mark.parametrize("name", SPECIAL_DISCS)
def test_discs_in_special_positions(name, turned, size, shift):
    mesh = grid(4)
    triangles = size * mesh.points[mesh.triangles] @ turned.T + shift
    place, share = SPECIAL_DISCS[name]
    centre, r = size * turned @ place + shift, size * share
    assert_disc(cutting.inside_disc(triangles, tuple(centre), r), centre, r)
    found = by_triangle(cutting.inside_disc(triangles, centre, r), len(triangles))
    each = [disc_area(triangle, centre, r) for triangle in triangles]
    np.testing.assert_allclose(found, each, rtol=0.0, atol=1e-10 * r**2)


def test_small_discs_around_the_vertices_of_a_large_panel():
    """Round-off where edges meet must not become an arc of its own."""
    triangles, random = scattered(3000, points=200)
    triangles = triangles - triangles.reshape(-1, 2).mean(axis=0)
    side = math.sqrt(areas(triangles).sum())
    for vertex in np.unique(triangles.reshape(-1, 2), axis=0):
        off = np.abs(vertex - triangles.reshape(-1, 2).mean(axis=0)).max()
        if off > 0.3 * side:
            continue
        for r in side * np.array([1e-2, 1e-4, 1e-6]):
            centre = vertex + 0.3 * r * random.uniform(-1.0, 1.0, 2)
            groups = cutting.inside_disc(triangles, tuple(centre), r)
            found = by_triangle(groups, len(triangles))
            round_off = 1e-15 * side * r
            assert found.sum() == pytest.approx(math.pi * r**2, abs=round_off)
            for k in np.flatnonzero(found):
                own = disc_area(triangles[k], centre, r)
                assert found[k] == pytest.approx(own, abs=round_off)


@pytest.mark.parametrize("turned", [np.eye(2), TURN], ids=["straight", "turned"])
def test_circles_that_all_but_touch_edges_from_inside(turned):
    """The chord they lose is as short as double precision has it, or missing."""
    triangle = np.array([[-0.7, 0.0], [0.9, 0.0], [0.1, 1.1]]) @ turned.T
    centre, r = turned @ [0.1, 0.3], 0.3
    for step in range(-20, 21):
        near = r * (1.0 + step * np.finfo(float).eps)
        groups = cutting.inside_disc(triangle[None], tuple(centre), near)
        assert_disc(groups, centre, near)


def test_circles_through_vertices():
    """The circle of each triangle goes through its vertices, to round-off."""
    for seed in range(6):
        triangles, _ = scattered(4000 + seed)
        for corners in triangles:
            edges = corners[1:] - corners[0]
            arm = np.linalg.solve(2.0 * edges, np.einsum("ec,ec->e", edges, edges))
            centre, r = corners[0] + arm, np.hypot(*arm)
            if r > 10.0 * math.sqrt(areas(triangles).sum()):
                continue
            groups = cutting.inside_disc(triangles, tuple(centre), r)
            each = [disc_area(triangle, centre, r) for triangle in triangles]
            np.testing.assert_allclose(
                by_triangle(groups, len(triangles)), each, rtol=0.0, atol=1e-11 * r**2
            )


def test_a_disc_over_everything_is_the_triangles():
    triangles, _ = scattered(5)
    groups = cutting.inside_disc(triangles, tuple(triangles[0, 0]), 100.0)
    found = by_triangle(groups, len(triangles))
    np.testing.assert_allclose(found, areas(triangles), rtol=1e-13)


SPECIAL_RECTANGLES = {
    "along edges, corners at vertices": ((0.5, 0.5), (0.5, 0.5)),
    "inside one triangle": ((0.4, 0.15), (0.05, 0.03)),
    "one side along edges": ((0.5, 0.55), (0.33, 0.1)),
    "corners on edges": ((0.5, 0.5), (0.25, 0.25)),
    "the whole": ((0.5, 0.5), (1.0, 1.0)),
    "a needle": ((0.5, 0.5), (0.9, 1e-3)),
}


@pytest.mark.parametrize("turned", [0.0, math.atan2(0.6, 0.8), math.pi / 4])
@pytest.mark.parametrize("name", SPECIAL_RECTANGLES)
def test_rectangles_in_special_positions(name, turned):
    c, s = math.cos(turned), math.sin(turned)
    Q = np.array([[c, -s], [s, c]])
    mesh = grid(4)
    triangles = mesh.points[mesh.triangles] @ Q.T + [0.7, 0.2]
    place, size = SPECIAL_RECTANGLES[name]
    centre = Q @ place + [0.7, 0.2]
    groups = cutting.inside_polygon(triangles, rectangle(centre, size, turned))
    second = Q @ np.diag(np.square(size)) @ Q.T * np.prod(size) / 12.0
    assert_moments(groups, centre, np.prod(size), second, max(size))


@pytest.mark.parametrize("power", range(6))
def test_rectangles_integrate_quintics(power):
    mesh = grid(3)
    corners = rectangle(np.array([0.5, 0.5]), (0.6, 0.4), 0.0)
    groups = cutting.inside_polygon(mesh.points[mesh.triangles], corners)
    _, points, weights = flat(groups)
    x, y = points.T
    a, b = power + 1, 6 - power
    exact = (0.8**a - 0.2**a) / a * (0.7**b - 0.3**b) / b
    assert weights @ (x**power * y ** (5 - power)) == pytest.approx(exact, rel=1e-13)


def test_a_patch_off_the_triangles_has_no_weight():
    triangles = grid(2).points[grid(2).triangles]
    for at in ((5.0, 5.0), (1.5, 0.5), (-0.5, 0.5), (1.2, 1.2)):
        disc = cutting.inside_disc(triangles, at, 0.25)
        square = cutting.inside_polygon(triangles, rectangle(np.array(at), 0.4, 0.0))
        for groups in (disc, square):
            assert flat(groups)[2].sum() == 0.0
