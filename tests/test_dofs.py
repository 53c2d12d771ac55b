"""The numbering of unknowns, on meshes small enough to number by hand."""

import numpy as np
import pytest
from plates import grid

from kplate.dofs import Numbering
from kplate.mesh import Mesh


@pytest.fixture
def square():
    """Two triangles; the edges in rising order are 01, 02, 03, 12, 23."""
    return Mesh(
        points=[(0, 0), (1, 0), (1, 1), (0, 1)],
        triangles=[(0, 1, 2), (2, 3, 0)],
        boundary_edges=[(0, 1), (1, 2), (2, 3), (3, 0)],
        boundary_sides=[0, 0, 0, 0],
        side_names=("rim",),
    )


def test_unknowns_at_vertices_come_in_the_order_of_the_vertices(square):
    numbering = Numbering(mesh=square, per_vertex=3, per_edge=0)
    assert numbering.count == 12
    expected = [[0, 1, 2, 3, 4, 5, 6, 7, 8], [6, 7, 8, 9, 10, 11, 0, 1, 2]]
    np.testing.assert_array_equal(numbering.table, expected)
    at = numbering.at_vertices(np.array([[2], [1]]))
    np.testing.assert_array_equal(at, [[[6, 7, 8]], [[3, 4, 5]]])


@pytest.mark.parametrize(
    ("per_vertex", "per_edge", "expected"),
    [
        # Edges opposite the vertices: 12, 02, 01 and 03, 02, 23.
        (1, 1, [[0, 1, 2, 7, 5, 4], [2, 3, 0, 6, 5, 8]]),
        (0, 2, [[6, 7, 2, 3, 0, 1], [4, 5, 2, 3, 8, 9]]),
    ],
)
def test_unknowns_on_edges_follow_those_at_vertices(
    square, per_vertex, per_edge, expected
):
    numbering = Numbering(mesh=square, per_vertex=per_vertex, per_edge=per_edge)
    assert numbering.count == 4 * per_vertex + 5 * per_edge
    np.testing.assert_array_equal(numbering.table, expected)


@pytest.mark.parametrize(("per_vertex", "per_edge"), [(3, 0), (3, 1), (6, 1), (1, 2)])
def test_every_unknown_belongs_to_as_many_triangles_as_its_vertex_or_edge(
    per_vertex, per_edge
):
    mesh = grid(3)
    numbering = Numbering(mesh=mesh, per_vertex=per_vertex, per_edge=per_edge)
    found = np.bincount(numbering.table.ravel(), minlength=numbering.count)
    at_vertex = np.bincount(mesh.triangles.ravel())
    on_edge = np.bincount(mesh.triangle_edges.ravel())
    expected = np.concatenate(
        [np.repeat(at_vertex, per_vertex), np.repeat(on_edge, per_edge)]
    )
    np.testing.assert_array_equal(found, expected)


@pytest.mark.parametrize("per_edge", [0, 1])
def test_values_are_viewed_by_vertex(square, per_edge):
    numbering = Numbering(mesh=square, per_vertex=3, per_edge=per_edge)
    values = np.arange(2.0 * numbering.count).reshape(-1, 2)
    found = numbering.by_vertex(values)
    assert found.shape == (4, 3, 2)
    assert np.shares_memory(found, values)
    for vertex in range(4):
        own = numbering.at_vertices(np.array(vertex))
        np.testing.assert_array_equal(found[vertex], values[own])
    assert numbering.by_vertex(values[:, 0]).shape == (4, 3, 1)
