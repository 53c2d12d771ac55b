"""What every entry of ELEMENTS must satisfy, whatever its unknowns.

Unknowns of a field are found from `evaluate` by least squares, so that nothing is
assumed of them but that w and its slopes at the vertices come first. Exact integrals of
products of barycentrics l are ``2 A a! b! c! / (a + b + c + 2)!`` for l0^a l1^b l2^c.
"""

import math

import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st
from strategies import (
    kites,
    numbers,
    points_in,
    polynomials,
    powers,
    rigidities,
    similarities,
    size_of,
    triangles,
)

from kplate.elements import ELEMENTS
from kplate.elements.triangle import EDGES, Geometry, area, barycentric_gradients
from kplate.materials import Isotropic
from kplate.quadrature import composite, gauss, triangle_rule

every_element = pytest.mark.parametrize(
    "element", ELEMENTS.values(), ids=ELEMENTS.keys()
)
few = settings(max_examples=20)  # of what takes long
FINE = 12  # degree of the rules that stand for exact integrals
LATTICE = np.array([(i, j, 7 - i - j) for i in range(8) for j in range(8 - i)]) / 7.0
# Two triangles that share a vertical edge, the second beginning with its own vertex.
UPRIGHT = (
    np.array([(0.0, 0.0), (0.0, 1.0), (-0.7, 0.4), (0.6, 0.3)]),
    np.array([(0, 1, 2), (3, 1, 0)]),
)


def places(vertices, barycentrics):
    """Points (q, 2) of one triangle."""
    return barycentrics @ vertices


def unknowns_of(element):
    return 3 * (element.per_vertex + element.per_edge)


def rows(element, vertices, barycentrics):
    """Rows of w and slopes of one triangle, (q, 3, d)."""
    return element.evaluate(vertices[None], barycentrics[None])[0]


def fit(matrix, right):
    """Least-squares solution, whose columns may have different units."""
    scale = np.abs(matrix).max(axis=0)
    solution, _, rank, _ = np.linalg.lstsq(matrix / scale, right, rcond=1e-8)
    assert rank == matrix.shape[1]
    return (solution.T / scale).T


def interpolate(element, vertices, jet):
    """Unknowns of the field with this jet at the lattice, (d,)."""
    weight = np.array([1.0, size_of(vertices), size_of(vertices)])[:, None]
    matrix = (rows(element, vertices, LATTICE) * weight).reshape(
        -1, unknowns_of(element)
    )
    return fit(matrix, (jet * weight[:, 0]).ravel())


def moved_unknowns(element, before, after, corners=(0, 1, 2)):
    """Matrix T: unknowns of the same deflection on another triangle.

    Vertex k of `after` is vertex corners[k] of `before`, moved.
    """
    old = rows(element, before, LATTICE)[:, 0]
    new = rows(element, after, LATTICE[:, list(corners)])[:, 0]
    T = fit(new, old)
    S = scales(element, before)
    assert_close(new @ T / S, old / S, 1e-10)
    return T


def scales(element, vertices):
    """Size of each column of w, so that unknowns of different units compare."""
    return np.abs(rows(element, vertices, LATTICE)[:, 0]).max(axis=0)


def stiffness(element, vertices, rigidity):
    """Stiffness of one triangle for rigidity (q, 3, 3) or (3, 3)."""
    geometry = Geometry(vertices=vertices[None], rule=element.rule)
    each = np.broadcast_to(rigidity, (1, len(element.rule.weights), 3, 3))
    return element.stiffness(geometry, each)[0]


def load(element, vertices, pressure):
    """Load of one triangle for a function of barycentrics."""
    geometry = Geometry(vertices=vertices[None], rule=element.load_rule)
    return element.load(geometry, pressure(element.load_rule.points)[None])[0]


def mass(element, vertices, density):
    """Mass matrix of one triangle for a function of barycentrics."""
    geometry = Geometry(vertices=vertices[None], rule=element.load_rule)
    return element.mass(geometry, density(element.load_rule.points)[None])[0]


def geometric(element, vertices, forces):
    """Geometric stiffness of one triangle for a function of barycentrics."""
    geometry = Geometry(vertices=vertices[None], rule=element.load_rule)
    return element.geometric(geometry, forces(element.load_rule.points)[None])[0]


def matrices(element, vertices, rigidity, density, forces):
    """Stiffness, mass and geometric stiffness where the size of the triangle is one."""
    size = area(vertices[None])[0]
    return np.stack(
        [
            stiffness(element, vertices, rigidity) * size,
            mass(element, vertices, density) / size,
            geometric(element, vertices, forces),
        ]
    )


def quadratic(c):
    """The function ``sum of c l_i l_j`` of barycentrics; c all 1 is constant."""
    return lambda l: np.einsum("...i,ij,...j->...", l, c, l)


def linear(c):
    """The function of barycentrics with the values c at the vertices."""
    return lambda l: l @ c


def tensors(forces):
    """Forces n_xx, n_yy, n_xy (..., 3) as tensors, (..., 2, 2)."""
    xx, yy, xy = np.moveaxis(forces, -1, 0)
    return np.stack([np.stack([xx, xy], -1), np.stack([xy, yy], -1)], -1)


def rigid(element, vertices):
    """Unknowns of w = 1 and of the distances from the centroid along x and y, (d, 3).

    The distances count in the size of the triangle.
    """
    arms = (places(vertices, LATTICE) - vertices.mean(axis=0)) / size_of(vertices)
    jets = np.zeros((len(LATTICE), 3, 3))
    jets[:, 0, 0] = 1.0
    jets[:, 0, 1:] = arms
    jets[:, [1, 2], [1, 2]] = 1.0 / size_of(vertices)
    return np.column_stack(
        [interpolate(element, vertices, jets[..., k]) for k in range(3)]
    )


def monomials(points, i=0, j=0, *, degree=5):
    """Derivatives, i by x and j by y, of all monomials at points (q, 2), (q, m)."""
    x, y = points.T
    columns = [
        math.perm(a, i) * math.perm(b, j) * x ** max(a - i, 0) * y ** max(b - j, 0)
        for a, b in powers(degree)
    ]
    return np.column_stack(columns)


def assert_close(actual, expected, atol=1e-9):
    """Compare with a tolerance relative to the largest number."""
    size = np.abs(expected).max()
    np.testing.assert_allclose(actual, expected, rtol=0.0, atol=atol * size)


def assert_equal(actual, expected, atol=1e-9):
    """Compare numbers of the size of one with an absolute tolerance."""
    np.testing.assert_allclose(actual, expected, rtol=0.0, atol=atol)


def assert_matrices(actual, expected):
    """Compare matrices (k, d, d), each in its own size where that is more than one."""
    sizes = np.maximum(np.abs(expected).max(axis=(1, 2), keepdims=True), 1.0)
    assert_equal(actual / sizes, expected / sizes)


@every_element
@given(triangles())
def test_deflections_tell_the_unknowns_apart(element, X):
    E = rows(element, X, LATTICE)[:, 0] / scales(element, X)
    strength = np.linalg.svd(E, compute_uv=False)
    assert len(strength) == unknowns_of(element)
    assert strength[-1] > 1e-3 * strength[0]


@every_element
@given(triangles(), numbers(100))
def test_unknowns_at_vertices_are_deflection_and_slopes(element, X, u):
    u = u[: unknowns_of(element)]
    jet = rows(element, X, np.eye(3)) @ u
    first = u[: 3 * element.per_vertex].reshape(3, -1)[:, :3]
    assert_equal(jet, first, 1e-11)


@every_element
@given(triangles(), st.data())
def test_polynomials_are_in_the_space(element, X, data):
    p = data.draw(polynomials(element.degree)).about(X)
    u = interpolate(element, X, p.jet(places(X, LATTICE)))
    barycentrics = data.draw(points_in(count=5))
    found = rows(element, X, barycentrics) @ u
    weight = [1.0, size_of(X), size_of(X)]
    assert_equal(found * weight, p.jet(places(X, barycentrics)) * weight)


@every_element
@given(triangles(), st.data())
def test_polynomials_are_exact_in_curvature(element, X, data):
    p = data.draw(polynomials(element.degree)).about(X)
    barycentrics = data.draw(points_in(count=5))
    u = interpolate(element, X, p.jet(places(X, LATTICE)))
    found = element.curvature(X[None], barycentrics)[0] @ u
    exact = p.curvature(places(X, barycentrics))
    assert_equal(found * size_of(X) ** 2, exact * size_of(X) ** 2)


@every_element
@given(triangles(), st.data())
def test_polynomials_are_exact_in_energy(element, X, data):
    """The curvature alone does not see a wrong scale of K; the energy does."""
    p = data.draw(polynomials(element.degree)).about(X)
    (D,) = data.draw(rigidities(count=1))
    u = interpolate(element, X, p.jet(places(X, LATTICE)))
    rule = triangle_rule(FINE)
    kappa = p.curvature(places(X, rule.points))
    exact = area(X[None])[0] * np.einsum("q,qa,ab,qb", rule.weights, kappa, D, kappa)
    size = np.abs(D).max() / size_of(X) ** 2
    assert u @ stiffness(element, X, D) @ u == pytest.approx(
        exact, rel=1e-9, abs=1e-10 * size
    )


@every_element
@given(triangles(), st.data())
def test_rigidity_is_taken_point_by_point(element, X, data):
    p = data.draw(polynomials(element.degree)).about(X)
    D = data.draw(rigidities(count=len(element.rule.weights)))
    u = interpolate(element, X, p.jet(places(X, LATTICE)))
    kappa = p.curvature(places(X, element.rule.points))
    energies = np.einsum("qa,qab,qb->q", kappa, D, kappa)
    exact = area(X[None])[0] * element.rule.weights @ energies
    size = np.abs(D).max() / size_of(X) ** 2
    assert u @ stiffness(element, X, D) @ u == pytest.approx(
        exact, rel=1e-9, abs=1e-10 * size
    )


@every_element
@given(triangles(), rigidities(count=1))
def test_stiffness_is_the_energy_of_the_curvature(element, X, D):
    """For any unknowns: the rule of the stiffness is exact where D is constant."""
    rule = composite(element.pieces, triangle_rule(FINE))
    B = element.curvature(X[None], rule.points)[0]
    weights = area(X[None])[0] * rule.weights
    exact = np.einsum("q,qad,ab,qbe->de", weights, B, D[0], B)
    S = np.sqrt(np.diag(exact))
    found = stiffness(element, X, D[0])
    assert_equal(found / np.outer(S, S), exact / np.outer(S, S))


@every_element
@given(triangles(), rigidities(count=2))
def test_one_rigidity_may_be_copied_to_every_point(element, X, D):
    """The closed form for one rigidity a triangle is the sum over the points."""
    geometry = Geometry(vertices=[X, 1.3 * X[[1, 2, 0]]], rule=element.rule)
    count = len(element.rule.weights)
    one = np.broadcast_to(D[:, None], (2, count, 3, 3))
    copied = one.copy()
    assert one.strides[1] == 0 < copied.strides[1]
    for found, expected in zip(
        element.stiffness(geometry, one),
        element.stiffness(geometry, copied),
        strict=True,
    ):
        S = np.sqrt(np.diag(expected))
        assert_equal(found / np.outer(S, S), expected / np.outer(S, S))


@every_element
@given(triangles(), st.data())
def test_stiffness_is_symmetric_with_three_free_motions(element, X, data):
    D = data.draw(rigidities(count=len(element.rule.weights)))
    K = stiffness(element, X, D)
    S = np.sqrt(np.diag(K))
    K = K / np.outer(S, S)
    assert_equal(K, K.T, 1e-13)
    strength = np.linalg.eigvalsh(K)
    assert np.abs(strength[:3]).max() < 1e-12 * strength[-1]
    assert strength[3] > 1e-6 * strength[-1]


@every_element
@few
@given(triangles(), rigidities(count=1), st.integers(0, 2), numbers(3, 3))
def test_renumbering_the_triangle_renumbers_its_matrices(element, X, D, start, c):
    """The turns of the three numbers only: the others make it run clockwise.

    The density is constant, for which the rule of the mass is exact.
    """
    corners = [start, (start + 1) % 3, (start + 2) % 3]
    T = moved_unknowns(element, X, X[corners], corners)
    S = scales(element, X)
    D = D[0] / np.abs(D).max()
    density = quadratic(np.ones((3, 3)))
    found = T.T @ matrices(element, X[corners], D, density, linear(c[corners])) @ T
    expected = matrices(element, X, D, density, linear(c))
    assert_matrices(found / np.outer(S, S), expected / np.outer(S, S))


@every_element
@few
@given(triangles(), rigidities(count=1), similarities(), numbers(3, 3))
def test_turning_and_enlarging_the_triangle_does_so_to_its_matrices(
    element, X, D, motion, c
):
    """For the same w, K falls as 1/size^2, masses and loads grow as size^2."""
    turn, size, shift = motion
    moved = size * X @ turn.T + shift
    T = moved_unknowns(element, X, moved)
    S = scales(element, X)
    D = D[0] / np.abs(D).max()
    bend, pulled = bending_turn(turn), turn @ tensors(c) @ turn.T
    turned = np.linalg.solve(bend.T, D @ np.linalg.inv(bend))
    forces = np.stack([pulled[:, 0, 0], pulled[:, 1, 1], pulled[:, 0, 1]], axis=-1)
    found = T.T @ matrices(element, moved, turned, quadratic(c), linear(forces)) @ T
    expected = matrices(element, X, D, quadratic(c), linear(c))
    assert_matrices(found / np.outer(S, S), expected / np.outer(S, S))
    S *= area(X[None])[0]
    found = T.T @ load(element, moved, quadratic(c)) / size**2
    assert_equal(found / S, load(element, X, quadratic(c)) / S, 1e-10)


def bending_turn(turn):
    """Matrix that turns curvatures ``w,xx, w,yy, 2 w,xy``."""
    columns = []
    for xx, yy, xy in ((1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (0.0, 0.0, 0.5)):
        H = turn @ np.array([[xx, xy], [xy, yy]]) @ turn.T
        columns.append([H[0, 0], H[1, 1], 2.0 * H[0, 1]])
    return np.array(columns).T


@every_element
@given(triangles(), st.floats(1e-3, 0.1), st.floats(0.1, 10.0))
def test_stiffness_grows_with_the_cube_of_the_thickness(element, X, h, factor):
    steel = Isotropic(name="steel", E=210e9, nu=0.3)
    thin = stiffness(element, X, steel.rigidity(h))
    thick = stiffness(element, X, steel.rigidity(factor * h))
    S = scales(element, X)
    assert_close(thick / np.outer(S, S), factor**3 * thin / np.outer(S, S), 1e-12)


@every_element
@given(triangles())
def test_slopes_are_the_derivatives_of_the_deflection(element, X):
    points = composite(element.pieces, triangle_rule(4)).points
    step = 1e-5 * size_of(X)
    moves = barycentric_gradients(X[None])[0].T * step  # barycentrics along x, along y
    S = scales(element, X)
    slopes = rows(element, X, points)[:, 1:] / S
    for c in range(2):
        ahead, behind = (
            rows(element, X, points + sign * moves[c])[:, 0] for sign in (1.0, -1.0)
        )
        difference = (ahead - behind) / (2.0 * step) / S
        assert_close(difference, slopes[:, c], 1e-7)


@every_element
@given(triangles())
def test_conforming_elements_bend_as_their_slopes_do(element, X):
    """Those alone: the energy of the others is not that of any deflection."""
    points = composite(element.pieces, triangle_rule(4)).points
    step = 1e-5 * size_of(X)
    moves = barycentric_gradients(X[None])[0].T * step
    S = scales(element, X)
    by = []
    for move in moves:
        ahead, behind = (rows(element, X, points + s * move)[:, 1:] for s in (1, -1))
        by.append((ahead - behind) / (2.0 * step) / S)
    expected = np.stack([by[0][:, 0], by[1][:, 1], by[0][:, 1] + by[1][:, 0]], axis=1)
    error = np.abs(element.curvature(X[None], points)[0] / S - expected).max()
    assert element.conforming == (error < 1e-6 * np.abs(expected).max())


@every_element
@few
@given(triangles())
def test_third_derivatives_are_those_of_the_deflection(element, X):
    """Those of the polynomial through the deflections of each piece."""
    S = scales(element, X)
    size = size_of(X)
    middle = X.mean(axis=0)
    for piece in element.pieces:
        around, inside = LATTICE @ piece, triangle_rule(4).points @ piece
        at, to = ((l @ X - middle) / size for l in (around, inside))
        w = np.linalg.lstsq(monomials(at), rows(element, X, around)[:, 0] / S)[0]
        xxx, xxy, xyy, yyy = (monomials(to, 3 - k, k) @ w for k in range(4))
        by_x = np.stack([xxx, xyy, 2.0 * xxy], axis=1)
        by_y = np.stack([xxy, yyy, 2.0 * xyy], axis=1)
        found = element.third_derivatives(X[None], inside)[0] / S * size**3
        assert_close(found, np.stack([by_x, by_y], axis=1), 1e-7)


@every_element
@few
@given(triangles())
def test_third_derivatives_are_those_of_the_curvature_of_conforming_elements(
    element, X
):
    """Of those alone: the curvatures of the others are not those of any deflection."""
    points = composite(element.pieces, triangle_rule(4)).points
    step = 1e-5 * size_of(X)
    S = scales(element, X)
    by = []
    for move in barycentric_gradients(X[None])[0].T * step:
        ahead, behind = (
            element.curvature(X[None], points + s * move)[0] for s in (1.0, -1.0)
        )
        by.append((ahead - behind) / (2.0 * step) / S)
    expected = np.stack(by, axis=1)
    error = np.abs(element.third_derivatives(X[None], points)[0] / S - expected).max()
    assert element.conforming == (error < 1e-6 * np.abs(expected).max())


@every_element
@few
@given(triangles())
def test_curvatures_have_the_stated_degree_on_each_piece(element, X):
    """Polynomials of that degree fit them, of one degree less do not."""
    S = scales(element, X)
    for piece in element.pieces:
        points = triangle_rule(8).points @ piece
        at = (points @ X - X.mean(axis=0)) / size_of(X)
        B = (element.curvature(X[None], points)[0] / S).reshape(len(points), -1)
        errors = []
        for degree in (element.curvature_degree, element.curvature_degree - 1):
            basis = monomials(at, degree=degree)
            fitted = basis @ np.linalg.lstsq(basis, B)[0]
            errors.append(np.abs(fitted - B).max() / np.abs(B).max())
        assert errors[0] < 1e-10
        assert errors[1] > 1e-3


@every_element
@given(triangles())
def test_curvature_sums_to_the_slopes_around_the_edge(element, X):
    """Gauss's theorem, whether the element is C1 or takes w on its edges only."""
    rule = composite(element.pieces, triangle_rule(FINE))
    B = element.curvature(X[None], rule.points)[0]
    inside = area(X[None])[0] * np.einsum("q,qad->ad", rule.weights, B)
    s, weights = gauss(8)
    around = np.zeros_like(inside)
    for i, j in EDGES:
        along = X[j] - X[i]
        n = np.array([along[1], -along[0]])  # outward, times the length
        barycentrics = np.outer(1.0 - s, np.eye(3)[i]) + np.outer(s, np.eye(3)[j])
        slope = np.einsum("q,qcd->cd", weights, rows(element, X, barycentrics)[:, 1:])
        around += [n[0] * slope[0], n[1] * slope[1], n[1] * slope[0] + n[0] * slope[1]]
    S = scales(element, X)
    assert_close(inside / S, around / S)


@every_element
@given(triangles())
def test_curvature_along_an_edge_is_that_of_the_deflection(element, X):
    s = 0.5 - 0.5 * np.cos(np.pi * (np.arange(8) + 0.5) / 8)
    S = scales(element, X)
    found, expected = [], []
    for i, j in EDGES:
        t = X[j] - X[i]
        barycentrics = np.outer(1.0 - s, np.eye(3)[i]) + np.outer(s, np.eye(3)[j])
        w = rows(element, X, barycentrics)[:, 0] / S
        second = np.polynomial.polynomial.polyder(
            np.polynomial.polynomial.polyfit(s, w, 5), 2
        )
        expected.append(np.polynomial.polynomial.polyval(s, second).T)
        B = element.curvature(X[None], barycentrics)[0] / S
        found.append(np.einsum("a,qad->qd", [t[0] ** 2, t[1] ** 2, t[0] * t[1]], B))
    assert_close(np.array(found), np.array(expected), 1e-8)


@every_element
@given(kites(), numbers(2, 100), st.lists(st.floats(0.0, 1.0), min_size=1))
@example(UPRIGHT, np.cos(np.arange(200.0)).reshape(2, 100), [0.0, 0.3, 0.6, 1.0])
def test_triangles_with_the_same_unknowns_agree_along_a_shared_edge(
    element, kite, u, shares
):
    """In w; in w and both slopes where the element is conforming.

    An edge's own unknowns mean the same in both triangles, whatever their numbers are.
    """
    points, corners = kite
    X = points[corners]
    at = [[list(own).index(k) for k in (0, 1)] for own in corners]
    u = u[:, : unknowns_of(element)] / scales(element, X[0])
    first = 3 * element.per_vertex
    vertex = u[:, :first].reshape(2, 3, -1)  # views
    edge = u[:, first:].reshape(2, 3, -1)
    vertex[1, at[1]] = vertex[0, at[0]]
    edge[1, 3 - sum(at[1])] = edge[0, 3 - sum(at[0])]  # opposite the third vertex
    kept = 3 if element.conforming else 1
    weight = np.array([1.0, size_of(X[0]), size_of(X[0])])[:kept]
    s = np.array(shares)
    traces = []
    for own, ends, values in zip(X, np.eye(3)[at], u, strict=True):
        barycentrics = np.outer(1.0 - s, ends[0]) + np.outer(s, ends[1])
        traces.append(rows(element, own, barycentrics)[:, :kept] @ values * weight)
    assert_equal(traces[0], traces[1], 1e-10)


@every_element
@given(triangles(), numbers(3, 3))
def test_load_is_the_pressure_times_the_deflection(element, X, c):
    p = quadratic(c)
    rule = composite(element.pieces, triangle_rule(FINE))
    w = rows(element, X, rule.points)[:, 0]
    exact = area(X[None])[0] * (rule.weights * p(rule.points)) @ w
    S = scales(element, X) * area(X[None])[0]
    assert_equal(load(element, X, p) / S, exact / S, 1e-12)


@every_element
@given(triangles(), numbers(3, 3))
def test_load_has_the_force_and_moments_of_the_pressure(element, X, c):
    middle = X.mean(axis=0)
    force = area(X[None])[0] * sum(
        c[i, j] * moment_of(i, j) for i in range(3) for j in range(3)
    )
    corner = area(X[None])[0] * np.array(
        [
            sum(c[i, j] * moment_of(i, j, k) for i in range(3) for j in range(3))
            for k in range(3)
        ]
    )
    f = load(element, X, quadratic(c))
    one = interpolate(element, X, np.tile([1.0, 0.0, 0.0], (len(LATTICE), 1)))
    size = area(X[None])[0]
    assert f @ one / size == pytest.approx(force / size, abs=1e-11)
    for axis in range(2):
        arm = places(X, LATTICE)[:, axis] - middle[axis]
        slope = np.tile(np.eye(2)[axis], (len(LATTICE), 1))
        u = interpolate(element, X, np.column_stack([arm, slope]))
        moment = corner @ (X[:, axis] - middle[axis])
        size = area(X[None])[0] * size_of(X)
        assert f @ u / size == pytest.approx(moment / size, abs=1e-11)


def moment_of(*factors):
    """Mean over a triangle of a product of barycentrics."""
    counts = [factors.count(k) for k in range(3)]
    top = math.prod(math.factorial(count) for count in counts)
    return 2.0 * top / math.factorial(sum(counts) + 2)


@every_element
@given(triangles(), st.data())
def test_load_works_on_polynomials_exactly(element, X, data):
    p = data.draw(polynomials(2)).about(X)
    w = data.draw(polynomials(element.degree)).about(X)
    rule = triangle_rule(FINE)
    points = places(X, rule.points)
    product = p.derivative(points, 0, 0) * w.derivative(points, 0, 0)
    u = interpolate(element, X, w.jet(places(X, LATTICE)))
    f = load(element, X, lambda l: p.derivative(places(X, l), 0, 0))
    assert f @ u / area(X[None])[0] == pytest.approx(rule.weights @ product, abs=1e-11)


@every_element
@few
@given(triangles(), numbers(3, 3), st.data())
def test_mass_is_exact_on_polynomials(element, X, c, data):
    """Any two for a constant density; one and a lower one for a quadratic density."""
    rule = triangle_rule(FINE)
    points = places(X, rule.points)
    w = data.draw(polynomials(element.degree)).about(X)
    u = interpolate(element, X, w.jet(places(X, LATTICE)))
    for degree, density in (
        (element.degree, quadratic(np.full((3, 3), c[0, 0]))),
        (element.degree - 2, quadratic(c)),
    ):
        v = data.draw(polynomials(degree)).about(X)
        other = interpolate(element, X, v.jet(places(X, LATTICE)))
        product = w.derivative(points, 0, 0) * v.derivative(points, 0, 0)
        exact = rule.weights @ (density(rule.points) * product)
        found = u @ mass(element, X, density) @ other / area(X[None])[0]
        assert found == pytest.approx(exact, abs=1e-10)


@every_element
@few
@given(triangles(), st.data())
def test_mass_is_taken_point_by_point(element, X, data):
    rule = element.load_rule
    density = data.draw(numbers(len(rule.weights)))
    w = rows(element, X, rule.points)[:, 0] / scales(element, X)
    exact = np.einsum("q,q,qd,qe->de", rule.weights, density, w, w)
    S = scales(element, X) * np.sqrt(area(X[None])[0])
    found = mass(element, X, lambda _: density)
    assert_equal(found / np.outer(S, S), exact, 1e-12)


@every_element
@given(triangles(), st.data())
def test_mass_is_symmetric_and_positive(element, X, data):
    density = 1.5 + data.draw(numbers(len(element.load_rule.weights)))
    M = mass(element, X, lambda _: density)
    S = np.sqrt(np.diag(M))
    M = M / np.outer(S, S)
    assert_equal(M, M.T, 1e-14)
    assert np.linalg.eigvalsh(M)[0] > 1e-7


@every_element
@few
@given(triangles(), numbers(3, 3))
def test_mass_of_rigid_motions_is_mass_and_moments_of_area(element, X, c):
    """First and second ones, about the centroid, from the closed form."""
    motions = rigid(element, X)
    arms = (X - X.mean(axis=0)) / size_of(X)
    at = np.column_stack([np.ones(3), arms])  # w of the motions at the vertices
    exact = np.zeros((3, 3))
    for i, j, k, l in np.ndindex(3, 3, 3, 3):
        exact += c[i, j] * moment_of(i, j, k, l) * np.outer(at[k], at[l])
    found = motions.T @ mass(element, X, quadratic(c)) @ motions
    assert_equal(found / area(X[None])[0], exact, 1e-11)


@every_element
@few
@given(triangles(), numbers(3, 3), st.data())
def test_geometric_stiffness_is_exact_on_polynomials(element, X, c, data):
    """For in-plane forces that are constant or linear."""
    rule = triangle_rule(FINE)
    points = places(X, rule.points)
    w, v = (data.draw(polynomials(element.degree)).about(X) for _ in range(2))
    u, other = (interpolate(element, X, p.jet(places(X, LATTICE))) for p in (w, v))
    for forces in (linear(c), linear(np.tile(c[0], (3, 1)))):
        n_xx, n_yy, n_xy = forces(rule.points).T
        w_x, w_y = w.jet(points)[:, 1:].T * size_of(X)
        v_x, v_y = v.jet(points)[:, 1:].T * size_of(X)
        work = n_xx * w_x * v_x + n_yy * w_y * v_y + n_xy * (w_x * v_y + w_y * v_x)
        found = u @ geometric(element, X, forces) @ other
        exact = area(X[None])[0] / size_of(X) ** 2 * (rule.weights @ work)
        assert found == pytest.approx(exact, abs=1e-10)


@every_element
@given(triangles(), numbers(3))
def test_geometric_stiffness_is_the_work_on_the_slopes(element, X, c):
    """For any unknowns, where the forces are constant."""
    rule = composite(element.pieces, triangle_rule(FINE))
    S = scales(element, X)
    slopes = rows(element, X, rule.points)[:, 1:] / S
    weights = area(X[None])[0] * rule.weights
    exact = np.einsum("q,qid,ij,qje->de", weights, slopes, tensors(c), slopes)
    found = geometric(element, X, linear(np.tile(c, (3, 1)))) / np.outer(S, S)
    assert_equal(found, found.T, 1e-13)
    assert_equal(found, exact, 1e-11)


@every_element
@few
@given(triangles(), st.data())
def test_in_plane_forces_are_taken_point_by_point(element, X, data):
    rule = element.load_rule
    forces = data.draw(numbers(len(rule.weights), 3))
    S = scales(element, X)
    slopes = rows(element, X, rule.points)[:, 1:] / S
    weights = area(X[None])[0] * rule.weights
    exact = np.einsum("q,qid,qij,qje->de", weights, slopes, tensors(forces), slopes)
    found = geometric(element, X, lambda _: forces) / np.outer(S, S)
    assert_equal(found, exact, 1e-11)


@every_element
@few
@given(triangles(), st.data())
def test_in_plane_forces_do_not_work_on_a_motion_up_and_down(element, X, data):
    forces = data.draw(numbers(len(element.load_rule.weights), 3))
    up = rigid(element, X)[:, 0]
    found = geometric(element, X, lambda _: forces) @ up
    assert_equal(found / scales(element, X), 0.0, 1e-11)


@every_element
@few
@given(st.lists(triangles(), min_size=2, max_size=3), st.integers(0, 2**32 - 1))
def test_a_batch_is_one_by_one(element, several, seed):
    X = np.array(several)
    n, q, load_q = len(X), len(element.rule.weights), len(element.load_rule.weights)
    rng = np.random.default_rng(seed)
    A = rng.normal(size=(n, q, 3, 3))
    D = A @ A.swapaxes(-1, -2)
    p, forces = rng.normal(size=(n, load_q)), rng.normal(size=(n, load_q, 3))
    l = rng.dirichlet(np.ones(3), (n, 4))
    for array in (X, D, p, forces, l):
        array.setflags(write=False)

    def all_of(some):
        geometry = Geometry(vertices=X[some], rule=element.rule)
        loaded = Geometry(vertices=X[some], rule=element.load_rule)
        return (
            element.stiffness(geometry, D[some]),
            element.stiffness(geometry, np.broadcast_to(D[some, :1], D[some].shape)),
            element.load(loaded, p[some]),
            element.mass(loaded, p[some]),
            element.geometric(loaded, forces[some]),
            element.evaluate(X[some], l[some]),
            element.curvature(X[some], l[some]),
            element.third_derivatives(X[some], l[some]),
        )

    singles = [all_of(slice(i, i + 1)) for i in range(n)]
    for whole, *parts in zip(all_of(slice(None)), *singles, strict=True):
        for one, other in zip(whole, np.concatenate(parts), strict=True):
            assert_close(one, other, 1e-13)


@every_element
@given(triangles(), points_in(count=4))
def test_points_may_be_given_for_all_triangles_or_for_each(element, X, barycentrics):
    both = np.array([X, 2.0 * X[[1, 2, 0]]])
    each = np.array([barycentrics] * 2)
    d = unknowns_of(element)
    for rows_of, shape in (
        (element.evaluate, (2, 4, 3, d)),
        (element.curvature, (2, 4, 3, d)),
        (element.third_derivatives, (2, 4, 2, 3, d)),
    ):
        shared = rows_of(both, barycentrics)
        assert shared.shape == shape
        np.testing.assert_allclose(shared, rows_of(both, each), rtol=1e-14, atol=0.0)


@every_element
def test_pieces_part_the_triangle(element):
    shares = np.linalg.det(element.pieces)
    assert (shares > 0.0).all()
    assert shares.sum() == pytest.approx(1.0, rel=1e-14)


@every_element
@given(
    st.lists(triangles(), min_size=1, max_size=3),
    numbers(3, 100, 2),
    points_in(count=4),
)
def test_fields_are_the_rows_times_the_unknowns(element, several, u, l):
    """Without forming the rows; of DKT those of the deflection between its vertices."""
    X = np.array(several)
    S = np.array([scales(element, own) for own in X])
    u = u[: len(X), : unknowns_of(element)] / S[:, :, None]
    size = np.array([size_of(own) for own in X])[:, None, None, None]
    each = np.broadcast_to(l, (len(X), *l.shape))
    for points in (l, each):
        jets = np.einsum("nqad,ndc->nqac", element.evaluate(X, points), u)
        found = element.shape.fields(X, points, u, 1)
        assert_equal(found[:, :, :1], jets[:, :, :1], 1e-11)
        assert_equal(found[:, :, 1:] * size, jets[:, :, 1:] * size, 1e-10)
        bent = np.einsum("nqad,ndc->nqac", element.shape.curvature(X, points), u)
        found = element.shape.fields(X, points, u, 2)
        assert_equal(found * size**2, bent * size**2, 1e-9)
        third = np.einsum("nqbad,ndc->nqbac", element.third_derivatives(X, points), u)
        found = element.shape.fields(X, points, u, 3).reshape(third.shape)
        assert_equal(found * size[..., None] ** 3, third * size[..., None] ** 3, 1e-8)


@every_element
@given(triangles(), numbers(4, 3), points_in(count=4))
def test_pulls_on_the_curvature_load_as_its_rows_do(element, X, pulls, l):
    B = element.shape.curvature(X[None], l)[0]
    expected = np.einsum("qad,qa->d", B, pulls)
    found = element.shape.curvature_load(X[None], l, pulls[None])[0]
    S = np.abs(B).sum(axis=(0, 1))
    assert_equal(found / S, expected / S, 1e-12)
