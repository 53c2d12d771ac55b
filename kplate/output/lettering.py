"""Texts on a picture that do not run into each other.

A text is taken for a chain of circles along its line, of its height; a new one may
stand where its circles meet none of those that are taken. Lengths are pixels.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np

from kplate.arrays import Floats

FAMILY = "DejaVu Sans"  # comes with matplotlib, so that every machine has it
SHORTEST = 8  # characters that must be left of a shortened text
ELLIPSIS = "\u2026"
AIR = 2.0  # pixels around a text
STEEP = np.radians(75.0)  # a text falls no steeper than that to the right


@dataclass(frozen=True, kw_only=True)
class Hand:
    """How a text is written.

    Parameters
    ----------
    size : float
        Size of the letters in points.
    style : {"normal", "italic"}
        How they lean.
    weight : {"normal", "bold"}
        How thick they are.
    """

    size: float
    style: Literal["normal", "italic"] = "normal"
    weight: Literal["normal", "bold"] = "normal"

    @property
    def font(self) -> Any:
        """The font, for matplotlib."""
        from matplotlib.font_manager import FontProperties

        return FontProperties(
            family=FAMILY, size=self.size, style=self.style, weight=self.weight
        )

    def measure(self, renderer: Any, text: str) -> tuple[float, float]:
        """Width and height of a text."""
        width, height, _ = renderer.get_text_width_height_descent(
            text, self.font, ismath=False
        )
        return float(width), float(height)

    def shorten(self, renderer: Any, text: str, room: float) -> str:
        """Cut a text to a width, with an ellipsis for what is gone."""
        if self.measure(renderer, text)[0] <= room:
            return text
        fits, cut = 0, len(text)  # characters that do, and do not, fit
        while cut - fits > 1:
            middle = (fits + cut) // 2
            short = text[:middle].rstrip() + ELLIPSIS
            if self.measure(renderer, short)[0] <= room:
                fits = middle
            else:
                cut = middle
        return text[:fits].rstrip() + ELLIPSIS


@dataclass(frozen=True, kw_only=True)
class Spot:
    """Where a text may stand: beside a place, or on it.

    Parameters
    ----------
    at : tuple of float
        The place, in data coordinates.
    away : tuple of float
        Unit vector to the side of it on which the text stands; (0, 0) on the place.
    angle : float
        Angle of the text in rad.
    room : float
        Width to which the text may be shortened; 0 where it may not.
    """

    at: tuple[float, float]
    away: tuple[float, float] = (0.0, 0.0)
    angle: float = 0.0
    room: float = 0.0


class Names:
    """Texts on axes, none on top of another.

    Parameters
    ----------
    axes : Axes
        Where they stand; they do not leave it.
    renderer : object
        What measures them.
    """

    def __init__(self, axes: Any, renderer: Any) -> None:
        self._axes = axes
        self._renderer = renderer
        self._taken = np.empty((0, 3))  # x, y, radius of circles
        edge = axes.get_window_extent(renderer)
        self._edge = np.array([[edge.x0, edge.y0], [edge.x1, edge.y1]])

    def block(self, points: Floats, reach: float) -> None:
        """Keep texts off points (k, 2) in data coordinates, by `reach` pixels."""
        places = self._axes.transData.transform(points)
        self._take(np.column_stack([places, np.full(len(places), reach)]))

    def place(
        self,
        text: str,
        spots: Sequence[Spot],
        hand: Hand,
        *,
        gap: float = 0.0,
        **style: Any,
    ) -> bool:
        """Write a text at the first spot with room for it, shortened if need be.

        Parameters
        ----------
        text : str
            What to write.
        spots : sequence of Spot
            Where it may stand, the best first.
        hand : Hand
            How it is written.
        gap : float
            Distance from the place.
        **style
            Passed on to matplotlib.

        Returns
        -------
        bool
            Whether there was room.
        """
        shown = printable(text)
        size = hand.measure(self._renderer, shown)
        for spot in spots:
            if self._write(shown, size, spot, hand, gap, style):
                return True
        for spot in spots:
            short = hand.shorten(self._renderer, shown, spot.room)
            if short != shown and len(short) > SHORTEST:
                size = hand.measure(self._renderer, short)
                if self._write(short, size, spot, hand, gap, style):
                    return True
        return False

    def _write(
        self,
        text: str,
        size: tuple[float, float],
        spot: Spot,
        hand: Hand,
        gap: float,
        style: dict[str, Any],
    ) -> bool:
        """Write at a spot if there is room."""
        along = np.array([np.cos(spot.angle), np.sin(spot.angle)])
        across = np.array([-along[1], along[0]])
        away = np.array(spot.away)
        reach = 0.5 * (size[0] * abs(along @ away) + size[1] * abs(across @ away))
        centre = self._axes.transData.transform(spot.at) + (gap + reach) * away
        radius = 0.5 * size[1] + AIR
        half = max(0.5 * size[0] - 0.5 * size[1], 0.0)
        count = int(2.0 * half / radius) + 2
        circles = centre + np.linspace(-half, half, count)[:, None] * along
        if not self._is_free(circles, radius):
            return False
        self._take(np.column_stack([circles, np.full(count, radius)]))
        self._axes.text(
            *self._axes.transData.inverted().transform(centre),
            text,
            ha="center",
            va="center",
            rotation=np.degrees(spot.angle),
            rotation_mode="anchor",
            fontproperties=hand.font,
            **style,
        )
        return True

    def _is_free(self, circles: Floats, radius: float) -> bool:
        low, high = self._edge
        if (circles < low + radius).any() or (circles > high - radius).any():
            return False
        between = circles[:, None] - self._taken[:, :2]
        return bool((np.hypot(*between.T) > radius + self._taken[:, 2:]).all())

    def _take(self, circles: Floats) -> None:
        self._taken = np.concatenate([self._taken, circles])


def printable(text: str) -> str:
    """One line of a text, whatever is in it."""
    return "".join(c if c.isprintable() else " " for c in text)


def upright(angle: float) -> float:
    """Turn an angle in rad by half turns so that a text along it can be read.

    A text along a line that is vertical, or nearly so, reads upwards.
    """
    return float((angle + STEEP) % np.pi - STEEP)


def halo(width: float = 2.5) -> list[Any]:
    """White around letters, so that they read on any colour."""
    from matplotlib.patheffects import withStroke

    return [withStroke(linewidth=width, foreground="white")]
