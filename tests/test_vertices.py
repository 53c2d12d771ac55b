"""Outlines from lists of vertices: all ways to write them, refusals by line."""

import numpy as np
import pytest

from kplate.errors import InputError
from kplate.vertices import read_csv

SQUARE = [(0, 0), (800, 0), (800, 600), (0, 600)]


def refusal(read):
    """The message with which something is refused."""
    with pytest.raises(InputError) as caught:
        read()
    return str(caught.value)


@pytest.fixture
def listed(tmp_path):
    """Write a CSV file; return its path."""

    def make(text, encoding="utf-8"):
        path = tmp_path / "panel.csv"
        path.write_bytes(text.encode(encoding))
        return path

    return make


def test_vertices_with_side_names_and_bulges(listed):
    text = (
        "x,y,side,bulge\n0,0,south,0\n\n# a comment\n"
        "800,0,east,0.5\n800,600,north,0\n0,600,west,0\n"
    )
    drawing = read_csv(listed(text), unit="mm")
    rim = drawing.outline.rim
    np.testing.assert_allclose(rim.points, np.array(SQUARE) / 1e3)
    assert rim.sides == ("south", "east", "north", "west")
    np.testing.assert_allclose(rim.bulges, [0, 0.5, 0, 0])
    assert drawing.unit == "mm"


@pytest.mark.parametrize(
    "text",
    [
        "0,0\n800,0\n800,600\n0,600\n",
        "0;0\n800,0;0\n800,0;600,0\n0;600\n",
        "x;y\n0;0\n800;0\n800;600\n0;600\n0;0\n",
        "\ufeffY,X\r\n0,0\r\n0,800\r\n600,800\r\n600,0\r\n",
        "0,0,\n800,0,\n800,600,\n0,600,\n".replace(",\n", "\n"),
        "x,y\n0,600\n800,600\n800,0\n0,0\n",
    ],
)
def test_all_ways_to_write_a_rectangle(listed, text):
    outline = read_csv(listed(text), unit="mm").outline
    np.testing.assert_allclose(outline.rim.points, np.array(SQUARE) / 1e3)
    assert outline.side_names == ("side-1", "side-2", "side-3", "side-4")


def test_a_clockwise_list_keeps_the_names_of_its_pieces(listed):
    text = "x,y,side\n0,0,west\n0,600,north\n800,600,east\n800,0,south\n"
    drawing = read_csv(listed(text), unit="mm")
    rim = drawing.outline.rim
    middles = {
        name: tuple(np.round(500.0 * (a + b)))
        for name, a, b in zip(rim.sides, rim.points, rim.ends, strict=True)
    }
    assert middles == {
        "south": (400, 0), "east": (800, 300), "north": (400, 600), "west": (0, 300),
    }  # fmt: skip
    assert drawing.notes == ("turned round: it runs clockwise",)


WRONG_LISTS = [
    ("", "the file holds no vertices; write x,y in each line."),
    ("0,0\n1,0\n", "the file holds 2 vertices; a closed line has at least three, two "
     "where a piece is an arc."),
    ("x,z\n0,0\n", "line 1: the header is 'x,z'; its columns must be x, y and, where "
     "wanted, side and bulge, each once."),
    ("x,y,x\n0,0,0\n", "line 1: the header is 'x,y,x'; its columns must be x, y and, "
     "where wanted, side and bulge, each once."),
    ("0,0\n800,0\n800,6e\n", "line 3: y is '6e'; it must be a number."),
    ("0,0\n800,0\n800,nan\n", "line 3: y is 'nan'; it must be a number."),
    ("0,0\n800,0\n800,1e999\n", "line 3: y is '1e999'; it must be a number."),
    ("0,0\n800,0,1\n800,6\n", "line 2 has 3 columns; it must have 2: x, y; decimals "
     "with a comma need semicolons between the columns."),
    ("x;y\n0;0\n8;0;a\n", "line 3 has 3 columns; it must have 2: x, y."),
    ("0,0,a\n8,0,\n8,6,c\n", "line 2: the side is ''; name the piece that begins "
     "here. A file without side names needs a header, such as x,y,bulge."),
    ("0,0,0.5\n8,0,0\n8,6,0\n", "line 1: the side is '0.5'; name the piece that begins "
     "here. A file without side names needs a header, such as x,y,bulge."),
    ("x,y,bulge\n0,0,99\n8,0,0\n8,6,0\n", "line 2: the bulge is 99; it must lie "
     "between -30 and 30."),
    ("0,0\n8,0\n\n8,0\n8,6\n", "lines 2 and 4 give the same vertex, (8, 0) mm; drop "
     "one of them."),
    ("0,0\n8,6\n8,0\n0,6\n", "the pieces that begin in lines 1 and 3 cross or touch "
     "at (4, 3) mm; list the vertices in the order in which a pencil would draw them."),
]  # fmt: skip


@pytest.mark.parametrize(("text", "message"), WRONG_LISTS)
def test_a_wrong_list_names_its_line(listed, text, message):
    path = listed(text)
    assert refusal(lambda: read_csv(path, unit="mm")) == message


def test_lists_that_cannot_be_read(listed, tmp_path):
    path = listed("0,0\n", encoding="utf-16")
    assert refusal(lambda: read_csv(path, unit="mm")) == (
        f"{str(path)!r} is not text in UTF-8; save it as CSV in UTF-8."
    )
    none = tmp_path / "none.csv"
    assert refusal(lambda: read_csv(none, unit="mm")) == (
        f"there is no file {str(none)!r}; name a .csv file."
    )
    assert refusal(lambda: read_csv(tmp_path, unit="mm")) == (
        f"{str(tmp_path)!r} is a folder; name a .csv file."
    )
    assert "'mn'" in refusal(lambda: read_csv(path, unit="mn"))
