"""The column of controls at the left of the window: words to click, in groups.

What is chosen is dark on pale, as print is; a click anywhere on a word's line acts. The
column stands at the left because its words begin there; the colours are explained at
the right, where the plate ends, and nothing covers the plate.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

from kplate.output.props import FAINT, INK, font_file

SHARE = 0.235  # of the window's width
GROUND, CHOSEN = "#f3f1ec", "#2b2b2b"
LETTERS, ROW = 0.62, 21.0  # size of letters in rows; pixels of a row at most
TOP, LEFT = 10.0, 12.0  # pixels free


@dataclass(frozen=True, eq=False, kw_only=True)
class Control:
    """A word to click, or the heading of a group.

    Parameters
    ----------
    name : str
        Its own among all.
    text : str
        What it says.
    run : callable, optional
        What a click does; a heading has none.
    chosen : bool
        Whether it is what is shown now.
    weight : float
        Width, as a share of the weights of its line.
    """

    name: str
    text: str
    run: Callable[[], None] | None = None
    chosen: bool = False
    weight: float = 1.0


class Panel:
    """Draws controls and finds the one under a click.

    Parameters
    ----------
    renderer : object
        The part of the window it has for itself.
    below : float
        Pixels at its foot that are not its own.
    """

    def __init__(self, renderer: Any, below: float) -> None:
        self.renderer, self.below = renderer, below
        self.boxes: dict[str, tuple[float, float, float, float]] = {}
        self._controls: dict[str, Control] = {}
        self._actors: list[Any] = []
        renderer.set_background(GROUND)

    def show(self, lines: Sequence[Sequence[Control]], size: tuple[int, int]) -> None:
        """Lay lines of controls out from the top of a window of this size in pixels."""
        for actor in self._actors:
            self.renderer.RemoveViewProp(actor)
        self._actors, self._controls, self.boxes = [], {}, {}
        width = SHARE * size[0] - 2.0 * LEFT
        row = min(ROW, (size[1] - self.below - TOP) / max(len(lines), 1))
        for k, line in enumerate(lines):
            low, left = size[1] - TOP - (k + 1) * row, LEFT
            per_weight = width / sum(control.weight for control in line)
            for control in line:
                right = left + control.weight * per_weight
                box = (left, low, right - 4.0, low + row)
                self._draw(control, box)
                if control.run is not None:
                    self.boxes[control.name] = box
                    self._controls[control.name] = control
                left = right

    def press(self, x: float, y: float) -> bool:
        """Act on a click at pixels from the lower left; whether a control was there."""
        for name, (left, low, right, high) in self.boxes.items():
            if left <= x < right and low <= y < high:
                run = self._controls[name].run
                assert run is not None
                run()
                return True
        return False

    def _draw(self, control: Control, box: tuple[float, float, float, float]) -> None:
        from vtkmodules.vtkRenderingCore import vtkTextActor

        left, low, right, high = box
        actor = vtkTextActor()
        letters = actor.GetTextProperty()
        letters.SetFontFamily(4)  # a file
        letters.SetFontFile(font_file())
        letters.SetFontSize(max(int(LETTERS * (high - low)), 6))
        letters.SetVerticalJustificationToCentered()
        colour = INK if control.run is not None else FAINT
        if control.chosen:
            colour = "#ffffff"
            letters.SetBackgroundColor(*_rgb(CHOSEN))
            letters.SetBackgroundOpacity(1.0)
        letters.SetColor(*_rgb(colour))
        actor.SetInput(control.text if control.run is None else f" {control.text} ")
        actor.SetPosition(left, 0.5 * (low + high))
        size = [0.0, 0.0]
        actor.GetSize(self.renderer, size)
        if size[0] > right - left:
            letters.SetFontSize(
                max(int(letters.GetFontSize() * (right - left) / size[0]), 6)
            )
        self.renderer.AddViewProp(actor)
        self._actors.append(actor)


def _rgb(colour: str) -> tuple[float, float, float]:
    red, green, blue = (int(colour[k : k + 2], 16) / 255.0 for k in (1, 3, 5))
    return red, green, blue
