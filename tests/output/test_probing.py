"""Readings and sections against the solution they come from."""

import csv

import numpy as np
import pytest

from kplate.adapt import solve
from kplate.errors import InputError
from kplate.loads import Pressure
from kplate.materials import STEEL
from kplate.outline import Outline
from kplate.output.probing import probe, section, write_section
from kplate.output.result import result_of
from kplate.plate import Plate
from kplate.supports import SIMPLY_SUPPORTED


@pytest.fixture(scope="module")
def pane():
    """A square solved with its dual on few triangles."""
    sides = ["a", "b", "c", "d"]
    plate = Plate(
        outline=Outline.polygon([(0, 0), (1, 0), (1, 1), (0, 1)], sides=sides),
        thickness=0.01,
        material=STEEL,
        supports=dict.fromkeys(sides, SIMPLY_SUPPORTED),
    )
    return solve(plate, [Pressure(-1e4)], triangles=40, balanced=True)


def shade_of(result, name):
    return next(shade for shade in result.shades if shade.name == name)


def middles(result):
    fields = result.fields
    return fields.points[fields.triangles, :2].mean(axis=1)


def at_middle(result, shade, face="bottom", case=None):
    """A reading in the middle of the small triangle that holds the plate's middle."""
    found = middles(result)
    triangle = int(np.hypot(*(found - found.mean(axis=0)).T).argmin())
    case = case or next(iter(result.cases))
    shares = np.full(3, 1.0 / 3.0)
    return probe(result, shade, case=case, face=face, triangle=triangle, shares=shares)


def test_a_reading_is_the_field_at_its_place(pane):
    result = result_of(pane)
    for name, field, size in (
        ("deflection", lambda p: pane.deflection(p), 1e-3),
        ("moments yy", lambda p: pane.moments(p)[:, 1], 1.0),
        ("stress xx", lambda p: pane.stresses(p, face="top")[:, 0], 1e6),
    ):
        shade = shade_of(result, name)
        found = at_middle(result, shade, face="top")
        assert found.value * size == pytest.approx(field([found.place])[0], rel=0.01)
        assert found.left_out == ""


def test_the_difference_is_that_of_primal_and_dual(pane):
    result = result_of(pane)
    found = at_middle(result, shade_of(result, "deflection"))
    fields, w = pane.point_fields(), "deflection [m]"
    off = np.abs(fields[w] - fields[f"balanced {w}"])
    assert 0.0 < found.difference <= 1e3 * off.max()
    found = at_middle(result, shade_of(result, "moments xx"))
    triangle = int(np.hypot(*(middles(result) - found.place).T).argmin())
    corners = result.fields.triangles[triangle]
    own = fields["moments [N]"] - fields["balanced moments [N]"]
    m_xx, m_yy, m_xy = own[corners].mean(axis=0)
    whole = abs(m_xx + m_yy) / 2 + np.hypot((m_xx - m_yy) / 2, m_xy)
    assert found.difference == pytest.approx(whole, rel=1e-3)
    stress = at_middle(result, shade_of(result, "stress yy"))
    assert stress.difference == pytest.approx(6 / 0.01**2 * found.difference / 1e6)
    for name in ("von Mises", "largest principal", "shear stress", "shears x"):
        reading = at_middle(result, shade_of(result, name))
        assert 0.0 < reading.difference < abs(reading.value) + 1.0
    assert at_middle(result, shade_of(result, "slopes x")).difference is None


def test_without_a_dual_no_difference_is_claimed(lid):
    result = result_of(lid)
    for shade in result.shades:
        assert at_middle(result, shade).difference is None


def test_a_reading_in_a_place_left_out_says_why(cover):
    result = result_of(cover)
    triangle = int(np.hypot(*(middles(result) - (1.0, 0.8)).T).argmin())
    found = probe(
        result,
        shade_of(result, "von Mises"),
        case="crowd",
        face="",
        triangle=triangle,
        shares=np.full(3, 1.0 / 3.0),
    )
    assert found.left_out == result.told.left_out[0].reason


def test_a_section_reads_the_field_along_the_line(cover):
    result = result_of(cover)
    values = result.shown("crowd", shade_of(result, "deflection"))
    start, end = (0.1, 0.15), (1.5, 0.6)
    cut = section(result, values, start, end)
    length = np.hypot(1.4, 0.45)
    s = cut.pieces.mean(axis=1)
    assert (np.diff(s) >= 0.0).all()
    assert 0.0 <= cut.pieces.min() < 1e-6
    assert length - 1e-6 < cut.pieces.max() <= length
    places = np.array(start) + s[:, None] / length * np.array([1.4, 0.45])
    expected = 1e3 * cover.deflection(places, case="crowd")
    off = np.abs(cut.values.mean(axis=1) - expected)
    assert off.max() < 0.01 * np.abs(expected).max()


def test_a_section_leaves_holes_out(cover):
    result = result_of(cover)
    values = result.shown("crowd", shade_of(result, "deflection"))
    cut = section(result, values, (0.0, 0.4), (1.6, 0.4))
    gaps = cut.pieces[1:, 0] - cut.pieces[:-1, 1]
    k = int(gaps.argmax())
    assert gaps[k] == pytest.approx(0.24, rel=0.01)  # the shaft's diameter
    assert cut.pieces[k, 1] == pytest.approx(0.33, rel=0.01)
    assert (np.delete(gaps, k) < 1e-9).all()


def test_a_linear_field_stays_linear_along_any_line(cover):
    result = result_of(cover)
    x, y, _ = result.fields.points.T
    cut = section(result, 2.0 * x - 3.0 * y, (0.2, 0.7), (0.9, 0.75))
    along = np.array([0.7, 0.05]) / np.hypot(0.7, 0.05)
    expected = 2.0 * 0.2 - 3.0 * 0.7 + cut.pieces * (2.0 * along[0] - 3.0 * along[1])
    np.testing.assert_allclose(cut.values, expected, atol=1e-9)


@pytest.mark.parametrize(
    ("end", "message"),
    [
        ((3.0, 3.0), "a section needs two different points."),
        ((4.0, 3.0), "the section does not cross the plate; choose other points."),
    ],
)
def test_a_line_beside_the_plate_is_refused(cover, end, message):
    result = result_of(cover)
    with pytest.raises(InputError) as caught:
        section(result, result.fields.points[:, 0], (3.0, 3.0), end)
    assert str(caught.value) == message


def test_a_section_is_written_with_places_and_unit(cover, tmp_path):
    result = result_of(cover)
    shade = shade_of(result, "stress xx")
    values = result.shown("jack", shade, "top")
    cut = section(result, values, (0.1, 0.1), (1.5, 0.1))
    path = write_section(cut, shade.title("top"), tmp_path / "a.csv")
    with path.open(encoding="utf-8", newline="") as file:
        heading, *rows = csv.reader(file)
    assert heading == ["distance [m]", "x [m]", "y [m]", "stress xx, top [MPa]"]
    found = np.array(rows, dtype=float)
    np.testing.assert_allclose(found[:, 1], 0.1 + found[:, 0])
    np.testing.assert_allclose(found[:, 2], 0.1)
    np.testing.assert_allclose(found[:, 3], cut.values.ravel(), rtol=1e-8)
