"""Levels are round, from zero, told apart in grey, and without red and green."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from kplate.output.colours import MOST_LEVELS, colours

finite = st.floats(-1e9, 1e9).filter(lambda x: x == 0.0 or abs(x) > 1e-9)


def of(*values):
    values = np.array(values, dtype=float)
    return colours(values, values)


def lab(rgb):
    """Lightness and the two opponent colours of CIE 1976 (L*, a*, b*), D65.

    Formulas and the matrix of sRGB (IEC 61966-2-1), from memory; white comes out as
    (100, 0, 0).
    """
    linear = np.where(rgb <= 0.04045, rgb / 12.92, ((rgb + 0.055) / 1.055) ** 2.4)
    matrix = np.array(
        [
            [0.4124, 0.3576, 0.1805],
            [0.2126, 0.7152, 0.0722],
            [0.0193, 0.1192, 0.9505],
        ]
    )
    xyz = linear @ matrix.T / matrix.sum(axis=1)
    f = np.where(xyz > 216 / 24389, np.cbrt(xyz), (24389 / 27 * xyz + 16) / 116)
    return np.column_stack(
        [116 * f[:, 1] - 16, 500 * (f[:, 0] - f[:, 1]), 200 * (f[:, 1] - f[:, 2])]
    )


def test_white_has_no_colour():
    np.testing.assert_allclose(lab(np.ones((1, 3))), [[100, 0, 0]], atol=1e-9)


@pytest.mark.parametrize(
    ("values", "limits", "step"),
    [
        ((0.0, 2.0), (0.0, 2.0), 0.2),
        ((-2.0, 0.01), (-2.0, 0.0), 0.2),
        ((-2.0, 1.0), (-2.0, 2.0), 0.5),
        ((3.0, 4.0), (0.0, 4.0), 0.5),
        ((0.0, 0.0), (0.0, 1.0), 1.0),
        ((0.0, 1.034), (0.0, 1.1), 0.1),
        ((-21.1, 43.0), (-50.0, 50.0), 10.0),
    ],
)
def test_levels_are_round_and_start_from_zero(values, limits, step):
    found = of(*values)
    assert found.limits == pytest.approx(limits)
    assert found.step == pytest.approx(step)


@given(finite, finite)
def test_levels_hold_the_field_and_zero_and_are_centred_for_both_signs(a, b):
    found = of(a, b)
    levels, most = found.levels, np.abs(found.levels).max()
    assert 2 <= len(levels) <= MOST_LEVELS + 3
    assert len(found.bands) == len(levels) - 1
    assert np.abs(levels).min() == 0.0  # zero is a level
    slack = 0.0100001 * most
    assert levels[0] - slack <= min(a, b)
    assert max(a, b) <= levels[-1] + slack
    np.testing.assert_allclose(np.diff(levels), found.step, rtol=1e-6)
    if levels[0] < 0.0 < levels[-1]:
        np.testing.assert_allclose(levels, -levels[::-1], atol=1e-9 * most)
    assert (found.below, found.above) == (False, False)


def test_a_print_in_grey_tells_magnitudes():
    """Lightness falls from band to band away from zero, by what can be seen."""
    for values in ((0.0, 1.0), (-1.0, 0.0), (-1.0, 1.0)):
        found = of(*values)
        lightness = lab(found.bands)[:, 0]
        middles = 0.5 * (found.levels[:-1] + found.levels[1:])
        for side in (middles > 0.0, middles < 0.0):
            own = lightness[side][np.argsort(np.abs(middles[side]))]
            assert (np.diff(own) < -2.0).all()


def test_signs_differ_without_red_and_green():
    """In blue and yellow (b*) alone the two sides of zero are far apart."""
    found = of(-1.0, 1.0)
    blueness = lab(found.bands)[:, 2]
    half = len(found.bands) // 2
    for k in range(1, half):  # but for the palest pair
        assert blueness[half + k] - blueness[half - 1 - k] > 15.0
    middle = blueness[half] - blueness[half - 1]
    assert middle > 3.0


def test_places_left_out_do_not_set_the_levels_but_are_flagged():
    found = colours(np.array([0.0, 2.0]), np.array([0.0, 2.0, 50.0]))
    assert found.limits == (0.0, 2.0)
    assert (found.below, found.above) == (False, True)
    found = colours(np.array([-1.0, 2.0]), np.array([-7.0, 2.0]))
    assert (found.below, found.above) == (True, False)
