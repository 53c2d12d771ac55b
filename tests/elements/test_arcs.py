"""Triangles with a round edge: their true region, and the quintic that is lifted there.

Areas, integrals and circles are found again from the circle's centre and the vertices.
"""

import math

import numpy as np
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from rounds import (
    CLAMPED,
    FREE,
    HELD,
    STATES,
    WEIGHT,
    arc_on,
    around,
    fine_rule,
    from_shares,
    round_triangles,
    true_area,
    turns,
)
from strategies import (
    numbers,
    placed,
    points_in,
    polynomials,
    rigidities,
    similarities,
    size_of,
    triangles,
)

from kplate.elements.arcs import Arcs, no_arcs
from kplate.elements.quintic import QUINTIC
from kplate.elements.triangle import EDGES, edge_normals

ORDERS = ((0, 0), (1, 0), (0, 1), (2, 0), (1, 1), (0, 2))
SHARES = np.linspace(0.0, 1.0, 17)
held_states = st.sampled_from([HELD, CLAMPED])
inside = st.tuples(st.floats(0.05, 0.95), st.floats(0.05, 0.95))


def assert_equal(actual, expected, atol=1e-9):
    np.testing.assert_allclose(actual, expected, rtol=0.0, atol=atol)


def sizes(size):
    """What makes the 21 unknowns of a triangle of this size those of one of size 1."""
    return np.array([*[1.0, size, size, size**2, size**2, size**2] * 3, *[size] * 3])


def unknowns(arcs, p):
    """Unknowns of a polynomial, the slope of the round edge in the arc's middle."""
    X, k = arcs.vertices[0], arcs.edges[0]
    at_vertices = np.stack([p.derivative(X, *order) for order in ORDERS], axis=1)
    middles = 0.5 * (np.roll(X, -1, axis=0) + np.roll(X, -2, axis=0))
    middles[k] = around(arcs, np.array([0.5]))[0][2, 0]
    across = np.einsum("kc,kc->k", p.jet(middles)[:, 1:], edge_normals(X[None])[0])
    return np.concatenate([at_vertices.ravel(), across])


def held_as_asked(arcs, u):
    """Unknowns of the size of one, turned to those that the support allows."""
    held = arcs.holds[0], arcs.clamps[0]
    u = u / sizes(size_of(arcs.vertices[0]))
    _, steps = around(arcs, np.array([0.0, 1.0]))
    for vertex, (tx, ty) in zip(arcs.order[0, 1:], steps[2], strict=True):
        own = u[6 * vertex : 6 * vertex + 6]
        t = np.array([tx, ty]) / math.hypot(tx, ty)
        n = np.array([t[1], -t[0]])
        own[0] = 0.0
        own[1:3] -= (own[1:3] @ t) * t
        if held == CLAMPED:
            own[1:3] = 0.0
            own[3:] = (
                own[3:]
                @ [n[0] ** 2, 2.0 * n[0] * n[1], n[1] ** 2]
                * np.array([n[0] ** 2, n[0] * n[1], n[1] ** 2])
            )
    if held == CLAMPED:
        u[18 + arcs.edges[0]] = 0.0
    return u


def barycentrics(arcs, points):
    return arcs.barycentrics(points[None])[0]


def jet(arcs, points, u, order=1):
    """w, slopes times the size, or curvatures times its square, (q, 3)."""
    X = arcs.vertices
    make = QUINTIC.evaluate if order == 1 else QUINTIC.curvature
    size = size_of(X[0])
    rows = make(X, barycentrics(arcs, points)[None], arcs)[0]
    return rows @ u * ([1.0, size, size] if order == 1 else size**2)


# The region.


@given(round_triangles())
def test_the_turn_the_length_and_the_curvature_are_those_of_the_circle(arcs):
    points, steps = around(arcs)
    radius = arcs.circles[0, 2]
    length = WEIGHT @ np.hypot(*steps[2].T)
    assert_equal(arcs.lengths / length, 1.0, 1e-12)
    apart = np.hypot(*(points[2] - arcs.circles[0, :2]).T)
    assert_equal(apart / radius, 1.0, 1e-12)
    bulges = np.sign(arcs.turn[0])
    assert arcs.curvatures[0] == bulges / radius
    middle = around(arcs, np.array([0.5]))[0][2, 0]
    a, b = (arcs.vertices[0, k] for k in EDGES[arcs.edges[0]])
    right = (b - a)[0] * (middle - a)[1] - (b - a)[1] * (middle - a)[0]
    assert np.sign(-right) == bulges


@given(round_triangles(), st.floats(0.0, 1.0))
def test_points_and_frames_of_arcs_are_those_of_the_circle(arcs, share):
    s = np.array([share])
    points, steps = around(arcs, s)
    size = size_of(arcs.vertices[0])
    at, by, twice = (own[0, 0] for own in arcs.at(s))
    assert_equal(at, points[2, 0], 1e-11 * size)
    assert_equal(by, steps[2, 0], 1e-11 * size)
    out = at - arcs.circles[0, :2]
    assert_equal(twice, -(arcs.turn[0] ** 2) * out, 1e-10 * size)
    tangent, normal = (own[0, 0] for own in arcs.frames(s))
    assert_equal(tangent, steps[2, 0] / np.hypot(*steps[2, 0]), 1e-10)
    assert_equal(normal, np.sign(arcs.turn[0]) * out / np.hypot(*out), 1e-9)


@given(round_triangles())
def test_weights_sum_to_the_true_area(arcs):
    points, weights = arcs.rule
    assert_equal(weights.sum() / true_area(arcs), 1.0, 1e-12)
    assert_equal(points.sum(axis=2), 1.0, 1e-12)


@given(round_triangles(), polynomials(9))
def test_quadrature_is_exact_for_polynomials(arcs, p):
    """The integral of p,x is that of p dy around the region, by Green."""
    X = arcs.vertices[0]
    p, size = p.about(X), size_of(X)
    points, weights = arcs.rule
    found = weights[0] @ p.derivative(points[0] @ X, 1, 0) / size
    rims, steps = around(arcs)
    exact = np.einsum("q,eq,eq->", WEIGHT, p.derivative(rims, 0, 0), steps[..., 1])
    assert_equal(found, exact / size, 1e-11)


@given(round_triangles(), inside)
def test_the_cone_finds_t_and_s_again(arcs, shares):
    t, s = shares
    at = barycentrics(arcs, from_shares(arcs, [t], [s]))
    found_t, found_s = arcs.cone(at[None])
    assert_equal([found_t[0, 0], found_s[0, 0]], [t, s], 1e-9)


@given(round_triangles())
def test_the_cone_has_the_ends_of_the_arc_and_the_apex(arcs):
    k = int(arcs.edges[0])
    t, s = arcs.cone(np.eye(3)[[k, (k + 1) % 3, (k + 2) % 3]][None])
    assert_equal(t[0], [0.0, 1.0, 1.0], 1e-10)
    assert_equal(s[0, 1:], [0.0, 1.0], 1e-9)


@given(round_triangles(), points_in(count=4))
def test_bent_points_go_along_their_rays(arcs, points):
    """From the chord to the arc, in the same share of the way; the rest stays."""
    own = Arcs(
        rows=np.array([1]),
        vertices=arcs.vertices,
        edges=arcs.edges,
        circles=arcs.circles,
        holds=arcs.holds,
        clamps=arcs.clamps,
    )
    k = int(arcs.edges[0])
    i, j = EDGES[k]
    eye = np.eye(3)
    chord = np.outer(1.0 - SHARES, eye[i]) + np.outer(SHARES, eye[j])
    sides = np.concatenate([0.3 * eye[k] + 0.7 * eye[[i, j]], eye])
    found = own.bent(np.concatenate([chord, sides, points]), 3)
    for whole in (0, 2):
        assert_equal(found[whole], np.concatenate([chord, sides, points]), 0.0)
    X, (x, y, radius) = arcs.vertices[0], arcs.circles[0]
    on = found[1, : len(SHARES)] @ X
    assert_equal(np.hypot(*(on - (x, y)).T) / radius, 1.0, 1e-10)
    assert_equal(found[1, len(SHARES) : -4], sides, 1e-10)
    t, s = arcs.cone(found[1, None, -4:])
    assert_equal(t[0], points[:, i] + points[:, j], 1e-9)
    assert_equal(s[0], points[:, j] / (points[:, i] + points[:, j]), 1e-8)


@given(round_triangles(apexes=((-1.0, 2.0), (0.05, 1.0))))
def test_steepness_is_positive_where_every_ray_meets_the_arc_once(arcs):
    assume(abs(arcs.steepness[0]) > 0.01)
    ray = around(arcs, np.linspace(0.0, 1.0, 401))[0][2]
    ray = ray - arcs.vertices[0, arcs.edges[0]]
    angle = np.unwrap(np.arctan2(ray[:, 1], ray[:, 0]))
    assert (arcs.steepness[0] > 0.0) == bool((np.diff(angle) > 0.0).all())


def test_steepness_is_the_least_share_of_the_area_that_a_ray_sweeps():
    """Of an arc about the apex it is its sector's; at a tangent ray it is none."""
    X = np.array([(0.0, 0.0), (math.cos(0.4), -math.sin(0.4)), (math.cos(0.4), 0.0)])
    X[2, 1] = math.sin(0.4)
    assert_equal(arc_on(X, 0, 0.8).steepness, 0.8 / math.sin(0.8), 1e-12)
    flat = np.array([(1.0 + 0.5 / math.tan(0.3), 0.5), (0.0, 0.0), (1.0, 0.0)])
    apex = (0.5 / math.tan(0.3), 0.5)
    flat[0] = apex
    assert_equal(arc_on(flat, 0, -0.6).steepness, 0.0, 1e-12)


@given(round_triangles(), st.permutations(range(4)))
def test_arcs_among_some_triangles_are_numbered_as_these(arcs, order):
    many = Arcs(
        rows=np.array([7, 2]),
        vertices=np.repeat(arcs.vertices, 2, axis=0),
        edges=np.array([0, 1]),
        circles=np.repeat(arcs.circles, 2, axis=0),
        holds=np.array([True, False]),
        clamps=np.array([False, False]),
    )
    chosen = np.array([7, 2, 5, 11])[order]
    found = many.among(chosen)
    assert chosen[found.rows].tolist() == [n for n in chosen if n in (7, 2)]
    for row, edge, holds in zip(found.rows, found.edges, found.holds, strict=True):
        assert (edge, holds) == ((0, True) if chosen[row] == 7 else (1, False))
    assert len(many.among(np.array([5, 11]))) == len(no_arcs().among(chosen)) == 0


# The quintic on it.


@given(round_triangles(state=FREE), polynomials(5), inside)
def test_quintics_are_exact_beside_unheld_arcs(arcs, p, shares):
    X = arcs.vertices[0]
    p, size = p.about(X), size_of(X)
    u = unknowns(arcs, p)
    points = from_shares(arcs, *np.array([shares, (1.0, 0.3)]).T)
    assert_equal(jet(arcs, points, u), p.jet(points) * [1.0, size, size])
    assert_equal(jet(arcs, points, u, 2), p.curvature(points) * size**2, 1e-8)


@given(round_triangles(), numbers(21), st.integers(0, 8), inside)
def test_slopes_and_curvatures_are_derivatives(arcs, u, ahead, shares):
    """By differences of fourth order, of w and of the slopes."""
    t, s = 0.3 + 0.65 * shares[0], shares[1]
    X = arcs.vertices[0]
    size, u = size_of(X), u / sizes(size_of(X))
    point = from_shares(arcs, [t], [s])[0]
    step = 1e-3
    way = np.array([math.cos(ahead), math.sin(ahead)])
    near = point + size * step * np.array([[-2], [-1], [1], [2]]) * way
    rates = np.array([1.0, -8.0, 8.0, -1.0]) / (12.0 * step) @ jet(arcs, near, u)
    own, bent = jet(arcs, point[None], u)[0], jet(arcs, point[None], u, 2)[0]
    second = np.array([[bent[0], 0.5 * bent[2]], [0.5 * bent[2], bent[1]]])
    assert_equal(rates, [own[1:] @ way, *(second @ way)], 1e-5)


@given(triangles(), round_triangles(), numbers(2, 21, 2), st.sampled_from([1, 2]))
def test_fields_are_rows_times_unknowns(X, arcs, u, order):
    both = np.stack([X, arcs.vertices[0]])
    second = Arcs(
        rows=np.array([1]),
        vertices=arcs.vertices,
        edges=arcs.edges,
        circles=arcs.circles,
        holds=arcs.holds,
        clamps=arcs.clamps,
    )
    at = np.array([[0.2, 0.3, 0.5], [0.6, 0.3, 0.1]])
    at = second.bent(at, 2)
    u = u / np.stack([sizes(size_of(own)) for own in both])[..., None]
    rows = (QUINTIC.evaluate if order == 1 else QUINTIC.curvature)(both, at, second)
    found = QUINTIC.fields(both, at, u, order, second)
    size = np.array([size_of(own) for own in both])[:, None, None, None]
    scale = size**2 if order == 2 else np.maximum(size, 1.0)
    assert_equal((found - rows @ u[:, None]) * scale, 0.0)


@given(round_triangles(), rigidities(count=1))
def test_stiffness_is_symmetric_and_has_three_free_motions(arcs, D):
    """And no more: unknowns of second derivatives make the least stiffness."""
    size = size_of(arcs.vertices[0])
    S = sizes(size)
    K = QUINTIC.round_stiffness(arcs, D)[0] / (S * S[:, None])
    K /= np.sqrt(np.outer(np.diag(K), np.diag(K)))
    assert_equal(K, K.T, 1e-12)
    values = np.linalg.eigvalsh(K)
    assert_equal(values[:3], 0.0, 1e-13 * np.abs(values).max())
    assert values[3] > 1e4 * np.abs(values[:3]).max()


@given(round_triangles(), rigidities(count=1), numbers(3))
def test_rigid_motions_take_no_force(arcs, D, motion):
    X = arcs.vertices[0]
    size = size_of(X)
    u = np.zeros(21)
    at = u[:18].reshape(3, 6)
    at[:, 0] = motion[0] + (X - X.mean(axis=0)) @ motion[1:] / size
    at[:, 1:3] = motion[1:] / size
    u[18:] = edge_normals(X[None])[0] @ motion[1:] / size
    S = sizes(size)
    K = QUINTIC.round_stiffness(arcs, D)[0] / (S * S[:, None])
    assert_equal(K @ (u * S) / np.abs(K).max(), 0.0, 1e-11)
    # Held or not, they stay what they are.
    points = from_shares(arcs, [0.4, 1.0], [0.2, 0.7])
    w = motion[0] + (points - X.mean(axis=0)) @ motion[1:] / size
    assert_equal(jet(arcs, points, u), np.column_stack([w, [motion[1:]] * 2]))


@given(round_triangles(state=FREE), polynomials(2), rigidities(count=1))
def test_quadratics_have_their_exact_energy(arcs, p, D):
    p = p.about(arcs.vertices[0])
    u = unknowns(arcs, p)
    energy = 0.5 * u @ QUINTIC.round_stiffness(arcs, D)[0] @ u
    kappa = p.curvature(arcs.vertices[0, 0])
    exact = 0.5 * kappa @ D[0] @ kappa * true_area(arcs)
    scale = exact + 1e-3 * np.abs(D).max() / size_of(arcs.vertices[0]) ** 2
    assert_equal(energy / scale, exact / scale)


@settings(max_examples=20)
@given(round_triangles(), numbers(21), rigidities(count=1))
def test_stiffness_is_the_work_of_curvatures(arcs, u, D):
    """Against a tensor rule of 40 points; the steeper a ray the harder the lift."""
    assume(arcs.steepness[0] > 0.3)
    u = u / sizes(size_of(arcs.vertices[0]))
    points, weights = fine_rule(arcs)
    size = size_of(arcs.vertices[0])
    bent = jet(arcs, points, u, 2) / size**2
    exact = np.einsum("q,qa,ab,qb->", weights, bent, D[0], bent)
    found = u @ QUINTIC.round_stiffness(arcs, D)[0] @ u
    scale = exact + 1e-3 * np.abs(D).max() / size**2
    assert_equal(found / scale, exact / scale)


# The lift.


@given(round_triangles(), held_states, numbers(21))
def test_held_arcs_do_not_move(arcs, state, u):
    arcs = arc_on(arcs.vertices[0], arcs.edges[0], arcs.turn[0], state)
    u = held_as_asked(arcs, u)
    found = jet(arcs, around(arcs, SHARES)[0][2], u)
    assert_equal(found[:, 0], 0.0)
    if state == CLAMPED:
        assert_equal(found[:, 1:], 0.0)
    else:
        along = np.einsum("qc,qc->q", found[:, 1:], around(arcs, SHARES)[1][2])
        assert_equal(along / size_of(arcs.vertices[0]), 0.0, 1e-8)


@given(round_triangles(), held_states, numbers(21))
def test_the_lift_leaves_w_and_slopes_at_the_straight_edges(arcs, state, u):
    """Those of the straight triangle, so that w is C1 across them."""
    arcs = arc_on(arcs.vertices[0], arcs.edges[0], arcs.turn[0], state)
    u = held_as_asked(arcs, u)
    X, size = arcs.vertices, size_of(arcs.vertices[0])
    edges = around(arcs, SHARES)[0][:2].reshape(-1, 2)
    at = barycentrics(arcs, edges)[None]
    plain = QUINTIC.evaluate(X, at)[0] @ u * [1.0, size, size]
    assert_equal(jet(arcs, edges, u), plain)


@given(round_triangles(), held_states, numbers(21))
def test_the_lift_has_no_curvature_at_the_apex(arcs, state, u):
    """So that second derivatives are one there, as at every vertex."""
    arcs = arc_on(arcs.vertices[0], arcs.edges[0], arcs.turn[0], state)
    u = u / sizes(size_of(arcs.vertices[0]))
    apex = arcs.vertices[0, arcs.edges]
    close = from_shares(arcs, [1e-7, 1e-5], [0.3, 0.6])
    plain = jet(arcs.unheld(), np.concatenate([apex, close]), u, 2)
    assert_equal(jet(arcs, np.concatenate([apex, close]), u, 2), plain, 1e-6)


# What must not matter.


@given(st.data(), turns, st.sampled_from(STATES), numbers(21), similarities(), inside)
def test_turned_and_scaled_triangles_have_turned_and_scaled_fields(
    data, turn, state, u, similarity, shares
):
    R, size, shift = similarity
    corners = placed(data.draw, [(0.4, 0.9), (0.0, 0.0), (1.0, 0.0)])
    arcs = arc_on(corners, 0, turn, state)
    there = arc_on(size * corners @ R.T + shift, 0, turn, state)
    first = size_of(corners)
    u = u / sizes(first)
    v = u.copy()
    for vertex in range(3):
        own = v[6 * vertex : 6 * vertex + 6]
        own[1:3] = R @ own[1:3] / size
        second = R @ np.array([[own[3], own[4]], [own[4], own[5]]]) @ R.T / size**2
        own[3:] = second[0, 0], second[0, 1], second[1, 1]
    normals, moved = (edge_normals(a.vertices)[0] for a in (arcs, there))
    v[18:] *= np.round(np.einsum("kc,kc->k", normals @ R.T, moved)) / size
    t, s = np.array([shares, (0.7, 1.0)]).T
    here = jet(arcs, from_shares(arcs, t, s), u)
    found = jet(there, from_shares(there, t, s), v)
    here[:, 1:] = here[:, 1:] @ R.T
    assert_equal(found, here, 1e-8)


@given(st.data(), turns, st.sampled_from(STATES), polynomials(5), st.integers(1, 2))
def test_the_numbers_of_the_vertices_do_not_matter(data, turn, state, p, rolled):
    X = placed(data.draw, [(0.4, 0.9), (0.0, 0.0), (1.0, 0.0)])
    p = p.about(X)
    arcs = arc_on(X, 0, turn, state)
    other = arc_on(np.roll(X, rolled, axis=0), rolled, turn, state)
    points = from_shares(arcs, [0.3, 0.8, 1.0], [0.5, 0.1, 0.7])
    for order in (1, 2):
        found = jet(other, points, unknowns(other, p), order)
        assert_equal(found, jet(arcs, points, unknowns(arcs, p), order), 1e-7)


def test_no_arcs_have_no_points():
    """Of no triangles everything is empty, not wrong in shape."""
    points, weights = QUINTIC.round_rule(no_arcs())
    assert points.shape[0] == weights.shape[0] == 0
    assert points.shape[1:] == (weights.shape[1], 3)
    assert QUINTIC.round_stiffness(no_arcs(), np.empty((0, 3, 3))).shape == (0, 21, 21)
