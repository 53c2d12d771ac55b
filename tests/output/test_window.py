"""A real window under a virtual screen: what each control, key and click does.

The window runs in a process of its own; hands are `xdotool`'s. After each move the test
asks that process what it now shows.
"""

import json
import os
import shutil
import subprocess
import sys
import time
from contextlib import contextmanager

import numpy as np
import pytest

from kplate.output.record import solution_record, write_json
from kplate.output.vtk import write_vtk

pytestmark = [
    pytest.mark.slow,
    pytest.mark.skipif(sys.platform != "linux", reason="the virtual screen is of X11"),
]

PATIENCE = 60.0  # seconds until something must have happened
WINDOW = """
import json, sys, time
from pathlib import Path
import numpy as np
from kplate.output import props
from kplate.output.result import read_result
from kplate.output.window import Window

w = Window(read_result(Path(sys.argv[1])))
w.build()
w.plotter.show(interactive_update=True, auto_close=False)
stage = w.stage

def pixel(x, y, h=0.0):
    # Where a place of the plate is seen, in pixels from the lower left.
    k = int(stage.signs.nearest(np.array([[x, y]]))[0])
    renderer = w.plotter.renderers[1]
    renderer.SetWorldPoint(x, y, stage.scale * stage.props.w[k] + h, 1.0)
    renderer.WorldToDisplay()
    return list(renderer.GetDisplayPoint()[:2])

def knob():
    # Where the slider's knob is, and where its groove ends.
    shown = w._slider.GetRepresentation()
    a, b = (c.GetComputedDisplayValue(w.plotter.renderers[0])
            for c in (shown.GetPoint1Coordinate(), shown.GetPoint2Coordinate()))
    share = shown.GetValue() / shown.GetMaximumValue()
    return [a[0] + share * (b[0] - a[0]), a[1], b[0]]

def knob_to(scale):
    w._slider.GetRepresentation().SetValue(scale)

def bent():
    return float(abs(stage.props.layers["plate"].data.points[:, 2]).max())

def heavy(count):
    # From so many triangles on few are drawn while something is dragged.
    props.HEAVY = count
    stage.props.layers.clear()
    stage.refresh()
    w.plotter.render()

def text(name):
    actor = w.plotter.actors.get(name)
    return "" if actor is None else actor.GetInput() if name == "help" else next(
        (t for k in range(8) if (t := actor.GetText(k))), "")

def shown(name):
    actor = w.plotter.actors.get(name)
    return bool(actor is not None and actor.GetVisibility())

print(json.dumps("ready"), flush=True)
for line in sys.stdin:
    for _ in range(3):
        time.sleep(0.02)
        w.plotter.iren.process_events()
    print(json.dumps(eval(line), default=float), flush=True)
"""


class Hands:
    """Moves the mouse and presses keys in one window."""

    def __init__(self, display, process, window):
        self.environment = os.environ | {"DISPLAY": display}
        self.process, self.window = process, window

    def do(self, *words):
        done = subprocess.run(
            ["xdotool", *map(str, words)],
            env=self.environment,
            capture_output=True,
            text=True,
            check=True,
            timeout=PATIENCE,
        )
        return done.stdout

    def ask(self, code):
        """What an expression is worth in the window's process."""
        self.process.stdin.write(code + "\n")
        self.process.stdin.flush()
        answer = self.process.stdout.readline()
        assert answer, "the window's process has ended"
        return json.loads(answer)

    def until(self, code, wanted=None):
        """Ask again until it is as wanted, or true."""
        end = time.monotonic() + PATIENCE
        while True:
            found = self.ask(code)
            if found == wanted if wanted is not None else found:
                return found
            assert time.monotonic() < end, (code, found, wanted)

    def move(self, x, y):
        """Move to pixels from the lower left."""
        height = self.ask("w.plotter.window_size[1]")
        self.do("mousemove", "--window", self.window, round(x), round(height - y))

    def click(self, x, y):
        self.move(x, y)
        self.do("click", 1)

    def press(self, control):
        """Click a control by its name."""
        left, low, right, high = self.ask(f"w.panel.boxes[{control!r}]")
        self.click(0.5 * (left + right), 0.5 * (low + high))

    def key(self, name):
        self.do("windowfocus", "--sync", self.window, "key", name)

    def drag(self, start, end, *, asking=""):
        """Drag in steps; ask something before letting go."""
        self.move(*start)
        self.do("mousedown", 1)
        for share in np.linspace(0.0, 1.0, 6)[1:]:
            x, y = (1.0 - share) * np.array(start) + share * np.array(end)
            self.move(x, y)
            self.ask("None")
        found = self.ask(asking) if asking else None
        self.do("mouseup", 1)
        return found


@contextmanager
def virtual_screen():
    """Name of a new virtual screen."""
    for program in ("Xvfb", "xdotool"):
        if shutil.which(program) is None:
            pytest.fail(
                f"{program} is not installed; the window is tested under a virtual "
                "screen: install the packages xvfb, xauth and xdotool, as README's "
                "test command does.",
                pytrace=False,
            )
    read, write = os.pipe()
    screen = subprocess.Popen(
        ["Xvfb", "-displayfd", str(write), "-screen", "0", "1600x1000x24"],
        pass_fds=[write],
        stderr=subprocess.DEVNULL,
    )
    os.close(write)
    with os.fdopen(read) as answer:
        number = answer.readline().strip()
    assert number, "Xvfb has not started"
    try:
        yield f":{number}"
    finally:
        screen.terminate()
        screen.wait(PATIENCE)


@pytest.fixture(scope="module")
def files(cover, tmp_path_factory):
    path = tmp_path_factory.mktemp("window") / "cover.vtu"
    write_vtk(cover, path)
    record = solution_record(cover, "0.1.0")
    record["panel"] = {"name": "landing cover"}
    write_json(record, path.with_suffix(".json"))
    return path


def environment(display):
    own = {k: v for k, v in os.environ.items() if k != "VTK_DEFAULT_OPENGL_WINDOW"}
    return own | {"DISPLAY": display}


def find_window(display, title):
    """Number of the window with a title, once it is there."""
    done = subprocess.run(
        ["xdotool", "search", "--sync", "--onlyvisible", "--name", title],
        env=os.environ | {"DISPLAY": display},
        capture_output=True,
        text=True,
        check=True,
        timeout=PATIENCE,
    )
    return done.stdout.split()[0]


@pytest.fixture(scope="module")
def hands(files):
    """A window, and hands in it."""
    with virtual_screen() as display:
        process = subprocess.Popen(
            [sys.executable, "-c", WINDOW, str(files)],
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            text=True,
            env=environment(display),
        )
        try:
            assert json.loads(process.stdout.readline() or '""') == "ready"
            window = find_window(display, "kplate: landing cover")
            yield Hands(display, process, window)
        finally:
            process.stdin.close()
            process.stdout.close()
            process.terminate()
            process.wait(PATIENCE)


def test_it_is_a_window_of_the_screen(hands):
    assert "X" in hands.ask("type(w.plotter.render_window).__name__")
    assert hands.ask("list(w.plotter.window_size)") == [1400, 900]
    assert hands.do("getwindowname", hands.window).strip() == "kplate: landing cover"


def test_the_slider_draws_the_deflection_larger(hands):
    scale = hands.ask("stage.scale")
    x, y, end = hands.ask("knob()")
    hands.drag((x, y), (0.5 * (x + end), y))
    found = hands.until(f"stage.scale if stage.scale > 1.4 * {scale} else 0")
    assert f"drawn x {found:.4g}" in hands.ask("text('heading')")
    bent = hands.ask("bent()")
    w = hands.ask("float(abs(stage.props.w).max())")
    assert bent == pytest.approx(found * w, rel=1e-5)
    x, y, end = hands.ask("knob()")
    hands.drag((x, y), (1.0, y))
    assert hands.until("stage.scale == 0.0")
    assert hands.ask("bent()") == 0.0
    hands.ask(f"(stage.set_scale({scale}), knob_to({scale}))")


def test_plus_and_minus_draw_the_deflection_larger_and_smaller(hands):
    scale = hands.ask("stage.scale")
    hands.key("plus")
    assert hands.until(f"stage.scale > 1.2 * {scale}")
    assert hands.ask("w._slider.GetRepresentation().GetValue() == stage.scale")
    hands.key("minus")
    assert hands.until(f"abs(stage.scale / {scale} - 1.0) < 1e-9")


def test_a_click_chooses_the_quantity_and_arrows_step_through(hands):
    hands.press("quantity von Mises")
    hands.until("stage.shade.name", "von Mises")
    assert hands.ask("list(w.plotter.scalar_bars.keys())") == ["von Mises\n[MPa]"]
    data = "stage.props.layers['plate'].data.point_data"
    assert hands.ask(f"list({data}.keys())") == ["von Mises [MPa]"]
    hands.key("Right")
    hands.until("stage.shade.name", "deflection")  # the last is followed by the first
    hands.key("Right")
    hands.until("stage.shade.name", "slopes x")
    hands.key("Left")
    hands.until("stage.shade.name", "deflection")


def test_the_face_is_chosen_by_click_and_key(hands):
    hands.press("quantity stress xx")
    hands.until("stage.title", "stress xx, bottom [MPa]")
    bottom = hands.ask("float(stage.values[0])")
    hands.press("face top")
    hands.until("stage.title", "stress xx, top [MPa]")
    assert hands.ask("float(stage.values[0])") == pytest.approx(-bottom)
    assert "stress xx, top [MPa]" in hands.ask("text('heading')")
    hands.key("f")
    hands.until("stage.face", "bottom")
    hands.press("quantity deflection")
    hands.until("stage.shade.name", "deflection")


def test_the_case_is_chosen_by_click_and_key(hands):
    hands.press("case jack")
    hands.until("stage.case", "jack")
    assert "case jack: 2000 N up at a point" in hands.ask("text('heading')")
    hands.key("n")
    hands.until("stage.case", "crowd")


SWITCHES = {
    "contours": ("c", "contours below zero"),
    "mesh edges": ("m", "mesh edges"),
    "principal moments": ("x", "moments above zero"),
    "supports": ("s", "supports"),
    "loads": ("l", "loads"),
    "reactions": ("u", "pushes up"),
    "left out": ("o", "left out"),
    "names": ("t", None),
    "same colours": ("a", None),
}


@pytest.mark.parametrize("name", SWITCHES)
def test_a_switch_answers_to_click_and_key(hands, name):
    key, layer = SWITCHES[name]
    for act in (lambda: hands.press(name), lambda: hands.key(key)):
        before = hands.ask(f"stage.on[{name!r}]")
        act()
        hands.until(f"stage.on[{name!r}] is {not before}")
        if layer is not None:
            assert hands.ask(f"shown({layer!r})") is not before
    if name == "names":
        assert hands.ask("'east' in [label.text for label in stage.labels]")


def test_the_view_is_from_above_or_oblique(hands):
    hands.key("1")
    hands.until("stage.flat")
    np.testing.assert_allclose(
        hands.ask("list(w.plotter.camera.direction)"), [0, 0, -1], atol=1e-6
    )
    hands.press("oblique")
    hands.until("not stage.flat")
    assert hands.ask("w.plotter.camera.direction[2]") > -0.9


def test_a_drag_turns_the_view_by_few_triangles_and_full_again_after(hands):
    """As a plate of many triangles is: from so many on as this one has."""
    hands.ask("heavy(500)")
    before = hands.ask("list(w.plotter.camera.position)")
    x, y = hands.ask("pixel(0.8, 0.2)")
    state = hands.drag(
        (x, y), (x + 120, y + 60), asking="[shown('few'), shown('plate')]"
    )
    assert state == [True, False]
    hands.until("not stage.props.dragging")
    assert hands.ask("[shown('few'), shown('plate')]") == [False, True]
    assert hands.ask("list(w.plotter.camera.position)") != before
    assert hands.ask("stage.reading is None")  # a drag is no click
    hands.ask("(heavy(50_000), stage.look(flat=False), w.plotter.render())")


@pytest.mark.parametrize("place", [(0.8, 0.2), (1.3, 0.5), (0.2, 0.9)])
def test_a_click_reads_the_undeformed_place(hands, cover, place):
    """The plate is drawn bent, by up to 0.25 m: the place is that before it bent."""
    hands.key("p")
    hands.until("w.mode", "probe")
    hands.click(*hands.ask(f"pixel{place}"))
    hands.until(
        f"stage.reading is not None and np.hypot(*np.subtract(stage.reading.place, "
        f"{place})) < 0.03"
    )
    x, y = hands.ask("list(stage.reading.place)")
    w = 1e3 * cover.deflection([(x, y)], case="crowd")[0]
    value = hands.ask("stage.reading.value")
    assert value == pytest.approx(w, abs=0.01 * abs(w) + 1e-4)
    said = hands.ask("text('notes')")
    assert f"at ({1e3 * x:.4g}, {1e3 * y:.4g}) mm: deflection {value:.4g} mm" in said
    assert hands.ask("shown('probe')")


def test_two_clicks_make_a_section_that_is_saved(hands, files):
    hands.press("section")
    hands.until("w.mode", "section")
    for place in ((0.1, 0.15), (1.4, 0.15)):
        hands.click(*hands.ask(f"pixel{place}"))
        hands.ask("None")
    hands.until("stage.cut is not None")
    start, end = hands.ask("[stage.cut.start, stage.cut.end]")
    np.testing.assert_allclose([start, end], [(0.1, 0.15), (1.4, 0.15)], atol=0.03)
    assert hands.ask("w.plotter.renderer._charts[0].y_label") == "deflection [mm]"
    hands.key("k")
    path = files.with_name("cover-section-1.csv")
    hands.until("stage.message", f"written: {path}")
    rows = path.read_text("utf-8").splitlines()
    assert rows[0] == 'distance [m],x [m],y [m],"deflection [mm], case crowd"'
    assert len(rows) > 20
    hands.key("p")


@pytest.mark.parametrize(
    ("control", "key", "ending", "start"),
    [
        ("png", "g", "png", b"\x89PNG"),
        ("svg", "v", "svg", b"<?xml"),
        ("pdf", "b", "pdf", b"%PDF"),
    ],
)
def test_pictures_are_saved_by_click_and_key(hands, files, control, key, ending, start):
    hands.press(control)
    first = files.with_name(f"cover-view-1.{ending}")
    hands.until("stage.message", f"written: {first}")
    hands.key(key)
    second = files.with_name(f"cover-view-2.{ending}")
    hands.until("stage.message", f"written: {second}")
    for path in (first, second):
        assert path.read_bytes().startswith(start)
    if ending == "png":
        from matplotlib.image import imread

        picture = imread(first)[..., :3]
        assert picture.shape == (900, 1400, 3)
        # No controls: their ground is not white.
        assert (picture[450, :100] > 0.99).all()
    said = "".join(hands.ask("text('notes')").split())
    assert f"written:{second}" in said
    assert hands.ask("shown('plate')")
    assert hands.ask("w.plotter.renderers[0].GetDraw()")


def test_help_is_shown_and_goes(hands):
    hands.key("h")
    hands.until("shown('help')")
    said = hands.ask("text('help')")
    for name in SWITCHES:
        key = SWITCHES[name][0]
        assert f"{key}  " in said
    assert "qualified engineer's judgement" in said
    hands.press("help")
    hands.until("not shown('help')")


def test_controls_stay_in_the_window_when_it_shrinks(hands):
    hands.do("windowsize", "--sync", hands.window, 900, 600)
    hands.until("list(w.plotter.render_window.GetSize())", [900, 600])
    hands.ask("w.plotter.render()")
    boxes = np.array(list(hands.ask("w.panel.boxes").values()))
    assert boxes.min() >= 0.0
    assert boxes[:, 2].max() <= 0.235 * 900
    assert boxes[:, 3].max() <= 600.0
    hands.press("quantity slopes y")
    hands.until("stage.shade.name", "slopes y")
    hands.do("windowsize", "--sync", hands.window, 1400, 900)
    hands.until("list(w.plotter.render_window.GetSize())", [1400, 900])


def test_the_command_opens_a_window_that_writes_and_closes(files, tmp_path):
    own = tmp_path / "own.vtu"
    own.write_bytes(files.read_bytes())
    own.with_suffix(".json").write_bytes(files.with_suffix(".json").read_bytes())
    with virtual_screen() as display:
        process = subprocess.Popen(
            [sys.executable, "-m", "kplate", "view", str(own)],
            stdout=subprocess.PIPE,
            stderr=subprocess.PIPE,
            text=True,
            env=environment(display),
        )
        try:
            window = find_window(display, "kplate: landing cover")
            picture = tmp_path / "own-view-1.png"
            end = time.monotonic() + PATIENCE
            while not picture.exists():
                assert time.monotonic() < end
                assert process.poll() is None, process.stderr.read()
                press_in(display, window, "g")
                time.sleep(1.0)
            assert picture.read_bytes().startswith(b"\x89PNG")
            press_in(display, window, "q")
            out, err = process.communicate(timeout=PATIENCE)
            assert (process.returncode, out, err) == (0, "", "")
        finally:
            if process.poll() is None:
                process.kill()
                process.wait()


def press_in(display, window, key):
    subprocess.run(
        ["xdotool", "windowfocus", "--sync", window, "key", key],
        env=environment(display),
        check=True,
        timeout=PATIENCE,
    )
