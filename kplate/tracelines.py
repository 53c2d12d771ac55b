"""Line reactions along held lines, from traces: stations, and what lines bring."""

from itertools import pairwise

import numpy as np

from kplate.arrays import Floats, Ints
from kplate.quadrature import gauss
from kplate.stations import HeldLine, LinePart, stretches
from kplate.traces import Traces

STATIONS = 4  # on each edge
CUBIC = 4  # jets of a cubic trace, at both ends


def traced(
    found: Traces, lines: list[HeldLine], at_corners: Floats, index: int
) -> list[LinePart]:
    """What held lines bring in case number `index`, without the corner forces.

    `at_corners` (n_points,) are those forces in N. What else acts at the end of a run
    goes to the lines that meet there in even shares.
    """
    left = found.forces[:, index] - at_corners[found.vertices]
    meeting = np.zeros((len(lines), len(found.vertices)), dtype=bool)
    for k, line in enumerate(lines):
        if line.support.holds_deflection:
            meeting[k] = np.isin(found.vertices, line.edges)
    shares = left / np.maximum(meeting.sum(axis=0), 1)
    parts = []
    for k, line in enumerate(lines):
        own = np.flatnonzero(found.held.lines == line.number)
        brought = np.einsum(
            "edm,ed->m", found.motions[found.unknowns[own]], found.nodal[own, :, index]
        )
        at = found.numbering.at_vertices(found.vertices)[:, 0]
        brought = brought + found.left[own, :, index].sum(axis=0)
        brought = brought + (shares * meeting[k]) @ found.motions[at]
        parts.append(_along_line(found, line, own, brought, index))
    return parts


def _along_line(
    found: Traces, line: HeldLine, own: Ints, brought: Floats, index: int
) -> LinePart:
    """Stations of a line, several on each edge, and what it brings there."""
    number = {tuple(pair): k for k, pair in zip(own, line.edges.tolist(), strict=True)}
    share = np.arange(STATIONS + 1) / STATIONS
    places: list[Floats] = []
    distances: list[Floats] = []
    reactions: list[Floats] = []
    moments: list[Floats] = []
    start = 0.0
    for chain in stretches(line.edges):
        pairs = list(pairwise(chain.tolist()))
        forward = np.array([pair in number for pair in pairs])
        edges = np.array(
            [number[p if f else p[::-1]] for p, f in zip(pairs, forward, strict=True)]
        )
        at, lengths = found.places(edges, share)
        at[~forward] = at[~forward, ::-1]
        v = found.line_reaction(edges, share)[:, :, index]
        m = found.line_moment(edges, share)[:, :, index]
        # The moment counts about the normal on the right of the stretch.
        v[~forward], m[~forward] = v[~forward, ::-1], -m[~forward, ::-1]
        if found.shears.shape[1] == CUBIC:
            v = _means(found, edges, index, closed=bool(chain[0] == chain[-1]))
        first = start + np.concatenate([[0.0], np.cumsum(lengths)[:-1]])
        along = first[:, None] + share * lengths[:, None]
        # The end of each edge is the start of the next.
        for values, to in ((along, distances), (v, reactions), (m, moments)):
            to += [values[:, :-1].ravel(), values[-1:, -1]]
        places += [at[:, :-1].reshape(-1, 2), at[-1:, -1]]
        start = float(along[-1, -1])
    return LinePart(
        stations=np.concatenate(places),
        distance=np.concatenate(distances),
        reaction=np.concatenate(reactions) * line.support.holds_deflection,
        moment=np.concatenate(moments) * line.support.holds_slope,
        resultant=brought,
    )


def _means(found: Traces, edges: Ints, index: int, *, closed: bool) -> Floats:
    """Line reactions of cubic traces at stations, between means over whole edges.

    Cubic traces swing by several per cent between the vertices; their means over edges
    do not.
    """
    ends = found.numbering.mesh.points[found.held.edges[edges]]
    lengths = np.hypot(*(ends[:, 1] - ends[:, 0]).T)
    s, weights = gauss(2)
    means = weights @ found.line_reaction(edges, s)[:, :, index].T
    start = np.concatenate([[0.0], np.cumsum(lengths)[:-1]])
    middle = start + 0.5 * lengths
    period = float(lengths.sum())
    at = start[:, None] + np.arange(STATIONS + 1) / STATIONS * lengths[:, None]
    if closed:
        return np.interp(at, middle, means, period=period)
    return np.interp(at, middle, means)
