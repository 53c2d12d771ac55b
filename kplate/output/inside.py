"""What lies inside the plan of a plate: zones, seams and marks, with their names.

The edge of a zone is thin. A held seam has the symbol of its support on both sides, a
free one is a thin line of dashes and dots. A mark is a small sign of its own.
"""

from typing import Any

import numpy as np

from kplate import curves
from kplate.outline import Outline, Seam
from kplate.output.lettering import Names, Spot, halo
from kplate.output.plan import (
    ARC_STEP,
    FAINT,
    INK,
    NAME_GAP,
    SIDE_NAME,
    Piece,
    draw_piece,
    side_spots,
)
from kplate.plate import Plate
from kplate.supports import Support
from kplate.units import Unit

ZONE_EDGE = {"color": INK, "linewidth": 0.6}
FREE_SEAM = {"color": FAINT, "linewidth": 1.0, "linestyle": (0, (8.0, 2.0, 1.5, 2.0))}
AROUND, MARK_GAP = 7.0, 13.0  # pixels that texts keep off a mark, its name stands off


def draw_inside(axes: Any, plate: Plate, size: float, per_pixel: float) -> None:
    """Draw zones, seams and marks.

    Parameters
    ----------
    axes : Axes
        Of the plan.
    plate : Plate
        What to draw.
    size : float
        Unit of length in m.
    per_pixel : float
        Of it, how many make a pixel.
    """
    outline = plate.outline
    for zone in outline.zones:
        line = zone.shape.line
        points, _ = curves.flattened(line.points, line.ends, line.bulges, step=ARC_STEP)
        axes.plot(*np.vstack([points, points[:1]]).T / size, **ZONE_EDGE)
    for seam in outline.seams:
        support = plate.support(seam.name)
        for piece in _both_sides(seam, size):
            if is_held(support):
                draw_piece(axes, piece, support, per_pixel)
            else:
                axes.plot(*piece.points.T, **FREE_SEAM)
    for mark in outline.marks:
        x, y = mark.at
        axes.plot(x / size, y / size, **mark_sign(plate.support(mark.name)))


def block_inside(names: Names, outline: Outline, size: float, per_pixel: float) -> None:
    """Keep names off seams and marks."""
    for seam in outline.seams:
        piece = _both_sides(seam, size)[0]
        count = int(piece.length / (6.0 * per_pixel)) + 2
        names.block(piece.at(np.linspace(0.0, 1.0, count))[0], 4.0)
    if outline.marks:
        places = np.array([mark.at for mark in outline.marks]) / size
        names.block(places, AROUND)


def write_inside_names(
    names: Names, plate: Plate, length: Unit, per_pixel: float
) -> int:
    """Write the names of marks, seams and zones, these with a thickness of their own.

    Returns
    -------
    int
        How many found no room.
    """
    outline, size, missing = plate.outline, length.size, 0
    for mark in outline.marks:
        at = (mark.at[0] / size, mark.at[1] / size)
        ways = [(1.0, 0.0), (-1.0, 0.0), (0.0, 1.0), (0.0, -1.0)]
        spots = [Spot(at=at, away=way) for way in ways]
        missing += not _write(names, mark.name, spots, MARK_GAP)
    for seam in outline.seams:
        spots = [
            spot
            for piece in _both_sides(seam, size)
            for spot in side_spots(piece, per_pixel)
        ]
        missing += not _write(names, seam.name, spots, NAME_GAP)
    for zone, (thickness, _) in zip(outline.zones, plate.sections[1:], strict=True):
        spots = _zone_spots(zone.shape.line.region, size, per_pixel)
        name = zone.name
        if thickness != plate.thickness:
            name += f", {thickness / size:.4g} {length.symbol}"
        missing += not _write(names, name, spots, 0.0)
    return missing


def is_held(support: Support) -> bool:
    """Whether a support holds anything."""
    return support.holds_deflection or support.holds_slope


def mark_sign(support: Support) -> dict[str, Any]:
    """Sign of a mark: a triangle where it is held, a faint cross where it is free."""
    sign = {"linestyle": "none", "color": INK, "zorder": 5}
    if not is_held(support):
        return {
            **sign,
            "marker": "x",
            "markersize": 5,
            "markeredgewidth": 1.3,
            "color": FAINT,
        }
    edge = {"markeredgecolor": "white", "markeredgewidth": 0.8}
    return {**sign, **edge, "marker": "^", "markersize": 7}


def _write(names: Names, name: str, spots: list[Spot], gap: float) -> bool:
    return names.place(name, spots, SIDE_NAME, gap=gap, path_effects=halo())


def _both_sides(seam: Seam, size: float) -> list[Piece]:
    """A seam with normals to its right, then to its left."""
    ends = seam.points[1:]
    flat, _ = curves.flattened(seam.points[:-1], ends, seam.bulges, step=ARC_STEP)
    points = np.vstack([flat, ends[-1:]]) / size
    step = np.diff(points, axis=0)
    right = np.column_stack([step[:, 1], -step[:, 0]]) / np.hypot(*step.T)[:, None]
    return [
        Piece(side=seam.name, points=points, away=way * right) for way in (1.0, -1.0)
    ]


def _zone_spots(region: Any, size: float, per_pixel: float) -> list[Spot]:
    """In a zone, and at a few places around its middle."""
    middle = region.representative_point()
    low_x, low_y, high_x, high_y = np.array(region.bounds) / size
    room = 0.9 * (high_x - low_x) / per_pixel
    x, y = middle.x / size, middle.y / size
    rows = (y, 0.5 * (y + low_y), 0.5 * (y + high_y))
    return [
        Spot(at=(float(column), float(row)), room=float(room if column == x else 0.0))
        for row in rows
        for column in (x, 0.5 * (x + low_x), 0.5 * (x + high_x))
    ]
