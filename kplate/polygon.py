"""Closed lines of straight pieces and arcs, checked and tidied when they are built.

A polygon runs counter-clockwise as stated; its pieces run from each point to the next.
What a drawing leaves to be tidied (vertices hardly off a line, chords that stand for an
arc) is tidied and noted. Turns at the vertices are recorded here; whether a turn is a
corner or a bend of a curve is decided where supports meet it.
"""

import math
from dataclasses import dataclass, field, replace
from functools import cached_property
from typing import Any, Literal

import numpy as np

from kplate import chords, curves
from kplate.arrays import Bools, Floats, read_only_floats
from kplate.errors import InputError
from kplate.given import FARTHEST, as_bulges, as_names, as_points

# Lengths below this share of the size are no lengths: points coincide, a hole touches,
# a vertex is not meant to be off the straight line between its neighbours.
SNAP = 1e-6
# A vertex that is off the line by no more than this share is on it, but for round-off;
# far from the origin, four units in the last place of the coordinates.
STRAIGHT = 1e-12
LAST_PLACES = 4.0 * float(np.finfo(float).eps)
# Pieces that meet an arc with less than this turn (rad) have one tangent with it.
SMOOTH = 1e-6
# How far a point may be from the side it stands for, as a share of the size.
ASIDE = 0.01
# An arc of 352 degrees; more has ends that nearly meet.
MOST_BULGE = 30.0
MOST_LISTED = 5  # merged vertices that a note lists one by one

Chords = Literal["ask", "arc", "polygon"]


@dataclass(frozen=True, eq=False, kw_only=True)
class Polygon:
    """A closed line of straight pieces and arcs.

    Parameters
    ----------
    points : array_like, shape (n, 2)
        Vertices in m, counter-clockwise, the first not repeated at the end.
    sides : sequence of str
        Names of the pieces, the first from point 0 to point 1; several pieces may
        share a name and make one side.
    bulges : array_like, shape (n,), optional
        Tangent of a quarter of the angle each piece turns through: 0 is straight,
        positive turns to the left, 1 is a half circle; all straight if left out.
    chords : {"ask", "arc", "polygon"}
        What runs of straight pieces on a circle are. Eight or more vertices that turn
        evenly by less than 10 degrees are an arc, unless "polygon" says that they are
        not; up to 30 degrees they are one if "arc" says so, and a supported run with
        "ask" is refused.
    snap : float, optional
        A vertex closer than this, in m, to the straight line between its neighbours is
        merged into it; 1e-6 of the size if left out.

    Attributes
    ----------
    notes : tuple of str
        What was merged or taken for an arc, in words.

    Raises
    ------
    InputError
        If it has too few points, points that coincide, turns back on itself, crosses or
        touches itself, or runs clockwise.
    """

    points: Floats
    sides: tuple[str, ...]
    bulges: Floats = ()  # type: ignore[assignment]  # filled when built
    chords: Chords = "ask"
    snap: float | None = None
    notes: tuple[str, ...] = field(init=False, default=())

    def __post_init__(self) -> None:
        """Check the line and tidy it."""
        object.__setattr__(self, "points", as_points(self.points))
        object.__setattr__(self, "sides", as_names(self.sides))
        n = len(np.atleast_1d(self.points))
        object.__setattr__(self, "bulges", as_bulges(self.bulges, n))
        self._check_numbers()
        self._check_points()
        # Arcs first: the vertices of fine chords are hardly off a line as well.
        self._take_arcs()
        self._merge_straight()
        self._check_crossing()

    @property
    def line(self) -> "Polygon":
        """Itself."""
        return self

    @property
    def ends(self) -> Floats:
        """End of each piece, (n, 2)."""
        return np.roll(self.points, -1, axis=0)

    @cached_property
    def box(self) -> tuple[float, float, float, float]:
        """Smallest x, smallest y, largest x, largest y in m."""
        outer = curves.outermost(self.points, self.ends, self.bulges)
        (x0, y0), (x1, y1) = outer.min(axis=0), outer.max(axis=0)
        return float(x0), float(y0), float(x1), float(y1)

    @property
    def size(self) -> float:
        """Diagonal of the box around it in m."""
        x0, y0, x1, y1 = self.box
        return math.hypot(x1 - x0, y1 - y0)

    @property
    def area(self) -> float:
        """Enclosed area in m2."""
        x, y = (self.points - self.points[0]).T  # coordinates may be a site's
        flat = 0.5 * float(np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y))
        return flat + float(curves.slivers(self.points, self.ends, self.bulges).sum())

    @property
    def lengths(self) -> Floats:
        """Length of each piece in m, (n,)."""
        return curves.lengths(self.points, self.ends, self.bulges)

    @property
    def perimeter(self) -> float:
        """Length in m."""
        return float(self.lengths.sum())

    @property
    def circles(self) -> Floats:
        """Centre x, centre y, radius in m of each piece, nan where straight, (n, 3)."""
        return curves.circles(self.points, self.ends, self.bulges)

    @cached_property
    def turns(self) -> Floats:
        """Turn to the left at each vertex in rad, in (-pi, pi), (n,)."""
        out, into = curves.tangents(self.points, self.ends, self.bulges)
        into = np.roll(into, 1, axis=0)
        cross = into[:, 0] * out[:, 1] - into[:, 1] * out[:, 0]
        turn: Floats = np.arctan2(cross, np.einsum("ij,ij->i", into, out))
        return turn

    @cached_property
    def straight(self) -> Bools:
        """Vertices without a turn, but for round-off, (n,)."""
        flat = (self.bulges == 0.0) & (np.roll(self.bulges, 1) == 0.0)
        on_line = self._offset() <= self._round_off
        return np.where(flat, on_line, np.abs(self.turns) < SMOOTH)

    @cached_property
    def region(self) -> Any:
        """The enclosed area as a shapely polygon, chords for arcs."""
        import shapely

        return shapely.Polygon(curves.flattened(self.points, self.ends, self.bulges)[0])

    def split(self, piece: int, share: float, names: tuple[str, str]) -> "Polygon":
        """Part a piece in two.

        Parameters
        ----------
        piece : int
            Its number.
        share : float
            Share of its length at which it is parted, between 0 and 1.
        names : tuple of str
            Names of both parts.

        Returns
        -------
        Polygon
        """
        one = slice(piece, piece + 1)
        bulge = float(self.bulges[piece])
        place = curves.points_at(
            self.points[one], self.ends[one], self.bulges[one], np.array([share])
        )
        points = np.insert(self.points, piece + 1, place, axis=0)
        parts = [curves.part(bulge, share), curves.part(bulge, 1.0 - share)]
        bulges = np.concatenate([self.bulges[:piece], parts, self.bulges[piece + 1 :]])
        sides = (*self.sides[:piece], *names, *self.sides[piece + 1 :])
        return self.changed(points=points, sides=sides, bulges=bulges)

    def fractions(
        self, side: str, between: tuple[tuple[float, float], tuple[float, float]]
    ) -> tuple[float, float]:
        """Shares of a side's length at its points nearest to two given ones.

        Raises
        ------
        InputError
            If a point is farther from the side than a hundredth of the line's size.
        """
        pieces = self._stretch(side)
        starts = np.concatenate([[0.0], np.cumsum(self.lengths[pieces])])
        shares = []
        for point in as_points(between, f"the ends of a part of side {side!r}"):
            off = curves.distances(
                point[None], self.points[pieces], self.ends[pieces], self.bulges[pieces]
            )[0]
            k = int(np.argmin(off))
            if off[k] > ASIDE * self.size:
                raise InputError(
                    f"{at(point)} is {off[k]:.3g} m away from side {side!r}; give a "
                    "point on it."
                )
            own = pieces[k : k + 1]
            share = curves.nearest_share(
                point,
                self.points[own[0]],
                self.ends[own[0]],
                float(self.bulges[own[0]]),
            )
            shares.append((starts[k] + share * self.lengths[own[0]]) / starts[-1])
        low, high = sorted(float(share) for share in shares)
        return low, high

    def parted(self, side: str, name: str, fractions: tuple[float, float]) -> "Polygon":
        """Give the part of a side between two shares of its length its own name.

        Raises
        ------
        InputError
            If the shares do not rise from 0 to 1, or the side is in several stretches.
        """
        low, high = fractions
        if not (0.0 <= low < high <= 1.0):
            raise InputError(
                f"the part {name!r} of side {side!r} runs from {low:g} to {high:g} of "
                "its length; it must run from a smaller to a larger share, 0 to 1."
            )
        line: Polygon = self
        for share in (low, high):
            line = line._cut_side(side, share)
        pieces = line._stretch(side)
        ends = np.cumsum(line.lengths[pieces]) / line.lengths[pieces].sum()
        middle = ends - 0.5 * line.lengths[pieces] / line.lengths[pieces].sum()
        own = pieces[(middle > low) & (middle < high)]
        sides = list(line.sides)
        for piece in own:
            sides[piece] = name
        return line.changed(sides=tuple(sides))

    def path(self, side: str) -> Any:
        """Pieces of a side as shapely lines, chords for arcs."""
        import shapely

        own = [i for i, name in enumerate(self.sides) if name == side]
        lines = []
        for i in own:
            one = slice(i, i + 1)
            flat, _ = curves.flattened(
                self.points[one], self.ends[one], self.bulges[one]
            )
            lines.append(shapely.LineString(np.vstack([flat, self.ends[one]])))
        return shapely.MultiLineString(lines)

    def _cut_side(self, side: str, share: float) -> "Polygon":
        """Put a vertex at a share of a side's length, where none is yet."""
        pieces = self._stretch(side)
        lengths = self.lengths[pieces]
        starts = np.concatenate([[0.0], np.cumsum(lengths)])
        place = share * starts[-1]
        k = min(int(np.searchsorted(starts, place, side="right")) - 1, len(pieces) - 1)
        within = (place - starts[k]) / lengths[k]
        if min(within, 1.0 - within) * lengths[k] <= SNAP * self.size:
            return self
        return self.split(int(pieces[k]), float(within), (side, side))

    def _stretch(self, side: str) -> Any:
        """Pieces of a side in order, from its start."""
        own = np.array([name == side for name in self.sides])
        n = len(own)
        if own.all():
            return np.arange(n)
        heads = np.flatnonzero(own & ~np.roll(own, 1))
        if len(heads) != 1:
            raise InputError(
                f"side {side!r} is in {len(heads)} stretches; give each a name of its "
                "own before parting one."
            )
        return (heads[0] + np.arange(int(own.sum()))) % n

    def changed(self, **changes: Any) -> "Polygon":
        """Return a variant that keeps the notes."""
        line = replace(self, **changes)
        object.__setattr__(line, "notes", (*self.notes, *line.notes))
        return line

    @property
    def _label(self) -> str:
        return f"the polygon with side {self.sides[0]!r}" if self.sides else "a polygon"

    @property
    def _round_off(self) -> float:
        """Distance in m that is none."""
        return STRAIGHT * self.size + LAST_PLACES * float(np.abs(self.points).max())

    def _offset(self) -> Floats:
        """Distance of each vertex from the line through its neighbours in m."""
        before, after = np.roll(self.points, 1, axis=0), self.ends
        chord, arm = after - before, self.points - before
        cross = chord[:, 0] * arm[:, 1] - chord[:, 1] * arm[:, 0]
        length = np.hypot(*chord.T)
        return np.abs(cross) / np.where(length > 0.0, length, np.inf)

    def _check_numbers(self) -> None:
        points, n = self.points, len(np.atleast_1d(self.points))
        arcs = bool(np.any(self.bulges != 0.0))
        if points.ndim != 2 or points.shape[1:] != (2,) or n < (2 if arcs else 3):
            raise InputError(
                f"{self._label} has points of shape {points.shape}; it takes at least "
                "three pairs (x, y), two where a piece is an arc."
            )
        far = ~(np.abs(points) <= FARTHEST).all(axis=1)
        for i in np.flatnonzero(far):
            raise InputError(
                f"{self._label}: point {i + 1} is {at(points[i])}; coordinates must "
                f"be numbers in m, no larger than {FARTHEST:g}."
            )
        for what, given in (("side names", self.sides), ("bulges", self.bulges)):
            if len(given) != n:
                raise InputError(
                    f"{self._label} has {n} points and {len(given)} {what}; give one "
                    "for each piece, from each point to the next."
                )
        wild = ~(np.abs(self.bulges) <= MOST_BULGE)
        for i in np.flatnonzero(wild):
            raise InputError(
                f"{self._label}: piece {i + 1} has bulge {self.bulges[i]:g}; it must "
                f"lie between -{MOST_BULGE:g} and {MOST_BULGE:g}."
            )
        if self.chords not in ("ask", "arc", "polygon"):
            raise InputError(
                f"{self._label}: chords is {self.chords!r}; it must be ask, arc or "
                "polygon."
            )
        if self.snap is not None and not 0.0 <= self.snap < self.size:
            raise InputError(
                f"{self._label}: snap is {self.snap:g} m; it must be at least 0 and "
                "less than the size."
            )

    def _check_points(self) -> None:
        n = len(self.points)
        lengths = curves.chords(self.points, self.ends)
        for i in np.flatnonzero(lengths <= SNAP * self.size):
            j = (i + 1) % n
            raise InputError(
                f"{self._label}: points {i + 1} and {j + 1} coincide near "
                f"{at(self.points[i])}; drop one of them."
            )
        for i in np.flatnonzero(np.abs(self.turns) > math.pi - SNAP):
            raise InputError(
                f"{self._label}: the line turns back on itself at point {i + 1}, "
                f"{at(self.points[i])}; take the spike out."
            )

    def _merge_straight(self) -> None:
        """Take vertices that are hardly off a straight line into it."""
        snap = SNAP * self.size if self.snap is None else self.snap
        merged: list[str] = []
        while len(self.points) > 3:
            off = self._offset()
            flat = (self.bulges == 0.0) & (np.roll(self.bulges, 1) == 0.0)
            near = flat & (off > self._round_off) & (off < snap)
            near &= np.abs(self.turns) < chords.ARC_TURN
            if not near.any():
                break
            least = chords.lowest(np.where(near, off, np.inf))
            merged += [
                f"{at(self.points[i])} by {off[i]:.2g} m" for i in np.flatnonzero(least)
            ]
            self._replace(
                *chords.flattened(self.points, self.sides, self.bulges, least)
            )
        if merged:
            listed = ", ".join(merged[:MOST_LISTED])
            more = len(merged) - MOST_LISTED
            rest = f" and {more} more" if more > 0 else ""
            note = f"merged into the straight line: {listed}{rest}"
            object.__setattr__(self, "notes", (*self.notes, note))

    def _take_arcs(self) -> None:
        """Take runs of chords for the arcs they stand for."""
        if self.chords == "polygon":
            return
        limit = chords.ASK_TURN if self.chords == "arc" else chords.ARC_TURN - 1e-9
        found = [
            run
            for run in chords.runs(self.points, self.sides, self.bulges, self.turns)
            if abs(run.turn) < limit
        ]
        if not found:
            return
        notes = [
            f"{run.pieces} chords of {self.sides[run.first]!r} from "
            f"{at(self.points[run.first])} taken for an arc of radius "
            f"{run.radius:.6g} m"
            for run in found
        ]
        self._replace(*chords.as_arcs(self.points, self.sides, self.bulges, found))
        object.__setattr__(self, "notes", (*self.notes, *notes))

    def _replace(self, points: Floats, sides: tuple[str, ...], bulges: Floats) -> None:
        """Put tidied pieces in place and forget what was derived from the old ones."""
        object.__setattr__(self, "points", read_only_floats(points))
        object.__setattr__(self, "sides", sides)
        object.__setattr__(self, "bulges", read_only_floats(bulges))
        for name in ("turns", "straight", "region", "box"):
            self.__dict__.pop(name, None)

    def _check_crossing(self) -> None:
        from shapely.validation import explain_validity

        if not self.region.is_valid:
            where = explain_validity(self.region).partition("[")[2].rstrip("]")
            x, y, *_ = (float(word) for word in where.split())
            raise InputError(
                f"{self._label} crosses or touches itself at {at((x, y))}; list its "
                "points in the order in which a pencil would draw it."
            )
        if self.area < 0.0:
            raise InputError(
                f"{self._label} runs clockwise from {at(self.points[0])}; list its "
                "points counter-clockwise, with their side names."
            )
        self._check_necks()

    def _check_necks(self) -> None:
        """Refuse a line that comes next to itself."""
        import shapely

        least = SNAP * self.size
        if (self.bulges == 0.0).all():
            neck: Any = shapely.minimum_clearance_line(self.region)
            if neck.length > least:
                return
        else:
            # The clearance of the region is that of the chords it has for arcs.
            pieces = self._pieces()
            near = shapely.STRtree(pieces).query(pieces, "dwithin", least)
            i, j = near[:, (near[0] < near[1])]
            apart = (j - i > 1) & (j - i < len(pieces) - 1)
            if not apart.any():
                return
            neck = shapely.shortest_line(pieces[j[apart][0]], pieces[i[apart][0]])
        raise InputError(
            f"{self._label} comes within {neck.length:.2g} m of itself at "
            f"{at(neck.coords[0])}; part it there, or leave a gap."
        )

    def _pieces(self) -> Any:
        """Each piece as a shapely line, chords for arcs, (n,)."""
        import shapely

        flat, owners = curves.flattened(self.points, self.ends, self.bulges)
        ends = self.ends
        return np.array(
            [
                shapely.LineString(np.vstack([flat[owners == i], ends[i]]))
                for i in range(len(ends))
            ]
        )


def at(point: Any) -> str:
    """Write a place in m; round-off is nought."""
    reach = max(abs(float(point[0])), abs(float(point[1])))
    x, y = (0.0 if abs(c) < STRAIGHT * reach else c + 0.0 for c in point[:2])
    return f"({x:.6g}, {y:.6g}) m"
