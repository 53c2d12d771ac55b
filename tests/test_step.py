"""Planar faces from STEP files, wherever they lie in space."""

import math

import gmsh as gmsh_library
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from kplate.errors import InputError
from kplate.meshing import gmsh_model
from kplate.outline import Outline
from kplate.shapes import Circle
from kplate.step import read_step

ROUND = (4.0 - math.pi) * 0.06**2  # what four corners of 60 mm take off


def write(path, build, *, turn=None):
    """Write what is built, in mm; turned by (axis, angle) about a point off it."""
    with gmsh_model(1.0) as gmsh:
        made = build(gmsh.model.occ)
        if turn is not None:
            axis, angle = turn
            gmsh.model.occ.rotate(made, 30, -40, 50, *axis, angle)
        gmsh.model.occ.synchronize()
        gmsh.write(str(path))
    return path


def panel(occ):
    """1200 x 900 mm with round corners and two holes, at a height of 7 mm."""
    plate = occ.addRectangle(100, 50, 7, 1200, 900, roundedRadius=60)
    holes = [(2, occ.addDisk(400, 400, 7, 50, 50)), (2, window(occ, 900, 600))]
    return occ.cut([(2, plate)], holes)[0]


def window(occ, x, y):
    """200 x 80 mm with corners of 30 mm."""
    return occ.addRectangle(x - 100, y - 40, 7, 200, 80, roundedRadius=30)


def blank(occ):
    return [(2, occ.addRectangle(0, 0, 0, 800, 600))]


def refusal(read):
    """The message with which something is refused."""
    with pytest.raises(InputError) as caught:
        read()
    return str(caught.value)


def test_a_level_face_keeps_its_coordinates(tmp_path):
    drawing = read_step(write(tmp_path / "a.step", panel))
    outline = drawing.outline
    assert outline.box == pytest.approx((0.1, 0.05, 1.3, 0.95))
    bore, window = outline.holes
    assert isinstance(bore, Circle)
    assert (*bore.centre, bore.radius) == pytest.approx((0.4, 0.4, 0.05), rel=1e-9)
    assert window.area == pytest.approx(0.2 * 0.08 - ROUND / 4.0, rel=1e-9)
    assert outline.boundaries[0].area == pytest.approx(1.08 - ROUND, rel=1e-9)
    bent = outline.rim.circles[outline.rim.bulges != 0.0, 2]
    np.testing.assert_allclose(bent, 0.06, rtol=1e-9)
    assert outline.side_names == (
        *(f"side-{k}" for k in range(1, 9)),
        "hole-1",
        "hole-2",
    )
    assert drawing.ignored == ()


@given(
    st.tuples(*[st.floats(-1.0, 1.0)] * 3).filter(lambda a: math.hypot(*a) > 0.1),
    st.floats(0.1, 3.0),
)
@settings(max_examples=15)
def test_a_face_turned_in_space_is_the_same_panel(tmp_path_factory, axis, angle):
    path = tmp_path_factory.mktemp("step") / "a.step"
    drawing = read_step(write(path, panel, turn=(axis, angle)))
    outline = drawing.outline
    level = read_step(write(path, panel)).outline
    if "turned into the xy plane" not in drawing.notes[0]:
        assert abs(axis[0]) + abs(axis[1]) < 1e-6  # about the normal
        return
    assert outline.box == pytest.approx((0.0, 0.0, 1.2, 0.9), abs=1e-9)
    assert outline.area == pytest.approx(level.area, rel=1e-9)
    assert sorted(hole.area for hole in outline.holes) == pytest.approx(
        sorted(hole.area for hole in level.holes), rel=1e-9
    )
    # The panel may come out half a turn round or mirrored, seen from its other face:
    # the bore is at (300, 350) mm from one of its corners.
    bore = next(hole for hole in outline.holes if isinstance(hole, Circle))
    x, y = bore.centre
    assert min(x, 1.2 - x) == pytest.approx(0.3, abs=1e-9)
    assert min(y, 0.9 - y) == pytest.approx(0.35, abs=1e-9)


@pytest.mark.parametrize("angle", [0.3, 1.2, 2.0, 2.8])
@pytest.mark.parametrize("axis", [(1, 0, 0), (1, 1, 0), (0.2, 1, 0.7), (-1, 0.4, 2)])
def test_the_longest_straight_edge_lies_below(tmp_path, axis, angle):
    def trapezoid(occ):
        corners = [(0, 0), (1000, 0), (800, 500), (100, 500)]
        points = [occ.addPoint(x, y, 0) for x, y in corners]
        ends = zip(points, [*points[1:], points[0]], strict=True)
        loop = occ.addCurveLoop([occ.addLine(a, b) for a, b in ends])
        return [(2, occ.addPlaneSurface([loop]))]

    path = write(tmp_path / "a.step", trapezoid, turn=(axis, angle))
    rim = read_step(path).outline.rim
    # The z component of the turned normal, by Rodrigues' formula: seen from above, a
    # face whose normal points down is mirrored.
    z = axis[2] ** 2 / sum(c * c for c in axis)
    up = math.cos(angle) + (1.0 - math.cos(angle)) * z > 0.0
    top = [(0.8, 0.5), (0.1, 0.5)] if up else [(0.9, 0.5), (0.2, 0.5)]
    np.testing.assert_allclose(rim.points, [(0, 0), (1, 0), *top], atol=1e-9)


def test_an_upright_disc_has_its_level_diameter_along_x(tmp_path):
    def disc(occ):
        return [(2, occ.addDisk(0, 0, 0, 250, 250))]

    turned = write(tmp_path / "a.step", disc, turn=((1, 0, 0), math.pi / 2))
    rim = read_step(turned).outline.rim
    assert isinstance(rim, Circle)
    assert (*rim.centre, rim.radius) == pytest.approx((0.25, 0.25, 0.25), rel=1e-9)


def test_other_curves_become_arcs(tmp_path):
    def shape(occ):
        plate = occ.addRectangle(0, 0, 0, 1000, 800)
        oval = occ.addDisk(500, 400, 0, 300, 100)
        return occ.cut([(2, plate)], [(2, oval)])[0]

    for turn in (None, ((1.0, 2.0, 0.5), 0.8)):
        outline = read_step(write(tmp_path / "a.step", shape, turn=turn)).outline
        assert outline.holes[0].area == pytest.approx(math.pi * 0.3 * 0.1, rel=2e-4)
        assert set(outline.holes[0].sides) == {"hole-1"}

    def wave(occ):
        places = [(0, 0), (300, 80), (600, -40), (1000, 0)]
        points = [occ.addPoint(x, y, 0) for x, y in places]
        far = [occ.addPoint(1000, 500, 0), occ.addPoint(0, 500, 0)]
        lines = [
            occ.addSpline(points),
            occ.addLine(points[-1], far[0]),
            occ.addLine(far[0], far[1]),
            occ.addLine(far[1], points[0]),
        ]
        return [(2, occ.addPlaneSurface([occ.addCurveLoop(lines)]))]

    def mass(path):
        with gmsh_model(1.0) as gmsh:
            gmsh.model.occ.importShapes(str(path))
            gmsh.model.occ.synchronize()
            return gmsh.model.occ.getMass(2, 1)

    path = write(tmp_path / "b.step", wave)
    drawing = read_step(path)
    assert drawing.outline.area == pytest.approx(1e-6 * mass(path), rel=1e-4)
    assert drawing.outline.side_names == ("side-1", "side-2", "side-3", "side-4")


def test_the_larger_face_of_a_solid_is_taken_and_the_others_listed(tmp_path):
    def solid(occ):
        return [(3, occ.addBox(0, 0, 0, 800, 600, 10))]

    drawing = read_step(write(tmp_path / "a.step", solid))
    assert drawing.outline.area == pytest.approx(0.48)
    assert drawing.notes[0] == "face 5 of 6 taken, the largest planar one"
    assert drawing.ignored == (
        "planar face 1 of area 6000 mm2: another face",
        "planar face 2 of area 6000 mm2: another face",
        "planar face 3 of area 8000 mm2: another face",
        "planar face 4 of area 8000 mm2: another face",
        "planar face 6 of area 480000 mm2: another face",
    )


def test_the_unit_is_the_file_s_own(tmp_path):
    """The same numbers, said to be in another unit."""
    path = write(tmp_path / "a.step", blank)
    text = path.read_text()
    assert "SI_UNIT(.MILLI.,.METRE.)" in text
    path.write_text(
        text.replace("SI_UNIT(.MILLI.,.METRE.)", "SI_UNIT(.CENTI.,.METRE.)")
    )
    assert read_step(path).outline.box == pytest.approx((0.0, 0.0, 8.0, 6.0))
    path.write_text(text.replace("SI_UNIT(.MILLI.,.METRE.)", "SI_UNIT($,.METRE.)"))
    assert read_step(path).outline.box == pytest.approx((0.0, 0.0, 800.0, 600.0))
    assert read_step(path, unit="in").unit == "in"


def test_the_state_of_gmsh_is_put_back(tmp_path):
    path = write(tmp_path / "a.step", blank)
    gmsh_library.initialize(["x", "-v", "0"], False, False, False)
    try:
        gmsh_library.model.add("theirs")
        models = gmsh_library.model.list()
        gmsh_library.option.setString("Geometry.OCCTargetUnit", "M")
        assert read_step(path).outline.area == pytest.approx(0.48)
        assert gmsh_library.option.getString("Geometry.OCCTargetUnit") == "M"
        assert gmsh_library.model.getCurrent() == "theirs"
        assert gmsh_library.model.list() == models
    finally:
        gmsh_library.option.setString("Geometry.OCCTargetUnit", "")
        gmsh_library.finalize()


def test_a_read_face_is_an_outline_like_any_other(tmp_path):
    read = read_step(write(tmp_path / "a.step", blank)).outline
    stated = Outline.polygon([(0, 0), (0.8, 0), (0.8, 0.6), (0, 0.6)])
    np.testing.assert_allclose(read.rim.points, stated.rim.points, atol=1e-15)
    assert read.side_names == stated.side_names


# Refusals


def test_curved_faces_are_refused(tmp_path):
    path = write(tmp_path / "a.step", lambda occ: [(3, occ.addSphere(0, 0, 0, 80))])
    assert refusal(lambda: read_step(path)) == (
        "the file holds 1 face, all curved; kplate takes a flat panel: save its middle "
        "plane, or one of its flat faces, as STEP."
    )


def test_lines_without_a_face_are_refused(tmp_path):
    def line(occ):
        return [(1, occ.addLine(occ.addPoint(0, 0, 0), occ.addPoint(100, 0, 0)))]

    path = write(tmp_path / "a.step", line)
    assert refusal(lambda: read_step(path)) == (
        "the file holds no face; kplate takes a flat panel: save its middle plane, or "
        "one of its flat faces, as STEP."
    )


def test_files_that_are_no_step_are_refused_by_name(tmp_path, capfd):
    def said(name, content=None):
        path = tmp_path / name
        if content is not None:
            path.write_bytes(content)
        return refusal(lambda: read_step(path)).replace(str(tmp_path), "")

    assert said("a.step") == "there is no file '/a.step'; name a .step file."
    assert said("b.step", b"solid") == (
        "'/b.step' is no STEP file; save the face as STEP."
    )
    assert said("c.step", b"ISO-10303-21;\nHEADER;") == (
        "'/c.step' ends too early: it was not written or copied to its end; save the "
        "face again."
    )
    assert capfd.readouterr() == ("", "")
    rubbish = b"ISO-10303-21;\nHEADER;\nrubbish\nEND-ISO-10303-21;"
    assert said("d.step", rubbish) == (
        "'/d.step' is damaged, or no STEP file; save the face again."
    )
    (tmp_path / "e.step").mkdir()
    assert said("e.step") == "'/e.step' is a folder; name a .step file."
