"""A panel file to change one thing in, and where the sample files are."""

from pathlib import Path

import kplate.panel
from kplate.panel import Panel, read_panel

STARTER = Path(kplate.panel.__file__).with_name("starter.toml")
MESHES = Path(__file__).parents[1] / "meshes"
SAMPLES = [STARTER, *sorted(MESHES.glob("*.toml"))]

BASE = """
[panel]
name = "lid"
thickness = "10 mm"
material = "steel S235"

[outline]
unit = "mm"
points = [[0, 0], [800, 0], [800, 600], [0, 600]]
sides = ["south", "east", "north", "west"]

[supports]
south = "clamped"

[[case]]
name = "wheel"
loads = [{ force = "1.5 kN down", over = "200 mm x 100 mm", at = ["400 mm", "300 mm"] }]

[limits]
stress = { criterion = "von Mises", strength = "235 MPa", factor = 1.5 }
"""
# Every kind of section, shape, support and load at once.
RICH = """
[panel]
name = "sluice cover"
thickness = "8 mm"
material = "steel S235"

[outline]
unit = "mm"
points = [
    [0, 0],
    { from = [1200, 0], through = [1350, 450] },
    ["1.2 m", 900],
    [400, 900],
    [400, 600],
    { from = [0, 600], through = [80, 300] },
]
sides = ["weir", "bow", "ladder", "notch-side", "notch", "hollow"]
chords = "polygon"
snap = 0.1
fillets = [{ corner = ["ladder", "notch-side"], radius = 60 }]
reliefs = [{ corner = ["notch", "notch-side"], radius = "4 cm", name = "relief" }]
parts = [
    { side = "bow", name = "hinge", from = "20 %", to = "45 %" },
    { side = "weir", name = "weld", from = [100, 0], to = ["0.5 m", 0] },
]
expect = { size = "1350 mm x 900 mm", holes = 4, area = "0.963 m^2" }

[[hole]]
name = "oval"
ellipse = { centre = [900, 600], size = [260, 120], angle = "30 deg" }

[[hole]]
name = "window"
rectangle = { centre = [250, 420], size = [160, 120], corner_radius = 30, angle = "-20 deg" }

[[hole]]
slot = { centre = [250, 200], length = 160, width = 40 }

[[hole]]
circle = { centre = [700, 700], diameter = 60 }

[[zone]]
name = "doubler"
points = [[500, 0], [800, 0], { from = [800, 200], through = [650, 320] }, [500, 200]]
thickness = "12 mm"

[[zone]]
name = "pane"
circle = { centre = [1150, 700], radius = 60 }
material = { name = "own", E = "70 GPa", nu = 0.23, density = "2500 kg/m^3" }

[[seam]]
name = "rib"
points = [[1000, 100], { from = [1050, 200], through = [1120, 300] }, [1050, 400]]

[[seam]]
name = "track"
points = [[450, 350], [700, 500]]

[[mark]]
name = "pin"
at = [600, 700]

[[mark]]
name = "stud"
at = [950, 300]

[supports]
hinge = "clamped"
weld = "clamped"
ladder = "simply supported"
hollow = "guided"
rib = "clamped"
pin = "simply supported"
stud = "free"

[[case]]
name = "all"
loads = [
    { self_weight = "down" },
    { pressure = "5 kPa up", on = "doubler" },
    { line = "1 kN/m down", along = "track" },
    { edge_moment = "100 N m/m", along = "notch", stretches = "top" },
    { moment = "20 N m", lifts = "+x", at = "stud" },
    { force = "1 kN down", over = "disc 50 mm", at = "stud" },
    { liquid = "1000 kg/m^3", level = "0.5 m", pushes = "down" },
]

[[case]]
name = "wind"
loads = [{ pressure = "0.8 kPa up" }]
reverses = "yes"

[[combination]]
preset = "EN 1990 STR"
permanent = ["all"]
variable = ["wind"]

[[combination]]
name = "storm"
purpose = "service"
factors = { all = 1, wind = 0.6 }

[[combination]]
name = "lift"
purpose = "uplift"
factors = { all = 0.9, wind = 1.5 }

[limits]
deflection = [
    { span = "side ladder", at_most = ["span/200", "4 mm"] },
    { cantilever = "300 mm", preset = "walkway ISO 14122-2" },
]
step = { along = "notch", preset = "walkway ISO 14122-2" }
stress = { preset = "steel S235 EN 10025-2", factor = "steel" }
stress_range = { of = "stress xx", at_most = "80 MPa" }
hold_down = { corners = "500 N", sides = "4 kN/m" }
bearing = { points = "8 kN", only = ["pin"] }

[[ask]]
name = "camera"
at = "stud"
values = ["deflection", "von Mises"]

[[ask]]
name = "line"
from = [500, 450]
to = ["0.8 m", 450]
stations = 5
values = ["m_xx"]
"""  # noqa: E501  TOML keeps an inline table on one line
LOAD = BASE.partition("loads = [")[2].partition("]\n\n[limits]")[0]


def changed(old: str, new: str) -> str:
    """Change what stands once in the file."""
    assert BASE.count(old) == 1, old
    return BASE.replace(old, new)


def with_load(load: str) -> str:
    """Put another load in the place of the only one."""
    return changed(LOAD, load)


def read_text(folder: Path, text: str) -> Panel:
    """Read a panel from its text."""
    path = folder / "panel.toml"
    path.write_text(text, encoding="utf-8")
    return read_panel(path)


def write_dxf(path: Path, *, hole: float = 40.0, layer: str = "0") -> Path:
    """A cover of 400 x 300 mm with a round hole and a text, in mm."""
    import ezdxf

    document = ezdxf.new()
    document.header["$INSUNITS"] = 4
    space, on = document.modelspace(), {"layer": layer}
    rim = [(0, 0), (400, 0), (400, 300), (0, 300)]
    space.add_lwpolyline(rim, close=True, dxfattribs=on)
    space.add_circle((200, 150), hole, dxfattribs=on)
    space.add_text("cover", dxfattribs=on)
    document.saveas(path)
    return path


def with_limit(limit: str) -> str:
    """Add a limit."""
    return changed("[limits]", f"[limits]\n{limit}")


def with_combination(text: str) -> str:
    """Add a combination."""
    return changed("[limits]", f"[[combination]]\n{text}\n\n[limits]")


def with_ask(text: str) -> str:
    """Ask for values."""
    return f"{BASE}\n[[ask]]\n{text}\n"


def with_roaming(*fields: str) -> str:
    """Let the wheel roam in the place of its load."""
    return changed(f"loads = [{LOAD}]", f"roaming = {{ {', '.join(fields)} }}")


def with_section(text: str) -> str:
    """Add a section before the supports."""
    return changed("[supports]", f"{text}\n\n[supports]")
