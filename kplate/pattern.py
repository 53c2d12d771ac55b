"""Where the entries of a symmetric sparse matrix stand, found once for a mesh.

The unknowns of a vertex, or of an edge, are a *group*. Groups are numbered vertices
first, then edges. Two groups of one triangle share a block of the matrix; the pattern
lists each block once, with the smaller group as its rows, and gives every entry its
place in the upper triangle's rows. Numbers are then summed by one count over stored
places.
"""

from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.sparse as sp

from kplate.arrays import Bools, Floats, Ints
from kplate.dofs import Numbering

# Entries that are summed at a time, which bounds the memory.
CHUNK = 1 << 23


@dataclass(frozen=True, eq=False, kw_only=True)
class Pattern:
    """The pattern of a numbering's matrix.

    Parameters
    ----------
    numbering : Numbering
        Unknowns at the vertices and on the edges.
    """

    numbering: Numbering

    @cached_property
    def _sizes(self) -> Ints:
        """Unknowns of each of a triangle's groups: 3 vertices, then 3 edges if any."""
        n = self.numbering
        return np.array([n.per_vertex] * 3 + [n.per_edge] * (3 if n.per_edge else 0))

    @cached_property
    def _groups(self) -> Ints:
        """Groups of each triangle, (n_triangles, 3 or 6)."""
        mesh = self.numbering.mesh
        if not self.numbering.per_edge:
            return mesh.triangles
        return np.hstack([mesh.triangles, len(mesh.points) + mesh.triangle_edges])

    @cached_property
    def _pairs(self) -> list[tuple[int, int]]:
        """Pairs of a triangle's groups, first to be rows where it is the smaller."""
        count = len(self._sizes)
        return [(a, b) for a in range(count) for b in range(a, count)]

    @cached_property
    def _blocks(self) -> tuple[Ints, Ints, Ints]:
        """Row group and column group of each block, and the block of each pair."""
        groups, total = self._groups, int(self._groups.max()) + 1
        ends = np.array(self._pairs)
        first, second = groups[:, ends[:, 0]], groups[:, ends[:, 1]]
        key = np.minimum(first, second) * total + np.maximum(first, second)
        unique, inverse = np.unique(key, return_inverse=True)
        rows, columns = np.divmod(unique, total)
        return rows, columns, inverse.reshape(key.shape)

    @cached_property
    def _places(self) -> tuple[Ints, Ints, Ints, Ints]:
        """First place and stride of each block; pointers and columns of all rows."""
        n = self.numbering
        rows, columns, _ = self._blocks
        vertices = len(n.mesh.points)
        count = vertices + (len(n.mesh.edges) if n.per_edge else 0)
        size = np.where(np.arange(count) < vertices, n.per_vertex, n.per_edge)
        start = np.concatenate([[0], np.cumsum(size)])
        width = size[columns]
        before = np.concatenate([[0], np.cumsum(width)])
        first = np.searchsorted(rows, np.arange(count + 1))
        length = before[first[1:]] - before[first[:-1]]  # of each row of a group
        pointers = np.concatenate([[0], np.cumsum(np.repeat(length, size))])
        stride = length[rows]
        place = pointers[start[rows]] + before[:-1] - before[first[:-1]][rows]
        indices = np.empty(pointers[-1], dtype=np.int64)
        for p, q in {
            (n.per_vertex,) * 2,
            (n.per_vertex, n.per_edge),
            (n.per_edge,) * 2,
        }:
            own = np.flatnonzero((size[rows] == p) & (width == q))
            at = _entries(place[own], stride[own], p, q)
            indices[at] = start[columns[own]][:, None, None] + np.arange(q)
        return place, stride, pointers, indices

    def matrix(
        self, elements: Iterable[tuple[Ints, Floats]], free: Bools
    ) -> sp.csc_array:
        """Sum element matrices and keep the free unknowns.

        Parameters
        ----------
        elements : iterable of tuple
            Triangles (n,) and their symmetric matrices (n, d, d), block by block.
        free : ndarray, shape (count,)
            Which unknowns to keep.

        Returns
        -------
        csc_array, shape (n_free, n_free)
            The lower triangle, rows sorted, diagonal included.
        """
        _, _, pointers, indices = self._places
        data = np.zeros(pointers[-1])
        at: list[Ints] = []
        values: list[Floats] = []
        for triangles, K in elements:
            for number, pair in enumerate(self._pairs):
                where, own = self._cut(K, triangles, number, pair)
                at.append(where.ravel())
                values.append(own.ravel())
            if sum(map(len, at)) > CHUNK:
                data += _summed(at, values, len(data))
                at, values = [], []
        data += _summed(at, values, len(data))
        upper = sp.csr_array((data, indices, pointers), shape=(len(pointers) - 1,) * 2)
        return _free_lower(upper, free)

    def _cut(
        self, K: Floats, triangles: Ints, number: int, pair: tuple[int, int]
    ) -> tuple[Ints, Floats]:
        """Places and entries of a pair's blocks, rows those of the smaller group."""
        place, stride, _, _ = self._places
        ends = np.concatenate([[0], np.cumsum(self._sizes)])
        a, b = pair
        block = K[:, ends[a] : ends[a + 1], ends[b] : ends[b + 1]]
        if a != b and (a < 3) == (b < 3):
            rising = self._groups[triangles, a] < self._groups[triangles, b]
            block = np.where(rising[:, None, None], block, block.swapaxes(1, 2))
        own = self._blocks[2][triangles, number]
        return _entries(place[own], stride[own], *block.shape[1:]), block


def _summed(at: list[Ints], values: list[Floats], size: int) -> Floats:
    """Sum of values at places, (size,)."""
    if not at:
        return np.zeros(size)
    weights = np.concatenate(values)
    return np.bincount(np.concatenate(at), weights, size).astype(np.float64)


def _entries(place: Ints, stride: Ints, p: int, q: int) -> Ints:
    """Places of the entries of blocks p x q, (n, p, q)."""
    rows = place[:, None, None] + stride[:, None, None] * np.arange(p)[:, None]
    return rows + np.arange(q)


def _free_lower(upper: sp.csr_array, free: Bools) -> sp.csc_array:
    """Drop held unknowns; the rows of the upper triangle are columns of the lower."""
    n = upper.shape[0]
    rows = np.repeat(np.arange(n), np.diff(upper.indptr))
    keep = free[rows] & free[upper.indices] & (upper.indices >= rows)
    number = np.cumsum(free) - 1
    counts = np.bincount(rows[keep], minlength=n)[free]
    pointers = np.concatenate([[0], np.cumsum(counts)])
    indices = number[upper.indices[keep]]
    size = int(free.sum())
    return sp.csc_array((upper.data[keep], indices, pointers), shape=(size, size))
