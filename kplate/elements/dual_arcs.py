"""The dual on triangles with a round edge: moments in balance up to what arcs carry.

The moments are polynomials on the true triangle. What tests their balance is written
by parts, for the outward normal n and the arc's own tangent,

    b(m; v, r) = integral of div div m v + sum over edges of (v_n, v) + (m_nn, r)
                 + at each vertex the jump of m_ns times v,
    v_n = q_n - d m_ns / ds,
    d m_ns / ds = n . (dm/ds) t + curvature (m_tt - m_nn),

so that straight edges, corners and the inside are tested as on straight triangles, the
inside over the true region. Along the arc m_nn and v_n are no polynomials of it, and
vanish on the average only. With tau along the chord from -1 to 1, y across it in m and
Legendre's polynomials P, the unknowns on a round edge stand for

- deflections v = P_j(tau), j < k: their rows are ``(v_n, v) + (m_nn, dv/dn)``;
- slopes: where w is free those of v = y P_j(tau), j <= k, with the same rows; where it
  is held, ``(m_nn, r)`` for r = n . y, P_1, ..., P_k.

Among the tests are those of all rigid motions, so that what is left of m_nn and v_n
along the arc works on curvatures only: `residuals` bounds its work. On a circle n . x
is P_1 but for a factor.

Source: derived here; checked against the exact energies of plates with round rims.
"""

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from kplate.arrays import Floats
from kplate.elements import bernstein
from kplate.elements.arcs import Arcs
from kplate.elements.piecewise import curvature_of_pairs
from kplate.elements.triangle import area
from kplate.quadrature import gauss, triangle_rule

_POINTS = 14  # of the quadrature along an arc
# Rays on which the shape of a triangle is taken, and what its slope may be missed by.
_RAYS, _SAFETY = 41, 1.05


@dataclass(frozen=True, eq=False, kw_only=True)
class RoundDual:
    """What round edges change of a dual of order k.

    Parameters
    ----------
    order : int
        Degree k of the moments.
    arcs : Arcs
        The round edges.
    """

    order: int
    arcs: Arcs

    @cached_property
    def masses(self) -> Floats:
        """Products of the moments' polynomials over the true regions, (m, o, o)."""
        points, weights = self.arcs.rule
        values = bernstein.values(self.order, points)
        weighted: Floats = values * weights[..., None]
        return values.swapaxes(1, 2) @ weighted

    def inner_change(self) -> Floats:
        """Change of the work of div div m on w's ordinates, (m, 3, o, ordinates).

        What the true region adds to that of the straight triangle.
        """
        arcs, k = self.arcs, self.order
        rule = triangle_rule(2 * k - 1)
        bends = curvature_of_pairs(arcs.gradients)
        total: Floats | float = 0.0
        straight = area(arcs.vertices)[:, None] * rule.weights
        m = len(arcs)
        for points, weights in (
            arcs.rule,
            (np.broadcast_to(rule.points, (m, *rule.points.shape)), -straight),
        ):
            carried = bends[:, None] @ bernstein.hessians(k, points)  # (m, q, 3, o)
            v = bernstein.values(k + 1, points) * weights[..., None]
            total = total + np.einsum("mqao,mqd->maod", carried, v, optimize=True)
        assert not isinstance(total, float)
        return total

    def chord_work(self) -> Floats:
        """Work of q_n and m_ns along the chords on w's ordinates, (m, 3, o, d).

        ``(q_n, v) + (m_ns, dv/ds)``, which the coupling of straight triangles has.
        """
        arcs, k = self.arcs, self.order
        share, weights = gauss(k + 1)
        _, start, end = arcs.corners
        _, tangent, normal = arcs.chords
        lengths = np.hypot(*(end - start).T)
        points = start[:, None] + share[:, None] * (end - start)[:, None]
        at = arcs.barycentrics(points)
        q = len(share)
        frame = (_along(tangent, q), _along(normal, q))
        _, m_ns, q_n, _ = self._rows(at, *frame)
        v = bernstein.values(k + 1, at)
        by = bernstein.gradients(k + 1, at)
        slope = np.einsum("mvc,mqvd,mc->mqd", arcs.gradients, by, tangent)
        weighted = lengths[:, None] * weights
        return np.einsum("mq,mqao,mqd->maod", weighted, q_n, v, optimize=True) + (
            np.einsum("mq,mqao,mqd->maod", weighted, m_ns, slope, optimize=True)
        )

    def end_twists(self) -> Floats:
        """m_ns with the arc's own tangent at its start and end, (m, 2, 3, o)."""
        shares = np.array([0.0, 1.0])
        at = self.arcs.barycentrics(self.arcs.at(shares)[0])
        return self._rows(at, *self.arcs.frames(shares))[1]

    def deflection_rows(self) -> Floats:
        """Rows of the arcs' deflections, (m, 3, o, k)."""
        v, slope = self._deflections
        return self._work(v, slope)

    def slope_rows(self) -> Floats:
        """Rows of the arcs' slopes, (m, 3, o, k + 1)."""
        v, slope = self._slopes
        free = self._work(v, slope)
        held = self._work(np.zeros_like(v), self._rotations)
        return np.where(self.arcs.holds[:, None, None, None], held, free)

    def loads(self, force: Floats, moment: Floats) -> tuple[Floats, Floats]:
        """Work of a line force (m,) in N/m and an edge moment (m,) in N on the rows.

        Returns
        -------
        ndarray, shape (m, k)
            On the deflections.
        ndarray, shape (m, k + 1)
            On the slopes.
        """
        weights = self._weights
        found = []
        for v, slope in (self._deflections, self._slopes):
            work = force[:, None, None] * v + moment[:, None, None] * slope
            found.append(np.einsum("mq,mqj->mj", weights, work))
        turned = moment[:, None] * np.einsum("mq,mqj->mj", weights, self._rotations)
        found[1] = np.where(self.arcs.holds[:, None], turned, found[1])
        return found[0], found[1]

    def residuals(self, ordinates: Floats, force: Floats, moment: Floats) -> Floats:
        """Bound on the work of what is left along arcs on second derivatives.

        Parameters
        ----------
        ordinates : ndarray, shape (m, o, 3, c)
            Of the moments.
        force, moment : ndarray, shape (m, c)
            Line force in N/m and edge moment in N that act along the arcs.

        Returns
        -------
        ndarray, shape (m, c)
            Squares: of the greatest work, in J, on a w whose second derivatives have
            the integral of squares 1 over the triangle.

        Notes
        -----
        For g of mean zero on the arc, ``|g|^2 <= C^2 |grad g|^2`` over the triangle,
        which is star-shaped about its apex: from ``div(|g|^2 (x - O))`` with Poincare's
        constant d/pi of convex regions of diameter d (Payne and Weinberger, from
        memory), mapped along the rays where the arc bulges in. Applied to the slopes of
        w, and along the arc of length L once more to w itself, ``(L/pi)^2``.
        """
        at, weights = self._points, self._weights
        m_nn, _, q_n, twist = self._rows(at, *self.arcs.frames(self._shares))
        v_n = q_n - twist
        o = ordinates.shape[1]
        flat = ordinates.swapaxes(1, 2).reshape(len(at), 3 * o, -1)
        left = m_nn.reshape(*at.shape[:2], 3 * o) @ flat - moment[:, None]
        push = v_n.reshape(*at.shape[:2], 3 * o) @ flat - force[:, None]
        holds, clamps = self.arcs.holds[:, None], self.arcs.clamps[:, None]
        turning = np.einsum("mq,mqc->mc", weights, left**2)
        pushing = np.einsum("mq,mqc->mc", weights, push**2)
        turning = np.where(clamps, 0.0, turning)
        pushing = np.where(holds, 0.0, pushing)
        reach = (self.arcs.lengths[:, None] / np.pi) ** 2
        return self._trace[:, None] * (turning + reach * pushing)

    @cached_property
    def _trace(self) -> Floats:
        """Square C^2 in m of the constant of `residuals`."""
        arcs = self.arcs
        shares = np.linspace(0.0, 1.0, _RAYS)
        arc, _, _ = arcs.at(shares)
        apex, start, end = arcs.corners
        _, normal = arcs.frames(shares)
        ray = arc - apex[:, None]
        height = np.einsum("mqc,mqc->mq", ray, normal).min(axis=1)
        reach = np.hypot(ray[..., 0], ray[..., 1])
        diameter = np.maximum(reach.max(axis=1), np.hypot(*(end - start).T))
        poincare = diameter / np.pi
        _, _, across = arcs.chords
        way = ray / reach[..., None]
        chord = np.einsum("mc,mc->m", start - apex, across)[:, None] / np.einsum(
            "mqc,mc->mq", way, across
        )
        stretch = reach / chord
        angle = np.unwrap(np.arctan2(way[..., 1], way[..., 0]), axis=1)
        steep = np.abs(np.diff(stretch, axis=1) / np.diff(angle, axis=1)).max(axis=1)
        most, least = stretch.max(axis=1), stretch.min(axis=1)
        mapped = poincare * most / least * (most + _SAFETY * steep)
        poincare = np.where(arcs.turn < 0.0, mapped, poincare)
        return (2.0 * poincare**2 + 2.0 * poincare * diameter) / height

    @cached_property
    def _shares(self) -> Floats:
        return gauss(_POINTS)[0]

    @cached_property
    def _weights(self) -> Floats:
        """Weights of the points along arcs in m, (m, q)."""
        return self.arcs.lengths[:, None] * gauss(_POINTS)[1]

    @cached_property
    def _points(self) -> Floats:
        return self.arcs.barycentrics(self.arcs.at(self._shares)[0])

    @cached_property
    def _chordwise(self) -> tuple[Floats, Floats, Floats, Floats, Floats]:
        """tau, y, the normal's parts along and across the chord, half a chord."""
        arcs = self.arcs
        middle, tangent, normal = arcs.chords
        _, start, end = arcs.corners
        half = 0.5 * np.hypot(*(end - start).T)[:, None]
        away = arcs.at(self._shares)[0] - middle[:, None]
        out = arcs.frames(self._shares)[1]
        tau = np.einsum("mqc,mc->mq", away, tangent) / half
        y = np.einsum("mqc,mc->mq", away, normal)
        along = np.einsum("mqc,mc->mq", out, tangent)
        across = np.einsum("mqc,mc->mq", out, normal)
        return tau, y, along, across, half

    @cached_property
    def _legendre(self) -> tuple[Floats, Floats]:
        """Legendre's polynomials to degree k of tau, and their derivatives by it."""
        tau = self._chordwise[0]
        legendre = np.polynomial.legendre
        table: Floats = legendre.legvander(tau, self.order).astype(np.float64)
        down = legendre.legder(np.eye(self.order + 1))
        return table, table[..., :-1] @ down

    @cached_property
    def _deflections(self) -> tuple[Floats, Floats]:
        """V = P_j(tau) and dv/dn at the points, (m, q, k) each."""
        _, _, along, _, half = self._chordwise
        P, dP = self._legendre
        k = self.order
        return P[..., :k], dP[..., :k] * (along / half)[..., None]

    @cached_property
    def _slopes(self) -> tuple[Floats, Floats]:
        """V = y P_j(tau) and dv/dn at the points, (m, q, k + 1) each."""
        _, y, along, across, half = self._chordwise
        P, dP = self._legendre
        v = y[..., None] * P
        slope: Floats = across[..., None] * P + (y * along / half)[..., None] * dP
        return v, slope

    @cached_property
    def _rotations(self) -> Floats:
        """R = n . y, P_1, ... P_k at the points, (m, q, k + 1)."""
        P = self._legendre[0].copy()
        P[..., 0] = self._chordwise[3]
        return P

    def _work(self, v: Floats, slope: Floats) -> Floats:
        """``(v_n, v) + (m_nn, slope)`` along arcs, (m, 3, o, j)."""
        m_nn, _, q_n, twist = self._rows(self._points, *self.arcs.frames(self._shares))
        weights = self._weights[..., None]
        return np.einsum(
            "mqao,mqj->maoj", q_n - twist, weights * v, optimize=True
        ) + np.einsum("mqao,mqj->maoj", m_nn, weights * slope, optimize=True)

    def _rows(
        self, at: Floats, tangent: Floats, normal: Floats
    ) -> tuple[Floats, Floats, Floats, Floats]:
        """m_nn, m_ns, q_n and d m_ns / ds at points (m, q, 3), (m, q, 3, o) each.

        The last as along the arcs, with their curvature.
        """
        arcs = self.arcs
        B = bernstein.values(self.order, at)[:, :, None]
        by = bernstein.gradients(self.order, at)
        gx, gy = np.moveaxis(
            np.einsum("mvc,mqvo->mqco", arcs.gradients, by, optimize=True), 2, 0
        )
        nn = _products(normal, normal)[..., None]
        ns = _products(normal, tangent)[..., None]
        ss = _products(tangent, tangent)[..., None]
        nx, ny = normal[..., 0, None], normal[..., 1, None]
        q_n = -np.stack([gx * nx, gy * ny, gy * nx + gx * ny], axis=2)
        along = (gx * tangent[..., 0, None] + gy * tangent[..., 1, None])[:, :, None]
        bow = arcs.curvatures[:, None, None, None]
        return nn * B, ns * B, q_n, ns * along + bow * (ss - nn) * B


def _products(a: Floats, b: Floats) -> Floats:
    """Weights of m_xx, m_yy, m_xy in a . m b, (..., 3)."""
    ax, ay, bx, by = a[..., 0], a[..., 1], b[..., 0], b[..., 1]
    return np.stack([ax * bx, ay * by, ax * by + ay * bx], axis=-1)


def _along(vectors: Floats, count: int) -> Floats:
    """The same vectors (m, 2) at so many points, (m, q, 2)."""
    return np.broadcast_to(vectors[:, None], (len(vectors), count, 2))
