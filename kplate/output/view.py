"""Showing a result in a window, and pictures of it without one."""

from pathlib import Path
from typing import Any

from kplate.errors import InputError
from kplate.output.exporting import BAR, check_ending, write_stage
from kplate.output.plot import find_shade
from kplate.output.result import Result, read_result, result_of
from kplate.output.screen import check_drawing, check_window
from kplate.output.shades import FACES
from kplate.solution import Solution


def view(result: Path | Solution) -> None:
    """Show a result in a window, until that is closed.

    Parameters
    ----------
    result : Path or Solution
        A solution, or a .vtu file that `write_vtk` or ``kplate check`` wrote.

    Raises
    ------
    InputError
        If the file cannot be shown, there is no display, or a library is missing.
    """
    shown = _taken(result)
    check_window(shown.folder / f"{shown.name}.png")
    check_drawing(off_screen=False)
    from kplate.output.window import Window

    window = Window(shown)
    window.build()
    window.show()


def write_view(
    result: Path | Solution,
    path: Path,
    *,
    quantity: str = "deflection",
    case: str | None = None,
    face: str = "bottom",
    scale: float | None = None,
    show: dict[str, bool] | None = None,
    size: tuple[int, int] = (1400, 900),
) -> Path:
    """Draw what the window shows into a picture; it needs no display.

    Parameters
    ----------
    result : Path or Solution
        A solution, or a .vtu file that `write_vtk` or ``kplate check`` wrote.
    path : Path
        The picture: ``.png``, ``.svg`` or ``.pdf``.
    quantity : str
        What the colours mean, as the window names it, such as "von Mises".
    case : str, optional
        The load case; the first if left out.
    face : {"bottom", "top"}
        The face, of stresses.
    scale : float, optional
        How many times larger the deflection is drawn.
    show : dict of str to bool, optional
        What else is drawn: "contours", "mesh edges", "principal moments", "supports",
        "loads", "reactions", "left out", "names", "same colours" (in all cases), "plan"
        (seen from above).
    size : tuple of int
        Width and height in pixels.

    Returns
    -------
    Path
        The picture.

    Raises
    ------
    InputError
        If the result cannot be shown, has no such quantity or case, a library is
        missing, or the file cannot be written.
    """
    path = Path(path)
    check_ending(path)
    shown = _taken(result)
    shade = find_shade(shown, quantity)
    own = shown_case(shown, case)
    if face not in FACES:
        raise InputError(f"there is no face {face!r}; the faces are top and bottom.")
    check_drawing(off_screen=True)
    import pyvista

    from kplate.output.stage import Stage

    weights: Any = (1.0 - BAR, BAR)
    plotter: Any = pyvista.Plotter(
        shape=(1, 2),
        col_weights=list(weights),
        border=False,
        off_screen=True,
        window_size=list(size),
        line_smoothing=True,
    )
    try:
        stage = Stage(plotter, shown)
        stage.shade, stage.case, stage.face = shade, own, face
        if scale is not None:
            stage.scale = float(scale)
        wanted = dict(show or {})
        flat = wanted.pop("plan", False)
        for name, on in wanted.items():
            if name not in stage.on:
                raise InputError(
                    f"there is nothing called {name!r} to show; there are plan, "
                    f"{', '.join(stage.on)}."
                )
            stage.on[name] = bool(on)
        stage.build()
        if flat:
            stage.look(flat=True)
        write_stage(stage, path)
    finally:
        plotter.close()
    return path


def shown_case(result: Result, case: str | None) -> str:
    """A case by its name, the first if left out; refused if there is none such."""
    if case is None:
        return next(iter(result.cases))
    if case not in result.cases:
        raise InputError(
            f"there is no load case {case!r}; the cases are {', '.join(result.cases)}."
        )
    return case


def _taken(result: Path | Solution) -> Result:
    if isinstance(result, Solution):
        return result_of(result)
    return read_result(Path(result))
