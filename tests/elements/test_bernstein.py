"""Bernstein polynomials: identities that hold whatever the degree."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from strategies import numbers, points_in

from kplate.elements import bernstein
from kplate.quadrature import triangle_rule

degrees = st.integers(1, 6)


@given(degrees, points_in(count=5))
def test_values_add_up_to_one(degree, l):
    total = bernstein.values(degree, l).sum(axis=-1)
    np.testing.assert_allclose(total, 1.0, rtol=1e-14)


@given(degrees, points_in(count=5), numbers(3))
def test_powers_of_a_linear_function_are_reproduced(degree, l, c):
    """``(c . l)^p`` has the ordinates ``c0^a0 c1^a1 c2^a2`` (multinomial theorem)."""
    ordinates = np.prod(c ** np.array(bernstein.indices(degree)), axis=-1)
    found = bernstein.values(degree, l) @ ordinates
    np.testing.assert_allclose(found, (l @ c) ** degree, rtol=0.0, atol=1e-14)


@given(degrees, points_in(count=5))
def test_gradients_against_differences(degree, l):
    step = 1e-5
    found = bernstein.gradients(degree, l)
    for v in range(3):
        move = step * np.eye(3)[v]
        ahead, behind = (bernstein.values(degree, l + s * move) for s in (1.0, -1.0))
        difference = (ahead - behind) / (2.0 * step)
        np.testing.assert_allclose(found[:, v], difference, rtol=0.0, atol=1e-7)


@given(degrees, points_in(count=5))
def test_gradients_point_out_the_degree(degree, l):
    """Euler: ``l . grad B = p B`` for homogeneous B."""
    radial = np.einsum("qv,qvk->qk", l, bernstein.gradients(degree, l))
    expected = degree * bernstein.values(degree, l)
    np.testing.assert_allclose(radial, expected, rtol=0.0, atol=1e-13)


@pytest.mark.parametrize("degree", range(7))
def test_all_have_the_same_mean(degree):
    rule = triangle_rule(degree)
    means = rule.weights @ bernstein.values(degree, rule.points)
    count = math.comb(degree + 2, 2)
    assert len(means) == count
    np.testing.assert_allclose(means, 1.0 / count, rtol=1e-13)


@pytest.mark.parametrize("degree", range(1, 7))
def test_indices_and_positions_belong_together(degree):
    indices, place = bernstein.indices(degree), bernstein.position(degree)
    assert len(indices) == math.comb(degree + 2, 2)
    assert all(sum(index) == degree and min(index) >= 0 for index in indices)
    assert [place[index] for index in indices] == list(range(len(indices)))
    corners = bernstein.values(degree, np.eye(3))
    for v in range(3):
        index = tuple(degree if k == v else 0 for k in range(3))
        expected = np.zeros(len(indices))
        expected[place[index]] = 1.0
        np.testing.assert_array_equal(corners[v], expected)


def test_a_constant_has_no_gradient():
    np.testing.assert_array_equal(
        bernstein.gradients(1, np.full((2, 3), 1 / 3)), np.tile(np.eye(3), (2, 1, 1))
    )
