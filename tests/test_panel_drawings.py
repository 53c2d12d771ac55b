"""Outlines that a panel file takes from drawings beside it."""

import math
from functools import partial

import pytest
from panel_texts import changed, read_text, write_dxf

from kplate.errors import InputError

POINTS = "points = [[0, 0], [800, 0], [800, 600], [0, 600]]"
SIDES = 'sides = ["south", "east", "north", "west"]'


@pytest.fixture
def read(tmp_path):
    return partial(read_text, tmp_path)


def with_file(*lines: str) -> str:
    text = changed(f'unit = "mm"\n{POINTS}\n{SIDES}', "\n".join(lines))
    return text.replace('south = "clamped"', "")


def test_an_outline_is_taken_from_a_drawing_beside_the_file(read, tmp_path):
    write_dxf(tmp_path / "cover.dxf")
    sides = 'sides = ["south", "east", "north", "west"]'
    hole = '[[hole]]\ncircle = { centre = [60, 60], radius = "2 cm" }'
    panel = read(with_file('file = "cover.dxf"', sides, hole))
    outline = panel.plate.outline
    area = 0.4 * 0.3 - math.pi * (0.04**2 + 0.02**2)
    assert outline.area == pytest.approx(area, rel=1e-9)
    south = outline.rim.points[outline.rim.sides.index("south")]
    assert south == pytest.approx((0.0, 0.0), abs=1e-12)
    assert outline.side_names[4:] == ("hole-1", "hole-2")
    assert panel.units.length.symbol == "mm"
    assert any("TEXT" in note and note.startswith("not taken") for note in panel.notes)


def test_the_digest_changes_with_the_drawing(read, tmp_path):
    text = with_file('file = "cover.dxf"')
    write_dxf(tmp_path / "cover.dxf")
    first = read(text).digest
    assert read(text).digest == first
    write_dxf(tmp_path / "cover.dxf", hole=41.0)
    assert read(text).digest != first


def test_unit_layer_and_chords_go_to_the_drawing(read, tmp_path):
    write_dxf(tmp_path / "cover.dxf", layer="cut")
    lines = ('file = "cover.dxf"', 'unit = "in"', 'layer = "cut"', 'chords = "arc"')
    outline = read(with_file(*lines)).plate.outline
    assert outline.box == pytest.approx((0, 0, 400 * 0.0254, 300 * 0.0254), rel=1e-9)
    with pytest.raises(InputError, match=r"^\[outline\] file = 'cover.dxf': "):
        read(with_file('file = "cover.dxf"', 'layer = "glue"'))


def test_a_list_of_vertices_needs_its_unit(read, tmp_path):
    rows = "x,y,side\n0,0,south\n40,0,east\n40,30,north\n0,30,west\n"
    (tmp_path / "cover.csv").write_text(rows)
    outline = read(with_file('file = "cover.csv"', 'unit = "cm"')).plate.outline
    assert outline.area == pytest.approx(0.12, rel=1e-12)
    assert outline.side_names == ("south", "east", "north", "west")
    with pytest.raises(InputError, match="unit is missing; add unit = "):
        read(with_file('file = "cover.csv"'))


def test_a_round_drawing_has_one_side_to_name(read, tmp_path):
    import ezdxf

    document = ezdxf.new()
    document.header["$INSUNITS"] = 4
    document.modelspace().add_circle((0, 0), 300)
    document.saveas(tmp_path / "lid.dxf")
    panel = read(with_file('file = "lid.dxf"', 'sides = ["kerb"]'))
    rim = panel.plate.outline.rim
    assert (rim.name, rim.radius) == ("kerb", pytest.approx(0.3, rel=1e-12))
    assert rim.centre == pytest.approx((0.0, 0.0), abs=1e-12)
    with pytest.raises(
        InputError, match="the rim in the file has 1; name each or none"
    ):
        read(with_file('file = "lid.dxf"', 'sides = ["a", "b"]'))


@pytest.mark.parametrize(
    ("lines", "message"),
    [
        (
            ['file = "cover.pdf"'],
            "[outline] file = 'cover.pdf': it must end in one of .dxf, .step, .stp, "
            ".csv, .msh.",
        ),
        (
            ['file = "cover.csv"', 'layer = "cut"'],
            "[outline] layer = 'cut': it does not go with a .csv file.",
        ),
        (
            ['file = "cover.dxf"', POINTS],
            "[outline]: file and points exclude each other; keep one.",
        ),
        (
            ['unit = "mm"', POINTS, 'layer = "cut"'],
            "[outline] layer = 'cut': it goes with a file; take it out.",
        ),
        (
            ['file = "cover.dxf"', "snap = 0.1"],
            '[outline] snap = 0.1: a length is text with its unit, such as "10 mm".',
        ),
    ],
)
def test_fields_that_do_not_suit_a_file(read, lines, message):
    with pytest.raises(InputError) as caught:
        read(with_file(*lines))
    assert str(caught.value) == message


def test_a_missing_drawing_is_named(read):
    for ending in ("dxf", "step", "csv", "msh"):
        with pytest.raises(InputError) as caught:
            read(with_file(f'file = "none.{ending}"', 'unit = "mm"'))
        message = str(caught.value)
        assert message.startswith(f"[outline] file = 'none.{ending}': ")
        assert len(message.splitlines()) == 1
