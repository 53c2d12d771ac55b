"""Rules against the exact integrals of monomials.

Over a triangle of area 1 the mean of ``l0^a l1^b l2^c`` in barycentrics is
``2 a! b! c! / (a + b + c + 2)!``; on [0, 1] that of ``s^k`` is 1/(k + 1).
"""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from strategies import points_in

from kplate.elements.bernstein import indices
from kplate.quadrature import MIDPOINTS, Rule, composite, gauss, triangle_rule

RULES = [(MIDPOINTS, 2)] + [(triangle_rule(degree), degree) for degree in range(15)]


def exact(a, b, c):
    top = math.factorial(a) * math.factorial(b) * math.factorial(c)
    return 2.0 * top / math.factorial(a + b + c + 2)


def errors(rule, degree):
    """Relative errors over all monomials of one degree."""
    return np.array(
        [
            rule.weights @ np.prod(rule.points**a, axis=1) / exact(*a) - 1.0
            for a in indices(degree)
        ]
    )


@pytest.mark.parametrize(("rule", "degree"), RULES)
def test_monomials_are_exact_up_to_the_degree_and_not_beyond(rule, degree):
    for lower in range(degree + 1):
        assert np.abs(errors(rule, lower)).max() < 1e-13
    assert np.abs(errors(rule, degree + 1)).max() > 1e-5


@pytest.mark.parametrize(("rule", "degree"), RULES)
def test_weights_are_positive_and_points_inside(rule, degree):
    assert (rule.weights > 0.0).all()
    assert rule.weights.sum() == pytest.approx(1.0, rel=1e-14)
    assert (rule.points >= 0.0).all()
    np.testing.assert_allclose(rule.points.sum(axis=1), 1.0, rtol=1e-14)


@pytest.mark.parametrize("n", range(1, 15))
def test_gauss_is_exact_to_degree_two_n_minus_one(n):
    """What it misses of s^(2n) is the integral of Legendre's monic polynomial squared.

    That is ``n!^4 / ((2n + 1) (2n)!^2)`` on [0, 1].
    """
    points, weights = gauss(n)
    assert len(points) == n
    for k in range(2 * n):
        assert weights @ points**k == pytest.approx(1.0 / (k + 1), rel=1e-13)
    missed = math.factorial(n) ** 4 / ((2 * n + 1) * math.factorial(2 * n) ** 2)
    found = weights @ points ** (2 * n)
    assert found == pytest.approx(1.0 / (2 * n + 1) - missed, abs=1e-15)


@given(points_in(count=1), st.integers(0, 8))
def test_a_composite_rule_is_exact_on_each_piece(apex, degree):
    """Pieces from a point inside to the edges, one of them listed clockwise."""
    corners = np.eye(3)
    pieces = np.array([[corners[i], corners[i - 1], apex[0]] for i in range(3)])
    pieces[1, :2] = pieces[1, 1::-1]
    rule = composite(pieces, triangle_rule(degree))
    for lower in range(degree + 1):
        assert np.abs(errors(rule, lower)).max() < 1e-12
    count = len(triangle_rule(degree).weights)
    for k, piece in enumerate(pieces):
        own = slice(k * count, (k + 1) * count)
        share = abs(np.linalg.det(piece))
        assert rule.weights[own].sum() == pytest.approx(share, rel=1e-12)
        inside = rule.points[own] @ np.linalg.inv(piece)
        assert inside.min() > 0.0
        mean = rule.weights[own] @ rule.points[own] / share
        np.testing.assert_allclose(
            mean, piece.mean(axis=0), atol=1.0 if degree == 0 else 1e-12
        )


def test_rules_cannot_be_changed():
    rule = Rule(points=[[1.0, 0.0, 0.0]], weights=[1.0])
    for array in (rule.points, rule.weights, *gauss(2)):
        with pytest.raises(ValueError, match="read-only"):
            array[0] = 0.0
