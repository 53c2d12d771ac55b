"""Places at which fields are sampled for files, pictures and peaks.

Between the samples everything is taken as linear. Each sample belongs to one triangle
of the mesh, or to the triangles of one part of the plate around a vertex, so that a
field may jump from triangle to triangle and from part to part.
"""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from kplate.arrays import Floats, Ints


@dataclass(frozen=True, eq=False, kw_only=True)
class Samples:
    """Fields at sampled places, and the small triangles between these.

    Parameters
    ----------
    points : ndarray, shape (n, 2)
        Places in m.
    triangles : ndarray, shape (m, 3)
        Numbers of the points of each small triangle, counter-clockwise.
    owners : ndarray, shape (m,)
        Triangle of the mesh that each small triangle is a part of.
    rim : ndarray, shape (k, 2)
        Numbers of the points of each piece of the boundary.
    rim_owners : ndarray, shape (k,)
        Boundary edge of the mesh that each such piece is a part of.
    holders : ndarray, shape (n,)
        A triangle of the mesh that holds each point.
    sections : ndarray, shape (n,)
        Section of the plate at each point.
    bent : ndarray, shape (n, 3, c)
        w in m, dw/dx, dw/dy of each case.
    moments : ndarray, shape (n, 3, c)
        m_xx, m_yy, m_xy in N.
    shears : ndarray, shape (n, 2, c)
        q_x, q_y in N/m.
    """

    points: Floats
    triangles: Ints
    owners: Ints
    rim: Ints
    rim_owners: Ints
    holders: Ints
    sections: Ints
    bent: Floats
    moments: Floats
    shears: Floats


@dataclass(frozen=True, eq=False, kw_only=True)
class Lattice:
    """Points spread evenly over a triangle, its edges into `steps` parts each.

    Parameters
    ----------
    steps : int
        Parts of an edge.
    barycentrics : ndarray, shape (n, 3)
        The points.
    triangles : ndarray, shape (steps ** 2, 3)
        The small triangles between them, counter-clockwise.
    edges : ndarray, shape (3, steps + 1)
        Points along each edge, as `elements.triangle.EDGES` runs.
    """

    steps: int
    barycentrics: Floats
    triangles: Ints
    edges: Ints

    @classmethod
    @lru_cache
    def of(cls, steps: int) -> "Lattice":
        """The lattice of so many steps."""
        places = [(i, j) for i in range(steps + 1) for j in range(steps + 1 - i)]
        number = {place: k for k, place in enumerate(places)}
        barycentrics = np.array([(steps - i - j, i, j) for i, j in places]) / steps
        small = []
        for i, j in places:
            if i + j < steps:
                small.append([number[i, j], number[i + 1, j], number[i, j + 1]])
            if i + j < steps - 1:
                small.append([number[i + 1, j], number[i + 1, j + 1], number[i, j + 1]])
        along = range(steps + 1)
        edges = [
            [number[steps - k, k] for k in along],
            [number[0, steps - k] for k in along],
            [number[k, 0] for k in along],
        ]
        return cls(
            steps=steps,
            barycentrics=barycentrics,
            triangles=np.array(small),
            edges=np.array(edges),
        )

    @property
    def halved(self) -> tuple[Ints, Ints, Ints]:
        """Middles of small edges among the points of twice the steps, and their ends.

        The ends are numbers among the points of the same finer lattice.
        """
        fine = Lattice.of(2 * self.steps)
        place = np.rint(fine.barycentrics * fine.steps).astype(np.int64)
        number = {tuple(row): k for k, row in enumerate(place.tolist())}
        middles, first, second = [], [], []
        for row in place.tolist():
            odd = [k for k in range(3) if row[k] % 2]
            if odd:  # two of the three are odd: half-way along a small edge
                a, b = list(row), list(row)
                a[odd[0]] += 1
                a[odd[1]] -= 1
                b[odd[0]] -= 1
                b[odd[1]] += 1
                middles.append(number[tuple(row)])
                first.append(number[tuple(a)])
                second.append(number[tuple(b)])
        return np.array(middles), np.array(first), np.array(second)
