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
