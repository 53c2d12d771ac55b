"""Kernels against plates whose value at the centre is known in closed form.

Polynomials of degree 9 that bend under a linear pressure, found as the null space of
the conditions on their coefficients, are the fields; place, turn and size are random.
Series for rectangles are fields that are no polynomials.
"""

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache, partial

import numpy as np
import oracles
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.polynomial import Polynomial
from strategies import powers, similarities

from kplate import kernels
from kplate.arrays import Floats

DEGREE = 9
RADIAL, ANGULAR = 24, 48  # points of the rule: exact for weights times polynomials
# Derivatives by y that are zero on y = 0, the edge through the centre.
EDGES = {"clamping": (0, 1), "reaction": (0, 2)}
KERNELS = ("moment", "shear", "slope", *EDGES)
# Length to which power multiplies the weights and the load's addition.
POWERS = {
    "moment": (-2, 0),
    "shear": (-3, 1),
    "slope": (-3, 3),
    "clamping": (-4, 2),
    "reaction": (-3, 1),
}
COMPONENT, DIRECTION = np.array([0.7, -0.4, 1.3]), np.array([0.6, -1.1])

seeds = st.integers(0, 2**32 - 1)
nus = st.floats(0.0, 0.45)
rigidities = st.floats(-3.0, 7.0).map(lambda exponent: 10.0**exponent)


@dataclass(frozen=True, kw_only=True)
class Placed:
    """A plate known in axes of its own, turned, scaled and moved."""

    state: Callable[[Floats], oracles.State]
    load: oracles.LinearPressure
    turn: Floats
    size: float
    shift: Floats

    def local(self, points):
        return (points - self.shift) @ self.turn / self.size

    def point(self, local):
        return self.shift + self.size * self.turn @ local

    def moments(self, points):
        m_xx, m_yy, m_xy = self.state(self.local(points)).moments.T / self.size**2
        turned = self.turn @ np.moveaxis([[m_xx, m_xy], [m_xy, m_yy]], -1, 0)
        return (turned @ self.turn.T).reshape(-1, 4)[:, [0, 3, 1]]

    def addition(self, kernel, local):
        p = self.load.at_origin + np.dot(self.load.gradient, local)
        slope = self.turn @ np.array(self.load.gradient)
        return kernel.constant(p / self.size**4, slope / self.size**5)


@lru_cache
def fields(edge=()):
    """All polynomials with a linear pressure, coefficients (n, 10, 10), orthonormal.

    Their derivatives by y of the orders in `edge` are zero on y = 0.
    """
    monomials = powers(DEGREE)
    rows = [
        [
            math.perm(a, 4) * ((a, b) == (i + 4, j))
            + 2 * math.perm(a, 2) * math.perm(b, 2) * ((a, b) == (i + 2, j + 2))
            + math.perm(b, 4) * ((a, b) == (i, j + 4))
            for a, b in monomials
        ]
        for i, j in powers(DEGREE - 4)
        if i + j > 1
    ]
    rows += [
        [ab == (i, k) for ab in monomials] for k in edge for i in range(DEGREE + 1 - k)
    ]
    A = np.array(rows, dtype=float)
    _, s, V = np.linalg.svd(A / np.linalg.norm(A, axis=1, keepdims=True))
    rank = int(np.sum(s > 1e-10))
    found = np.zeros((len(monomials) - rank, DEGREE + 1, DEGREE + 1))
    for k, (i, j) in enumerate(monomials):
        found[:, i, j] = V[rank:, k]
    return found


def pressure(coefficients):
    """Pressure at the origin, and its gradient by differences."""
    at = [(0.0, 0.0), (1.0, 0.0), (0.0, 1.0)]
    p = oracles.polynomial_pressure(at, coefficients)
    return p[0], p[1:] - p[0]


@st.composite
def polynomial_plates(draw, what):
    """A plate of which the unit disc of its own axes meets the kernel's conditions."""
    basis = fields(EDGES.get(what, ()))
    mix = np.random.default_rng(draw(seeds)).normal(size=len(basis))
    coefficients = np.tensordot(mix, basis, 1)
    at_origin, gradient = pressure(coefficients)
    nu, D = draw(nus), draw(rigidities)
    turn, size, shift = draw(similarities())
    return Placed(
        state=lambda x: oracles.polynomial(x, coefficients, nu=nu, rigidity=D),
        load=oracles.LinearPressure(at_origin=at_origin, gradient=tuple(gradient)),
        turn=turn,
        size=size,
        shift=shift,
    )


@st.composite
def series_plates(draw, what):
    """An unloaded plate: a sine along x times cosh, sinh and these times y."""
    rng = np.random.default_rng(draw(seeds))
    wave, phase, mix = draw(st.floats(0.5, 3.0)), rng.uniform(0, 6), rng.normal(size=4)
    if what == "clamping":
        mix[:2] = -mix[3], 0.0
    elif what == "reaction":
        mix[1:3] = 0.0
    nu, D = draw(nus), draw(rigidities)
    turn, size, shift = draw(similarities())
    return Placed(
        state=lambda x: oracles.State(
            derivatives=term(x, wave, phase, mix) / D, nu=nu, rigidity=D
        ),
        load=oracles.LinearPressure(at_origin=0.0),
        turn=turn,
        size=size,
        shift=shift,
    )


def term(points, wave, phase, mix):
    """Derivatives of ``sin(k x + phase) (a S + b C + c k y S + d k y C)``.

    S and C are sinh and cosh of k y; the mix is a, b, c, d.
    """
    x, y = wave * points.T
    S = [np.sinh(y), np.cosh(y)] * 3  # S[j] is its derivative j
    a, b, c, d = mix
    W = np.zeros((4, 4, len(points)))
    for i, j in oracles.ORDERS:
        Y = a * S[j] + b * S[j + 1]
        Y = Y + c * (y * S[j] + j * S[j - 1]) + d * (y * S[j + 1] + j * S[j])
        W[i, j] = wave ** (i + j) * np.sin(x + phase + i * np.pi / 2) * Y
    return W


def kernel_of(what, plate, *, local=(0.0, 0.0), radius=1.0):
    """The kernel of a plate at a point and with a radius in its own axes."""
    place = plate.point(np.array(local)), radius * plate.size
    state = plate.state(np.array([local]))
    inward = plate.turn[:, 1]
    match what:
        case "moment":
            return kernels.moment_kernel(*place, COMPONENT)
        case "shear":
            return kernels.shear_kernel(*place, DIRECTION, nu=state.nu)
        case "slope":
            return kernels.slope_kernel(*place, DIRECTION, D=state.rigidity)
        case "clamping":
            return kernels.clamping_kernel(*place, inward, D=state.rigidity)
    return kernels.line_reaction_kernel(*place, inward, nu=state.nu)


def value_of(what, plate, *, local=(0.0, 0.0)):
    """What the kernel is to give, from the derivatives at the point."""
    state, size = plate.state(np.array([local])), plate.size
    match what:
        case "moment":
            return COMPONENT @ plate.moments(plate.point(np.array(local))[None])[0]
        case "shear":
            return DIRECTION @ plate.turn @ state.shears[0] / size**3
        case "slope":
            return DIRECTION @ plate.turn @ state.slopes[0] / size
        case "clamping":
            return state.moments[0, 1] / size**2
    return -state.effective_shears[0, 1] / size**3  # the outward normal is -y


def rule(kernel, count=(RADIAL, ANGULAR)):
    """Points (n, 2) and weights (n,) of a rule on the disc, or its half."""
    along, around = count
    t, s = np.polynomial.legendre.leggauss(along)
    r, radial = 0.5 * (t + 1.0), 0.25 * s * (t + 1.0)
    if kernel.inward is None:
        angle = 2.0 * np.pi * np.arange(around) / around
        angular = np.full(around, 2.0 * np.pi / around)
    else:
        t, s = np.polynomial.legendre.leggauss(around)
        normal = math.atan2(kernel.inward[1], kernel.inward[0])
        angle, angular = normal + 0.5 * np.pi * t, 0.5 * np.pi * s
    ray = np.stack([np.cos(angle), np.sin(angle)], axis=-1)
    points = kernel.centre + kernel.radius * r[:, None, None] * ray
    weights = kernel.radius**2 * np.outer(radial, angular)
    return points.reshape(-1, 2), weights.ravel()


def integrated(kernel, plate, *, local=(0.0, 0.0), count=(RADIAL, ANGULAR)):
    """The kernel's value, and the sum of its terms' magnitudes."""
    x, weights = rule(kernel, count)
    if kernel.moments is None:
        terms = weights * plate.state(plate.local(x)).w * kernel.pressure(x)
    else:
        assert kernel.pressure is None
        terms = weights * np.sum(plate.moments(x) * kernel.moments(x), axis=1)
    load = plate.addition(kernel, local)
    return terms.sum() + load, np.abs(terms).sum() + abs(load)


def some_kernel(what, centre=(0.0, 0.0), radius=1.0, turn=None):
    """A kernel for nu = 0.3, D = 1, its direction turned with the plate."""
    turn = np.eye(2) if turn is None else turn
    match what:
        case "moment":
            return kernels.moment_kernel(centre, radius, turned(turn, COMPONENT))
        case "shear":
            return kernels.shear_kernel(centre, radius, turn @ DIRECTION, nu=0.3)
        case "slope":
            return kernels.slope_kernel(centre, radius, turn @ DIRECTION, D=1.0)
        case "clamping":
            return kernels.clamping_kernel(centre, radius, turn[:, 1], D=1.0)
    return kernels.line_reaction_kernel(centre, radius, turn[:, 1], nu=0.3)


def turned(turn, weights):
    """Weights (..., 3) of the moments of a plate that was turned."""
    a, b, c = np.moveaxis(np.asarray(weights), -1, 0)
    A = turn @ np.moveaxis([[a, 0.5 * c], [0.5 * c, b]], [0, 1], [-2, -1]) @ turn.T
    return np.stack([A[..., 0, 0], A[..., 1, 1], 2.0 * A[..., 0, 1]], axis=-1)


def weights_of(kernel, points):
    """Weights of the moments, or of w, (..., c)."""
    if kernel.moments is None:
        return kernel.pressure(points)[..., None]
    return kernel.moments(points)


@pytest.mark.parametrize("edge", [(), *EDGES.values()])
def test_the_fields_have_every_linear_pressure(edge):
    """And no other: the loads of all fields span 1, x and y."""
    loads = []
    for coefficients in fields(edge):
        p, g = pressure(coefficients)
        loads.append([p, *g])
        x = np.array([(0.3, -0.8), (-1.0, 0.5)])
        found = oracles.polynomial_pressure(x, coefficients)
        np.testing.assert_allclose(found, p + x @ g, atol=1e-9)
    assert np.linalg.matrix_rank(np.array(loads), tol=1e-3) == 3


@pytest.mark.parametrize("what", KERNELS)
@given(st.data())
def test_any_polynomial_that_meets_the_conditions_is_exact(what, data):
    plate = data.draw(polynomial_plates(what))
    found, scale = integrated(kernel_of(what, plate), plate)
    exact = value_of(what, plate)
    assert found == pytest.approx(exact, rel=1e-11, abs=1e-13 * scale)


@pytest.mark.parametrize("what", KERNELS)
@given(st.data())
def test_terms_of_levys_series_are_exact(what, data):
    plate = data.draw(series_plates(what))
    found, scale = integrated(kernel_of(what, plate), plate)
    exact = value_of(what, plate)
    assert found == pytest.approx(exact, rel=1e-11, abs=1e-13 * scale)


@pytest.mark.parametrize("what", KERNELS)
def test_a_loaded_rectangle_is_exact(what):
    """By a whole series, or Ritz's method; another check of signs."""
    sides, load = (
        (1.0, 0.8),
        oracles.LinearPressure(at_origin=-1.0, gradient=(0.5, 0.3)),
    )
    clamped = partial(oracles.clamped_rectangle, terms=40)
    solution = clamped if what == "clamping" else oracles.navier
    plate = Placed(
        state=lambda x: solution(x, sides, load),
        load=load,
        turn=np.eye(2),
        size=1.0,
        shift=np.zeros(2),
    )
    local = (0.4, 0.0 if what in EDGES else 0.45)
    kernel = kernel_of(what, plate, local=local, radius=0.3)
    found, _ = integrated(kernel, plate, local=local, count=(16, 24))
    tolerance = 1e-7 if what == "clamping" else 1e-9  # 40 terms of Ritz's method
    assert found == pytest.approx(value_of(what, plate, local=local), rel=tolerance)
    if what == "reaction":
        assert found > 0.0  # pressed down, pushed up


@given(st.floats(-2.0, 2.0), nus, rigidities)
def test_moments_of_the_radial_profiles(exponent, nu, D):
    """Integral one, second moment zero; gradients turn x into minus the direction."""
    R, centre = 10.0**exponent, (3.0, -2.0)
    kernel = kernels.moment_kernel(centre, R, COMPONENT)
    x, weights = rule(kernel)
    r2 = np.sum((x - centre) ** 2, axis=1)
    first = weights @ kernel.moments(x)
    np.testing.assert_allclose(first, COMPONENT, rtol=1e-12)
    second = (weights * r2) @ kernel.moments(x)
    np.testing.assert_allclose(second, 0.0, atol=1e-12 * R**2)

    shear = kernels.shear_kernel(centre, R, DIRECTION, nu=nu).moments(x)
    np.testing.assert_array_equal(shear[:, 0], shear[:, 1])
    assert not shear[:, 2].any()
    moved = (weights * shear[:, 0]) @ (x - centre) * (1.0 + nu)
    np.testing.assert_allclose(moved, -DIRECTION, rtol=1e-9)

    slope = weights * kernels.slope_kernel(centre, R, DIRECTION, D=D).pressure(x)
    np.testing.assert_allclose(slope @ (x - centre), DIRECTION, rtol=1e-9)
    cubic = (slope * r2) @ (x - centre)
    np.testing.assert_allclose(cubic, 0.0, atol=1e-10 * R**2)


@pytest.mark.parametrize("what", KERNELS)
@given(similarities(), seeds)
def test_a_kernel_turns_and_scales_with_its_plate(what, similarity, seed):
    turn, size, shift = similarity
    rng = np.random.default_rng(seed)
    x, gradient = rng.uniform(-1.0, 1.0, (40, 2)), rng.normal(size=2)
    own, placed = some_kernel(what), some_kernel(what, shift, size, turn)
    for_weights, for_load = POWERS[what]
    expected = weights_of(own, x)
    if own.moments is not None:
        expected = turned(turn, expected)
    found = weights_of(placed, shift + size * x @ turn.T) / size**for_weights
    np.testing.assert_allclose(found, expected, rtol=1e-9, atol=1e-11)
    found = placed.constant(1.7, turn @ gradient / size) / size**for_load
    assert found == pytest.approx(own.constant(1.7, gradient), rel=1e-9, abs=1e-15)


@pytest.mark.parametrize("what", KERNELS)
def test_weights_go_to_zero_at_the_rim_by_the_exponent(what):
    kernel = some_kernel(what)
    angle = np.linspace(0.1, np.pi - 0.1, 8)
    ray = np.stack([np.cos(angle), np.sin(angle)], axis=-1)
    near, nearer = (weights_of(kernel, (1.0 - d) * ray) for d in (2e-4, 1e-4))
    order = np.log2(near[nearer != 0.0] / nearer[nearer != 0.0])
    np.testing.assert_allclose(order, kernel.exponent, atol=0.01)
    assert kernel.exponent == 6
    for out in (1.0 + 1e-12, 1.5, 40.0):
        assert not weights_of(kernel, out * ray).any()


@pytest.mark.parametrize("what", EDGES)
def test_a_half_disc_ends_at_the_edge(what):
    kernel = some_kernel(what)
    x = np.array([(0.2, 0.3), (0.2, 0.0), (0.2, -1e-12), (0.2, -1e-6), (-0.5, -0.5)])
    there = [True, True, True, False, False]
    assert weights_of(kernel, x).any(axis=1).tolist() == there
    assert kernel.holds(x).tolist() == there


@pytest.mark.parametrize("what", KERNELS)
def test_a_kernel_holds_inside_its_disc(what):
    kernel = some_kernel(what, (2.0, 1.0), 0.5)
    x = np.array([[(2.0, 1.0), (2.3, 1.3)], [(2.36, 1.36), (2.6, 1.0)]])
    assert kernel.holds(x).tolist() == [[True, True], [False, False]]
    assert weights_of(kernel, x).shape[:2] == (2, 2)
    assert kernel.holds((2.1, 1.1))


@pytest.mark.parametrize("what", KERNELS)
def test_weights_are_polynomials_of_the_degree_told(what):
    kernel = some_kernel(what)
    s = np.linspace(-1.0, 1.0, 201)
    x = np.stack([0.9 * s, 0.3 + 0.2 * s], axis=-1)[np.abs(s) < 0.9]  # across the disc
    s = s[np.abs(s) < 0.9]
    assert kernel.holds(x).all()
    w = weights_of(kernel, x).sum(axis=1)
    for degree, exact in ((kernel.degree, True), (kernel.degree - 1, False)):
        missed = Polynomial.fit(s, w, degree)(s) - w
        assert (np.abs(missed).max() < 1e-11 * np.abs(w).max()) == exact


def test_the_cut_off_of_the_clamping_kernel_spares_the_mesh(monkeypatch):
    """Without its second factor the Laplacian of the pressure is 1.4 times as large."""

    def roughness():
        kernel, h = some_kernel("clamping"), 1e-3
        x, weights = rule(kernel)
        steps = h * np.array([(1, 0), (-1, 0), (0, 1), (0, -1)])
        inside = x[:, 1] > 2 * h
        around = [kernel.pressure(x[inside] + step) for step in steps]
        laplacian = (np.sum(around, axis=0) - 4 * kernel.pressure(x[inside])) / h**2
        return math.sqrt(weights[inside] @ laplacian**2)

    own = roughness()
    monkeypatch.setattr(kernels, "_CUT_OFF", Polynomial([0.0, 1.0]) ** 10)
    assert roughness() / own == pytest.approx(1.4, abs=0.05)


def test_a_kernel_keeps_a_copy_of_what_it_was_given():
    centre, inward = np.array([1.0, 2.0]), np.array([0.0, 1.0])
    kernel = kernels.clamping_kernel(centre, 0.5, inward, D=2.0)
    before = kernel.pressure((0.9, 2.2))
    centre += 1.0
    inward[:] = (1.0, 0.0)
    assert kernel.pressure((0.9, 2.2)) == before
    assert kernel.centre.tolist() == [1.0, 2.0]
    with pytest.raises(ValueError, match="read-only"):
        kernel.inward[0] = 2.0
