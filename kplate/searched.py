"""Where the moments of a solved plate may peak.

Moments are looked at on samples over the plate and on the rims of the discs left out;
around the largest of a C1 element on many more.
"""

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from kplate.arrays import Floats, Ints
from kplate.peaks import Candidates, measures
from kplate.raw import RawMoments
from kplate.rims import outside, rim
from kplate.samples import Lattice
from kplate.solved import Solved

# Around peaks: triangles with samples so close to the largest, at most so many of them,
# are sampled on a lattice of so many steps.
CLOSE, MOST, FINE = 0.02, 64, 16


@dataclass(frozen=True, eq=False, kw_only=True)
class Searched(Solved):
    """A solved plate, and the places at which its moments may peak.

    Parameters
    ----------
    state, excluded_radius, dual
        As in `Solved`.
    """

    def _candidates(self, index: int) -> Candidates:
        """Where moments may peak in a case; those of the last case are kept."""
        if index not in self._last_candidates:
            self._last_candidates.clear()
            self._last_candidates[index] = self._found_candidates(index)
        return self._last_candidates[index]

    @cached_property
    def _last_candidates(self) -> dict[int, Candidates]:
        return {}

    def _found_candidates(self, index: int) -> Candidates:
        """Places at which moments may peak, with moments, shears and thickness there.

        They are taken as linear between the samples and what is asked of them is
        convex, so that it peaks at a sample; where a disc is left out, on its rim.
        """
        case, samples = self.cases[index], self.samples
        moments, shears = samples.moments[:, :, index], samples.shears[:, :, index]
        thickness = self.plate.thicknesses[samples.sections]
        found = Candidates(samples.points, moments, shears, thickness, samples.holders)
        discs = [e for e in self.excluded if e.case in ("", case)]
        if not discs:
            return found
        kept = outside(samples.points, discs, 1.0)
        rims = np.concatenate([rim(self.mesh, disc) for disc in discs])
        rims = rims[outside(rims, discs, 1.0 - 1e-9)]
        if not (kept.any() or len(rims)):
            nothing = np.empty((0, 3))
            none = np.empty(0, dtype=np.int64)
            return Candidates(
                nothing[:, :2], nothing, nothing[:, :2], nothing[:, 0], none
            )
        both = zip(found, self._at(rims, index), strict=True)
        return Candidates(*(np.concatenate([a[kept], b]) for a, b in both))

    def _sharpened(self, quantity: str, at: Candidates, index: int) -> Candidates:
        """Candidates with many more on the triangles where the largest of them lie.

        The samples of a C1 element are 0.5 % of a field's range apart from it; around a
        peak that is too coarse for a narrow band.
        """
        if not (self.state.element.conforming and len(at.places)):
            return at
        sizes, _ = measures(quantity, at, at.moments, at.shears)
        order = np.argsort(-sizes, kind="stable")
        close = order[sizes[order] >= (1.0 - CLOSE) * sizes[order[0]]]
        triangles = np.unique(at.triangles[close][:MOST])
        corners = self.mesh.points[self.mesh.triangles[triangles]]
        arcs = self.state.constraints.numbering.arcs.among(triangles)
        own = arcs.bent(Lattice.of(FINE).barycentrics, len(triangles))
        points = own @ corners
        owners = np.repeat(triangles, points.shape[1])
        points = points.reshape(-1, 2)
        case = self.cases[index]
        discs = [e for e in self.excluded if e.case in ("", case)]
        kept = outside(points, discs, 1.0)
        if not kept.any():
            return at
        moments, shears = self.fields_on(triangles, own)
        finer = Candidates(
            points,
            moments[..., index].reshape(-1, 3),
            shears[..., index].reshape(-1, 2),
            self.plate.thicknesses[self.mesh.zones[owners]],
            owners,
        )
        both = zip(at, finer, strict=True)
        return Candidates(*(np.concatenate([a, b[kept]]) for a, b in both))

    def fields_on(self, triangles: Ints, barycentrics: Floats) -> tuple[Floats, Floats]:
        """Moments (n, q, 3, c) in N and shears (n, q, 2, c) in N/m of all cases.

        At points (q, 3) or (n, q, 3) of triangles (n,), of a C1 element.
        """
        assert isinstance(self.recovered, RawMoments)
        return self.recovered.moments_and_shears(triangles, barycentrics)

    def _at(self, points: Floats, index: int) -> Candidates:
        """Candidates at points (k, 2)."""
        triangles, barycentrics = self.mesh.locate(points)
        return Candidates(
            points,
            self.recovered.moments_at(triangles, barycentrics)[:, :, index],
            self.recovered.shears_at(triangles, barycentrics)[:, :, index],
            self.plate.thicknesses[self.mesh.zones[triangles]],
            triangles,
        )
