"""Elements whose deflection is one Bernstein polynomial on each piece of a triangle.

The element says which pieces there are and how its unknowns give the ordinates on each;
everything else follows: values and slopes, curvatures, and the integrals of stiffness,
loads, mass and geometric stiffness.

Axes: n triangles, s pieces, k ordinates, d unknowns, q points.
"""

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from kplate.arrays import Bools, Floats, Ints
from kplate.elements import bernstein
from kplate.elements.arcs import Arcs
from kplate.elements.lifts import lift
from kplate.elements.triangle import (
    Geometry,
    area,
    barycentric_gradients,
    edge_normals,
)
from kplate.quadrature import Rule, composite, gauss, triangle_rule


@dataclass(frozen=True, eq=False, kw_only=True)
class Piecewise:
    """A deflection of one polynomial a piece.

    Parameters
    ----------
    degree : int
        Of the polynomials.
    pieces : ndarray, shape (s, 3, 3)
        Barycentric vertices of the pieces in the triangle.
    ordinates : callable
        Vertices (n, 3, 2) to the matrices (n, s, k, d) that turn unknowns into the
        ordinates of each piece.
    follows : bool
        Whether it can follow arcs: its last three unknowns are the slopes in the middle
        of the edges. Of several pieces, each has one edge of the triangle, between its
        first two vertices.

    Where a function takes `arcs`, they are the round edges of the triangles at hand,
    whose barycentrics then reach beyond the straight triangles (`Arcs.bent`).
    """

    degree: int
    pieces: Floats
    ordinates: Callable[[Floats], Floats]
    follows: bool = False

    @cached_property
    def rule(self) -> Rule:
        """Quadrature of the stiffness, exact where the rigidity is constant."""
        return composite(self.pieces, triangle_rule(2 * self.degree - 4))

    @cached_property
    def load_rule(self) -> Rule:
        """Quadrature of loads and masses: exact for two deflections multiplied."""
        return composite(self.pieces, triangle_rule(2 * self.degree))

    def evaluate(
        self, vertices: Floats, barycentrics: Floats, arcs: Arcs | None = None
    ) -> Floats:
        """Deflection and slopes at points (q, 3) or (n, q, 3) of triangles (n, 3, 2).

        Returns (n, q, 3, d): the rows that turn unknowns into w, dw/dx, dw/dy.
        """
        C = self._net(vertices, arcs)
        shape = np.broadcast_shapes(barycentrics.shape, (len(C), 1, 1))
        result = np.zeros((*shape[:-1], 3, C.shape[-1]))
        for k, local, own in self._parts(barycentrics, len(C), arcs):
            g = self._gradients(vertices, k)
            by = bernstein.gradients(self.degree, local)
            rows = np.empty((*shape[:-1], 3, C.shape[2]))
            rows[:, :, 0] = bernstein.values(self.degree, local)
            rows[:, :, 1:] = g.swapaxes(-1, -2)[:, None] @ by
            result += (rows * own[..., None, None]) @ C[:, None, k]
        self._take_off(result, C, barycentrics, arcs, 1)
        return result

    def curvature(
        self, vertices: Floats, barycentrics: Floats, arcs: Arcs | None = None
    ) -> Floats:
        """Curvatures ``w,xx, w,yy, 2 w,xy`` at points of triangles (n, 3, 2).

        Barycentrics (q, 3), the same in every triangle, or (n, q, 3); returns
        (n, q, 3, d).
        """
        C = self._net(vertices, arcs)
        shape = np.broadcast_shapes(barycentrics.shape, (len(C), 1, 1))
        result = np.zeros((*shape[:-1], 3, C.shape[-1]))
        for k, local, own in self._parts(barycentrics, len(C), arcs):
            bends = curvature_of_pairs(self._gradients(vertices, k))
            by = bernstein.hessians(self.degree, local) * own[..., None, None]
            result += (bends[:, None] @ by) @ C[:, None, k]
        self._take_off(result, C, barycentrics, arcs, 2)
        return result

    def third_derivatives(self, vertices: Floats, barycentrics: Floats) -> Floats:
        """Derivatives of the curvatures by x and y at points of triangles (n, 3, 2).

        Barycentrics (q, 3) or (n, q, 3); returns (n, q, 2, 3, d): by x, then by y, of
        ``w,xx, w,yy, 2 w,xy``.
        """
        C = self.ordinates(vertices)
        shape = np.broadcast_shapes(barycentrics.shape, (len(C), 1, 1))
        result = np.zeros((*shape[:-1], 2, 3, C.shape[-1]))
        for k, local, own in self._parts(barycentrics):
            g = self._gradients(vertices, k)
            bends = curvature_of_pairs(g)
            by = bernstein.hessian_gradients(self.degree, local)
            by = by * own[..., None, None, None]  # (n, q, 3, 6, k)
            bent = bends[:, None, None] @ by
            rows = np.einsum("nvc,...nqvak->nqcak", g, _whole(bent, shape))
            result += rows @ C[:, None, None, k]
        return result

    def fields(
        self,
        vertices: Floats,
        barycentrics: Floats,
        unknowns: Floats,
        order: int,
        arcs: Arcs | None = None,
    ) -> Floats:
        """What unknowns (n, d, c) make at points of triangles, without their rows.

        Barycentrics (q, 3) or (n, q, 3). Order 1 returns w and its slopes (n, q, 3, c);
        2 the curvatures (n, q, 3, c); 3 their derivatives by x, then by y,
        (n, q, 6, c), of the polynomials alone.
        """
        C = self._net(vertices, arcs)
        n, c = len(C), unknowns.shape[-1]
        q = barycentrics.shape[-2]
        result = np.zeros((n, q, 6 if order == 3 else 3, c))
        for k, local, own in self._parts(barycentrics, len(C), arcs):
            net = C[:, k] @ unknowns  # ordinates, (n, k, c)
            g = self._gradients(vertices, k)
            if order == 1:
                by = bernstein.gradients(self.degree, local)
                value = bernstein.values(self.degree, local)[..., None, :]
                turn = np.zeros((n, 3, 4))
                turn[:, 0, 0], turn[:, 1:, 1:] = 1.0, g.swapaxes(1, 2)
                rows = np.concatenate([value, by], axis=-2)
            elif order == 2:
                turn = curvature_of_pairs(g)
                rows = bernstein.hessians(self.degree, local)
            else:
                bends = curvature_of_pairs(g)
                turn = np.einsum("nvc,nax->ncavx", g, bends).reshape(n, 6, 18)
                rows = bernstein.hessian_gradients(self.degree, local)
                rows = rows.reshape(*rows.shape[:-3], 18, rows.shape[-1])
            rows = rows * own[..., None, None]
            flat = rows.reshape(*rows.shape[:-3], -1, rows.shape[-1])
            found = (flat @ net).reshape(n, q, rows.shape[-2], c)
            result += turn[:, None] @ found
        if order < 3 and arcs is not None and arcs.held.any():
            rows_held = arcs.rows[arcs.held]
            taken = self._lifted(C, barycentrics, arcs, order)
            result[rows_held] -= taken @ unknowns[rows_held][:, None]
        return result

    def curvature_load(
        self, vertices: Floats, barycentrics: Floats, pulls: Floats
    ) -> Floats:
        """Forces on the unknowns of pulls (n, q, 3) on the curvature at points (q, 3).

        Returns (n, d), the sum over the points of pull times curvature.
        """
        C = self.ordinates(vertices)
        total = np.zeros((len(C), C.shape[-1]))
        for k, local, own in self._parts(barycentrics):
            pairs = pulls @ curvature_of_pairs(self._gradients(vertices, k))
            by = bernstein.hessians(self.degree, local) * own[:, None, None]
            net = pairs.reshape(len(C), -1) @ by.reshape(-1, by.shape[-1])
            total += np.einsum("nk,nkd->nd", net, C[:, k])
        return total

    def round_stiffness(self, arcs: Arcs, rigidity: Floats) -> Floats:
        """Stiffness (m, d, d) of true triangles, for a rigidity (m, 3, 3) in N m."""
        points, weights = self.round_rule(arcs)
        alone = arcs.alone()
        B = self.curvature(arcs.vertices, points, alone)
        m, q, _, d = B.shape
        weighted = (rigidity[:, None] @ B) * weights[..., None, None]
        return B.reshape(m, 3 * q, d).swapaxes(1, 2) @ weighted.reshape(m, 3 * q, d)

    def stiffness(self, geometry: Geometry, rigidity: Floats) -> Floats:
        """Element stiffness matrices.

        `geometry` has the rule `rule`; rigidity (n, q, 3, 3) in N m; returns (n, d, d).
        A rigidity that is one array broadcast over the points takes the closed form.
        """
        vertices = geometry.vertices
        if rigidity.strides[1] == 0:
            return self._uniform_stiffness(vertices, rigidity[:, 0])
        B = self.curvature(vertices, geometry.rule.points)
        n, q, _, d = B.shape
        weights = area(vertices)[:, None] * geometry.rule.weights
        weighted = (rigidity @ B) * weights[..., None, None]
        return B.reshape(n, 3 * q, d).swapaxes(1, 2) @ weighted.reshape(n, 3 * q, d)

    def _uniform_stiffness(self, vertices: Floats, rigidity: Floats) -> Floats:
        """Stiffness for a rigidity (n, 3, 3) through the table of products."""
        C, n = self.ordinates(vertices), len(vertices)
        count = C.shape[2]
        areas = area(vertices)
        total = np.zeros((n, C.shape[-1], C.shape[-1]))
        for k, share in enumerate(self._shares):
            T = curvature_of_pairs(self._gradients(vertices, k))
            S = T.swapaxes(1, 2) @ rigidity @ T * (share * areas)[:, None, None]
            own = S.reshape(n, 36) @ bernstein.bendings(self.degree)
            own = own.reshape(n, count, count)
            total += C[:, k].swapaxes(1, 2) @ own @ C[:, k]
        return total

    def load(self, geometry: Geometry, pressure: Floats) -> Floats:
        """Consistent loads of a pressure.

        `geometry` has the rule `load_rule`; pressure (n, q) in Pa at its points,
        positive up; returns (n, d): what works on each unknown.
        """
        rule, C = geometry.rule, self.ordinates(geometry.vertices)
        forces = pressure * area(geometry.vertices)[:, None] * rule.weights
        total = np.zeros((len(C), C.shape[-1]))
        for k, local, own in self._parts(rule.points):
            shape = bernstein.values(self.degree, local) * own[:, None]
            total += np.einsum("nk,nkd->nd", forces @ shape, C[:, k], optimize=True)
        return total

    def arc_loads(self, arcs: Arcs, force: Floats, moment: Floats) -> Floats:
        """Consistent loads of a line force in N/m and an edge moment in N along arcs.

        The moment works on the slope along the outward normal; both (m,), returns
        (m, d).
        """
        shares, weights = gauss(2 * self.degree)
        alone = arcs.alone()
        points = arcs.barycentrics(arcs.at(shares)[0])
        rows = self.evaluate(arcs.vertices, points, alone)
        _, normal = arcs.frames(shares)
        work = force[:, None, None] * rows[:, :, 0] + moment[:, None, None] * (
            np.einsum("mqc,mqcd->mqd", normal, rows[:, :, 1:])
        )
        return np.einsum("m,q,mqd->md", arcs.lengths, weights, work)

    def mass(self, geometry: Geometry, density: Floats) -> Floats:
        """Consistent masses of w alone; rotary inertia is left out.

        `geometry` has the rule `load_rule`; density (n, q) in kg/m2 at its points;
        returns (n, d, d).
        """
        rule, C = geometry.rule, self.ordinates(geometry.vertices)
        weighted = density * area(geometry.vertices)[:, None] * rule.weights
        total = np.zeros((len(C), C.shape[-1], C.shape[-1]))
        for k, local, own in self._parts(rule.points):
            shape = bernstein.values(self.degree, local) * own[:, None]
            total += _congruent(weighted, shape[:, :, None] * shape[:, None], C[:, k])
        return total

    def geometric(self, geometry: Geometry, forces: Floats) -> Floats:
        """Geometric stiffness of in-plane forces: the work of their pull on the slopes.

        `geometry` has the rule `load_rule`; forces n_xx, n_yy, n_xy (n, q, 3) in N/m at
        its points, tension positive; returns (n, d, d), the integral of
        ``n_xx w,x v,x + n_yy w,y v,y + n_xy (w,x v,y + w,y v,x)``.
        """
        rule, vertices = geometry.rule, geometry.vertices
        C = self.ordinates(vertices)
        weights = area(vertices)[:, None] * rule.weights
        tensor = forces[..., [0, 2, 2, 1]].reshape(*forces.shape[:2], 2, 2)
        total = np.zeros((len(C), C.shape[-1], C.shape[-1]))
        for k, local, own in self._parts(rule.points):
            g = self._gradients(vertices, k)[:, None]
            pulls = g @ tensor @ g.swapaxes(-1, -2) * weights[..., None, None]
            by = bernstein.gradients(self.degree, local) * own[:, None, None]
            products = by[:, :, None, :, None] * by[:, None, :, None, :]
            total += _congruent(
                pulls.reshape(len(C), -1),
                products.reshape(-1, *products.shape[-2:]),
                C[:, k],
            )
        return total

    def _net(self, vertices: Floats, arcs: Arcs | None) -> Floats:
        """Ordinates of the unknowns, (n, s, k, d)."""
        C = self.ordinates(vertices)
        if arcs is not None and len(arcs):
            assert self.follows
            C[arcs.rows] = self._with_moved_slopes(C[arcs.rows], arcs)
        return C

    def _with_moved_slopes(self, C: Floats, arcs: Arcs) -> Floats:
        """The same (m, s, k, d), the slopes on round edges those of the arcs' middles.

        There the normal is that of the chord.
        """
        cones, number = self.cones(arcs), np.arange(len(arcs))
        middle, _, _ = cones.at(np.array([0.5]))
        by = bernstein.gradients(self.degree, cones.barycentrics(middle)[:, 0])
        normal = edge_normals(arcs.vertices)[number, arcs.edges]
        across = np.einsum("mvk,mvc,mc->mk", by, cones.gradients, normal)
        slope = np.einsum("mk,mkd->md", across, C[number, self._holders(arcs)])
        own = C.shape[-1] - 3 + arcs.edges
        share = 1.0 / slope[number, own]
        slope[number, own] = 0.0
        column = C[number, :, :, own] * share[:, None, None]  # (m, s, k)
        moved: Floats = C - column[..., None] * slope[:, None, None]
        moved[number, :, :, own] = column
        return moved

    def cones(self, arcs: Arcs) -> Arcs:
        """The pieces with a round edge, as triangles of their own."""
        if len(self.pieces) == 1:
            return arcs
        last = np.full(len(arcs), 2)
        vertices = self.pieces[arcs.edges] @ arcs.vertices
        return replace(arcs, vertices=vertices, edges=last)

    def round_rule(self, arcs: Arcs) -> tuple[Floats, Floats]:
        """Quadrature of true triangles: barycentrics (m, q, 3), weights in m2."""
        points, weights = self.cones(arcs).rule
        if len(self.pieces) == 1:
            return points, weights
        rule = triangle_rule(2 * self.degree)
        found = [(points @ self.pieces[arcs.edges], weights)]
        for step in (1, 2):
            other = (arcs.edges + step) % 3
            size = self._shares[other] * area(arcs.vertices)
            found.append(
                (rule.points @ self.pieces[other], np.outer(size, rule.weights))
            )
        return (
            np.concatenate([own for own, _ in found], axis=1),
            np.concatenate([own for _, own in found], axis=1),
        )

    def _holders(self, arcs: Arcs) -> Ints:
        """Number of the piece with the round edge, (m,)."""
        return arcs.edges if len(self.pieces) > 1 else np.zeros(len(arcs), dtype=int)

    def _lifted(
        self, C: Floats, barycentrics: Floats, arcs: Arcs, order: int
    ) -> Floats:
        """Rows of what is taken off in held triangles, so that w vanishes on arcs."""
        held = arcs.chosen(arcs.held)
        at = barycentrics if barycentrics.ndim == 2 else barycentrics[held.rows]
        at = np.broadcast_to(at, (len(held), *at.shape[-2:]))
        own = C[held.rows, self._holders(held)]
        ends = held.order[:, 1:]
        if len(self.pieces) == 1:
            return lift(held, self.degree, own, at, order, ends)
        at = at @ np.linalg.inv(self.pieces)[held.edges]
        rows = lift(self.cones(held), self.degree, own, at, order, ends)
        beside = at[..., :2].min(axis=-1) < 0.0  # in one of the other pieces
        return np.where(beside[..., None, None], 0.0, rows)

    def _take_off(
        self,
        result: Floats,
        C: Floats,
        barycentrics: Floats,
        arcs: Arcs | None,
        order: int,
    ) -> None:
        if arcs is not None and arcs.held.any():
            result[arcs.rows[arcs.held]] -= self._lifted(C, barycentrics, arcs, order)

    @cached_property
    def _shares(self) -> Floats:
        """Share of the area that each piece has."""
        shares: Floats = np.abs(np.linalg.det(self.pieces))
        return shares

    def _gradients(self, vertices: Floats, k: int) -> Floats:
        """Gradients (n, 3, 2) of the barycentrics of piece k."""
        if len(self.pieces) == 1:
            return barycentric_gradients(vertices)
        return barycentric_gradients(self.pieces[k] @ vertices)

    def _parts(
        self, barycentrics: Floats, count: int = 1, arcs: Arcs | None = None
    ) -> Iterator[tuple[int, Floats, Bools]]:
        """Each piece, the points' barycentrics in it, and which of them it holds.

        Beside a round edge a piece reaches as far as its cone does.
        """
        if len(self.pieces) == 1:
            yield 0, barycentrics, np.ones(barycentrics.shape[:-1], dtype=bool)
            return
        if arcs is not None and len(arcs) and barycentrics.ndim == 2:
            barycentrics = np.broadcast_to(barycentrics, (count, *barycentrics.shape))
        local = [barycentrics @ np.linalg.inv(piece) for piece in self.pieces]
        depth = np.stack([own.min(axis=-1) for own in local])
        if arcs is not None:
            for k, own in enumerate(local):
                rows = arcs.rows[arcs.edges == k]
                depth[k, rows] = own[rows, ..., :2].min(axis=-1)
        holder = np.argmax(depth, axis=0)
        for k, own in enumerate(local):
            held = holder == k
            if held.any():
                yield k, own, held


def curvature_of_pairs(gradients: Floats) -> Floats:
    """Turn derivatives by `bernstein.PAIRS` into ``w,xx, w,yy, 2 w,xy``, (n, 3, 6)."""
    T = np.empty((len(gradients), 3, len(bernstein.PAIRS)))
    for pair, (a, b) in enumerate(bernstein.PAIRS):
        (ax, ay), (bx, by) = gradients[:, a].T, gradients[:, b].T
        twice = 1.0 if a == b else 2.0  # each mixed pair stands for two
        T[:, 0, pair], T[:, 1, pair] = twice * ax * bx, twice * ay * by
        T[:, 2, pair] = twice * (ax * by + ay * bx)
    return T


def _whole(rows: Floats, shape: tuple[int, ...]) -> Floats:
    """Rows (n or 1, q, ...) for every triangle and point of a shape (n, q, 3)."""
    return np.broadcast_to(rows, (*shape[:2], *rows.shape[2:]))


def _congruent(weights: Floats, products: Floats, C: Floats) -> Floats:
    """``C^T (sum over q of weights (n, q) times products (q, k, k)) C``."""
    q, count, _ = products.shape
    own = (weights @ products.reshape(q, -1)).reshape(-1, count, count)
    return C.swapaxes(1, 2) @ own @ C
