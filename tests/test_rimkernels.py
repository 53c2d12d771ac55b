"""The kernel of a free round rim against plates known in closed form.

Around the centre, n waves: sums of r^n, r^-n, r^(2-n), r^(2+n) (with logarithms for
n = 0 and 1), and of what bends under a pressure that is even or linear, that leave the
rim free. Place, size, turn and Poisson's ratio are random.
"""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from strategies import similarities

from kplate import rimkernels
from kplate.rimkernels import rim_moment_kernel

WAVES = range(7)
seeds = st.integers(0, 2**32 - 1)
nus = st.floats(0.0, 0.45)
rigidities = st.floats(-3.0, 7.0).map(lambda exponent: 10.0**exponent)
# Rings around a hole and in a disc, in radii of the rim: near and far edge.
rings = st.one_of(
    st.tuples(st.floats(1.1, 1.8), st.floats(0.3, 6.0)).map(lambda s: (s[0], sum(s))),
    st.tuples(st.floats(0.55, 0.9), st.floats(0.1, 0.25)),
)


def radial(n, r):
    """Derivatives (4, terms, ...) of the radial parts of n waves; the last is loaded.

    D lap lap of it times cos or sin is 64 D for n = 0, 192 D r for n = 1, else 0.
    """
    r = np.asarray(r, dtype=float)
    # powers, and whether there is a logarithm
    parts = {
        0: [(0, 0), (2, 0), (0, 1), (2, 1), (4, 0)],
        1: [(1, 0), (3, 0), (-1, 0), (1, 1), (5, 0)],
    }.get(n, [(n, 0), (-n, 0), (2 - n, 0), (2 + n, 0)])
    table = []
    for power, log in parts:
        # d/dr of r^k (a + b log r) is r^(k - 1) (k a + b + k b log r)
        a, b, k, own = 1.0 - log, float(log), power, []
        for _ in range(4):
            own.append(r ** float(k) * (a + b * np.log(r)))
            a, b, k = k * a + b, k * b, k - 1
        table.append(own)
    return np.moveaxis(np.array(table), 0, 1)


def bending(n, table, r, nu):
    """m_nn, m_tt and v_n over D of the radial parts, outward normal along r."""
    w, w1, w2, w3 = table
    turned = w1 / r - n**2 * w / r**2
    m_nn, m_tt = w2 + nu * turned, turned + nu * w2
    laplacian = w3 + w2 / r - w1 / r**2 - n**2 * (w1 / r**2 - 2.0 * w / r**3)
    v_n = -laplacian + (1.0 - nu) * n**2 * (w1 / r**2 - w / r**3)
    return m_nn, m_tt, v_n


def free_fields(n, nu):
    """Coefficients (k, terms) of fields of n waves with the unit circle free."""
    m_nn, _, v_n = bending(n, radial(n, 1.0), 1.0, nu)
    rows = np.array([m_nn, v_n])
    _, _, V = np.linalg.svd(rows / np.linalg.norm(rows, axis=1, keepdims=True))
    return V[2:]


def rule(near, far, count=(50, 384)):
    """Radii, angles and weights of a rule on a ring."""
    t, s = np.polynomial.legendre.leggauss(count[0])
    r = 0.5 * (near + far) + 0.5 * (far - near) * t
    angle = 2.0 * np.pi * np.arange(count[1]) / count[1]
    weights = np.abs(far - near) * np.pi / count[1] * s * r
    return r[:, None], angle[None, :], np.repeat(weights[:, None], count[1], axis=1)


def ring_kernel(ring, similarity, angle, *, D, nu):
    turn, size, shift = similarity
    at = shift + size * turn @ [math.cos(angle), math.sin(angle)]
    circle = (*shift, size)
    near, far = ring
    return rim_moment_kernel(at, circle, (size * near, size * far), D=D, nu=nu)


@pytest.mark.parametrize("n", WAVES)
@settings(max_examples=15)
@given(rings, similarities(), st.floats(0.0, 6.3), seeds, nus, rigidities)
def test_fields_with_a_free_rim_are_exact(n, ring, similarity, place, seed, nu, D):
    turn, size, shift = similarity
    rng = np.random.default_rng(seed)
    basis, phase = free_fields(n, nu), rng.uniform(0.0, 6.0)
    mix = rng.normal(size=len(basis)) @ basis
    kernel = ring_kernel(ring, similarity, place, D=D, nu=nu)
    r, angle, weights = rule(*ring)
    w = np.tensordot(mix, radial(n, r)[0], 1) * np.cos(n * (angle - phase))
    local = np.stack([r * np.cos(angle), r * np.sin(angle)], axis=-1)
    b = kernel.pressure(shift + size * local @ turn.T)
    terms = size**2 * weights * w * b
    pressure, gradient = 0.0, np.zeros(2)
    if n == 0:
        pressure = 64.0 * D * mix[-1] / size**4
    elif n == 1:
        slope = 192.0 * D * mix[-1] / size**5
        gradient = slope * turn @ [math.cos(phase), math.sin(phase)]
    load = kernel.constant(pressure, gradient)
    m_tt = D / size**2 * bending(n, radial(n, 1.0), 1.0, nu)[1] @ mix
    exact = m_tt * math.cos(n * (place - phase))
    scale = np.abs(terms).sum() + abs(load)
    assert terms.sum() + load == pytest.approx(exact, rel=1e-9, abs=1e-11 * scale)


@given(rings, nus)
def test_a_load_is_in_the_constant(ring, nu):
    """Without it an even and a linear pressure are off by a large share."""
    kernel = ring_kernel(ring, (np.eye(2), 1.0, np.zeros(2)), 0.0, D=1.0, nu=nu)
    assert abs(kernel.constant(64.0, (0.0, 0.0))) > 1e-3
    assert kernel.constant(0.0, (0.0, 1.0)) == pytest.approx(0.0, abs=1e-15)


@settings(max_examples=15)
@given(rings, similarities(), st.floats(0.0, 6.3), nus)
def test_rigid_motions_have_no_moment(ring, similarity, place, nu):
    turn, size, shift = similarity
    kernel = ring_kernel(ring, similarity, place, D=1.0, nu=nu)
    r, angle, weights = rule(*ring)
    local = np.stack([r * np.cos(angle), r * np.sin(angle)], axis=-1)
    b = size**4 * kernel.pressure(shift + size * local @ turn.T) * weights
    scale = np.abs(b).sum()
    for motion in (np.ones_like(b), local[..., 0], local[..., 1]):
        assert (b * motion).sum() == pytest.approx(0.0, abs=1e-11 * scale)


@pytest.mark.parametrize("ring", [(1.2, 3.0), (0.8, 0.2)])
def test_weights_are_those_of_the_ring_alone(ring):
    kernel = ring_kernel(ring, (np.eye(2), 2.0, np.zeros(2)), 0.3, D=1.0, nu=0.3)
    low, high = sorted(ring)
    assert (kernel.inner, kernel.radius) == (2.0 * low, 2.0 * high)
    angle = np.linspace(0.0, 6.0, 7)
    ray = np.stack([np.cos(angle), np.sin(angle)], axis=-1)
    for out in (0.5 * low, low - 1e-9, high + 1e-9, 2.0 * high):
        assert not kernel.pressure(2.0 * out * ray).any()
        assert not kernel.holds(2.0 * out * ray).any()
    assert kernel.holds((low + high) * ray).all()
    for edge, sign in ((low, 1.0), (high, -1.0)):
        near, nearer = (
            kernel.pressure(2.0 * (edge + sign * d) * ray) for d in (2e-5, 1e-5)
        )
        np.testing.assert_allclose(np.log2(near / nearer), kernel.exponent, atol=0.02)


@pytest.mark.parametrize("ring", [(1.15, 1.9), (1.3, 10.0), (0.85, 0.3)])
def test_no_rigid_motion_added_makes_the_weights_larger(ring, monkeypatch):
    """Those that vanish halfway are the smaller ones, for a mesh to follow."""

    def size():
        kernel = ring_kernel(ring, (np.eye(2), 1.0, np.zeros(2)), 0.0, D=1.0, nu=0.3)
        r, angle, weights = rule(*ring)
        x = np.stack([r * np.cos(angle), r * np.sin(angle)], axis=-1)
        return math.sqrt((weights * kernel.pressure(x) ** 2).sum())

    own = size()
    monkeypatch.setattr(rimkernels._Field, "rigid", (0.0, 0.0))
    assert size() > 1.03 * own
