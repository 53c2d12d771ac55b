"""Areas and gradients on triangles, and the record that elements are given."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from strategies import kites, numbers, points_in, size_of, triangles

from kplate.elements.triangle import (
    EDGES,
    Geometry,
    area,
    barycentric_gradients,
    edge_normals,
    edge_senses,
)
from kplate.quadrature import MIDPOINTS


def edge_vectors(X):
    """Edges of a triangle (3, 2) in its own sense of running round, (3, 2)."""
    return np.array([X[j] - X[i] for i, j in EDGES])


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
def test_edge_normals_are_unit_and_square_to_their_edges(X):
    normals = edge_normals(X[None])[0]
    np.testing.assert_allclose(np.hypot(*normals.T), 1.0, rtol=1e-14)
    along = np.einsum("kc,kc->k", normals, edge_vectors(X)) / size_of(X)
    np.testing.assert_allclose(along, 0.0, atol=1e-15)


@given(triangles())
def test_edges_run_to_the_right_with_their_normals_below(X):
    """So both are geometric: no number of a triangle or vertex decides."""
    edges, senses = edge_vectors(X), edge_senses(X[None])[0]
    assert set(senses) <= {1.0, -1.0}
    run = edges * senses[:, None]
    assert (run[:, 0] >= 0.0).all()
    normals = edge_normals(X[None])[0]
    assert (normals[:, 1] <= 0.0).all()
    turn = run[:, 0] * normals[:, 1] - run[:, 1] * normals[:, 0]
    assert (turn < 0.0).all()  # on the right of the edge


@given(triangles())
def test_normals_point_out_of_the_triangle_where_the_edge_runs_its_way(X):
    """Counter-clockwise, what is on an edge's right is outside."""
    inward = barycentric_gradients(X[None])[0]
    outward = -np.sign(np.einsum("kc,kc->k", inward, edge_normals(X[None])[0]))
    np.testing.assert_array_equal(outward, edge_senses(X[None])[0])


@given(kites())
def test_both_triangles_of_an_edge_see_one_normal_and_opposite_senses(kite):
    """Whatever vertex each of them starts with."""
    assert_same_edge(*kite)


@pytest.mark.parametrize("run", [(0.0, 1.0), (0.0, -1.0), (1.0, 0.0), (-1.0, 0.0)])
@given(st.integers(0, 2), st.integers(0, 2), st.floats(-6.0, 6.0), numbers(2))
def test_so_they_do_on_upright_and_level_edges(run, first, second, exponent, shift):
    """An upright edge runs up, a level one to the right."""
    a = np.array(run)
    left = np.array([-a[1], a[0]])
    around = np.array([0.0 * a, a, 0.4 * a + left, 0.3 * a - left])
    points = 10.0**exponent * (shift + around)
    corners = np.array([np.roll([0, 1, 2], first), np.roll([1, 0, 3], second)])
    normal = assert_same_edge(points, corners)
    expected = (1.0, 0.0) if a[0] == 0.0 else (0.0, -1.0)
    np.testing.assert_allclose(normal, expected, atol=1e-15)


def assert_same_edge(points, corners):
    """Compare what two triangles say of the edge of points 0 and 1; its normal."""
    X = points[corners]
    opposite = [int(np.flatnonzero(own >= 2)[0]) for own in corners]
    normals = edge_normals(X)[[0, 1], opposite]
    senses = edge_senses(X)[[0, 1], opposite]
    np.testing.assert_array_equal(normals[0], normals[1])
    assert senses[0] == -senses[1]
    return normals[0]


@given(triangles(), st.integers(1, 2))
def test_renumbering_the_triangle_renumbers_its_edges(X, start):
    turned = np.roll(X, start, axis=0)
    for function in (edge_normals, edge_senses):
        expected = np.roll(function(X[None])[0], start, axis=0)
        np.testing.assert_array_equal(function(turned[None])[0], expected)


@given(triangles())
def test_geometry_keeps_vertices_of_its_own(X):
    given_vertices = X[None].copy()
    geometry = Geometry(vertices=given_vertices, rule=MIDPOINTS)
    given_vertices += size_of(X)
    np.testing.assert_array_equal(geometry.vertices, X[None])
    with pytest.raises(ValueError, match="read-only"):
        geometry.vertices[0] = 0.0
