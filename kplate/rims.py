"""Where to look for a peak: outside excluded discs, on their rims, on a summit."""

from collections.abc import Sequence

import numpy as np

from kplate.arrays import Bools, Floats
from kplate.mesh import STRAIGHT_EDGE, Mesh
from kplate.singular import Excluded

RIM_SAMPLES = 64  # points on the rim of an excluded disc


def outside(points: Floats, discs: Sequence[Excluded], share: float) -> Bools:
    """Tell which points (k, 2) lie outside all discs, shrunk by a share, (k,)."""
    out = np.ones(len(points), dtype=bool)
    for disc in discs:
        out &= np.hypot(*(points - disc.place).T) >= share * disc.radius
    return out


def rim(mesh: Mesh, disc: Excluded) -> Floats:
    """Points of a disc's rim on the plate, its ends on boundary edges included."""
    angle = np.linspace(0.0, 2.0 * np.pi, RIM_SAMPLES, endpoint=False)
    around = disc.place + disc.radius * np.column_stack([np.cos(angle), np.sin(angle)])
    start, end = np.moveaxis(mesh.points[mesh.boundary_edges], 1, 0)
    arm, step = start - disc.place, end - start
    a = np.einsum("kc,kc->k", step, step)
    b = np.einsum("kc,kc->k", arm, step)
    c = np.einsum("kc,kc->k", arm, arm) - disc.radius**2
    root = np.sqrt(np.maximum(b * b - a * c, 0.0))
    ends = []
    for t in ((-b - root) / a, (-b + root) / a):
        hit = (b * b > a * c) & (t >= 0.0) & (t <= 1.0)
        ends.append(start[hit] + t[hit, None] * step[hit])
    ends.append(_meetings(mesh, disc))
    points = np.concatenate([around, *ends])
    return points[mesh.covers(points)]


def _meetings(mesh: Mesh, disc: Excluded) -> Floats:
    """Where a disc's rim meets the circles of round boundary edges, (k, 2)."""
    curved = np.unique(mesh.boundary_circles[mesh.boundary_circles != STRAIGHT_EDGE])
    found = []
    for x, y, radius in mesh.circles[curved]:
        arm = np.array([x, y]) - disc.place
        gap = float(np.hypot(*arm))
        if abs(radius - disc.radius) < gap < radius + disc.radius:
            along = (gap**2 + disc.radius**2 - radius**2) / (2.0 * gap)
            off = np.sqrt(max(disc.radius**2 - along**2, 0.0))
            unit = arm / gap
            normal = np.array([-unit[1], unit[0]])
            for sign in (1.0, -1.0):
                found.append(disc.place + along * unit + sign * off * normal)
    return np.reshape(found, (-1, 2))


def stationary(places: Floats, values: Floats) -> Floats | None:
    """Top of the parabola through some values, if it lies among their places."""
    centre, size = places.mean(axis=0), float(np.ptp(places, axis=0).max())
    x, y = ((places - centre) / size).T
    terms = np.column_stack([np.ones_like(x), x, y, x * x, x * y, y * y])
    _, gx, gy, xx, xy, yy = np.linalg.lstsq(terms, values, rcond=None)[0]
    curvature = np.array([[2 * xx, xy], [xy, 2 * yy]])
    if np.linalg.det(curvature) <= 1e-6 * np.abs(curvature).max() ** 2:
        return None
    step = np.linalg.solve(curvature, [-gx, -gy])
    return centre + size * step if np.abs(step).max() < 0.5 else None
