"""Chains, dashes, arrows; few triangles for many; the edges of a mesh."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from plates import grid

from kplate.elements.triangle import area
from kplate.output.strokes import (
    FIXED,
    arrows,
    chains,
    dashed,
    dashes,
    hatches,
    runs,
    spread,
)
from kplate.output.thinning import mesh_edges, thinned
from kplate.samples import Lattice

SQUARE = np.array([(0.0, 0.0), (1.0, 0.0), (1.0, 1.0), (0.0, 1.0)])


def ring(count):
    angle = 2.0 * np.pi * np.arange(count) / count
    return np.column_stack([np.cos(angle), np.sin(angle)])


@given(st.permutations(range(12)))
def test_pieces_in_any_order_make_one_closed_chain(order):
    points = ring(12)
    lines = np.array([(k, (k + 1) % 12) for k in order])
    (chain,) = chains(points, lines)
    assert len(chain) == 13
    np.testing.assert_array_equal(chain[0], chain[-1])
    start = int(np.hypot(*(points - chain[0]).T).argmin())
    np.testing.assert_array_equal(chain[:-1], np.roll(points, -start, axis=0))


def test_pieces_whose_ends_lie_on_each_other_are_joined():
    """Every triangle has points of its own."""
    points = np.array([(0.0, 0.0), (1.0, 0.0), (1.0, 0.0), (2.0, 0.0), (5, 0), (6, 0)])
    first, second = chains(points, np.array([(2, 3), (0, 1), (4, 5)]))
    np.testing.assert_array_equal(first[:, 0], [0.0, 1.0, 2.0])
    np.testing.assert_array_equal(second[:, 0], [5.0, 6.0])


@given(st.permutations(range(6)), st.lists(st.booleans(), min_size=6, max_size=6))
def test_contour_pieces_run_on_whichever_way_they_point(order, turned):
    rows = np.column_stack([np.arange(7.0), np.zeros(7), np.arange(7.0) ** 2])
    pairs = np.array([(k, k + 1) for k in order])
    pairs[turned] = pairs[turned, ::-1]
    (run,) = runs(rows, pairs)
    run = run if run[0, 0] == 0.0 else run[::-1]
    np.testing.assert_array_equal(run, rows)


def test_dashes_cover_half_of_a_line_and_carry_its_values():
    x = np.linspace(0.0, 3.0, 40)
    rows = np.column_stack([x, np.zeros(40), 5.0 * x])
    pairs = np.column_stack([np.arange(39), np.arange(1, 40)])
    found = dashed(rows, pairs, 0.1)
    lengths = np.diff(found[..., 0], axis=1)
    assert np.abs(lengths).sum() == pytest.approx(1.5, rel=0.01)
    np.testing.assert_allclose(found[..., 2], 5.0 * found[..., 0])


def test_supports_are_drawn_outside():
    """The plate lies to the left of its sides."""
    chain = np.vstack([SQUARE, SQUARE[:1]])
    for sign in (hatches(chain, 0.05, 0.03), dashes(chain, 0.05, 0.6, 0.02)):
        middle = sign.ends.mean(axis=1)[:, :2]
        assert (np.abs(middle - 0.5).max(axis=1) > 0.5).all()
        assert (sign.anchors == FIXED).all()
    places, away = spread(chain, 0.1)
    assert len(places) == 40
    np.testing.assert_allclose(np.hypot(*away.T), 1.0)


@pytest.mark.parametrize("length", [0.3, -0.3])
def test_an_arrow_ends_at_its_tip(length):
    tip = np.array([[1.0, 2.0, 0.0]])
    sign = arrows(tip, np.array([length]))
    shaft = sign.ends[0]
    np.testing.assert_allclose(shaft, [[1.0, 2.0, -length], [1.0, 2.0, 0.0]])
    heads = sign.ends[1:]
    np.testing.assert_allclose(heads[:, 1], np.tile(tip, (4, 1)))
    assert (np.sign(heads[:, 0, 2]) == -np.sign(length)).all()


@pytest.mark.parametrize("most", [50, 400])
def test_few_triangles_stand_for_many(most):
    mesh = grid(40)
    kept, few = thinned(mesh.points, mesh.triangles, most)
    assert 0.5 * most < len(few) < 2.0 * most
    assert len(set(kept.tolist())) == len(kept)
    sizes = area(mesh.points[kept][few])
    assert sizes.min() > -1e-12
    assert sizes.sum() == pytest.approx(mesh.areas.sum(), rel=0.35)


def test_edges_are_those_of_the_mesh_not_of_the_samples():
    mesh = grid(3, m=2)
    lattice = Lattice.of(4)
    points = (lattice.barycentrics @ mesh.points[mesh.triangles]).reshape(-1, 2)
    size, n = len(lattice.barycentrics), len(mesh.triangles)
    small = (size * np.arange(n)[:, None, None] + lattice.triangles).reshape(-1, 3)
    owners = np.repeat(np.arange(n), len(lattice.triangles))
    edges = mesh_edges(points, small, owners)
    assert len(edges) == n * 3 * 4
    length = np.hypot(*np.diff(points[edges], axis=1)[:, 0].T).sum()
    corners = mesh.points[mesh.triangles]
    sides = np.hypot(*np.moveaxis(corners - np.roll(corners, 1, axis=1), -1, 0))
    assert length == pytest.approx(sides.sum())
