"""The dual on one triangle: what its unknowns are, exact states, balance inside.

The coupling, the compliance and all derivatives are found again here from moments at
points in x and y. Lengths count in the size of the triangle.
"""

import math

import numpy as np
import pytest
from duals import (
    FINE,
    IN_A_TRIANGLE,
    SHARE,
    WEIGHT,
    assert_equal,
    every_dual,
    interpolate,
    line,
    load,
    moments_of,
    pressure_of,
    scales,
    slots,
)
from hypothesis import given
from hypothesis import strategies as st
from strategies import (
    numbers,
    points_in,
    polynomials,
    rigidities,
    similarities,
    size_of,
    triangles,
)

from kplate.elements import bernstein
from kplate.elements.triangle import (
    EDGES,
    Geometry,
    area,
    barycentric_gradients,
    edge_senses,
)
from kplate.quadrature import triangle_rule


def edge_geometry(X, k):
    """Unit tangent and outward normal of edge k, and its length."""
    i, j = EDGES[k]
    along = X[j] - X[i]
    length = float(np.hypot(*along))
    t = along / length
    return t, np.array([t[1], -t[0]]), length


def normal_moment(m, n):
    """m_nn of moments (..., 3, c)."""
    return np.einsum("...mc,m->...c", m, [n[0] ** 2, n[1] ** 2, 2.0 * n[0] * n[1]])


@every_dual
def test_counts_and_rules_fit_the_order(dual):
    k = dual.order
    assert (dual.per_vertex, dual.per_edge, dual.edge_deflections) == (1, 2 * k + 1, k)
    assert dual.left == 3 * (1 + dual.per_edge)
    deflections, slopes = math.comb(k + 3, 2), 3 * (k + 1)
    assert dual.whole == deflections + slopes
    X = np.array([[[0.0, 0.0], [1.0, 0.0], [0.0, 1.0]]])
    shape = (1, math.comb(k + 2, 2), 3, dual.whole)
    assert dual.coupling(X).shape == shape
    for rule, degree in ((dual.rule, 2 * k), (dual.load_rule, 2 * k + 2)):
        mean = 2.0 * math.factorial(degree) / math.factorial(degree + 2)
        assert rule.weights @ rule.points[:, 1] ** degree == pytest.approx(mean)


@every_dual
@given(triangles(), numbers(30), st.lists(st.floats(0.0, 1.0), min_size=1))
def test_deflections_are_ordinates_counted_along_each_edge(dual, X, u, shares):
    """On an edge w depends on that edge's unknowns and its ends, in its own sense."""
    u = u[: dual.whole]
    s, p = np.array(shares), dual.order + 1
    for k, (i, j) in enumerate(EDGES):
        start, end = (i, j) if edge_senses(X[None])[0, k] > 0.0 else (j, i)
        barycentrics = np.outer(1.0 - s, np.eye(3)[start]) + np.outer(s, np.eye(3)[end])
        ordinates = [u[start], *u[slots(dual, k)[0]], u[end]]
        exact = sum(
            math.comb(p, a) * s**a * (1.0 - s) ** (p - a) * ordinate
            for a, ordinate in enumerate(ordinates)
        )
        found = dual.evaluate(X[None], barycentrics[None])[0, :, 0] @ u
        assert_equal(found, exact, 1e-13)


@every_dual
@given(triangles(), points_in(count=4))
def test_slopes_are_the_derivatives_of_the_deflection(dual, X, l):
    step = 1e-5 * size_of(X)
    moves = barycentric_gradients(X[None])[0].T * step
    slopes = dual.evaluate(X[None], l)[0, :, 1:]
    for c in range(2):
        ahead, behind = (
            dual.evaluate(X[None], l + s * moves[c])[0, :, 0] for s in (1, -1)
        )
        difference = (ahead - behind) / (2.0 * step)
        assert_equal(difference * size_of(X), slopes[:, c] * size_of(X), 1e-6)


@every_dual
@given(triangles(), st.data())
def test_slopes_on_edges_are_legendre_series_in_the_edges_own_sense(dual, X, data):
    slope = data.draw(polynomials(dual.order + 1)).about(X)
    u = interpolate(dual, X, slope)
    for k in range(3):
        _, n, _ = edge_geometry(X, k)
        rows = dual.outward_slopes(X[None], np.array([k]), SHARE)[0]
        across = [slope.derivative(line(k, SHARE) @ X, *ij) for ij in ((1, 0), (0, 1))]
        assert_equal(rows @ u * size_of(X), n @ across * size_of(X))


@every_dual
@given(triangles(), st.data())
def test_coupling_is_the_stated_integral(dual, X, data):
    """For moments, a deflection and slopes on the edges that have nothing in common."""
    w, other = (data.draw(polynomials(dual.order + 1)).about(X) for _ in range(2))
    o = math.comb(dual.order + 2, 2)
    t = data.draw(numbers(o, 3))[None, :, :, None]
    u = interpolate(dual, X, w, slope=other)
    rule = triangle_rule(FINE)
    inside = dual.moments(t, rule.points)[0, :, :, 0]
    products = (inside * w.curvature(rule.points @ X)).sum(axis=1)
    exact = area(X[None])[0] * rule.weights @ products
    for k in range(3):
        _, n, length = edge_geometry(X, k)
        m_nn = normal_moment(dual.moments(t, line(k, SHARE)), n)[0, :, 0]
        points = line(k, SHARE) @ X
        turn = n @ [
            w.derivative(points, *ij) - other.derivative(points, *ij)
            for ij in ((1, 0), (0, 1))
        ]
        exact -= length * WEIGHT @ (m_nn * turn)
    found = np.einsum("om,omd,d->", t[0, :, :, 0], dual.coupling(X[None])[0], u)
    assert found == pytest.approx(exact, abs=1e-10)


@every_dual
@given(triangles(), st.data())
def test_polynomials_are_exact_in_moments_and_energy(dual, X, data):
    """Up to the degree k + 2, two above the moments', under the load they need.

    Only what is left of the unknowns is given; those inside follow from the load.
    """
    w = data.draw(polynomials(dual.degree)).about(X)
    (D,) = data.draw(rigidities(count=1))
    size = np.abs(D).max() / size_of(X) ** 2
    forces = load(dual, X[None], pressure_of(D, w))[..., None]
    u = interpolate(dual, X, w)
    parts = dual.condense(X[None], D[None])
    whole = parts.whole(u[None, : dual.left, None], forces)
    assert_equal(whole[0, :, 0] / scales(dual, X), u / scales(dual, X))
    ordinates = parts.moments(whole)
    found = dual.moments(ordinates, IN_A_TRIANGLE)[0, :, :, 0]
    assert_equal(found / size, moments_of(D, w, IN_A_TRIANGLE @ X) / size)
    rule = triangle_rule(FINE)
    kappa = w.curvature(rule.points @ X)
    exact = area(X[None])[0] * np.einsum("q,qa,ab,qb", rule.weights, kappa, D, kappa)
    energy = dual.energy(X[None], D[None], ordinates)[0, 0]
    assert energy / size == pytest.approx(0.5 * exact / size, abs=1e-9)
    # What is left of the load and the stiffness knows of the unknowns inside.
    v = data.draw(numbers(dual.left)) * scales(dual, X)[: dual.left]
    inner = parts.internal_forces(ordinates)[0, : dual.left, 0]
    left = parts.stiffness[0] @ u[: dual.left] - parts.forces(forces)[0, :, 0]
    assert v @ left / size == pytest.approx(
        v @ (inner - forces[0, : dual.left, 0]) / size, abs=1e-9
    )


@every_dual
@given(triangles(), st.data())
def test_polynomials_one_degree_lower_are_exact_in_deflection_and_slope(dual, X, data):
    w = data.draw(polynomials(dual.order + 1)).about(X)
    (D,) = data.draw(rigidities(count=1))
    forces = load(dual, X[None], pressure_of(D, w))[..., None]
    u = interpolate(dual, X, w)
    whole = dual.condense(X[None], D[None]).whole(u[None, : dual.left, None], forces)
    jet = dual.evaluate(X[None], IN_A_TRIANGLE)[0] @ whole[0, :, 0]
    weight = [1.0, size_of(X), size_of(X)]
    assert_equal(jet * weight, w.jet(IN_A_TRIANGLE @ X) * weight)


@every_dual
@given(triangles(), st.data())
def test_shears_and_carried_pressure_of_polynomials_are_exact(dual, X, data):
    w = data.draw(polynomials(dual.degree)).about(X)
    (D,) = data.draw(rigidities(count=1))
    size = np.abs(D).max()
    u = interpolate(dual, X, w)[None, :, None]
    ordinates = dual.condense(X[None], D[None]).moments(u)
    points = IN_A_TRIANGLE @ X

    def bent(i, j):
        """Derivative i, j of the moments, (3, q)."""
        orders = ((2 + i, j), (i, 2 + j), (1 + i, 1 + j))
        return D @ (
            [[1.0], [1.0], [2.0]] * np.array([w.derivative(points, *d) for d in orders])
        )

    by_x, by_y = bent(1, 0), bent(0, 1)
    exact = -np.stack([by_x[0] + by_y[2], by_x[2] + by_y[1]], axis=1)
    found = dual.shears(X[None], ordinates, IN_A_TRIANGLE)[0, :, :, 0]
    assert_equal(found * size_of(X) ** 3 / size, exact * size_of(X) ** 3 / size, 1e-8)
    found = dual.carried(X[None], ordinates, IN_A_TRIANGLE)[0, :, 0]
    exact = pressure_of(D, w)(points)
    assert_equal(found * size_of(X) ** 4 / size, exact * size_of(X) ** 4 / size, 1e-8)


@every_dual
@given(triangles(), st.data())
def test_moments_balance_the_load_inside_whatever_the_boundary_does(dual, X, data):
    """For pressures of degree k - 2: the pressure carried is the one that acts."""
    p = data.draw(polynomials(dual.order - 2)).about(X)
    (D,) = data.draw(rigidities(count=1))
    u = data.draw(numbers(dual.left)) * scales(dual, X)[: dual.left]
    # As large as what the unknowns bring, so that neither drowns the other.
    size = np.abs(D).max() / size_of(X) ** 4
    forces = load(dual, X[None], lambda x: size * p.derivative(x, 0, 0))[..., None]
    parts = dual.condense(X[None], D[None])
    ordinates = parts.moments(parts.whole(u[None, :, None], forces))
    found = dual.carried(X[None], ordinates, IN_A_TRIANGLE)[0, :, 0]
    assert_equal(found / size, p.derivative(IN_A_TRIANGLE @ X, 0, 0), 1e-8)


@every_dual
@given(triangles(), rigidities(count=1))
def test_stiffness_is_symmetric_with_three_free_motions(dual, X, D):
    K = dual.condense(X[None], D).stiffness[0]
    S = np.sqrt(np.diag(K))
    K = K / np.outer(S, S)
    assert_equal(K, K.T, 1e-13)
    strength = np.linalg.eigvalsh(K)
    assert np.abs(strength[:3]).max() < 1e-12 * strength[-1]
    assert strength[3] > 1e-6 * strength[-1]


@every_dual
@given(triangles(), st.data())
def test_rigid_motions_bring_no_moments(dual, X, data):
    w = data.draw(polynomials(1)).about(X)
    (D,) = data.draw(rigidities(count=1))
    u = interpolate(dual, X, w)[None, :, None]
    ordinates = dual.condense(X[None], D[None]).moments(u)
    assert_equal(ordinates * size_of(X) ** 2 / np.abs(D).max(), 0.0, 1e-10)


@every_dual
@given(triangles(), st.data())
def test_condensed_is_the_system_of_moments_and_deflections(dual, X, data):
    """The moments and inner deflections of the whole saddle point, solved at once."""
    (D,) = data.draw(rigidities(count=1))
    D = D / np.abs(D).max()
    X = X / size_of(X)
    u = data.draw(numbers(dual.left))
    F = data.draw(numbers(dual.whole))
    rule = triangle_rule(FINE)
    values = bernstein.values(dual.order, rule.points)
    masses = area(X[None])[0] * np.einsum("q,qo,qp->op", rule.weights, values, values)
    R = dual.coupling(X[None])[0].reshape(-1, dual.whole)
    compliance = np.kron(masses, np.linalg.inv(D))
    left = dual.left
    zero = np.zeros((dual.whole - left,) * 2)
    whole = np.block([[-compliance, R[:, left:]], [R[:, left:].T, zero]])
    exact = np.linalg.solve(whole, np.concatenate([-R[:, :left] @ u, F[left:]]))
    parts = dual.condense(X[None], D[None])
    found = parts.whole(u[None, :, None], F[None, :, None])
    assert_equal(found[0, :left, 0], u, 0.0)
    size = max(1.0, np.abs(exact).max())
    assert_equal(found[0, left:, 0] / size, exact[len(R) :] / size)
    ordinates = parts.moments(found)
    assert_equal(ordinates.ravel() / size, exact[: len(R)] / size)
    reactions = R[:, :left].T @ exact[: len(R)] - F[:left]
    condensed = parts.stiffness[0] @ u - parts.forces(F[None, :, None])[0, :, 0]
    assert_equal(condensed / size, reactions / size)
    assert_equal(parts.internal_forces(ordinates)[0, left:, 0] / size, F[left:] / size)


@every_dual
@given(triangles(), rigidities(count=1), st.integers(1, 2), numbers(3, 3))
def test_renumbering_the_triangle_renumbers_all(dual, X, D, start, c):
    """Whatever its number, an edge keeps its own unknowns, sign and all."""
    corners = (np.arange(3) + start) % 3
    blocks = [3 + dual.per_edge * k + np.arange(dual.per_edge) for k in corners]
    order = np.concatenate([corners, *blocks])
    S = scales(dual, X)[: dual.left]
    S = np.outer(S, S) * size_of(X) ** 2 / np.abs(D).max()
    one = dual.condense(X[None], D).stiffness[0]
    other = dual.condense(X[corners][None], D).stiffness[0]
    assert_equal(other * S, one[np.ix_(order, order)] * S)

    def force(points):
        l = (points - X.mean(axis=0)) / size_of(X)
        return c[0, 0] + l @ c[1, :2] + (l @ c[2, :2]) ** 2

    one = dual.condense(X[None], D).forces(load(dual, X[None], force)[..., None])
    other = X[corners][None]
    other = dual.condense(other, D).forces(load(dual, other, force)[..., None])
    size = area(X[None])[0]
    assert_equal(other[0] / size, one[0, order] / size)


@every_dual
@given(triangles(), rigidities(count=1), similarities())
def test_turning_and_enlarging_the_triangle_does_so_to_the_stiffness(
    dual, X, D, motion
):
    """For the same w, K falls as 1/size^2; an edge that now runs back counts so."""
    turn, size, shift = motion
    moved = size * X @ turn.T + shift
    c, s = turn[0]
    c, s = c, -s
    bend = np.array(
        [
            [c * c, s * s, -c * s],
            [s * s, c * c, c * s],
            [2 * c * s, -2 * c * s, c * c - s * s],
        ]
    )
    turned = np.linalg.solve(bend.T, D[0] @ np.linalg.inv(bend))
    T = np.eye(dual.left)
    flip = edge_senses(X[None])[0] * edge_senses(moved[None])[0]
    for k in range(3):
        deflections, slopes = slots(dual, k)
        if flip[k] < 0.0:
            T[deflections] = T[deflections[::-1]]
        T[slopes, slopes] = flip[k] ** np.arange(1, dual.order + 2) / size
    S = scales(dual, X)[: dual.left]
    S = np.outer(S, S) * size_of(X) ** 2 / np.abs(D).max()
    one = dual.condense(X[None], D).stiffness[0]
    other = dual.condense(moved[None], turned[None]).stiffness[0]
    assert_equal(size**2 * T.T @ other @ T * S, one * S)


@every_dual
@given(triangles(), rigidities(count=1), st.floats(1e-3, 1e3))
def test_moments_and_stiffness_grow_with_the_rigidity(dual, X, D, factor):
    one, other = (dual.condense(X[None], f * D) for f in (1.0, factor))
    size = factor * np.abs(one.stiffness).max()
    assert_equal(other.stiffness / size, factor * one.stiffness / size, 1e-12)
    size = factor * np.abs(one.bending).max()
    assert_equal(other.bending / size, factor * one.bending / size, 1e-12)


@every_dual
@given(triangles(), st.data())
def test_load_works_on_polynomials_exactly(dual, X, data):
    """Pressure and deflection both of degree k + 1."""
    p, w = (data.draw(polynomials(dual.order + 1)).about(X) for _ in range(2))
    rule = triangle_rule(FINE)
    points = rule.points @ X
    product = p.derivative(points, 0, 0) * w.derivative(points, 0, 0)
    f = load(dual, X[None], lambda x: p.derivative(x, 0, 0))[0]
    work = f @ interpolate(dual, X, w) / area(X[None])[0]
    assert work == pytest.approx(rule.weights @ product, abs=1e-11)


@every_dual
@given(triangles(), numbers(50), st.data())
def test_load_is_the_pressure_times_the_deflection(dual, X, u, data):
    """For any unknowns; the slopes on edges have no part in it."""
    u = u[: dual.whole]
    p = data.draw(polynomials(dual.order + 1)).about(X)
    rule = triangle_rule(FINE)
    w = dual.evaluate(X[None], rule.points)[0, :, 0] @ u
    exact = rule.weights @ (p.derivative(rule.points @ X, 0, 0) * w)
    f = load(dual, X[None], lambda x: p.derivative(x, 0, 0))[0]
    assert f @ u / area(X[None])[0] == pytest.approx(exact, abs=1e-12)


@every_dual
@given(st.lists(triangles(), min_size=2, max_size=4), st.data())
def test_a_batch_is_one_by_one(dual, several, data):
    X = np.array(several)
    n, o, c = len(X), math.comb(dual.order + 2, 2), 2
    D = data.draw(rigidities(count=n))
    p = data.draw(numbers(n, len(dual.load_rule.weights)))
    l = data.draw(points_in(count=4 * n)).reshape(n, 4, 3)
    u, F = data.draw(numbers(n, dual.left, c)), data.draw(numbers(n, dual.whole, c))
    t = data.draw(numbers(n, o, 3, c))
    edges = np.arange(n) % 3
    for array in (X, D, p, l, u, F, t):
        array.setflags(write=False)

    def all_of(some):
        parts = dual.condense(X[some], D[some])
        whole = parts.whole(u[some], F[some])
        return (
            parts.stiffness,
            parts.forces(F[some]),
            whole,
            parts.moments(whole),
            parts.internal_forces(t[some]),
            dual.load(Geometry(vertices=X[some], rule=dual.load_rule), p[some]),
            dual.evaluate(X[some], l[some]),
            dual.outward_slopes(X[some], edges[some], SHARE),
            dual.moments(t[some], l[some]),
            dual.shears(X[some], t[some], l[some]),
            dual.carried(X[some], t[some], l[some]),
            dual.energy(X[some], D[some], t[some]),
        )

    for k, whole in enumerate(all_of(slice(None))):
        single = np.concatenate([all_of(slice(i, i + 1))[k] for i in range(n)])
        for one, other in zip(whole, single, strict=True):
            size = max(np.abs(other).max(), np.finfo(float).tiny)
            assert_equal(one / size, other / size, 1e-12)


@every_dual
@given(triangles(), points_in(count=4), numbers(10, 3))
def test_points_are_for_all_or_for_each(dual, X, l, t):
    both, each = np.array([X, 2.0 * X]), np.array([l, l])
    t = np.array([t, 2.0 * t])[:, : math.comb(dual.order + 2, 2), :, None]
    for one, other in (
        (dual.evaluate(both, l), dual.evaluate(both, each)),
        (dual.moments(t, l), dual.moments(t, each)),
        (dual.shears(both, t, l), dual.shears(both, t, each)),
        (dual.carried(both, t, l), dual.carried(both, t, each)),
    ):
        assert one.shape[:2] == (2, 4)
        np.testing.assert_allclose(one, other, rtol=1e-12, atol=1e-300)
