"""Broken drawings: every refusal with its words and its place."""

import math

import pytest

from kplate.dxf import read_dxf
from kplate.errors import InputError

SQUARE = [(0, 0), (800, 0), (800, 600), (0, 600)]


def lines(space, points, *, close=True, **attributes):
    """Draw loose lines from point to point."""
    ends = [*points[1:], points[0]] if close else points[1:]
    for start, end in zip(points, ends, strict=False):
        space.add_line(start, end, dxfattribs=attributes)


def square(space, **attributes):
    lines(space, SQUARE, **attributes)


def refusal(read):
    """The message with which something is refused."""
    with pytest.raises(InputError) as caught:
        read()
    return str(caught.value)


def gap(space):
    lines(space, [*SQUARE, (0, 0.4)], close=False)


def stray(space):
    square(space)
    space.add_line((100, 300), (200, 300))


def branch(space):
    square(space)
    space.add_line((800, 0), (900, 50))


def two_spurs(space):
    branch(space)
    space.add_line((0, 600), (-50, 650))


def bow_tie(space):
    lines(space, [(0, 0), (800, 600), (800, 0), (0, 600)])


def two_rims(space):
    square(space)
    lines(space, [(1000, 0), (1100, 0), (1100, 100)])


def nested(space):
    square(space)
    space.add_circle((400, 300), 100)
    space.add_circle((400, 300), 20)


def overlapping(space):
    square(space)
    space.add_circle((0, 300), 100)


def touching_holes(space):
    square(space)
    space.add_circle((300, 300), 50)
    space.add_lwpolyline([(300, 350), (350, 450), (250, 450)], close=True)


def crossing_holes(space):
    square(space)
    space.add_circle((300, 300), 50)
    space.add_circle((360, 300), 50)


def tilted_line(space):
    square(space)
    space.add_line((0, 0, 0), (100, 100, 50))


def tilted_circle(space):
    square(space)
    space.add_circle((300, 300), 50, dxfattribs={"extrusion": (0, 0.6, 0.8)})


def standing_ellipse(space):
    square(space)
    attributes = {"extrusion": (0, 1, 0)}
    space.add_ellipse((300, 300), (50, 0), dxfattribs=attributes)


def texts(space):
    space.add_text("M8", dxfattribs={"insert": (10, 20)})
    space.add_text("M8", dxfattribs={"insert": (10, 40)})
    space.add_point((1, 2))


def nothing(space):
    pass


def tiny_stray(space):
    square(space)
    space.add_line((100, 300), (100.05, 300))


def dots(space):
    space.add_line((5, 5), (5, 5))


def open_polyline(space):
    space.add_lwpolyline(SQUARE)


def half_arc(space):
    space.add_arc((0, 0), 100, 0, 180)


def spike(space):
    lines(space, [(0, 0), (800, 0), (800, 600), (800, 900), (800, 600.2), (0, 600)])


def missing_side(space):
    lines(space, [SQUARE[0], *SQUARE[3:0:-1]], close=False)


def pinched(space):
    points = [(0, 0), (400, 300), (800, 0), (800, 600), (400, 300), (0, 600)]
    space.add_lwpolyline(points, close=True)


SQUARE_LINE = "the closed line from (0, 0) mm to (800, 600) mm"
OWN_LAYER = "Take the others out, or put them on a layer of their own."
APART = "a hole must lie strictly inside the rim and apart from other holes."
FLAT = "it is not parallel to the xy plane; draw the panel flat."
BROKEN = [
    (
        gap,
        "the LINE from (0, 0) mm to (800, 0) mm does not close: gap of 0.4 mm near (0, "
        "0) mm (2 free ends in all). Join the ends, or snap over more than 0.4 mm.",
    ),
    (
        stray,
        "the LINE from (100, 300) mm to (200, 300) mm is joined to nothing at (100, "
        "300) mm; join it, take it out, or put it on a layer of its own.",
    ),
    (
        branch,
        "3 lines meet at (800, 0) mm; at each corner of a closed line there are two. "
        + OWN_LAYER,
    ),
    (
        two_spurs,
        "3 lines meet at (800, 0) mm (2 such points); at each corner of a closed line "
        "there are two. " + OWN_LAYER,
    ),
    (
        bow_tie,
        f"{SQUARE_LINE} crosses or touches itself at (400, 300) mm; draw it so that it "
        "meets itself nowhere.",
    ),
    (
        two_rims,
        "the closed line from (1000, 0) mm to (1100, 100) mm lies outside "
        f"{SQUARE_LINE}; a panel has one rim. Take one of them out, or choose its "
        "layer.",
    ),
    (
        nested,
        "the closed line from (380, 280) mm to (420, 320) mm lies inside the hole of "
        "the closed line from (300, 200) mm to (500, 400) mm; a panel has a rim and "
        "holes, nothing in them. Take it out, or choose the layers of the panel.",
    ),
    (overlapping, f"two closed lines cross or touch at (0, 400) mm; {APART}"),
    (
        touching_holes,
        f"two closed lines cross or touch at (300, 350) mm; {APART}",
    ),
    (crossing_holes, f"two closed lines cross or touch at (330, 340) mm; {APART}"),
    (tilted_line, f"LINE on layer '0' at (0, 0) mm: {FLAT}"),
    (tilted_circle, f"CIRCLE on layer '0' at (300, 300) mm: {FLAT}"),
    (standing_ellipse, f"ELLIPSE on layer '0' at (300, 300) mm: {FLAT}"),
    (
        texts,
        "the drawing holds no lines or arcs that could be an outline, only 1 POINT, 2 "
        "TEXT; explode blocks, and draw the panel with lines, arcs, polylines or "
        "circles.",
    ),
    (
        nothing,
        "the drawing holds no lines or arcs that could be an outline; draw it with "
        "lines, arcs, polylines or circles.",
    ),
    (
        open_polyline,
        "the LWPOLYLINE from (0, 0) mm to (800, 0) mm does not close: gap of 600 mm "
        "near (0, 0) mm (2 free ends in all). Join the ends, or snap over more than "
        "600 mm.",
    ),
    (
        half_arc,
        "the ARC from (100, 0) mm to (-100, 0) mm is joined to nothing at (100, 0) mm; "
        "join it, take it out, or put it on a layer of its own.",
    ),
    (
        spike,
        "the closed line from (0, 0) mm to (800, 900) mm crosses or touches itself at "
        "(800, 600.2) mm; draw it so that it meets itself nowhere.",
    ),
    (
        missing_side,
        "the LINE from (0, 0) mm to (0, 600) mm is joined to nothing at (0, 0) mm; "
        "join it, take it out, or put it on a layer of its own.",
    ),
    (
        tiny_stray,
        "the LINE from (100, 300) mm to (100.05, 300) mm is joined to nothing at (100, "
        "300) mm; join it, take it out, or put it on a layer of its own.",
    ),
    (dots, "all lines of the drawing are without length."),
    (
        pinched,
        "4 lines meet at (400, 300) mm; at each corner of a closed line there are two. "
        + OWN_LAYER,
    ),
]


@pytest.mark.parametrize(
    ("draw", "message"), BROKEN, ids=lambda p: getattr(p, "__name__", "")
)
def test_a_broken_drawing_says_where(drawn, draw, message):
    path = drawn(draw)
    assert refusal(lambda: read_dxf(path)) == message


def test_a_drawing_without_a_unit_says_how_to_state_it(drawn):
    assert refusal(lambda: read_dxf(drawn(square, unit=0))) == (
        "the drawing does not say its unit of length (it has no usable $INSUNITS); "
        'state it, such as unit = "mm".'
    )


def test_files_that_are_no_drawings_are_refused_by_name(tmp_path):
    def said(name, content=None):
        path = tmp_path / name
        if content is not None:
            path.write_bytes(content)
        return refusal(lambda: read_dxf(path)).replace(str(tmp_path), "")

    assert said("none.dxf") == "there is no file '/none.dxf'; name a .dxf file."
    assert said("") == f"{str(tmp_path)!r} is a folder; name a .dxf file.".replace(
        str(tmp_path), ""
    )
    damaged = "it is no DXF file, or damaged."
    assert said("a.dxf", b"hello") == f"cannot read '/a.dxf'; {damaged}"
    assert said("b.dxf", b"") == f"cannot read '/b.dxf'; {damaged}"
    assert said("c.dxf", b"AC1032" + bytes(99)) == (
        "'/c.dxf' is a DWG file; save the drawing as DXF."
    )


def test_half_a_drawing_is_refused(drawn, tmp_path):
    path = drawn(square, version="R12")
    content = path.read_bytes()
    path.write_bytes(content[: len(content) // 2])
    assert "it is no DXF file, or damaged" in refusal(lambda: read_dxf(path))


@pytest.mark.parametrize("snap", [-1.0, 5.0, math.nan])
def test_a_snap_that_cannot_be_meant_is_refused(drawn, snap):
    assert refusal(lambda: read_dxf(drawn(square), snap=snap)) == (
        f"snap is {snap / 1e-3:.3g} mm; it must be at least 0 and less than the size "
        "of the drawing, 1e+03 mm."
    )
