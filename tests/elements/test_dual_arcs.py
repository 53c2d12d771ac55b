"""The dual on triangles with a round edge: what its rows are, and the bound it needs.

Moments are polynomials in x and y here, their derivatives exact; what arcs see of them
is found again along the circle, d m_ns / ds by the series of m_ns itself.
"""

import math

import numpy as np
import pytest
from duals import every_dual, slots
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from rounds import (
    ALONG,
    CLAMPED,
    FREE,
    HELD,
    arc_on,
    around,
    fine_rule,
    round_triangles,
)
from rounds import WEIGHT as FINE_WEIGHT
from strategies import numbers, polynomials, rigidities, size_of

from kplate.elements import bernstein
from kplate.elements.dual import DUALS
from kplate.elements.dual_arcs import RoundDual
from kplate.elements.triangle import EDGES, edge_normals
from kplate.quadrature import triangle_rule

STEEP = 0.3  # as `roundedges.fitted` leaves it


def assert_equal(actual, expected, atol=1e-9):
    np.testing.assert_allclose(actual, expected, rtol=0.0, atol=atol)


def moments(order):
    """m_xx, m_yy, m_xy, polynomials of this degree."""
    return st.lists(polynomials(order), min_size=3, max_size=3)


def ordinates(dual, arcs, m):
    """Bernstein ordinates of moments on a triangle, (1, o, 3, 1)."""
    at = triangle_rule(6).points
    values = np.stack([own.derivative(at @ arcs.vertices[0], 0, 0) for own in m])
    rows = bernstein.values(dual.order, at)
    return np.linalg.lstsq(rows, values.T, rcond=None)[0][None, :, :, None]


def tensor(m, points, i=0, j=0):
    """Moments, or derivatives of them, as (q, 2, 2)."""
    xx, yy, xy = (own.derivative(points, i, j) for own in m)
    return np.moveaxis(np.array([[xx, xy], [xy, yy]]), -1, 0)


def along(m, points, steps):
    """m_nn, m_ns and q_n at points (q, 2) of an edge run along steps (q, 2)."""
    t = steps / np.hypot(*steps.T)[:, None]
    n = np.column_stack([t[:, 1], -t[:, 0]])
    own = tensor(m, points)
    nn, ns = (np.einsum("qa,qab,qb->q", n, own, b) for b in (n, t))
    out = tensor(m, points, 1, 0)[:, 0] + tensor(m, points, 0, 1)[:, 1]
    return nn, ns, -np.einsum("qa,qa->q", out, n), n


def shear(m, points, steps):
    """m_nn and v_n at the points ALONG of an edge, and its length's weights."""
    nn, ns, q_n, n = along(m, points, steps)
    length = np.hypot(*steps.T)
    fit = np.polynomial.Legendre.fit(ALONG, ns, 28, domain=[0.0, 1.0])
    return nn, q_n - fit.deriv()(ALONG) / length, n, FINE_WEIGHT * length


def chordwise(arcs, points, normal):
    """Tau and y of points of the arc; both along the normals, (q,) each."""
    a, b = (arcs.vertices[0, k] for k in EDGES[arcs.edges[0]])
    half = 0.5 * np.hypot(*(b - a))
    t = (b - a) / (2.0 * half)
    n = np.array([t[1], -t[0]])
    away = points - 0.5 * (a + b)
    return away @ t / half, away @ n, normal @ t / half, normal @ n


def virtual(arcs, order, deflections, slopes):
    """W and the slope that unknowns of the round edge stand for, at the points ALONG.

    Where w is held those for slopes are a slope alone.
    """
    points, steps = (own[2] for own in around(arcs))
    t = steps / np.hypot(*steps.T)[:, None]
    normal = np.column_stack([t[:, 1], -t[:, 0]])
    tau, y, by_tau, by_y = chordwise(arcs, points, normal)
    P = np.polynomial.legendre.Legendre
    first = P(deflections)
    w, turn = first(tau), first.deriv()(tau) * by_tau
    if arcs.holds[0]:
        rest = P([0.0, *slopes[1:]])
        return w, turn + slopes[0] * by_y + rest(tau)
    second = P(slopes)
    w = w + y * second(tau)
    return w, turn + by_y * second(tau) + y * second.deriv()(tau) * by_tau


def by_parts(dual, arcs, m, u):
    """b(m; v, r), from integrals over the region and along its edges."""
    X, k = arcs.vertices[0], int(arcs.edges[0])
    points, weights = fine_rule(arcs)
    v = dual.evaluate(X[None], arcs.barycentrics(points[None]), arcs)[0, :, 0] @ u
    xx, yy, xy = m
    load = xx.derivative(points, 2, 0) + yy.derivative(points, 0, 2)
    total = weights @ ((load + 2.0 * xy.derivative(points, 1, 1)) * v)
    edges, steps = around(arcs)
    for e in (0, 1, 2):
        number = (k + 1 + e) % 3 if e < 2 else k
        nn, push, _, own = shear(m, edges[e], steps[e])
        if number == k:
            w, turn = virtual(arcs, dual.order, *(u[s] for s in slots(dual, k)))
        else:
            at = arcs.barycentrics(edges[e][None])
            w = dual.evaluate(X[None], at, arcs)[0, :, 0] @ u
            rows = dual.outward_slopes(X[None], np.array([number]), ALONG)[0]
            turn = rows @ u
        total += own @ (push * w + nn * turn)
        first, last = EDGES[number]
        twist = along(m, *(x[e] for x in around(arcs, np.array([0.0, 1.0]))))[1]
        total += twist[1] * u[last] - twist[0] * u[first]
    return total


@every_dual
@settings(max_examples=25)
@given(st.data())
def test_the_coupling_is_the_stated_sum(dual, data):
    arcs = data.draw(round_triangles())
    X = arcs.vertices[0]
    m = [own.about(X) for own in data.draw(moments(dual.order))]
    u = data.draw(numbers(30))[: dual.whole].copy()
    for k in range(3):
        u[slots(dual, k)[1]] /= size_of(X)
    found = np.einsum(
        "omd,om,d->",
        dual.coupling(X[None], arcs)[0],
        ordinates(dual, arcs, m)[0, :, :, 0],
        u,
    )
    assert_equal(found, by_parts(dual, arcs, m, u), 1e-8)


def rigid(dual, arcs, motion):
    """Unknowns of w = c + a x + b y about the middle of the chord.

    Of held arcs, whose slopes are turns alone, those that do not turn about the chord.
    """
    X, k = arcs.vertices[0], int(arcs.edges[0])
    i, j = EDGES[k]
    chord = X[j] - X[i]
    half = 0.5 * np.hypot(*chord)
    t = chord / (2.0 * half)
    n = np.array([t[1], -t[0]])
    slope = motion[1:] / size_of(X)
    if arcs.holds[0]:
        slope = (slope @ t) * t
    origin = 0.5 * (X[i] + X[j])

    def w(points):
        return motion[0] + (points - origin) @ slope

    u = np.zeros(dual.whole)
    u[:3] = w(X)
    for e in range(3):
        on_w, on_slope = slots(dual, e)
        if e == k:
            u[on_w[:2]] = motion[0], half * slope @ t
            u[on_slope[0]] = slope @ n
        else:
            p = dual.order + 1
            start, end = EDGES[e]
            run = np.arange(1, p) / p
            own = edge_normals(X[None])[0, e]
            outward = np.array([X[end] - X[start]]) @ [[0.0, -1.0], [1.0, 0.0]]
            turned = float(outward[0] @ own) < 0.0
            start, end = (end, start) if turned else (start, end)
            u[on_w] = w(X[start] + run[:, None] * (X[end] - X[start]))
            u[on_slope[0]] = slope @ own
    # Inside, so that pressures of degree k - 2 do the same work.
    points, weights = fine_rule(arcs)
    at = arcs.barycentrics(points[None])
    rows = dual.evaluate(X[None], at, arcs)[0, :, 0]
    tests = weights * bernstein.values(dual.order - 2, at[0]).T
    left = tests @ (w(points) - rows @ u)
    u[dual.left :] = np.linalg.solve(tests @ rows[:, dual.left :], left)
    return u


@every_dual
@given(st.data())
def test_rigid_motions_do_no_work(dual, data):
    """So that forces on a triangle's unknowns are in balance, whatever its moments."""
    arcs, motion = data.draw(round_triangles()), data.draw(numbers(3))
    R = dual.coupling(arcs.vertices, arcs)[0]
    size = size_of(arcs.vertices[0])
    assert_equal(R @ rigid(dual, arcs, motion) * size, 0.0, 1e-8 * size)


@every_dual
@given(round_triangles(), rigidities(count=1), st.data())
def test_energy_is_that_of_the_true_region(dual, arcs, D, data):
    X = arcs.vertices[0]
    m = [own.about(X) for own in data.draw(moments(dual.order))]
    points, weights = fine_rule(arcs)
    values = np.stack([own.derivative(points, 0, 0) for own in m], axis=1)
    exact = 0.5 * np.einsum(
        "q,qa,ab,qb->", weights, values, np.linalg.inv(D[0]), values
    )
    found = dual.energy(X[None], D, ordinates(dual, arcs, m), arcs)[0, 0]
    scale = weights.sum() * np.linalg.norm(np.linalg.inv(D[0]))
    assert_equal(found / scale, exact / scale)


@every_dual
@given(round_triangles(), numbers(2), numbers(7))
def test_loads_along_arcs_are_their_work(dual, arcs, load, u):
    k, size = int(arcs.edges[0]), size_of(arcs.vertices[0])
    rows = dual.arc_loads(arcs, load[:1], load[1:] * size)[0]
    on_w, on_slope = slots(dual, k)
    others = np.setdiff1d(np.arange(dual.whole), [*on_w, *on_slope])
    assert_equal(rows[others], 0.0, 0.0)
    w, turn = virtual(arcs, dual.order, u[: len(on_w)], u[-len(on_slope) :] / size)
    if arcs.holds[0]:  # a force does no work on a slope alone
        w = virtual(arcs, dual.order, u[: len(on_w)], np.zeros(len(on_slope)))[0]
    steps = around(arcs)[1][2]
    length = FINE_WEIGHT * np.hypot(*steps.T)
    work = length @ (load[0] * w + load[1] * size * turn)
    found = rows[on_w] @ u[: len(on_w)] + rows[on_slope] @ u[-len(on_slope) :] / size
    assert_equal(found / size, work / size)


# The bound on what is left.


def residual(dual, arcs, m, force=0.0, moment=0.0):
    found = RoundDual(order=dual.order, arcs=arcs)
    given_force, given_moment = (np.array([[own]]) for own in (force, moment))
    return found.residuals(m, given_force, given_moment)[0, 0]


def about_the_centre(dual, arcs, field):
    """Ordinates (1, o, 3, 1) of moments, functions of x and y from the circle's centre.

    In units of its radius.
    """
    at = triangle_rule(6).points
    x, y, radius = arcs.circles[0]
    values = np.stack(field(*((at @ arcs.vertices[0] - (x, y)) / radius).T), axis=1)
    rows = bernstein.values(dual.order, at)
    return np.linalg.lstsq(rows, values, rcond=None)[0][None, :, :, None]


@given(round_triangles(state=FREE), numbers(2))
def test_nothing_is_left_of_moments_without_tractions_on_the_arc(arcs, c):
    """(r^2 - 1) sym(x' c) has neither m_nn nor v_n at r = 1; x' is x turned."""

    def field(x, y):
        away = x * x + y * y - 1.0
        xx, yy, xy = -y * c[0], x * c[1], 0.5 * (x * c[0] - y * c[1])
        return away * xx, away * yy, away * xy

    m = about_the_centre(DUALS[3], arcs, field)
    size = size_of(arcs.vertices[0])
    scale = (arcs.circles[0, 2] / size) ** 3  # ordinates of a cubic far from its middle
    assert residual(DUALS[3], arcs, m) / size**2 < (1e-13 * scale) ** 2 * 1e4


@every_dual
@given(round_triangles(state=FREE), numbers(2))
def test_nothing_is_left_of_moments_that_meet_the_loads(dual, arcs, c):
    """A r^2 + b x x has m_nn = a + b and v_n = -(2 a + 3 b) / R at r = 1."""
    a, b = c
    turned = np.sign(arcs.turn[0])

    def field(x, y):
        r2 = x * x + y * y
        return a * r2 + b * x * x, a * r2 + b * y * y, b * x * y

    m = about_the_centre(dual, arcs, field)
    size, radius = size_of(arcs.vertices[0]), arcs.circles[0, 2]
    force = -turned * (2.0 * a + 3.0 * b) / radius
    scale = (radius / size) ** 2
    assert residual(dual, arcs, m, force, a + b) / size**2 < (1e-12 * scale) ** 2
    assert residual(dual, arcs, m, force, a + b + 1.0) / size**2 > 1e-4
    assert residual(dual, arcs, m, force + 1.0 / size, a + b) / size**2 > 1e-6


@every_dual
@given(round_triangles(state=FREE))
def test_what_is_left_counts_by_the_length_and_as_the_support_asks(dual, arcs):
    """A moment by the root of C^2 L, a force by L/pi more; held, they are reactions."""
    nothing = np.zeros((1, dual.ordinates, 3, 1))
    length = arcs.lengths[0]
    turning = residual(dual, arcs, nothing, moment=1.0)
    pushing = residual(dual, arcs, nothing, force=math.pi / length)
    assert turning == pytest.approx(pushing, rel=1e-12)
    for state, kept in ((HELD, turning), (CLAMPED, 0.0)):
        held = arc_on(arcs.vertices[0], arcs.edges[0], arcs.turn[0], state)
        assert residual(dual, held, nothing, moment=1.0) == pytest.approx(kept)
        assert residual(dual, held, nothing, force=1.0) == 0.0


def sharp(arcs, degree=9):
    """Ritz value of the largest |g|^2 on the arc by |grad g|^2, its mean there zero.

    From below: that of polynomials.
    """
    points, weights = fine_rule(arcs)
    X = arcs.vertices[0]
    centre, size = X.mean(axis=0), size_of(X)
    edge, steps = (own[2] for own in around(arcs))
    length = FINE_WEIGHT * np.hypot(*steps.T)

    def tables(at):
        x, y = ((at - centre) / size).T
        legendre = np.polynomial.legendre
        down = legendre.legder(np.eye(degree + 1))
        a, b = legendre.legvander(x, degree), legendre.legvander(y, degree)
        pairs = [(i, j) for i in range(degree + 1) for j in range(degree + 1 - i)]
        i, j = np.array(pairs[1:]).T
        by_x, by_y = a[:, :-1] @ down, b[:, :-1] @ down
        return a[:, i] * b[:, j], by_x[:, i] * b[:, j], a[:, i] * by_y[:, j]

    _, gx, gy = tables(points)
    K = (weights * gx.T) @ gx + (weights * gy.T) @ gy
    g = tables(edge)[0]
    g = g - length @ g / length.sum()
    M = (length * g.T) @ g
    values, vectors = np.linalg.eigh(K)
    kept = values > 1e-11 * values[-1]
    T = vectors[:, kept] / np.sqrt(values[kept])
    return np.linalg.eigvalsh(T.T @ M @ T)[-1] * size**2


@settings(max_examples=30)
@given(round_triangles(apexes=((-0.4, 1.4), (0.25, 1.6))))
def test_the_constant_is_not_below_the_sharp_one(arcs):
    """Nor so far above it that bands would widen for nothing."""
    assume(arcs.steepness[0] > STEEP)
    free = arcs.unheld()
    nothing = np.zeros((1, DUALS[2].ordinates, 3, 1))
    C2 = residual(DUALS[2], free, nothing, moment=1.0) / free.lengths[0]
    assert 1.0 < C2 / sharp(free) < 60.0


@every_dual
@settings(max_examples=25)
@given(st.data())
def test_what_is_left_does_no_more_work_than_bounded(dual, data):
    """On any deflection, the work that tests of the arc see taken off."""
    arcs = data.draw(round_triangles(state=FREE))
    assume(arcs.steepness[0] > STEEP)
    X, size = arcs.vertices[0], size_of(arcs.vertices[0])
    m = [own.about(X) for own in data.draw(moments(dual.order))]
    w = data.draw(polynomials(6)).about(X)
    points, steps = (own[2] for own in around(arcs))
    nn, push, n, own = shear(m, points, steps)
    value = w.derivative(points, 0, 0)
    slopes = np.stack([w.derivative(points, *ij) for ij in ((1, 0), (0, 1))], axis=1)
    # Less the affine function that residuals, in balance, do no work on.
    mean = own @ slopes / own.sum()
    rest = value - points @ mean
    rest = rest - own @ rest / own.sum()
    turn = np.einsum("qc,qc->q", slopes - mean, n)
    work = own @ (nn * turn + push * rest)
    region, weights = fine_rule(arcs)
    xx, yy, xy = (w.derivative(region, *ij) for ij in ((2, 0), (0, 2), (1, 1)))
    second = weights @ (xx**2 + yy**2 + 2.0 * xy**2)
    bound = residual(dual, arcs, ordinates(dual, arcs, m)) * second
    assert work**2 <= bound * (1.0 + 1e-9) + 1e-20 * size
