"""The scene off screen: what is in it, its numbers, ranges, colours and texts."""

import re

import numpy as np
import pytest

import kplate as kp
from kplate.errors import InputError
from kplate.output import screen
from kplate.output.result import result_of
from kplate.output.stage import SWITCHES, Stage, first_scale
from kplate.output.strokes import FIXED
from kplate.output.view import write_view
from kplate.recovery import principal_moments


def staged(result):
    """A stage off screen."""
    screen.check_drawing(off_screen=True)
    import pyvista

    plotter = pyvista.Plotter(
        shape=(1, 2), border=False, off_screen=True, window_size=[700, 450]
    )
    found = Stage(plotter, result)
    found.build()
    return found


@pytest.fixture(scope="module")
def _no_display():
    with pytest.MonkeyPatch.context() as patch:
        patch.delenv("DISPLAY", raising=False)
        yield


@pytest.fixture(scope="module")
def stage(cover, _no_display):
    found = staged(result_of(cover))
    yield found
    found.plotter.close()


@pytest.fixture(scope="module")
def deck_stage(deck, _no_display):
    found = staged(result_of(deck))
    yield found
    found.plotter.close()


@pytest.fixture(autouse=True)
def _as_at_first(request):
    """Each test finds its stage as it was built."""
    for name in ("stage", "deck_stage"):
        if name in request.fixturenames:
            found = request.getfixturevalue(name)
            found.case, found.shade = found.cases[0], found.result.shades[0]
            found.face, found.flat = "bottom", False
            found.scale = first_scale(found.result)
            found.on = dict(SWITCHES)
            found.reading = found.cut = found._read_at = None
            found.message = ""
            found.refresh()


def pick(stage, name):
    stage.choose(shade=next(s for s in stage.result.shades if s.name == name))


def written(stage, name):
    """What a text in a corner says."""
    actor = stage.plotter.actors[name]
    return next(text for k in range(8) if (text := actor.GetText(k)))


def labels(stage):
    return [label.text for label in stage.labels]


def test_the_scene_has_plate_rim_supports_loads_marks_names_and_bar(stage):
    assert {
        "plate",
        "back",
        "rim",
        "undeflected",
        "contours below zero",
        "supports",
        "loads",
        "left out",
        "labels-labels",
        "heading",
        "notes",
    } <= set(stage.plotter.actors)
    assert list(stage.plotter.scalar_bars.keys()) == ["deflection\n[mm]"]


def test_the_heading_names_panel_case_loads_quantity_unit_and_scale(stage):
    assert written(stage, "heading") == (
        "case crowd: 5.00 kPa down, self-weight down\n"
        f"deflection [mm]; deflection drawn x {stage.scale:g}"
    )
    stage.choose(case="jack")
    assert "case jack: 2000 N up at a point" in written(stage, "heading")
    stage.set_scale(123.0)
    assert written(stage, "heading").endswith("; deflection drawn x 123")


def test_everything_that_hangs_on_the_plate_moves_with_it(stage, cover):
    w = cover.point_fields(case="crowd")["deflection [m]"]
    for scale in (0.0, 1.0, 123.0):
        stage.set_scale(scale)
        layers = stage.props.layers
        points = layers["plate"].data.points
        np.testing.assert_allclose(points[:, :2], cover.field_points, rtol=1e-6)
        np.testing.assert_allclose(points[:, 2], scale * w, rtol=1e-6, atol=1e-12)
        rim = layers["rim"].data.points[:, 2].reshape(-1, 2)
        np.testing.assert_allclose(rim, scale * w[cover.field_edges], rtol=1e-5)
        dots = layers["left out"].data.points
        assert dots[0, 2] == pytest.approx(0.0, abs=1e-9)  # at a support
        lines = layers["contours below zero"]
        np.testing.assert_allclose(
            lines.data.points[:, 2], scale * lines.hung, rtol=1e-5, atol=1e-9
        )
    supports = stage.props.layers["supports"]
    assert not supports.data.points[:, 2].any()  # these stay
    assert not stage.result.fields.points[:, 2].any()


def test_contours_lie_where_two_colours_meet_and_follow_the_deflection(stage, cover):
    for name, field in (
        ("deflection", lambda p: 1e3 * cover.deflection(p, case="crowd")),
        ("slopes y", lambda p: cover.slopes(p, case="crowd")[:, 1]),
    ):
        pick(stage, name)
        step, inner = stage.colours.step, stage.colours.inner
        for layer in {"contours", "contours below zero"} & set(stage.props.layers):
            lines = stage.props.layers[layer]
            places = lines.data.points[:, :2].astype(float)
            places = places[cover.mesh.covers(places)]
            values = field(places)
            off = np.abs(values[:, None] - inner).min(axis=1)
            assert np.median(off) < 0.05 * step
            sign = -1.0 if layer == "contours below zero" else 1.0
            assert (sign * values > -0.2 * step).all()
    pick(stage, "deflection")
    lines = stage.props.layers["contours below zero"]
    w = cover.deflection(lines.data.points[:, :2].astype(float), case="crowd")
    np.testing.assert_allclose(lines.hung, w, atol=0.01 * np.abs(w).max())


def test_the_colours_are_the_field_in_the_unit_of_the_bar(stage, cover):
    shown = stage.props.layers["plate"].data.point_data["deflection [mm]"]
    w = 1e3 * cover.point_fields(case="crowd")["deflection [m]"]
    np.testing.assert_allclose(shown, w, rtol=1e-6, atol=1e-9)
    mapper = stage.plotter.actors["plate"].mapper
    assert mapper.scalar_range == pytest.approx(stage.colours.limits)
    low, high = stage.colours.limits
    assert low <= w.min() * 0.99
    assert high == 0.0 or high == -low
    table = mapper.lookup_table
    assert table.n_values == len(stage.colours.bands)
    np.testing.assert_allclose(
        np.asarray(table.values)[:, :3], 255 * stage.colours.bands, atol=0.51
    )


def test_the_bar_has_a_figure_at_every_level(stage):
    (bar,) = stage.plotter.scalar_bars.values()
    assert bar.GetNumberOfLabels() == len(stage.colours.levels)


def test_the_face_changes_the_sign_of_a_stress(stage):
    pick(stage, "stress xx")
    bottom = stage.values.copy()
    assert stage.title == "stress xx, bottom [MPa]"
    stage.choose(face="top")
    np.testing.assert_allclose(stage.values, -bottom, rtol=1e-6)
    assert "stress xx, top [MPa]" in written(stage, "heading")


def test_all_cases_may_have_the_same_colours(stage):
    pick(stage, "von Mises")
    own = {}
    for case in stage.cases:
        stage.choose(case=case)
        own[case] = stage.colours.limits
    assert own["crowd"] != own["jack"]
    stage.switch("same colours")
    same = []
    for case in stage.cases:
        stage.choose(case=case)
        same.append(stage.colours.limits)
    assert same[0] == same[1]
    assert same[0][1] == max(high for _, high in own.values())


def test_places_without_a_finite_moment_do_not_set_the_colours(stage, cover):
    pick(stage, "von Mises")
    stress = cover.point_fields(case="crowd")["von Mises [Pa]"] / 1e6
    far = np.hypot(*(cover.field_points - (1.0, 0.8)).T) >= cover.plate.thickness
    low, high = stage.colours.limits
    assert low == 0.0
    assert stress[far].max() <= high * 1.011
    assert high - stage.colours.step < stress[far].max()
    assert stage.colours.above
    assert stress.max() > high
    table = stage.plotter.actors["plate"].mapper.lookup_table
    assert table.above_range_color is not None


def test_places_left_out_are_numbered_and_their_reasons_written(stage):
    assert "(1)" in labels(stage)
    reason = stage.result.told.left_out[0].reason
    said = " ".join(written(stage, "notes").split())
    assert said == f"(1) no finite moment, left out: {reason}"
    stage.choose(case="jack")
    assert stage.props.layers["left out"].data.n_points == 2
    assert {"(1)", "(2)"} <= set(labels(stage))
    stage.switch("left out")
    assert "left out" not in stage.props.layers
    assert "notes" not in stage.plotter.actors


@pytest.mark.parametrize(
    ("switch", "layers"),
    [
        ("contours", ["contours below zero"]),
        ("supports", ["supports"]),
        ("loads", ["loads"]),
        ("mesh edges", ["mesh edges"]),
        ("reactions", ["pushes up", "holds down"]),
        ("principal moments", ["moments above zero", "moments below zero"]),
    ],
)
def test_a_switch_shows_and_hides(stage, switch, layers):
    for _ in range(2):
        for layer in layers:
            assert (layer in stage.props.layers) == stage.on[switch]
            assert (layer in stage.plotter.actors) == stage.on[switch]
        stage.switch(switch)


def test_names_say_how_sides_are_held(stage):
    assert {"south: clamped", "west: simply supported", "east", "shaft"} <= set(
        labels(stage)
    )
    stage.switch("names")
    assert "east" not in labels(stage)


def test_fences_are_as_high_as_the_line_reaction(stage, cover):
    """Pales stand at the stations: up where the support pushes up."""
    stage.switch("reactions")
    up, down = stage.signs.reactions("crowd")
    heights = {}
    for sign in (up.strokes, down.strokes):
        for foot, top in sign.ends:
            if foot[2] == 0.0 and np.allclose(foot[:2], top[:2]):
                heights.setdefault(tuple(np.round(foot[:2], 9)), []).append(top[2])
    ratios = []
    for side in cover.reactions(case="crowd").sides:
        for place, value in zip(side.stations, side.line_reaction, strict=True):
            key = tuple(np.round(place, 9))
            if np.isfinite(value) and key in heights:
                # At a corner two sides have a station each.
                own = [h for h in heights[key] if np.sign(h) == np.sign(value)]
                assert own
                ratios.append(max(own, key=abs) / value)
    assert len(ratios) > 100
    median = np.median(ratios)
    # All at one scale, but for those cut off beside places without a finite one.
    assert (np.abs(np.array(ratios) / median - 1.0) < 1e-6).mean() > 0.95


def test_reactions_have_figures_in_their_units(stage, cover):
    stage.switch("reactions")
    found = labels(stage)
    for side in cover.reactions(case="crowd").sides:
        worst = side.line_reaction[np.nanargmax(np.abs(side.line_reaction))] / 1e3
        own = [t for t in found if t.startswith(f"{side.side} ") and "N/mm" in t]
        assert len(own) == 1
        figure = float(own[0].split(" ")[1])
        assert figure == pytest.approx(worst, rel=0.006)
    for corner in cover.reactions(case="crowd").corners:
        if np.isfinite(corner.force.value):
            assert any(
                re.fullmatch(r"[+-][\d.]+ N", t)
                and float(t[:-2]) == pytest.approx(corner.force.value, rel=1e-3)
                for t in found
            )
    assert "force without a finite value" in found


def test_seen_from_above_fences_lie_beside_their_sides(stage):
    stage.switch("reactions")
    stage.look(flat=True)
    sign = stage.props.layers["pushes up"]
    assert not sign.data.points[:, 2].any()
    assert sign.data.points[:, 1].min() < -0.01  # outside the south side
    look = stage.plotter.camera.direction
    np.testing.assert_allclose(look, (0.0, 0.0, -1.0), atol=1e-9)
    light = stage.plotter.actors["plate"].prop
    assert (light.ambient, light.diffuse) == (1.0, 0.0)  # colours as in the bar


def test_crosses_are_the_principal_moments(stage, cover):
    plus, minus = stage.signs.crosses("crowd")
    for strokes, sign in ((plus, 1.0), (minus, -1.0)):
        at = strokes.anchors[:, 0]
        arm = np.diff(strokes.ends, axis=1)[:, 0, :2]
        moments = stage.result.values("crowd", "moments [N]")[at]
        along = arm / np.hypot(*arm.T)[:, None]
        normal = (
            moments[:, 0] * along[:, 0] ** 2
            + moments[:, 1] * along[:, 1] ** 2
            + 2.0 * moments[:, 2] * along[:, 0] * along[:, 1]
        )
        assert (np.sign(normal) == sign).all()
        values, _ = principal_moments(moments)
        off = np.abs(values - normal[:, None]).min(axis=1)
        assert off.max() < 1e-5 * np.abs(values).max()
        ratio = np.hypot(*arm.T) / np.abs(normal)
        np.testing.assert_allclose(ratio, ratio[0], rtol=1e-4)


def test_loads_stand_where_they_act_and_point_as_they_do(deck_stage):
    sign = deck_stage.signs.loads("winch")
    shafts = sign.strokes.ends[
        np.ptp(sign.strokes.ends[..., :2], axis=1).max(axis=1) < 1e-12
    ]
    assert (shafts[:, 0, 2] > shafts[:, 1, 2]).all()  # all of them down
    tips = shafts[:, 1, :2]
    on_pad = np.hypot(*(tips - (0.3, 0.25)).T) < 0.13
    track = np.hypot(*(tips - (0.9, 0.5)).T) < 0.15
    assert on_pad.any()
    assert track.any()
    assert (on_pad | track).all()
    texts = {label.text for label in sign.labels}
    assert texts == {"1.00 N/mm down", "moment 50.0 N", "couple (0, -20) N m"}
    assert (sign.strokes.anchors != FIXED).all()


def test_held_marks_have_a_foot_and_the_force_its_figure(deck_stage, deck):
    deck_stage.switch("reactions")
    ends = deck_stage.signs.supports().strokes.ends
    feet = ends[ends[:, 1, 2] < 0.0]
    assert len(feet) == 6  # two tripods; the lamp is free
    found = labels(deck_stage)
    for point in deck.reactions().points:
        assert any(
            t.endswith(" N")
            and t[0] in "+-"
            and float(t[:-2]) == pytest.approx(point.force.value, rel=1e-3)
            for t in found
        )


def test_a_reading_is_written_and_follows_the_choice(stage, cover):
    fields = stage.result.fields
    middles = fields.points[fields.triangles, :2].mean(axis=1)
    triangle = int(np.hypot(*(middles - (1.2, 0.3)).T).argmin())
    stage.read(triangle, np.full(3, 1.0 / 3.0))
    x, y = stage.reading.place
    w = stage.reading.value
    assert w == pytest.approx(
        1e3 * cover.deflection([(x, y)], case="crowd")[0], rel=0.01
    )
    said = " ".join(written(stage, "notes").split())
    assert f"at ({1e3 * x:.4g}, {1e3 * y:.4g}) mm: deflection {w:.4g} mm" in said
    assert "no difference of primal and dual is kept for it" in said
    assert "probe" in stage.props.layers
    stage.choose(case="jack")
    other = 1e3 * cover.deflection([(x, y)], case="jack")[0]
    assert stage.reading.value == pytest.approx(other, rel=0.01)
    assert f"deflection {stage.reading.value:.4g} mm" in written(stage, "notes")


def test_a_section_is_drawn_plotted_and_saved(stage, tmp_path):
    with pytest.raises(InputError, match="there is no section yet"):
        stage.save_cut(tmp_path / "a.csv")
    stage.cut_along((0.1, 0.15), (1.5, 0.6))
    assert "section" in stage.props.layers
    (chart,) = stage.plotter.renderer._charts
    assert chart.x_label == "along the section [mm]"
    assert chart.y_label == "deflection [mm]"
    (line,) = chart.plots("line")
    assert line.x.max() == pytest.approx(1e3 * np.hypot(1.4, 0.45), rel=1e-6)
    assert line.y.min() == pytest.approx(stage.cut.values.min())
    pick(stage, "von Mises")
    (chart,) = stage.plotter.renderer._charts
    assert chart.y_label == "von Mises [MPa]"
    path = stage.save_cut(tmp_path / "a.csv")
    assert "von Mises [MPa], case crowd" in path.read_text("utf-8")


def test_while_it_is_dragged_a_large_plate_is_drawn_by_few_triangles(
    stage, monkeypatch
):
    monkeypatch.setattr("kplate.output.props.HEAVY", 1000)
    monkeypatch.setattr("kplate.output.props.FEW", 500)
    stage.props.layers.clear()
    stage.props._few = None
    stage.refresh()
    props, actors = stage.props, stage.plotter.actors
    assert not actors["few"].GetVisibility()
    smooth = stage.plotter.render_window.GetMultiSamples()
    props.drag(on=True)
    assert stage.plotter.render_window.GetMultiSamples() == 0
    shown = {name for name, actor in actors.items() if actor.GetVisibility()}
    assert {"few", "rim"} <= shown
    assert not {"plate", "labels-labels", "contours below zero"} & shown
    stage.set_scale(55.0)
    few = props.layers["few"]
    kept, triangles = props.few
    assert 200 < len(triangles) < 1500
    np.testing.assert_allclose(few.data.points[:, 2], 55.0 * props.w[kept], rtol=1e-6)
    props.drag(on=False)
    assert stage.plotter.render_window.GetMultiSamples() == smooth
    assert actors["plate"].GetVisibility()
    assert not actors["few"].GetVisibility()
    plate = props.layers["plate"].data.points[:, 2]
    np.testing.assert_allclose(plate, 55.0 * props.w, rtol=1e-6, atol=1e-12)
    monkeypatch.undo()
    props.remove("few")
    props.layers.clear()


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


@pytest.mark.slow
@pytest.mark.usefixtures("_no_display")
@pytest.mark.parametrize("ending", ["png", "svg", "pdf"])
def test_a_picture_of_a_solution_is_written(lid, tmp_path, ending):
    path = tmp_path / f"a.{ending}"
    show = {"plan": True, "loads": False}
    found = write_view(lid, path, quantity="moments xx", show=show, size=(700, 450))
    assert found == path
    content = path.read_bytes()
    start = {"png": b"\x89PNG", "svg": b"<?xml", "pdf": b"%PDF"}[ending]
    assert content.startswith(start)
    if ending == "svg":
        text = content.decode()
        texts = re.findall(r"<text[^>]*>([^<]*)</text>", text)
        assert not any("\n" in own for own in texts)  # it would be drawn as a space
        for words in (
            "case wind: 5.00 kPa down",
            "south: simply supported",
            "moments xx",
            "[N]",
        ):
            assert words in texts
        assert any(
            own.startswith("moments xx [N]; deflection drawn x") for own in texts
        )
    assert [p.name for p in tmp_path.iterdir()] == [path.name]


@pytest.mark.usefixtures("_no_display")
@pytest.mark.parametrize(
    ("given", "message"),
    [
        ({"quantity": "colour"}, "there is no quantity 'colour'; there are deflection"),
        ({"case": "snow"}, "there is no load case 'snow'; the cases are wind."),
        ({"face": "left"}, "there is no face 'left'; the faces are top and bottom."),
        ({"show": {"sun": True}}, "there is nothing called 'sun' to show; there are"),
    ],
)
def test_what_there_is_not_is_refused(lid, tmp_path, given, message):
    with pytest.raises(InputError) as caught:
        write_view(lid, tmp_path / "a.png", **given)
    assert str(caught.value).startswith(message)
    assert list(tmp_path.iterdir()) == []


def test_a_picture_by_another_name_is_refused(lid, tmp_path):
    with pytest.raises(InputError) as caught:
        write_view(lid, tmp_path / "a.jpg")
    assert str(caught.value) == (
        f"'{tmp_path / 'a.jpg'}' must end in .png, .svg or .pdf; name it so."
    )


@pytest.mark.usefixtures("_no_display")
def test_a_number_asked_for_is_shown_with_its_band_where_it_was_asked():
    sides = ["a", "b", "c", "d"]
    plate = kp.Plate(
        outline=kp.Outline.polygon([(0, 0), (1, 0), (1, 1), (0, 1)], sides=sides),
        thickness=0.01,
        material=kp.STEEL,
        supports=dict.fromkeys(sides, kp.SIMPLY_SUPPORTED),
    )
    goal = kp.Moment(at=(0.5, 0.5), component="m_xx")
    solution = kp.solve(plate, [kp.Pressure(-1e4)], tolerance=0.05, goals=[goal])
    found = staged(result_of(solution))
    try:
        middles = found.result.fields.points[found.result.fields.triangles, :2].mean(
            axis=1
        )
        value = solution.value(goal)
        for place, near in (((0.5, 0.5), True), ((0.2, 0.7), False)):
            triangle = int(np.hypot(*(middles - place).T).argmin())
            found.read(triangle, np.full(3, 1.0 / 3.0))
            said = " ".join(found.notes().split())
            assert re.search(
                r"primal and dual differ by (less than )?[1-9.e-]\S* mm here "
                r"\(estimate, not a bound\)",
                said,
            )
            words = (
                f"asked for at (0.5, 0.5) m: m_xx {value.value:.4g}, {value.kind} "
                f"{value.lower:.4g} to {value.upper:.4g} (SI)"
            )
            assert (words in said) == near
    finally:
        found.plotter.close()
