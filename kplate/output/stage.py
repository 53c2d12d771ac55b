"""A result on a plotter: what is chosen to be shown, and its drawing.

The window and pictures share it. Every choice is a plain attribute; `refresh` draws
them.
"""

import textwrap
from pathlib import Path
from typing import Any

import numpy as np

from kplate.arrays import Floats
from kplate.errors import InputError
from kplate.output.chart import draw_chart
from kplate.output.colours import Colours, colours
from kplate.output.probing import Reading, Section, probe, section, write_section
from kplate.output.props import FAINT, INK, LIGHT, Props
from kplate.output.result import DEFLECTION, Result
from kplate.output.shades import Shade
from kplate.output.signs import LIFT, Sign, Signs, words_of
from kplate.output.strokes import Label, Strokes, dashed
from kplate.output.thinning import mesh_edges

RISE = 0.14  # largest deflection at first, as a share of the plate's mean size
MOST_REASONS = 6  # lines of reasons under a picture
UP, DOWN, LOAD, RED = "#00695c", "#8e24aa", "#b35900", "#c1272d"
STRETCHED, PRESSED = "#7a0017", "#0b2f66"  # as the colours of their signs
ROUND = 3e-7  # share of a field's largest value that single precision may blur
NEAR = 0.03  # of the mean size, within which a click finds a place asked for
NOTE, INDENT = 72, "     "  # letters of a line under a picture; where it goes on
DASH = 0.02  # of lines below zero, share of the mean size
SWITCHES = {  # what can be shown or not, and whether it is at first
    "contours": True,
    "mesh edges": False,
    "principal moments": False,
    "supports": True,
    "loads": True,
    "reactions": False,
    "left out": True,
    "names": True,
    "same colours": False,
}
OBLIQUE = (-0.35, -0.8, 0.7)


class Stage:
    """A result on a plotter.

    Parameters
    ----------
    plotter : pyvista.Plotter
        Where it is drawn, in its active renderer.
    result : Result
        What is drawn.
    columns : tuple of int
        Parts of the plotter in which the plate stands, and the bar of colours.
    """

    def __init__(
        self, plotter: Any, result: Result, columns: tuple[int, int] = (0, 1)
    ) -> None:
        self.plotter, self.result = plotter, result
        self.signs = Signs(result)
        fields = result.fields
        self.props = Props(plotter, fields.points, fields.triangles, columns)
        self.cases = list(result.cases)
        self.case, self.shade = self.cases[0], result.shades[0]
        self.face = "bottom"
        self.scale = first_scale(result)
        self.on = dict(SWITCHES)
        self.flat = False
        self.reading: Reading | None = None
        self.cut: Section | None = None
        self.message = ""
        self.colours: Colours | None = None
        self._read_at: tuple[int, Floats] | None = None
        self._edges: Any = None
        self.labels: list[Label] = []

    @property
    def title(self) -> str:
        """Quantity, face and unit."""
        return self.shade.title(self.face)

    @property
    def values(self) -> Floats:
        """What the colours show, at the points, in its unit."""
        return self.result.shown(self.case, self.shade, self.face)

    def build(self) -> None:
        """Put everything on the plotter and look at it."""
        plotter = self.plotter
        plotter.set_background("white", all_renderers=False)
        plotter.add_axes(color=INK)
        plotter.enable_parallel_projection()
        self.refresh()
        self.look(flat=False)

    def look(self, *, flat: bool) -> None:
        """Look from above, or obliquely."""
        self.flat = flat
        if flat:
            self.plotter.view_xy(render=False)
        else:
            self.plotter.view_vector(OBLIQUE, viewup=(0.0, 0.0, 1.0), render=False)
        self._light()
        self._signs()
        self.plotter.reset_camera(render=False)
        self.plotter.camera.zoom(1.1)

    def set_scale(self, scale: float) -> None:
        """Draw the deflection this many times larger."""
        self.scale = float(scale)
        self.props.lift(self.scale)
        self._heading()

    def refresh(self) -> None:
        """Draw all that is chosen."""
        self.props.w = self.result.values(self.case, DEFLECTION)
        self.props.scale = self.scale
        self._surface()
        self._lines()
        self._signs()
        self.write()

    def choose(
        self, *, shade: Shade | None = None, face: str = "", case: str = ""
    ) -> None:
        """Show another quantity, face or case."""
        self.shade = shade or self.shade
        self.face, self.case = face or self.face, case or self.case
        if self._read_at is not None:
            self.read(*self._read_at)
        if self.cut is not None:
            self.cut = section(self.result, self.values, self.cut.start, self.cut.end)
        self.refresh()

    def switch(self, name: str) -> None:
        """Show something, or not."""
        self.on[name] = not self.on[name]
        self.refresh()

    def read(self, triangle: int, shares: Floats) -> None:
        """Probe a small triangle at barycentric shares (3,)."""
        self._read_at = triangle, shares
        self.reading = probe(
            self.result,
            self.shade,
            case=self.case,
            face=self.face,
            triangle=triangle,
            shares=shares,
        )
        self._mark_reading()
        self.write()

    def cut_along(self, start: tuple[float, float], end: tuple[float, float]) -> None:
        """Plot what is shown along a line in plan."""
        self.cut = section(self.result, self.values, start, end)
        self._mark_cut()

    def save_cut(self, path: Path) -> Path:
        """Write the section as a CSV table.

        Raises
        ------
        InputError
            If there is none, or the file cannot be written.
        """
        if self.cut is None:
            raise InputError("there is no section yet; choose it by two clicks first.")
        words = f"{self.title}, case {self.case}" if self.case else self.title
        return write_section(self.cut, words, path)

    def heading(self) -> str:
        """What is shown, in words."""
        loads = self.result.told.loads.get(self.case, [])
        words = ", ".join(words_of(load, self.result) for load in loads)
        case = f"case {self.case}" if self.case else ""
        case += f": {words}" if case and words else ""
        lines = [self.result.told.title, case]
        lines.append(f"{self.title}; deflection drawn x {self.scale:.4g}")
        return "\n".join(_short(line) for line in lines if line)

    def notes(self) -> str:
        """Reasons of what is left out, reading of the probe, message."""
        lines = []
        if self.on["left out"]:
            discs = self.result.left_out(self.case)
            for k, disc in enumerate(discs[:MOST_REASONS], 1):
                lines.append(f"({k}) no finite moment, left out: {disc.reason}")
            if len(discs) > MOST_REASONS:
                lines.append(f"and {len(discs) - MOST_REASONS} more")
        if self.reading is not None:
            lines += self._reading_words(self.reading)
        if self.message:
            lines.append(self.message)
        return "\n".join(part for line in lines for part in _folded(line))

    def write(self) -> None:
        """Write heading and notes."""
        self._heading()
        self.props.text("notes", self.notes(), "lower_left", size=8)

    def _heading(self) -> None:
        self.props.text("heading", self.heading(), "upper_left", size=9)

    def _reading_words(self, reading: Reading) -> list[str]:
        length = self.result.units.length
        x, y = (f"{c / length.size:.4g}" for c in reading.place)
        unit = self.shade.unit.symbol
        words = f"at ({x}, {y}) {length.symbol}: {self.shade.name} {reading.value:.4g} "
        lines = [words + unit]
        if reading.left_out:
            lines.append("    no finite value here: " + reading.left_out)
        elif reading.difference is None:
            lines.append("    no difference of primal and dual is kept for it")
        else:
            # Fields in single precision do not tell less.
            least = ROUND * float(np.abs(self.values).max())
            words = f"{max(reading.difference, least):.2g} {unit}"
            less = "less than " if reading.difference < least else ""
            lines.append(
                f"    primal and dual differ by {less}{words} here "
                "(estimate, not a bound)"
            )
        for asked in self.result.told.asked:
            lines += self._asked_words(asked, reading)
        return lines

    def _asked_words(self, asked: dict[str, Any], reading: Reading) -> list[str]:
        """A number that was asked for at the place of a reading, with its band."""
        near = NEAR * self.result.size
        if asked["case"] != self.case or asked.get("at") is None:
            return []
        if np.hypot(*np.subtract(asked["at"], reading.place)) > near:
            return []
        if asked["lower"] is None:
            return []
        named = asked.get("component") or asked["goal"]
        return [
            f"    asked for at ({asked['at'][0]:g}, {asked['at'][1]:g}) m: {named} "
            f"{asked['value']:.4g}, {asked['kind']} {asked['lower']:.4g} to "
            f"{asked['upper']:.4g} (SI)"
        ]

    def _surface(self) -> None:
        result, values = self.result, self.values
        cases = self.cases if self.on["same colours"] else [self.case]
        shown = [result.shown(case, self.shade, self.face) for case in cases]
        judged = [v[result.judged(c)] for c, v in zip(cases, shown, strict=True)]
        self.colours = colours(np.concatenate(judged), np.concatenate(shown))
        self.props.surface(self.title, values, self.colours)
        self.props.bar(self.title, self.colours)
        self._light()

    def _light(self) -> None:
        """From above without light and shade, which would falsify colours."""
        for name in ("plate", "few"):
            if name in self.plotter.actors:
                light = self.plotter.actors[name].prop
                light.ambient, light.diffuse = (1.0, 0.0) if self.flat else LIGHT

    def _lines(self) -> None:
        props, fields = self.props, self.result.fields
        points, w = fields.points, props.w
        props.lines("rim", points[fields.lines], w[fields.lines], colour=INK, width=3.0)
        largest = np.max(
            [np.abs(self.result.values(c, DEFLECTION)) for c in self.cases], 0
        )
        moved = fields.lines[largest[fields.lines].max(axis=1) > 1e-3 * largest.max()]
        props.lines(
            "undeflected", points[moved], np.zeros(moved.shape), colour=FAINT, width=1.0
        )
        if self.on["mesh edges"]:
            edges = self._mesh_edges()
            props.lines(
                "mesh edges",
                points[edges],
                w[edges],
                colour="#4a4a4a",
                width=1.0,
                stays=False,
            )
        else:
            props.remove("mesh edges")
        self._contours()

    def _mesh_edges(self) -> Any:
        if self._edges is None:
            fields = self.result.fields
            every = np.arange(len(fields.triangles))
            owners = fields.cell_data.get("triangle", (every,))[0]
            self._edges = mesh_edges(fields.points[:, :2], fields.triangles, owners)
        return self._edges

    def _contours(self) -> None:
        """Lines where two colours meet, dashed below zero."""
        for name in ("contours", "contours below zero"):
            self.props.remove(name)
        assert self.colours is not None
        if not (self.on["contours"] and len(self.colours.inner)):
            return
        import pyvista

        fields = self.result.fields
        faces: Any = fields.triangles
        flat = pyvista.PolyData.from_regular_faces(fields.points, faces)
        flat.point_data["shown"], flat.point_data["w"] = self.values, self.props.w
        inner = self.colours.inner
        for name, levels, dash in (
            ("contours", inner[inner >= 0.0], False),
            ("contours below zero", inner[inner < 0.0], True),
        ):
            if not len(levels):
                continue
            found = flat.contour(levels, scalars="shown")
            if not found.n_points:
                continue
            pairs = np.asarray(found.lines).reshape(-1, 3)[:, 1:]
            rows = np.column_stack([found.points[:, :2], found.point_data["w"]])
            if dash and self.colours.levels[-1] > 0.0:
                ends = dashed(rows, pairs, DASH * self.result.size)
            else:
                ends = rows[pairs]
            hung = ends[..., 2].copy()
            ends[..., 2] = 0.0
            self.props.lines(name, ends, hung, colour=INK, width=1.3, stays=False)

    def _signs(self) -> None:
        props, on, signs = self.props, self.on, self.signs
        nothing = Sign()
        supports = signs.supports() if on["supports"] else nothing
        loads = signs.loads(self.case) if on["loads"] else nothing
        up, down = (nothing, nothing)
        if on["reactions"]:
            up, down = signs.reactions(self.case, flat=self.flat)
        has = on["principal moments"] and self.result.has(self.case, "moments [N]")
        plus, minus = signs.crosses(self.case) if has else (Strokes(), Strokes())
        for name, strokes, colour, width in (
            ("supports", supports.strokes, INK, 1.5),
            ("loads", loads.strokes, LOAD, 2.5),
            ("pushes up", up.strokes, UP, 1.5),
            ("holds down", down.strokes, DOWN, 1.5),
            ("moments above zero", plus, STRETCHED, 2.0),
            ("moments below zero", minus, PRESSED, 2.0),
        ):
            props.strokes(name, strokes, colour=colour, width=width)
        discs = self.result.left_out(self.case) if on["left out"] else []
        places = np.array([disc.place for disc in discs]).reshape(-1, 2)
        anchors = signs.nearest(places) if len(places) else np.empty(0, dtype=np.int64)
        flat = np.column_stack([places, np.zeros(len(places))])
        props.dots("left out", flat, anchors, colour=RED, size=11.0)
        labels = [
            Label(text=f"({k})", place=(*disc.place, 0.0), anchor=int(anchor))
            for k, (disc, anchor) in enumerate(zip(discs, anchors, strict=True), 1)
        ]
        labels += [*up.labels, *loads.labels]
        labels += signs.names() if on["names"] else []
        self.labels = labels
        props.labels(labels)
        self._mark_reading()
        self._mark_cut()

    def settle(self) -> None:
        """Put labels where their places are after a drag."""
        self.props.labels(self.labels)

    def _mark_reading(self) -> None:
        if self.reading is None:
            self.props.remove("probe")
            return
        place = np.array([[*self.reading.place, 0.0]])
        at = self.signs.nearest(place[:, :2])
        self.props.dots("probe", place, at, colour=INK, size=13.0)

    def _mark_cut(self) -> None:
        """Draw the line of the section, and its plot."""
        draw_chart(self.plotter, self.cut, self.title, self.result.units.length)
        if self.cut is None:
            self.props.remove("section")
            return
        start, end = np.array(self.cut.start), np.array(self.cut.end)
        along = (end - start) / np.hypot(*(end - start))
        places = start + self.cut.pieces[..., None] * along
        z = np.full((*places.shape[:2], 1), LIFT * self.result.size)
        w = section(self.result, self.props.w, self.cut.start, self.cut.end).values
        ends = np.concatenate([places, z], axis=-1)
        self.props.lines("section", ends, w, colour=RED, width=3.0)


def first_scale(result: Result) -> float:
    """Scale of one digit at which the largest deflection of all cases can be seen."""
    largest = max(
        float(np.abs(result.values(case, DEFLECTION)).max()) for case in result.cases
    )
    return float(f"{RISE * result.size / largest:.1g}") if largest > 0.0 else 1.0


def _folded(line: str) -> list[str]:
    return textwrap.wrap(
        line, NOTE, subsequent_indent=INDENT, break_on_hyphens=False
    ) or [line]


def _short(line: str, most: int = 110) -> str:
    return line if len(line) <= most else line[: most - 1] + "\u2026"
