"""The dual on six triangles about a vertex: the patch test, and balance everywhere."""

import math

import numpy as np
import pytest
from duals import (
    IN_A_TRIANGLE,
    assert_equal,
    every_dual,
    interpolate,
    load,
    moments_of,
    pressure_of,
    slots,
    tractions,
)
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp
from strategies import numbers, polynomials, rigidities, similarities, size_of

from kplate.elements import bernstein
from kplate.elements.triangle import EDGES, Geometry, area


@st.composite
def fans(draw):
    """Seven points (7, 2) and the numbers (6, 3) of six triangles about point 0."""
    late = draw(hnp.arrays(float, 6, elements=st.floats(0.0, 0.5)))
    angles = (np.arange(6) + late) * (np.pi / 3.0)
    radii = draw(hnp.arrays(float, 6, elements=st.floats(0.6, 1.4)))
    rim = radii[:, None] * np.column_stack([np.cos(angles), np.sin(angles)])
    turn, size, shift = draw(similarities())
    points = size * np.vstack([np.zeros(2), rim]) @ turn.T + shift
    around = [[0, 1 + k, 1 + (k + 1) % 6] for k in range(6)]
    starts = draw(hnp.arrays(int, 6, elements=st.integers(0, 2)))
    return points, np.array(
        [np.roll(a, k) for a, k in zip(around, starts, strict=True)]
    )


class Patch:
    """A few triangles with unknowns in common, solved with dense matrices."""

    def __init__(self, dual, points, corners, D):
        self.dual, self.X = dual, points[corners]
        ends = np.sort(corners[:, EDGES], axis=2).reshape(-1, 2)
        self.edges, number, count = np.unique(
            ends, axis=0, return_inverse=True, return_counts=True
        )
        self.rim = np.flatnonzero(count == 1)
        own = self.on_edges(number.reshape(-1, 3)).reshape(len(corners), -1)
        self.table = np.hstack([corners, own])
        self.count = self.table.max() + 1
        self.scale = np.ones(self.count)
        slopes = [slots(dual, k)[1] for k in range(3)]
        self.scale[self.table[:, slopes]] = 1.0 / size_of(self.X[0])
        self.parts = dual.condense(self.X, D)

    def on_edges(self, edges):
        """Unknowns on edges (...), (..., 2 k + 1): deflections, then slopes."""
        return 7 + self.dual.per_edge * edges[..., None] + np.arange(self.dual.per_edge)

    def held_rim(self, clamped):
        """Which unknowns are held on the rim: deflections, or slopes too."""
        held = np.zeros(self.count, dtype=bool)
        held[1:7] = True
        last = None if clamped else self.dual.edge_deflections
        held[self.on_edges(self.rim)[:, :last]] = True
        return held

    def solve(self, forces, held, values):
        """Moments (n, o, 3, 1) with some unknowns held at values."""
        K, F = np.zeros((self.count, self.count)), np.zeros(self.count)
        left = self.parts.forces(forces)[..., 0]
        for own, K_own, F_own in zip(
            self.table, self.parts.stiffness, left, strict=True
        ):
            K[np.ix_(own, own)] += K_own
            F[own] += F_own
        K *= np.outer(self.scale, self.scale)
        u, free = values / self.scale, ~held
        right = (F * self.scale)[free] - K[np.ix_(free, held)] @ u[held]
        u[free] = np.linalg.solve(K[np.ix_(free, free)], right)
        whole = self.parts.whole((u * self.scale)[self.table][..., None], forces)
        return self.parts.moments(whole)


@every_dual
@given(fans(), st.data())
def test_patch_test(dual, fan, data):
    """A polynomial of degree k + 2 given on the rim is exact in moments inside."""
    (D,) = data.draw(rigidities(count=1))
    patch = Patch(dual, *fan, np.broadcast_to(D, (6, 3, 3)))
    w = data.draw(polynomials(dual.degree)).about(fan[0])
    values = np.zeros(patch.count)
    for own, table in zip(patch.X, patch.table, strict=True):
        values[table] = interpolate(dual, own, w)[: dual.left]
    held = patch.held_rim(clamped=True)
    forces = load(dual, patch.X, pressure_of(D, w))[..., None]
    ordinates = patch.solve(forces, held, np.where(held, values, 0.0))
    found = dual.moments(ordinates, IN_A_TRIANGLE)[..., 0]
    size = np.abs(D).max() / w.length**2
    exact = moments_of(D, w, IN_A_TRIANGLE @ patch.X)
    assert_equal(found / size, exact / size, 1e-8)


@every_dual
@pytest.mark.parametrize("rim", ["clamped", "simply supported", "on three points"])
@given(fans(), st.data())
def test_moments_balance_everywhere(dual, rim, fan, data):
    """Pressures of degree k - 2, another on each triangle, and a force at the middle.

    Rigidities jump too. Edges that nothing holds are free of m_nn and v_n.
    """
    D = data.draw(rigidities(count=6))
    patch = Patch(dual, *fan, D / np.abs(D).max(axis=(1, 2), keepdims=True))
    p = data.draw(numbers(6, math.comb(dual.order, 2)))
    force = data.draw(st.floats(0.5, 1.0))
    areas = area(patch.X)[:, None]
    geometry = Geometry(vertices=patch.X, rule=dual.load_rule)
    at_points = p @ bernstein.values(dual.order - 2, dual.load_rule.points).T
    forces = dual.load(geometry, at_points / areas)[..., None]
    forces[0, np.flatnonzero(patch.table[0] == 0)] += force
    held = patch.held_rim(clamped=rim == "clamped")
    if rim == "on three points":
        held = np.isin(np.arange(patch.count), [1, 3, 5])
    ordinates = patch.solve(forces, held, np.zeros(patch.count))
    M, size = np.abs(ordinates).max(), np.sqrt(areas.max())
    carried = dual.carried(patch.X, ordinates, IN_A_TRIANGLE)[..., 0]
    exact = p @ bernstein.values(dual.order - 2, IN_A_TRIANGLE).T
    assert_equal(carried * areas / M, exact / M, 1e-8)
    found = tractions(dual, *fan, ordinates)
    everywhere = np.ones(len(found.edges), dtype=bool)
    loose = everywhere if rim == "on three points" else found.inner
    turning = found.inner if rim == "clamped" else everywhere
    assert_equal(found.bends[turning] / M, 0.0, 1e-9)
    assert_equal(found.pushes[loose] * size / M, 0.0, 1e-8)
    free = ~held[:7]
    expected = np.where(np.arange(7) == 0, force, 0.0)
    assert_equal(found.corners[free, 0] / M, expected[free] / M, 1e-9)
