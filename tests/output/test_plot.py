"""Fields on matplotlib axes, moving pictures, what a notebook shows."""

import base64
import html
import re
from pathlib import Path

import numpy as np
import pytest
from PIL import Image

import kplate as kp
from kplate.errors import InputError
from kplate.output.plot import new_axes


def texts(axes):
    return [text.get_text() for text in axes.texts]


def test_the_bar_has_quantity_and_unit_and_the_axes_are_equal(cover):
    axes = kp.plot(cover, "m_xx", case="crowd")
    (bar,) = (a for a in axes.figure.axes if a is not axes)
    assert bar.get_ylabel() == "moments xx [N]"
    assert (axes.get_xlabel(), axes.get_ylabel()) == ("x [mm]", "y [mm]")
    assert axes.get_aspect() == 1.0
    assert axes.get_title(loc="left") == "moments xx [N], case crowd"


def test_it_draws_on_the_axes_given(lid):
    axes = new_axes()
    assert kp.plot(lid, ax=axes) is axes
    assert axes.collections


def test_peaks_stand_where_they_are_with_their_values(lid):
    axes = kp.plot(lid, "deflection")
    w = 1e3 * lid.point_fields()["deflection [m]"]
    assert texts(axes) == [f"{w.min():.4g}"]
    mark = [line for line in axes.lines if line.get_marker() == "x"][-1]
    at = (mark.get_xdata()[0], mark.get_ydata()[0])
    np.testing.assert_allclose(at, (400.0, 300.0), atol=25.0)
    axes = kp.plot(lid, "m_xy")
    found = {float(text) for text in texts(axes)}
    m_xy = lid.point_fields()["moments [N]"][:, 2]
    assert found == {float(f"{m_xy.max():.4g}"), float(f"{m_xy.min():.4g}")}


def test_a_peak_is_none_of_the_places_left_out(cover):
    axes = kp.plot(cover, "von Mises", case="jack")
    stress = cover.point_fields(case="jack")["von Mises [Pa]"] / 1e6
    far = np.ones(len(stress), dtype=bool)
    for disc in cover.excluded:
        far &= np.hypot(*(cover.field_points - disc.place).T) >= disc.radius
    (text,) = texts(axes)
    assert float(text) == pytest.approx(stress[far].max(), rel=1e-3)
    assert float(text) < stress.max()
    rings = [line for line in axes.lines if line.get_marker() == "o"]
    assert len(rings) == 2


def test_contours_fill_the_levels_and_lines_below_zero_are_dashed(lid):
    axes = kp.plot(lid, "m_xy")
    filled, lines = axes.collections[:2]
    np.testing.assert_allclose(filled.levels, -filled.levels[::-1])  # zero-centred
    assert set(lines.levels) <= set(filled.levels)
    dashed = [
        offset_and_dash[1] is not None for offset_and_dash in lines.get_linestyle()
    ]
    assert dashed == [level < 0.0 for level in lines.levels]


def test_other_limits_widen_the_colours(lid):
    axes = kp.plot(lid, "von Mises", limits=(0.0, 500.0))
    assert axes.collections[0].levels[-1] >= 500.0


def test_faces_differ_in_sign(lid):
    top, bottom = (
        kp.plot(lid, "stress xx", face=face).collections[0]
        for face in ("top", "bottom")
    )
    np.testing.assert_allclose(top.zmin, -bottom.zmax, rtol=1e-6)


@pytest.mark.parametrize(
    ("given", "message"),
    [
        (
            {"quantity": "colour", "case": "jack"},
            "there is no quantity 'colour'; there are deflection,",
        ),
        ({"case": "snow"}, "there is no load case 'snow'; the cases are crowd, jack."),
        ({}, "there are 2 load cases; name one of crowd, jack."),
        ({"face": "left"}, "there is no face 'left'; the faces are top and bottom."),
    ],
)
def test_what_there_is_not_is_refused(cover, given, message):
    with pytest.raises(InputError) as caught:
        kp.plot(cover, **given)
    assert str(caught.value).startswith(message)


@pytest.mark.parametrize("ending", ["gif", "png"])
def test_cases_follow_each_other_in_a_moving_picture(cover, tmp_path, ending):
    path = kp.write_animation(cover, tmp_path / f"a.{ending}", quantity="von Mises")
    with Image.open(path) as image:
        assert image.n_frames == 2
        first = np.asarray(image.convert("RGB"), dtype=float)
        image.seek(1)
        second = np.asarray(image.convert("RGB"), dtype=float)
    assert first.shape == second.shape
    assert (np.abs(first - second).max(axis=2) > 30).mean() > 0.01


def test_a_load_grows_with_the_same_colours_in_all_frames(lid, tmp_path):
    path = kp.write_animation(
        lid, tmp_path / "a.gif", factors=[0.0, 0.5, 1.0], seconds=0.2
    )
    with Image.open(path) as image:
        assert image.n_frames == 3
        assert image.info["duration"] == 200
        frames = []
        for k in range(3):
            image.seek(k)
            frames.append(np.asarray(image.convert("RGB"), dtype=float))
    middle = tuple(np.array(frames[0].shape[:2]) // 2)
    darkness = [255.0 - frame[middle].mean() for frame in frames]
    # No load: as pale as zero; then darker, by the same scale.
    assert darkness[0] + 10.0 < darkness[1] < darkness[2] - 10.0


@pytest.mark.parametrize(
    ("name", "given", "message"),
    [
        ("a.mp4", {}, "must end in .gif or .png; name it so."),
        ("a.gif", {}, "there are 1 frames; a moving picture has 2 to"),
        ("a.gif", {"cases": ["snow"]}, "there is no load case 'snow'"),
        ("a.gif", {"factors": [1.0, -1.0]}, "they must not be negative"),
        ("a.gif", {"factors": [0.0, 1.0], "seconds": 0.0}, "a frame stays 0 s"),
    ],
)
def test_no_moving_picture_of_nothing(lid, tmp_path, name, given, message):
    with pytest.raises(InputError, match=re.escape(message)):
        kp.write_animation(lid, tmp_path / name, **given)
    assert list(tmp_path.iterdir()) == []


def test_a_notebook_shows_a_plate(cover):
    assert cover.plate._repr_png_().startswith(b"\x89PNG")


def test_a_notebook_shows_peaks_and_the_deflection(cover):
    shown = cover._repr_html_()
    picture = re.search(r"base64,([^\"]+)", shown)[1]
    assert base64.b64decode(picture).startswith(b"\x89PNG")
    for case in cover.cases:
        assert f"<td>{case}</td><td>peak deflection</td>" in shown
    peak = cover.peak("von Mises", case="crowd")
    assert f"<td>{peak.value / 1e6:#.4g} MPa</td>" in shown
    assert "not estimated" in shown
    assert "2 places without a finite moment are left out" in shown


def test_a_notebook_shows_reactions_with_names_escaped(deck):
    reactions = deck.reactions()
    shown = reactions._repr_html_()
    for side in reactions.sides:
        assert f"<td>{side.side}</td>" in shown
    assert "<td>mark bolt</td>" in shown
    assert "<th>case winch</th>" in shown


def test_a_notebook_shows_what_the_command_prints():
    panel = Path(__file__).parents[2] / "meshes" / "pit-cover.toml"
    checked = kp.check(panel)
    assert checked._repr_html_() == f"<pre>{html.escape(checked.text)}</pre>"
