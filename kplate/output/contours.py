"""Bands of colour between round levels, and the levels written on their lines.

Deflections have one colour from pale at zero to dark, or two where they go both ways;
stresses start from zero. All values are in display units.
"""

from dataclasses import dataclass
from typing import Any, Literal

import numpy as np

from kplate.arrays import Floats, Ints
from kplate.output.lettering import Hand, Names, Spot, halo, upright

Quantity = Literal["deflection", "von Mises"]

MOST_BANDS = 9
TINY = 0.01  # deflections the other way below this share do not change the colours
# Colours go up to the stress that all but this share of the plate stays below, if
# that is less than half the peak; or a corner would leave the plate in one colour.
RARE = 0.02
LEVEL = Hand(size=8.0)
SHORTEST_LINE = 80.0  # pixels of a contour that its level is written on
PLAIN = "#f2f2f2"  # a plate with nothing to tell apart
BEYOND = "#6a0d1c"  # above the highest level


@dataclass(frozen=True, eq=False, kw_only=True)
class Bands:
    """What is coloured, and where the contours are.

    Parameters
    ----------
    quantity : {"deflection", "von Mises"}
        What it is.
    values : ndarray, shape (n_points,)
        Values at the vertices.
    levels : ndarray
        The levels, rising evenly; none where all values are zero.
    """

    quantity: Quantity
    values: Floats
    levels: Floats

    @property
    def step(self) -> float:
        """From one level to the next."""
        return float(self.levels[1] - self.levels[0])

    @property
    def go_beyond(self) -> bool:
        """Whether stresses go beyond the highest level."""
        above = self.values.max() > self.levels[-1]
        return bool(above) and self.quantity != "deflection"

    @property
    def within(self) -> Floats:
        """Values moved inside the levels, where they do not go beyond on purpose."""
        # Just inside: what equals the last level belongs to no band.
        hair = 1e-9 * (self.levels[-1] - self.levels[0])
        top = np.inf if self.go_beyond else self.levels[-1] - hair
        return np.clip(self.values, self.levels[0] + hair, top)

    def colours(self) -> tuple[Any, Any]:
        """Colour map, and the limits it spans."""
        import matplotlib
        from matplotlib.colors import LinearSegmentedColormap, Normalize

        low, high = float(self.levels[0]), float(self.levels[-1])
        if low < 0.0 < high:
            low, high = -max(-low, high), max(-low, high)
            colours = matplotlib.colormaps["RdBu_r"](np.linspace(0.1, 0.9, 256))
        else:
            name = "YlGnBu" if self.quantity == "deflection" else "YlOrRd"
            colours = matplotlib.colormaps[name](np.linspace(0.04, 0.82, 256))
            colours = colours[::-1] if high <= 0.0 else colours
        found = LinearSegmentedColormap.from_list("kplate", list(colours))
        return found.with_extremes(over=BEYOND), Normalize(low, high)

    def on_triangles(self, triangles: Ints) -> Floats:
        """Colour of each triangle (n_triangles, 3), (n_triangles, 4)."""
        from matplotlib.colors import to_rgba

        if not len(self.levels):
            return np.tile(to_rgba(PLAIN), (len(triangles), 1))
        colours, limits = self.colours()
        means = self.within[triangles].mean(axis=1)
        return np.asarray(colours(limits(means)), dtype=np.float64)


def bands(
    quantity: Quantity, values: Floats, peak: float, areas: Floats | None = None
) -> Bands:
    """Choose levels for vertex values, and for a peak that may lie between vertices.

    `areas` says how much of the plate each value stands for; alike if left out.
    """
    low, high = 0.0, peak
    if quantity == "deflection":
        low = min(0.0, peak, float(values.min()))
        high = max(0.0, peak, float(values.max()))
        low = 0.0 if -low < TINY * high else low
        high = 0.0 if high < -TINY * low else high
    else:
        order = np.argsort(values)
        shares = np.ones(len(values)) if areas is None else areas
        below = np.cumsum(shares[order])
        usual = float(values[order][np.searchsorted(below, (1.0 - RARE) * below[-1])])
        high = usual if usual < 0.5 * peak else peak
    return Bands(quantity=quantity, values=values, levels=_levels(low, high))


def _levels(low: float, high: float) -> Floats:
    """Round numbers from at most low to at least high; none if there is no range."""
    from matplotlib.ticker import MaxNLocator

    if low == high:
        return np.empty(0)
    locator = MaxNLocator(nbins=MOST_BANDS, steps=[1, 2, 2.5, 5, 10])
    return np.asarray(locator.tick_values(low, high), dtype=np.float64)


def draw_bands(axes: Any, points: Floats, triangles: Ints, drawn: Bands) -> Any:
    """Fill the bands over triangles (n_triangles, 3) of points (n_points, 2).

    Returns
    -------
    object
        The filled contours, for a colour bar; ``None`` where there are no levels.
    """
    from matplotlib.colors import ListedColormap
    from matplotlib.tri import Triangulation

    grid: Any = Triangulation(points[:, 0], points[:, 1], triangles)
    levels = drawn.levels
    if not len(levels):
        axes.tripcolor(grid, drawn.values, cmap=ListedColormap([PLAIN]))
        return None
    colours, limits = drawn.colours()
    extend = "max" if drawn.go_beyond else "neither"
    return axes.tricontourf(
        grid, drawn.within, levels, cmap=colours, norm=limits, extend=extend
    )


def draw_levels(
    axes: Any, names: Names, points: Floats, triangles: Ints, drawn: Bands
) -> None:
    """Draw the contours, and write each level on its longest line.

    None at the ends of the range: zero is where the supports are, and round-off.
    """
    from matplotlib.tri import Triangulation

    levels = drawn.levels[1:] if len(drawn.levels) else drawn.levels
    levels = levels if len(levels) and drawn.go_beyond else levels[:-1]
    if not len(levels):
        return
    grid: Any = Triangulation(points[:, 0], points[:, 1], triangles)
    style = {"colors": "#1a1a1a", "linewidths": 0.5, "linestyles": "solid"}
    contours: Any = axes.tricontour(grid, drawn.within, levels, **style, alpha=0.6)
    for level, lines in zip(levels, contours.allsegs, strict=True):
        on_page = [axes.transData.transform(line) for line in lines if len(line) > 2]
        lengths = [np.hypot(*np.diff(line, axis=0).T).sum() for line in on_page]
        if max(lengths, default=0.0) >= SHORTEST_LINE:
            longest = on_page[int(np.argmax(lengths))]
            spots = _spots_along(axes, longest)
            names.place(f"{level:g}", spots, LEVEL, path_effects=halo(1.5))


def _spots_along(axes: Any, line: Floats) -> list[Spot]:
    """Spots on a line given in pixels, along it, from its middle outwards."""
    spots = []
    last = len(line) - 1
    for share in (0.5, 0.4, 0.6, 0.3, 0.7, 0.2, 0.8, 0.1, 0.9):
        i = round(share * last)
        step = line[min(i + 2, last)] - line[max(i - 2, 0)]
        x, y = axes.transData.inverted().transform(line[i])
        angle = upright(float(np.arctan2(step[1], step[0])))
        spots.append(Spot(at=(float(x), float(y)), angle=angle))
    return spots
