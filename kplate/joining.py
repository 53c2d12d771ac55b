"""Zones, seams and marks, joined to the lines that they nearly touch.

Whoever states a point on a slanted side or on an arc rounds it: it is then off by the
last digit, and would leave a sliver for triangles a hundred times smaller than that.
Vertices are moved onto vertices and lines within the snap distance, pieces that run
along a line follow it, and pieces take up vertices that they pass. What is moved by
more than round-off is noted.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from kplate import curves
from kplate.arrays import Bools, Floats
from kplate.polygon import Polygon, at

# Closer than this share of the plate's size is meant to touch: a tenth of a millimetre
# on a metre.
SNAP_SHARE = 1e-4
# Moved by less than this share, nobody needs to know.
UNSEEN = 1e-6
# Within this share a point is on a line, but for round-off.
ON = 1e-12


@dataclass(frozen=True, eq=False, kw_only=True)
class Lines:
    """Pieces to which others are joined.

    Parameters
    ----------
    starts, ends : ndarray, shape (n, 2)
        Their ends in m.
    bulges : ndarray, shape (n,)
        Their bulges.
    names : tuple of str
        What each belongs to, in words.
    size : float
        Diagonal of the box around the plate in m.
    """

    starts: Floats
    ends: Floats
    bulges: Floats
    names: tuple[str, ...]
    size: float

    def and_also(
        self, starts: Floats, ends: Floats, bulges: Floats, name: str
    ) -> "Lines":
        """Return these and some more, all of one name."""
        return Lines(
            starts=np.concatenate([self.starts, starts]),
            ends=np.concatenate([self.ends, ends]),
            bulges=np.concatenate([self.bulges, bulges]),
            names=(*self.names, *(name for _ in bulges)),
            size=self.size,
        )

    def distances(self, points: Floats) -> Floats:
        """Distance in m from points (k, 2) to each piece, (k, n)."""
        return curves.distances(points, self.starts, self.ends, self.bulges)

    def share(self, piece: int, point: Floats) -> float:
        """Share of a piece's length at its point nearest to a given one."""
        a, b = self.starts[piece], self.ends[piece]
        return curves.nearest_share(point, a, b, float(self.bulges[piece]))

    def place(self, piece: int, share: float) -> Floats:
        """Point after a share of a piece's length, (2,)."""
        one = slice(piece, piece + 1)
        place: Floats = curves.points_at(
            self.starts[one], self.ends[one], self.bulges[one], np.array([share])
        )[0]
        return place


def lines(boundaries: Sequence[Polygon], size: float) -> Lines:
    """Pieces of the boundaries of a plate of this size in m."""
    return Lines(
        starts=np.concatenate([line.points for line in boundaries]),
        ends=np.concatenate([line.ends for line in boundaries]),
        bulges=np.concatenate([line.bulges for line in boundaries]),
        names=tuple(f"side {name!r}" for line in boundaries for name in line.sides),
        size=size,
    )


def moved(points: Floats, lines: Lines, what: str) -> tuple[Floats, list[str]]:
    """Points (n, 2) with those near a vertex or a line put on it, and notes."""
    snap, result, notes = SNAP_SHARE * lines.size, points.copy(), []
    vertices = np.concatenate([lines.starts, lines.ends])
    off = lines.distances(points)
    for i, point in enumerate(points):
        to_vertex = np.hypot(*(vertices - point).T)
        if to_vertex.min() <= snap:
            nearest = int(to_vertex.argmin())
            result[i], piece = vertices[nearest], nearest % len(lines.bulges)
        elif off[i].min() <= snap:
            piece = int(off[i].argmin())
            result[i] = lines.place(piece, lines.share(piece, point))
        else:
            continue
        gap = float(np.hypot(*(result[i] - point)))
        if gap > UNSEEN * lines.size:
            notes.append(
                f"{what}: point {at(point)} moved by {gap:.2g} m onto "
                f"{lines.names[piece]}"
            )
    return result, notes


def followed(points: Floats, ends: Floats, bulges: Floats, lines: Lines) -> Floats:
    """Bulges of pieces, with those that run along a line made its own, (n,)."""
    result = bulges.copy()
    middles = curves.points_at(points, ends, bulges, np.full(len(bulges), 0.5))
    near = lines.distances(middles) <= SNAP_SHARE * lines.size
    on = _on(points, lines) & _on(ends, lines) & near
    for i, piece in np.argwhere(on):
        first, last = (lines.share(piece, p[i]) for p in (points, ends))
        part = curves.part(float(lines.bulges[piece]), abs(last - first))
        result[i] = part if last > first else -part
    return result


def threaded(
    points: Floats, ends: Floats, bulges: Floats, lines: Lines
) -> tuple[Floats, Floats, list[int]]:
    """Pieces parted at vertices of lines that they pass within the snap distance.

    Returns
    -------
    points : ndarray, shape (m, 2)
        Where each part begins.
    bulges : ndarray, shape (m,)
        Bulge of each part.
    owners : list of int
        The piece each is a part of.
    """
    snap, on = SNAP_SHARE * lines.size, ON * lines.size
    vertices = np.unique(np.concatenate([lines.starts, lines.ends]), axis=0)
    off = curves.distances(vertices, points, ends, bulges)
    found: list[tuple[Floats, float, int]] = []
    for i, bulge in enumerate(bulges):
        near = vertices[(off[:, i] <= snap) & (off[:, i] > on)]
        far = np.minimum(*(np.hypot(*(near - p[i]).T) for p in (points, ends))) > snap
        stops = sorted(
            (curves.nearest_share(v, points[i], ends[i], float(bulge)), tuple(v))
            for v in near[far]
        )
        cuts = [(0.0, tuple(points[i])), *stops]
        shares = [*(share for share, _ in cuts), 1.0]
        found += [
            (np.array(place), curves.part(float(bulge), shares[k + 1] - share), i)
            for k, (share, place) in enumerate(cuts)
        ]
    starts, bent, owners = zip(*found, strict=True)
    return np.array(starts), np.array(bent), list(owners)


def _on(points: Floats, lines: Lines) -> Bools:
    on: Bools = lines.distances(points) <= ON * lines.size + 1e-15 * np.abs(points).max(
        initial=0.0
    )
    return on
