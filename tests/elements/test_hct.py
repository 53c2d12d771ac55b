"""The reduced Hsieh-Clough-Tocher triangle, from its ordinates and from its values.

Cubic pieces, a continuous slope and a linear slope across each outer edge fix it.
"""

import numpy as np
import pytest
from hypothesis import given
from strategies import kites, numbers, polynomials, size_of, triangles

from kplate.elements import bernstein, hct
from kplate.elements.triangle import EDGES, Geometry, area, barycentric_gradients
from kplate.quadrature import triangle_rule

SHARES = np.linspace(0.0, 1.0, 7)


def unknowns(X, p):
    """Unknowns of a field with a jet."""
    return p.jet(X).ravel()


def physical(X, u):
    """Numbers of the size of one as deflections and slopes of such a triangle."""
    return (u.reshape(-1, 3, 3) / [1.0, size_of(X), size_of(X)]).reshape(u.shape)


def between(start, end):
    """Barycentrics on the way from one point to another, (7, 3)."""
    return np.outer(1.0 - SHARES, start) + np.outer(SHARES, end)


def jet(X, barycentrics, u):
    """Deflection, and slopes times the size, at points (q, 3)."""
    rows = hct.REDUCED.evaluate(X[None], barycentrics[None])[0]
    return rows @ u * [1.0, size_of(X), size_of(X)]


def piece_jet(X, k, barycentrics, u):
    """The same from the ordinates of piece k, wherever the points (q, 3) lie."""
    corners = hct.PIECES[k] @ X
    local = barycentrics @ np.linalg.inv(hct.PIECES[k])
    ordinates = hct.reduced_ordinates(X[None])[0, k] @ u
    slopes = (
        bernstein.gradients(3, local)
        @ ordinates
        @ barycentric_gradients(corners[None])[0]
    )
    value = bernstein.values(3, local) @ ordinates
    return np.column_stack([value, slopes * size_of(X)])


def assert_equal(actual, expected, atol=1e-11):
    np.testing.assert_allclose(actual, expected, rtol=0.0, atol=atol)


@given(triangles(), numbers(9))
def test_pieces_meet_in_deflection_and_slope(X, u):
    u = physical(X, u)
    for v in range(3):
        line = between(np.eye(3)[v], np.full(3, 1 / 3))
        one, other = (piece_jet(X, (v + k) % 3, line, u) for k in (1, 2))
        assert_equal(one, other)


@given(triangles(), numbers(9))
def test_values_come_from_the_piece_that_holds_the_point(X, u):
    u = physical(X, u)
    for k in range(3):
        points = triangle_rule(4).points @ hct.PIECES[k]
        assert_equal(jet(X, points, u), piece_jet(X, k, points, u))


@given(triangles(), numbers(9))
def test_slope_across_an_outer_edge_is_linear(X, u):
    u = physical(X, u)
    for i, j in EDGES:
        along = (X[j] - X[i]) / size_of(X)
        across = jet(X, between(*np.eye(3)[[i, j]]), u)[:, 1:] @ [along[1], -along[0]]
        straight = across[0] + SHARES * (across[-1] - across[0])
        assert_equal(across, straight)


@given(triangles(), polynomials(3))
def test_cubics_are_exact_along_the_edges(X, p):
    p = p.about(X)
    for i, j in EDGES:
        line = between(*np.eye(3)[[i, j]])
        found = jet(X, line, unknowns(X, p))[:, 0]
        assert_equal(found, p.derivative(line @ X, 0, 0))


@given(triangles(), polynomials(2))
def test_quadratics_are_exact(X, p):
    p = p.about(X)
    points = triangle_rule(6).points
    scale = [1.0, size_of(X), size_of(X)]
    assert_equal(jet(X, points, unknowns(X, p)), p.jet(points @ X) * scale)


@given(kites(), numbers(4, 3))
def test_deflection_and_both_slopes_are_continuous_across_triangles(kite, u):
    points, corners = kite
    X = points[corners]
    u /= [1.0, size_of(X[0]), size_of(X[0])]
    traces = []
    for own, numbers_of in zip(X, corners, strict=True):
        ends = np.eye(3)[[list(numbers_of).index(k) for k in (0, 1)]]
        trace = jet(own, between(*ends), u[numbers_of].ravel())
        traces.append(trace / [1.0, size_of(own), size_of(own)])
    scale = [1.0, size_of(X[0]), size_of(X[0])]
    assert_equal(traces[0] * scale, traces[1] * scale)


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
