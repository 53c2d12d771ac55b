"""The Hsieh-Clough-Tocher triangles, from their ordinates and from their values.

Cubic pieces, a continuous slope and the slope in the middle of each outer edge fix the
full one of twelve unknowns; in the reduced one of nine that slope is linear along it.
"""

import numpy as np
import pytest
from hypothesis import given
from strategies import kites, numbers, polynomials, size_of, triangles

from kplate.elements import bernstein, hct
from kplate.elements.triangle import (
    EDGES,
    Geometry,
    area,
    barycentric_gradients,
    edge_normals,
)
from kplate.quadrature import triangle_rule

both = pytest.mark.parametrize("shape", [hct.HCT, hct.REDUCED], ids=["full", "reduced"])
SHARES = np.linspace(0.0, 1.0, 7)


def middles(X):
    """Middles of the edges of a triangle (3, 2), (3, 2)."""
    return np.array([X[list(ends)].mean(axis=0) for ends in EDGES])


def unknowns(X, p):
    """The twelve unknowns of a field with a jet."""
    normals = edge_normals(X[None])[0]
    across = np.einsum("kc,kc->k", p.jet(middles(X))[:, 1:], normals)
    return np.concatenate([p.jet(X).ravel(), across])


def physical(X, u):
    """Numbers of the size of one as deflections and slopes of such a triangle."""
    weights = np.concatenate(
        [np.tile([1.0, size_of(X), size_of(X)], 3), [size_of(X)] * 3]
    )
    return u / weights[: len(u)]


def between(start, end):
    """Barycentrics on the way from one point to another, (7, 3)."""
    return np.outer(1.0 - SHARES, start) + np.outer(SHARES, end)


def jet(shape, X, barycentrics, u):
    """Deflection, and slopes times the size, at points (q, 3)."""
    rows = shape.evaluate(X[None], barycentrics[None])[0]
    return rows @ u * [1.0, size_of(X), size_of(X)]


def piece_jet(shape, X, k, barycentrics, u):
    """The same from the ordinates of piece k, wherever the points (q, 3) lie."""
    corners = hct.PIECES[k] @ X
    local = barycentrics @ np.linalg.inv(hct.PIECES[k])
    ordinates = shape.ordinates(X[None])[0, k] @ u
    slopes = (
        bernstein.gradients(3, local)
        @ ordinates
        @ barycentric_gradients(corners[None])[0]
    )
    value = bernstein.values(3, local) @ ordinates
    return np.column_stack([value, slopes * size_of(X)])


def own(shape, u):
    """As many of the twelve unknowns as the triangle has."""
    return u if shape is hct.HCT else u[:9]


def assert_equal(actual, expected, atol=1e-11):
    np.testing.assert_allclose(actual, expected, rtol=0.0, atol=atol)


@both
@given(triangles(), numbers(12))
def test_pieces_meet_in_deflection_and_slope(shape, X, u):
    u = own(shape, physical(X, u))
    for v in range(3):
        line = between(np.eye(3)[v], np.full(3, 1 / 3))
        one, other = (piece_jet(shape, X, (v + k) % 3, line, u) for k in (1, 2))
        assert_equal(one, other)


@both
@given(triangles(), numbers(12))
def test_values_come_from_the_piece_that_holds_the_point(shape, X, u):
    u = own(shape, physical(X, u))
    for k in range(3):
        points = triangle_rule(4).points @ hct.PIECES[k]
        assert_equal(jet(shape, X, points, u), piece_jet(shape, X, k, points, u))


@given(triangles(), numbers(12))
def test_slope_in_the_middle_of_an_edge_is_the_unknown(X, u):
    """Along the edge's own normal."""
    u = physical(X, u)
    amid = 0.5 * (1.0 - np.eye(3))
    slopes = jet(hct.HCT, X, amid, u)[:, 1:]
    across = np.einsum("kc,kc->k", slopes, edge_normals(X[None])[0])
    assert_equal(across, u[9:] * size_of(X))


@given(triangles(), numbers(9))
def test_the_reduced_triangle_is_the_full_one_with_mean_slopes(X, u):
    """The slope in the middle of an edge is the mean of those at its ends."""
    u = physical(X, u)
    slopes = u.reshape(3, 3)[:, 1:]
    normals = edge_normals(X[None])[0]
    amid = [
        0.5 * (slopes[i] + slopes[j]) @ n
        for (i, j), n in zip(EDGES, normals, strict=True)
    ]
    whole = np.concatenate([u, amid])
    points = triangle_rule(6).points
    assert_equal(jet(hct.REDUCED, X, points, u), jet(hct.HCT, X, points, whole))


@given(triangles(), numbers(9))
def test_slope_across_an_outer_edge_of_the_reduced_triangle_is_linear(X, u):
    u = physical(X, u)
    for i, j in EDGES:
        along = (X[j] - X[i]) / size_of(X)
        slopes = jet(hct.REDUCED, X, between(*np.eye(3)[[i, j]]), u)[:, 1:]
        across = slopes @ [along[1], -along[0]]
        straight = across[0] + SHARES * (across[-1] - across[0])
        assert_equal(across, straight)


@given(triangles(), numbers(12))
def test_slope_across_an_outer_edge_is_the_parabola_through_three(X, u):
    """Those at the ends and the unknown in the middle."""
    u = physical(X, u)
    for k, (i, j) in enumerate(EDGES):
        n = edge_normals(X[None])[0, k]
        across = jet(hct.HCT, X, between(*np.eye(3)[[i, j]]), u)[:, 1:] @ n
        known = np.array([across[0], u[9 + k] * size_of(X), across[-1]])
        s = SHARES[:, None]
        parabola = np.hstack([(1 - s) * (1 - 2 * s), 4 * s * (1 - s), s * (2 * s - 1)])
        assert_equal(across, parabola @ known)


@both
@given(triangles(), polynomials(3))
def test_cubics_are_exact_along_the_edges(shape, X, p):
    p = p.about(X)
    u = own(shape, unknowns(X, p))
    for i, j in EDGES:
        line = between(*np.eye(3)[[i, j]])
        assert_equal(jet(shape, X, line, u)[:, 0], p.derivative(line @ X, 0, 0))


@given(triangles(), polynomials(2))
def test_quadratics_are_exact_in_the_reduced_triangle(X, p):
    p = p.about(X)
    points = triangle_rule(6).points
    scale = [1.0, size_of(X), size_of(X)]
    found = jet(hct.REDUCED, X, points, unknowns(X, p)[:9])
    assert_equal(found, p.jet(points @ X) * scale)


@given(triangles(), polynomials(3))
def test_cubics_are_exact_in_the_full_triangle(X, p):
    """In deflection, slopes, curvatures and third derivatives."""
    p = p.about(X)
    u, size = unknowns(X, p), size_of(X)
    barycentrics = triangle_rule(6).points
    points = barycentrics @ X
    assert_equal(jet(hct.HCT, X, barycentrics, u), p.jet(points) * [1.0, size, size])
    curvature = hct.HCT.curvature(X[None], barycentrics)[0] @ u
    assert_equal(curvature * size**2, p.curvature(points) * size**2, 1e-10)
    third = hct.HCT.third_derivatives(X[None], barycentrics)[0] @ u
    xxx, xxy, xyy, yyy = (p.derivative(points, 3 - k, k) for k in range(4))
    exact = [[xxx, xyy, 2.0 * xxy], [xxy, yyy, 2.0 * xyy]]
    assert_equal(third * size**3, np.moveaxis(exact, -1, 0) * size**3, 1e-9)


@both
@given(kites(), numbers(4, 3), numbers(2, 3))
def test_deflection_and_both_slopes_are_continuous_across_triangles(
    shape, kite, u, amid
):
    points, corners = kite
    X = points[corners]
    size = size_of(X[0])
    u, amid = u / [1.0, size, size], amid / size
    opposite = [int(np.flatnonzero(own >= 2)[0]) for own in corners]
    amid[1, opposite[1]] = amid[0, opposite[0]]
    traces = []
    for vertices, numbers_of, slopes in zip(X, corners, amid, strict=True):
        ends = np.eye(3)[[list(numbers_of).index(k) for k in (0, 1)]]
        values = own(shape, np.concatenate([u[numbers_of].ravel(), slopes]))
        rows = shape.evaluate(vertices[None], between(*ends)[None])[0]
        traces.append(rows @ values * [1.0, size, size])
    assert_equal(traces[0], traces[1])


def test_uniform_pressure_on_an_equilateral_triangle_loads_its_vertices_evenly():
    """By symmetry a third each, with equal couples towards the centroid."""
    angles = 2.0 * np.pi * np.arange(3) / 3.0
    X = np.column_stack([np.cos(angles), np.sin(angles)])
    geometry = Geometry(vertices=X[None], rule=hct.REDUCED.load_rule)
    f = hct.REDUCED.load(geometry, np.ones((1, len(hct.REDUCED.load_rule.weights))))[
        0
    ].reshape(3, 3)
    np.testing.assert_allclose(f[:, 0], area(X[None])[0] / 3.0, rtol=1e-13)
    inward, around = -X, np.column_stack([X[:, 1], -X[:, 0]])
    couples = np.einsum("vc,vc->v", f[:, 1:], inward)
    assert couples == pytest.approx(couples.mean(), rel=1e-12)
    assert couples.min() > 0.0
    assert_equal(np.einsum("vc,vc->v", f[:, 1:], around), 0.0)


@given(triangles(), numbers(48))
def test_loads_of_the_reduced_triangle_are_those_of_its_ordinates(X, pressure):
    rule = hct.REDUCED.load_rule
    geometry = Geometry(vertices=X[None], rule=rule)
    p = np.resize(np.asarray(pressure), (1, len(rule.weights)))
    whole = hct.REDUCED.load(geometry, p)
    scale = np.tile([1.0, size_of(X), size_of(X)], 3) * abs(area(X[None])[0])
    np.testing.assert_allclose(
        hct.reduced_load(geometry, p) / scale, whole / scale, atol=1e-12
    )
