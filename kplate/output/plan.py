"""The plan of a plate: its sides by how they are held, and where their names may stand.

A clamped side is hatched outside, a simply supported one has a dashed line beside it, a
side whose slope alone is held a dotted one, a free side nothing. Lengths of symbols are
pixels; what is drawn stands in the data coordinates of its axes, `per_pixel` of them a
pixel.
"""

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np

from kplate import curves
from kplate.arrays import Floats
from kplate.outline import Outline
from kplate.output.lettering import Hand, Names, Spot, halo, upright
from kplate.polygon import Polygon
from kplate.supports import Support

INK, FAINT = "#1a1a1a", "#6b6b6b"
# All in pixels: how far beside a side its dashes run, hatches reach, names stand.
BESIDE, REACH, NAME_GAP = 5.0, 9.0, 11.0
HATCH_STEP = 8.0
END = 16.0  # that a shortened name stays off the ends of its side
MOST_NAMES = 60  # more sides than that cannot be told apart on a picture
SIDE_NAME = Hand(size=9.5, style="italic")
ARC_STEP = math.radians(2.0)  # from chord to chord of an arc


@dataclass(frozen=True, eq=False, kw_only=True)
class Piece:
    """A straight piece of a side, or arcs that run on, a whole circle at most.

    Parameters
    ----------
    side : str
        Name of the side.
    points : ndarray, shape (k, 2)
        Its line.
    away : ndarray, shape (k - 1, 2)
        Unit normals of its steps, out of the plate.
    """

    side: str
    points: Floats
    away: Floats

    @property
    def is_straight(self) -> bool:
        """Whether it is a straight piece."""
        return len(self.points) == 2

    @property
    def is_closed(self) -> bool:
        """Whether it ends where it begins."""
        first, last = self.points[0], self.points[-1]
        return float(np.hypot(*(last - first))) < 1e-6 * self.length

    @property
    def length(self) -> float:
        """Length of the line."""
        return float(np.hypot(*np.diff(self.points, axis=0).T).sum())

    def at(self, shares: Floats) -> tuple[Floats, Floats]:
        """Points and normals at shares of the length, (k, 2) each."""
        lengths = np.hypot(*np.diff(self.points, axis=0).T)
        distance = np.concatenate([[0.0], np.cumsum(lengths)])
        at = shares * distance[-1]
        points = np.column_stack([np.interp(at, distance, c) for c in self.points.T])
        step = np.searchsorted(distance, at, side="right") - 1
        return points, self.away[np.clip(step, 0, len(lengths) - 1)]


def pieces(outline: Outline, size: float) -> list[Piece]:
    """Pieces of all sides, lengths in units of `size` m."""
    return [
        piece
        for number, line in enumerate(outline.boundaries)
        for piece in _line_pieces(line, size, hole=number > 0)
    ]


def _line_pieces(line: Polygon, size: float, *, hole: bool) -> Iterator[Piece]:
    """Pieces of a line; arcs of one side that run on are drawn as one."""
    runs: list[list[int]] = []
    for i, bulge in enumerate(line.bulges):
        runs_on = bulge != 0.0 and line.bulges[i - 1] != 0.0 and line.straight[i]
        if runs and runs_on and line.sides[i] == line.sides[i - 1]:
            runs[-1].append(i)
        else:
            runs.append([i])
    for run in runs:
        ends = line.ends[run]
        points, _ = curves.flattened(
            line.points[run], ends, line.bulges[run], step=ARC_STEP
        )
        drawn = np.vstack([points, ends[-1:]])
        yield _piece(line.sides[run[0]], drawn / size, hole=hole)


def _piece(side: str, points: Floats, *, hole: bool) -> Piece:
    step = np.diff(points, axis=0)
    normal = np.column_stack([step[:, 1], -step[:, 0]]) * (-1.0 if hole else 1.0)
    return Piece(side=side, points=points, away=normal / np.hypot(*step.T)[:, None])


def draw_piece(axes: Any, piece: Piece, support: Support, per_pixel: float) -> None:
    """Draw a piece of a side with the symbol of its support."""
    held = support.holds_deflection or support.holds_slope
    width = 1.8 if held else 1.1
    axes.plot(*piece.points.T, color=INK, linewidth=width, solid_capstyle="round")
    if support.holds_deflection and support.holds_slope:
        _hatch(axes, piece, per_pixel)
    elif held:
        style = (0, (5.0, 3.0)) if support.holds_deflection else (0, (1.0, 2.0))
        line = _beside(piece, BESIDE * per_pixel)
        axes.plot(*line.T, color=INK, linewidth=1.3, linestyle=style)


def _hatch(axes: Any, piece: Piece, per_pixel: float) -> None:
    """Oblique strokes outside a piece."""
    from matplotlib.collections import LineCollection

    count = max(int(piece.length / (HATCH_STEP * per_pixel)), 1)
    foot, away = piece.at((np.arange(count) + 0.5) / count)
    back = np.column_stack([away[:, 1], -away[:, 0]])
    tip = foot + REACH * per_pixel * np.sqrt(0.5) * (away + back)
    strokes = np.stack([foot, tip], axis=1)
    axes.add_collection(LineCollection(list(strokes), colors=INK, linewidths=0.9))


def _beside(piece: Piece, gap: float) -> Floats:
    """A line beside a piece, not quite to its ends."""
    cut = min(gap / piece.length, 0.25) if piece.is_straight else 0.0
    points, away = piece.at(np.linspace(cut, 1.0 - cut, len(piece.points)))
    return points + gap * away


def block_sides(names: Names, lines: list[Piece], per_pixel: float) -> None:
    """Keep names off the sides."""
    for piece in lines:
        count = int(piece.length / (6.0 * per_pixel)) + 2
        names.block(piece.at(np.linspace(0.0, 1.0, count))[0], 3.0)


def write_side_names(names: Names, lines: list[Piece], per_pixel: float) -> int:
    """Write each side's name at its longest piece.

    Returns
    -------
    int
        How many names found no room.
    """
    longest: dict[str, Piece] = {}
    for piece in lines:
        if piece.side not in longest or piece.length > longest[piece.side].length:
            longest[piece.side] = piece
    missing = max(len(longest) - MOST_NAMES, 0)
    for piece in sorted(longest.values(), key=lambda p: -p.length)[:MOST_NAMES]:
        spots = side_spots(piece, per_pixel)
        found = names.place(
            piece.side, spots, SIDE_NAME, gap=NAME_GAP, path_effects=halo()
        )
        missing += not found
    return missing


def side_spots(piece: Piece, per_pixel: float) -> list[Spot]:
    """Where the name of a piece may stand."""
    if piece.is_closed:
        return _round_spots(piece, per_pixel)
    return _open_spots(piece, per_pixel)


def _open_spots(piece: Piece, per_pixel: float) -> list[Spot]:
    """Along a piece: outside it, else beside it on the plate; level where it bends."""
    spots = []
    for way in (1.0, -1.0):
        for share in (0.5, 0.3, 0.7):
            foot, away = (array[0] for array in piece.at(np.array([share])))
            angle, room = 0.0, 0.0
            if piece.is_straight:
                angle = upright(float(np.arctan2(away[0], -away[1])))
                room = piece.length / per_pixel - 2.0 * END if share == 0.5 else 0.0
            spots.append(
                Spot(
                    at=(float(foot[0]), float(foot[1])),
                    away=(way * float(away[0]), way * float(away[1])),
                    angle=angle,
                    room=room,
                )
            )
    return spots


def _round_spots(piece: Piece, per_pixel: float) -> list[Spot]:
    """In a round hole, or around a closed line, outside it before inside."""
    low, high = piece.points.min(axis=0), piece.points.max(axis=0)
    centre = 0.5 * (low + high)
    is_hole = float(piece.away[0] @ (piece.points[0] - centre)) < 0.0
    spots = []
    if is_hole:
        room = float(high[0] - low[0]) / per_pixel - 2.0 * NAME_GAP
        spots.append(Spot(at=(float(centre[0]), float(centre[1])), room=room))
    eighths = np.array([1, 3, 7, 5, 2, 6, 0, 4]) / 8.0
    outwards = -1.0 if is_hole else 1.0
    for way in (outwards, -outwards):
        for foot, away in zip(*piece.at(eighths), strict=True):
            beside = (way * float(away[0]), way * float(away[1]))
            spots.append(Spot(at=(float(foot[0]), float(foot[1])), away=beside))
    return spots
