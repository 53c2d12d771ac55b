"""Results as files and solutions tell them; what cannot be shown is refused."""

import json
import sys

import numpy as np
import pytest

from kplate.errors import InputError
from kplate.output.record import solution_record, write_json
from kplate.output.result import read_result, result_of
from kplate.output.view import view
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


def test_a_solution_tells_the_same_as_its_files(deck, tmp_path):
    path = write_vtk(deck, tmp_path / "a.vtu")
    write_json(solution_record(deck, "0"), path.with_suffix(".json"))
    found, own = read_result(path), result_of(deck)
    assert dict(found.cases) == dict(own.cases) == {"winch": ""}
    for name, values in own.fields.point_data.items():
        np.testing.assert_array_equal(found.fields.point_data[name], values)
    np.testing.assert_array_equal(found.fields.triangles, own.fields.triangles)
    for side in ("side", "zone", "triangle", "thickness [m]"):
        for a, b in zip(
            found.fields.cell_data[side], own.fields.cell_data[side], strict=True
        ):
            np.testing.assert_array_equal(a, b)
    for a, b in ((found.told, own.told),):
        assert (a.side_names, a.zone_names) == (b.side_names, b.zone_names)
        assert (a.left_out, a.loads, a.forces) == (b.left_out, b.loads, b.forces)
        assert (a.supports, a.marks) == (b.supports, b.marks)
        np.testing.assert_array_equal(a.seams["track"], b.seams["track"])


def test_supports_seams_marks_and_loads_are_told(deck):
    told = result_of(deck).told
    assert told.supports["bow"].name == "clamped"
    assert told.supports["west"].name == "guided"
    assert told.supports["north"].name == "free"
    assert told.zone_names == ("pad",)
    assert told.marks["bolt"] == (0.9, 0.4)
    np.testing.assert_allclose(told.seams["track"][[0, -1]], [(0.8, 0.4), (1.0, 0.6)])
    assert len(told.seams["track"]) > 5  # an arc
    kinds = [load["kind"] for load in told.loads["winch"]]
    assert kinds == ["pressure", "line force", "edge moment", "point moment"]


def test_fences_are_the_stations_of_the_reactions(cover):
    told = result_of(cover).told
    for case in cover.cases:
        reactions = cover.reactions(case=case)
        for fence, side in zip(told.fences[case], reactions.sides, strict=True):
            assert fence.side == side.side
            places = np.concatenate([p for p, _ in fence.stretches])
            values = np.concatenate([v for _, v in fence.stretches])
            np.testing.assert_array_equal(places, side.stations)
            np.testing.assert_array_equal(values, side.line_reaction)
        corners = {c.corner.place: c.force.value for c in reactions.corners}
        for force in told.forces[case]:
            value = corners[force.place]
            assert force.force == (None if np.isnan(value) else value)


def test_a_fence_is_parted_where_its_side_is_interrupted(deck):
    """The seam `sill` is one stretch; no pale is joined to one far off."""
    told = result_of(deck).told
    for fence in told.fences["winch"]:
        for places, _ in fence.stretches:
            if len(places) > 1:
                step = np.hypot(*np.diff(places, axis=0).T)
                assert step.max() < 0.2


def test_places_left_out_do_not_count_as_judged(cover):
    found = result_of(cover)
    far = np.hypot(*(cover.field_points - (1.0, 0.8)).T) >= cover.plate.thickness
    np.testing.assert_array_equal(found.judged("crowd"), far)
    assert len(found.left_out("crowd")) == 1
    assert len(found.left_out("jack")) == 2


def test_every_field_of_the_file_can_be_shown_in_a_unit(cover):
    found = result_of(cover)
    titles = [shade.title("top") for shade in found.shades]
    assert len(set(titles)) == len(titles)
    assert titles[0] == "deflection [mm]"
    assert {
        "slopes x [rad]",
        "moments xy [N]",
        "principal moments larger [N]",
        "shears y [N/mm]",
        "stress xx, top [MPa]",
        "largest principal, top [MPa]",
        "von Mises [MPa]",
    } < set(titles)
    arrays = cover.point_fields(case="jack")
    for shade in found.shades:
        for face in shade.faces or ("",):
            values = arrays[shade.array(face)]
            if shade.component is not None:
                values = values[:, shade.component]
            shown = found.shown("jack", shade, face)
            np.testing.assert_allclose(shown * shade.unit.size, values, rtol=1e-6)


def test_a_quantity_has_the_faces_its_fields_have(cover):
    faces = {shade.name: shade.faces for shade in result_of(cover).shades}
    assert faces["stress yy"] == ("top", "bottom")
    assert faces["deflection"] == ()


def test_a_file_without_its_record_is_shown_by_its_fields_alone(cover, tmp_path):
    found = read_result(write_vtk(cover, tmp_path / "a.vtu"))
    assert list(found.cases) == ["crowd", "jack"]
    assert (found.told.title, found.told.side_names) == ("", ())
    assert (found.told.left_out, found.told.fences) == ((), {})
    assert found.judged("jack").all()


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
    assert found.told.title == ""
    assert found.told.side_names == ()


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
