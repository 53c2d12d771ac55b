"""Design moments are safe in every direction, tight in one, and of the least sum."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from plates import grid, rectangle, solved
from strategies import numbers

from kplate.adapt import solve
from kplate.errors import InputError
from kplate.loads import Pressure
from kplate.output.record import solution_record
from kplate.output.result import read_result
from kplate.output.vtk import write_vtk
from kplate.supports import SIMPLY_SUPPORTED
from kplate.woodarmer import DESIGN, design_moments, largest_change

ANGLES = np.radians(np.arange(360.0))
COS, SIN = np.cos(ANGLES), np.sin(ANGLES)
SIZES = st.floats(-6.0, 6.0).map(lambda exponent: 10.0**exponent)


def normal_moments(m):
    """m_nn of moments (k, 3) on 360 faces, (k, 360)."""
    xx, yy, xy = (part[:, None] for part in m.T)
    return xx * COS**2 + yy * SIN**2 + 2.0 * xy * COS * SIN


def resisted(pair):
    """What bars along x and y (k, 2) resist on 360 faces."""
    return pair[:, :1] * COS**2 + pair[:, 1:] * SIN**2


@given(numbers(20, 3), SIZES)
def test_no_direction_is_beyond_what_the_bars_resist(shares, size):
    m = size * shares
    found = design_moments(m)
    assert (found >= 0.0).all()
    slack = 1e-12 * size
    assert (resisted(found[:, :2]) >= normal_moments(m) - slack).all()
    assert (resisted(found[:, 2:]) >= normal_moments(-m) - slack).all()


@given(numbers(20, 3), SIZES)
def test_one_direction_is_tight(shares, size):
    """The spare in the worst direction is the smaller eigenvalue of what is spare."""
    m = size * shares
    found = design_moments(m)
    for pair, own in ((found[:, :2], m), (found[:, 2:], -m)):
        spare = np.zeros((len(m), 2, 2))
        spare[:, 0, 0], spare[:, 1, 1] = (pair - own[:, :2]).T
        spare[:, 0, 1] = spare[:, 1, 0] = -own[:, 2]
        least = np.linalg.eigvalsh(spare)[:, 0]
        used = pair.any(axis=1)  # a layer without bars has nothing to be tight with
        np.testing.assert_allclose(least[used], 0.0, atol=1e-9 * size)


@given(numbers(3), st.floats(1e-3, 1e3))
def test_no_other_bars_that_are_safe_need_a_smaller_sum(m, share):
    """All that is just safe: m_x = m_xx + t, m_y = m_yy + m_xy^2 / t with any t > 0."""
    twist = max(abs(m[2]), 1e-9)
    t = share * twist
    other = np.array([m[0] + t, m[1] + m[2] ** 2 / t])
    if (other >= 0.0).all():
        assert design_moments(m)[:2].sum() <= other.sum() + 1e-9


@given(numbers(3))
def test_turning_the_plate_over_or_by_a_right_angle_exchanges_the_layers_or_bars(m):
    found = design_moments(m)
    np.testing.assert_array_equal(design_moments(-m), found[[2, 3, 0, 1]])
    np.testing.assert_allclose(
        design_moments([m[1], m[0], -m[2]]), found[[1, 0, 3, 2]], rtol=1e-14
    )


@given(numbers(40, 3), numbers(40, 3), st.floats(1e-6, 1.0))
def test_design_moments_change_by_no_more_than_is_said(m, step, size):
    change = np.abs(design_moments(m + size * step) - design_moments(m))
    most = largest_change(size * step)
    assert (change.max(axis=1) <= most * (1.0 + 1e-9) + 1e-12).all()


@pytest.mark.parametrize(
    ("m", "expected"),
    [
        ([10.0, 4.0, 3.0], [13.0, 7.0, 0.0, 0.0]),
        ([10.0, -4.0, 3.0], [12.25, 0.0, 0.0, 4.9]),
        ([-10.0, 4.0, 3.0], [0.0, 4.9, 12.25, 0.0]),
        ([-10.0, -4.0, 0.0], [0.0, 0.0, 10.0, 4.0]),
        ([0.0, 0.0, 0.0], [0.0, 0.0, 0.0, 0.0]),
    ],
)
def test_worked_numbers(m, expected):
    """By hand: 10 + 3^2 / 4 = 12.25 and 4 + 3^2 / 10 = 4.9."""
    assert design_moments(m) == pytest.approx(expected)


def test_a_wrong_shape_is_refused():
    with pytest.raises(InputError, match=r"shape \(2,\); its last axis must hold m_xx"):
        design_moments([1.0, 2.0])


@pytest.fixture(scope="module")
def slab():
    plate = rectangle(SIMPLY_SUPPORTED, a=3.0, b=2.0, thickness=0.1, D=2e7)
    return solved(plate, grid(12, a=3.0, b=2.0), Pressure(-8e3))


def test_peaks_are_those_of_the_field(slab):
    fields = slab.point_fields(design=True)["design moments [N]"]
    assert "design moments [N]" not in slab.point_fields()
    for k, quantity in enumerate(DESIGN):
        peak = slab.peak(quantity)
        assert peak.value == pytest.approx(fields[:, k].max(), rel=1e-9)
        there = slab.design_moments([peak.place])[0, k]
        assert there == pytest.approx(peak.value, rel=1e-6)
    # Pressed down it sags: bars along the short span carry most, those at the top
    # twist at the corners only.
    assert slab.peak("design bottom y").value > slab.peak("design bottom x").value
    x, y = slab.peak("design top x").place
    assert min(x, 3.0 - x) + min(y, 2.0 - y) < 0.5


def test_fields_and_peaks_are_written_when_asked(slab, tmp_path):
    path = write_vtk(slab, tmp_path / "slab.vtu", design=True)
    names = [shade.name for shade in read_result(path).shades]
    assert "design moments bottom x" in names
    record = solution_record(slab, "0", design=True)
    peaks = record["results"][0]["peaks"]
    assert peaks["design top y [N]"]["value"] == slab.peak("design top y").value
    plain = solution_record(slab, "0")
    assert "design top y [N]" not in plain["results"][0]["peaks"]
    assert "design moments [N]" in record["field_names"]
    assert "design moments [N]" not in plain["field_names"]


def test_a_band_holds_the_peak_of_a_finer_solution():
    plate = rectangle(SIMPLY_SUPPORTED, a=3.0, b=2.0, thickness=0.1, D=2e7)
    coarse = solve(plate, [Pressure(-8e3)], tolerance=0.05)
    fine = solve(plate, [Pressure(-8e3)], triangles=6000)
    for quantity in DESIGN:
        band, best = coarse.peak(quantity), fine.peak(quantity).value
        assert band.kind == "estimate"
        assert band.lower <= best <= band.upper
