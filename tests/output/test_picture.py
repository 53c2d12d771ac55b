"""The picture: what is on it, that nothing overlaps, and that it is the same again."""

import subprocess
import sys
from dataclasses import replace
from itertools import pairwise

import matplotlib
import numpy as np
import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.collections import PolyCollection
from matplotlib.colors import to_rgba
from matplotlib.figure import Figure

from kplate.adapt import solve
from kplate.elements.triangle import area
from kplate.errors import InputError
from kplate.loads import Case, Pressure
from kplate.materials import ALUMINIUM
from kplate.outline import Outline
from kplate.output import plan, shape
from kplate.output.contours import bands, draw_bands
from kplate.output.lettering import Hand, Names, Spot, upright
from kplate.output.picture import HEIGHT, WIDTH, figure, write_picture
from kplate.plate import Plate
from kplate.shapes import Circle, Ellipse, Slot
from kplate.supports import CLAMPED, SIMPLY_SUPPORTED, Support
from kplate.units import DisplayUnits, Unit


def texts(drawn):
    """All that is written on a figure outside tick labels."""
    own = [*drawn.texts, *(t for axes in drawn.axes for t in axes.texts)]
    return [text for text in own if text.get_text()]


def words(drawn):
    return [text.get_text() for text in texts(drawn)]


def plan_of(drawn):
    """The axes of the plan, and of the colour bar."""
    plan_axes = next(a for a in drawn.axes if a.get_xlabel().startswith("x ["))
    bar = next((a for a in drawn.axes if "[" in a.get_ylabel()[3:]), None)
    return plan_axes, bar


def surface_of(drawn):
    """The triangles of the deflected shape."""
    return next(
        c for a in drawn.axes for c in a.collections if type(c) is PolyCollection
    )


def overlaps(drawn):
    """Pairs of texts whose boxes overlap."""
    renderer = drawn.canvas.get_renderer()
    found = []
    own = [t for t in texts(drawn) if t.get_rotation() % 90 == 0]
    boxes = [t.get_window_extent(renderer) for t in own]
    for i, a in enumerate(boxes):
        for j, b in enumerate(boxes[:i]):
            wide = min(a.x1, b.x1) - max(a.x0, b.x0)
            high = min(a.y1, b.y1) - max(a.y0, b.y0)
            if wide > 1.0 and high > 1.0:
                found.append((own[i].get_text(), own[j].get_text()))
    return found


def test_the_file_is_a_png_of_the_stated_size_and_the_same_again(cover, tmp_path):
    path = tmp_path / "a.png"
    assert write_picture(cover, path, title="landing cover") == path
    content = path.read_bytes()
    assert content[:8] == b"\x89PNG\r\n\x1a\n"
    size = [int.from_bytes(content[k : k + 4], "big") for k in (16, 20)]
    assert size == [WIDTH, HEIGHT] == [1600, 800]
    assert b"Software" not in content  # nor its version
    write_picture(cover, path, title="landing cover")
    assert path.read_bytes() == content
    assert list(tmp_path.iterdir()) == [path]


def test_the_users_settings_change_nothing(lid, tmp_path):
    first = write_picture(lid, tmp_path / "a.png").read_bytes()
    mine = {"font.size": 20, "axes.facecolor": "red", "savefig.dpi": 50}
    with matplotlib.rc_context(mine):
        second = write_picture(lid, tmp_path / "b.png").read_bytes()
        assert matplotlib.rcParams["font.size"] == 20
    assert second == first


def test_it_says_what_it_shows(cover):
    drawn = figure(cover, case="crowd", title="landing cover")
    peak = cover.peak("deflection", case="crowd")
    value = f"{1e3 * peak.value:#.4g} mm"
    x, y = (f"{1e3 * c:.4g}" for c in peak.place)
    written = words(drawn)
    assert "landing cover" in written
    assert (
        f"case crowd     peak deflection {value} at ({x}, {y}) mm     "
        f"thickness 12 mm, steel S235     {len(cover.mesh.triangles)} triangles     "
        "bands not estimated"
    ) in written
    assert value in written  # beside the cross
    for side in cover.plate.outline.side_names:
        assert side in written
    assert "clamped: w = 0, rotation held, uplift held" in written
    assert "simply supported: w = 0, rotation free, uplift held" in written
    assert "free: nothing held" in written
    assert "no finite moment: left out of peaks (1)" in written
    assert "undeflected" in written
    plan_axes, bar = plan_of(drawn)
    assert plan_axes.get_xlabel() == "x [mm]"
    assert plan_axes.get_ylabel() == "y [mm]"
    assert bar.get_ylabel() == "deflection [mm], positive up"


def test_the_case_with_the_largest_peak_is_drawn_where_none_is_named(cover):
    worst = cover.peak("deflection").case
    assert any(text.startswith(f"case {worst} ") for text in words(figure(cover)))


def test_a_point_force_is_marked_in_its_own_case_only(cover):
    rings = {}
    for case in cover.cases:
        axes, _ = plan_of(figure(cover, case=case))
        rings[case] = sorted(
            tuple(np.ravel(line.get_xydata()))
            for line in axes.lines
            if line.get_marker() == "o"
        )
    assert rings == {
        "crowd": [(1000.0, 800.0)],
        "jack": [(1000.0, 800.0), (1350.0, 400.0)],
    }


def test_the_cross_stands_at_the_peak(cover):
    axes, _ = plan_of(figure(cover, case="jack"))
    place = 1e3 * np.array(cover.peak("deflection", case="jack").place)
    crosses = [line.get_xydata()[0] for line in axes.lines if line.get_marker() == "+"]
    assert crosses
    np.testing.assert_allclose(crosses, np.tile(place, (len(crosses), 1)))


def test_scales_of_the_plan_are_equal(cover, lid):
    for solution in (cover, lid):
        drawn = figure(solution)
        axes, _ = plan_of(drawn)
        (x0, y0), (x1, y1) = axes.transData.transform([(0.0, 0.0), (1e3, 1e3)])
        assert x1 - x0 == pytest.approx(y1 - y0, rel=1e-9)


def test_contours_and_colour_bar_have_the_same_round_levels(lid):
    drawn = figure(lid)
    peak = 1e3 * lid.peak("deflection").value
    _, bar = plan_of(drawn)
    ticks = bar.get_yticks()
    step = np.diff(ticks)
    np.testing.assert_allclose(step, step[0], rtol=1e-9)
    assert ticks[0] <= peak < ticks[0] + step[0]
    assert ticks[-1] == 0.0
    assert [t.get_text() for t in bar.get_yticklabels()] == [f"{t:g}" for t in ticks]
    assert f"Plan, deflection, a contour every {step[0]:g} mm" in words(drawn)


def test_colours_of_the_shape_run_from_pale_at_zero_to_dark_at_the_peak(lid):
    w = 1e3 * lid.point_fields()["deflection [m]"]
    drawn = bands("deflection", w, 1e3 * lid.peak("deflection").value)
    colours = drawn.on_triangles(lid.field_triangles)
    means = w[lid.field_triangles].mean(axis=1)
    brightness = colours[:, :3] @ (0.299, 0.587, 0.114)
    order = np.argsort(means)
    assert np.corrcoef(means, brightness)[0, 1] > 0.97
    assert brightness[order[0]] < 0.45 < 0.9 < brightness[order[-1]]


def test_deflections_both_ways_have_white_at_zero(cover):
    w = 1e3 * cover.point_fields(case="crowd")["deflection [m]"]
    assert w.max() > -0.01 * w.min()  # the free notch side lifts
    drawn = bands("deflection", w, w.min())
    colours, limits = drawn.colours()
    assert limits.vmin == -limits.vmax
    assert min(colours(limits(0.0))[:3]) > 0.95


def test_a_hair_of_uplift_does_not_change_the_colours():
    w = np.array([-1.0, 0.005, 0.0])
    np.testing.assert_allclose(
        bands("deflection", w, -1.0).levels[[0, -1]], [-1.0, 0.0]
    )


def test_the_shape_has_the_stated_scale(lid):
    drawn = figure(lid)
    caption = next(t for t in words(drawn) if t.startswith("Deflected shape"))
    scale = float(caption.rpartition(" x ")[2])
    w = 1e3 * lid.point_fields()["deflection [m]"]
    bent = np.c_[1e3 * lid.field_points, scale * w]
    corners = {
        tuple(np.round(p, 6))
        for path in surface_of(drawn).get_paths()
        for p in path.vertices
    }
    for point in shape.project(bent):
        assert tuple(np.round(point, 6)) in corners


def test_round_off_above_zero_is_zero_on_plan_and_shape(lid):
    """Clamped corners lift by some 1e-6 of the peak; they keep the colour of zero."""
    w = 1e3 * lid.point_fields()["deflection [m]"]
    corner = np.hypot(*(lid.field_points - (0.8, 0.6)).T) < 0.1
    lifted = np.where(corner, 1e-6, w)
    drawn = bands("deflection", lifted, w.min())
    assert drawn.levels[-1] == 0.0
    pale = drawn.colours()[0](0.9999999)
    inside = corner[lid.field_triangles].all(axis=1)
    assert inside.any()
    np.testing.assert_allclose(
        drawn.on_triangles(lid.field_triangles)[inside],
        np.tile(pale, (inside.sum(), 1)),
    )
    axes = Figure().add_subplot()
    draw_bands(axes, lid.field_points, lid.field_triangles, drawn)
    (filled,) = axes.collections
    highest = filled.get_paths()[-1]
    assert highest.contains_point((0.79, 0.59))


@pytest.mark.parametrize(
    ("largest", "scale"),
    [(1.0, 100.0), (1.1, 80.0), (0.07, 1000.0), (2e3, 0.05), (0.0, 1.0)],
)
def test_scales_are_round_and_the_largest_that_fit(largest, scale):
    """At most the share RISE of the size, 0.14 of 720 here, is drawn."""
    assert shape.RISE == 0.14
    found = shape.scale_factor(largest, 720.0)
    assert found == pytest.approx(scale)
    assert found * largest <= 0.14 * 720.0 * (1.0 + 1e-9)


def test_what_is_further_back_is_drawn_first(lid):
    mesh = lid.mesh
    bent = np.c_[mesh.points, np.zeros(len(mesh.points))]
    faces = np.tile([0.2, 0.4, 0.6, 1.0], (len(mesh.triangles), 1))
    rim = mesh.boundary_edges
    drawn = shape.surface(bent, mesh.triangles, rim=rim, faces=faces)
    filled = drawn.get_facecolors()[:, 3] > 0.0
    depth = np.array([p.vertices[:3, 1].mean() for p in drawn.get_paths()])[filled]
    assert len(depth) == len(mesh.triangles)
    assert (np.diff(depth) <= 1e-12).all()


def test_grid_lines_lie_on_the_surface():
    """On a plane z = 0.3 x + 0.2 y all cuts have that z, and x where they should."""
    points = np.random.default_rng(5).uniform(size=(60, 2))
    bent = np.c_[points, points @ (0.3, 0.2)]
    triangles = np.arange(60).reshape(20, 3)
    segments, which = shape._cut(bent, triangles, bent[:, 0] - 0.5)
    crossed = (bent[triangles, 0] > 0.5).any(axis=1) & (bent[triangles, 0] < 0.5).any(
        axis=1
    )
    np.testing.assert_array_equal(which, np.flatnonzero(crossed))
    np.testing.assert_allclose(segments[..., 0], 0.5)
    np.testing.assert_allclose(segments[..., 2], segments[..., :2] @ (0.3, 0.2))


def test_stress_beyond_rare_corners_does_not_set_the_colours(cover):
    drawn = figure(cover, case="crowd", quantity="von Mises")
    peak = cover.peak("von Mises", case="crowd").value / 1e6
    stress = cover.point_fields(case="crowd")["von Mises [Pa]"] / 1e6
    _, bar = plan_of(drawn)
    top = bar.get_yticks()[-1]
    corners = cover.field_triangles
    areas = np.bincount(
        corners.ravel(), np.repeat(area(cover.field_points[cover.field_triangles]), 3)
    )
    assert areas[stress > top].sum() < 0.02 * areas.sum()
    assert top < 0.6 * peak
    assert bar.get_yticks()[0] == 0.0
    assert bar.get_ylabel() == "von Mises [MPa], both faces"
    above = bands("von Mises", stress, peak, areas).on_triangles(cover.field_triangles)
    means = stress[cover.field_triangles].mean(axis=1)
    beyond = means > top
    assert beyond.any()
    dark = np.tile(to_rgba("#6a0d1c"), (beyond.sum(), 1))
    np.testing.assert_allclose(above[beyond], dark)


def test_supports_are_drawn_by_kind(cover):
    axes, _ = plan_of(figure(cover))
    styles = {}
    for line in axes.lines:
        if len(line.get_xdata()) == 2:
            styles.setdefault(line.get_linestyle(), []).append(line.get_xydata())
    dashed = np.array(styles["--"])
    assert len(dashed) == 3  # notch-south, north, west: outside the plate
    assert {tuple(np.ptp(line, axis=0) > 1.0) for line in dashed} == {
        (True, False),
        (False, True),
    }
    assert sorted(dashed[:, :, 1].max(axis=1))[-1] > 1200.0
    assert dashed[:, :, 0].min() < 0.0
    hatch = next(
        c.get_segments()
        for c in axes.collections
        if type(c).__name__ == "LineCollection" and len(c.get_segments()) > 20
    )
    hatch = np.array(hatch)  # of the south side, below it
    np.testing.assert_allclose(hatch[:, 0, 1], 0.0, atol=1e-9)
    assert (hatch[:, 1, 1] < 0.0).all()


def test_a_held_slope_alone_has_dots():
    guided = Support(name="guided", holds_deflection=False, holds_slope=True, words="")
    drawn = Figure()
    axes = drawn.add_subplot()
    outline = Outline.polygon([(0, 0), (1, 0), (0, 1)], sides=["a", "b", "c"])
    plan.draw_piece(axes, plan.pieces(outline, 1.0)[0], guided, 0.01)
    side, dots = axes.lines
    assert side.get_linestyle() == "-"
    assert dots._unscaled_dash_pattern[1] == (1.0, 2.0)  # points drawn, points left out
    np.testing.assert_allclose(dots.get_ydata(), -0.05)


def test_normals_point_out_of_the_plate_and_into_holes():
    outline = Outline.polygon([(0, 0), (4, 0), (4, 3), (0, 3)]).cut(
        Circle(centre=(1, 1), radius=0.5, name="hole")
    )
    for piece in plan.pieces(outline, 1.0):
        foot, away = (array[0] for array in piece.at(np.array([0.5])))
        x, y = foot + 0.01 * away
        on_plate = 0.0 < x < 4.0 and 0.0 < y < 3.0 and np.hypot(x - 1, y - 1) > 0.5
        assert not on_plate


def test_an_arc_is_drawn_round_with_its_normals_out_of_the_plate():
    outline = Outline.polygon(
        [(0, 0), (2, 0), (2, 2), (0, 2)],
        sides=["a", "bow", "c", "hollow"],
        bulges=[0.0, 0.4, 0.0, -0.4],
    )
    bow, hollow = (plan.pieces(outline, 1.0)[i] for i in (1, 3))
    for piece, into in ((bow, -1.0), (hollow, 1.0)):
        x, y, radius = outline.rim.circles[outline.rim.sides.index(piece.side)]
        assert len(piece.points) > 20
        np.testing.assert_allclose(np.hypot(*(piece.points - (x, y)).T), radius)
        foot, away = piece.at(np.array([0.2, 0.5, 0.8]))
        to_centre = (x, y) - foot
        assert (into * np.einsum("kc,kc->k", away, to_centre) > 0.0).all()
    # A half of the way round, the bow stands 0.4 x 1 m out of its chord.
    np.testing.assert_allclose(bow.at(np.array([0.5]))[0], [[2.4, 1.0]], atol=1e-3)


def test_arcs_of_one_side_that_run_on_are_one_piece():
    ellipse = Ellipse(centre=(0, 0), size=(2, 1), name="rim")
    (piece,) = plan.pieces(Outline.of(ellipse), 1.0)
    assert piece.is_closed
    assert piece.length == pytest.approx(ellipse.perimeter, rel=1e-3)
    slot = Slot(centre=(0, 0), length=2, width=1, name="rim")
    assert len(plan.pieces(Outline.of(slot), 1.0)) == 4


def test_what_lies_inside_is_named_and_explained(deck):
    drawn = figure(deck)
    written = words(drawn)
    for name in (*deck.plate.outline.names, "pad, 12 mm"):
        assert name in written
    for text in ("simply supported point", "free point"):
        assert text in written
    assert "guided: rotation held, w free: a line of symmetry" in written
    # The seam's, as no side is simply supported.
    assert "simply supported: w = 0, rotation free, uplift held" in written
    assert not any("no room" in text for text in written)
    assert overlaps(drawn) == []


def lines_of(axes, place):
    """Lines of the plan that pass within a millimetre of a place."""
    return [
        line
        for line in axes.lines
        if len(line.get_xdata()) > 1
        and np.hypot(*(_dense(line.get_xydata()) - place).T).min() < 1.0
    ]


def _dense(points):
    shares = np.linspace(0.0, 1.0, 200)[:, None]
    return np.concatenate([a + shares * (b - a) for a, b in pairwise(points)])


def test_a_held_seam_has_its_symbol_on_both_sides_and_a_free_one_none(deck):
    axes, _ = plan_of(figure(deck))
    dashed = [
        line.get_xydata()
        for line in axes.lines
        if line.get_linestyle() == "--" and len(line.get_xdata()) == 2
    ]
    dashed = [line for line in dashed if line.min() > 0.0]  # not the dots of the west
    assert len(dashed) == 2
    beside = sorted(float(line[:, 0].mean()) for line in dashed)
    assert beside[0] < 600.0 < beside[1]
    assert 600.0 - beside[0] == pytest.approx(beside[1] - 600.0)
    middle = deck.plate.outline.seams[1].path.interpolate(0.5, normalized=True)
    free = lines_of(axes, 1e3 * np.array(middle.coords[0]))
    assert free
    assert {line.get_linewidth() for line in free} == {1.0}


def test_marks_have_signs_by_what_they_hold(deck):
    axes, _ = plan_of(figure(deck))
    signs = {
        tuple(np.round(line.get_xydata()[0], 6)): line.get_marker()
        for line in axes.lines
        if line.get_marker() in ("^", "s", "x")
    }
    assert signs == {(900, 400): "^", (450, 450): "^", (1100, 600): "x"}


def test_the_edge_of_a_zone_is_thin_and_closed(deck):
    axes, _ = plan_of(figure(deck))
    (edge,) = lines_of(axes, (300.0 + 120.0, 250.0))
    assert edge.get_linewidth() < 1.0
    points = edge.get_xydata()
    np.testing.assert_allclose(points[0], points[-1])
    radius = np.hypot(*(points - (300.0, 250.0)).T)
    np.testing.assert_allclose(radius, 120.0, rtol=1e-9)


def test_stress_jumps_at_the_edge_of_a_thicker_zone(deck):
    """m_nn goes on across the step, so that stresses jump by about (12 / 8)^2."""
    drawn = figure(deck, quantity="von Mises")
    assert overlaps(drawn) == []
    stress = deck.point_fields()["von Mises [Pa]"] / 1e6
    peak = deck.peak("von Mises").value / 1e6
    corners = deck.field_triangles.ravel()
    areas = np.bincount(
        corners, np.repeat(area(deck.field_points[deck.field_triangles]), 3)
    )
    colours = bands("von Mises", stress, peak, areas).on_triangles(deck.field_triangles)
    found = surface_of(drawn).get_facecolors()
    found = found[found[:, 3] > 0.0]
    np.testing.assert_allclose(np.sort(found, axis=0), np.sort(colours, axis=0))
    places = deck.field_points
    on_edge = np.abs(np.hypot(*(places - (0.3, 0.25)).T) - 0.12) < 1e-6
    _, place = np.unique(places.round(9), axis=0, return_inverse=True)
    jumps = [np.ptp(stress[place == k]) for k in np.unique(place[on_edge])]
    assert len(jumps) > 20
    assert max(jumps) > 0.3 * stress[on_edge].max()


def test_a_hole_has_its_name_in_it_where_there_is_room(deck):
    axes, _ = plan_of(figure(deck))
    (oval,) = (text for text in axes.texts if text.get_text() == "oval")
    assert oval.get_position() == pytest.approx((300.0, 600.0), abs=1.0)


def strip(side):
    """A strip ten times as wide as deep, with a long name for a side."""
    plate = Plate(
        outline=Outline.polygon(
            [(0, 0), (3, 0), (3, 0.3), (0, 0.3)],
            sides=[side, "east end", "long north", "west end"],
        ),
        thickness=0.01,
        material=replace(ALUMINIUM, name="a material with a rather long name " * 3),
        supports={"east end": SIMPLY_SUPPORTED, "west end": CLAMPED},
    )
    case = Case(name="wind from all directions " * 4, loads=[Pressure(-1e3)])
    return solve(plate, [case], triangles=600)


def test_a_strip_has_its_plan_below_and_full_width():
    drawn = figure(strip("side"))
    axes, _ = plan_of(drawn)
    place = axes.get_position()
    assert place.width > 0.8
    assert place.y1 < 0.5
    captions = {t.get_text()[:4]: t.get_position()[1] for t in drawn.texts}
    assert captions["Defl"] > captions["Plan"]


@pytest.mark.parametrize("side", ["side", "the side that bears on the old kerb" * 5])
def test_nothing_overlaps_or_leaves_the_picture_however_long_the_names(side):
    drawn = figure(strip(side), title="a very long title of a very long strip " * 8)
    assert overlaps(drawn) == []
    renderer = drawn.canvas.get_renderer()
    for text in texts(drawn):
        box = text.get_window_extent(renderer)
        assert box.x0 >= 0.0, text
        assert box.x1 <= WIDTH, text
    (title,) = [t for t in words(drawn) if t.startswith("a very long title")]
    assert title.endswith("\u2026")


def test_nothing_overlaps_on_a_plate_with_a_notch_and_a_hole(cover):
    for case in cover.cases:
        assert overlaps(figure(cover, case=case)) == []


def test_names_without_room_are_counted():
    angle = np.linspace(0.0, 2.0 * np.pi, 80, endpoint=False)
    radius = 1.0 + 0.05 * np.cos(9.0 * angle)
    points = np.c_[radius * np.cos(angle), radius * np.sin(angle)]
    outline = Outline.polygon(points, sides=[f"side number {i}" for i in range(80)])
    drawn = Figure(figsize=(6.0, 6.0), dpi=100)
    axes = drawn.add_axes((0.0, 0.0, 1.0, 1.0))
    axes.set_xlim(-1.2, 1.2)
    axes.set_ylim(-1.2, 1.2)
    lines, per_pixel = plan.pieces(outline, 1.0), 2.4 / 600.0
    canvas = FigureCanvasAgg(drawn)
    names = Names(axes, canvas.get_renderer())
    plan.block_sides(names, lines, per_pixel)
    missing = plan.write_side_names(names, lines, per_pixel)
    assert 0 < missing < 80
    assert missing + len(axes.texts) == 80


def test_a_name_that_does_not_fit_is_shortened_to_its_side():
    drawn = Figure(figsize=(4.0, 4.0), dpi=100)
    axes = drawn.add_axes((0.0, 0.0, 1.0, 1.0))
    axes.set_xlim(0.0, 400.0)
    axes.set_ylim(0.0, 400.0)
    renderer = FigureCanvasAgg(drawn).get_renderer()
    names, hand = Names(axes, renderer), Hand(size=10.0)
    long = "a name that is too long for its side " * 3
    spot = Spot(at=(200.0, 200.0), room=150.0)
    assert names.place(long, [spot], hand)
    (text,) = axes.texts
    assert text.get_text().endswith("\u2026")
    assert 100.0 < text.get_window_extent(renderer).width <= 151.0
    assert not names.place("no room", [spot], hand)  # taken
    assert not names.place("off", [Spot(at=(399.0, 10.0))], hand)  # leaves the axes
    assert not names.place(long, [Spot(at=(200.0, 100.0), room=20.0)], hand)


@pytest.mark.parametrize("degrees", range(-180, 181, 15))
def test_texts_stand_upright(degrees):
    angle = np.degrees(upright(np.radians(degrees)))
    half_turns = (angle - degrees) / 180.0
    assert half_turns == pytest.approx(round(half_turns), abs=1e-9)
    assert -75.0 - 1e-9 <= angle < 105.0


def test_dollars_and_control_signs_are_written_as_they_are(lid):
    odd = Plate(
        outline=Outline.polygon(
            [(0, 0), (1, 0), (1, 1), (0, 1)], sides=["$a_1$", "b\nc", "d", "e"]
        ),
        thickness=0.01,
        material=lid.plate.material,
        supports={"d": SIMPLY_SUPPORTED, "b\nc": CLAMPED},
    )
    drawn = figure(solve(odd, [Pressure(1.0)], triangles=200), title="$x^2$ \x07")
    assert "$a_1$" in words(drawn)
    assert "b c" in words(drawn)
    title = next(t for t in texts(drawn) if t.get_text().startswith("$x^2$"))
    assert title.get_text() == "$x^2$  "
    # Mathematics that cannot be parsed would take the picture down.
    assert not any(text.get_parse_math() for text in texts(drawn))


def test_a_plate_without_load_has_no_levels_and_no_colour_bar(lid):
    still = solve(lid.plate, [Case(name="still", loads=[Pressure(0.0)])], triangles=200)
    drawn = figure(still)
    assert plan_of(drawn)[1] is None
    assert "Plan, deflection" in words(drawn)
    assert "Deflected shape, deflection x 1" in words(drawn)


def test_the_axes_of_a_round_plate_end_at_its_rim(lid):
    """Though the chords of the mesh do not quite reach it."""
    # Half circles that begin off the axes, so that the north has no vertex.
    turn = np.radians(17.3)
    start = np.array([np.cos(turn), np.sin(turn)])
    outline = Outline.polygon(
        [1.0 + start, 1.0 - start], sides=["rim", "rim"], bulges=[1.0, 1.0]
    )
    held = {"rim": SIMPLY_SUPPORTED}
    plate = replace(lid.plate, outline=outline, supports=held)
    short = solve(plate, [Pressure(-1e3)], triangles=200)
    assert np.ptp(short.mesh.points[:, 1]) < 1.9999
    axes, _ = plan_of(figure(short))
    for own in (axes.xaxis, axes.yaxis):
        ticks = [label.get_text() for label in own.get_ticklabels()]
        assert (ticks[0], ticks[-1]) == ("0", "2000")


def test_other_units_are_shown(lid):
    inch = Unit("in", 0.0254)
    units = DisplayUnits(length=inch, deflection=inch, stress=Unit("psi", 6894.757))
    drawn = figure(lid, units=units)
    axes, bar = plan_of(drawn)
    assert axes.get_xlabel() == "x [in]"
    assert bar.get_ylabel() == "deflection [in], positive up"
    assert max(axes.get_xticks()) == 30.0  # of 31.5 in
    peak = lid.peak("deflection").value / 0.0254
    assert f"{peak:#.4g} in" in words(drawn)


def test_wrong_quantities_and_cases_are_refused(cover):
    with pytest.raises(InputError) as caught:
        figure(cover, quantity="torsion")
    assert str(caught.value) == (
        "there is no picture of 'torsion'; draw deflection or von Mises."
    )
    with pytest.raises(InputError, match="there is no load case 'snow'"):
        figure(cover, case="snow")


def test_a_missing_folder_is_an_input_error(lid, tmp_path):
    with pytest.raises(InputError, match="there is no folder"):
        write_picture(lid, tmp_path / "none" / "a.png")


def test_a_picture_does_not_touch_the_state_of_pyplot(tmp_path):
    code = (
        "import sys\n"
        "from pathlib import Path\n"
        "from kplate.adapt import solve\n"
        "from kplate.loads import Pressure\n"
        "from kplate.materials import STEEL\n"
        "from kplate.outline import Outline\n"
        "from kplate.output.picture import write_picture\n"
        "from kplate.plate import Plate\n"
        "from kplate.supports import CLAMPED\n"
        "rim = Outline.circle((0.0, 0.0), radius=1.0)\n"
        "plate = Plate(\n"
        "    outline=rim, thickness=0.01, material=STEEL, supports={'rim': CLAMPED}\n"
        ")\n"
        "print('matplotlib' in sys.modules)\n"
        "solution = solve(plate, [Pressure(1.0)], triangles=100)\n"
        "write_picture(solution, Path(sys.argv[1]))\n"
        "print('matplotlib.pyplot' in sys.modules)\n"
    )
    path = str(tmp_path / "a.png")
    run = subprocess.run(
        [sys.executable, "-c", code, path], capture_output=True, text=True, check=True
    )
    assert run.stdout == "False\nFalse\n"
