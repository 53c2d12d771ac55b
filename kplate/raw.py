"""Moments and shears of C1 elements themselves, triangle by triangle.

Nothing is averaged: m = D kappa of the element's own second derivatives, q of its third
ones. A triangle is sampled on a lattice, each piece of it for itself, which is refined
until linear interpolation between the samples is within `TOLERANCE` of the range that
a field has outside the excluded discs. The pieces of the Hsieh-Clough-Tocher triangle
have constant third derivatives; its shears are those of the smoothed moments
(`kplate.recovery`).

    q_x = -(m_xx,x + m_xy,y),   q_y = -(m_xy,x + m_yy,y).
"""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from kplate import assembly
from kplate.arrays import Bools, Floats, Ints
from kplate.mesh import Mesh
from kplate.recovery import SmoothedMoments, smoothed_moments, von_mises
from kplate.samples import Lattice, Samples
from kplate.singular import Excluded, plate_corners
from kplate.solve.static import StaticState
from kplate.traces import Traces, solve_traces

TOLERANCE = 0.005
MOST_STEPS = 16  # of a lattice: where a field is steeper, it stays coarser
# A field less than this share of the largest of its kind is taken for nothing.
NOTHING = 1e-3
# Samples lie this share of a piece inside it, which settles on which side of a kink.
INSIDE = 1e-9
_BLOCK = 1024  # triangles
_COARSE = 4  # steps of a lattice on which the deflection alone is sampled
_BENT, _MOMENTS, _SHEARS = slice(0, 3), slice(3, 6), slice(6, 8)  # parts of all fields


@dataclass(frozen=True, eq=False, kw_only=True)
class RawMoments:
    """Moments and shears of a solved plate of C1 elements.

    Parameters
    ----------
    state : StaticState
        The solved plate.
    excluded : sequence of Excluded
        Discs in which fields need not be resolved.
    """

    state: StaticState
    excluded: Sequence[Excluded] = ()

    def moments_at(self, triangles: Ints, barycentrics: Floats) -> Floats:
        """Moments in N at one point in each triangle, (k, 3, c)."""
        return self._fields(triangles, barycentrics[:, None])[:, 0, _MOMENTS]

    def shears_at(self, triangles: Ints, barycentrics: Floats) -> Floats:
        """Transverse shears in N/m at one point in each triangle, (k, 2, c)."""
        return self._fields(triangles, barycentrics[:, None])[:, 0, _SHEARS]

    def moments_and_shears(
        self, triangles: Ints, barycentrics: Floats
    ) -> tuple[Floats, Floats]:
        """Both at points (q, 3) or (n, q, 3), (n, q, 3, c) and (n, q, 2, c)."""
        fields = self._fields(triangles, barycentrics)
        return fields[:, :, _MOMENTS], fields[:, :, _SHEARS]

    def corner_moments(self, edges: Ints, ends: Ints) -> Floats:
        """Moments at one end (0 or 1) of boundary edges (k,), (k, 3, c)."""
        return self.moments_at(*corner_places(self.state.mesh, edges, ends))

    @cached_property
    def deflections(self) -> tuple[Floats, Ints, Floats]:
        """Places (n, 2) over the plate, triangles that hold them, w (n, c), in m."""
        mesh, numbering = self.state.mesh, self.state.constraints.numbering
        found = []
        for start in range(0, len(mesh.triangles), _BLOCK):
            part = np.arange(start, min(start + _BLOCK, len(mesh.triangles)))
            arcs = numbering.arcs.among(part)
            at = arcs.bent(Lattice.of(_COARSE).barycentrics, len(part))
            vertices = mesh.points[mesh.triangles[part]]
            own = self.state.unknowns[numbering.table[part]]
            w = self.state.element.shape.fields(vertices, at, own, 1, arcs)[:, :, 0]
            holders = np.repeat(part, w.shape[1])
            places = (at @ vertices).reshape(-1, 2)
            found.append((places, holders, w.reshape(len(holders), -1)))
        parts = [np.concatenate(own) for own in zip(*found, strict=True)]
        return parts[0], parts[1].astype(np.int64), parts[2]

    @cached_property
    def samples(self) -> Samples:
        """Fields on lattices that are fine enough."""
        levels = self._levels()
        parts = [self._emit(levels == steps, int(steps)) for steps in np.unique(levels)]
        offsets = np.cumsum([0, *(len(part.points) for part in parts)])
        return Samples(
            points=np.concatenate([part.points for part in parts]),
            triangles=np.concatenate(
                [p.triangles + o for p, o in zip(parts, offsets, strict=False)]
            ),
            owners=np.concatenate([part.owners for part in parts]),
            rim=np.concatenate(
                [p.rim + o for p, o in zip(parts, offsets, strict=False)]
            ),
            rim_owners=np.concatenate([part.rim_owners for part in parts]),
            holders=np.concatenate([part.holders for part in parts]),
            sections=np.concatenate([part.sections for part in parts]),
            bent=np.concatenate([part.bent for part in parts]),
            moments=np.concatenate([part.moments for part in parts]),
            shears=np.concatenate([part.shears for part in parts]),
        )

    @cached_property
    def traces(self) -> Traces:
        """What the supports bring along their lines."""
        points = self.state.mesh.points
        places = [c.place for c in plate_corners(self.state.plate) if c.carries_force]
        vertices = [int(np.hypot(*(points - p).T).argmin()) for p in places]
        return solve_traces(self.state, np.array(vertices, dtype=np.int64))

    @property
    def _pieces(self) -> Floats:
        return self.state.element.pieces

    @cached_property
    def _smoothed(self) -> SmoothedMoments:
        return smoothed_moments(self.state)

    def _levels(self) -> Ints:
        """Steps of the lattice on each piece of each triangle, (n_triangles, s)."""
        mesh, s = self.state.mesh, len(self._pieces)
        levels = np.ones((len(mesh.triangles), s), dtype=np.int64)
        ranges = self._ranges()
        open_pieces = np.broadcast_to(~self._within_discs()[:, None], levels.shape)
        steps = 1
        while open_pieces.any() and steps < MOST_STEPS:
            middles, first, second = Lattice.of(steps).halved
            coarse = np.zeros_like(open_pieces)
            for k in range(s):
                own = np.flatnonzero(open_pieces[:, k])
                for part, values in self._lattice_fields(own, k, 2 * steps):
                    values = _with_stress(values)
                    bow = values[:, middles] - 0.5 * (
                        values[:, first] + values[:, second]
                    )
                    off = np.abs(bow).max(axis=1) > TOLERANCE * ranges
                    coarse[part, k] = off.any(axis=(1, 2))
            steps *= 2
            levels[coarse] = steps
            open_pieces = coarse
        return levels

    def _ranges(self) -> Floats:
        """Range of each field over the plate outside the discs, (9, c)."""
        mesh = self.state.mesh
        every = np.flatnonzero(~self._within_discs())
        if not every.size:
            every = np.arange(len(mesh.triangles))
        low: Floats | float = np.inf
        high: Floats | float = -np.inf
        for k in range(len(self._pieces)):
            for part, values in self._lattice_fields(every, k, 2):
                points = self._places(part, k, Lattice.of(2))
                values = _with_stress(values)
                judged = self._judged(points)[..., None, None]
                if not judged.any():
                    continue
                low = np.minimum(low, np.where(judged, values, np.inf).min(axis=(0, 1)))
                high = np.maximum(
                    high, np.where(judged, values, -np.inf).max(axis=(0, 1))
                )
        if not np.ndim(low):  # the discs cover the plate
            return np.full((9, 1), np.finfo(float).tiny)
        largest = np.maximum(np.abs(low), np.abs(high))
        size = float(np.ptp(mesh.points, axis=0).max())
        slope, moment = largest[1:3].max(axis=0), largest[_MOMENTS].max(axis=0)
        shear = np.maximum(largest[_SHEARS].max(axis=0), moment / size)
        kinds = [largest[0], *[slope] * 2, *[moment] * 3, *[shear] * 2, moment]
        ranges = np.maximum(high - low, NOTHING * np.stack(kinds))
        return np.maximum(ranges, np.finfo(float).tiny)

    def _judged(self, points: Floats) -> Bools:
        """Which points (..., 2) lie outside the discs."""
        out = np.ones(points.shape[:-1], dtype=bool)
        for disc in self.excluded:
            arm = points - disc.place
            out &= np.hypot(arm[..., 0], arm[..., 1]) >= disc.radius
        return out

    def _within_discs(self) -> Bools:
        """Which triangles lie in excluded discs wholly, (n_triangles,)."""
        mesh = self.state.mesh
        within = np.zeros(len(mesh.triangles), dtype=bool)
        for disc in self.excluded:
            near = np.hypot(*(mesh.points - disc.place).T) < disc.radius
            within |= near[mesh.triangles].all(axis=1)
        return within

    def _emit(self, chosen: Bools, steps: int) -> Samples:
        """Samples of pieces (n_triangles, s) that have so many steps."""
        mesh, lattice = self.state.mesh, Lattice.of(steps)
        size, cases = len(lattice.barycentrics), len(self.state.cases)
        first = np.full(chosen.shape, -1)
        first[chosen] = size * np.arange(np.count_nonzero(chosen))
        total = size * np.count_nonzero(chosen)
        points, values = np.empty((total, 2)), np.empty((total, 8, cases))
        owners, triangles = [], []
        for k in range(len(self._pieces)):
            own = np.flatnonzero(chosen[:, k])
            for part, found in self._lattice_fields(own, k, steps):
                at = first[part, k][:, None] + np.arange(size)
                values[at] = found
                points[at] = self._places(part, k, lattice)
            small = first[own, k][:, None, None] + lattice.triangles
            triangles.append(small.reshape(-1, 3))
            owners.append(np.repeat(own, len(lattice.triangles)))
        rim, rim_owners = self._rim(first, lattice)
        every = np.zeros(total, dtype=np.int64)
        which, _ = np.nonzero(chosen)
        every[first[chosen][:, None] + np.arange(size)] = which[:, None]
        return Samples(
            points=points,
            triangles=np.concatenate(triangles),
            owners=np.concatenate(owners),
            rim=rim,
            rim_owners=rim_owners,
            holders=every,
            sections=mesh.zones[every],
            bent=values[:, _BENT],
            moments=values[:, _MOMENTS],
            shears=values[:, _SHEARS],
        )

    def _rim(self, first: Ints, lattice: Lattice) -> tuple[Ints, Ints]:
        """Pieces of the boundary on lattices whose first points are `first`."""
        mesh = self.state.mesh
        triangles = mesh.triangles_at(mesh.boundary_edges)
        corners = mesh.triangles[triangles]
        on = (corners[:, :, None] == mesh.boundary_edges[:, None]).any(axis=2)
        opposite = np.argmin(on, axis=1)
        # In a triangle of several pieces, piece k has edge k as its last.
        whole = len(self._pieces) == 1
        piece = np.zeros_like(opposite) if whole else opposite
        edge = opposite if whole else np.full_like(opposite, 2)
        start = first[triangles, piece]
        kept = np.flatnonzero(start >= 0)
        along = start[kept][:, None] + lattice.edges[edge[kept]]
        pairs = np.stack([along[:, :-1], along[:, 1:]], axis=-1)
        return pairs.reshape(-1, 2), np.repeat(kept, lattice.steps)

    def _places(self, triangles: Ints, k: int, lattice: Lattice) -> Floats:
        """Points (n, q, 2) of a lattice on piece k of triangles."""
        mesh = self.state.mesh
        at = self._bent(triangles, k, lattice.barycentrics)
        return at @ mesh.points[mesh.triangles[triangles]]

    def _bent(self, triangles: Ints, k: int, local: Floats) -> Floats:
        """Where points (q, 3) of piece k lie in triangles, some of them round."""
        arcs = self.state.constraints.numbering.arcs.among(triangles)
        if len(self._pieces) > 1:
            arcs = arcs.chosen(np.flatnonzero(arcs.edges == k))
        cones = self.state.element.shape.cones(arcs)
        return cones.bent(local, len(triangles)) @ self._pieces[k]

    def _lattice_fields(
        self, triangles: Ints, k: int, steps: int
    ) -> Iterator[tuple[Ints, Floats]]:
        """Fields (n, q, 8, c) on the lattice of piece k, block by block."""
        local = Lattice.of(steps).barycentrics
        if len(self._pieces) > 1:
            local = local + INSIDE * (1.0 / 3.0 - local)
        for start in range(0, len(triangles), _BLOCK):
            part = triangles[start : start + _BLOCK]
            yield part, self._fields(part, self._bent(part, k, local))

    def _fields(self, triangles: Ints, barycentrics: Floats) -> Floats:
        """Deflection, slopes, moments and shears at points of triangles.

        Barycentrics (q, 3) or (n, q, 3); returns (n, q, 8, c).
        """
        state = self.state
        mesh, element = state.mesh, state.element
        vertices = mesh.points[mesh.triangles[triangles]]
        own = state.unknowns[state.constraints.numbering.table[triangles]]
        bent = assembly.without_rigid_motion(own, vertices, state.constraints.numbering)
        rigidity = state.plate.rigidities[mesh.zones[triangles]][:, None]
        shape = element.shape
        arcs = state.constraints.numbering.arcs.among(triangles)
        moments = rigidity @ shape.fields(vertices, barycentrics, bent, 2, arcs)
        if element.curvature_degree > 1:
            third = shape.fields(vertices, barycentrics, bent, 3, arcs)
            by_x, by_y = rigidity @ third[:, :, :3], rigidity @ third[:, :, 3:]
            shears = -np.stack(
                [by_x[:, :, 0] + by_y[:, :, 2], by_x[:, :, 2] + by_y[:, :, 1]], axis=2
            )
        else:
            nodes = self._smoothed.nodes.triangles[triangles]
            at = np.broadcast_to(barycentrics, (*moments.shape[:2], 3))
            shears = np.einsum("nqv,nvac->nqac", at, self._smoothed.shears[nodes])
        jets = shape.fields(vertices, barycentrics, own, 1, arcs)
        return np.concatenate([jets, moments, shears], axis=2)


def corner_places(mesh: Mesh, edges: Ints, ends: Ints) -> tuple[Ints, Floats]:
    """Triangles at boundary edges (k,), and one end (0 or 1) in each, (k, 3)."""
    own = mesh.boundary_edges[edges]
    triangles = mesh.triangles_at(own)
    vertex = own[np.arange(len(own)), ends]
    barycentrics = (mesh.triangles[triangles] == vertex[:, None]).astype(float)
    towards = mesh.barycentrics(triangles, mesh.points[own].mean(axis=1))
    return triangles, barycentrics + INSIDE * (towards - barycentrics)


def _with_stress(values: Floats) -> Floats:
    """Add what von Mises's stress is proportional to, (n, q, 9, c)."""
    moments = np.moveaxis(values[:, :, _MOMENTS], 2, -1)
    return np.concatenate([values, von_mises(moments)[:, :, None]], axis=2)
