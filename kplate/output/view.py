"""The 3-D window: a deflected plate with a slider for its scale.

Arrow keys change what the colours mean, `n` the load case. Colours are pale at zero and
dark at the extremes; places without a finite moment do not set them.
"""

from pathlib import Path
from typing import Any

import numpy as np

from kplate.arrays import Floats
from kplate.output.result import DEFLECTION, Result, read_result
from kplate.output.screen import check_drawing, check_window

KEYS = "left, right: field    n: next case    r: reset view    q: close"
LEFT_OUT = "red: no finite moment, left out of the colours"
SIZE = (1400, 900)  # pixels of the window
RISE = 0.14  # largest deflection at first, as a share of the plate's mean size
MOST_SCALE = 3.0  # end of the slider, in what the scale is at first
TINY = 0.01  # values of the other sign below this share do not change the colours
INK, FAINT, RED = "#1a1a1a", "#6b6b6b", "#c1272d"


def view(path: Path) -> None:
    """Show a result in a window, until that is closed.

    Parameters
    ----------
    path : Path
        A .vtu file that `write_vtk` or ``kplate check`` wrote.

    Raises
    ------
    InputError
        If the file cannot be shown, there is no display, or a library is missing.
    """
    path = Path(path)
    result = read_result(path)
    check_window(path.with_suffix(".png"))
    _build(result, path, off_screen=False).show()


def scene(path: Path, *, off_screen: bool = False) -> Any:
    """Build the scene of a result, without showing it.

    Parameters
    ----------
    path : Path
        A .vtu file that `write_vtk` or ``kplate check`` wrote. The record (.json)
        beside it adds title, side names and places without a finite moment.
    off_screen : bool
        Whether it is for a picture rather than a window.

    Returns
    -------
    pyvista.Plotter
        Call its ``show`` or ``screenshot``.

    Raises
    ------
    InputError
        If the file cannot be shown, or a library is missing.
    """
    path = Path(path)
    return _build(read_result(path), path, off_screen=off_screen)


def _build(result: Result, path: Path, *, off_screen: bool) -> Any:
    check_drawing(off_screen=off_screen)
    import pyvista

    plotter = pyvista.Plotter(
        off_screen=off_screen,
        window_size=list(SIZE),
        title=f"kplate: {path.name}",
        line_smoothing=True,
    )
    Stage(plotter, result).build()
    return plotter


class Stage:
    """A plate on a plotter, and what is shown of it.

    Parameters
    ----------
    plotter : pyvista.Plotter
        Where it is drawn.
    result : Result
        What is drawn.
    """

    def __init__(self, plotter: Any, result: Result) -> None:
        self.plotter = plotter
        self.result = result
        self.cases = list(result.cases)
        self.case = self.cases[0]
        self.shades = result.shades()
        self.shade = self.shades[0]
        self.scale = first_scale(result)
        fields = result.fields
        # Each with points of its own: they are moved.
        self.plate = _plate(fields.points, fields.triangles)
        self.rim = _lines(fields.points, fields.lines)
        self.marks, self.marked = _points(fields.points[:0]), np.empty(0, dtype=int)

    def build(self) -> None:
        """Put everything on the plotter."""
        plotter = self.plotter
        plotter.set_background("white")
        self._add_undeflected()
        plotter.add_mesh(
            self.rim, color=INK, line_width=4, render_lines_as_tubes=True, name="rim"
        )
        self._add_side_names()
        plotter.add_axes()
        plotter.add_text(
            KEYS, name="keys", position="lower_left", font_size=9, color=FAINT
        )
        plotter.view_vector((-0.35, -0.8, 0.7), viewup=(0.0, 0.0, 1.0))
        plotter.enable_parallel_projection()
        self.refresh()
        plotter.reset_camera()
        self._add_slider()
        plotter.add_key_event("Right", lambda: self.step_shade(1))
        plotter.add_key_event("Left", lambda: self.step_shade(-1))
        plotter.add_key_event("n", self.next_case)

    def set_scale(self, scale: float) -> None:
        """Draw the deflection this many times larger."""
        self.scale = float(scale)
        bent = self.result.fields.points[:, 2] + self.scale * self.result.values(
            self.case, DEFLECTION
        )
        self.plate.points[:, 2] = bent
        self.rim.points[:, 2] = bent
        if len(self.marked):
            self.marks.points[:, 2] = bent[self.marked]

    def step_shade(self, step: int) -> None:
        """Colour the plate by the next field, or the one before."""
        at = self.shades.index(self.shade) + step
        self.shade = self.shades[at % len(self.shades)]
        self.refresh()
        self.plotter.render()

    def next_case(self) -> None:
        """Show the next load case."""
        at = self.cases.index(self.case) + 1
        self.case = self.cases[at % len(self.cases)]
        self.refresh()
        self.plotter.render()

    def refresh(self) -> None:
        """Draw the plate anew, with its colours and headings."""
        self._add_left_out()
        self.set_scale(self.scale)
        title, values = self.shade.title, self.result.shown(self.case, self.shade)
        self.plate.point_data.clear()
        self.plate.point_data[title] = values
        limits, colours = colour_limits(values[self.result.judged(self.case)])
        for old in list(self.plotter.scalar_bars.keys()):
            self.plotter.remove_scalar_bar(old)
        self.plotter.add_mesh(
            self.plate,
            name="plate",
            scalars=title,
            cmap=colours,
            clim=limits,
            n_colors=24,
            ambient=0.75,  # mostly flat light, or the colours would lie
            diffuse=0.3,
            reset_camera=False,
            show_scalar_bar=False,
        )
        _add_bar(self.plotter, title)
        number = self.shades.index(self.shade) + 1
        lines = [self.result.title, f"case {self.case}" if self.case else ""]
        lines.append(f"{title}, field {number} of {len(self.shades)}")
        self.plotter.add_text(
            "\n".join(line for line in lines if line),
            name="heading",
            position="upper_left",
            font_size=11,
            color=INK,
        )

    def _add_undeflected(self) -> None:
        """Draw where the moving parts of the rim were."""
        fields = self.result.fields
        largest = np.max(
            [np.abs(self.result.values(case, DEFLECTION)) for case in self.cases],
            axis=0,
        )
        moved = largest[fields.lines].max(axis=1) > 1e-3 * largest.max()
        if moved.any():
            flat = _lines(fields.points, fields.lines[moved])
            self.plotter.add_mesh(flat, color=FAINT, line_width=1, name="undeflected")

    def _add_side_names(self) -> None:
        """Write side names at the middle of their sides."""
        places = self.result.side_places()
        if places:
            self.plotter.add_point_labels(
                np.array(list(places.values())),
                list(places),
                name="side names",
                font_size=14,
                text_color=INK,
                shape_color="white",
                shape_opacity=0.7,
                show_points=False,
                always_visible=True,
                reset_camera=False,
            )

    def _add_left_out(self) -> None:
        """Mark places without a finite moment, as high as the point nearest to each."""
        self.plotter.remove_actor(["left out", "left out words"], render=False)
        points = self.result.fields.points
        places = [(x, y, 0.0) for x, y, _ in self.result.left_out(self.case)]
        self.marked = np.array(
            [np.hypot(*(points[:, :2] - place[:2]).T).argmin() for place in places],
            dtype=int,
        )
        if not places:
            return
        self.marks = _points(np.array(places))
        self.plotter.add_points(
            self.marks,
            name="left out",
            color=RED,
            point_size=12,
            render_points_as_spheres=True,
            reset_camera=False,
            render=False,
        )
        self.plotter.add_text(
            LEFT_OUT,
            name="left out words",
            position=(0.005, 0.05),
            viewport=True,
            font_size=9,
            color=RED,
            render=False,
        )

    def _add_slider(self) -> None:
        """Add the slider for the scale of the deflection."""
        self.plotter.add_slider_widget(
            self.set_scale,
            (0.0, MOST_SCALE * self.scale),
            value=self.scale,
            title="deflection x",
            pointa=(0.68, 0.08),
            pointb=(0.97, 0.08),
            color=INK,
            fmt="%.4g",
            title_height=0.02,
            slider_width=0.02,
            tube_width=0.003,
            interaction_event="always",
        )


def first_scale(result: Result) -> float:
    """Scale of one digit at which the largest deflection of all cases can be seen."""
    largest = max(
        float(np.abs(result.values(case, DEFLECTION)).max()) for case in result.cases
    )
    size = float(np.sqrt(np.prod(np.ptp(result.fields.points[:, :2], axis=0))))
    return float(f"{RISE * size / largest:.1g}") if largest > 0.0 else 1.0


def colour_limits(values: Floats) -> tuple[tuple[float, float], str]:
    """Limits of the colours, and their map: pale at zero."""
    low, high = min(float(values.min()), 0.0), max(float(values.max()), 0.0)
    if low == high:
        return (0.0, 1.0), "YlGnBu"
    if -low <= TINY * high:
        return (0.0, high), "YlGnBu"
    if high <= -TINY * low:
        return (low, 0.0), "YlGnBu_r"
    most = max(-low, high)
    return (-most, most), "RdBu_r"


def _plate(points: Floats, triangles: Any) -> Any:
    import pyvista

    return pyvista.PolyData.from_regular_faces(points.copy(), triangles)


def _lines(points: Floats, lines: Any) -> Any:
    import pyvista

    cells = np.column_stack([np.full(len(lines), 2), lines])
    return pyvista.PolyData(points.copy(), lines=cells.ravel())


def _points(points: Floats) -> Any:
    import pyvista

    return pyvista.PolyData(points.copy())


def _add_bar(plotter: Any, title: str) -> None:
    """Explain the colours."""
    bar = plotter.add_scalar_bar(
        title=title,
        vertical=True,
        position_x=0.9,
        position_y=0.25,
        height=0.5,
        width=0.05,
        n_labels=5,
        fmt="%.4g",
        color=INK,
        title_font_size=18,
        label_font_size=16,
        render=False,
    )
    bar.SetVerticalTitleSeparation(12)
