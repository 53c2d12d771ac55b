"""DXF drawings and lists of vertices: round trips, and every refusal with its words."""

import math
from itertools import pairwise

import ezdxf
import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from kplate import curves
from kplate.chaining import Piece, chain
from kplate.describe import describe
from kplate.drawings import drawing_of
from kplate.dxf import read_dxf
from kplate.errors import InputError
from kplate.fitting import as_arcs
from kplate.outline import Outline
from kplate.polygon import Polygon
from kplate.shapes import Circle, Ellipse
from kplate.units import Unit

MM = Unit("mm", 1e-3)
SQUARE = [(0, 0), (800, 0), (800, 600), (0, 600)]


def lines(space, points, *, close=True, **attributes):
    """Draw loose lines from point to point."""
    ends = [*points[1:], points[0]] if close else points[1:]
    for start, end in zip(points, ends, strict=False):
        space.add_line(start, end, dxfattribs=attributes)


POINTS = [(0, 0, 0), (400, -50, 0), (500, 300, 0), (200, 500, 0), (-100, 300, 0)]


def square(space, **attributes):
    lines(space, SQUARE, **attributes)


def refusal(read):
    """The message with which something is refused."""
    with pytest.raises(InputError) as caught:
        read()
    return str(caught.value)


# Round trips


def test_loose_lines_and_arcs_in_any_order_make_one_panel(drawn):
    def draw(space):
        space.add_line((0, 800), (0, 0))
        space.add_arc((100, 800), 100, 90, 180)
        space.add_line((1200, 900), (1200, 0))
        space.add_line((100, 900), (1200, 900))
        space.add_line((0, 0), (1200, 0))
        space.add_circle((900, 300), 50)
        space.add_circle((300, 300), 25)

    drawing = read_dxf(drawn(draw))
    outline = drawing.outline
    corner = math.tan(math.pi / 8)
    expected = [(0, 0), (1.2, 0), (1.2, 0.9), (0.1, 0.9), (0, 0.8)]
    np.testing.assert_allclose(outline.rim.points, expected, atol=1e-12)
    np.testing.assert_allclose(outline.rim.bulges, [0, 0, 0, corner, 0], atol=1e-15)
    assert outline.rim.sides == ("side-1", "side-2", "side-3", "side-4", "side-5")
    assert [hole.name for hole in outline.holes] == ["hole-1", "hole-2"]
    assert [hole.radius for hole in outline.holes] == pytest.approx([0.025, 0.05])
    missing = (1.0 - math.pi / 4.0) * 0.1**2 + math.pi * (0.05**2 + 0.025**2)
    assert outline.area == pytest.approx(1.2 * 0.9 - missing, rel=1e-12)
    assert outline.rim.perimeter == pytest.approx(4.0 + 0.1 * math.pi / 2.0, rel=1e-12)
    assert drawing.notes == ("5 lines and arcs chained into 1 closed line",)
    assert drawing.ignored == ()
    assert drawing.unit == "mm"
    assert describe(outline, mass=0.006 * 7850.0 * outline.area) == (
        "your panel is 1200 x 900 mm, 2 holes, area 1.068 m2, mass 50.3 kg"
    )


def test_a_polyline_keeps_its_bulges(drawn):
    rows = [(0, 0, 0), (500, 0, 1), (500, 200, 0), (0, 200, 0.3)]
    path = drawn(lambda s: s.add_lwpolyline(rows, format="xyb", close=True))
    rim = read_dxf(path).outline.rim
    np.testing.assert_allclose(rim.points, [(x / 1e3, y / 1e3) for x, y, _ in rows])
    np.testing.assert_allclose(rim.bulges, [0, 1, 0, 0.3], atol=1e-15)
    assert len(set(rim.sides)) == 4


def test_an_old_polyline_reads_as_a_new_one(drawn):
    rows = [(0, 0, 0), (500, 0, 2.0), (500, 200, 0), (0, 200, -0.3)]
    new = read_dxf(drawn(lambda s: s.add_lwpolyline(rows, format="xyb", close=True)))
    old = read_dxf(drawn(lambda s: s.add_polyline2d(rows, format="xyb", close=True)))
    np.testing.assert_allclose(old.outline.rim.points, new.outline.rim.points)
    np.testing.assert_allclose(old.outline.rim.bulges, new.outline.rim.bulges)


def test_a_polyline_that_ends_where_it_began_is_closed(drawn):
    path = drawn(lambda s: s.add_lwpolyline([*SQUARE, SQUARE[0]]))
    assert read_dxf(path).outline.area == pytest.approx(0.48)


def test_an_arc_of_more_than_half_a_circle_keeps_its_area(drawn):
    rows = [(0, 0, 3.0), (0, 100, 0)]
    rim = read_dxf(
        drawn(lambda s: s.add_lwpolyline(rows, format="xyb", close=True))
    ).outline.rim
    stated = Polygon(points=[(0, 0), (0, 0.1)], sides=("a", "b"), bulges=[3.0, 0.0])
    assert rim.area == pytest.approx(stated.area, rel=1e-12)
    assert rim.perimeter == pytest.approx(stated.perimeter, rel=1e-12)
    assert sorted(set(rim.sides)) == ["side-1", "side-2"]


def test_a_clockwise_polyline_is_turned_round_and_noted(drawn):
    rows = [(0, 0, 0), (0, 600, 0), (800, 600, 0), (800, 0, 0.5)]
    drawing = read_dxf(
        drawn(lambda s: s.add_lwpolyline(rows, format="xyb", close=True))
    )
    np.testing.assert_allclose(drawing.outline.rim.points, np.array(SQUARE) / 1e3)
    np.testing.assert_allclose(drawing.outline.rim.bulges, [-0.5, 0, 0, 0])
    assert drawing.notes == (
        "the closed line from (0, 0) mm to (800, 600) mm turned round: it was drawn "
        "clockwise",
    )


def test_a_circle_is_a_panel_of_one_side(drawn):
    rim = read_dxf(drawn(lambda s: s.add_circle((10, 20), 250))).outline.rim
    assert isinstance(rim, Circle)
    assert rim.name == "side-1"
    assert (*rim.centre, rim.radius) == pytest.approx((0.01, 0.02, 0.25), rel=1e-12)


def test_a_full_turn_arc_is_a_circle(drawn):
    rim = read_dxf(drawn(lambda s: s.add_arc((10, 20), 250, 30, 390))).outline.rim
    assert rim.radius == pytest.approx(0.25)


def test_chords_of_a_circle_are_taken_for_one_and_noted(drawn):
    angle = 2.0 * np.pi * np.arange(48) / 48
    points = 300.0 * np.column_stack([np.cos(angle), np.sin(angle)])
    drawing = read_dxf(drawn(lambda s: lines(s, points.tolist())))
    assert drawing.outline.rim.radius == pytest.approx(0.3, rel=1e-9)
    assert "taken for an arc of radius 0.3 m" in drawing.notes[-1]


def test_chords_that_may_be_a_circle_are_one_side(drawn):
    angle = 2.0 * np.pi * np.arange(24) / 24
    points = 300.0 * np.column_stack([np.cos(angle), np.sin(angle)])
    path = drawn(lambda s: lines(s, points.tolist()))
    assert set(read_dxf(path).outline.rim.sides) == {"side-1"}
    assert read_dxf(path, chords="arc").outline.rim.radius == pytest.approx(0.3)
    assert len(set(read_dxf(path, chords="polygon").outline.rim.sides)) == 24


def test_a_mirrored_arc_is_seen_from_above(drawn):
    def draw(space):
        down = {"extrusion": (0, 0, -1)}
        # In its own plane x runs the other way: this is the corner at (1200, 900).
        space.add_arc((-1100, 800), 100, 90, 180, dxfattribs=down)
        points = [(1100, 900), (0, 900), (0, 0), (1200, 0), (1200, 800)]
        lines(space, points, close=False)

    outline = read_dxf(drawn(draw)).outline
    missing = (1.0 - math.pi / 4.0) * 0.1**2
    assert outline.area == pytest.approx(1.2 * 0.9 - missing, rel=1e-12)
    assert (outline.rim.bulges >= 0.0).all()


def test_vertices_on_a_straight_line_are_dropped(drawn):
    points = [(0, 0), (300, 0), (800, 0), (800, 600), (0, 600)]
    drawing = read_dxf(drawn(lambda s: lines(s, points)))
    assert len(drawing.outline.rim.points) == 4
    assert "1 vertex on straight lines dropped" in drawing.notes


@pytest.mark.parametrize("ratio", [1.0, 0.5, 0.2])
@pytest.mark.parametrize("turn", [0.0, 0.7])
def test_an_ellipse_becomes_arcs_within_its_promise(drawn, ratio, turn):
    axis = (400 * math.cos(turn), 400 * math.sin(turn))
    rim = read_dxf(drawn(lambda s: s.add_ellipse((10, 20), axis, ratio))).outline.rim
    assert rim.area == pytest.approx(math.pi * 0.4**2 * ratio, rel=2e-4)
    line = rim.line
    middles = curves.points_at(
        line.points, line.ends, line.bulges, np.full(len(line.points), 0.5)
    )
    c, s = math.cos(turn), math.sin(turn)
    x, y = ((middles - (0.01, 0.02)) @ [[c, -s], [s, c]]).T
    # Distance from the ellipse, to first order.
    value = np.hypot(x / 0.4, y / (0.4 * ratio))
    slope = np.hypot(x / 0.4**2, y / (0.4 * ratio) ** 2) / value
    assert np.abs((value - 1.0) / slope).max() <= 1e-4 * math.hypot(0.8, 0.8 * ratio)
    assert set(line.sides) == {"side-1"}


def test_splines_of_other_kinds(drawn):
    """Through points; straight pieces; a conic, here with its exact area."""

    def area(add):
        def draw(space):
            add(space)
            space.add_line((800, 0), (0, 0))

        drawing = read_dxf(drawn(draw))
        assert drawing.outline.side_names[0] == "side-1"
        assert drawing.notes[0] == "2 lines and arcs chained into 1 closed line"
        return drawing.outline.area

    points = [(0, 0, 0), (400, 300, 0), (800, 0, 0)]
    straight = area(lambda s: s.add_open_spline(points, degree=1))
    assert straight == pytest.approx(0.12, rel=1e-12)
    # Through three points the spline is made of cubics; a parabola has 2/3 of the box.
    through = area(lambda s: s.add_spline(points))
    assert 0.12 < through < 0.16
    # Weights 1, 0, 1 of the quadratic are the chord, 1, 1, 1 the parabola through half
    # the height of the middle point.
    parabola = area(lambda s: s.add_rational_spline(points, [1, 1, 1], degree=2))
    assert parabola == pytest.approx(2.0 / 3.0 * 0.8 * 0.15, rel=3e-4)
    # Weights 1, cos 45, 1 of a right angle are a quarter of a circle.
    right = [(0, 0, 0), (400, 400, 0), (800, 0, 0)]
    quarter = area(
        lambda s: s.add_rational_spline(right, [1, math.sqrt(0.5), 1], degree=2)
    )
    radius = 0.4 * math.sqrt(2.0)
    assert quarter == pytest.approx(radius**2 * (math.pi / 4.0 - 0.5), rel=3e-4)


def test_a_part_of_an_ellipse_closes_with_lines(drawn):
    def draw(space):
        space.add_ellipse((0, 0), (400, 0), 0.5, 0.0, math.pi)
        space.add_line((-400, 0), (400, 0))

    outline = read_dxf(drawn(draw)).outline
    assert outline.area == pytest.approx(0.5 * math.pi * 0.4 * 0.2, rel=2e-4)
    assert outline.side_names == ("side-1", "side-2")


def test_a_spline_becomes_arcs(drawn):
    """Its area by Green's theorem from fine chords."""

    def draw(space):
        spline = space.add_spline(degree=3)
        spline.set_closed(np.array(POINTS))

    path = drawn(draw)
    tool = next(iter(ezdxf.readfile(path).modelspace())).construction_tool()
    low, high = tool.knots()[3], tool.knots()[tool.count]
    places = tool.points(np.linspace(low, high, 20001))
    points = np.array([(p.x, p.y) for p in places])
    x, y = points.T
    area = 0.5e-6 * abs(np.sum(x[:-1] * y[1:] - x[1:] * y[:-1]))
    outline = read_dxf(path).outline
    assert outline.area == pytest.approx(area, rel=2e-4)
    assert outline.side_names == ("side-1",)


def test_units_are_read_and_can_be_overruled(drawn):
    for code, size in ((1, 0.0254), (2, 0.3048), (4, 1e-3), (5, 1e-2), (6, 1.0)):
        outline = read_dxf(drawn(square, unit=code)).outline
        assert outline.area == pytest.approx(0.48e6 * size**2)
    drawing = read_dxf(drawn(square, unit=6), unit="mm")
    assert drawing.outline.area == pytest.approx(0.48)
    assert drawing.notes[0] == "unit mm as stated; the drawing says m"
    assert read_dxf(drawn(square, unit=0), unit="cm").unit == "cm"
    assert read_dxf(drawn(square, version="R12"), unit="cm").unit == "cm"


def test_a_small_gap_is_snapped_and_noted(drawn):
    points = [(0, 0), (800, 0), (800, 600), (0, 600), (0, 0.05)]
    drawing = read_dxf(drawn(lambda s: lines(s, points, close=False)))
    assert drawing.outline.area == pytest.approx(0.48, rel=1e-4)
    assert drawing.notes == (
        "4 lines and arcs chained into 1 closed line",
        "ends snapped together at (0, 0.025) mm by 0.05 mm",
    )


def test_a_wider_snap_closes_a_wider_gap(drawn):
    path = drawn(lambda s: lines(s, [*SQUARE, (0, 2)], close=False))
    assert "gap of 2 mm" in refusal(lambda: read_dxf(path))
    assert read_dxf(path, snap=0.003).outline.area == pytest.approx(0.48, rel=3e-3)


def test_an_arc_keeps_its_radius_where_a_line_is_snapped_to_it(drawn):
    def draw(space):
        space.add_arc((700, 100), 100, 270, 360)
        points = [(800.02, 100), (800, 600), (0, 600), (0, 0), (700, 0.03)]
        lines(space, points, close=False)

    rim = read_dxf(drawn(draw)).outline.rim
    assert np.nanmin(rim.circles[:, 2]) == pytest.approx(0.1, rel=1e-12)


def test_a_line_drawn_twice_counts_once(drawn):
    def draw(space):
        square(space)
        space.add_line((800.01, 0), (0, 0.01))

    drawing = read_dxf(drawn(draw))
    assert drawing.outline.area == pytest.approx(0.48)
    assert drawing.ignored == (
        "LINE on layer '0' from (800.01, 0) mm to (0, 0.01) mm: drawn twice",
    )


def test_everything_ignored_is_listed(drawn):
    def draw(space):
        square(space)
        layer = {"layer": "NOTES"}
        space.add_text("M8", dxfattribs={"insert": (10, 20), **layer})
        space.add_mtext("plate", dxfattribs={"insert": (30, 40), **layer})
        space.add_point((5, 6), dxfattribs=layer)
        hatch = space.add_hatch(dxfattribs=layer)
        hatch.paths.add_polyline_path(SQUARE)
        space.doc.blocks.new("BOLT").add_circle((0, 0), 5)
        space.add_blockref("BOLT", (70, 80), dxfattribs=layer)
        space.add_linear_dim((0, -50), (0, 0), (800, 0), dxfattribs=layer).render()
        space.add_solid([(1, 2), (3, 4), (5, 6)], dxfattribs=layer)
        space.add_leader([(0, 0), (9, 9)], dxfattribs=layer)
        space.add_xline((1, 1), (1, 0), dxfattribs=layer)
        space.add_polymesh((3, 3), dxfattribs=layer)
        space.add_line((7, 7), (7, 7), dxfattribs=layer)

    assert read_dxf(drawn(draw), layer="0").ignored == (
        "TEXT on layer 'NOTES' at (10, 20) mm: no line",
        "MTEXT on layer 'NOTES' at (30, 40) mm: no line",
        "POINT on layer 'NOTES' at (5, 6) mm: no line",
        "HATCH on layer 'NOTES' at (0, 0) mm: no line",
        "INSERT on layer 'NOTES' at (70, 80) mm: a block, not taken apart; explode it "
        "if it is part of the panel",
        "DIMENSION on layer 'NOTES' at (0, -50) mm: no line",
        "SOLID on layer 'NOTES' at (1, 2) mm: no line",
        "LEADER on layer 'NOTES' at (0, 0) mm: no line",
        "XLINE on layer 'NOTES' at (1, 1) mm: no line",
        "POLYLINE on layer 'NOTES' at (0, 0) mm: no line",
        "LINE on layer 'NOTES' from (7, 7) mm to (7, 7) mm: on another layer",
    )


def test_hidden_and_empty_entities_are_ignored(drawn):
    def draw(space):
        square(space)
        space.doc.layers.add("OFF").off()
        space.doc.layers.add("ICE").freeze()
        space.add_line((1, 1), (2, 2), dxfattribs={"layer": "OFF"})
        space.add_circle((3, 3), 1, dxfattribs={"layer": "ICE"})
        space.add_line((4, 4), (5, 5), dxfattribs={"invisible": 1})
        space.add_line((6, 6), (6, 6))
        space.add_circle((7, 7), 0)

    assert read_dxf(drawn(draw)).ignored == (
        "LINE on layer 'OFF' at (1, 1) mm: its layer is off",
        "CIRCLE on layer 'ICE' at (3, 3) mm: its layer is frozen",
        "LINE on layer '0' at (4, 4) mm: it is invisible",
        "CIRCLE on layer '0' at (7, 7) mm: without length",
        "LINE on layer '0' from (6, 6) mm to (6, 6) mm: without length",
    )


# Layers and names


def test_the_only_layer_with_closed_lines_is_taken(drawn):
    def draw(space):
        square(space, layer="PANEL")
        space.add_line((-20, 300), (820, 300), dxfattribs={"layer": "CENTRE"})
        space.add_line((9, 9), (9, 9), dxfattribs={"layer": "DOTS"})

    drawing = read_dxf(drawn(draw))
    assert drawing.notes[0] == "layer 'PANEL' taken: no other holds closed lines"
    assert drawing.ignored == (
        "LINE on layer 'CENTRE' from (-20, 300) mm to (820, 300) mm: on another layer",
        "LINE on layer 'DOTS' from (9, 9) mm to (9, 9) mm: on another layer",
    )


def test_layers_can_be_chosen(drawn):
    def draw(space):
        square(space, layer="PANEL")
        space.add_circle((400, 300), 50, dxfattribs={"layer": "Holes"})
        lines(space, [(-99, -99), (999, -99), (999, 999)], layer="FRAME")

    path = drawn(draw)
    assert refusal(lambda: read_dxf(path)) == (
        "the panel may be on several layers: 'FRAME' (1 closed line), 'Holes' (1 "
        "closed line), 'PANEL' (1 closed line); choose the layer, or the layers, that "
        "it is drawn on."
    )
    assert len(read_dxf(path, layer="panel").outline.holes) == 0
    assert len(read_dxf(path, layer=["PANEL", "HOLES"]).outline.holes) == 1
    assert refusal(lambda: read_dxf(path, layer="HOLE")) == (
        "layer 'HOLE' holds no lines or arcs; those that do are 'FRAME', 'Holes', "
        "'PANEL'."
    )


def test_a_hole_is_not_taken_for_a_panel_whose_rim_does_not_close(drawn):
    def draw(space):
        lines(space, SQUARE, close=False, layer="PANEL")
        space.add_circle((400, 300), 50, dxfattribs={"layer": "HOLES"})

    assert refusal(lambda: read_dxf(drawn(draw))) == (
        "the panel may be on several layers: 'HOLES' (1 closed line), 'PANEL' (0 "
        "closed lines); choose the layer, or the layers, that it is drawn on."
    )


def test_an_outline_over_several_layers_is_chained(drawn):
    def draw(space):
        for k, (start, end) in enumerate(pairwise([*SQUARE, SQUARE[0]])):
            space.add_line(start, end, dxfattribs={"layer": f"L{k}"})

    assert read_dxf(drawn(draw)).outline.area == pytest.approx(0.48)


def test_holes_are_named_row_by_row(drawn):
    places = [(500, 400.1), (100, 100), (300, 399.9), (700, 99.9), (400, 100.2)]

    def draw(space):
        square(space)
        for x, y in places:
            space.add_circle((x, y), 20)

    holes = read_dxf(drawn(draw)).outline.holes
    x = [round(1e3 * hole.centre[0]) for hole in holes]
    assert x == [100, 400, 700, 300, 500]


# Any outline


@st.composite
def panels(draw):
    """A star-shaped rim with some arcs, every corner a clear one, and holes."""
    n = draw(st.integers(3, 9))
    radii = np.array(draw(st.lists(st.floats(0.6, 1.0), min_size=n, max_size=n)))
    angle = 2.0 * np.pi * np.arange(n) / n + draw(st.floats(0.0, 1.0))
    points = radii[:, None] * np.column_stack([np.cos(angle), np.sin(angle)])
    bulges = np.array(
        draw(st.lists(st.sampled_from([0.0, 0.0, 0.15, -0.1]), min_size=n, max_size=n))
    )
    line = Polygon(
        points=points,
        sides=[f"s{k}" for k in range(n)],
        bulges=bulges,
        chords="polygon",
    )
    assume((np.abs(line.turns) > math.radians(12.0)).all())
    holes = draw(st.integers(0, 2))
    places = [(-0.12, 0.0), (0.12, 0.05)][:holes]
    return line, [Circle(centre=p, radius=0.05, name="h") for p in places]


def loose(shape, kind="line"):
    line = shape.line
    return [
        (tuple(a), tuple(b), float(bulge))
        for a, b, bulge in zip(line.points, line.ends, line.bulges, strict=True)
    ]


@given(panels(), st.randoms(use_true_random=False))
def test_any_outline_is_read_back_from_its_loose_pieces(panel, random):
    """Shuffled, reversed, their ends off by less than the snap."""
    rim, holes = panel
    pieces = [piece for shape in (rim, *holes) for piece in loose(shape)]
    tidy = [Piece(start=a, end=b, bulge=bulge, entity=k)
            for k, (a, b, bulge) in enumerate(pieces)]  # fmt: skip
    snap = 1e-4

    def off(point, bulge):
        reach = 0.0 if bulge else 0.2 * snap  # arcs are where they are
        turn = random.uniform(0.0, 2.0 * math.pi)
        return (point[0] + reach * math.cos(turn), point[1] + reach * math.sin(turn))

    messy = []
    for k, (a, b, bulge) in enumerate(pieces):
        start, end = off(a, bulge), off(b, bulge)
        if random.random() < 0.5:
            start, end, bulge = end, start, -bulge
        messy.append(Piece(start=start, end=end, bulge=bulge, entity=k))
    random.shuffle(messy)
    one = drawing_of(chain(tidy, unit=MM, snap=snap), unit=MM).outline
    other = drawing_of(chain(messy, unit=MM, snap=snap), unit=MM).outline
    assert one.area == pytest.approx(rim.area - sum(h.area for h in holes), rel=1e-12)
    assert other.side_names == one.side_names
    for a, b in zip(one.boundaries, other.boundaries, strict=True):
        np.testing.assert_allclose(b.points, a.points, atol=0.3 * snap)
        np.testing.assert_allclose(b.bulges, a.bulges, atol=1e-12)


@given(panels())
def test_a_file_gives_the_outline_to_round_off(tmp_path_factory, panel):
    rim, holes = panel
    document = ezdxf.new(units=6)
    space = document.modelspace()
    rows = np.column_stack([rim.points, rim.bulges])
    space.add_lwpolyline(rows.tolist(), format="xyb", close=True)
    for hole in holes:
        space.add_circle(hole.centre, hole.radius)
    path = tmp_path_factory.mktemp("dxf") / "panel.dxf"
    document.saveas(path)
    read = read_dxf(path).outline
    first = int(np.argmin(np.hypot(*(rim.points - read.rim.points[0]).T)))
    np.testing.assert_allclose(
        read.rim.points, np.roll(rim.points, -first, axis=0), atol=1e-12
    )
    np.testing.assert_allclose(read.rim.bulges, np.roll(rim.bulges, -first), atol=1e-12)
    assert read.rim.perimeter == pytest.approx(rim.perimeter, rel=1e-9)
    assert read.rim.area == pytest.approx(rim.area, rel=1e-9)


def test_a_curve_with_a_cusp_is_refused_or_followed():
    """The curve (t^2, t^3) has its cusp at a joint, where both halves are smooth."""

    def curve(t):
        return np.column_stack([t**2, t**3]), np.column_stack([2.0 * t, 3.0 * t**2])

    arcs = as_arcs(curve, np.array([-1.0, 0.0, 1.0]))
    assert arcs[0][0] == pytest.approx((1.0, -1.0))
    assert arcs[-1][1] == pytest.approx((1.0, 1.0))
    assert refusal(lambda: as_arcs(lambda t: (np.zeros((len(t), 2)),) * 2, np.ones(2)))


def test_an_ellipse_of_the_drawing_is_the_shape_of_that_name(drawn):
    read = read_dxf(drawn(lambda s: s.add_ellipse((0, 0), (400, 0), 0.5))).outline
    shape = Outline.of(Ellipse(centre=(0.0, 0.0), size=(0.8, 0.4), name="rim"))
    assert read.area == pytest.approx(shape.area, rel=1e-4)
    assert read.box == pytest.approx(shape.box, abs=1e-6)


# The sentence


def test_the_sentence_in_the_user_s_unit():
    outline = Outline.circle((0, 0), radius=0.5).cut(
        Circle(centre=(0, 0), radius=0.1, name="eye")
    )
    assert describe(outline, unit=Unit("in", 0.0254)) == (
        "your panel is 39.3701 x 39.3701 in, 1 hole, area 0.754 m2"
    )
