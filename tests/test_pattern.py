"""The assembled lower triangle against a dense sum by plain loops.

Entries are whole numbers, so that sums are exact in whatever order.
"""

import numpy as np
import pytest
from plates import grid

from kplate import pattern
from kplate.dofs import Numbering
from kplate.mesh import Mesh
from kplate.pattern import Pattern

# Reduced and full C1 triangles, the quintic, the dual of order 3, edges alone.
UNKNOWNS = [(3, 0), (3, 1), (6, 1), (1, 7), (0, 2)]
each = pytest.mark.parametrize(("per_vertex", "per_edge"), UNKNOWNS)


@pytest.fixture(scope="module")
def mesh():
    """Triangles of no order: numbered, begun and listed at random."""
    rng = np.random.default_rng(3)
    regular = grid(4, m=3)
    number = rng.permutation(len(regular.points))
    points = np.empty_like(regular.points)
    points[number] = regular.points
    triangles = [np.roll(own, rng.integers(3)) for own in number[regular.triangles]]
    return Mesh(
        points=points,
        triangles=rng.permutation(triangles),
        boundary_edges=number[regular.boundary_edges],
        boundary_sides=regular.boundary_sides,
        side_names=regular.side_names,
    )


def random_elements(numbering, rng):
    """Symmetric matrices of whole numbers for all triangles, (n, d, d)."""
    n, d = numbering.table.shape
    K = rng.integers(-99, 100, (n, d, d)).astype(float)
    return K + K.swapaxes(1, 2)


def blocks(K, size, order):
    """Triangles in this order, some at a time."""
    for start in range(0, len(order), size):
        own = order[start : start + size]
        yield own, K[own]


def dense(numbering, K, triangles):
    """Sum of the matrices of some triangles, entry by entry."""
    total = np.zeros((numbering.count, numbering.count))
    for k in triangles:
        for a, row in enumerate(numbering.table[k]):
            for b, column in enumerate(numbering.table[k]):
                total[row, column] += K[k, a, b]
    return total


def assert_lower(found, expected, free):
    """Compare with the lower triangle of a dense matrix, and check the storage."""
    whole = expected[np.ix_(free, free)]
    np.testing.assert_array_equal(found.toarray(), np.tril(whole))
    assert found.data.dtype == np.float64
    for column in range(found.shape[1]):
        rows = found.indices[found.indptr[column] : found.indptr[column + 1]]
        assert rows[0] == column
        assert (np.diff(rows) > 0).all()


@each
def test_the_matrix_is_the_lower_triangle_of_the_sum(mesh, per_vertex, per_edge):
    numbering = Numbering(mesh=mesh, per_vertex=per_vertex, per_edge=per_edge)
    rng = np.random.default_rng(7)
    K = random_elements(numbering, rng)
    order = rng.permutation(len(mesh.triangles))
    expected = dense(numbering, K, order)
    everything = np.ones(numbering.count, dtype=bool)
    own = Pattern(numbering=numbering)
    for free in (everything, rng.random(numbering.count) < 0.7):
        assert_lower(own.matrix(blocks(K, 5, order), free), expected, free)


@each
def test_unknowns_that_meet_in_no_triangle_have_no_entry(mesh, per_vertex, per_edge):
    numbering = Numbering(mesh=mesh, per_vertex=per_vertex, per_edge=per_edge)
    n, d = numbering.table.shape
    order = np.arange(n)
    met = dense(numbering, np.ones((n, d, d)), order) > 0.0
    free = np.ones(numbering.count, dtype=bool)
    found = Pattern(numbering=numbering).matrix(
        blocks(np.ones((n, d, d)), n, order), free
    )
    assert found.nnz == np.count_nonzero(np.tril(met))


@each
def test_some_triangles_alone_leave_the_rest_zero(mesh, per_vertex, per_edge):
    numbering = Numbering(mesh=mesh, per_vertex=per_vertex, per_edge=per_edge)
    K = random_elements(numbering, np.random.default_rng(11))
    free = np.ones(numbering.count, dtype=bool)
    own = Pattern(numbering=numbering)
    for order in (np.array([], dtype=int), np.array([4]), np.array([9, 2, 17])):
        expected = dense(numbering, K, order)
        assert_lower(own.matrix(blocks(K, 2, order), free), expected, free)


@each
def test_summing_in_chunks_changes_nothing(mesh, per_vertex, per_edge, monkeypatch):
    """In chunks of one block, of several, and all at once."""
    numbering = Numbering(mesh=mesh, per_vertex=per_vertex, per_edge=per_edge)
    K = random_elements(numbering, np.random.default_rng(13))
    order = np.arange(len(mesh.triangles))
    free = np.arange(numbering.count) % 5 > 0
    expected = dense(numbering, K, order)
    own, sums = Pattern(numbering=numbering), []
    once = pattern._summed

    def counted(at, values, size):
        sums.append(len(at))
        return once(at, values, size)

    monkeypatch.setattr(pattern, "_summed", counted)
    entries = K[:3].size  # at most what a block of 3 triangles brings
    for chunk in (1, 2 * entries, 1 << 23):
        sums.clear()
        monkeypatch.setattr(pattern, "CHUNK", chunk)
        assert_lower(own.matrix(blocks(K, 3, order), free), expected, free)
        assert (len(sums) > 2) == (chunk < 1 << 23)


def test_a_single_triangle_is_its_own_matrix():
    """Its edges 12, 20 and 01 are numbered 2, 1 and 0."""
    alone = Mesh(
        points=[(0, 0), (1, 0), (0, 1)],
        triangles=[(0, 1, 2)],
        boundary_edges=[(0, 1), (1, 2), (2, 0)],
        boundary_sides=[0, 0, 0],
        side_names=("rim",),
    )
    numbering = Numbering(mesh=alone, per_vertex=1, per_edge=1)
    K = random_elements(numbering, np.random.default_rng(17))
    free = np.ones(6, dtype=bool)
    found = Pattern(numbering=numbering).matrix([(np.array([0]), K)], free)
    order = [0, 1, 2, 5, 4, 3]
    np.testing.assert_array_equal(found.toarray(), np.tril(K[0][np.ix_(order, order)]))
