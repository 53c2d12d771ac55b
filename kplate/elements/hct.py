"""The Hsieh-Clough-Tocher triangle (HCT): C1, cubic in three pieces.

Unknowns, vertex by vertex: ``w``, ``dw/dx``, ``dw/dy``; then on each edge the slope at
its middle along the edge's own normal (`triangle.edge_normals`): twelve. The triangle
is parted at its centroid S into three pieces; piece k has the vertices (k+1, k+2, S).
On each piece w is a cubic, given by ten Bernstein ordinates; w and its slopes are
continuous across pieces and triangles.

The ordinates next to a vertex follow from w and its slopes, the one in the middle of a
piece from the slope across its outer edge, and the others from the conditions for a
continuous slope inside: each is the mean of the three around it. Exact for cubics on
any mesh.

In the *reduced* triangle of nine unknowns the slope across an outer edge is linear
along it; it is exact for quadratics.

Source: R. W. Clough and J. L. Tocher, "Finite element stiffness matrices for analysis
of plate bending", Proc. Conf. on Matrix Methods in Structural Mechanics,
Wright-Patterson AFB, 1965; P. G. Ciarlet, "The Finite Element Method for Elliptic
Problems", North-Holland, 1978, ch. 6 (both from memory).
"""

from functools import lru_cache

import numpy as np

from kplate.arrays import Bools, Floats
from kplate.elements import bernstein
from kplate.elements.piecewise import Piecewise
from kplate.elements.triangle import (
    EDGES,
    Geometry,
    area,
    barycentric_gradients,
    edge_normals,
)
from kplate.quadrature import Rule

DEGREE = 3
_CENTROID = np.full(3, 1 / 3)
PIECES = np.array([[np.eye(3)[i], np.eye(3)[j], _CENTROID] for i, j in EDGES])


def ordinates(vertices: Floats) -> Floats:
    """Turn the unknowns into the ordinates of the three pieces, (n, 3, 10, 12)."""
    n = len(vertices)
    centroid, normals = vertices.mean(axis=1), edge_normals(vertices)
    value = np.zeros((3, n, 12))
    inward = np.zeros((3, n, 12))  # beside each vertex, towards the centroid
    for v in range(3):
        value[v, :, 3 * v] = 1.0
        inward[v] = _beside(value[v], v, centroid - vertices[:, v])
    outer, middle = [], []
    for k, (i, j) in enumerate(EDGES):
        edge = vertices[:, j] - vertices[:, i]
        outer.append((_beside(value[i], i, edge), _beside(value[j], j, -edge)))
        corners = np.stack([vertices[:, i], vertices[:, j], centroid], axis=1)
        slope = np.zeros((n, 12))
        slope[:, 9 + k] = 1.0
        net = (value[i], *outer[k], value[j]), (inward[i], inward[j])
        middle.append(_middle(corners, normals[:, k], slope, *net))
    around = [
        (inward[v] + middle[(v + 1) % 3] + middle[(v + 2) % 3]) / 3 for v in range(3)
    ]
    centre = (around[0] + around[1] + around[2]) / 3
    C = np.empty((n, 3, 10, 12))
    place = bernstein.position(DEGREE)
    for k, (i, j) in enumerate(EDGES):
        C[:, k, place[3, 0, 0]], C[:, k, place[0, 3, 0]] = value[i], value[j]
        C[:, k, place[2, 1, 0]], C[:, k, place[1, 2, 0]] = outer[k]
        C[:, k, place[2, 0, 1]], C[:, k, place[0, 2, 1]] = inward[i], inward[j]
        C[:, k, place[1, 1, 1]] = middle[k]
        C[:, k, place[1, 0, 2]], C[:, k, place[0, 1, 2]] = around[i], around[j]
        C[:, k, place[0, 0, 3]] = centre
    return C


def reduced_ordinates(vertices: Floats) -> Floats:
    """Turn the nine unknowns of the reduced triangle into ordinates, (n, 3, 10, 9).

    The slope in the middle of an edge is the mean of those at its ends.
    """
    whole = np.zeros((len(vertices), 12, 9))
    whole[:, :9] = np.eye(9)
    normals = edge_normals(vertices)
    for k, ends in enumerate(EDGES):
        for v in ends:
            whole[:, 9 + k, 3 * v + 1 : 3 * v + 3] = 0.5 * normals[:, k]
    return ordinates(vertices) @ whole[:, None]


def reduced_load(geometry: Geometry, pressure: Floats) -> Floats:
    """Consistent loads of the reduced triangle, as `REDUCED.load` gives them.

    The forces on the ordinates are taken back to the unknowns one by one instead of by
    the matrices of `reduced_ordinates`: a sixth of the time.
    """
    vertices, rule = geometry.vertices, geometry.rule
    forces = pressure * area(vertices)[:, None] * rule.weights
    holder, shape = _shapes(rule)
    place = bernstein.position(DEGREE)
    net = [(forces[:, own] @ shape[own]).T for own in holder]  # (10, n) each
    centroid, normals = vertices.mean(axis=1), edge_normals(vertices)
    centre = sum(own[place[0, 0, 3]] for own in net) / 3.0
    around = [centre.copy() for _ in range(3)]
    for k, (i, j) in enumerate(EDGES):
        around[i] += net[k][place[1, 0, 2]]
        around[j] += net[k][place[0, 1, 2]]
    value = [around[v] / 3.0 for v in range(3)]  # of what is beside a vertex inwards
    slopes = [value[v][:, None] * (centroid - vertices[:, v]) / 3.0 for v in range(3)]
    for k, (i, j) in enumerate(EDGES):
        edge = vertices[:, j] - vertices[:, i]
        corners = np.stack([vertices[:, i], vertices[:, j], centroid], axis=1)
        d = np.einsum("nvc,nc->vn", barycentric_gradients(corners), normals[:, k])
        middle = net[k][place[1, 1, 1]] + (around[i] + around[j]) / 3.0
        middle = middle / d[2]
        half = -0.5 * middle
        # Through the ordinate amid the piece, on those beside it (see `_middle`).
        ends = {
            i: net[k][place[3, 0, 0]] + half * d[0],
            j: net[k][place[0, 3, 0]] + half * d[1],
        }
        outer = {
            i: net[k][place[2, 1, 0]] + half * d[1] - middle * d[0],
            j: net[k][place[1, 2, 0]] + half * d[0] - middle * d[1],
        }
        inward = {
            i: net[k][place[2, 0, 1]] + half * d[2],
            j: net[k][place[0, 2, 1]] + half * d[2],
        }
        across = (middle / 3.0)[:, None] * normals[:, k]  # 4/3 of half the two slopes
        for v, arm in ((i, edge), (j, -edge)):
            value[v] = value[v] + ends[v] + outer[v] + inward[v]
            slopes[v] = slopes[v] + across + outer[v][:, None] * (arm / 3.0)
            slopes[v] += inward[v][:, None] * ((centroid - vertices[:, v]) / 3.0)
    columns = [np.column_stack([value[v], slopes[v]]) for v in range(3)]
    return np.concatenate(columns, axis=1)


@lru_cache
def _shapes(rule: Rule) -> tuple[list[Bools], Floats]:
    """Points of a rule that each piece holds, and the polynomials of it there."""
    local = [rule.points @ np.linalg.inv(piece) for piece in PIECES]
    holder = np.argmax([own.min(axis=-1) for own in local], axis=0)
    shape = np.array([bernstein.values(DEGREE, own) for own in local])
    chosen = shape[holder, np.arange(len(holder))]
    return [holder == k for k in range(3)], chosen


HCT = Piecewise(degree=DEGREE, pieces=PIECES, ordinates=ordinates, follows=True)
REDUCED = Piecewise(degree=DEGREE, pieces=PIECES, ordinates=reduced_ordinates)


def _beside(value: Floats, v: int, arm: Floats) -> Floats:
    """Ordinate a third of the way along an arm (n, 2) from vertex v."""
    ordinate = value.copy()
    ordinate[:, 3 * v + 1 : 3 * v + 3] = arm / 3.0
    return ordinate


def _middle(
    corners: Floats,
    normal: Floats,
    slope: Floats,
    along: tuple[Floats, Floats, Floats, Floats],
    inward: tuple[Floats, Floats],
) -> Floats:
    """Ordinate (1, 1, 1) of a piece with a given slope amid its outer edge.

    Along the outer edge the slope across it is a quadratic with the ordinates
    ``3 (d0 b_j0 + d1 b_j1 + d2 b_j2)``, d the normal in barycentrics; in the middle it
    is ``(first + 2 middle + last) / 4`` of them.
    """
    d = np.einsum("nvc,nc->vn", barycentric_gradients(corners), normal)[..., None]
    first = d[0] * along[0] + d[1] * along[1] + d[2] * inward[0]
    last = d[0] * along[2] + d[1] * along[3] + d[2] * inward[1]
    wanted = (4.0 / 3.0 * slope - first - last) / 2.0
    return (wanted - d[0] * along[1] - d[1] * along[2]) / d[2]
