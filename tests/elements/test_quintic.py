"""The C1 quintic: what its 21 unknowns are, and what two triangles share.

Unknowns are stated here from the field, in the order of the module's docstring.
"""

import numpy as np
from hypothesis import given
from strategies import kites, numbers, polynomials, size_of, triangles

from kplate.elements.quintic import QUINTIC
from kplate.elements.triangle import EDGES, edge_normals
from kplate.quadrature import triangle_rule

SHARES = np.linspace(0.0, 1.0, 9)
AMID = 0.5 * (1.0 - np.eye(3))  # the middles of the edges
ORDERS = ((0, 0), (1, 0), (0, 1), (2, 0), (1, 1), (0, 2))
# Quartics in powers of the share s: at 0, 1 and 1/2, then their derivatives at 0 and 1.
FIVE = np.array(
    [
        [1, 0, 0, 0, 0],
        [1, 1, 1, 1, 1],
        [1, 1 / 2, 1 / 4, 1 / 8, 1 / 16],
        [0, 1, 0, 0, 0],
        [0, 1, 2, 3, 4],
    ]
)


def unknowns(X, p):
    """Unknowns of a polynomial, (21,)."""
    at_vertices = np.stack([p.derivative(X, *order) for order in ORDERS], axis=1)
    slopes = p.jet(AMID @ X)[:, 1:]
    across = np.einsum("kc,kc->k", slopes, edge_normals(X[None])[0])
    return np.concatenate([at_vertices.ravel(), across])


def sizes(size):
    """What makes the 21 unknowns of a triangle of this size those of one of size 1."""
    at_vertex = [1.0, size, size, size**2, size**2, size**2]
    return np.array([*at_vertex * 3, size, size, size])


def jet(X, barycentrics, u):
    """Deflection, and slopes times the size, at points (q, 3)."""
    rows = QUINTIC.evaluate(X[None], barycentrics)[0]
    return rows @ u * [1.0, size_of(X), size_of(X)]


def curvature(X, barycentrics, u):
    """Curvatures times the size squared at points (q, 3)."""
    return QUINTIC.curvature(X[None], barycentrics)[0] @ u * size_of(X) ** 2


def line(k):
    """Barycentrics along edge k in the triangle's own sense, (9, 3)."""
    i, j = EDGES[k]
    return np.outer(1.0 - SHARES, np.eye(3)[i]) + np.outer(SHARES, np.eye(3)[j])


def assert_equal(actual, expected, atol=1e-9):
    np.testing.assert_allclose(actual, expected, rtol=0.0, atol=atol)


@given(triangles(), numbers(21))
def test_second_derivatives_at_the_vertices_are_the_unknowns(X, u):
    found = curvature(X, np.eye(3), u / sizes(size_of(X)))
    xx, xy, yy = u[:18].reshape(3, 6)[:, 3:].T
    assert_equal(found, np.column_stack([xx, yy, 2.0 * xy]))


@given(triangles(), numbers(21))
def test_slope_in_the_middle_of_an_edge_is_the_unknown(X, u):
    """Along the edge's own normal."""
    slopes = jet(X, AMID, u / sizes(size_of(X)))[:, 1:]
    across = np.einsum("kc,kc->k", slopes, edge_normals(X[None])[0])
    assert_equal(across, u[18:])


@given(triangles(), polynomials(5))
def test_quintics_are_exact(X, p):
    """In deflection, slopes, curvatures and third derivatives."""
    p = p.about(X)
    u, size = unknowns(X, p), size_of(X)
    barycentrics = triangle_rule(6).points
    points = barycentrics @ X
    assert_equal(jet(X, barycentrics, u), p.jet(points) * [1.0, size, size])
    assert_equal(curvature(X, barycentrics, u), p.curvature(points) * size**2)
    third = QUINTIC.third_derivatives(X[None], barycentrics)[0] @ u
    xxx, xxy, xyy, yyy = (p.derivative(points, 3 - k, k) for k in range(4))
    exact = [[xxx, xyy, 2.0 * xxy], [xxy, yyy, 2.0 * xyy]]
    assert_equal(third * size**3, np.moveaxis(exact, -1, 0) * size**3, 1e-8)


@given(triangles(), numbers(21))
def test_slope_across_an_edge_is_the_quartic_of_five_unknowns(X, u):
    """Its values at both ends and the middle, its derivatives at both ends."""
    u = u / sizes(size_of(X))
    for k, (i, j) in enumerate(EDGES):
        n, t = edge_normals(X[None])[0, k], X[j] - X[i]
        at_ends = u[:18].reshape(3, 6)[[i, j]]
        values = at_ends[:, 1:3] @ n
        twist = [t[0] * n[0], t[0] * n[1] + t[1] * n[0], t[1] * n[1]]
        changes = at_ends[:, 3:] @ twist  # by the share of the edge
        fixed = np.array([*values, u[18 + k], *changes]) * size_of(X)
        quartic = np.polynomial.Polynomial(np.linalg.solve(FIVE, fixed))
        assert_equal(jet(X, line(k), u)[:, 1:] @ n, quartic(SHARES))


@given(kites(), numbers(4, 6), numbers(2, 3))
def test_slope_across_a_shared_edge_is_one_quartic(kite, u, amid):
    """So are w and the slope along it; second derivatives meet at its ends only."""
    points, corners = kite
    X = points[corners]
    size = size_of(X[0])
    opposite = [int(np.flatnonzero(own >= 2)[0]) for own in corners]
    amid[1, opposite[1]] = amid[0, opposite[0]]
    normal = edge_normals(X[:1])[0, opposite[0]]
    along = points[1] - points[0]
    jets, bends = [], []
    for own, numbers_of, slopes, k in zip(X, corners, amid, opposite, strict=True):
        values = np.concatenate([u[numbers_of].ravel(), slopes]) / sizes(size)
        run = line(k) if numbers_of[EDGES[k][0]] == 0 else line(k)[::-1]
        jets.append(QUINTIC.evaluate(own[None], run)[0] @ values * [1.0, size, size])
        bends.append(QUINTIC.curvature(own[None], run)[0] @ values * size**2)
    assert_equal(jets[0], jets[1])
    across = jets[0][:, 1:] @ normal
    coefficients = np.polynomial.polynomial.polyfit(SHARES, across, 4)
    assert_equal(np.polynomial.polynomial.polyval(SHARES, coefficients), across)
    assert_equal(bends[0][[0, -1]], bends[1][[0, -1]])
    tt = [along[0] ** 2, along[1] ** 2, along[0] * along[1]]  # of xx, yy, 2 xy
    nt = [
        along[0] * normal[0],
        along[1] * normal[1],
        0.5 * (along[0] * normal[1] + along[1] * normal[0]),
    ]
    for row in (np.array(tt) / size**2, np.array(nt) / size):
        assert_equal(bends[0] @ row, bends[1] @ row)
