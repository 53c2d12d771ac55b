"""Loads and cases: numbers checked when stated, corners of patches."""

import math
from dataclasses import FrozenInstanceError

import numpy as np
import pytest
import shapely
from hypothesis import given
from hypothesis import strategies as st

from kplate.errors import InputError
from kplate.loads import (
    Case,
    DiscPatch,
    Hydrostatic,
    PointForce,
    Pressure,
    PressureField,
    RectanglePatch,
    SelfWeight,
)

WRONG = (math.nan, math.inf, -math.inf)
PATCH = {"force": -1.0, "centre": (0, 0), "size": (1, 2)}
DISC = {"force": -1.0, "centre": (0, 0), "radius": 0.1}
LIQUID = {"level": 1.0, "specific_weight": 1e4}


def refusal(build):
    with pytest.raises(InputError) as caught:
        build()
    return str(caught.value)


@pytest.mark.parametrize("value", WRONG)
@pytest.mark.parametrize(
    ("build", "words"),
    [
        (lambda x: Pressure(x), "pressure is {}"),
        (lambda x: Hydrostatic(**{**LIQUID, "level": x}), "level of a liquid is {}"),
        (
            lambda x: Hydrostatic(**{**LIQUID, "specific_weight": x}),
            "specific weight of a liquid is {}",
        ),
        (
            lambda x: Hydrostatic(**LIQUID, up=(0, x)),
            "up direction of a liquid is 0, {}",
        ),
        (lambda x: RectanglePatch(**{**PATCH, "force": x}), "force of a patch is {}"),
        (
            lambda x: RectanglePatch(**{**PATCH, "centre": (x, 2)}),
            "centre of a patch is {}, 2",
        ),
        (lambda x: RectanglePatch(**PATCH, angle=x), "angle of a patch is {}"),
        (
            lambda x: RectanglePatch(**{**PATCH, "size": (1, x)}),
            "size of a patch is 1, {}",
        ),
        (lambda x: DiscPatch(**{**DISC, "force": x}), "force of a patch is {}"),
        (
            lambda x: DiscPatch(**{**DISC, "centre": (0, x)}),
            "centre of a patch is 0, {}",
        ),
        (lambda x: DiscPatch(**{**DISC, "radius": x}), "radius of a patch is {}"),
        (lambda x: PointForce(force=x, at=(0, 0)), "force is {}"),
        (lambda x: PointForce(force=1, at=(x, 0.5)), "place of a force is {}, 0.5"),
        (lambda x: SelfWeight(acceleration=x), "acceleration of gravity is {}"),
    ],
)
def test_numbers_of_a_load_are_finite(build, words, value):
    shown = words.format(f"{value:g}")
    assert refusal(lambda: build(value)) == f"the {shown}; it must be finite."


@pytest.mark.parametrize(
    ("size", "shown"),
    [((0, 1), "0 x 1"), ((2, -0.5), "2 x -0.5"), ((-1, -1), "-1 x -1")],
)
def test_the_size_of_a_patch_is_positive(size, shown):
    assert refusal(lambda: RectanglePatch(force=1, centre=(0, 0), size=size)) == (
        f"the size of a patch is {shown} m; it must be positive."
    )


@pytest.mark.parametrize("radius", [0.0, -0.1])
def test_the_radius_of_a_patch_is_positive(radius):
    assert refusal(lambda: DiscPatch(force=1, centre=(0, 0), radius=radius)) == (
        f"the radius of a patch is {radius:g} m; it must be positive."
    )


def test_a_liquid_has_a_surface_somewhere():
    assert refusal(lambda: Hydrostatic(**LIQUID, up=(0, 0))) == (
        "the up direction of a liquid is (0, 0); give a direction."
    )
    assert Hydrostatic(**LIQUID).up == (0.0, 1.0)


def test_the_corners_of_a_patch():
    patch = RectanglePatch(force=1, centre=(3, 4), size=(2, 1))
    assert patch.corners == [(2.0, 3.5), (4.0, 3.5), (4.0, 4.5), (2.0, 4.5)]
    turned = RectanglePatch(force=1, centre=(3, 4), size=(2, 1), angle=math.pi / 2)
    np.testing.assert_allclose(
        turned.corners, [(3.5, 3.0), (3.5, 5.0), (2.5, 5.0), (2.5, 3.0)]
    )


positive = st.floats(1e-3, 1e3)


@given(st.tuples(positive, positive), st.floats(-10, 10), st.floats(-10, 10))
def test_a_turned_patch_keeps_its_size_and_centre(size, angle, x):
    patch = RectanglePatch(force=1, centre=(x, -x), size=size, angle=angle)
    corners = np.array(patch.corners)
    blur = 1e-12 * (abs(x) + max(size))
    np.testing.assert_allclose(corners.mean(axis=0), (x, -x), atol=blur)
    ring = shapely.LinearRing(corners)
    assert ring.is_ccw
    first, second = corners[1] - corners[0], corners[2] - corners[1]
    along = size[0] * np.array([math.cos(angle), math.sin(angle)])
    np.testing.assert_allclose(first, along, atol=blur)
    np.testing.assert_allclose(
        second, size[1] / size[0] * along @ [[0, 1], [-1, 0]], atol=blur
    )


# Standard acceleration of free fall: 3rd General Conference on Weights and Measures,
# 1901 (from memory).
def test_a_plate_that_lies_face_up_weighs_down():
    assert SelfWeight().acceleration == -9.80665


LOADS = [
    Pressure(1.0),
    Hydrostatic(**LIQUID),
    PressureField(lambda x, y: x + y),
    RectanglePatch(**PATCH),
    DiscPatch(**DISC),
    PointForce(force=1, at=(0, 0)),
    SelfWeight(),
]


def test_a_case_takes_every_kind_of_load():
    assert Case(name="all", loads=LOADS).loads == tuple(LOADS)


def test_a_case_keeps_the_loads_it_was_given():
    loads = LOADS[:2]
    case = Case(name="two", loads=loads)
    loads.clear()
    assert len(case.loads) == 2


@pytest.mark.parametrize("load", LOADS)
def test_loads_cannot_be_changed(load):
    name = next(iter(vars(load)))
    with pytest.raises(FrozenInstanceError):
        setattr(load, name, 0.0)


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"name": ""}, "a load case has no name; give it one."),
        ({"loads": []}, "case 'wind' has no loads; give at least one."),
        (
            {"loads": [Pressure(1.0), 5.0]},
            "case 'wind' holds 5.0, which is not a load; use Pressure, Hydrostatic, "
            "PressureField, RectanglePatch, DiscPatch, PointForce, PointMoment, "
            "LineForce, EdgeMoment or SelfWeight.",
        ),
    ],
)
def test_a_case_that_cannot_be_is_refused(changes, words):
    stated = {"name": "wind", "loads": [Pressure(1.0)], **changes}
    assert refusal(lambda: Case(**stated)) == words
