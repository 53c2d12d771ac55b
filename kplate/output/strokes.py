"""Lines in space from which signs are made: chains, hatches, dashes, arrows.

A stroke may hang on points of the plate, so that it goes up and down with these.
"""

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np

from kplate.arrays import Floats, Ints

FIXED = -1  # hangs on nothing
SAME = 1e-7  # points closer than this share of the size are one
HEAD = 0.28  # of an arrow, share of its length


@dataclass(frozen=True, eq=False, kw_only=True)
class Strokes:
    """Line segments.

    Parameters
    ----------
    ends : ndarray, shape (k, 2, 3)
        Their ends in m, over the undeflected plate.
    anchors : ndarray, shape (k, 2)
        Point of the plate that each end hangs on, or `FIXED`.
    """

    ends: Floats = field(default_factory=lambda: np.empty((0, 2, 3)))
    anchors: Ints = field(default_factory=lambda: np.empty((0, 2), dtype=np.int64))

    @classmethod
    def of(cls, ends: Floats, anchors: Ints | int = FIXED) -> "Strokes":
        """Segments (k, 2, 3), or (k, 2, 2) at z = 0, that hang on these points."""
        if ends.shape[-1] == 2:
            ends = np.concatenate([ends, np.zeros((*ends.shape[:-1], 1))], axis=-1)
        return cls(ends=ends, anchors=np.broadcast_to(anchors, ends.shape[:2]).copy())


@dataclass(frozen=True, kw_only=True)
class Label:
    """A text at a place, which hangs on a point of the plate or on nothing."""

    text: str
    place: tuple[float, float, float]
    anchor: int = FIXED


def joined(parts: Sequence[Strokes]) -> Strokes:
    """All in one."""
    if not parts:
        return Strokes()
    return Strokes(
        ends=np.concatenate([part.ends for part in parts]),
        anchors=np.concatenate([part.anchors for part in parts]),
    )


def chains(points: Floats, lines: Ints) -> list[Floats]:
    """Directed pieces (k, 2) of lines between points (n, 2), joined end to end.

    Returns
    -------
    list of ndarray (m, 2)
        Places along each chain; the first again at the end of a closed one.
    """
    if not len(lines):
        return []
    ends = _ends(points, lines)
    after = {int(start): k for k, start in enumerate(ends[:, 0])}
    starts = set(ends[:, 0].tolist()) - set(ends[:, 1].tolist())
    left = dict.fromkeys(range(len(lines)))
    found = []
    queue = [after[start] for start in sorted(starts)]
    while left:
        k: int | None = queue.pop(0) if queue else next(iter(left))
        run = []
        while k is not None and k in left:
            del left[k]
            run.append(k)
            k = after.get(int(ends[k, 1]))
        if run:
            found.append(np.vstack([points[lines[run, 0]], points[lines[run[-1:], 1]]]))
    return found


def runs(rows: Floats, pairs: Ints) -> list[Floats]:
    """Pieces (m, 2) of lines, either way round, joined where two of them meet.

    Returns
    -------
    list of ndarray (l, k)
        Rows along each run.
    """
    if not len(pairs):
        return []
    ends = _ends(rows[:, :2], pairs)
    pairs, ends = pairs[ends[:, 0] != ends[:, 1]], ends[ends[:, 0] != ends[:, 1]]
    at: dict[int, list[tuple[int, int]]] = {}
    for k, (a, b) in enumerate(ends.tolist()):
        at.setdefault(a, []).append((k, 0))
        at.setdefault(b, []).append((k, 1))
    left = dict.fromkeys(range(len(pairs)))
    loose = [own[0] for own in at.values() if len(own) != 2]
    found = []
    while left:
        k, side = loose.pop() if loose else (next(iter(left)), 0)
        if k not in left:
            continue
        run = [int(pairs[k, side])]
        while True:
            del left[k]
            run.append(int(pairs[k, 1 - side]))
            meeting = at[int(ends[k, 1 - side])]
            onward = [own for own in meeting if own[0] in left]
            if len(meeting) != 2 or not onward:
                break
            k, side = onward[0]
        found.append(rows[run])
    return found


def _ends(points: Floats, pairs: Ints) -> Ints:
    """Numbers of the ends of pieces, alike where places are."""
    size = float(np.ptp(points, axis=0).max())
    used, inverse = np.unique(pairs, return_inverse=True)
    whole = np.rint((points[used] - points.min(axis=0)) / (SAME * size))
    _, same = np.unique(whole.astype(np.int64), axis=0, return_inverse=True)
    return np.asarray(same.reshape(-1)[inverse.reshape(pairs.shape)])


def spread(chain: Floats, step: float) -> tuple[Floats, Floats]:
    """Places evenly along a chain, and the unit normals to its right, (k, 2) each."""
    pieces = np.diff(chain, axis=0)
    lengths = np.hypot(*pieces.T)
    along = np.concatenate([[0.0], np.cumsum(lengths)])
    count = max(round(along[-1] / step), 1)
    at = (np.arange(count) + 0.5) / count * along[-1]
    which = np.clip(np.searchsorted(along, at, side="right") - 1, 0, len(pieces) - 1)
    tangent = pieces[which] / lengths[which][:, None]
    places = chain[which] + (at - along[which])[:, None] * tangent
    return places, np.column_stack([tangent[:, 1], -tangent[:, 0]])


def hatches(chain: Floats, step: float, reach: float) -> Strokes:
    """Oblique strokes to the right of a chain."""
    foot, away = spread(chain, step)
    back = np.column_stack([away[:, 1], -away[:, 0]])
    tip = foot + reach * np.sqrt(0.5) * (away + back)
    return Strokes.of(np.stack([foot, tip], axis=1))


def dashes(chain: Floats, step: float, share: float, beside: float) -> Strokes:
    """Dashes to the right of a chain, each a share of a step long."""
    middle, away = spread(chain, step)
    along = np.column_stack([-away[:, 1], away[:, 0]])
    middle = middle + beside * away
    half = 0.5 * share * step * along
    return Strokes.of(np.stack([middle - half, middle + half], axis=1))


def dashed(rows: Floats, pairs: Ints, step: float) -> Floats:
    """Dashes along lines between points, every second step of the way.

    Parameters
    ----------
    rows : ndarray, shape (n, k)
        Points: x, y, and what else is to be interpolated.
    pairs : ndarray, shape (m, 2)
        Ends of the pieces of the lines.
    step : float
        Length of a dash, and of a gap.

    Returns
    -------
    ndarray, shape (d, 2, k)
    """
    found = [np.empty((0, 2, rows.shape[1]))]
    for chain in runs(rows, pairs):
        along = np.concatenate(
            [[0.0], np.cumsum(np.hypot(*np.diff(chain[:, :2], axis=0).T))]
        )
        count = max(round(along[-1] / (2.0 * step)), 1)
        at = (np.arange(count)[:, None] + (0.25, 0.75)) * along[-1] / count
        found.append(
            np.stack([np.interp(at, along, column) for column in chain.T], axis=-1)
        )
    return np.concatenate(found)


def outline(chain: Floats, anchors: Ints | int = FIXED) -> Strokes:
    """The pieces of a chain; `anchors` (m,) of its places."""
    ends = np.stack([chain[:-1], chain[1:]], axis=1)
    if isinstance(anchors, int):
        return Strokes.of(ends, anchors)
    return Strokes.of(ends, np.stack([anchors[:-1], anchors[1:]], axis=1))


def arrows(tips: Floats, lengths: Floats, anchors: Ints | int = FIXED) -> Strokes:
    """Upright arrows that end at tips (k, 3).

    Lengths (k,) are positive where an arrow points up: it then comes from below.
    """
    up = np.array([0.0, 0.0, 1.0])
    feet = tips - lengths[:, None] * up
    neck = tips - HEAD * lengths[:, None] * up
    wide = 0.4 * HEAD * np.abs(lengths)[:, None]
    segments = [np.stack([feet, tips], axis=1)]
    for way in ((1.0, 0.0, 0.0), (-1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (0.0, -1.0, 0.0)):
        segments.append(np.stack([neck + wide * np.array(way), tips], axis=1))
    if not isinstance(anchors, int):
        anchors = np.tile(anchors, len(segments))[:, None]
    return Strokes.of(np.concatenate(segments), anchors)
