"""A field of a solution on matplotlib axes: the plan, contours, supports, peaks."""

from typing import Any

import numpy as np

from kplate.arrays import Floats
from kplate.errors import InputError
from kplate.output.colours import Colours, colours
from kplate.output.inside import draw_inside
from kplate.output.plan import FAINT, INK, draw_piece, pieces
from kplate.output.result import Result, fields_of
from kplate.output.shades import FACES, Shade
from kplate.plate import Plate
from kplate.solution import Solution
from kplate.units import DisplayUnits

# Short names, as goals and peaks have them, for those of fields.
SHORT = {
    "w": "deflection",
    "m_xx": "moments xx",
    "m_yy": "moments yy",
    "m_xy": "moments xy",
    "q_x": "shears x",
    "q_y": "shears y",
}
HALO = {"color": "white", "markeredgewidth": 4.0, "markersize": 11.0}
MARGIN = 0.05  # around the plate, share of its size
SIZE = 520.0  # pixels that a plate is taken to have across, for signs of supports


def plot(
    solution: Solution,
    quantity: str = "deflection",
    *,
    ax: Any = None,
    case: str | None = None,
    face: str = "bottom",
    units: DisplayUnits | None = None,
    limits: tuple[float, float] | None = None,
) -> Any:
    """Draw a field of a solution over its plan.

    Parameters
    ----------
    solution : Solution
        What to draw.
    quantity : str
        "deflection", "von Mises", "m_xx", "m_yy", "m_xy", "q_x", "q_y", or any other
        that the window offers, such as "largest principal".
    ax : matplotlib Axes, optional
        Where; axes of a new figure if left out.
    case : str, optional
        The load case; may be left out where there is only one.
    face : {"bottom", "top"}
        The face, of stresses.
    units : DisplayUnits, optional
        What numbers are shown in; mm, N, N/mm and MPa if left out.
    limits : tuple of float, optional
        Values in that unit that the colours span at least, such as those of another
        case.

    Returns
    -------
    Axes
        With equal scales: filled contours, their bar with quantity and unit, lines
        where two colours meet (dashed below zero), outline and supports, rings around
        places without a finite moment, and the largest and smallest value elsewhere
        (+, x).

    Raises
    ------
    InputError
        If there is no such quantity, case or face.
    """
    if face not in FACES:
        raise InputError(f"there is no face {face!r}; the faces are top and bottom.")
    if case is None and len(solution.cases) > 1:
        raise InputError(
            f"there are {len(solution.cases)} load cases; name one of "
            f"{', '.join(solution.cases)}."
        )
    own = solution.cases[0] if case is None else case
    if own not in solution.cases:
        raise InputError(
            f"there is no load case {own!r}; the cases are {', '.join(solution.cases)}."
        )
    shown = DisplayUnits() if units is None else units
    result = fields_of(solution, shown)
    shade = find_shade(result, quantity)
    values = result.shown(own, shade, face)
    judged = result.judged(own)
    chosen = colours(np.append(values[judged], limits or ()), values)
    axes = new_axes() if ax is None else ax
    draw_field(axes, result, (values, judged), chosen, shade.title(face))
    draw_outline(axes, solution.plate, shown)
    for disc in result.left_out(own):
        x, y = np.array(disc.place) / shown.length.size
        axes.plot(x, y, marker="o", markersize=8, color="#c1272d", fillstyle="none")
    axes.set_title(_title(shade, face, own, solution), fontsize="medium", loc="left")
    return axes


def draw_field(
    axes: Any,
    result: Result,
    shown: tuple[Floats, Any],
    chosen: Colours,
    title: str,
) -> None:
    """Draw values at the field points, those judged with their extremes, and a bar."""
    values, judged = shown
    points = result.fields.points[:, :2] / result.units.length.size
    filled = _fill(axes, points, result, (values, chosen))
    _draw_peaks(axes, points, (values, judged), chosen)
    bar = axes.figure.colorbar(filled, ax=axes, ticks=chosen.levels, shrink=0.9)
    bar.set_label(title)
    bar.ax.set_yticks(chosen.levels, [f"{level:.4g}" for level in chosen.levels])


def find_shade(result: Result, quantity: str) -> Shade:
    """A quantity by its name, or by the short one that goals have.

    Raises
    ------
    InputError
        If there is none such.
    """
    name = SHORT.get(quantity, quantity)
    for shade in result.shades:
        if shade.name == name:
            return shade
    raise InputError(
        f"there is no quantity {quantity!r}; there are "
        f"{', '.join(shade.name for shade in result.shades)}."
    )


def new_axes() -> Any:
    """Axes of a figure of its own, without a window."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    figure = Figure(figsize=(7.0, 5.0), layout="constrained")
    FigureCanvasAgg(figure)
    return figure.add_subplot()


def draw_outline(axes: Any, plate: Plate, units: DisplayUnits) -> None:
    """Draw sides with their supports, seams, zones and marks; label the axes."""
    length = units.length
    low, high = np.reshape(plate.outline.box, (2, 2)) / length.size
    size = float((high - low).max())
    per_pixel = size / SIZE
    for piece in pieces(plate.outline, length.size):
        draw_piece(axes, piece, plate.support(piece.side), per_pixel)
    draw_inside(axes, plate, length.size, per_pixel)
    axes.set_aspect("equal")
    gap = MARGIN * size
    axes.set_xlim(low[0] - gap, high[0] + gap)
    axes.set_ylim(low[1] - gap, high[1] + gap)
    axes.set_xlabel(f"x [{length.symbol}]")
    axes.set_ylabel(f"y [{length.symbol}]")
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)


def _fill(
    axes: Any, points: Floats, result: Result, shown: tuple[Floats, Colours]
) -> Any:
    from matplotlib.colors import BoundaryNorm, ListedColormap
    from matplotlib.tri import Triangulation

    from kplate.output.colours import BEYOND

    values, chosen = shown
    grid: Any = Triangulation(points[:, 0], points[:, 1], result.fields.triangles)
    table: Any = ListedColormap([tuple(band) for band in chosen.bands])
    extend = {
        (False, False): "neither",
        (True, False): "min",
        (False, True): "max",
        (True, True): "both",
    }[chosen.below, chosen.above]
    table = table.with_extremes(under=BEYOND, over=BEYOND)
    # What round-off brings beyond the last level belongs to its band.
    low, high = chosen.limits
    hair = 1e-9 * (high - low)
    inside = np.clip(
        values,
        -np.inf if chosen.below else low + hair,
        np.inf if chosen.above else high - hair,
    )
    filled = axes.tricontourf(
        grid,
        inside,
        chosen.levels,
        cmap=table,
        norm=BoundaryNorm(list(chosen.levels), len(chosen.bands)),
        extend=extend,
    )
    inner = chosen.inner
    inner = inner[(inner > inside.min()) & (inner < inside.max())]
    if len(inner):
        styles = ["dashed" if level < 0.0 < high else "solid" for level in inner]
        axes.tricontour(
            grid,
            inside,
            inner,
            colors=INK,
            linewidths=0.5,
            linestyles=styles,
            alpha=0.6,
        )
    return filled


def _draw_peaks(
    axes: Any, points: Floats, shown: tuple[Floats, Any], chosen: Colours
) -> None:
    """Mark the largest value (+) and the smallest (x), where they are not nothing."""
    values, judged = shown
    low, high = chosen.limits
    middle = 0.5 * (points[:, 0].min() + points[:, 0].max())
    for sign, marker in ((1.0, "+"), (-1.0, "x")):
        at = int(np.argmax(np.where(judged, sign * values, -np.inf)))
        if sign * values[at] < 0.02 * max(high, -low):
            continue
        mark = {"marker": marker, "markersize": 9.0, "markeredgewidth": 1.6}
        axes.plot(*points[at], **mark | HALO)
        axes.plot(*points[at], **mark, color=INK)
        right = points[at, 0] > middle
        axes.annotate(
            f"{values[at]:.4g}",
            points[at],
            xytext=(-8 if right else 8, 6),
            textcoords="offset points",
            ha="right" if right else "left",
            fontsize="small",
            fontweight="bold",
            color=INK,
            bbox={"facecolor": "white", "alpha": 0.7, "edgecolor": FAINT, "pad": 1.5},
        )


def _title(shade: Shade, face: str, case: str, solution: Solution) -> str:
    words = shade.title(face)
    return f"{words}, case {case}" if len(solution.cases) > 1 else words
