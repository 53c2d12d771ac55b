"""Triangles with one edge that is an arc of a circle.

Their polynomials are those of the straight triangle on the same vertices, in its own
barycentrics, over the true region between the two straight edges and the arc: the cone

    x = O + t (P(s) - O),   0 <= t <= 1,   0 <= s <= 1,

from the vertex O opposite the arc to the points P(s) of it. The arc may bulge out of
the triangle or into it, as long as every ray from O meets it once.

Axes: m such triangles, q points, c coordinates.
"""

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from kplate.arrays import Bools, Floats, Ints
from kplate.elements.triangle import EDGES, barycentric_gradients
from kplate.quadrature import gauss

# Points of the quadrature along rays and along the arc. Along rays it is exact; the
# curvatures of lifts grow where a ray is steep to the arc, and there decide: with a
# steepness of 0.6 20 points take their energy to 1e-13, of 0.3 to 1e-9 (12 points: to
# 1e-8 and 1e-4).
_ALONG_RAYS, _ALONG_ARC = 6, 20
# Share of a ray below which a point is the apex itself.
_APEX = 1e-12


@dataclass(frozen=True, eq=False, kw_only=True)
class Arcs:
    """Round edges of some triangles.

    Parameters
    ----------
    rows : ndarray, shape (m,)
        Which triangles of those at hand they belong to, each at most once.
    vertices : ndarray, shape (m, 3, 2)
        Vertices of these in m, counter-clockwise.
    edges : ndarray, shape (m,)
        Which of their edges is round.
    circles : ndarray, shape (m, 3)
        Centre and radius in m of the circle that it lies on.
    holds, clamps : ndarray, shape (m,)
        Whether w, and whether the slope across it, has to vanish along it.
    """

    rows: Ints
    vertices: Floats
    edges: Ints
    circles: Floats
    holds: Bools
    clamps: Bools

    def __len__(self) -> int:
        """How many there are."""
        return len(self.rows)

    @property
    def held(self) -> Bools:
        """Along which w, or its slope across, has to vanish, (m,)."""
        return self.holds | self.clamps

    def chosen(self, which: Bools | Ints, rows: Ints | None = None) -> "Arcs":
        """Some of them, for the triangles at hand numbered as they are or anew."""
        return Arcs(
            rows=self.rows[which] if rows is None else rows,
            vertices=self.vertices[which],
            edges=self.edges[which],
            circles=self.circles[which],
            holds=self.holds[which],
            clamps=self.clamps[which],
        )

    def unheld(self) -> "Arcs":
        """The same, along which nothing has to vanish."""
        nothing = np.zeros(len(self), dtype=bool)
        return replace(self, holds=nothing, clamps=nothing)

    def alone(self) -> "Arcs":
        """The same, with no other triangles at hand."""
        return replace(self, rows=np.arange(len(self)))

    def among(self, triangles: Ints) -> "Arcs":
        """Those of some of the triangles at hand (k,), numbered as these are."""
        if not len(self):
            return self
        order = np.argsort(self.rows)
        place = np.searchsorted(self.rows, triangles, sorter=order)
        which = order[np.minimum(place, len(order) - 1)]
        found = np.flatnonzero(self.rows[which] == triangles)
        return self.chosen(which[found], found)

    @cached_property
    def order(self) -> Ints:
        """Numbers (m, 3) of the apex, and of the arc's start and end."""
        return np.array([(k, *EDGES[k]) for k in range(3)])[self.edges]

    @cached_property
    def corners(self) -> tuple[Floats, Floats, Floats]:
        """Apex, start and end of the arc in m, (m, 2) each."""
        turned = np.take_along_axis(self.vertices, self.order[:, :, None], axis=1)
        return turned[:, 0], turned[:, 1], turned[:, 2]

    @cached_property
    def turn(self) -> Floats:
        """Angle in rad that each arc turns through, positive where it bulges out."""
        arms = np.stack(self.corners[1:]) - self.circles[:, :2]
        angles = np.arctan2(arms[..., 1], arms[..., 0])
        step: Floats = (angles[1] - angles[0] + np.pi) % (2.0 * np.pi) - np.pi
        return step

    @cached_property
    def lengths(self) -> Floats:
        """Length of each arc in m."""
        return np.abs(self.turn) * self.circles[:, 2]

    @cached_property
    def chords(self) -> tuple[Floats, Floats, Floats]:
        """Middle, unit tangent and outward normal of each chord, (m, 2) each."""
        _, start, end = self.corners
        tangent = end - start
        tangent = tangent / np.hypot(*tangent.T)[:, None]
        normal = np.column_stack([tangent[:, 1], -tangent[:, 0]])
        return 0.5 * (start + end), tangent, normal

    def at(self, shares: Floats) -> tuple[Floats, Floats, Floats]:
        """Points P of the arcs at shares (q,) or (m, q), and dP/ds, d2P/ds2.

        Each has the shape (m, q, 2).
        """
        _, start, _ = self.corners
        arm = start - self.circles[:, :2]
        angle = self.turn[:, None] * shares
        cos, sin = np.cos(angle)[..., None], np.sin(angle)[..., None]
        turned = np.column_stack([-arm[:, 1], arm[:, 0]])
        out = cos * arm[:, None] + sin * turned[:, None]
        along = cos * turned[:, None] - sin * arm[:, None]
        turn = self.turn[:, None, None]
        return self.circles[:, None, :2] + out, turn * along, -(turn**2) * out

    def frames(self, shares: Floats) -> tuple[Floats, Floats]:
        """Unit tangents, the plate on the left, and outward normals, (m, q, 2) each."""
        _, along, _ = self.at(shares)
        tangent = along / np.hypot(along[..., 0], along[..., 1])[..., None]
        normal = np.stack([tangent[..., 1], -tangent[..., 0]], axis=-1)
        return tangent, normal

    @property
    def curvatures(self) -> Floats:
        """Curvature in 1/m, positive where the arc bulges out, (m,)."""
        return np.sign(self.turn) / self.circles[:, 2]

    @cached_property
    def gradients(self) -> Floats:
        """Gradients in 1/m of the barycentrics, (m, 3, 2)."""
        return barycentric_gradients(self.vertices)

    def barycentrics(self, points: Floats) -> Floats:
        """Barycentrics (m, q, 3) of points (m, q, 2) in m."""
        away = points - self.vertices[:, None, 0]
        result = np.einsum("mvc,mqc->mqv", self.gradients, away)
        result[..., 0] += 1.0
        return result

    @cached_property
    def rule(self) -> tuple[Floats, Floats]:
        """Quadrature of the true regions: barycentrics (m, q, 3), weights in m2."""
        (t, along), (s, around) = gauss(_ALONG_RAYS), gauss(_ALONG_ARC)
        apex = self.corners[0][:, None]
        arc, step, _ = self.at(s)
        ray = arc - apex
        cross = ray[..., 0] * step[..., 1] - ray[..., 1] * step[..., 0]
        points = apex[:, None] + ray[:, :, None] * t[:, None]
        weights = (cross * around)[:, :, None] * (t * along)
        m = len(self)
        flat = points.reshape(m, len(s) * len(t), 2)
        return self.barycentrics(flat), weights.reshape(m, flat.shape[1])

    @cached_property
    def steepness(self) -> Floats:
        """Least share, of twice the triangle's area, that a ray sweeps, (m,).

        It is positive where every ray from the apex meets the arc once.
        """
        arc, step, _ = self.at(np.linspace(0.0, 1.0, 9))
        apex, start, end = self.corners
        ray = arc - apex[:, None]
        cross = ray[..., 0] * step[..., 1] - ray[..., 1] * step[..., 0]
        u, v = start - apex, end - apex
        least: Floats = cross.min(axis=1) / (u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0])
        return least

    def bent(self, barycentrics: Floats, count: int) -> Floats:
        """Where points of straight triangles lie in the true ones.

        Points of the straight triangle, (q, 3) for each of `count` at hand, go along
        the ray from the apex; those on the chord come to lie on the arc.

        Returns
        -------
        ndarray, shape (q, 3) if none is round, else (count, q, 3)
        """
        if not len(self):
            return barycentrics
        result = np.tile(barycentrics, (count, 1, 1))
        own = barycentrics[:, self.order]  # (q, m, 3)
        t = (own[..., 1] + own[..., 2]).T
        s = np.divide(own[..., 2].T, t, out=np.full_like(t, 0.5), where=t > 0.0)
        arc, _, _ = self.at(s)
        apex = self.corners[0][:, None]
        result[self.rows] = self.barycentrics(apex + t[..., None] * (arc - apex))
        return result

    def cone(self, barycentrics: Floats) -> tuple[Floats, Floats]:
        """T and s (m, q) of points given by barycentrics (m, q, 3)."""
        apex, middle = self.corners[0], self.chords[0]
        height = middle - apex
        length = np.hypot(*height.T)[:, None]
        ray = barycentrics @ self.vertices - apex[:, None]
        reach = np.hypot(ray[..., 0], ray[..., 1])
        away = reach > _APEX * length
        way = np.where(away[..., None], ray, height[:, None])
        way = way / np.where(away, reach, length)[..., None]
        arm = apex - self.circles[:, :2]
        b = np.einsum("mqc,mc->mq", way, arm)
        c = (np.einsum("mc,mc->m", arm, arm) - self.circles[:, 2] ** 2)[:, None]
        root = np.sqrt(np.maximum(b * b - c, 0.0)) * np.sign(self.turn)[:, None]
        whole = root - b  # the far side of the circle if it bulges out, else the near
        foot = apex[:, None] + whole[..., None] * way - self.circles[:, None, :2]
        start = self.corners[1] - self.circles[:, :2]
        cross = start[:, None, 0] * foot[..., 1] - start[:, None, 1] * foot[..., 0]
        angle = np.arctan2(cross, np.einsum("mqc,mc->mq", foot, start))
        shares = np.clip(angle / self.turn[:, None], 0.0, 1.0)
        return np.where(away, reach, 0.0) / whole, shares


def no_arcs() -> Arcs:
    """None at all."""
    nothing = np.empty(0, dtype=np.int64)
    return Arcs(
        rows=nothing,
        vertices=np.empty((0, 3, 2)),
        edges=nothing,
        circles=np.empty((0, 3)),
        holds=np.empty(0, dtype=bool),
        clamps=np.empty(0, dtype=bool),
    )
