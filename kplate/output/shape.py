"""A deflected surface in oblique projection, drawn from the far side to the near.

x and z are true, y is drawn back, to the right and up. The view runs along y, so that
what has the larger y is further back; a line on the surface is drawn right after the
triangle it lies on. Points (n_points, 3) carry the scaled deflection as their z.
"""

from typing import Any

import numpy as np

from kplate.arrays import Floats, Ints

BACK = np.array([0.32, 0.58])  # where one unit of y goes
RISE = 0.14  # largest deflection drawn, as a share of the plate's mean size
RIM = 0.004  # how far the rim is drawn in front of itself, lest tiny triangles cover it
GRID = 14  # grid lines over the mean size, at most
ROUND = (1.0, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0, 6.0, 8.0)
# Colours and widths of the grid and of the rim.
_LINES = np.array([[0.1, 0.1, 0.1, 0.28], [0.1, 0.1, 0.1, 1.0]])
_WIDTHS = np.array([0.5, 1.3])


def project(points: Floats) -> Floats:
    """Oblique projection of points (..., 3), (..., 2)."""
    x, y, z = np.moveaxis(points, -1, 0)
    return np.stack([x + BACK[0] * y, z + BACK[1] * y], axis=-1)


def mean_size(points: Floats) -> float:
    """Size of a plate by its box: the side of a square of the same area."""
    return float(np.sqrt(np.prod(np.ptp(points[:, :2], axis=0))))


def scale_factor(largest: float, size: float) -> float:
    """Round factor at which a deflection can be seen on a plate of some size."""
    if largest == 0.0:
        return 1.0
    wanted = RISE * size / largest
    decade = 10.0 ** np.floor(np.log10(wanted))
    return float(decade * max(r for r in ROUND if r == 1.0 or r * decade <= wanted))


def surface(bent: Floats, triangles: Ints, *, rim: Ints, faces: Floats) -> Any:
    """Coloured triangles with grid lines and the rim, those behind hidden.

    Parameters
    ----------
    bent : ndarray, shape (n_points, 3)
        Where points are drawn.
    triangles : ndarray, shape (n_triangles, 3)
        Points of each triangle.
    rim : ndarray, shape (n_boundary, 2)
        Points of each edge of the boundary.
    faces : ndarray, shape (n_triangles, 4)
        Colours, red, green, blue and opacity.

    Returns
    -------
    PolyCollection
        In projected coordinates.
    """
    from matplotlib.collections import PolyCollection

    depth = bent[triangles, 1].mean(axis=1)
    nearest = np.full(len(bent), np.inf)
    np.minimum.at(nearest, triangles.ravel(), np.repeat(depth, 3))
    grid, grid_depth = _grid(bent, triangles, depth)
    rim_depth = nearest[rim].min(axis=1) - RIM * mean_size(bent)
    lines = np.concatenate([grid, bent[rim]])[:, [0, 1, 1]]  # flat triangles
    kinds = np.repeat([0, 1], [len(grid), len(rim)])
    order = np.argsort(-np.concatenate([depth, grid_depth, rim_depth]), kind="stable")
    shapes = np.concatenate([bent[triangles], lines])
    polygons: Any = project(shapes)[order]
    return PolyCollection(
        polygons,
        facecolors=np.concatenate([faces, np.zeros((len(lines), 4))])[order],
        # An edge of its own colour closes the seam between neighbours.
        edgecolors=np.concatenate([faces, _LINES[kinds]])[order],
        linewidths=np.concatenate([np.full(len(faces), 0.3), _WIDTHS[kinds]])[order],
    )


def _grid(bent: Floats, triangles: Ints, depth: Floats) -> tuple[Floats, Floats]:
    """Lines x = const and y = const on the surface, and how far back they lie."""
    from matplotlib.ticker import MaxNLocator

    cuts, depths = [np.empty((0, 2, 3))], [np.empty(0)]
    ticks = MaxNLocator(nbins=GRID).tick_values(0.0, mean_size(bent))
    step = float(ticks[1] - ticks[0])
    for axis in (0, 1):
        values = bent[:, axis]
        first, last = np.ceil(values.min() / step), np.floor(values.max() / step)
        for level in step * np.arange(first, last + 1.0):
            cut, which = _cut(bent, triangles, values - level)
            cuts.append(cut)
            depths.append(depth[which])
    return np.concatenate(cuts), np.concatenate(depths)


def _cut(points: Floats, triangles: Ints, values: Floats) -> tuple[Floats, Ints]:
    """Where vertex values change sign: segments (k, 2, 3), and their triangles."""
    own = values[triangles]
    above = own > 0.0
    which = np.flatnonzero(above.any(axis=1) & ~above.all(axis=1))
    own, above = own[which], above[which]
    # The vertex that is alone on its side, then the other two.
    lone = np.where(above.sum(axis=1) == 1, above.argmax(axis=1), above.argmin(axis=1))
    order = (lone[:, None] + np.arange(3)) % 3
    own = np.take_along_axis(own, order, axis=1)
    corners = points[np.take_along_axis(triangles[which], order, axis=1)]
    share = own[:, :1] / (own[:, :1] - own[:, 1:])
    segments = corners[:, :1] + share[..., None] * (corners[:, 1:] - corners[:, :1])
    return segments, which
