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
from_two = st.integers(2, 6)


def difference(function, degree, l, v):
    """Central difference of a function of barycentrics by barycentric v."""
    step = 1e-5 * np.eye(3)[v]
    return (function(degree, l + step) - function(degree, l - step)) / 2e-5


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
    found = bernstein.gradients(degree, l)
    for v in range(3):
        expected = difference(bernstein.values, degree, l, v)
        np.testing.assert_allclose(found[:, v], expected, rtol=0.0, atol=1e-7)


@given(from_two, points_in(count=5))
def test_hessians_against_differences(degree, l):
    found = bernstein.hessians(degree, l)
    assert found.shape == (5, 6, len(bernstein.indices(degree)))
    for pair, (v, u) in enumerate(bernstein.PAIRS):
        expected = difference(bernstein.gradients, degree, l, v)[:, u]
        np.testing.assert_allclose(found[:, pair], expected, rtol=0.0, atol=1e-6)


@given(from_two, points_in(count=5))
def test_hessian_gradients_against_differences(degree, l):
    """Of quadratics too, whose hessians do not change."""
    found = bernstein.hessian_gradients(degree, l)
    assert found.shape == (5, 3, 6, len(bernstein.indices(degree)))
    for v in range(3):
        expected = difference(bernstein.hessians, degree, l, v)
        np.testing.assert_allclose(found[:, v], expected, rtol=0.0, atol=1e-5)


def test_pairs_are_all_pairs_of_barycentrics():
    found = sorted(tuple(sorted(pair)) for pair in bernstein.PAIRS)
    assert found == [(0, 0), (0, 1), (0, 2), (1, 1), (1, 2), (2, 2)]


@pytest.mark.parametrize("degree", range(1, 7))
def test_masses_are_the_means_of_products(degree):
    rule = triangle_rule(2 * degree)
    B = bernstein.values(degree, rule.points)
    expected = np.einsum("q,qi,qj->ij", rule.weights, B, B)
    np.testing.assert_allclose(bernstein.masses(degree), expected, rtol=1e-12)


@pytest.mark.parametrize("degree", range(2, 7))
def test_bendings_are_the_means_of_products_of_hessians(degree):
    rule = triangle_rule(2 * degree - 4)
    H = bernstein.hessians(degree, rule.points)
    count = H.shape[-1]
    expected = np.einsum("q,qxi,qyj->xyij", rule.weights, H, H)
    found = bernstein.bendings(degree).reshape(6, 6, count, count)
    np.testing.assert_allclose(found, expected, rtol=1e-12, atol=1e-12 * degree**4)


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
