"""Loose lines and arcs, chained into closed lines.

What a drawing holds is a heap of pieces in any order and sense. Ends that coincide are
joined; ends that are left free are joined to the nearest free end within the snap
distance. What then does not close, branches or stands alone is refused with its place.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from scipy.sparse import coo_array

from kplate import curves
from kplate.arrays import Floats, Ints
from kplate.errors import InputError
from kplate.polygon import SNAP
from kplate.units import Unit

# Free ends closer than this share of the drawing's size are meant to meet: a drawing's
# last digit, or a line drawn by eye.
SNAP_SHARE = 1e-4
# Ends closer than this share coincide whether free or not; a polygon allows no less.
SAME = 2.0 * SNAP
MOST_LISTED = 5  # snapped ends that a note lists one by one

Point = tuple[float, float]


@dataclass(frozen=True, kw_only=True)
class Piece:
    """A line or an arc of a drawing.

    Parameters
    ----------
    start, end : tuple of float
        Its ends in m.
    bulge : float
        Tangent of a quarter of the angle it turns through, positive to the left.
    kind : str
        What the drawing calls it.
    layer : str
        The layer it lies on.
    entity : int
        Number of what it is a part of, such as a polyline.
    """

    start: Point
    end: Point
    bulge: float = 0.0
    kind: str = "line"
    layer: str = ""
    entity: int = 0


@dataclass(frozen=True, eq=False, kw_only=True)
class Loop:
    """A closed line.

    Parameters
    ----------
    points : ndarray, shape (n, 2)
        Its vertices in m, in the sense in which its first piece was drawn.
    bulges : ndarray, shape (n,)
        Bulge of each piece.
    pieces : tuple of Piece
        What it was made of.
    """

    points: Floats
    bulges: Floats
    pieces: tuple[Piece, ...]

    @property
    def whole(self) -> bool:
        """Whether it was drawn as one."""
        return len({piece.entity for piece in self.pieces}) == 1


@dataclass(frozen=True, eq=False, kw_only=True)
class Chained:
    """Closed lines, and what was done to get them, in words.

    Parameters
    ----------
    loops : tuple of Loop
        The closed lines.
    notes : tuple of str
        What was chained and snapped.
    ignored : tuple of str
        Pieces without length, and pieces that are drawn twice.
    """

    loops: tuple[Loop, ...]
    notes: tuple[str, ...]
    ignored: tuple[str, ...]


@dataclass(frozen=True, eq=False, kw_only=True)
class _Net:
    """Pieces between nodes: nodes (n, 2) of each piece, places (m, 2) of the nodes."""

    pieces: tuple[Piece, ...]
    nodes: Ints
    places: Floats
    snaps: tuple[tuple[float, Point], ...]
    ignored: tuple[tuple[Piece, str], ...]

    @property
    def degrees(self) -> Ints:
        """How many ends meet at each node."""
        return np.bincount(self.nodes.ravel(), minlength=len(self.places))


def chain(pieces: Sequence[Piece], *, unit: Unit, snap: float | None = None) -> Chained:
    """Chain pieces into closed lines.

    Parameters
    ----------
    pieces : sequence of Piece
        Lines and arcs in any order and sense.
    unit : Unit
        Unit of length in which places are named.
    snap : float, optional
        Free ends closer than this, in m, are joined; 1e-4 of the size if left out.

    Returns
    -------
    Chained

    Raises
    ------
    InputError
        If a line does not close, more than two meet at a point, or there is none.
    """
    if not pieces:
        raise InputError(
            "the drawing holds no lines or arcs that could be an outline; draw it with "
            "lines, arcs, polylines or circles."
        )
    net = _join(pieces, _snap(pieces, snap, unit))
    _check_branches(net, unit)
    _check_gaps(net, unit)
    loops = _loops(net)
    loose = sum(
        len({piece.entity for piece in loop.pieces}) for loop in loops if not loop.whole
    )
    joined = sum(not loop.whole for loop in loops)
    notes = [f"{loose} lines and arcs chained into {count(joined, 'closed line')}"]
    return Chained(
        loops=loops,
        notes=(*(notes if joined else ()), *_snap_notes(net, unit)),
        ignored=tuple(f"{words(p, unit)}: {why}" for p, why in net.ignored),
    )


def closed_lines(pieces: Sequence[Piece], *, snap: float | None = None) -> int:
    """Number of closed lines among pieces; what does not close is left out."""
    size = _size(pieces)
    if size == 0.0:
        return 0
    net = _join(pieces, SNAP_SHARE * size if snap is None else snap)
    labels = _groups(net.nodes, len(net.places))
    bad = np.unique(labels[net.degrees != 2])
    return len(np.unique(labels)) - len(bad)


def place(point: Any, unit: Unit) -> str:
    """Write a place in the unit of the drawing, to a thousandth of a millimetre."""
    x, y = (_plain(value / unit.size) for value in point[:2])
    return f"({x}, {y}) {unit.symbol}"


def length(value: float, unit: Unit) -> str:
    """Write a length in the unit of the drawing."""
    return f"{value / unit.size:.3g} {unit.symbol}"


def words(piece: Piece, unit: Unit) -> str:
    """Name a piece by its kind, layer and ends."""
    layer = f" on layer {piece.layer!r}" if piece.layer else ""
    return (
        f"{piece.kind}{layer} from {place(piece.start, unit)} to "
        f"{place(piece.end, unit)}"
    )


def count(number: int, noun: str) -> str:
    """Write a number of things."""
    return f"{number} {noun}{'s' * (number != 1)}"


def arrays(pieces: Sequence[Piece]) -> tuple[Floats, Floats, Floats]:
    """Starts (n, 2), ends (n, 2) and bulges (n,) of pieces."""
    starts = np.array([piece.start for piece in pieces], dtype=float).reshape(-1, 2)
    ends = np.array([piece.end for piece in pieces], dtype=float).reshape(-1, 2)
    return starts, ends, np.array([piece.bulge for piece in pieces], dtype=float)


def _plain(value: float) -> str:
    return f"{0.0 if abs(value) < 1e-9 else value:.6g}"


def _size(pieces: Sequence[Piece]) -> float:
    """Diagonal in m of the box around all ends."""
    starts, ends, _ = arrays(pieces)
    return float(np.hypot(*np.ptp(np.concatenate([starts, ends]), axis=0)))


def _snap(pieces: Sequence[Piece], snap: float | None, unit: Unit) -> float:
    """Snap distance; refuse one that cannot be meant."""
    size = _size(pieces)
    if size == 0.0:
        raise InputError("all lines of the drawing are without length.")
    if snap is None:
        return SNAP_SHARE * size
    if not 0.0 <= snap < size:
        raise InputError(
            f"snap is {length(snap, unit)}; it must be at least 0 and less than the "
            f"size of the drawing, {length(size, unit)}."
        )
    return snap


def _join(pieces: Sequence[Piece], snap: float) -> _Net:
    """Join ends that coincide, then free ends within the snap distance."""
    starts, ends, bulges = arrays(pieces)
    size = _size(pieces)
    short = np.hypot(*(ends - starts).T) <= SAME * size
    full = np.flatnonzero(~short)
    nodes, _ = _nodes(starts[full], ends[full], SAME * size)
    free = (np.bincount(nodes.ravel())[nodes] == 1).any(axis=1)
    reach = np.where(free, max(snap, SAME * size), SAME * size)
    twice = full[_drawn_twice(starts[full], ends[full], bulges[full], reach)]
    ignored = [(pieces[int(i)], "without length") for i in np.flatnonzero(short)]
    ignored += [(pieces[int(i)], "drawn twice") for i in twice]
    keep = np.setdiff1d(full, twice)
    nodes, places = _nodes(starts[keep], ends[keep], SAME * size)
    net = _Net(
        pieces=tuple(pieces[int(i)] for i in keep),
        nodes=nodes,
        places=places,
        snaps=(),
        ignored=tuple(ignored),
    )
    return _snapped(net, snap) if len(keep) else net


def _nodes(starts: Floats, ends: Floats, same: float) -> tuple[Ints, Floats]:
    """Nodes (n, 2) that the ends of pieces are, and their places (m, 2)."""
    both = np.stack([starts, ends], axis=1).reshape(-1, 2)
    labels = _groups(_pairs(both, same), len(both))
    first = np.unique(labels, return_index=True)[1]
    return labels.reshape(-1, 2), both[first]


def _pairs(points: Floats, reach: float) -> Ints:
    """Pairs of points within a distance of each other, (k, 2)."""
    from scipy.spatial import KDTree

    if not len(points):
        return np.empty((0, 2), dtype=np.int64)
    pairs: Ints = KDTree(points).query_pairs(reach, output_type="ndarray")
    return pairs.astype(np.int64)


def _groups(pairs: Ints, n: int) -> Ints:
    """Number the groups of things that pairs connect, (n,)."""
    from scipy.sparse.csgraph import connected_components

    graph = coo_array((np.ones(len(pairs)), (pairs[:, 0], pairs[:, 1])), shape=(n, n))
    return connected_components(graph, directed=False)[1].astype(np.int64)


def _drawn_twice(starts: Floats, ends: Floats, bulges: Floats, reach: Floats) -> Ints:
    """Pieces that lie on another, in either sense, within the reach of one of them.

    Of two the one with the longer reach is given, of equals the later.
    """
    if not len(bulges):
        return np.empty(0, dtype=np.int64)
    reach = np.minimum(reach, 0.1 * np.hypot(*(ends - starts).T))
    middles = curves.points_at(starts, ends, bulges, np.full(len(bulges), 0.5))
    twice = set()
    for i, j in np.sort(_pairs(middles, float(reach.max())), axis=1).tolist():
        most = max(reach[i], reach[j])
        along = max(math.dist(starts[i], starts[j]), math.dist(ends[i], ends[j]))
        against = max(math.dist(starts[i], ends[j]), math.dist(ends[i], starts[j]))
        if max(min(along, against), math.dist(middles[i], middles[j])) <= most:
            twice.add(i if reach[i] > reach[j] and j not in twice else j)
    return np.array(sorted(twice), dtype=np.int64)


def _snapped(net: _Net, snap: float) -> _Net:
    """Join free ends to the nearest other within the snap distance."""
    free = np.flatnonzero(net.degrees == 1)
    owner = np.full(len(net.places), -1)
    owner[net.nodes] = np.arange(len(net.nodes))[:, None]
    pairs = free[_pairs(net.places[free], snap)]
    gaps = np.hypot(*(net.places[pairs[:, 0]] - net.places[pairs[:, 1]]).T)
    places, number = net.places.copy(), np.arange(len(net.places))
    taken: set[int] = set()
    snaps: list[tuple[float, Point]] = []
    for k in np.argsort(gaps, kind="stable"):
        i, j = (int(node) for node in pairs[k])
        if owner[i] == owner[j] or {i, j} & taken:
            continue
        taken |= {i, j}
        places[i] = _meeting(net, (i, j), (int(owner[i]), int(owner[j])))
        number[j] = i
        snaps.append((float(gaps[k]), (float(places[i, 0]), float(places[i, 1]))))
    return replace(net, nodes=number[net.nodes], places=places, snaps=tuple(snaps))


def _meeting(net: _Net, nodes: tuple[int, int], owners: tuple[int, int]) -> Floats:
    """Where two free ends meet: on the arc, whose radius stays, or half way."""
    bent = [net.pieces[owner].bulge != 0.0 for owner in owners]
    if bent[0] != bent[1]:
        return net.places[nodes[bent.index(True)]]
    return 0.5 * (net.places[nodes[0]] + net.places[nodes[1]])


def _snap_notes(net: _Net, unit: Unit) -> list[str]:
    """Say which ends were snapped; round-off is not worth a word."""
    size = float(np.hypot(*np.ptp(net.places, axis=0)))
    snaps = [(gap, where) for gap, where in net.snaps if gap > SAME * size]
    if not snaps:
        return []
    snaps.sort(reverse=True)
    listed = ", ".join(
        f"{place(where, unit)} by {length(gap, unit)}"
        for gap, where in snaps[:MOST_LISTED]
    )
    more = len(snaps) - MOST_LISTED
    rest = f" and {count(more, 'place')} by less" if more > 0 else ""
    return [f"ends snapped together at {listed}{rest}"]


def _check_branches(net: _Net, unit: Unit) -> None:
    """Refuse points at which more than two pieces meet."""
    degrees = net.degrees
    branches = np.flatnonzero(degrees > 2)
    if branches.size:
        where = place(net.places[branches[0]], unit)
        more = f" ({len(branches)} such points)" if len(branches) > 1 else ""
        raise InputError(
            f"{degrees[branches[0]]} lines meet at {where}{more}; at each corner of a "
            "closed line there are two. Take the others out, or put them on a layer of "
            "their own."
        )


def _check_gaps(net: _Net, unit: Unit) -> None:
    """Refuse free ends, by the smallest gap."""
    free = np.flatnonzero(net.degrees == 1)
    if not free.size:
        return
    gap, end, piece = min(_nearest(net, int(node), free) for node in free)
    own = net.pieces[piece]
    line = f"the {own.kind} from {place(own.start, unit)} to {place(own.end, unit)}"
    where = place(net.places[end], unit)
    starts, ends, bulges = arrays([own])
    if gap > float(curves.lengths(starts, ends, bulges)[0]):
        raise InputError(
            f"{line} is joined to nothing at {where}; join it, take it out, or put it "
            "on a layer of its own."
        )
    ends_left = count(len(free), "free end")
    raise InputError(
        f"{line} does not close: gap of {length(gap, unit)} near {where} "
        f"({ends_left} in all). Join the ends, or snap over more than "
        f"{length(gap, unit)}."
    )


def _nearest(net: _Net, node: int, free: Ints) -> tuple[float, int, int]:
    """Gap from a free end to the nearest one of another piece, the end, its piece."""
    piece = int(np.flatnonzero((net.nodes == node).any(axis=1))[0])
    others = free[~np.isin(free, net.nodes[piece])]
    if not others.size:
        return math.inf, node, piece
    gaps = np.hypot(*(net.places[others] - net.places[node]).T)
    return float(gaps.min()), node, piece


def _loops(net: _Net) -> tuple[Loop, ...]:
    """Walk round every closed line, from its first piece."""
    at_node: list[list[int]] = [[] for _ in net.places]
    for i, (a, b) in enumerate(net.nodes):
        at_node[a].append(i)
        at_node[b].append(i)
    seen = np.zeros(len(net.pieces), dtype=bool)
    loops = []
    for first in range(len(net.pieces)):
        if seen[first]:
            continue
        own, points, bulges = [], [], []
        piece, start = first, int(net.nodes[first, 0])
        while not seen[piece]:
            seen[piece] = True
            forward = net.nodes[piece, 0] == start
            own.append(net.pieces[piece])
            points.append(net.places[start])
            bulges.append(own[-1].bulge if forward else -own[-1].bulge)
            start = int(net.nodes[piece, 1 if forward else 0])
            piece = next((i for i in at_node[start] if not seen[i]), piece)
        loops.append(
            Loop(points=np.array(points), bulges=np.array(bulges), pieces=tuple(own))
        )
    return tuple(loops)
