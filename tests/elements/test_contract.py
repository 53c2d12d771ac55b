"""What every entry of ELEMENTS must satisfy, whatever its unknowns.

Unknowns of a field are found from `evaluate` by least squares, so that nothing is
assumed of them but that w and its slopes at the vertices come first. Exact integrals of
products of barycentrics l are ``2 A a! b! c! / (a + b + c + 2)!`` for l0^a l1^b l2^c.
"""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from strategies import (
    kites,
    numbers,
    points_in,
    polynomials,
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
FINE = 12  # degree of the rules that stand for exact integrals
LATTICE = np.array([(i, j, 7 - i - j) for i in range(8) for j in range(8 - i)]) / 7.0


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


def quadratic_pressure(c):
    """Pressure ``sum of c l_i l_j`` as a function of barycentrics."""
    return lambda l: np.einsum("...i,ij,...j->...", l, c, l)


def assert_close(actual, expected, atol=1e-9):
    """Compare with a tolerance relative to the largest number."""
    size = np.abs(expected).max()
    np.testing.assert_allclose(actual, expected, rtol=0.0, atol=atol * size)


def assert_equal(actual, expected, atol=1e-9):
    """Compare numbers of the size of one with an absolute tolerance."""
    np.testing.assert_allclose(actual, expected, rtol=0.0, atol=atol)


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
@given(triangles(), rigidities(count=1), st.permutations(range(3)))
def test_renumbering_the_triangle_renumbers_the_stiffness(element, X, D, order):
    """The turns of the three numbers only: the others make it run clockwise."""
    start = order[0]
    corners = [start, (start + 1) % 3, (start + 2) % 3]
    T = moved_unknowns(element, X, X[corners], corners)
    S = scales(element, X)
    back = T.T @ stiffness(element, X[corners], D[0]) @ T
    assert_close(back / np.outer(S, S), stiffness(element, X, D[0]) / np.outer(S, S))


@every_element
@given(triangles(), rigidities(count=1), similarities(), numbers(3, 3))
def test_turning_and_enlarging_the_triangle_does_so_to_the_stiffness(
    element, X, D, motion, c
):
    """For the same w, K falls as 1/size^2 and loads grow as size^2."""
    turn, size, shift = motion
    moved = size * X @ turn.T + shift
    T = moved_unknowns(element, X, moved)
    bend = bending_turn(turn)
    turned = np.linalg.solve(bend.T, D[0] @ np.linalg.inv(bend))
    S = scales(element, X)
    back = size**2 * T.T @ stiffness(element, moved, turned) @ T
    assert_close(back / np.outer(S, S), stiffness(element, X, D[0]) / np.outer(S, S))
    p = quadratic_pressure(c)
    S *= area(X[None])[0]
    found = T.T @ load(element, moved, p) / size**2
    assert_equal(found / S, load(element, X, p) / S, 1e-10)


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
def test_triangles_agree_along_a_shared_edge(element, kite, u, shares):
    """In w; in w and both slopes where the element is conforming."""
    points, corners = kite
    X = points[corners]
    at = [[list(own).index(k) for k in (0, 1)] for own in corners]
    u = u[:, : unknowns_of(element)] / scales(element, X[0])
    vertex = u[:, : 3 * element.per_vertex].reshape(2, 3, -1).copy()
    vertex[1, at[1]] = vertex[0, at[0]]
    u[1, : vertex[1].size] = vertex[1].ravel()
    kept = 3 if element.conforming else 1
    weight = np.array([1.0, size_of(X[0]), size_of(X[0])])[:kept, None]
    s = np.array(shares)
    traces = []
    for own, ends in zip(X, np.eye(3)[at], strict=True):
        barycentrics = np.outer(1.0 - s, ends[0]) + np.outer(s, ends[1])
        traces.append(rows(element, own, barycentrics)[:, :kept] * weight)
    gap = (traces[0] @ u[0] - traces[1] @ u[1]).ravel()
    # Unknowns of the second triangle on the shared edge take the value that fits.
    first = vertex[1].size + element.per_edge * (3 - sum(at[1]))
    free = traces[1][..., first : first + element.per_edge].reshape(gap.size, -1)
    assert_equal(gap - free @ np.linalg.lstsq(free, gap)[0], 0.0, 1e-10)


@every_element
@given(triangles(), numbers(3, 3))
def test_load_is_the_pressure_times_the_deflection(element, X, c):
    p = quadratic_pressure(c)
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
    f = load(element, X, quadratic_pressure(c))
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
@given(st.lists(triangles(), min_size=2, max_size=4), st.data())
def test_a_batch_is_one_by_one(element, several, data):
    X = np.array(several)
    n, q, load_q = len(X), len(element.rule.weights), len(element.load_rule.weights)
    D = data.draw(rigidities(count=n * q)).reshape(n, q, 3, 3)
    p = data.draw(numbers(n, load_q))
    l = data.draw(points_in(count=4 * n)).reshape(n, 4, 3)
    for array in (X, D, p, l):
        array.setflags(write=False)

    def all_of(some):
        geometry = Geometry(vertices=X[some], rule=element.rule)
        loaded = Geometry(vertices=X[some], rule=element.load_rule)
        return (
            element.stiffness(geometry, D[some]),
            element.load(loaded, p[some]),
            element.evaluate(X[some], l[some]),
            element.curvature(X[some], l[some]),
        )

    for k, whole in enumerate(all_of(slice(None))):
        single = np.concatenate([all_of(slice(i, i + 1))[k] for i in range(n)])
        for one, other in zip(whole, single, strict=True):
            assert_close(one, other, 1e-13)


@every_element
@given(triangles(), points_in(count=4))
def test_curvature_takes_points_for_all_or_for_each(element, X, barycentrics):
    both = np.array([X, 2.0 * X])
    shared = element.curvature(both, barycentrics)
    each = element.curvature(both, np.array([barycentrics] * 2))
    np.testing.assert_array_equal(shared, each)
    d = unknowns_of(element)
    assert shared.shape == (2, 4, 3, d)


@every_element
def test_pieces_part_the_triangle(element):
    shares = np.linalg.det(element.pieces)
    assert (shares > 0.0).all()
    assert shares.sum() == pytest.approx(1.0, rel=1e-14)
