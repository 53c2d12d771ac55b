"""The legend of a picture: samples of its symbols, each with what it means, in rows."""

from collections.abc import Sequence
from typing import Any

import numpy as np

from kplate.output.lettering import Hand
from kplate.output.plan import Piece, draw_piece
from kplate.supports import Support

# A support along a line, or the style of a mark or a line for matplotlib.
Symbol = Support | dict[str, Any]

ROW, GAP = 26.0, 26.0  # pixels from row to row, and from entry to entry
MARK, LINE, SPACE = 22.0, 44.0, 8.0  # widths of samples, and of the space after them


def draw_legend(
    axes: Any,
    renderer: Any,
    entries: Sequence[tuple[Symbol, str]],
    *,
    hand: Hand,
    start: tuple[float, float],
) -> None:
    """Write entries from a start on, in rows as wide as the axes leave on both sides.

    Parameters
    ----------
    axes : Axes
        Their data coordinates are pixels.
    renderer : object
        What measures texts.
    entries : sequence of (symbol, str)
        Symbols and what they mean.
    hand : Hand
        How texts are written.
    start : tuple of float
        Where the first row begins.
    """
    left, y = start
    x = left
    for symbol, text in entries:
        wide = MARK if isinstance(symbol, dict) and "marker" in symbol else LINE
        step = wide + SPACE + hand.measure(renderer, text)[0]
        if x + step > axes.get_xlim()[1] - left:
            x, y = left, y - ROW
        _draw_symbol(axes, symbol, (x, y), wide)
        axes.text(x + wide + SPACE, y, text, fontproperties=hand.font, va="center")
        x += step + GAP


def _draw_symbol(
    axes: Any, symbol: Symbol, at: tuple[float, float], wide: float
) -> None:
    """Draw a sample of a support, a mark or a line."""
    x, y = at
    if isinstance(symbol, Support):
        line = np.array([[x, y + 3.0], [x + wide, y + 3.0]])
        sample = Piece(side="", points=line, away=np.array([[0.0, -1.0]]))
        draw_piece(axes, sample, symbol, 1.0)
    elif "marker" in symbol:
        axes.plot(x + 0.5 * wide, y, **symbol)
    else:
        axes.plot([x, x + wide], [y, y], **symbol)
