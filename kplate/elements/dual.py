"""The Hellan-Herrmann-Johnson dual of order k: moments in equilibrium with the load.

On each triangle the three moments are polynomials of degree k that jump from triangle
to triangle, w is a polynomial of degree k + 1, continuous across triangles, and every
edge has a normal slope of its own, a polynomial of degree k. The moments answer to both
through the *coupling*

    b(m; w, s) = integral over the triangle of  m_xx w,xx + m_yy w,yy + 2 m_xy w,xy
                 - integral around it of  m_nn (dw/dn - s),

and follow from ``integral of m : D^-1 t = b(t; w, s)`` for all moments t. Balance with
the loads, ``b(m; v, r) = work of the loads on v and r`` for all v and r, makes

- ``m_xx,xx + 2 m_xy,xy + m_yy,yy = p`` inside, for pressures of degree k - 2,
- m_nn and the effective shear v_n continuous across edges and zero on free ones,
- the jumps of m_ns about a vertex add up to the force there,

all of them exactly. So the moments are admissible, and their complementary energy is
not below that of the plate. Every w of degree k + 2 is exact in moments and energy, of
degree k + 1 in deflection and slopes too. Moments converge as h**(k + 1).

Unknowns: w at the three vertices; then edge by edge the k inner Bernstein ordinates of
w on the edge and the k + 1 Legendre coefficients of its slope along
`triangle.edge_normals`, both counted in the sense of `triangle.edge_senses`; then the
ordinates of w inside. Those inside and the moments are eliminated triangle by triangle.

Axes: n triangles, q points, m or a three moments, o their ordinates, d unknowns, c
cases; *whole* has the unknowns inside too.

Source: K. Hellan, "Analysis of elastic plates in flexure by a simplified finite element
method", Acta Polytechnica Scandinavica, Ci 46 (1967); L. R. Herrmann, "Finite element
bending analysis for plates", J. Eng. Mech. Div. ASCE 93 (1967) 13-26; C. Johnson, "On
the convergence of a mixed finite-element method for plate bending problems", Numer.
Math. 21 (1973) 43-62; the slopes on the edges after D. N. Arnold and F. Brezzi, "Mixed
and nonconforming finite element methods", RAIRO M2AN 19 (1985) 7-32 (all from memory).
"""

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from kplate.arrays import Floats, Ints, read_only_floats, read_only_ints
from kplate.elements import bernstein
from kplate.elements.arcs import Arcs
from kplate.elements.dual_arcs import RoundDual
from kplate.elements.piecewise import curvature_of_pairs
from kplate.elements.triangle import (
    EDGES,
    Geometry,
    area,
    barycentric_gradients,
    edge_senses,
)
from kplate.quadrature import Rule, gauss, triangle_rule


@dataclass(frozen=True, eq=False, kw_only=True)
class Condensed:
    """Triangles without their moments and their unknowns inside.

    Parameters
    ----------
    coupling : ndarray, shape (n, 3 o, whole)
        The coupling of each moment ordinate (moment by moment) with each unknown.
    bending : ndarray, shape (n, 3 o, whole)
        The moment ordinates that each unknown brings, in N.
    stiffness : ndarray, shape (n, d, d)
        Of the unknowns that are left.
    inside : ndarray, shape (n, i, i)
        Stiffness of the unknowns inside.
    relief : ndarray, shape (n, i, d)
        How far the unknowns inside give way to each of the others.
    """

    coupling: Floats
    bending: Floats
    stiffness: Floats
    inside: Floats
    relief: Floats

    def forces(self, forces: Floats) -> Floats:
        """Forces on the unknowns that are left, (n, d, c), from all (n, whole, c)."""
        left = self.stiffness.shape[-1]
        carried = self.relief.swapaxes(1, 2) @ forces[:, left:]
        return forces[:, :left] - carried

    def whole(self, unknowns: Floats, forces: Floats) -> Floats:
        """All unknowns (n, whole, c) from those left (n, d, c) and all forces."""
        left = self.stiffness.shape[-1]
        moved = np.linalg.solve(self.inside, forces[:, left:])
        return np.concatenate([unknowns, moved - self.relief @ unknowns], axis=1)

    def moments(self, whole: Floats) -> Floats:
        """Ordinates of the moments in N, (n, o, 3, c), from all unknowns."""
        n, rows, _ = self.bending.shape
        ordinates = self.bending @ whole
        return ordinates.reshape(n, 3, rows // 3, -1).swapaxes(1, 2)

    def internal_forces(self, moments: Floats) -> Floats:
        """Forces on all unknowns, (n, whole, c), that balance moments (n, o, 3, c).

        What a solution's forces differ from them is its defect: round-off of ``w/h^2``
        in the moments of small triangles, which a second solution takes away.
        """
        n, rows, _ = self.coupling.shape
        ordinates = moments.swapaxes(1, 2).reshape(n, rows, -1)
        return self.coupling.swapaxes(1, 2) @ ordinates


@dataclass(frozen=True, eq=False, kw_only=True)
class Dual:
    """The dual of one order.

    Parameters
    ----------
    order : int
        Degree k of the moments, at least 2.
    """

    order: int

    @property
    def name(self) -> str:
        """Its name in words."""
        return f"Hellan-Herrmann-Johnson dual of order {self.order}"

    @property
    def per_vertex(self) -> int:
        """Unknowns at each vertex: w."""
        return 1

    @property
    def per_edge(self) -> int:
        """Unknowns on each edge: deflections, then slopes."""
        return 2 * self.order + 1

    @property
    def edge_deflections(self) -> int:
        """How many of the unknowns on an edge are deflections."""
        return self.order

    @property
    def left(self) -> int:
        """Unknowns of a triangle that are left when those inside are eliminated."""
        return 3 * (self.per_vertex + self.per_edge)

    @property
    def whole(self) -> int:
        """Unknowns of a triangle with those inside."""
        return self.left + math.comb(self.order, 2)

    @property
    def ordinates(self) -> int:
        """How many Bernstein ordinates each moment has."""
        return math.comb(self.order + 2, 2)

    @property
    def degree(self) -> int:
        """Polynomials w up to this degree are exact in moments."""
        return self.order + 2

    @cached_property
    def rule(self) -> Rule:
        """Quadrature exact for two moments multiplied."""
        return triangle_rule(2 * self.order)

    @cached_property
    def load_rule(self) -> Rule:
        """Quadrature exact for two deflections multiplied."""
        return triangle_rule(2 * self.order + 2)

    @cached_property
    def pieces(self) -> Floats:
        """Barycentric vertices of the one piece on which w is one polynomial."""
        return read_only_floats([np.eye(3)])

    def condense(
        self, vertices: Floats, rigidity: Floats, arcs: Arcs | None = None
    ) -> Condensed:
        """Eliminate the moments and the unknowns inside, triangle by triangle.

        vertices (n, 3, 2) in m, rigidity (n, 3, 3) in N m; of those with round edges
        `arcs` over the true regions.
        """
        R = self._coupling(vertices, arcs)
        n, _, o, whole = R.shape
        left = self.left
        D: Floats = rigidity / area(vertices)[:, None, None]
        bent = (D @ R.reshape(n, 3, o * whole)).reshape(R.shape)
        coupling = R.reshape(n, 3 * o, whole)
        bending = (self._inverse_masses @ bent).reshape(n, 3 * o, whole)
        if arcs is not None and len(arcs):
            own = rigidity[arcs.rows] @ R[arcs.rows].reshape(-1, 3, o * whole)
            masses = RoundDual(order=self.order, arcs=arcs).masses[:, None]
            solved = np.linalg.solve(masses, own.reshape(-1, 3, o, whole))
            bending[arcs.rows] = solved.reshape(-1, 3 * o, whole)
        K: Floats = coupling.swapaxes(1, 2) @ bending
        inside = K[:, left:, left:]
        relief = np.linalg.inv(inside) @ K[:, left:, :left]
        return Condensed(
            coupling=coupling,
            bending=bending,
            stiffness=K[:, :left, :left] - K[:, :left, left:] @ relief,
            inside=inside,
            relief=relief,
        )

    def coupling(self, vertices: Floats, arcs: Arcs | None = None) -> Floats:
        """The coupling of moment ordinates with all unknowns, (n, o, 3, whole)."""
        return self._coupling(vertices, arcs).swapaxes(1, 2)

    def load(self, geometry: Geometry, pressure: Floats) -> Floats:
        """Consistent loads of a pressure.

        `geometry` has the rule `load_rule`; pressure (n, q) in Pa at its points,
        positive up; returns (n, whole): what works on each unknown.
        """
        vertices, rule = geometry.vertices, geometry.rule
        forces = pressure * area(vertices)[:, None] * rule.weights
        loads = np.zeros((len(vertices), self.whole))
        loads[:, self._columns] = forces @ bernstein.values(self.order + 1, rule.points)
        return self._counted_by_edge(loads, vertices)

    def evaluate(
        self, vertices: Floats, barycentrics: Floats, arcs: Arcs | None = None
    ) -> Floats:
        """Deflection and its slopes at points (q, 3) or (n, q, 3) of triangles.

        Returns (n, q, 3, whole): the rows that turn unknowns into w, dw/dx, dw/dy, of
        which the last two jump from triangle to triangle. The deflections of round
        edges work along these alone.
        """
        shape = np.broadcast_shapes(barycentrics.shape, (len(vertices), 1, 1))
        by = bernstein.gradients(self.order + 1, barycentrics)
        g = barycentric_gradients(vertices)
        rows = np.zeros((*shape[:-1], 3, self.whole))
        rows[..., 0, self._columns] = bernstein.values(self.order + 1, barycentrics)
        rows[..., 1:, self._columns] = g.swapaxes(1, 2)[:, None] @ by
        if arcs is not None:
            for e in range(3):
                own = arcs.rows[arcs.edges == e]
                first = self._first(e)
                rows[own, ..., first : first + self.edge_deflections] = 0.0
        return self._counted_by_edge(rows, vertices)

    def round_rule(self, arcs: Arcs) -> tuple[Floats, Floats]:
        """Quadrature of true triangles: barycentrics (m, q, 3), weights in m2."""
        return arcs.rule

    def arc_loads(self, arcs: Arcs, force: Floats, moment: Floats) -> Floats:
        """Work of a line force in N/m and an edge moment in N along arcs, (m,) each.

        Returns (m, whole).
        """
        on_w, on_slope = RoundDual(order=self.order, arcs=arcs).loads(force, moment)
        rows = np.zeros((len(arcs), self.whole))
        for e in range(3):
            own = np.flatnonzero(arcs.edges == e)
            first = self._first(e)
            rows[own, first : first + self.edge_deflections] = on_w[own]
            rows[own, self._slopes(e)] = on_slope[own]
        return rows

    def outward_slopes(self, vertices: Floats, edges: Ints, shares: Floats) -> Floats:
        """Outward slope on one edge (n,) of each triangle, the edge's own unknowns.

        `shares` (q,) of the edge are counted from vertex k + 1 to k + 2 of edge k;
        returns the rows (n, q, whole).
        """
        rows = np.zeros((len(vertices), len(shares), self.whole))
        legendre = np.polynomial.legendre.legvander(2.0 * shares - 1.0, self.order)
        for k in range(3):
            rows[edges == k, :, self._slopes(k)] = legendre
        return self._counted_by_edge(rows, vertices)

    def moments(self, ordinates: Floats, barycentrics: Floats) -> Floats:
        """Moments in N at points (q, 3) or (n, q, 3), (n, q, 3, c)."""
        n, o, _, c = ordinates.shape
        values = bernstein.values(self.order, barycentrics)
        return (values @ ordinates.reshape(n, o, 3 * c)).reshape(n, -1, 3, c)

    def shears(
        self, vertices: Floats, ordinates: Floats, barycentrics: Floats
    ) -> Floats:
        """Transverse shears ``q_x, q_y`` in N/m at points, (n, q, 2, c)."""
        n, o, _, c = ordinates.shape
        by = bernstein.gradients(self.order, barycentrics)
        by = by.reshape(*by.shape[:-3], -1, o)  # (n or none, q v, o)
        slopes = (by @ ordinates.reshape(n, o, 3 * c)).reshape(n, -1, 3, 3, c)
        (xx, yy, xy) = np.moveaxis(
            np.einsum("nvx,nqvmc->nqmxc", barycentric_gradients(vertices), slopes), 2, 0
        )
        return -np.stack([xx[:, :, 0] + xy[:, :, 1], xy[:, :, 0] + yy[:, :, 1]], axis=2)

    def carried(
        self, vertices: Floats, ordinates: Floats, barycentrics: Floats
    ) -> Floats:
        """Pressure in Pa that the moments carry at points, (n, q, c).

        It is ``m_xx,xx + 2 m_xy,xy + m_yy,yy``, of degree k - 2.
        """
        n, o, _, c = ordinates.shape
        bends = curvature_of_pairs(barycentric_gradients(vertices))
        by = bernstein.hessians(self.order, barycentrics)  # (n or none, q, 6, o)
        rows = bends[:, None] @ by  # (n, q, 3, o)
        rows = rows.swapaxes(2, 3).reshape(n, -1, 3 * o)
        return rows @ ordinates.reshape(n, 3 * o, c)

    def energy(
        self,
        vertices: Floats,
        rigidity: Floats,
        ordinates: Floats,
        arcs: Arcs | None = None,
    ) -> Floats:
        """Complementary energy of moments in J, half the integral of m : D^-1 m.

        vertices (n, 3, 2), rigidity (n, 3, 3), ordinates (n, o, 3, c); returns (n, c).
        """
        curvatures = np.linalg.inv(rigidity)[:, None] @ ordinates
        products = np.einsum(
            "op,nomc,npmc->nc",
            bernstein.masses(self.order),
            ordinates,
            curvatures,
            optimize=True,
        )
        energies: Floats = 0.5 * area(vertices)[:, None] * products
        if arcs is not None and len(arcs):
            energies[arcs.rows] = 0.5 * np.einsum(
                "nop,nomc,npmc->nc",
                RoundDual(order=self.order, arcs=arcs).masses,
                ordinates[arcs.rows],
                curvatures[arcs.rows],
                optimize=True,
            )
        return energies

    def _coupling(self, vertices: Floats, arcs: Arcs | None = None) -> Floats:
        """The coupling, moment by moment, (n, 3, o, whole).

        Its integrals are those of a table times factors of each triangle. With the
        gradients g of the barycentrics, edge e has the outward normal ``-g_e/|g_e|``
        and the length ``2 A |g_e|``.
        """
        n, A, g = len(vertices), area(vertices), barycentric_gradients(vertices)
        factors = np.empty((n, 3, len(self._table)))
        factors[:, :, :6] = curvature_of_pairs(g) * A[:, None, None]
        for e in range(3):
            steep = np.hypot(g[:, e, 0], g[:, e, 1])
            x, y = (g[:, e] / steep[:, None]).T
            m_nn = np.stack([x * x, y * y, 2.0 * x * y], axis=1)
            turning = 2.0 * A[:, None] * np.einsum("nvx,nx->nv", g, g[:, e])
            factors[:, :, 6 + 3 * e : 9 + 3 * e] = m_nn[:, :, None] * turning[:, None]
            factors[:, :, 15 + e] = m_nn * (2.0 * A * steep)[:, None]
        R = factors.reshape(3 * n, -1) @ self._table.reshape(len(self._table), -1)
        R = self._counted_by_edge(R.reshape(n, 3, -1, self.whole), vertices)
        if arcs is not None and len(arcs):
            R[arcs.rows] = self._around_arcs(R[arcs.rows], arcs)
        return R

    def _around_arcs(self, straight: Floats, arcs: Arcs) -> Floats:
        """The coupling where an edge is round, from that of straight triangles."""
        found = RoundDual(order=self.order, arcs=arcs)
        change = np.zeros_like(straight)
        change[..., self._columns] = found.inner_change()
        R = straight + self._counted_by_edge(change, arcs.vertices)
        chords, twists = found.chord_work(), found.end_twists()
        on_w, on_slope = found.deflection_rows(), found.slope_rows()
        for e in range(3):
            own = np.flatnonzero(arcs.edges == e)
            for end, vertex, sign in ((0, EDGES[e][0], -1.0), (1, EDGES[e][1], 1.0)):
                ordinate = int(np.flatnonzero(self._columns == vertex)[0])
                R[own, :, :, vertex] += (
                    sign * twists[own, end] - chords[own, :, :, ordinate]
                )
            first = self._first(e)
            R[own, :, :, first : first + self.edge_deflections] = on_w[own]
            R[own, :, :, self._slopes(e)] = on_slope[own]
        return R

    @cached_property
    def _table(self) -> Floats:
        """Means of products of the moments' polynomials with others, (18, o, whole).

        With second derivatives of w by `bernstein.PAIRS` over the triangle; edge by
        edge with its derivatives by the barycentrics; edge by edge with the slope.
        """
        k, columns = self.order, self._columns
        rule = triangle_rule(2 * k - 1)
        share, weights = gauss(k + 1)
        table = np.zeros((18, self.ordinates, self.whole))
        table[:6, :, columns] = np.einsum(
            "q,qo,qxd->xod",
            rule.weights,
            bernstein.values(k, rule.points),
            bernstein.hessians(k + 1, rule.points),
        )
        for e, (i, j) in enumerate(EDGES):
            line = np.outer(1.0 - share, np.eye(3)[i]) + np.outer(share, np.eye(3)[j])
            weighted = weights[:, None] * bernstein.values(k, line)
            by = bernstein.gradients(k + 1, line)
            legendre = np.polynomial.legendre.legvander(2.0 * share - 1.0, k)
            table[6 + 3 * e : 9 + 3 * e][:, :, columns] = np.einsum(
                "qo,qvd->vod", weighted, by
            )
            table[15 + e, :, self._slopes(e)] = weighted.T @ legendre
        return read_only_floats(table)

    @cached_property
    def _inverse_masses(self) -> Floats:
        return read_only_floats(np.linalg.inv(bernstein.masses(self.order)))

    @cached_property
    def _columns(self) -> Ints:
        """Unknown of each ordinate of w, the edges run as the triangle does."""
        columns, inside = [], self.left
        for a in bernstein.indices(self.order + 1):
            if max(a) == self.order + 1:
                columns.append(a.index(max(a)))
            elif 0 in a:
                e = a.index(0)
                columns.append(self._first(e) + a[EDGES[e][1]] - 1)
            else:
                columns.append(inside)
                inside += 1
        return read_only_ints(columns)

    def _first(self, edge: int) -> int:
        return 3 * self.per_vertex + edge * self.per_edge

    def _slopes(self, edge: int) -> slice:
        first = self._first(edge) + self.edge_deflections
        return slice(first, first + self.order + 1)

    def _counted_by_edge(self, rows: Floats, vertices: Floats) -> Floats:
        """Count columns (n, ..., whole) in the edges' own sense, in place.

        An edge that runs against the triangle has its deflections in reverse, and its
        slope is along the inward normal: P_l(-s) is (-1)^l P_l(s).
        """
        senses = edge_senses(vertices)
        signs = (-1.0) ** np.arange(1, self.order + 2)
        for e in range(3):
            turned = np.flatnonzero(senses[:, e] < 0.0)
            deflections = slice(self._first(e), self._first(e) + self.edge_deflections)
            rows[turned, ..., deflections] = rows[turned, ..., deflections][..., ::-1]
            rows[turned, ..., self._slopes(e)] *= signs
        return rows


DUALS = {order: Dual(order=order) for order in (2, 3)}
