"""Triangles parted where a pressure that is stated as a function is not smooth."""

import numpy as np
import pytest
from plates import grid

from kplate.quadrature import triangle_rule
from kplate.sampling import DEEPEST, MOST, sampled

RULE = triangle_rule(4)


def corners(n=4):
    mesh = grid(n)
    return mesh.points[mesh.triangles]


def areas(pieces):
    a, b = np.moveaxis(pieces[:, 1:] - pieces[:, :1], 1, 0)
    return 0.5 * (a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0])


@pytest.mark.parametrize(
    "smooth",
    [
        lambda x, y: 3.0 - 2.0 * x + y,
        lambda x, y: 1.0 + x**3 * y**2,
        lambda x, y: np.sin(2.0 * x - y),
    ],
)
def test_smooth_pressures_part_nothing(smooth):
    found = sampled(lambda p: smooth(p[..., 0], p[..., 1]), corners())
    assert len(found.pieces) == len(found.owners) == len(found.rough) == 0


def test_pieces_make_up_their_triangles_and_halve_what_a_jump_leaves_open():
    def jump(points):
        return np.where(points[..., 0] + 0.4 * points[..., 1] < 0.53, 1.0, 0.0)

    triangles = corners()
    found = sampled(jump, triangles)
    own = areas(found.pieces)
    assert (own > 0.0).all()
    parted = np.unique(found.owners)
    summed = np.bincount(found.owners, own, minlength=len(triangles))
    np.testing.assert_allclose(summed[parted], areas(triangles)[parted])
    # The line crosses the rough pieces, all of the last size, and no others.
    side = found.pieces @ (1.0, 0.4) - 0.53
    crossed = (side.min(axis=1) < 0.0) & (side.max(axis=1) > 0.0)
    np.testing.assert_allclose(own[found.rough], 0.5 / 4**2 / 4**DEEPEST)
    assert crossed[found.rough].all()
    assert (crossed & ~found.rough).sum() < 0.1 * found.rough.sum()
    line = np.hypot(1.0, 0.4)
    assert own[found.rough].sum() < 3.0 * line * 0.25 / 2**DEEPEST


def test_a_jump_that_hugs_the_edges_is_seen_by_their_own_points():
    """No point inside sees a strip of 1e-5 beside the edges at x = 0.5."""

    def jump(points):
        return np.where(points[..., 0] > 0.5 + 1e-5, 1.0, 0.0)

    found = sampled(jump, corners())
    assert len(found.pieces)
    # Pieces with an edge there; those that only touch the line hold next to nothing.
    near = (np.abs(found.pieces[..., 0] - 0.5) < 1e-12).sum(axis=1) > 1
    right = found.pieces[..., 0].max(axis=1) > 0.5 + 1e-9
    assert found.rough[near & right].all()


def test_a_pressure_that_is_rough_all_over_is_not_parted_without_end():
    random = np.random.default_rng(0)
    found = sampled(lambda p: random.uniform(size=p.shape[:-1]), corners(40))
    assert 0 < len(found.pieces) <= MOST
    assert found.rough.mean() > 0.9
