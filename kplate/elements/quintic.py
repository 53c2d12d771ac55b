"""The C1 quintic triangle of Argyris: 21 unknowns, one polynomial of degree five.

Unknowns, vertex by vertex: ``w, w,x, w,y, w,xx, w,xy, w,yy``; then on each edge the
slope at its middle along the edge's own normal (`triangle.edge_normals`). The 21
Bernstein ordinates follow in closed form: the six nearest to a vertex from its
unknowns, the one that faces the middle of an edge from the slope there. Exact for
quintics on any mesh. Second derivatives are continuous at the vertices, which is right
only where the rigidity is.

Source: J. H. Argyris, I. Fried, D. W. Scharpf, "The TUBA family of plate elements for
the matrix displacement method", Aeronautical Journal 72 (1968) 701-709 (from memory).
"""

import math

import numpy as np

from kplate.arrays import Floats
from kplate.elements import bernstein
from kplate.elements.piecewise import Piecewise
from kplate.elements.triangle import EDGES, barycentric_gradients, edge_normals

DEGREE = 5


def ordinates(vertices: Floats) -> Floats:
    """Turn the unknowns into the ordinates, (n, 1, 21, 21)."""
    C = np.zeros((len(vertices), 21, 21))
    for v in range(3):
        _near_vertex(C, vertices, v)
    gradients, normals = barycentric_gradients(vertices), edge_normals(vertices)
    across = np.einsum("nvc,nkc->nkv", gradients, normals)  # normals in barycentrics
    for k in range(3):
        _facing_edge(C, across[:, k], k)
    return C[:, None]


QUINTIC = Piecewise(
    degree=DEGREE, pieces=np.eye(3)[None], ordinates=ordinates, follows=True
)


def _near_vertex(C: Floats, vertices: Floats, v: int) -> None:
    """Fill the ordinates up to two steps from a vertex.

    i steps along arm a and j along arm b from the vertex stand for
    ``w + (i D_a + j D_b) w / 5 + (C(i,2) D_aa + i j D_ab + C(j,2) D_bb) w / 20``.
    """
    ahead, behind = (v + 1) % 3, (v + 2) % 3
    a, b = vertices[:, ahead] - vertices[:, v], vertices[:, behind] - vertices[:, v]
    for i in range(3):
        for j in range(3 - i):
            row = np.zeros((len(vertices), 6))
            row[:, 0] = 1.0
            row[:, 1:3] = (i * a + j * b) / 5.0
            row[:, 3:] = (
                math.comb(i, 2) * _twice(a, a)
                + i * j * _twice(a, b)
                + math.comb(j, 2) * _twice(b, b)
            ) / 20.0
            C[:, _ordinate({v: 5 - i - j, ahead: i, behind: j}), 6 * v : 6 * v + 6] = (
                row
            )


def _twice(a: Floats, b: Floats) -> Floats:
    """Second derivative along a, then b, of ``w,xx, w,xy, w,yy``, (n, 3)."""
    return np.column_stack(
        [a[:, 0] * b[:, 0], a[:, 0] * b[:, 1] + a[:, 1] * b[:, 0], a[:, 1] * b[:, 1]]
    )


def _facing_edge(C: Floats, across: Floats, k: int) -> None:
    """Fill the ordinate that faces an edge, from the slope in the edge's middle.

    Along the edge the slope across it is a quartic with the ordinates ``5 G_j``, whose
    value in the middle is ``(G_0 + 4 G_1 + 6 G_2 + 4 G_3 + G_4) 5 / 16``; the ordinate
    wanted is in G_2 only.
    """
    i, j = EDGES[k]
    rest = np.zeros((len(C), 21))
    for step in range(5):
        known = [(i, {i: 5 - step, j: step}), (j, {i: 4 - step, j: step + 1})]
        if step != 2:
            known.append((k, {i: 4 - step, j: step, k: 1}))
        for v, index in known:
            scale = math.comb(4, step) * across[:, v]
            rest -= scale[:, None] * C[:, _ordinate(index)]
    rest[:, 18 + k] += 16.0 / 5.0
    own = _ordinate({i: 2, j: 2, k: 1})
    C[:, own] = rest / (math.comb(4, 2) * across[:, k])[:, None]


def _ordinate(index: dict[int, int]) -> int:
    """Number of the ordinate with these powers of the vertices' barycentrics."""
    powers = (index.get(0, 0), index.get(1, 0), index.get(2, 0))
    return bernstein.position(DEGREE)[powers]
