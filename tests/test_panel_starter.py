"""The starter: what it states and what it comments out are valid."""

import re
from functools import partial

import pytest
from panel_texts import STARTER, read_text, write_dxf


@pytest.fixture
def read(tmp_path):
    return partial(read_text, tmp_path)


# A line of the starter that is commented out begins so.
STATEMENT = r"^\s*# +(\[\[|[a-z_]+ = |\{)"
ALONE = [
    "roaming = {",
    *("material = {", "triangles", "element", "chords", "snap", "fillets", "reliefs"),
    *('parts = [{ side = "ladder", name = "hinge", from = "10', "expect"),
    *('parts = [{ side = "ladder", name = "hinge", from = [1100', "{ liquid"),
    *("{ edge_moment", "{ moment", "step", "stress_range", "bearing"),
]
TOGETHER = [
    ("fillets", "reliefs", 'parts = [{ side = "ladder", name = "hinge", from = "10'),
    (
        *("[[zone]]", 'name = "pad"', "rectangle = { centre = [900", "thickness = "),
        *('material = "steel S355"', '{ pressure = "2 kPa up"'),
    ),
    ("[[seam]]", 'name = "rib"', "points = [[600", "rib = "),
    (
        *("[[mark]]", 'name = "bolt"', "at = [1000", "bolt = "),
        '{ force = "50 N up", at = "bolt"',
    ),
    (
        "[[combination]]              # many",
        *('preset = "EN 1990', "permanent", "variable"),
        "[[combination]]              # or",
        *('name = "crowd"', 'purpose = "service"', "factors = { visitors = 1.0"),
        "[[combination]]              # and",
        *('name = "empty"', 'purpose = "uplift"', "factors = { visitors = 0.9"),
    ),
    (
        "[[ask]]                      # a point",
        *('name = "camera"', "at = [900", 'values = ["deflection", "m_xx"]'),
        "[[ask]]                      # a line",
        *('name = "cross-section"', "from = [0, 100", "to = [1200", "stations"),
        'values = ["deflection"]',
    ),
]
INSTEAD = [
    *("circle = { centre = [600", "ellipse = { centre = [600"),
    *("slot = { centre = [600", "rectangle = { centre = [600"),
    *("slot = { centre = [800", "rectangle = { centre = [800"),
    *("ellipse = { centre = [800", 'file = "cover.dxf"', 'layer = "outline"'),
    "{ from = [1200, 0]",
]


def uncommented(text: str, *starts: str) -> str:
    """Take the comment sign off the lines that begin so."""
    lines = text.splitlines()
    for start in starts:
        (i,) = (
            i for i, line in enumerate(lines) if line.strip().startswith(f"# {start}")
        )
        lines[i] = lines[i].replace("# ", "", 1)
    return "\n".join(lines)


@pytest.mark.parametrize("starts", [*((start,) for start in ALONE), *TOGETHER])
def test_what_the_starter_comments_out_is_valid(read, starts):
    text = STARTER.read_text(encoding="utf-8")
    if starts == ("material = {",):
        text = text.replace('material = "steel S235" ', "")
    read(uncommented(text, *starts))


@pytest.mark.parametrize("start", INSTEAD)
def test_what_the_starter_offers_instead_is_valid(read, start, tmp_path):
    text = STARTER.read_text(encoding="utf-8")
    holes = text.index("[[hole]]"), text.index("# An area of its own thickness")
    if "[800" in start:
        text = uncommented(text, start).replace(
            "circle = { centre = [800, 500], radius = 60 }", ""
        )
    elif start.startswith("{ from"):
        text = text.replace("#   { from", "# { from")
        line = next(k for k in text.splitlines() if k.startswith("# { from"))
        text = text.replace("    [1200, 0], ", line.removeprefix("# ")).replace(
            f"\n{line}\n", "\n"
        )
    else:
        text = text[: holes[0]] + text[holes[1] :]
        text = re.sub(
            r"\npoints = \[  .*?\nsides = .*?\n\].*?\n", "\n", text, flags=re.S
        )
        text = re.sub(r"\n(weir|bank|ladder|river|notch|notch-side) = .*", "", text)
        text = text.replace('{ line = "0.2 kN/m down", along = "notch" },', "")
        own = ("file", "layer") if start.startswith(("file", "layer")) else (start,)
        text = uncommented(text, *own)
        write_dxf(tmp_path / "cover.dxf", layer="outline")
    read(text)


def test_no_statement_of_the_starter_is_left_untried():
    text = STARTER.read_text(encoding="utf-8")
    tried = {*ALONE, *INSTEAD, *(start for starts in TOGETHER for start in starts)}
    stated = [line for line in text.splitlines() if re.match(STATEMENT, line)]
    for line in stated:
        begin = line.strip().removeprefix("#").strip()
        assert any(begin.startswith(start) for start in tried), line
    assert len(stated) >= 30
