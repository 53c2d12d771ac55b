"""An influence surface as a picture: contours over the plan of the plate.

Each contour is the result of 1 kN down at that place. The place the result is asked for
is a ring; the disc on which a line reaction's kernel smooths the surface is left blank.
"""

from pathlib import Path
from typing import Any

import numpy as np

from kplate.errors import InputError
from kplate.files import replacing
from kplate.goals import (
    ClampingMoment,
    Deflection,
    Goal,
    LineReaction,
    MeanDeflection,
    Moment,
    Resultant,
    Shear,
    Slope,
)
from kplate.influence import InfluenceSurface
from kplate.output.contours import Bands, bands, draw_bands
from kplate.output.inside import draw_inside
from kplate.output.plan import FAINT, INK, draw_piece, pieces
from kplate.output.shape import mean_size
from kplate.units import DisplayUnits, Unit

INCHES, PIXELS = 9.0, 100  # width of the picture; pixels an inch
MARGIN = 0.06  # around the plan, as a share of its mean size
FORCE, FORCE_WORDS = -1e3, "1 kN down"


def write_influence(
    surface: InfluenceSurface, path: Path, *, units: DisplayUnits | None = None
) -> Path:
    """Draw an influence surface.

    Parameters
    ----------
    surface : InfluenceSurface
        What to draw.
    path : Path
        The file: ``.png``, ``.svg`` or ``.pdf``; one that exists is replaced.
    units : DisplayUnits, optional
        What lengths and the result are shown in.

    Returns
    -------
    Path
        The file.

    Raises
    ------
    InputError
        If the file cannot be written, or its name ends otherwise.
    """
    path = Path(path)
    if path.suffix not in (".png", ".svg", ".pdf"):
        raise InputError(f"{str(path)!r} must end in .png, .svg or .pdf; name it so.")
    drawn = influence_figure(surface, units or DisplayUnits())
    with replacing(path) as temporary:
        drawn.savefig(temporary, format=path.suffix[1:], dpi=PIXELS)
    return path


def influence_figure(surface: InfluenceSurface, units: DisplayUnits) -> Any:
    """The picture as a matplotlib figure."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure
    from matplotlib.patches import Circle

    plate, size = surface.plate, units.length.size
    points, values, triangles = surface.sampled()
    points = points / size
    unit = _unit(surface.goal, units)
    values = FORCE * values / unit.size
    largest = float(values[np.abs(values).argmax()])
    shown: Bands = bands("deflection", values, largest)  # as a signed quantity
    low, high = np.reshape(plate.outline.box, (2, 2)) / size
    gap = MARGIN * mean_size(points)
    shape = (high - low + 2.0 * gap)[::-1] / (high - low + 2.0 * gap)[0]
    drawn = Figure(figsize=(INCHES, float(np.clip(0.85 * shape[0], 0.3, 1.6)) * INCHES))
    drawn.set_layout_engine("constrained")
    FigureCanvasAgg(drawn)
    axes: Any = drawn.add_subplot()
    axes.set_aspect("equal")
    filled = draw_bands(axes, points, triangles, shown)
    if filled is not None:
        label = f"{name(surface.goal)} [{unit.symbol}] by {FORCE_WORDS} at a place"
        drawn.colorbar(filled, ax=axes, ticks=list(shown.levels), label=label)
        axes.tricontour(
            *points.T,
            triangles,
            values,
            shown.levels,
            colors=INK,
            linewidths=0.4,
            zorder=1,
        )
    per_pixel = float((high - low + 2.0 * gap)[0]) / (0.8 * INCHES * PIXELS)
    if surface.kernel is not None:
        centre, radius = surface.kernel.centre / size, surface.kernel.radius / size
        disc = Circle(tuple(centre), radius, fc="white", ls=":", ec=FAINT, zorder=1.5)
        axes.add_patch(disc)
    for piece in pieces(plate.outline, size):
        draw_piece(axes, piece, plate.support(piece.side), per_pixel)
    draw_inside(axes, plate, size, per_pixel)
    at = getattr(surface.goal, "at", None)
    if at is not None:
        ring = {"mfc": "none", "ms": 9, "ls": "none", "marker": "o", "zorder": 5}
        axes.plot(at[0] / size, at[1] / size, mec="white", mew=3.5, **ring)
        axes.plot(at[0] / size, at[1] / size, mec=INK, mew=1.5, **ring)
    axes.set_xlim(low[0] - gap, high[0] + gap)
    axes.set_ylim(low[1] - gap, high[1] + gap)
    axes.set_xlabel(f"x [{units.length.symbol}]")
    axes.set_ylabel(f"y [{units.length.symbol}]")
    axes.spines[["top", "right"]].set_visible(False)
    title = f"Influence surface: {_title(surface.goal, units)}"
    if surface.kernel is not None:
        title += "\n(not known on the blank disc: solve for loads there)"
    axes.set_title(title, loc="left", fontsize=11)
    return drawn


def name(goal: Goal) -> str:
    """What a result is called."""
    match goal:
        case Deflection():
            return "deflection"
        case MeanDeflection():
            return "mean deflection"
        case Slope():
            return "slope"
        case Moment(component=component):
            return component
        case ClampingMoment():
            return "m_nn"
        case Shear():
            return "transverse shear"
        case LineReaction():
            return "line reaction"
        case Resultant():
            return "force"
    raise InputError(f"{goal} has no influence surface.")


def _title(goal: Goal, units: DisplayUnits) -> str:
    """The result and where it is asked for."""
    words = name(goal)
    if isinstance(goal, Resultant):
        return f"{words} of {goal.of}"
    if isinstance(goal, MeanDeflection):
        return f"{words} of {goal.zone or 'the plate'}"
    at = getattr(goal, "at", (0.0, 0.0))
    x, y = (value / units.length.size for value in at)
    return f"{words} at ({x:.4g}, {y:.4g}) {units.length.symbol}"


def _unit(goal: Goal, units: DisplayUnits) -> Unit:
    match goal:
        case Deflection() | MeanDeflection():
            return units.deflection
        case Slope():
            return Unit("rad", 1.0)
        case Shear() | LineReaction():
            return units.line_force
        case Resultant():
            return units.force
    return units.moment
