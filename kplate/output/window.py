"""The window: a stage, a column of controls, keys and the mouse.

Every control has a key, so that nothing needs a mouse but probe and section. A click on
the plate that does not move reads it; with "section" chosen, two clicks cut it. A drag
turns, shifts or zooms the view.
"""

from collections.abc import Callable
from functools import partial
from itertools import groupby
from pathlib import Path
from typing import Any

import numpy as np

from kplate.errors import InputError
from kplate.output.controls import SHARE, Control, Panel
from kplate.output.exporting import BAR, write_stage
from kplate.output.props import INK, font_file
from kplate.output.result import Result
from kplate.output.stage import Stage

SIZE = (1400, 900)  # pixels at first
MOST_SCALE = 3.0  # end of the slider, in what the scale is at first
SLIDER = 96.0  # pixels at the foot of the controls
STILL = 4  # pixels that a click may move
MOST_CASES = 6  # listed at once
STEP = 1.25  # of the scale, by a key
KEYS = {  # of switches
    "contours": "c",
    "mesh edges": "m",
    "principal moments": "x",
    "supports": "s",
    "loads": "l",
    "reactions": "u",
    "left out": "o",
    "names": "t",
    "same colours": "a",
}
HELP = """\
left, right     quantity before, after          1, 2   plan view, oblique view
f               other face                      p      click: read a point
n               next case                       d      two clicks: section line
+, -            deflection larger, smaller      k      save the section (.csv)
c  contour lines      s  supports               g      save a picture (.png)
m  mesh edges         l  loads                  v      save a picture (.svg)
x  principal moments  u  reactions              b      save a picture (.pdf)
o  places left out    t  names                  h      this help
a  same colours in all cases                    q      close

Drag turns the view, with shift it shifts it, the wheel zooms.
Reactions: a fence above a side pushes the plate up, below it holds it down.
Crosses: directions and sizes of the principal moments; red compresses
the top face, blue the bottom face. Dashed contours are below zero.
Red dots: no finite moment there; they do not set the colours.
A reading is a field of the elements. How far primal and dual differ there is
an estimate; for a band at a point, ask for it: kplate.solve(..., goals=[...]).

Results are for a qualified engineer's judgement; local codes and licensed
practice decide."""


class Window:
    """A result in a window.

    Parameters
    ----------
    result : Result
        What is shown.
    off_screen : bool
        Whether nobody sees it.
    """

    def __init__(self, result: Result, *, off_screen: bool = False) -> None:
        import pyvista

        weights: Any = (SHARE, 1.0 - SHARE - BAR, BAR)
        self.plotter: Any = pyvista.Plotter(
            shape=(1, 3),
            col_weights=list(weights),
            border=False,
            off_screen=off_screen,
            window_size=list(SIZE),
            title=f"kplate: {result.told.title or result.name}",
            line_smoothing=True,
        )
        self.panel = Panel(self.plotter.renderers[0], SLIDER)
        self.plotter.subplot(0, 1)
        self.plotter.renderers[2].set_background("white")
        self.stage = Stage(self.plotter, result, (1, 2))
        self.mode = "probe"
        self.helped = False
        self._first: tuple[float, float] | None = None
        self._pressed: tuple[int, int] | None = None
        self._moved = False
        self._size = (0, 0)
        self._slider: Any = None

    def build(self) -> None:
        """Put everything in its place."""
        self.stage.build()
        self._add_slider()
        self._lay_out()
        self._bind()

    def show(self) -> None:
        """Show it until it is closed."""
        self.plotter.show()

    def controls(self) -> list[list[Control]]:
        """All that can be clicked, line by line, as it stands now."""
        stage = self.stage
        lines = [[_heading("quantity   left, right")]]
        for field, shades in groupby(stage.result.shades, key=lambda s: s.field):
            own = list(shades)
            whole = len(own) == 1
            line = (
                []
                if whole
                else [Control(name=f"field {field}", text=field, weight=1.3)]
            )
            for shade in own:
                line.append(
                    Control(
                        name=f"quantity {shade.name}",
                        text=field if whole else shade.word,
                        run=self._doing(partial(stage.choose, shade=shade)),
                        chosen=shade is stage.shade,
                        weight=1.0 if whole else 1.0 / len(own),
                    )
                )
            lines.append(line)
        if stage.shade.faces:
            line = [
                Control(
                    name=f"face {face}",
                    text=f"{face} face",
                    run=self._doing(partial(stage.choose, face=face)),
                    chosen=face == stage.face,
                )
                for face in stage.shade.faces
            ]
            lines += [[_heading("face   f")], line]
        lines += self._cases()
        lines.append([_heading("show")])
        switches = [
            self._button(name, f"{name}  {KEYS[name]}", partial(stage.switch, name), on)
            for name, on in stage.on.items()
        ]
        look, flat = stage.look, stage.flat
        looks = [
            self._button(name, text, run, chosen)
            for name, text, run, chosen in (
                ("plan", "from above  1", partial(look, flat=True), flat),
                (
                    "oblique",
                    "oblique  2",
                    partial(stage.look, flat=False),
                    not stage.flat,
                ),
                ("probe", "read a point  p", self._probe, self.mode == "probe"),
                ("section", "section  d", self._section, self.mode == "section"),
            )
        ]
        files = [
            self._button(name, text, run, chosen)
            for name, text, run, chosen in (
                ("png", "picture .png  g", partial(self.save, ".png"), False),
                ("svg", "picture .svg  v", partial(self.save, ".svg"), False),
                ("pdf", "picture .pdf  b", partial(self.save, ".pdf"), False),
                ("csv", "section .csv  k", partial(self.save, ".csv"), False),
                ("help", "help  h", self._help, self.helped),
            )
        ]
        lines += _pairs(switches)
        lines += [[_heading("look and read")], *_pairs(looks)]
        return [*lines, [_heading("save")], *_pairs(files)]

    def act(self, run: Callable[[], None]) -> None:
        """Do something and draw what came of it."""
        self.stage.message = ""
        try:
            run()
        except InputError as error:
            self.stage.message = str(error)
        self.stage.write()
        self._lay_out()
        self.plotter.render()

    def save(self, ending: str) -> None:
        """Write a picture, or the section, beside the result."""
        stage = self.stage
        kind = "section" if ending == ".csv" else "view"
        path = _free(stage.result.folder, f"{stage.result.name}-{kind}", ending)
        stage.message = ""
        if ending == ".csv":
            stage.save_cut(path)
        else:
            self._picture(path)
        stage.message = f"written: {path}"

    def _picture(self, path: Path) -> None:
        """Write what is shown, without the controls."""
        controls, scene, bar = self.plotter.renderers
        kept = scene.GetViewport(), bar.GetViewport()
        self.stage.write()
        controls.SetDraw(False)
        self._slider.Off()
        scene.SetViewport(0.0, 0.0, 1.0 - BAR, 1.0)
        bar.SetViewport(1.0 - BAR, 0.0, 1.0, 1.0)
        try:
            write_stage(self.stage, path)
        finally:
            scene.SetViewport(*kept[0])
            bar.SetViewport(*kept[1])
            controls.SetDraw(True)
            self._slider.On()

    def click(self, x: int, y: int) -> None:
        """Read or cut the plate at pixels from the lower left."""
        found = self._pick(x, y)
        if found is None:
            return
        triangle, shares = found
        if self.mode == "probe":
            self.act(lambda: self.stage.read(triangle, shares))
            return
        fields = self.stage.result.fields
        place = shares @ fields.points[fields.triangles[triangle], :2]
        here = float(place[0]), float(place[1])
        if self._first is None:
            self._first = here
            self.act(lambda: self._say("section: click where it ends"))
            return
        start, self._first = self._first, None
        self.act(lambda: self.stage.cut_along(start, here))

    def _pick(self, x: int, y: int) -> tuple[int, Any] | None:
        """Small triangle under a pixel, and the shares of its corners."""
        from vtkmodules.vtkRenderingCore import vtkCellPicker

        picker = vtkCellPicker()
        picker.SetTolerance(0.0)
        picker.PickFromListOn()
        picker.AddPickList(self.plotter.actors["plate"])
        if not picker.Pick(x, y, 0.0, self.plotter.renderers[1]):
            return None
        triangle = int(picker.GetCellId())
        corners = (
            self.stage.props.layers["plate"]
            .data.points[self.stage.result.fields.triangles[triangle]]
            .astype(np.float64)
        )
        a, b, c = corners
        basis = np.column_stack([b - a, c - a])
        arm = np.array(picker.GetPickPosition()) - a
        s, t = np.linalg.lstsq(basis, arm, rcond=None)[0]
        shares = np.clip([1.0 - s - t, s, t], 0.0, 1.0)
        return triangle, shares / shares.sum()

    def _cases(self) -> list[list[Control]]:
        stage = self.stage
        cases = stage.cases
        if len(cases) < 2:
            return []
        at = cases.index(stage.case)
        first = min(max(at - MOST_CASES // 2, 0), max(len(cases) - MOST_CASES, 0))
        lines = [[_heading(f"case {at + 1} of {len(cases)}   n")]]
        for case in cases[first : first + MOST_CASES]:
            run = partial(stage.choose, case=case)
            lines.append([self._button(f"case {case}", case, run, case == stage.case)])
        return lines

    def _button(
        self, name: str, text: str, run: Callable[[], None], chosen: bool
    ) -> Control:
        return Control(name=name, text=text, run=self._doing(run), chosen=chosen)

    def _doing(self, run: Callable[[], None]) -> Callable[[], None]:
        return partial(self.act, run)

    def _say(self, words: str) -> None:
        self.stage.message = words

    def _probe(self) -> None:
        self.mode, self._first = "probe", None

    def _section(self) -> None:
        self.mode, self._first = "section", None
        self._say("section: click where it begins")

    def _help(self) -> None:
        self.helped = not self.helped
        plotter = self.plotter
        plotter.remove_actor("help", render=False)
        if self.helped:
            actor = plotter.add_text(
                HELP,
                name="help",
                position=(0.05, 0.36),
                viewport=True,
                font_size=7,
                font_file=_mono(),
                color=INK,
                render=False,
            )
            letters = actor.GetTextProperty()
            letters.SetBackgroundColor(1.0, 1.0, 1.0)
            letters.SetBackgroundOpacity(1.0)
            letters.SetFrame(True)
            letters.SetFrameColor(0.4, 0.4, 0.4)

    def _step(self, step: int) -> None:
        shades = self.stage.result.shades
        at = shades.index(self.stage.shade) + step
        self.act(lambda: self.stage.choose(shade=shades[at % len(shades)]))

    def _next_case(self) -> None:
        cases = self.stage.cases
        at = cases.index(self.stage.case) + 1
        self.act(lambda: self.stage.choose(case=cases[at % len(cases)]))

    def _other_face(self) -> None:
        face = "top" if self.stage.face == "bottom" else "bottom"
        self.act(lambda: self.stage.choose(face=face))

    def _rescale(self, factor: float) -> None:
        self.stage.set_scale(self.stage.scale * factor)
        self._slider.GetRepresentation().SetValue(self.stage.scale)
        self.stage.settle()
        self.plotter.render()

    def _add_slider(self) -> None:
        """Add the slider for the scale of the deflection under the controls."""
        stage = self.stage
        low = 0.5 * SLIDER / SIZE[1]
        self.plotter.subplot(0, 0)
        self._slider = self.plotter.add_slider_widget(
            self._slid,
            (0.0, MOST_SCALE * stage.scale),
            value=stage.scale,
            title="deflection drawn x   +, -",
            pointa=(0.06, low),
            pointb=(0.94, low),
            color=INK,
            fmt="%.4g",
            title_height=0.016,
            slider_width=0.035,
            tube_width=0.006,
            interaction_event="always",
        )
        shown = self._slider.GetRepresentation()
        for letters in (shown.GetTitleProperty(), shown.GetLabelProperty()):
            letters.SetFontFamily(4)  # a file
            letters.SetFontFile(font_file())
            letters.SetBold(False)
            letters.SetShadow(False)
        shown.SetLabelHeight(0.016)
        self.plotter.subplot(0, 1)

    def _slid(self, scale: float) -> None:
        if self._slider is not None:  # not while it is made
            self.stage.set_scale(scale)

    def _lay_out(self) -> None:
        width, height = self.plotter.window_size
        self._size = (width, height)
        self.panel.show(self.controls(), self._size)

    def _bind(self) -> None:
        """Listen to keys and the mouse."""
        iren = self.plotter.iren
        if iren is None:
            return
        iren.clear_key_event_callbacks()
        keys: dict[str, Callable[[], None]] = {
            "Right": lambda: self._step(1),
            "Left": lambda: self._step(-1),
            "f": self._other_face,
            "n": self._next_case,
            "plus": lambda: self._rescale(STEP),
            "minus": lambda: self._rescale(1.0 / STEP),
            "equal": lambda: self._rescale(STEP),
        }
        named = {"1": "plan", "2": "oblique", "p": "probe", "d": "section"}
        named |= {"g": "png", "v": "svg", "b": "pdf", "k": "csv", "h": "help"}
        named |= {key: name for name, key in KEYS.items()}
        for key, name in named.items():
            keys[key] = partial(self._run, name)
        for key, run in keys.items():
            iren.add_key_event(key, run)
        iren.add_key_event("q", self._close)
        # Letters mean what the help says, not what VTK does with them.
        iren.interactor.GetInteractorStyle().AddObserver("CharEvent", _nothing)
        self._listen("LeftButtonPressEvent", self._press)
        self._listen("MouseMoveEvent", self._move)
        self._listen("LeftButtonReleaseEvent", self._release)
        self.plotter.render_window.AddObserver("WindowResizeEvent", self._resized)

    def _listen(self, event: str, listen: Callable[[int, int], bool]) -> None:
        """Hear a mouse event before VTK does; what is answered goes no further."""
        interactor = self.plotter.iren.interactor

        def hear(*_: object) -> None:
            if listen(*interactor.GetEventPosition()):
                command.SetAbortFlag(1)

        command = interactor.GetCommand(interactor.AddObserver(event, hear, 10.0))
        # From a press on VTK's own style takes all that is not heard passively.
        command.SetPassiveObserver(event != "LeftButtonPressEvent")

    def _run(self, name: str) -> None:
        run = next(c.run for line in self.controls() for c in line if c.name == name)
        assert run is not None
        run()

    def _press(self, x: int, y: int) -> bool:
        if self.panel.press(x, y):
            return True
        self._pressed, self._moved = (x, y), False
        return False

    def _move(self, x: int, y: int) -> bool:
        if self._pressed is not None and not self._moved:
            far = max(abs(x - self._pressed[0]), abs(y - self._pressed[1]))
            if far > STILL:
                self._moved = True
                self.stage.props.drag(on=True)
        return False

    def _release(self, x: int, y: int) -> bool:
        pressed, self._pressed = self._pressed, None
        if pressed is None:
            return False
        if self._moved:
            self._moved = False
            self.stage.props.drag(on=False)
            self.stage.settle()
            self.plotter.render()
        elif x > SHARE * self._size[0]:
            self.click(x, y)
        return False

    def _resized(self, *_: object) -> None:
        if tuple(self.plotter.render_window.GetSize()) != self._size:
            self._lay_out()

    def _close(self) -> None:
        self.plotter.iren.terminate_app()


def _heading(text: str) -> Control:
    return Control(name=text, text=text)


def _pairs(controls: list[Control]) -> list[list[Control]]:
    """Two to a line."""
    found = [controls[k : k + 2] for k in range(0, len(controls), 2)]
    if len(found[-1]) == 1:
        found[-1].append(Control(name="", text=""))
    return found


def _nothing(*_: object) -> None:
    pass


def _mono() -> str:
    return font_file().replace("DejaVuSans", "DejaVuSansMono")


def _free(folder: Path, stem: str, ending: str) -> Path:
    """A name that no file has yet."""
    number = 1
    while (path := folder / f"{stem}-{number}{ending}").exists():
        number += 1
    return path
