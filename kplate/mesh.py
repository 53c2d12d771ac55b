"""Triangles over a plate, and the side and curve of every boundary edge.

Numbers run over points, triangles and edges. Edge k of a triangle lies opposite its
vertex k. Boundary edges are listed with the plate on their left.
"""

import reprlib
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from kplate.arrays import Bools, Floats, Ints, read_only_floats, read_only_ints
from kplate.errors import InputError, MeshError

STRAIGHT_EDGE = -1
# How far off the plate a point may lie and still be located, as a share of the plate's
# size: round-off.
OUTSIDE = 1e-9


@dataclass(frozen=True, eq=False, kw_only=True)
class Mesh:
    """Triangles over a plate.

    Parameters
    ----------
    points : array_like, shape (n_points, 2)
        Vertex coordinates in m.
    triangles : array_like, shape (n_triangles, 3)
        Vertex numbers of each triangle, counter-clockwise.
    boundary_edges : array_like, shape (n_boundary, 2)
        Vertex numbers of each boundary edge, the plate on its left.
    boundary_sides : array_like, shape (n_boundary,)
        Number in `side_names` of the one side each boundary edge belongs to.
    side_names : tuple of str
        Names of the sides.
    boundary_circles : array_like, shape (n_boundary,), optional
        Number in `circles` of the circle whose chord an edge is, or -1 on a straight
        piece; all straight if left out.
    circles : array_like, shape (n_circles, 3), optional
        Centre x, centre y and radius in m.
    zones : array_like, shape (n_triangles,), optional
        Zone number of each triangle, in `zone_names`; all 0 if left out.
    zone_names : tuple of str
        Names of the zones; number 0 is the plate around them.
    seam_edges : array_like, shape (n_seam, 2), optional
        Vertex numbers of the edges that lie on seams.
    seam_numbers : array_like, shape (n_seam,), optional
        Number in `seam_names` of the seam each lies on.
    seam_names : tuple of str
        Names of the seams.
    mark_vertices : array_like, shape (n_marks,), optional
        Vertex of each mark.
    mark_names : tuple of str
        Names of the marks.

    Raises
    ------
    MeshError
        If an array has the wrong shape or holds a number out of range, there are no
        triangles, one is flat or clockwise, two overlap, a point belongs to none, or
        the boundary edges are not the edges used once, the plate on their left.
    """

    points: Floats
    triangles: Ints
    boundary_edges: Ints
    boundary_sides: Ints
    side_names: tuple[str, ...]
    boundary_circles: Ints = None  # type: ignore[assignment]  # filled when built
    circles: Floats = ()  # type: ignore[assignment]  # filled when built
    zones: Ints = None  # type: ignore[assignment]  # filled when built
    zone_names: tuple[str, ...] = ("plate",)
    seam_edges: Ints = ()  # type: ignore[assignment]  # filled when built
    seam_numbers: Ints = ()  # type: ignore[assignment]  # filled when built
    seam_names: tuple[str, ...] = ()
    mark_vertices: Ints = ()  # type: ignore[assignment]  # filled when built
    mark_names: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        """Freeze the arrays and check them."""
        for name in ("triangles", "boundary_edges", "boundary_sides"):
            object.__setattr__(self, name, read_only_ints(getattr(self, name)))
        for name in ("seam_numbers", "mark_vertices"):
            object.__setattr__(self, name, read_only_ints(getattr(self, name)))
        seams = np.reshape(np.asarray(self.seam_edges, dtype=np.int64), (-1, 2))
        object.__setattr__(self, "seam_edges", read_only_ints(seams))
        object.__setattr__(self, "points", read_only_floats(self.points))
        circles = np.reshape(np.asarray(self.circles, dtype=float), (-1, 3))
        object.__setattr__(self, "circles", read_only_floats(circles))
        defaults = {
            "boundary_circles": (STRAIGHT_EDGE, len(self.boundary_edges)),
            "zones": (0, len(self.triangles)),
        }
        for name, (value, length) in defaults.items():
            given = getattr(self, name)
            full = np.full(length, value) if given is None else given
            object.__setattr__(self, name, read_only_ints(full))
        if not len(self.triangles):
            raise MeshError("the mesh has no triangles.")
        self._check_arrays()
        self._check_triangles()
        self._check_boundary()
        self._check_inside()

    @cached_property
    def areas(self) -> Floats:
        """Area of each triangle in m2, positive, (n_triangles,)."""
        a, b, c = np.moveaxis(self.points[self.triangles], 1, 0)
        u, v = b - a, c - a
        areas: Floats = 0.5 * (u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0])
        return areas

    @property
    def area(self) -> float:
        """Area of all triangles in m2."""
        return float(self.areas.sum())

    @cached_property
    def _edges(self) -> tuple[Ints, Ints]:
        pairs = self.triangles[:, [[1, 2], [2, 0], [0, 1]]].reshape(-1, 2)
        pairs = np.sort(pairs, axis=1)
        key = pairs[:, 0] * len(self.points) + pairs[:, 1]
        unique, inverse = np.unique(key, return_inverse=True)
        edges = np.column_stack(np.divmod(unique, len(self.points)))
        return edges, inverse.reshape(-1, 3)

    @property
    def edges(self) -> Ints:
        """Vertices of each edge, the smaller first, in rising order, (n_edges, 2)."""
        return self._edges[0]

    @property
    def triangle_edges(self) -> Ints:
        """Edge number opposite each vertex of each triangle, (n_triangles, 3)."""
        return self._edges[1]

    @cached_property
    def boundary_lengths(self) -> Floats:
        """Length of each boundary edge (of the chord, on a circle) in m."""
        a, b = np.moveaxis(self.points[self.boundary_edges], 1, 0)
        lengths: Floats = np.hypot(*(b - a).T)
        return lengths

    @cached_property
    def boundary_stretch(self) -> Floats:
        """Length of the side behind each boundary edge over the edge's own."""
        stretch = np.ones(len(self.boundary_edges))
        curved = self.boundary_circles != STRAIGHT_EDGE
        radius = self.circles[self.boundary_circles[curved], 2]
        half = np.arcsin(np.minimum(0.5 * self.boundary_lengths[curved] / radius, 1.0))
        stretch[curved] = half / np.sin(half)
        return stretch

    def triangles_at(self, edges: Ints) -> Ints:
        """One triangle at each edge (k, 2) given by its vertices, (k,)."""
        owner = np.empty(len(self.edges), dtype=np.int64)
        owner[self.triangle_edges.ravel()] = np.repeat(
            np.arange(len(self.triangles)), 3
        )
        return owner[self.edge_numbers(edges)]

    def edge_numbers(self, edges: Ints) -> Ints:
        """Numbers in `edges` of edges (k, 2) given by their vertices, (k,)."""
        n = len(self.points)
        given = np.sort(edges, axis=1)
        key = self.edges[:, 0] * n + self.edges[:, 1]
        return np.searchsorted(key, given[:, 0] * n + given[:, 1])

    @cached_property
    def boundary_joints(self) -> Ints:
        """Arriving and leaving boundary edge at every boundary vertex, (n_boundary, 2).

        Row i is the vertex at which boundary edge i ends.
        """
        start = np.full(len(self.points), -1)
        start[self.boundary_edges[:, 0]] = np.arange(len(self.boundary_edges))
        arriving = np.arange(len(self.boundary_edges))
        return np.column_stack([arriving, start[self.boundary_edges[:, 1]]])

    def tangents(self, edges: Ints, at: Ints) -> Floats:
        """Unit tangents of boundary edges at one of their vertices.

        Parameters
        ----------
        edges : ndarray, shape (k,)
            Boundary edges.
        at : ndarray, shape (k,)
            The vertex of each at which its tangent is wanted.

        Returns
        -------
        ndarray, shape (k, 2)
            Tangent with the plate on the left: of the circle where the edge is a chord
            of one, of the edge itself elsewhere.
        """
        a, b = np.moveaxis(self.points[self.boundary_edges[edges]], 1, 0)
        tangent: Floats = (b - a) / np.hypot(*(b - a).T)[:, None]
        circle = self.boundary_circles[edges]
        curved = circle != STRAIGHT_EDGE
        arm = self.points[at[curved]] - self.circles[circle[curved], :2]
        turned = np.column_stack([-arm[:, 1], arm[:, 0]])
        turned /= np.hypot(*turned.T)[:, None]
        along = np.einsum("kc,kc->k", turned, tangent[curved])
        tangent[curved] = turned * np.sign(along)[:, None]
        return tangent

    def locate(self, points: ArrayLike) -> tuple[Ints, Floats]:
        """Find the triangle that holds each point.

        Parameters
        ----------
        points : array_like, shape (k, 2)
            Points in m; a point on a shared edge goes to one of its triangles, a point
            between a chord of a round rim and its circle to the triangle of the chord.

        Returns
        -------
        triangles : ndarray, shape (k,)
            Triangle numbers.
        barycentrics : ndarray, shape (k, 3)
            Barycentric coordinates in that triangle.

        Raises
        ------
        InputError
            If a point is not on the plate.
        """
        points = _as_points(points)
        triangles, barycentrics, on = self._find(points)
        for i in np.flatnonzero(~on):
            raise InputError(
                f"point ({points[i, 0]:.6g}, {points[i, 1]:.6g}) m is not on the "
                "plate; it lies outside the outline or in a hole."
            )
        return triangles, barycentrics

    def covers(self, points: ArrayLike) -> Bools:
        """Tell which points (k, 2) in m are on the plate, (k,).

        Beside a round hole or notch points beyond its rim are not, though a triangle
        may hold them.
        """
        points = _as_points(points)
        triangles, _, on = self._find(points)
        hollow = self._hollows[triangles]
        near = on & (hollow >= 0)
        circle = self.circles[hollow[near]]
        reach = np.hypot(*(points[near] - circle[:, :2]).T)
        on[near] = reach >= circle[:, 2] - OUTSIDE * np.sqrt(self.area)
        return on

    def barycentrics(self, triangles: Ints, points: Floats) -> Floats:
        """Barycentric coordinates of points in given triangles, (k, 3)."""
        a, b, c = np.moveaxis(self.points[self.triangles[triangles]], 1, 0)
        u, v, d = b - a, c - a, points - a
        double = 2.0 * self.areas[triangles]
        second = (d[:, 0] * v[:, 1] - d[:, 1] * v[:, 0]) / double
        third = (u[:, 0] * d[:, 1] - u[:, 1] * d[:, 0]) / double
        return np.column_stack([1.0 - second - third, second, third])

    @cached_property
    def _hollows(self) -> Ints:
        """Circle that bends into each triangle at an edge of it, or -1."""
        curved = self.boundary_circles != STRAIGHT_EDGE
        chords = self.points[self.boundary_edges[curved]]
        circles = self.boundary_circles[curved]
        inward = _left_of(chords, self.circles[circles, :2]) <= 0.0
        hollow = np.full(len(self.triangles), -1)
        at = self.triangles_at(self.boundary_edges[curved])
        hollow[at[inward]] = circles[inward]
        return hollow

    @cached_property
    def _bulges(self) -> tuple[Floats, Floats]:
        """Chords (m, 2, 2) with a circle of the plate beyond them, and it (m, 3)."""
        curved = self.boundary_circles != STRAIGHT_EDGE
        chords = self.points[self.boundary_edges[curved]]
        circles = self.circles[self.boundary_circles[curved]]
        round_rim = _left_of(chords, circles[:, :2]) > 0.0
        return chords[round_rim], circles[round_rim]

    @cached_property
    def _tree(self) -> Any:
        import shapely

        polygons: Any = shapely.polygons(self.points[self.triangles])
        return shapely.STRtree(polygons)

    def _find(self, points: Floats) -> tuple[Ints, Floats, Bools]:
        """Nearest triangle, barycentrics in it, and whether that is on the plate."""
        import shapely

        found, distance = self._tree.query_nearest(
            shapely.points(points), all_matches=False, return_distance=True
        )
        triangles = np.asarray(found[1], dtype=np.int64)
        on = distance <= OUTSIDE * np.sqrt(self.area)
        on[~on] = self._in_slivers(points[~on])
        return triangles, self.barycentrics(triangles, points), on

    def _in_slivers(self, points: Floats) -> Bools:
        """Which points (k, 2) lie between a chord of a round rim and the rim, (k,)."""
        import shapely

        chords, circles = self._bulges
        if not (len(chords) and len(points)):
            return np.zeros(len(points), dtype=bool)
        lines: Any = shapely.linestrings(chords)
        nearest = np.asarray(shapely.STRtree(lines).nearest(shapely.points(points)))
        x, y, radius = circles[nearest].T
        reach = np.hypot(points[:, 0] - x, points[:, 1] - y)
        inside: Bools = reach <= radius + OUTSIDE * np.sqrt(self.area)
        return inside & (_left_of(chords[nearest], points) <= 0.0)

    def _check_arrays(self) -> None:
        n, m = len(self.points), len(self.triangles)
        k = len(self.boundary_edges)
        for name, shape, least, most in (
            ("points", (n, 2), -np.inf, np.inf),
            ("triangles", (m, 3), 0, n),
            ("boundary_edges", (k, 2), 0, n),
            ("boundary_sides", (k,), 0, len(self.side_names)),
            ("boundary_circles", (k,), STRAIGHT_EDGE, len(self.circles)),
            ("zones", (m,), 0, np.inf),
        ):
            values = getattr(self, name)
            if values.shape != shape:
                raise MeshError(
                    f"{name} has shape {values.shape}; it must have {shape}."
                )
            bad = values[~((values >= least) & (values < most))]
            if bad.size:
                raise MeshError(
                    f"{name} holds {bad[0]}; it takes numbers from {least} to below "
                    f"{most}."
                )

    def _check_triangles(self) -> None:
        flat = np.flatnonzero(~(self.areas > 0.0))
        if flat.size:
            i = int(flat[0])
            x, y = self.points[self.triangles[i]].mean(axis=0)
            raise MeshError(
                f"triangle {i} near ({x:.6g}, {y:.6g}) m has area {self.areas[i]:.3g} "
                f"m2 ({flat.size} such of {len(self.triangles)}); list the vertices of "
                "each triangle counter-clockwise."
            )
        used = np.zeros(len(self.points), dtype=bool)
        used[self.triangles] = True
        if not used.all():
            i = int(np.flatnonzero(~used)[0])
            x, y = self.points[i]
            raise MeshError(
                f"point {i} at ({x:.6g}, {y:.6g}) m belongs to no triangle; drop it."
            )

    def _check_inside(self) -> None:
        """Check that zones, seams and marks are parts of the mesh."""
        n = len(self.points)
        edges = self.edges[:, 0] * n + self.edges[:, 1]
        given = np.sort(self.seam_edges, axis=1)
        if not np.isin(given[:, 0] * n + given[:, 1], edges).all():
            raise MeshError("a seam is not made of edges of triangles; mesh again.")
        if len(self.seam_numbers) != len(self.seam_edges):
            raise MeshError("each seam edge needs the number of its seam.")
        if (
            len(self.mark_vertices) != len(self.mark_names)
            or not ((self.mark_vertices >= 0) & (self.mark_vertices < n)).all()
        ):
            raise MeshError("a mark is not a vertex of the mesh; mesh again.")
        if (
            len(self.zones) != len(self.triangles)
            or not ((self.zones >= 0) & (self.zones < len(self.zone_names))).all()
        ):
            raise MeshError("a triangle belongs to no named zone.")

    def _check_boundary(self) -> None:
        n = len(self.points)
        outer = self._outer_edges() @ [n, 1]
        given, turned = (self.boundary_edges @ key for key in ([n, 1], [1, n]))
        wrong = np.flatnonzero(np.isin(turned, outer) & ~np.isin(given, outer))
        if wrong.size:
            raise MeshError(
                f"boundary edge {wrong[0]} runs with the plate on its right "
                f"({wrong.size} such of {len(given)}); turn it round."
            )
        if not np.array_equal(np.sort(outer), np.sort(given)):
            raise MeshError(
                f"{len(outer)} edges belong to one triangle only but {len(given)} "
                "edges lie on sides: the mesh is cracked or a side is not named."
            )
        ends = np.bincount(self.boundary_edges.ravel(), minlength=n)
        if ends.max(initial=0) > 2:
            x, y = self.points[int(ends.argmax())]
            raise MeshError(
                f"the plate is pinched to a point at ({x:.6g}, {y:.6g}) m; part it."
            )

    def _outer_edges(self) -> Ints:
        """Edges of one triangle only, the plate on their left, (k, 2)."""
        around = self.triangles[:, [[1, 2], [2, 0], [0, 1]]].reshape(-1, 2)
        rising = np.where(around[:, 0] < around[:, 1], 1, -1)
        number = self.triangle_edges.ravel()
        count, sense = np.bincount(number), np.bincount(number, weights=rising)
        overlap = np.flatnonzero((count > 2) | (np.abs(sense) > 1))
        if overlap.size:
            x, y = self.points[self.edges[overlap[0]]].mean(axis=0)
            raise MeshError(
                f"two triangles lie on the same side of their edge at ({x:.6g}, "
                f"{y:.6g}) m: they overlap; mesh again."
            )
        once = count == 1
        edges: Ints = self.edges[once]
        falling = sense[once] < 0
        edges[falling] = edges[falling, ::-1]
        return edges


def _left_of(edges: Floats, points: Floats) -> Floats:
    """Twice the area of edge (k, 2, 2) and point (k, 2), positive on the left, (k,)."""
    step, arm = edges[:, 1] - edges[:, 0], points - edges[:, 0]
    return step[:, 0] * arm[:, 1] - step[:, 1] * arm[:, 0]


def _as_points(points: ArrayLike) -> Floats:
    try:
        array = np.atleast_2d(np.asarray(points, dtype=float))
    except (TypeError, ValueError) as error:
        raise InputError(
            f"points are {reprlib.repr(points)}; give pairs (x, y) in m."
        ) from error
    if array.shape[1:] != (2,) or not np.isfinite(array).all():
        raise InputError(
            f"points have shape {array.shape} or are not finite; give pairs (x, y) "
            "in m."
        )
    return array
