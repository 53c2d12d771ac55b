"""Where a plate deflects most, and how far the dual's deflection differs.

The deflection is sampled on a lattice of each triangle, its own, coarser than that of
moments; a summit is climbed to from the largest sample.
"""

import numpy as np

from kplate.arrays import Floats, Ints
from kplate.peaks import PeakBand, peak_band
from kplate.raw import RawMoments
from kplate.recovery import SmoothedMoments
from kplate.solve.dual import DualState
from kplate.solve.static import StaticState


def deflected(
    recovered: SmoothedMoments | RawMoments, index: int
) -> tuple[Floats, Ints, Floats]:
    """Places (n, 2) in m over a plate, triangles that hold them, and w (n,) in m."""
    if isinstance(recovered, RawMoments):
        places, holders, w = recovered.deflections
        return places, holders, w[:, index]
    samples = recovered.samples
    return samples.points, samples.holders, samples.bent[:, 0, index]


def deflection_band(
    state: StaticState, dual: DualState, recovered: RawMoments, index: int
) -> PeakBand:
    """Band of the largest deflection of case number `index`."""
    mesh, numbering = state.mesh, state.constraints.numbering
    places, holders, w = deflected(recovered, index)
    own = mesh.barycentrics(holders, places)[:, None]
    off = np.abs(w - dual.deflections_at(holders, own)[:, 0, index])
    if len(numbering.arcs):
        # At round edges the dual's unknowns are w at the vertices only.
        w_dual = dual.constraints.numbering.by_vertex(dual.unknowns)[:, 0, index]
        w_own = numbering.by_vertex(state.unknowns)[:, 0, index]
        corners = mesh.triangles[numbering.arcs.rows]
        at_arcs = np.full(len(mesh.triangles), np.nan)
        at_arcs[numbering.arcs.rows] = np.abs(w_own - w_dual)[corners].max(axis=1)
        off = np.where(np.isnan(at_arcs[holders]), off, at_arcs[holders])
    return peak_band(mesh, holders, np.abs(w), off)
