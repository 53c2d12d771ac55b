"""Lattices of samples: their points, their small triangles, their edges and middles."""

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given
from strategies import points_in

from kplate.elements.triangle import EDGES
from kplate.samples import Lattice

STEPS = range(1, 9)
each = pytest.mark.parametrize("steps", STEPS)


def small_edges(lattice):
    """Edges of the small triangles, each once, as pairs of rising numbers."""
    around = lattice.triangles[:, [[0, 1], [1, 2], [2, 0]]].reshape(-1, 2)
    return {tuple(sorted(pair)) for pair in around.tolist()}


@each
def test_points_are_all_barycentrics_in_whole_steps(steps):
    lattice = Lattice.of(steps)
    whole = lattice.barycentrics * steps
    np.testing.assert_allclose(whole, np.rint(whole), atol=1e-12)
    found = {tuple(row) for row in np.rint(whole).astype(int).tolist()}
    n = steps + 1
    wanted = {(i, j, steps - i - j) for i in range(n) for j in range(n - i)}
    assert found == wanted
    assert len(lattice.barycentrics) == len(wanted)


@each
def test_small_triangles_are_counter_clockwise_and_of_one_size(steps):
    """Their barycentrics are a determinant of 1, shared by the square of the steps."""
    lattice = Lattice.of(steps)
    shares = np.linalg.det(lattice.barycentrics[lattice.triangles])
    np.testing.assert_allclose(shares, np.full(steps**2, 1.0 / steps**2), rtol=1e-12)


@given(points_in(count=20))
def test_every_point_lies_in_one_small_triangle(points):
    """In none twice and in none not: they cover the triangle exactly."""
    for steps in STEPS:
        lattice = Lattice.of(steps)
        corners = lattice.barycentrics[lattice.triangles]
        local = np.einsum("qv,kvc->kqc", points, np.linalg.inv(corners))
        inside = local.min(axis=-1)
        assert ((inside >= -1e-12).sum(axis=0) >= 1).all()
        assert ((inside > 1e-12).sum(axis=0) <= 1).all()


@each
def test_edges_run_as_those_of_the_triangle(steps):
    lattice, share = Lattice.of(steps), np.arange(steps + 1) / steps
    for numbers, (i, j) in zip(lattice.edges, EDGES, strict=True):
        run = np.outer(1.0 - share, np.eye(3)[i]) + np.outer(share, np.eye(3)[j])
        np.testing.assert_allclose(lattice.barycentrics[numbers], run, atol=1e-15)


@each
def test_edges_are_edges_of_small_triangles(steps):
    """What runs along the boundary of a plate belongs to the triangles beside it."""
    lattice = Lattice.of(steps)
    for line in lattice.edges.tolist():
        pairs = {tuple(sorted(pair)) for pair in pairwise(line)}
        assert pairs <= small_edges(lattice)


@each
def test_halved_gives_the_middle_and_the_ends_of_every_small_edge(steps):
    lattice, fine = Lattice.of(steps), Lattice.of(2 * steps)
    middles, first, second = lattice.halved
    at = fine.barycentrics
    np.testing.assert_allclose(at[middles], 0.5 * (at[first] + at[second]), atol=1e-15)
    number = {tuple(p): k for k, p in enumerate(lattice.barycentrics.tolist())}
    pairs = [
        tuple(sorted((number[tuple(a)], number[tuple(b)])))
        for a, b in zip(at[first].tolist(), at[second].tolist(), strict=True)
    ]
    assert len(pairs) == len(set(pairs))
    assert set(pairs) == small_edges(lattice)


@each
def test_middles_and_coarse_points_make_up_the_finer_lattice(steps):
    middles, first, second = Lattice.of(steps).halved
    ends = np.union1d(first, second)
    everything = np.sort(np.concatenate([middles, ends]))
    np.testing.assert_array_equal(everything, np.arange((steps + 1) * (2 * steps + 1)))
