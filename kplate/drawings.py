"""Outlines from drawings: which closed line is the rim, which are holes, their names.

The outermost closed line is the rim, those inside it are holes. The sides of the rim
are "side-1", "side-2", ... counter-clockwise from its lowest left corner; a side runs
from corner to corner, and changes where a straight piece meets an arc. The rims of the
holes are "hole-1", "hole-2", ... row by row from below, each row from the left. Names
do not depend on the order in which the drawing was made.
"""

import contextlib
from collections.abc import Sequence
from dataclasses import dataclass, replace
from itertools import pairwise
from typing import Any

import numpy as np

from kplate import curves
from kplate.arrays import Bools, Floats, Ints
from kplate.chaining import Chained, Loop, count, place
from kplate.chords import ARC_TURN, runs
from kplate.errors import InputError
from kplate.outline import Outline
from kplate.polygon import SNAP, Chords, Polygon
from kplate.shapes import Circle, ClosedLine
from kplate.units import Unit

# Places closer than this share of the size are level, or equally far left: what decides
# an order must not hang on the last digit.
LEVEL = 1e-3
# Arcs whose circles agree to this share of the radius are one circle.
ONE_CIRCLE = 1e-9


@dataclass(frozen=True, eq=False, kw_only=True)
class Drawing:
    """An outline read from a drawing, and how it was read.

    Parameters
    ----------
    outline : Outline
        The outline, in m.
    unit : str
        Unit of length in which the drawing is made.
    notes : tuple of str
        What was chained, snapped, turned round, merged or taken for an arc.
    ignored : tuple of str
        What the drawing holds that is no part of the outline, with kind, layer, place.
    """

    outline: Outline
    unit: str
    notes: tuple[str, ...] = ()
    ignored: tuple[str, ...] = ()


def drawing_of(
    chained: Chained,
    *,
    unit: Unit,
    chords: Chords = "ask",
    notes: Sequence[str] = (),
    ignored: Sequence[str] = (),
) -> Drawing:
    """Make the outline of closed lines.

    Parameters
    ----------
    chained : Chained
        The closed lines.
    unit : Unit
        The unit of the drawing, in which places are named.
    chords : {"ask", "arc", "polygon"}
        What runs of straight pieces on a circle are, as in `Polygon`.
    notes, ignored : sequence of str
        What to say besides.

    Returns
    -------
    Drawing

    Raises
    ------
    InputError
        If a line crosses or touches itself or another, two lie side by side, or one
        lies in a hole.
    """
    loops = chained.loops
    for loop in loops:
        check_simple(loop, unit)
    rim = _rim(loops, unit)
    turned = [
        f"{_where(loop, unit)} turned round: it was drawn clockwise"
        for loop in loops
        if loop.whole and signed_area(loop.points, loop.bulges) < 0.0
    ]
    lines = [_tidy(loop, unit, chords) for loop in loops]
    outer = lines.pop(rim)
    tidied = [note for line in (outer, *lines) for note in line.notes]
    holes = [
        _shape(replace(line, sides=(f"hole-{k}",) * len(line.sides)))
        for k, line in enumerate(_in_rows(lines, outer.size), start=1)
    ]
    return Drawing(
        outline=Outline(rim=_shape(_with_sides(outer, chords)), holes=tuple(holes)),
        unit=unit.symbol,
        notes=(*notes, *chained.notes, *turned, *tidied),
        ignored=(*ignored, *chained.ignored),
    )


def check_simple(loop: Loop, unit: Unit) -> None:
    """Refuse a closed line that crosses or touches itself."""
    where = crossing(loop.points, loop.bulges)
    if where is not None:
        raise InputError(
            f"{_where(loop, unit)} crosses or touches itself at {place(where, unit)}; "
            "draw it so that it meets itself nowhere."
        )


def crossing(points: Floats, bulges: Floats) -> tuple[float, float] | None:
    """A point at which a closed line crosses or touches itself, if it does."""
    from shapely.validation import explain_validity

    region = _region(points, bulges)
    if region.is_valid:
        return None
    x, y, *_ = explain_validity(region).partition("[")[2].rstrip("]").split()
    return float(x), float(y)


def signed_area(points: Floats, bulges: Floats) -> float:
    """Area in m2 that a closed line encloses, negative where it runs clockwise."""
    x, y = (points - points[0]).T
    flat = 0.5 * float(np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y))
    ends = np.roll(points, -1, axis=0)
    return flat + float(curves.slivers(points, ends, bulges).sum())


def turned_round(points: Floats, bulges: Floats) -> tuple[Floats, Floats]:
    """Return the same closed line, run through the other way."""
    return points[::-1], -np.roll(bulges[::-1], -1)


def _region(points: Floats, bulges: Floats) -> Any:
    """The area that a closed line encloses, chords for arcs."""
    import shapely

    flat, _ = curves.flattened(points, np.roll(points, -1, axis=0), bulges)
    if len(flat) < 3:
        return shapely.Polygon(np.vstack([flat, flat, flat])[:4])
    return shapely.Polygon(flat)


def _rim(loops: Sequence[Loop], unit: Unit) -> int:
    """Number of the outermost closed line; all others are strictly within it."""
    import shapely

    regions = [_region(loop.points, loop.bulges) for loop in loops]
    rim = int(np.argmax([region.area for region in regions]))
    lines = [region.exterior for region in regions]
    tree: Any = shapely.STRtree(lines)
    # No closer than an outline allows.
    least = 2.0 * SNAP * float(shapely.length(shapely.box(*regions[rim].bounds)))
    near = tree.query(lines, predicate="dwithin", distance=least)
    for i, j in sorted(near.T.tolist()):
        if i < j:
            meeting = shapely.shortest_line(lines[i], lines[j]).coords[0]
            raise InputError(
                f"two closed lines cross or touch at {place(meeting, unit)}; a hole "
                "must lie strictly inside the rim and apart from other holes."
            )
    # Lines that do not meet lie in each other or apart: a point of each tells.
    inside = shapely.STRtree(regions).query(
        [shapely.Point(line.coords[0]) for line in lines], predicate="within"
    )
    holders: list[set[int]] = [set() for _ in loops]
    for inner, outer in inside.T.tolist():
        if inner != outer:
            holders[inner].add(outer)
    for i, holding in enumerate(holders):
        if i == rim:
            continue
        if rim not in holding:
            raise InputError(
                f"{_where(loops[i], unit)} lies outside {_where(loops[rim], unit)}; a "
                "panel has one rim. Take one of them out, or choose its layer."
            )
        within = sorted(holding - {rim})
        if within:
            raise InputError(
                f"{_where(loops[i], unit)} lies inside the hole of "
                f"{_where(loops[within[0]], unit)}; a panel has a rim and holes, "
                "nothing in them. Take it out, or choose the layers of the panel."
            )
    return rim


def _where(loop: Loop, unit: Unit) -> str:
    """Name a closed line by its box."""
    flat, _ = curves.flattened(
        loop.points, np.roll(loop.points, -1, axis=0), loop.bulges
    )
    low, high = flat.min(axis=0), flat.max(axis=0)
    return f"the closed line from {place(low, unit)} to {place(high, unit)}"


def _tidy(loop: Loop, unit: Unit, chords: Chords) -> Polygon:
    """Polygon of one name, counter-clockwise, without vertices on straight lines."""
    points, bulges = loop.points, loop.bulges
    if signed_area(loop.points, loop.bulges) < 0.0:
        points, bulges = turned_round(points, bulges)
    try:
        line = Polygon(
            points=points, sides=("line",) * len(points), bulges=bulges, chords=chords
        )
        flat = line.straight & (line.bulges == 0.0) & (np.roll(line.bulges, 1) == 0.0)
        if not flat.any():
            return line
        plain = Polygon(
            points=line.points[~flat],
            sides=("line",) * int((~flat).sum()),
            bulges=line.bulges[~flat],
            chords=chords,
        )
    except InputError as error:
        why = str(error).removeprefix("the polygon with side 'line'")
        raise InputError(f"{_where(loop, unit)}{why}") from error
    merged = f"{count(int(flat.sum()), 'vertex')} on straight lines dropped"
    merged = merged.replace("vertexs", "vertices")
    object.__setattr__(plain, "notes", (*line.notes, merged, *plain.notes))
    return plain


def _with_sides(line: Polygon, chords: Chords) -> Polygon:
    """Begin at the lowest left corner and name the sides from there."""
    starts = ~_continues(line, chords)
    anywhere = np.flatnonzero(starts) if starts.any() else np.arange(len(starts))
    first = _lowest_left(line.points, anywhere, LEVEL * line.size)
    turned = np.roll(starts, -first)
    turned[0] = True
    numbers = np.cumsum(turned)
    return Polygon(
        points=np.roll(line.points, -first, axis=0),
        sides=tuple(f"side-{number}" for number in numbers),
        bulges=np.roll(line.bulges, -first),
        chords=chords,
    )


def _continues(line: Polygon, chords: Chords) -> Bools:
    """Vertices at which the side before goes on, (n,)."""
    straight = line.bulges == 0.0
    alike = straight == np.roll(straight, 1)
    goes_on: Bools = alike & (np.abs(line.turns) < ARC_TURN - 1e-9)
    if chords != "polygon":
        # Chords that may stand for an arc are one side, whatever they turn out to be.
        n = len(straight)
        for run in runs(line.points, line.sides, line.bulges, line.turns):
            inside = range(0 if run.pieces == n else 1, run.pieces)
            goes_on[[(run.first + k) % n for k in inside]] = True
    return goes_on


def _lowest_left(points: Floats, among: Ints, level: float) -> int:
    """The vertex farthest down to the left; of several, the lowest."""
    sums = points[among].sum(axis=1)
    near = among[sums <= sums.min() + level]
    return int(near[np.argmin(points[near, 1])])


def _in_rows(lines: Sequence[Polygon], size: float) -> list[Polygon]:
    """Put holes in order: rows from below, each from the left."""
    if not lines:
        return []
    boxes = np.array([line.box for line in lines])
    x, y = boxes[:, [0, 2]].mean(axis=1), boxes[:, [1, 3]].mean(axis=1)
    rising = np.argsort(y, kind="stable")
    row = np.zeros(len(lines), dtype=int)
    for below, above in pairwise(rising):
        row[above] = row[below] + (y[above] - y[below] > LEVEL * size)
    return [lines[i] for i in np.lexsort((y, x, row))]


def _shape(line: Polygon) -> ClosedLine:
    """The circle whose boundary a polygon is, or itself."""
    x, y, radius = line.circles.T
    if np.isnan(radius).any() or (line.bulges < 0.0).any():
        return line
    spread = max(np.ptp(x), np.ptp(y), np.ptp(radius))
    if spread > ONE_CIRCLE * radius.max():
        return line
    with contextlib.suppress(InputError):
        centre = (float(x.mean()), float(y.mean()))
        return Circle(centre=centre, radius=float(radius.mean()), name=line.sides[0])
    return line
