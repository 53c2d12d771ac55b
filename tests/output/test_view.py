"""The 3-D scene: what is in it, what its keys and slider do, and what is refused."""

import json
import os
import re
import subprocess
import sys

import numpy as np
import pytest

from kplate.errors import InputError
from kplate.output import screen
from kplate.output.record import solution_record, write_json
from kplate.output.result import read_result
from kplate.output.view import Stage, colour_limits, first_scale, scene, view
from kplate.output.vtk import write_vtk


@pytest.fixture(scope="module")
def files(cover, tmp_path_factory):
    """A .vtu file with its record beside it."""
    path = tmp_path_factory.mktemp("results") / "cover.vtu"
    write_vtk(cover, path)
    record = solution_record(cover, "0.1.0")
    record["panel"] = {"name": "landing cover"}
    write_json(record, path.with_suffix(".json"))
    return path


@pytest.fixture
def no_display(monkeypatch):
    """Off screen, whatever the machine has."""
    monkeypatch.delenv("DISPLAY", raising=False)
    if "VTK_DEFAULT_OPENGL_WINDOW" not in os.environ:
        # Put back what `check_drawing` chooses, and let it choose again afterwards.
        monkeypatch.setenv("VTK_DEFAULT_OPENGL_WINDOW", "")
        monkeypatch.delenv("VTK_DEFAULT_OPENGL_WINDOW")


@pytest.fixture(scope="module")
def stage(files):
    """A stage off screen, closed afterwards."""
    with pytest.MonkeyPatch.context() as patch:
        patch.delenv("DISPLAY", raising=False)
        screen.check_drawing(off_screen=True)
        import pyvista

        plotter = pyvista.Plotter(off_screen=True, window_size=[700, 450])
        found = Stage(plotter, read_result(files))
        found.build()
        plotter.screenshot(None, return_img=True)  # starts it, as showing a window does
        yield found
        plotter.close()


@pytest.fixture(autouse=True)
def _as_at_first(request):
    """Each test finds the stage as it was built."""
    if "stage" in request.fixturenames:
        found = request.getfixturevalue("stage")
        found.case, found.shade = found.cases[0], found.shades[0]
        found.scale = first_scale(found.result)
        found.refresh()


def press(plotter, key):
    """Press a key in the window."""
    interactor = plotter.iren.interactor
    interactor.SetKeyEventInformation(0, 0, "\0", 0, key)
    interactor.KeyPressEvent()


def written(plotter):
    """What the texts in the corners say."""
    found = {}
    for name, actor in plotter.actors.items():
        if hasattr(actor, "GetText"):
            found[name] = actor.GetText(2)  # the upper left corner
    return found


@pytest.mark.slow
def test_the_scene_of_a_file_has_plate_rim_names_marks_bar_and_slider(
    files, no_display
):
    plotter = scene(files, off_screen=True)
    try:
        assert {"plate", "rim", "undeflected", "keys", "heading"} <= set(plotter.actors)
        assert {"side names-labels", "left out", "left out words"} <= set(
            plotter.actors
        )
        assert list(plotter.scalar_bars.keys()) == ["deflection [mm]"]
        picture = plotter.screenshot(None, return_img=True)
        assert picture.std() > 10.0  # something is drawn
    finally:
        plotter.close()


def test_the_heading_names_panel_case_and_field(stage):
    assert written(stage.plotter)["heading"] == (
        f"landing cover\ncase crowd\ndeflection [mm], field 1 of {len(stage.shades)}"
    )


def test_the_plate_is_bent_by_the_scale_times_the_deflection(stage, cover):
    w = cover.point_fields(case="crowd")["deflection [m]"]
    for scale in (0.0, 1.0, 123.0):
        stage.set_scale(scale)
        for surface in (stage.plate, stage.rim):
            np.testing.assert_array_equal(surface.points[:, :2], cover.field_points)
            np.testing.assert_allclose(
                surface.points[:, 2], scale * w, rtol=1e-6, atol=1e-15
            )
    assert not stage.result.fields.points[:, 2].any()  # the nodes themselves stay


def test_the_colours_are_the_field_in_the_unit_of_the_bar(stage, cover):
    shown = stage.plate.point_data["deflection [mm]"]
    w = cover.point_fields(case="crowd")["deflection [m]"]
    np.testing.assert_allclose(shown, 1e3 * w, rtol=1e-6, atol=1e-12)
    low, high = stage.plotter.actors["plate"].mapper.scalar_range
    assert -low == high == pytest.approx(1e3 * np.abs(w).max(), rel=0.01)


def test_the_first_scale_shows_the_largest_deflection_at_a_seventh_of_the_size(
    stage, cover
):
    largest = max(
        np.abs(cover.point_fields(case=case)["deflection [m]"]).max()
        for case in cover.cases
    )
    drawn = first_scale(stage.result) * largest
    assert drawn == pytest.approx(0.14 * np.sqrt(1.6 * 1.2), rel=0.34)
    assert re.fullmatch(r"[1-9]0*", f"{first_scale(stage.result):.0f}")


def test_arrows_step_through_the_fields_and_back(stage):
    assert stage.shades[0].title == "deflection [mm]"
    press(stage.plotter, "Right")
    assert list(stage.plotter.scalar_bars.keys()) == [stage.shades[1].title]
    assert stage.plate.active_scalars_name == stage.shades[1].title
    press(stage.plotter, "Left")
    press(stage.plotter, "Left")
    assert stage.shade is stage.shades[-1]
    assert list(stage.plotter.scalar_bars.keys()) == ["von Mises [MPa]"]


def test_n_shows_the_next_case_with_its_own_deflection_and_marks(stage, cover):
    assert stage.marks.n_points == 1
    press(stage.plotter, "n")
    assert "case jack" in written(stage.plotter)["heading"]
    w = cover.point_fields(case="jack")["deflection [m]"]
    np.testing.assert_allclose(
        stage.plate.points[:, 2], stage.scale * w, rtol=1e-6, atol=1e-15
    )
    assert stage.marks.n_points == 2
    under = stage.marks.points[np.argmax(stage.marks.points[:, 0])]
    np.testing.assert_allclose(under[:2], (1.35, 0.4), atol=1e-9)  # on the plate
    assert under[2] == pytest.approx(
        stage.scale * cover.deflection([(1.35, 0.4)], case="jack")[0], rel=0.01
    )
    press(stage.plotter, "n")
    assert stage.case == "crowd"
    assert stage.marks.n_points == 1


def test_places_without_a_finite_moment_do_not_set_the_colours(stage, cover):
    stage.shade = next(s for s in stage.shades if s.name == "von Mises")
    stage.refresh()
    stress = cover.point_fields(case="crowd")["von Mises [Pa]"] / 1e6
    far = np.hypot(*(cover.field_points - (1.0, 0.8)).T) >= cover.plate.thickness
    _, high = stage.plotter.actors["plate"].mapper.scalar_range
    assert high == pytest.approx(stress[far].max())
    assert high < stress.max()


def test_every_field_of_the_file_can_be_shown_in_a_unit(stage):
    titles = [shade.title for shade in stage.shades]
    assert len(set(titles)) == len(titles)
    assert {
        "slopes x [rad]",
        "moments xy [N]",
        "principal moments larger [N]",
        "shears y [N/mm]",
        "stress top xx [MPa]",
        "largest principal bottom [MPa]",
    } < set(titles)
    for shade in stage.shades:
        assert stage.result.shown("jack", shade).shape == (len(stage.plate.points),)


def test_side_names_stand_on_their_sides(stage):
    places = stage.result.side_places()
    assert list(places) == list(stage.result.side_names)
    assert places["south"][1] == 0.0
    assert places["south"][0] == pytest.approx(0.8, abs=0.1)
    assert places["notch-east"][0] == 1.0
    assert np.hypot(*(places["shaft"][:2] - (0.45, 0.4))) == pytest.approx(
        0.12, rel=0.02
    )


def test_the_slider_bends_the_picture(stage):
    before = stage.plotter.screenshot(None, return_img=True)
    stage.set_scale(2.0 * stage.scale)
    stage.plotter.render()  # as the slider does
    after = stage.plotter.screenshot(None, return_img=True)
    assert (before != after).mean() > 0.01


def test_a_file_without_its_record_is_shown_by_its_fields_alone(cover, tmp_path):
    found = read_result(write_vtk(cover, tmp_path / "a.vtu"))
    assert list(found.cases) == ["crowd", "jack"]
    assert (found.title, found.side_names, found.excluded) == ("", (), ())
    assert found.judged("jack").all()
    assert found.side_places() == {}


def test_one_case_without_a_record_has_no_name(lid, tmp_path):
    found = read_result(write_vtk(lid, tmp_path / "a.vtu"))
    assert dict(found.cases) == {"": ""}
    np.testing.assert_array_equal(
        found.values("", "deflection [m]"),
        np.float32(lid.point_fields()["deflection [m]"]),
    )


def test_a_record_names_the_one_case(lid, tmp_path):
    path = write_vtk(lid, tmp_path / "a.vtu")
    write_json(solution_record(lid, "0"), path.with_suffix(".json"))
    assert dict(read_result(path).cases) == {"wind": ""}


@pytest.mark.parametrize(
    "text",
    [
        "not json",
        "[]",
        "{}",
        "[" * 100_000,
        '{"mesh": {"triangles": 1, "points": 1}}',
        "the record of another panel",
        "the record of other cases",
    ],
)
def test_a_record_of_something_else_is_left_alone(cover, lid, tmp_path, text):
    path = write_vtk(lid, tmp_path / "a.vtu")
    if text.endswith("panel"):
        text = json.dumps(solution_record(cover, "0"))
    if text.endswith("cases"):
        record = solution_record(lid, "0")
        del record["field_names"]["moments [N]"]
        text = json.dumps(record)
    path.with_suffix(".json").write_text(text)
    found = read_result(path)
    assert found.title == ""
    assert found.side_names == ()


@pytest.mark.parametrize(
    ("values", "expected"),
    [
        ([0.0, 2.0], ((0.0, 2.0), "YlGnBu")),
        ([-2.0, 0.01], ((-2.0, 0.0), "YlGnBu_r")),
        ([-2.0, 1.0], ((-2.0, 2.0), "RdBu_r")),
        ([3.0, 4.0], ((0.0, 4.0), "YlGnBu")),
        ([0.0, 0.0], ((0.0, 1.0), "YlGnBu")),
    ],
)
def test_colours_start_from_zero(values, expected):
    assert colour_limits(np.array(values)) == expected


def refusal(path):
    with pytest.raises(InputError) as caught:
        view(path)
    return str(caught.value)


def test_a_missing_file_is_named(tmp_path):
    path = tmp_path / "none.vtu"
    assert refusal(path) == (
        f"there is no file '{path}'; name a .vtu file that kplate check wrote."
    )


def test_a_folder_is_refused(tmp_path):
    assert refusal(tmp_path) == f"'{tmp_path}' is a folder; name a .vtu file."


@pytest.mark.parametrize(
    "content", [b"", b"\x89PNG\r\n\x1a\n" + bytes(99), b"[panel]\nname = 'lid'\n"]
)
def test_another_kind_of_file_is_refused(tmp_path, content):
    path = tmp_path / "a.vtu"
    path.write_bytes(content)
    assert refusal(path) == (
        f"'{path}' is not a VTU file; name a .vtu file that kplate check wrote."
    )


def test_a_truncated_file_is_refused(files, tmp_path):
    path = tmp_path / "a.vtu"
    content = files.read_bytes()
    for length in (2000, len(content) // 2, len(content) - 5):
        path.write_bytes(content[:length])
        assert refusal(path) == (
            f"'{path}' ends too early: it was not written or copied to its end; run "
            "kplate check again."
        )


def test_a_damaged_file_is_refused(files, tmp_path):
    path = tmp_path / "a.vtu"
    content = bytearray(files.read_bytes())
    content[2000:2040] = b"<" * 40
    path.write_bytes(content)
    assert refusal(path) == (
        f"'{path}' is damaged, or not of triangles and lines; run kplate check again."
    )


def test_a_file_without_deflection_is_refused(files, tmp_path):
    path = tmp_path / "a.vtu"
    text = files.read_text().replace("deflection [m]", "height [m]")
    path.write_text(text)
    message = refusal(path)
    start = f"'{path}' holds no field 'deflection [m]' (its point fields: crowd: height"
    assert message.startswith(start)
    assert message.endswith("); name a .vtu file that kplate check wrote.")


@pytest.mark.skipif(sys.platform != "linux", reason="DISPLAY is of X11")
def test_without_a_display_no_window_is_promised(files, monkeypatch):
    monkeypatch.delenv("DISPLAY", raising=False)
    start = "no window can be opened: there is no display (DISPLAY is not set); "
    assert refusal(files) == (
        start + "kplate check writes a picture (.png), which needs none."
    )
    picture = files.with_suffix(".png")
    picture.write_bytes(b"")
    assert refusal(files) == start + f"look at the picture '{picture}' instead."
    picture.unlink()


@pytest.mark.skipif(sys.platform != "linux", reason="DISPLAY is of X11")
def test_a_dead_display_is_named(files, monkeypatch):
    monkeypatch.setenv("DISPLAY", ":987")
    assert refusal(files) == (
        "no window can be opened: the display ':987' does not answer; kplate check "
        "writes a picture (.png), which needs none."
    )


@pytest.mark.parametrize(
    ("outcome", "why"),
    [
        ((-11, ""), "OpenGL is missing or broken"),
        (
            (
                1,
                "ImportError: libGL.so.1: cannot open shared object file: No such file",
            ),
            "libGL.so.1 is missing",
        ),
    ],
)
def test_missing_libraries_are_named_before_anything_is_drawn(
    files, no_display, monkeypatch, outcome, why
):
    monkeypatch.setattr(screen, "_run", lambda *_: outcome)
    screen._find_way.cache_clear()
    with pytest.raises(InputError) as caught:
        scene(files, off_screen=True)
    assert str(caught.value) == (
        f"nothing can be drawn in 3-D: {why}; install the system packages libgl1 "
        "libegl1 libxrender1 (their names on Debian and Ubuntu), or look at the "
        "picture that kplate check wrote."
    )


@pytest.mark.skipif(sys.platform != "linux", reason="only there without a display")
def test_the_second_way_to_draw_is_taken_where_the_first_does_not_work(
    no_display, monkeypatch
):
    tried = []

    def run(_, environment):
        tried.append(environment["VTK_DEFAULT_OPENGL_WINDOW"])
        return (0, "") if tried[-1] == "vtkOSOpenGLRenderWindow" else (-11, "")

    monkeypatch.setattr(screen, "_run", run)
    screen._find_way.cache_clear()
    screen.check_drawing(off_screen=True)
    assert tried == ["vtkEGLRenderWindow", "vtkOSOpenGLRenderWindow"]
    assert os.environ["VTK_DEFAULT_OPENGL_WINDOW"] == "vtkOSOpenGLRenderWindow"
    screen._find_way.cache_clear()


def test_a_process_that_hangs_counts_as_one_that_fails(monkeypatch):
    def hang(*_, **__):
        raise subprocess.TimeoutExpired("python", 1.0)

    monkeypatch.setattr(subprocess, "run", hang)
    assert screen._run("", {}) == (-1, "")
