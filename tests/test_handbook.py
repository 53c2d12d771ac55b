"""Series and Ritz sums against tables, closed forms and the tests' own oracles."""

import numpy as np
import oracles
import pytest

from kplate.handbook import clamped_disc_work, disc_centre, rectangle
from kplate.quadrature import gauss

HELD = ("simply supported",) * 4
CLAMPED = ("clamped",) * 4


def spread(size, pressure, panels=12):
    """Places and forces of a pressure p(x, y) on a rectangle."""
    g, w = gauss(4)
    share = ((np.arange(panels)[:, None] + g) / panels).ravel()
    weight = np.tile(w / panels, panels)
    x, y = np.meshgrid(size[0] * share, size[1] * share, indexing="ij")
    area = size[0] * size[1] * np.outer(weight, weight)
    return np.column_stack([x.ravel(), y.ravel()]), (pressure(x, y) * area).ravel()


def even(x, y):
    return np.ones_like(x + y)


# NEEDS of the project, independently computed: w = k q a^4 / (E t^3), nu = 0.3.
@pytest.mark.parametrize(
    ("ends", "b", "k"),
    [
        (HELD, 1.0, 0.04436),
        (HELD, 1.5, 0.08435),
        (HELD, 2.0, 0.11061),
        (CLAMPED, 1.0, 0.01382),
        (CLAMPED, 1.5, 0.02399),
        (CLAMPED, 2.0, 0.02766),
    ],
)
def test_the_centre_deflects_as_tables_say(ends, b, k):
    D = 1.0 / (12.0 * (1.0 - 0.09))  # E t^3 = 1
    own = rectangle((1.0, b), ends, *spread((1.0, b), even), D=D, nu=0.3)
    centre = own.deflection(np.array([[0.5, 0.5 * b]]))[0]
    assert centre == pytest.approx(k, abs=0.6e-5)


def test_a_patch_on_a_simply_supported_rectangle_is_naviers():
    load = oracles.PatchForce(centre=(0.5, 0.25), size=(0.2, 0.1), force=3.0)
    places, forces = spread((0.2, 0.1), even)
    places, forces = places + np.array([0.4, 0.2]), forces / forces.sum() * 3.0
    own = rectangle((0.8, 0.6), HELD, places, forces, D=2.0, nu=0.3)
    at = np.array([(0.5, 0.25), (0.2, 0.5)])
    exact = oracles.navier(at, (0.8, 0.6), load).w / 2.0
    np.testing.assert_allclose(own.deflection(at), exact, rtol=1e-4)


@pytest.mark.parametrize("end", ["clamped", "free", "simply supported"])
@pytest.mark.parametrize("nu", [0.0, 0.3])
def test_two_sides_simply_supported_are_levys(end, nu):
    size = (1.0, 0.7)
    load = oracles.LinearPressure(at_origin=1.0, gradient=(0.5, -0.3))
    ends = ("simply supported", "simply supported", "clamped", end)
    forces = spread(size, lambda x, y: 1.0 + 0.5 * x - 0.3 * y)
    own = rectangle(size, ends, *forces, D=3.0, nu=nu)
    at = np.array([(0.5, 0.35), (0.3, 0.6), (0.5, 0.69)])
    exact = oracles.levy(at, size, load, ends=("clamped", end), nu=nu).w / 3.0
    np.testing.assert_allclose(own.deflection(at), exact, rtol=2e-5, atol=1e-9)


def test_a_cantilever_without_poissons_ratio_is_a_beam():
    own = rectangle(
        (2.0, 0.5),
        ("clamped", "free", "free", "free"),
        *spread((2.0, 0.5), even),
        D=7.0,
        nu=0.0,
    )
    tip = own.deflection(np.array([[2.0, 0.1]]))[0]
    assert tip == pytest.approx(2.0**4 / (8.0 * 7.0), rel=1e-9)


@pytest.mark.parametrize(
    "ends",
    [("free",) * 4, ("simply supported", "free", "free", "free")],
)
def test_a_rectangle_that_can_move_has_no_answer(ends):
    assert rectangle((1.0, 1.0), ends, *spread((1.0, 1.0), even), D=1.0, nu=0.3) is None


def test_a_clamped_disc_under_an_even_pressure_does_its_work():
    """p^2 pi a^6 / 192 D, the integral of p (a^2 - r^2)^2 / 64 D."""
    a, p, D = 0.4, 3.0, 5.0
    r, w = gauss(20)
    angle = 2.0 * np.pi * np.arange(16) / 16
    x = a * np.outer(r, np.cos(angle)).ravel() + 1.0
    y = a * np.outer(r, np.sin(angle)).ravel() - 2.0
    forces = p * np.repeat(w * r, 16) * a**2 * 2.0 * np.pi / 16
    places = np.column_stack([x, y])
    centres = np.array([(1.0, -2.0), (1.05, -2.0)])
    found = clamped_disc_work(centres, np.array([a, 0.35]), places, forces, D=D)
    assert found[0] == pytest.approx(p**2 * np.pi * a**6 / (192.0 * D), rel=1e-12)
    assert found[1] < found[0]


def test_discs_deflect_as_closed_forms_say():
    clamped = disc_centre(10e3, 0.3, D=19230.0, nu=0.3, clamped=True)
    assert clamped == pytest.approx(10e3 * 0.3**4 / 64 / 19230.0)
    held = disc_centre(10e3, 0.3, D=19230.0, nu=0.3, clamped=False)
    # SCENARIOS of the project, S4: a steel disc of radius 300 mm, 10 mm, 10 kPa.
    assert (1e3 * held, 1e3 * clamped) == pytest.approx((0.2683, 0.0658), abs=6e-5)
