"""One picture of a solved plate: its deflected shape and its plan with contours.

Drawn by matplotlib without a display. The two stand beside each other, or above each
other where the plate is much wider than deep. On the plan the contours are level with
the ticks of the colour bar.
"""

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from kplate.arrays import Floats, Ints
from kplate.elements.triangle import area
from kplate.errors import InputError
from kplate.files import replacing
from kplate.output.contours import Bands, Quantity, bands, draw_bands, draw_levels
from kplate.output.inside import (
    block_inside,
    draw_inside,
    is_held,
    mark_sign,
    write_inside_names,
)
from kplate.output.legend import Symbol, draw_legend
from kplate.output.lettering import FAMILY, Hand, Names, Spot, halo, printable
from kplate.output.plan import (
    FAINT,
    INK,
    block_sides,
    draw_piece,
    pieces,
    write_side_names,
)
from kplate.output.shape import BACK, mean_size, project, scale_factor, surface
from kplate.solution import Solution
from kplate.units import DisplayUnits, Unit
from kplate.values import Value

if TYPE_CHECKING:
    from matplotlib.figure import Figure

Box = tuple[float, float, float, float]  # left, bottom, width, height in pixels

WIDTH, HEIGHT, DPI = 1600, 800, 100  # pixels; pixels an inch
LEFT = 40  # pixels to the left of all text
SIDE_BY_SIDE: tuple[Box, Box] = ((LEFT, 125, 700, 535), (850, 135, 600, 525))
STACKED: tuple[Box, Box] = ((90, 425, 1330, 230), (90, 135, 1330, 215))
WIDE = 2.4  # from this width over depth on, the two stand above each other
MARGIN = 46  # pixels around the plan, for supports and names
DIRECTIONS = 70  # pixels to the left of the shape, for the directions x, y and z
LEAST = 260  # pixels that the plan takes across, for the value of the peak
TITLE, CAPTION = Hand(size=16.0, weight="bold"), Hand(size=11.5, weight="bold")
TEXT, SMALL = Hand(size=10.5), Hand(size=9.5)
PEAK = Hand(size=10.5, weight="bold")
_RC = {
    "font.family": FAMILY,
    "font.size": 10.0,
    "text.color": INK,
    "text.parse_math": False,
    "axes.unicode_minus": False,
    "axes.edgecolor": FAINT,
    "axes.linewidth": 0.8,
    "xtick.color": FAINT,
    "ytick.color": FAINT,
    "xtick.labelcolor": INK,
    "ytick.labelcolor": INK,
}
_CROSS = {"marker": "+", "markersize": 12, "markeredgewidth": 1.8, "color": INK}
_RING = {
    "marker": "o",
    "markersize": 9,
    "markerfacecolor": "none",
    "markeredgecolor": "#c1272d",
    "markeredgewidth": 1.6,
    "linestyle": "none",
    "zorder": 4,
}
_DASHED = {"color": FAINT, "linewidth": 1.0, "linestyle": "--"}


@dataclass(frozen=True, eq=False, kw_only=True)
class Shown:
    """What a picture shows, in display units.

    Parameters
    ----------
    solution : Solution
        The solved plate.
    peak : Value
        Peak of what is coloured, in SI units; names the case.
    units : DisplayUnits
        What lengths, deflections and stresses are shown in.
    points : ndarray, shape (n_points, 2)
        Field points of the solution.
    deflection : ndarray, shape (n_points,)
        Deflection in units of length.
    bands : Bands
        What is coloured, and its levels.
    """

    solution: Solution
    peak: Value
    units: DisplayUnits
    points: Floats
    deflection: Floats
    bands: Bands

    @property
    def triangles(self) -> Ints:
        """Points of each triangle."""
        return self.solution.field_triangles

    @property
    def quantity(self) -> Quantity:
        """What is coloured."""
        return self.bands.quantity

    @property
    def unit(self) -> Unit:
        """Unit of what is coloured."""
        return _unit(self.quantity, self.units)

    @property
    def place(self) -> tuple[float, float]:
        """Place of the peak."""
        assert self.peak.place is not None
        size = self.units.length.size
        return self.peak.place[0] / size, self.peak.place[1] / size

    @property
    def left_out(self) -> list[tuple[float, float]]:
        """Places without a finite moment."""
        size = self.units.length.size
        return [
            (excluded.place[0] / size, excluded.place[1] / size)
            for excluded in self.solution.excluded
            if excluded.case in ("", self.peak.case)
        ]


def write_picture(
    solution: Solution,
    path: Path,
    *,
    case: str | None = None,
    quantity: Quantity = "deflection",
    units: DisplayUnits | None = None,
    title: str = "",
) -> Path:
    """Draw the deflected shape and the plan of a solution into a PNG file.

    Parameters
    ----------
    solution : Solution
        What to draw.
    path : Path
        The file; one that exists is replaced.
    case : str, optional
        The load case; the one with the largest peak if left out.
    quantity : {"deflection", "von Mises"}
        What the colours mean.
    units : DisplayUnits, optional
        What numbers are shown in; mm and MPa if left out.
    title : str
        The heading.

    Returns
    -------
    Path
        The file: 1600 x 800 pixels, the same bytes for the same input.

    Raises
    ------
    InputError
        If there is no such quantity or case, or the file cannot be written.
    """
    path = Path(path)
    with _style():
        drawn = figure(solution, case=case, quantity=quantity, units=units, title=title)
        with replacing(path) as temporary:
            # Without the library's version the bytes depend on the picture alone.
            drawn.savefig(temporary, format="png", dpi=DPI, metadata={"Software": None})
    return path


def figure(
    solution: Solution,
    *,
    case: str | None = None,
    quantity: Quantity = "deflection",
    units: DisplayUnits | None = None,
    title: str = "",
) -> "Figure":
    """Draw what `write_picture` writes; see there."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    if quantity not in ("deflection", "von Mises"):
        raise InputError(
            f"there is no picture of {quantity!r}; draw deflection or von Mises."
        )
    shown = _shown(solution, case, quantity, DisplayUnits() if units is None else units)
    with _style():
        drawn = Figure(figsize=(WIDTH / DPI, HEIGHT / DPI), dpi=DPI, facecolor="white")
        canvas: Any = FigureCanvasAgg(drawn)
        renderer = canvas.get_renderer()
        across, deep = np.ptp(shown.points, axis=0)
        shape, plan = STACKED if across > WIDE * deep else SIDE_BY_SIDE
        _write_headings(drawn, renderer, shown, title)
        _draw_shape(drawn, shown, shape)
        _draw_plan(drawn, renderer, shown, plan)
        _draw_legend(drawn, renderer, shown)
    return drawn


@contextmanager
def _style() -> Iterator[None]:
    """Fixed fonts and colours, whatever the user's matplotlibrc says."""
    import matplotlib

    plain: dict[Any, Any] = {
        key: value
        for key, value in matplotlib.rcParamsDefault.items()
        if not key.startswith(("backend", "interactive", "toolbar", "webagg"))
    }
    with matplotlib.rc_context(plain | _RC):
        yield


def _unit(quantity: Quantity, units: DisplayUnits) -> Unit:
    return units.deflection if quantity == "deflection" else units.stress


def _shown(
    solution: Solution, case: str | None, quantity: Quantity, units: DisplayUnits
) -> Shown:
    """Take what is to be drawn out of a solution."""
    peak = solution.peak(quantity, case=case)
    fields = solution.point_fields(case=peak.case)
    size = _unit(quantity, units).size
    colour = fields["deflection [m]" if quantity == "deflection" else "von Mises [Pa]"]
    corners = solution.field_triangles.ravel()
    small = area(solution.field_points[solution.field_triangles])
    areas = np.bincount(corners, np.repeat(small, 3)).astype(np.float64)
    return Shown(
        solution=solution,
        peak=peak,
        units=units,
        points=solution.field_points / units.length.size,
        deflection=fields["deflection [m]"] / units.length.size,
        bands=bands(quantity, colour / size, peak.value / size, areas),
    )


def _write_headings(drawn: "Figure", renderer: Any, shown: Shown, title: str) -> None:
    """Write the title, and what the picture shows."""
    length, plate = shown.units.length, shown.solution.plate
    room = WIDTH - 2.0 * LEFT
    heading = TITLE.shorten(renderer, printable(title), room)
    _write(drawn, heading, (LEFT, 752), TITLE)
    x, y = (_plain(length, place * length.size) for place in shown.place)
    material = TEXT.shorten(renderer, printable(plate.material.name), 220.0)
    case = TEXT.shorten(renderer, printable(shown.peak.case), 420.0)
    parts = [
        f"case {case}",
        f"peak {shown.quantity} {shown.unit.show(shown.peak.value)} at ({x}, {y}) "
        f"{length.symbol}",
        f"thickness {_plain(length, plate.thickness)} {length.symbol}, {material}",
        f"{len(shown.solution.mesh.triangles)} triangles",
    ]
    if shown.peak.kind == "none":
        parts.append("bands not estimated")
    line = TEXT.shorten(renderer, "     ".join(parts), room)
    _write(drawn, line, (LEFT, 723), TEXT, color=FAINT)


def _write(
    drawn: "Figure", text: str, at: tuple[float, float], hand: Hand, **style: Any
) -> None:
    """Write a text at pixels from the lower left."""
    drawn.text(at[0] / WIDTH, at[1] / HEIGHT, text, fontproperties=hand.font, **style)


def _plain(unit: Unit, value: float) -> str:
    """Four digits of a length, without zeros that say nothing."""
    text = unit.number(0.0 if abs(value) < 1e-9 else value)
    return text.rstrip("0").rstrip(".") if "." in text and "e" not in text else text


def _axes(drawn: "Figure", box: Box, low: Floats, high: Floats) -> Any:
    """Axes with equal scales in the middle of a box."""
    left, bottom, width, height = box
    size = high - low
    per_pixel = float(max(size[0] / width, size[1] / height))
    used = size / per_pixel
    left += 0.5 * (width - used[0])
    bottom += 0.5 * (height - used[1])
    axes = drawn.add_axes(
        (left / WIDTH, bottom / HEIGHT, used[0] / WIDTH, used[1] / HEIGHT)
    )
    axes.set_xlim(float(low[0]), float(high[0]))
    axes.set_ylim(float(low[1]), float(high[1]))
    return axes


def _caption(drawn: "Figure", box: Box, text: str) -> None:
    _write(drawn, text, (box[0], box[1] + box[3] + 12.0), CAPTION)


def _draw_shape(drawn: "Figure", shown: Shown, box: Box) -> None:
    """Draw the deflected shape, and where free sides were."""
    from matplotlib.collections import LineCollection

    plate = shown.solution.plate
    scale = scale_factor(float(np.abs(shown.deflection).max()), mean_size(shown.points))
    bent = np.column_stack([shown.points, scale * shown.deflection])
    flat = [
        project(np.column_stack([piece.points, np.zeros(len(piece.points))]))
        for piece in pieces(plate.outline, shown.units.length.size)
        if shown.deflection.any() and not plate.support(piece.side).holds_deflection
    ]
    reach = np.concatenate([project(bent), *flat])
    gap = 0.02 * np.ptp(reach, axis=0).max()
    low, high = reach.min(axis=0) - gap, reach.max(axis=0) + gap
    axes = _axes(
        drawn, (box[0] + DIRECTIONS, box[1], box[2] - DIRECTIONS, box[3]), low, high
    )
    axes.set_axis_off()
    faces = shown.bands.on_triangles(shown.triangles)
    rim = shown.solution.field_edges
    axes.add_collection(surface(bent, shown.triangles, rim=rim, faces=faces))
    axes.add_collection(
        LineCollection(flat, colors=FAINT, linewidths=1.0, linestyles="dashed")
    )
    factor = np.format_float_positional(scale, trim="-")
    _caption(drawn, box, f"Deflected shape, deflection x {factor}")
    _draw_directions(drawn, box)


def _draw_directions(drawn: "Figure", box: Box) -> None:
    """Draw the directions x, y and z beside the shape."""
    axes: Any = drawn.add_axes(
        (box[0] / WIDTH, (box[1] + box[3] - 70) / HEIGHT, 80 / WIDTH, 70 / HEIGHT)
    )
    axes.set_axis_off()
    axes.set_xlim(0.0, 80.0)
    axes.set_ylim(0.0, 70.0)
    foot, long = np.array([10.0, 14.0]), 34.0
    directions = {"x": np.array([1.0, 0.0]), "y": BACK, "z": np.array([0.0, 1.0])}
    for name, way in directions.items():
        arrow = {"arrowstyle": "-|>", "color": FAINT, "linewidth": 1.0}
        axes.annotate("", foot + long * way, foot, arrowprops=arrow)
        x, y = foot + (long + 8.0 / np.hypot(*way)) * way
        style = {"ha": "center", "va": "center", "color": FAINT}
        axes.text(x, y, name, fontproperties=SMALL.font, **style)


def _draw_plan(drawn: "Figure", renderer: Any, shown: Shown, box: Box) -> None:
    """Draw contours, sides, names, the peak and what is left out."""
    plate, length = shown.solution.plate, shown.units.length
    lines = pieces(plate.outline, length.size)
    # Not the mesh: its chords do not quite reach round a circle.
    low, high = np.reshape(plate.outline.box, (2, 2)) / length.size
    per_pixel = float(np.max((high - low) / (np.array(box[2:]) - 2.0 * MARGIN)))
    gap = np.full(2, MARGIN * per_pixel)
    gap[0] = max(gap[0], 0.5 * (LEAST * per_pixel - (high - low)[0]))
    axes = _axes(drawn, box, low - gap, high + gap)
    _finish_axes(axes, length, low, high, per_pixel)
    filled = draw_bands(axes, shown.points, shown.triangles, shown.bands)
    if filled is not None:
        _draw_bar(drawn, axes, shown, filled)
    for piece in lines:
        draw_piece(axes, piece, plate.support(piece.side), per_pixel)
    draw_inside(axes, plate, length.size, per_pixel)
    names = Names(axes, renderer)
    block_sides(names, lines, per_pixel)
    block_inside(names, plate.outline, length.size, per_pixel)
    _draw_marks(axes, names, shown)
    missing = write_side_names(names, lines, per_pixel)
    missing += write_inside_names(names, plate, length, per_pixel)
    draw_levels(axes, names, shown.points, shown.triangles, shown.bands)
    caption = f"Plan, {shown.quantity}"
    if filled is not None:
        caption += f", a contour every {shown.bands.step:g} {shown.unit.symbol}"
    if missing:
        caption += f" (no room for {missing} name{'s' * (missing > 1)})"
    _caption(drawn, box, caption)


def _draw_bar(drawn: "Figure", axes: Any, shown: Shown, filled: Any) -> None:
    """Explain the colours to the right of the plan."""
    place = axes.get_position()
    low, high = place.y0 + 0.06 * place.height, 0.88 * place.height
    bar = drawn.add_axes((place.x1 + 24 / WIDTH, low, 16 / WIDTH, high))
    sign = ", positive up" if shown.quantity == "deflection" else ", both faces"
    label = f"{shown.quantity} [{shown.unit.symbol}]{sign}"
    levels = list(shown.bands.levels)
    drawn.colorbar(filled, cax=bar, ticks=levels, label=label)
    bar.set_yticks(levels, [f"{level:g}" for level in levels])
    bar.tick_params(length=3.5, labelsize=9)


def _finish_axes(
    axes: Any, length: Unit, low: Floats, high: Floats, per_pixel: float
) -> None:
    """Axes as long as the plate, apart from it."""
    from matplotlib.ticker import MaxNLocator

    axes.set_xlabel(f"x [{length.symbol}]")
    axes.set_ylabel(f"y [{length.symbol}]")
    axes.tick_params(length=3.5, labelsize=9)
    axes.spines[["top", "right"]].set_visible(False)
    for side, own, first, last in zip(
        ("bottom", "left"), (axes.xaxis, axes.yaxis), low, high, strict=True
    ):
        most = int(np.clip((last - first) / (70.0 * per_pixel), 1, 7))
        locator = MaxNLocator(nbins=most, steps=[1, 2, 2.5, 5, 10])
        ticks = np.asarray(locator.tick_values(first, last))
        slack = 1e-6 * (last - first)
        ticks = ticks[(ticks >= first - slack) & (ticks <= last + slack)]
        own.set_ticks(ticks, [f"{tick:.10g}" for tick in ticks])
        axes.spines[side].set_bounds(first, last)
    axes.spines["left"].set_position(("data", float(low[0]) - MARGIN * per_pixel))


def _draw_marks(axes: Any, names: Names, shown: Shown) -> None:
    """Mark the places left out, and the peak with its value."""
    for place in shown.left_out:
        axes.plot(*place, **_RING)
        names.block(np.array([place]), 8.0)
    at = shown.place
    back = {**_CROSS, "color": "white", "markersize": 14, "markeredgewidth": 4.0}
    axes.plot(*at, **back)
    axes.plot(*at, **_CROSS)
    names.block(np.array([at]), 7.0)
    half = float(np.sqrt(0.5))
    ways = [(1.0, 0.0), (-1.0, 0.0), (0.0, 1.0), (0.0, -1.0)]
    ways += [(half, half), (-half, half), (-half, -half), (half, -half)]
    names.place(
        shown.unit.show(shown.peak.value),
        [Spot(at=at, away=way) for way in ways],
        PEAK,
        gap=12.0,
        path_effects=halo(),
    )


def _draw_legend(drawn: "Figure", renderer: Any, shown: Shown) -> None:
    """Write what the symbols mean, in rows along the bottom."""
    axes: Any = drawn.add_axes((0.0, 0.0, 1.0, 78 / HEIGHT))
    axes.set_axis_off()
    axes.set_xlim(0.0, WIDTH)
    axes.set_ylim(0.0, 78.0)
    start = (float(LEFT), 50.0)
    draw_legend(axes, renderer, _legend(shown), hand=SMALL, start=start)


def _legend(shown: Shown) -> list[tuple[Symbol, str]]:
    """Symbols and what they mean."""
    plate = shown.solution.plate
    outline = plate.outline
    seams = [plate.support(seam.name) for seam in outline.seams]
    marks = {plate.support(mark.name) for mark in outline.marks}
    sides = {plate.support(side) for side in outline.side_names}
    supports = sides.union(filter(is_held, seams))
    entries: list[tuple[Symbol, str]] = [
        (support, f"{support.name}: {support.words}")
        for support in sorted(supports, key=lambda s: (s.words, s.name), reverse=True)
    ]
    entries += [
        (mark_sign(support), f"{support.name} point")
        for support in sorted(marks, key=lambda s: s.name)
    ]
    entries.append((_CROSS, f"peak {shown.quantity}"))
    if shown.left_out:
        count = len(shown.left_out)
        entries.append((_RING, f"no finite moment: left out of peaks ({count})"))
    if shown.deflection.any() and not all(s.holds_deflection for s in sides):
        entries.append((_DASHED, "undeflected"))
    return entries
