"""Shapes of rims and holes: measures in closed form, and refusals."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from kplate.errors import InputError
from kplate.shapes import Circle, Ellipse, Rectangle, Slot

PLACE = {"centre": (3.0, 2.0), "name": "hole"}


def slot(**changes):
    return Slot(**{**PLACE, "length": 0.5, "width": 0.2, **changes})


def rectangle(**changes):
    return Rectangle(**{**PLACE, "size": (0.5, 0.2), **changes})


def ellipse(**changes):
    return Ellipse(**{**PLACE, "size": (0.5, 0.2), **changes})


def refusal(build):
    with pytest.raises(InputError) as caught:
        build()
    return str(caught.value)


# Areas and perimeters of circles, slots and rounded rectangles: elementary geometry.
SHAPES = [
    (Circle(**PLACE, radius=0.3), 0.09 * math.pi, 0.6 * math.pi),
    (slot(), 0.3 * 0.2 + 0.01 * math.pi, 0.6 + 0.2 * math.pi),
    (rectangle(), 0.1, 1.4),
    (
        rectangle(corner_radius=0.05),
        0.1 - (4.0 - math.pi) * 0.05**2,
        1.4 - (8.0 - 2.0 * math.pi) * 0.05,
    ),
]


@pytest.mark.parametrize(("shape", "area", "perimeter"), SHAPES)
def test_shapes_measure_as_geometry_says(shape, area, perimeter):
    assert shape.area == pytest.approx(area, rel=1e-14)
    assert shape.perimeter == pytest.approx(perimeter, rel=1e-14)
    assert shape.sides == ("hole",)
    assert shape.line.area == shape.area


def test_an_ellipse_measures_as_geometry_says():
    """Area pi a b; perimeter by Ramanujan's second formula (1914, from memory)."""
    a, b = 0.25, 0.1
    h = ((a - b) / (a + b)) ** 2
    length = math.pi * (a + b) * (1.0 + 3.0 * h / (10.0 + math.sqrt(4.0 - 3.0 * h)))
    assert ellipse().area == pytest.approx(math.pi * a * b, rel=1e-4)
    assert ellipse().perimeter == pytest.approx(length, rel=1e-4)


@pytest.mark.parametrize("shape", [slot(), rectangle(corner_radius=0.05), ellipse()])
def test_round_shapes_have_no_corners(shape):
    assert shape.line.straight.all()
    assert rectangle().line.straight.sum() == 0


@given(st.floats(-7.0, 7.0), st.sampled_from([slot, rectangle, ellipse]))
def test_a_turned_shape_is_the_shape_turned_about_its_middle(angle, build):
    c, s = math.cos(angle), math.sin(angle)
    turned, plain = build(angle=angle).line, build().line
    arms = plain.points - PLACE["centre"]
    expected = PLACE["centre"] + arms @ np.array([[c, s], [-s, c]])
    np.testing.assert_allclose(turned.points, expected, atol=1e-14)
    np.testing.assert_allclose(turned.bulges, plain.bulges)


def test_the_box_of_a_shape_is_its_size():
    assert slot().line.box == pytest.approx((2.75, 1.9, 3.25, 2.1))
    upright = slot(angle=math.pi / 2)
    assert upright.line.box == pytest.approx((2.9, 1.75, 3.1, 2.25))
    assert ellipse().line.box == pytest.approx((2.75, 1.9, 3.25, 2.1), abs=5e-5)


def test_shapes_that_are_stated_alike_are_equal():
    assert slot() == slot()
    assert hash(slot()) == hash(slot())
    assert slot() != slot(angle=0.1)


@pytest.mark.parametrize(
    ("build", "words"),
    [
        (
            lambda: slot(length=0.2),
            "slot 'hole' is 0.2 m long and 0.2 m wide; its length, from end to end, "
            "must be more than its width.",
        ),
        (
            lambda: slot(width=0.0),
            "slot 'hole' has width 0 m; it must be positive.",
        ),
        (
            lambda: slot(angle=math.nan),
            "slot 'hole' has angle nan; it must be finite, no larger than 1e+09.",
        ),
        (
            lambda: slot(length="200 mm"),
            "slot 'hole' has length '200 mm'; it must be a number.",
        ),
        (
            lambda: rectangle(size=(0.5, -0.2)),
            "rectangle 'hole' has size -0.2 m; it must be positive.",
        ),
        (
            lambda: rectangle(size=0.5),
            "rectangle 'hole' has size 0.5; give a pair of numbers in m.",
        ),
        (
            lambda: rectangle(corner_radius=0.1),
            "rectangle 'hole' has corners of radius 0.1 m; it must be at least 0 and "
            "less than half its smaller length.",
        ),
        (
            lambda: rectangle(corner_radius=-0.1),
            "rectangle 'hole' has corners of radius -0.1 m; it must be at least 0 and "
            "less than half its smaller length.",
        ),
        (
            lambda: ellipse(size=(0.5, math.inf)),
            "ellipse 'hole' has size inf; it must be finite, no larger than 1e+09.",
        ),
        (
            lambda: ellipse(centre=("0", "1")),
            "ellipse 'hole' has centre ('0', '1'); give a pair of numbers in m.",
        ),
    ],
)
def test_a_shape_that_cannot_be_is_refused(build, words):
    assert refusal(build) == words
