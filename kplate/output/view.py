"""The 3-D window: a deflected plate with a slider for its scale.

A scene is built from the fields of a .vtu file as `write_vtk` writes them, and from the
record (.json) beside it where there is one that belongs to it: title, load cases, side
names, places without a finite moment. Without a record the fields alone are shown.

Drawing needs OpenGL, and a window a display. Both are tried in another process before
anything is drawn, for VTK takes the process down where a library is missing and says
nothing where a display does not answer.
"""

import functools
import json
import os
import re
import subprocess
import sys
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from kplate.arrays import Bools, Floats
from kplate.errors import InputError
from kplate.meshfiles import Fields, read_vtu
from kplate.units import DisplayUnits, Unit

DEFLECTION = "deflection [m]"
# What the components of a field are called, by the start of its name or their number.
COMPONENTS: dict[str | int, tuple[str, ...]] = {
    "principal": ("larger", "smaller"),
    2: ("x", "y"),
    3: ("xx", "yy", "xy"),
}
KEYS = "left, right: field    n: next case    r: reset view    q: close"
RISE = 0.14  # largest deflection at first, as a share of the plate's mean size
MOST_SCALE = 3.0  # end of the slider, in what the scale is at first
TINY = 0.01  # values of the other sign below this share do not change the colours
INK, FAINT, RED = "#1a1a1a", "#8c8c8c", "#c1272d"
PACKAGES = "libgl1 libegl1 libxrender1"  # of Debian and Ubuntu
_DRAW = """
import pyvista
plotter = pyvista.Plotter(off_screen=True, window_size=(16, 16))
plotter.add_mesh(pyvista.Sphere())
plotter.show()
"""
_OPEN_DISPLAY = """
import ctypes, sys
x11 = ctypes.CDLL("libX11.so.6")
x11.XOpenDisplay.restype = ctypes.c_void_p
sys.exit(x11.XOpenDisplay(None) is None)
"""


@dataclass(frozen=True, kw_only=True)
class Shade:
    """One thing to colour the plate by.

    Parameters
    ----------
    name : str
        Its name, component included, without the unit.
    array : str
        The field it comes from, without its case.
    component : int, optional
        Which column of that.
    unit : Unit
        What it is shown in.
    """

    name: str
    array: str
    component: int | None
    unit: Unit

    @property
    def title(self) -> str:
        """Quantity and unit."""
        return f"{self.name} [{self.unit.symbol}]"


def view(path: Path) -> None:
    """Show the result in a file in a window, until that is closed.

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
    fields = read_vtu(path)
    _cases(fields, path)
    _check_display(path)
    scene(path).show()


def scene(path: Path, *, off_screen: bool = False) -> Any:
    """Build the scene of a result, without showing it.

    Parameters
    ----------
    path : Path
        A .vtu file that `write_vtk` or ``kplate check`` wrote.
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
    fields = read_vtu(path)
    cases = _cases(fields, path)
    record = _record(path, fields)
    check_drawing(os.environ.get("DISPLAY"))
    import pyvista

    plotter = pyvista.Plotter(
        off_screen=off_screen, window_size=(1400, 900), title=f"kplate: {path.name}"
    )
    stage = Stage(plotter, fields, cases, record)
    stage.build()
    return plotter


class Stage:
    """A plate on a plotter, and what is shown of it.

    Parameters
    ----------
    plotter : pyvista.Plotter
        Where it is drawn.
    fields : Fields
        The result.
    cases : mapping of str to str
        What the arrays of each load case start with.
    record : mapping
        The record beside the result; empty where there is none.
    """

    def __init__(
        self,
        plotter: Any,
        fields: Fields,
        cases: Mapping[str, str],
        record: Mapping[str, Any],
    ) -> None:
        self.plotter = plotter
        self.fields = fields
        self.record = record
        self.cases = list(cases)
        self.case = 0
        self.shades = shades(fields, next(iter(cases.values())))
        self.shade = 0
        self._prefixes = list(cases.values())
        self.scale = _first_scale(fields, self._prefixes)
        self._plate, self._rim = _surfaces(fields)

    def build(self) -> None:
        """Put everything on the plotter."""
        plotter = self.plotter
        plotter.set_background("white")
        _, flat = _surfaces(self.fields)
        plotter.add_mesh(flat, color=FAINT, line_width=1, name="undeflected")
        plotter.add_mesh(self._rim, color=INK, line_width=3, name="rim")
        self._add_names()
        self._add_left_out()
        plotter.add_axes()
        plotter.add_text(KEYS, name="keys", position="lower_left", **_small())
        plotter.view_vector((-0.35, -0.8, 0.7), viewup=(0.0, 0.0, 1.0))
        plotter.enable_parallel_projection()
        self.refresh()
        plotter.reset_camera()
        plotter.add_slider_widget(
            self.set_scale,
            (0.0, MOST_SCALE * self.scale),
            value=self.scale,
            title="deflection x",
            pointa=(0.62, 0.09),
            pointb=(0.96, 0.09),
            color=INK,
            fmt="%.4g",
            interaction_event="always",
        )
        plotter.add_key_event("Right", lambda: self.step_shade(1))
        plotter.add_key_event("Left", lambda: self.step_shade(-1))
        plotter.add_key_event("n", self.next_case)

    def set_scale(self, scale: float) -> None:
        """Draw the deflection this many times larger."""
        self.scale = float(scale)
        height = self.scale * self._values(DEFLECTION)
        for surface in (self._plate, self._rim):
            surface.points[:, 2] = self.fields.points[:, 2] + height
            surface.Modified()

    def step_shade(self, step: int) -> None:
        """Colour the plate by the next field, or the one before."""
        self.shade = (self.shade + step) % len(self.shades)
        self.refresh()
        self.plotter.render()

    def next_case(self) -> None:
        """Show the next load case."""
        self.case = (self.case + 1) % len(self.cases)
        self.refresh()
        self.plotter.render()

    def refresh(self) -> None:
        """Draw the plate anew, with its colours and headings."""
        self.set_scale(self.scale)
        shade = self.shades[self.shade]
        values = self._values(shade.array)
        values = values if shade.component is None else values[:, shade.component]
        self._plate.point_data.clear()
        self._plate.point_data[shade.title] = values / shade.unit.size
        limits, colours = _colours(values[self._judged()] / shade.unit.size)
        for title in list(self.plotter.scalar_bars.keys()):
            self.plotter.remove_scalar_bar(title)
        self.plotter.add_mesh(
            self._plate,
            name="plate",
            scalars=shade.title,
            cmap=colours,
            clim=limits,
            n_colors=24,
            ambient=0.75,  # mostly flat light, or the colours would lie
            diffuse=0.3,
            reset_camera=False,
            scalar_bar_args=_bar(shade.title),
        )
        heading = "\n".join(
            part for part in (self._title(), self._case_words()) if part
        )
        self.plotter.add_text(
            heading, name="heading", position="upper_left", font_size=12, color=INK
        )

    def _values(self, array: str) -> Floats:
        return self.fields.point_data[self._prefixes[self.case] + array]

    def _title(self) -> str:
        panel = self.record.get("panel")
        name = panel.get("name") if isinstance(panel, Mapping) else ""
        return name if isinstance(name, str) else ""

    def _case_words(self) -> str:
        case = self.cases[self.case]
        return f"case {case}" if case else ""

    def _left_out(self) -> list[tuple[Floats, float]]:
        """Places without a finite moment in this case, with their radius."""
        case = self.cases[self.case]
        return [
            (np.array(excluded["place [m]"]), float(excluded["radius [m]"]))
            for excluded in self.record.get("excluded", [])
            if excluded["case"] in (None, case)
        ]

    def _judged(self) -> Bools:
        """Vertices outside those places: they alone set the colours."""
        xy = self.fields.points[:, :2]
        judged = np.ones(len(xy), dtype=bool)
        for place, radius in self._left_out():
            judged &= np.hypot(*(xy - place).T) >= radius
        return judged if judged.any() else np.ones(len(xy), dtype=bool)

    def _add_names(self) -> None:
        """Write side names beside the middle of their sides."""
        names = self.record.get("side_names", [])
        sides = self.fields.cell_data.get("side", (None, np.empty(0)))[1]
        middles = self.fields.points[self.fields.lines].mean(axis=1)
        places, texts = [], []
        for number, name in enumerate(names):
            own = middles[sides == number]
            if len(own):
                nearest = np.hypot(*(own - own.mean(axis=0))[:, :2].T).argmin()
                places.append(own[nearest])
                texts.append(name)
        if texts:
            self.plotter.add_point_labels(
                np.array(places),
                texts,
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
        """Mark places without a finite moment, in whatever case."""
        places = [e["place [m]"] for e in self.record.get("excluded", [])]
        if places:
            points = np.column_stack([np.array(places), np.zeros(len(places))])
            self.plotter.add_points(
                points,
                name="left out",
                color=RED,
                point_size=12,
                render_points_as_spheres=True,
                reset_camera=False,
            )
            self.plotter.add_text(
                "red: no finite moment, left out of the colours",
                name="left out words",
                position=(0.01, 0.05),
                viewport=True,
                **_small(),
            )


def shades(fields: Fields, prefix: str) -> list[Shade]:
    """All scalars of a load case, deflection first."""
    found = []
    for name, values in fields.point_data.items():
        if not name.startswith(prefix):
            continue
        array = name.removeprefix(prefix)
        base, _, symbol = array.rstrip("]").rpartition(" [")
        unit = _unit(symbol) if base else Unit("-", 1.0)
        base = base or array
        if values.ndim == 1:
            found.append(Shade(name=base, array=array, component=None, unit=unit))
            continue
        for k, word in enumerate(_component_names(base, values.shape[1])):
            shade = Shade(name=f"{base} {word}", array=array, component=k, unit=unit)
            found.append(shade)
    return sorted(found, key=lambda shade: shade.array != DEFLECTION)


def _component_names(base: str, count: int) -> tuple[str, ...]:
    names = COMPONENTS.get(base.split(" ")[0]) or COMPONENTS.get(count, ())
    return names if len(names) == count else tuple(str(k + 1) for k in range(count))


def _unit(symbol: str) -> Unit:
    """Unit to show a field in whose unit in the file is this."""
    units = DisplayUnits()
    shown = {
        "m": units.deflection,
        "Pa": units.stress,
        "N": units.moment,
        "N per m": units.line_force,
    }
    return shown.get(symbol, Unit(symbol, 1.0))


def _cases(fields: Fields, path: Path) -> dict[str, str]:
    """Load cases by what their arrays start with; one without a name has no prefix."""
    cases = {
        name.removesuffix(DEFLECTION).removesuffix(": "): name.removesuffix(DEFLECTION)
        for name, values in fields.point_data.items()
        if (name == DEFLECTION or name.endswith(f": {DEFLECTION}")) and values.ndim == 1
    }
    if not cases:
        held = ", ".join(fields.point_data) or "none"
        raise InputError(
            f"{str(path)!r} holds no field {DEFLECTION!r} (its point fields: {held}); "
            "name a .vtu file that kplate check wrote."
        )
    return cases


def _record(path: Path, fields: Fields) -> Mapping[str, Any]:
    """Record beside a result, if there is one and it belongs to it; else nothing."""
    try:
        record = json.loads(path.with_suffix(".json").read_text("utf-8"))
        belongs = (
            record["mesh"]["triangles"] == len(fields.triangles)
            and record["mesh"]["points"] == len(fields.points)
            and set(record["field_names"]) == set(fields.point_data)
            and all(isinstance(name, str) for name in record["side_names"])
            and all(
                len(e["place [m]"]) == 2
                and np.isfinite(e["radius [m]"])
                and "case" in e
                for e in record["excluded"]
            )
        )
    except (OSError, ValueError, TypeError, LookupError, RecursionError):
        return {}
    return record if belongs else {}


def _surfaces(fields: Fields) -> tuple[Any, Any]:
    """Triangles and rim, each with points of its own to be moved."""
    import pyvista

    plate = pyvista.PolyData.from_regular_faces(fields.points.copy(), fields.triangles)
    twos = np.full(len(fields.lines), 2)
    rim = pyvista.PolyData(
        fields.points.copy(), lines=np.column_stack([twos, fields.lines]).ravel()
    )
    return plate, rim


def _first_scale(fields: Fields, prefixes: list[str]) -> float:
    """Scale at which the largest deflection of all cases can be seen."""
    largest = max(np.abs(fields.point_data[p + DEFLECTION]).max() for p in prefixes)
    size = float(np.sqrt(np.prod(np.ptp(fields.points[:, :2], axis=0))))
    return float(f"{RISE * size / largest:.1g}") if largest > 0.0 else 1.0


def _colours(values: Floats) -> tuple[tuple[float, float], str]:
    """Limits of the colours, and their map: pale at zero where all have one sign."""
    low, high = min(float(values.min()), 0.0), max(float(values.max()), 0.0)
    if low == high:
        return (0.0, 1.0), "YlGnBu"
    if -low <= TINY * high:
        return (0.0, high), "YlGnBu"
    if high <= -TINY * low:
        return (low, 0.0), "YlGnBu_r"
    most = max(-low, high)
    return (-most, most), "RdBu_r"


def _bar(title: str) -> dict[str, Any]:
    return {
        "title": title,
        "vertical": True,
        "position_x": 0.9,
        "position_y": 0.25,
        "height": 0.5,
        "width": 0.05,
        "n_labels": 5,
        "fmt": "%.4g",
        "color": INK,
        "title_font_size": 18,
        "label_font_size": 16,
    }


def _small() -> dict[str, Any]:
    return {"font_size": 9, "color": FAINT}


def _check_display(path: Path) -> None:
    """Refuse where no window can be opened."""
    if sys.platform != "linux":
        return
    picture = f"look at the picture {str(path.with_suffix('.png'))!r} instead"
    display = os.environ.get("DISPLAY")
    if not display:
        raise InputError(
            f"no window can be opened: there is no display (DISPLAY is not set); {picture}."
        )
    if _run(_OPEN_DISPLAY, dict(os.environ)).returncode != 0:
        raise InputError(
            f"no window can be opened: the display {display!r} does not answer; {picture}."
        )


@functools.cache
def check_drawing(display: str | None) -> None:
    """Choose a way to draw that works with this display, or none.

    Raises
    ------
    InputError
        If there is none; the message names the system packages.
    """
    ways: tuple[str | None, ...] = (None,)
    if sys.platform == "linux" and not display:
        ways = ("vtkEGLRenderWindow", "vtkOSOpenGLRenderWindow")
    stated = os.environ.get("VTK_DEFAULT_OPENGL_WINDOW")
    error = ""
    for way in (stated,) if stated else ways:
        environment = dict(os.environ)
        if way is not None:
            environment["VTK_DEFAULT_OPENGL_WINDOW"] = way
        found = _run(_DRAW, environment)
        if found.returncode == 0:
            os.environ.update(
                {k: v for k, v in environment.items() if k.startswith("VTK")}
            )
            return
        error = error or found.stderr
    missing = re.search(r"(lib\S+?\.so[.\d]*): cannot open", error)
    why = (
        f"{missing[1]} is missing" if missing else "OpenGL is missing or does not work"
    )
    raise InputError(
        f"nothing can be drawn in 3-D: {why}; install the system packages {PACKAGES}, "
        "or look at the picture that kplate check wrote."
    )


def _run(code: str, environment: dict[str, str]) -> "subprocess.CompletedProcess[str]":
    """Run code in another Python."""
    return subprocess.run(
        [sys.executable, "-c", code],
        capture_output=True,
        text=True,
        env=environment,
        timeout=120,
        check=False,
    )
