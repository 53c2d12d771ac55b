"""What a mesh must follow so that loads and goals are exact on it.

Outlines of rectangular patches and the surface of a liquid become seams, point forces
and the places of deflections become marks. None of them is held; they are no part of
the plate as stated. One that the outline does not take, such as a patch that reaches
over a seam, is left out: its load is then balanced on the average only, which widens
the bands.
"""

import itertools
from collections.abc import Sequence

import numpy as np

from kplate.errors import KplateError
from kplate.goals import Deflection, Goal, Place
from kplate.loads import Case, Hydrostatic, PointForce, RectanglePatch
from kplate.outline import Outline
from kplate.polygon import SNAP


def followed(outline: Outline, cases: Sequence[Case], goals: Sequence[Goal]) -> Outline:
    """The outline with what a mesh must follow.

    Parameters
    ----------
    outline : Outline
        As stated.
    cases : sequence of Case
        Their loads.
    goals : sequence of Goal
        Their places.

    Returns
    -------
    Outline
    """
    seen: set[tuple[float, ...]] = set()
    for case in cases:
        for load in case.loads:
            if isinstance(load, RectanglePatch):
                corners = [*load.corners, load.corners[0]]
                outline = _with_seam(outline, corners, seen)
            elif isinstance(load, Hydrostatic):
                for line in _waterlines(outline, load):
                    outline = _with_seam(outline, line, seen)
            elif isinstance(load, PointForce):
                outline = _with_mark(outline, load.at)
    for goal in goals:
        if isinstance(goal, Deflection):
            outline = _with_mark(outline, goal.at)
    return outline


def _with_seam(
    outline: Outline, points: Sequence[Place], seen: set[tuple[float, ...]]
) -> Outline:
    """Add a seam, unless it is there already or does not fit."""
    key = tuple(np.round(np.ravel(points), 12).tolist())
    if key in seen:
        return outline
    seen.add(key)
    try:
        return outline.seam(points, name=_unused(outline, "load line"))
    except KplateError:
        return outline


def _with_mark(outline: Outline, place: Place) -> Outline:
    """Add a mark, unless a vertex lies there already or it does not fit."""
    known = [own.points for own in outline.boundaries]
    known += [seam.points for seam in outline.seams]
    known += [zone.shape.line.points for zone in outline.zones]
    known.append(np.reshape([mark.at for mark in outline.marks], (-1, 2)))
    off = np.hypot(*(np.concatenate(known) - place).T)
    if off.min(initial=np.inf) < SNAP * outline.size:
        return outline
    try:
        return outline.mark(place, name=_unused(outline, "load point"))
    except KplateError:
        return outline


def _unused(outline: Outline, stem: str) -> str:
    """The stem with the first number that makes it a name of nothing else."""
    taken = {*outline.names, *outline.zone_names}
    numbered = (f"{stem} {number}" for number in itertools.count(1))
    return next(name for name in numbered if name not in taken)


def _waterlines(outline: Outline, load: Hydrostatic) -> list[list[Place]]:
    """Where the surface of a liquid crosses the plate."""
    up = np.asarray(load.up, dtype=float) / np.hypot(*load.up)
    along = np.array([-up[1], up[0]])
    low_x, low_y, high_x, high_y = outline.box
    centre = np.array([low_x + high_x, low_y + high_y]) / 2.0
    foot = centre + (load.level - centre @ up) * up
    reach = float(np.hypot(high_x - low_x, high_y - low_y))
    (x0, y0), (x1, y1) = foot - reach * along, foot + reach * along
    return outline.crossed((float(x0), float(y0)), (float(x1), float(y1)))
