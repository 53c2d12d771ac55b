"""What tests of the dual share: polynomials as its unknowns, and edge tractions."""

from dataclasses import dataclass

import numpy as np
import pytest
from strategies import size_of

from kplate.arrays import Floats, Ints
from kplate.elements import bernstein
from kplate.elements.dual import DUALS
from kplate.elements.triangle import EDGES, Geometry, edge_normals, edge_senses
from kplate.quadrature import gauss, triangle_rule

every_dual = pytest.mark.parametrize("dual", DUALS.values(), ids=["2", "3"])
FINE = 12  # degree of the rules that stand for exact integrals
SHARE, WEIGHT = gauss(8)  # of an edge
IN_A_TRIANGLE = triangle_rule(6).points


def assert_equal(actual, expected, atol=1e-9):
    np.testing.assert_allclose(actual, expected, rtol=0.0, atol=atol)


def slots(dual, k):
    """Places of the deflections and of the slopes on edge k of a triangle."""
    first = 3 * dual.per_vertex + k * dual.per_edge
    middle = first + dual.edge_deflections
    return np.arange(first, middle), np.arange(middle, first + dual.per_edge)


def line(k, shares):
    """Barycentrics (..., 3) along edge k, from vertex k + 1 to k + 2."""
    i, j = EDGES[k]
    ends = np.eye(3)
    return (1.0 - shares)[..., None] * ends[i] + shares[..., None] * ends[j]


def scales(dual, X):
    """Size of each unknown: deflections count as they are, slopes in 1/size."""
    S = np.ones(dual.whole)
    for k in range(3):
        S[slots(dual, k)[1]] = 1.0 / size_of(X)
    return S


def interpolate(dual, X, w, slope=None):
    """Unknowns (whole,) of the w and, on the edges, the slope of polynomials.

    w is matched at the vertices and in its means with polynomials of degree k - 1 on
    each edge and k - 2 inside, which determines what moments of degree k see of it.
    """
    slope = w if slope is None else slope
    u = np.zeros(dual.whole)
    rule, k = triangle_rule(FINE), dual.order
    u[:3] = w.derivative(X, 0, 0)
    normals, senses = edge_normals(X[None])[0], edge_senses(X[None])[0]
    legendre = np.polynomial.legendre.legvander(2.0 * SHARE - 1.0, k)
    for e in range(3):
        own = SHARE if senses[e] > 0.0 else 1.0 - SHARE
        points = line(e, own) @ X
        deflections, slopes = slots(dual, e)
        across = [slope.derivative(points, *ij) for ij in ((1, 0), (0, 1))]
        means = (WEIGHT[:, None] * legendre).T @ (normals[e] @ across)
        u[slopes] = (2.0 * np.arange(k + 1) + 1.0) * means
        rows = dual.evaluate(X[None], line(e, own)[None])[0, :, 0]
        against = (WEIGHT[:, None] * legendre[:, :k]).T
        rest = w.derivative(points, 0, 0) - rows @ u
        u[deflections] = np.linalg.solve(against @ rows[:, deflections], against @ rest)
    rows = dual.evaluate(X[None], rule.points[None])[0, :, 0]
    against = rule.weights * bernstein.values(k - 2, rule.points).T
    rest = w.derivative(rule.points @ X, 0, 0) - rows @ u
    u[dual.left :] = np.linalg.solve(against @ rows[:, dual.left :], against @ rest)
    return u


def pressure_of(D, w):
    """The pressure that bends a plate of this rigidity into w, at points."""
    second = ((2, 0, 1.0), (0, 2, 1.0), (1, 1, 2.0))
    return lambda points: sum(
        D[a, b] * r * s * w.derivative(points, i + k, j + l)
        for a, (i, j, r) in enumerate(second)
        for b, (k, l, s) in enumerate(second)
    )


def load(dual, X, pressure):
    """Loads (n, whole) of a function of points on triangles (n, 3, 2)."""
    geometry = Geometry(vertices=X, rule=dual.load_rule)
    return dual.load(geometry, pressure(dual.load_rule.points @ X))


def moments_of(D, w, points):
    """Exact moments of a deflection at points, (q, 3)."""
    return w.curvature(points) @ D.T


@dataclass(frozen=True, kw_only=True)
class Tractions:
    """What moments do to edges and vertices, summed over the triangles there.

    Parameters
    ----------
    edges : ndarray, shape (n_edges, 2)
        Vertices of each edge, the smaller first, in order.
    count : ndarray, shape (n_edges,)
        Triangles at each.
    bends : ndarray, shape (n_edges, q, c)
        m_nn at the points SHARE, the triangle on the left of the edge's own sense less
        that on the right.
    pushes : ndarray, shape (n_edges, q, c)
        v_n, each for its own outward normal.
    corners : ndarray, shape (n_points, c)
        m_ns where it arrives less where it leaves.
    """

    edges: Ints
    count: Ints
    bends: Floats
    pushes: Floats
    corners: Floats

    @property
    def inner(self):
        """Which edges have two triangles."""
        return self.count == 2


def tractions(dual, points, triangles, moments):
    """Tractions of moments (n, o, 3, c) on triangles (n, 3) of points."""
    X = points[triangles]
    ends = np.sort(triangles[:, EDGES], axis=2).reshape(-1, 2)
    edges, number, count = np.unique(
        ends, axis=0, return_inverse=True, return_counts=True
    )
    number = number.reshape(-1, 3)
    q, c = len(SHARE), moments.shape[-1]
    bends, pushes = (np.zeros((len(edges), q, c)) for _ in range(2))
    corners = np.zeros((len(points), c))
    # m_ns is a polynomial of degree k along the edge; so its derivative is exact.
    powers = np.vander(SHARE, dual.order + 1, increasing=True)
    slopes = np.zeros_like(powers)
    slopes[:, 1:] = powers[:, :-1] * np.arange(1, dual.order + 1)
    derive = slopes @ np.linalg.pinv(powers)
    for k, (i, j) in enumerate(EDGES):
        sense = edge_senses(X)[:, k, None]
        n = sense * edge_normals(X)[:, k]  # outward
        t = np.column_stack([-n[:, 1], n[:, 0]])
        length = np.hypot(*(X[:, j] - X[:, i]).T)[:, None, None]
        rows_nn = np.column_stack([n[:, 0] ** 2, n[:, 1] ** 2, 2 * n[:, 0] * n[:, 1]])
        rows_ns = np.column_stack(
            [
                n[:, 0] * t[:, 0],
                n[:, 1] * t[:, 1],
                n[:, 0] * t[:, 1] + n[:, 1] * t[:, 0],
            ]
        )
        at = line(k, np.where(sense > 0.0, SHARE, 1.0 - SHARE))
        m = dual.moments(moments, at)
        shears = dual.shears(X, moments, at)
        twist = np.einsum("nm,nqmc->nqc", rows_ns, m)
        along = sense[..., None] * (derive @ twist) / length
        np.add.at(
            bends,
            number[:, k],
            sense[..., None] * np.einsum("nm,nqmc->nqc", rows_nn, m),
        )
        np.add.at(pushes, number[:, k], np.einsum("nx,nqxc->nqc", n, shears) - along)
        m = dual.moments(moments, line(k, np.array([0.0, 1.0])))
        m_ns = np.einsum("nm,nqmc->nqc", rows_ns, m)
        np.add.at(corners, triangles[:, j], m_ns[:, 1])
        np.add.at(corners, triangles[:, i], -m_ns[:, 0])
    return Tractions(
        edges=edges, count=count, bends=bends, pushes=pushes, corners=corners
    )
