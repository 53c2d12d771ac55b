"""Pictures of a stage: PNG as it stands on the screen, SVG and PDF with lines and text.

In SVG and PDF plates of many triangles are kept as an image, lest the file take minutes
and hundreds of MB; texts stay texts.
"""

from pathlib import Path
from typing import Any

from kplate.errors import InputError
from kplate.files import replacing
from kplate.output.props import LABELS, TEXT, font_file

ENDINGS = (".png", ".svg", ".pdf")
BAR = 0.11  # share of a picture's width for the bar of colours
LINE = 17.0  # pixels from line to line
MOST = 4_000  # triangles that are written one by one


def check_ending(path: Path) -> None:
    """Refuse a picture of another kind."""
    if path.suffix not in ENDINGS:
        raise InputError(f"{str(path)!r} must end in .png, .svg or .pdf; name it so.")


def write_stage(stage: Any, path: Path) -> Path:
    """Write what is shown as a picture.

    Raises
    ------
    InputError
        If the name has another ending, or the file cannot be written.
    """
    check_ending(path)
    plotter = stage.plotter
    plotter.render()
    with replacing(path) as temporary:
        # The writers go by the ending of the name.
        own = temporary.with_name(temporary.name + path.suffix)
        try:
            if path.suffix == ".png":
                plotter.screenshot(str(own))
            else:
                _write_lines(stage, own)
            temporary.write_bytes(own.read_bytes())
        finally:
            own.unlink(missing_ok=True)
    return path


def _write_lines(stage: Any, path: Path) -> None:
    """Write lines and texts as such.

    VTK's own labels would be left out, and of texts of several lines one would be made:
    texts of one line each stand for them meanwhile.
    """
    plotter = stage.plotter
    (bar,) = plotter.scalar_bars.values()
    title = bar.GetTitle()
    own = [
        (plotter.renderer, text) for text in [*_flat_labels(stage), *_corners(stage)]
    ]
    column = plotter.renderers[stage.props.columns[1]]
    own += [(column, text) for text in _bar_title(column, title)]
    names = (LABELS, "heading", "notes")
    hidden = [plotter.actors[name] for name in names if name in plotter.actors]
    for renderer, text in own:
        renderer.AddViewProp(text)
    for actor in hidden:
        actor.SetVisibility(False)
    bar.SetTitle(" ")
    try:
        plotter.save_graphic(str(path), raster=len(stage.props.triangles) > MOST)
    finally:
        bar.SetTitle(title)
        for renderer, text in own:
            renderer.RemoveViewProp(text)
        for actor in hidden:
            actor.SetVisibility(True)


def _corners(stage: Any) -> list[Any]:
    """Heading and notes, line by line."""
    height = stage.plotter.renderer.GetSize()[1]
    heading, notes = stage.heading().split("\n"), stage.notes().split("\n")
    found = [
        _text(line, 6.0, height - LINE * (k + 1)) for k, line in enumerate(heading)
    ]
    for k, line in enumerate(reversed(notes)):
        found.append(_text(line, 6.0, 6.0 + LINE * k))
    return found


def _bar_title(column: Any, title: str) -> list[Any]:
    """The title over the bar of colours, line by line."""
    width, height = column.GetSize()
    lines = title.split("\n")
    return [
        _text(line, 0.25 * width, 0.79 * height + LINE * (len(lines) - 1 - k))
        for k, line in enumerate(lines)
    ]


def _text(words: str, x: float, y: float) -> Any:
    """A text at pixels from the lower left of its part of the window."""
    from vtkmodules.vtkRenderingCore import vtkTextActor

    actor = vtkTextActor()
    letters = actor.GetTextProperty()
    letters.SetFontFamily(4)  # a file
    letters.SetFontFile(font_file())
    letters.SetFontSize(TEXT + 1)
    letters.SetColor(0.1, 0.1, 0.1)
    actor.SetInput(words)
    actor.SetPosition(x, y)
    return actor


def _flat_labels(stage: Any) -> list[Any]:
    """Labels where they are seen, but for those that would cover one before."""
    renderer, found = stage.plotter.renderer, []
    taken: list[tuple[float, float, float, float]] = []
    low_x, low_y = renderer.GetOrigin()
    for label, place in zip(
        stage.labels,
        stage.props.places(stage.labels) if stage.labels else (),
        strict=True,
    ):
        renderer.SetWorldPoint(*place, 1.0)
        renderer.WorldToDisplay()
        x, y, _ = renderer.GetDisplayPoint()
        actor = _text(label.text, x - low_x, y - low_y)
        size = [0.0, 0.0]
        actor.GetSize(renderer, size)
        box = (x, y, x + size[0], y + size[1])
        if not any(
            a < box[2] and box[0] < c and b < box[3] and box[1] < d
            for a, b, c, d in taken
        ):
            taken.append(box)
            found.append(actor)
    return found
