"""Where a plate deflects most, and how far the dual's deflection differs.

The deflection is sampled on a lattice of each triangle, its own, coarser than that of
moments; a summit is climbed to from the largest sample.

Axes: n places, c cases.
"""

import numpy as np

from kplate.arrays import Floats, Ints
from kplate.peaks import PeakBand, peak_band
from kplate.raw import RawMoments
from kplate.recovery import SmoothedMoments
from kplate.solve.dual import DualState
from kplate.solve.static import StaticState


def deflected(recovered: SmoothedMoments | RawMoments) -> tuple[Floats, Ints, Floats]:
    """Places (n, 2) in m over a plate, triangles that hold them, and w (n, c) in m."""
    if isinstance(recovered, RawMoments):
        return recovered.deflections
    samples = recovered.samples
    return samples.points, samples.holders, samples.bent[:, 0]


def deflection_gaps(
    state: StaticState, dual: DualState, recovered: SmoothedMoments | RawMoments
) -> Floats:
    """By how much w differs from the dual's at the places of `deflected`, (n, c).

    In triangles with a round edge the dual's unknowns are w at the vertices only; the
    difference there is taken as linear between them.
    """
    mesh, numbering = state.mesh, state.constraints.numbering
    places, holders, w = deflected(recovered)
    at = mesh.barycentrics(holders, places)
    off: Floats = w - dual.deflections_at(holders, at[:, None])[:, 0]
    curved = np.isin(holders, numbering.arcs.rows)
    if curved.any():
        own = numbering.by_vertex(state.unknowns)[:, 0]
        other = dual.constraints.numbering.by_vertex(dual.unknowns)[:, 0]
        corners = mesh.triangles[holders[curved]]
        off[curved] = np.einsum("nv,nvc->nc", at[curved], (own - other)[corners])
    return off


def deflection_band(
    state: StaticState, dual: DualState, recovered: RawMoments, index: int
) -> PeakBand:
    """Band of the largest deflection of case number `index`."""
    _, holders, w = deflected(recovered)
    off = deflection_gaps(state, dual, recovered)
    return peak_band(state.mesh, holders, np.abs(w[:, index]), np.abs(off[:, index]))
