"""Areas and gradients on triangles, and the record that elements are given."""

import numpy as np
import pytest
from hypothesis import given
from strategies import numbers, points_in, size_of, triangles

from kplate.elements.triangle import EDGES, Geometry, area, barycentric_gradients
from kplate.quadrature import MIDPOINTS


@given(triangles())
def test_area_is_half_the_longest_edge_times_the_height(X):
    lengths = [np.hypot(*(X[j] - X[i])) for i, j in EDGES]
    k = int(np.argmax(lengths))
    i, j = EDGES[k]
    along = (X[j] - X[i]) / lengths[k]
    height = np.hypot(*(X[k] - X[i] - along * (along @ (X[k] - X[i]))))
    assert area(X[None])[0] == pytest.approx(0.5 * lengths[k] * height, rel=1e-11)


@given(triangles(), numbers(3), points_in(count=2))
def test_gradients_carry_a_linear_function_from_point_to_point(X, values, l):
    slope = values @ barycentric_gradients(X[None])[0]
    found = slope @ ((l[1] - l[0]) @ X)
    assert found == pytest.approx((l[1] - l[0]) @ values, abs=1e-11)


def test_edge_k_lies_opposite_vertex_k():
    for k, (i, j) in enumerate(EDGES):
        assert {i, j, k} == {0, 1, 2}
        assert (j - i) % 3 == 1


@given(triangles())
def test_geometry_keeps_vertices_of_its_own(X):
    given_vertices = X[None].copy()
    geometry = Geometry(vertices=given_vertices, rule=MIDPOINTS)
    given_vertices += size_of(X)
    np.testing.assert_array_equal(geometry.vertices, X[None])
    with pytest.raises(ValueError, match="read-only"):
        geometry.vertices[0] = 0.0
