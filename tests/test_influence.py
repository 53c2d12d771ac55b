"""Influence surfaces: reciprocal, exact under patches, and what handbooks say."""

import numpy as np
import oracles
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from plates import grid, rectangle

from kplate.errors import InputError
from kplate.goals import (
    ClampingMoment,
    Deflection,
    LineReaction,
    MeanDeflection,
    Moment,
    Peak,
    Resultant,
    Shear,
    Slope,
)
from kplate.influence import influence
from kplate.kernelled import kernel_forces, kernelled_on
from kplate.loads import Case, DiscPatch, PointForce, Pressure, RectanglePatch
from kplate.solution import Solution
from kplate.solve.static import solve_static
from kplate.supports import CLAMPED, SIMPLY_SUPPORTED

A, B = 1.2, 1.0
PLATE = rectangle(
    {"west": CLAMPED, "south": SIMPLY_SUPPORTED, "north": SIMPLY_SUPPORTED}, a=A, b=B
)


def solved(*loads, plate=PLATE, n=6, element="quintic"):
    cases = [Case(name=str(k), loads=[load]) for k, load in enumerate(loads)]
    return Solution(
        state=solve_static(plate, grid(n, a=A, b=B), cases, element=element)
    )


INSIDE = st.tuples(st.floats(0.05, A - 0.05), st.floats(0.05, B - 0.05))


@settings(max_examples=20, deadline=None)
@given(a=INSIDE, b=INSIDE, element=st.sampled_from(["quintic", "hct", "dkt"]))
def test_deflection_at_a_by_a_force_at_b_is_that_at_b_by_one_at_a(a, b, element):
    one = solved(PointForce(force=1.0, at=a), element=element)
    other = solved(PointForce(force=1.0, at=b), element=element)
    there, back = one.deflection([b])[0], other.deflection([a])[0]
    size = abs(one.deflection([a])[0])
    assert there == pytest.approx(back, abs=1e-10 * size)
    surface = influence(one, Deflection(at=a))
    assert surface.at([b])[0] == pytest.approx(back, abs=1e-10 * size)


PATCHES = [
    RectanglePatch(force=-1500.0, centre=(0.5, 0.45), size=(0.2, 0.15), angle=0.3),
    RectanglePatch(force=-1500.0, centre=(0.93, 0.2), size=(0.2, 0.2)),
    DiscPatch(force=-700.0, centre=(0.33, 0.71), radius=0.12),
    PointForce(force=-400.0, at=(0.61, 0.52)),
]


@pytest.mark.parametrize(
    ("goal", "direct"),
    [
        (
            Deflection(at=(0.61, 0.37)),
            lambda s, k: s.deflection([(0.61, 0.37)], case=k),
        ),
        (
            Slope(at=(0.61, 0.37), direction=(0.6, 0.8)),
            lambda s, k: s.slopes([(0.61, 0.37)], case=k) @ (0.6, 0.8),
        ),
        (
            Moment(at=(0.61, 0.37), component="m_yy"),
            lambda s, k: s.moments([(0.61, 0.37)], case=k)[:, 1],
        ),
        (
            Moment(at=(0.61, 0.37), component="m_xy"),
            lambda s, k: s.moments([(0.61, 0.37)], case=k)[:, 2],
        ),
        (
            Shear(at=(0.61, 0.37), direction=(1.0, 0.0)),
            lambda s, k: s.shears([(0.61, 0.37)], case=k)[:, 0],
        ),
        (
            ClampingMoment(at=(0.0, 0.4)),
            lambda s, k: s.moments([(1e-12, 0.4)], case=k)[:, 0],
        ),
    ],
)
def test_the_surface_under_a_load_is_the_result_of_that_load(goal, direct):
    solution = solved(*PATCHES)
    surface = influence(solution, goal)
    for k, load in enumerate(PATCHES):
        (exact,) = direct(solution, str(k))
        assert surface.under([load]) == pytest.approx(exact, rel=1e-6)
    both = [direct(solution, str(k))[0] for k in (0, 2)]
    assert surface.under(PATCHES[:3:2]) == pytest.approx(sum(both), rel=1e-6)


def test_a_strips_end_carries_what_a_beams_does():
    """Simply supported at both ends, nu = 0: the push is (1 - x/a) for a force."""
    plate = rectangle(
        {"west": SIMPLY_SUPPORTED, "east": SIMPLY_SUPPORTED}, a=A, b=B, nu=0.0
    )
    solution = solved(*PATCHES, plate=plate)
    surface = influence(solution, Resultant(of="west"))
    x = np.array([0.1, 0.5, 1.0])
    found = surface.at(np.column_stack([x, [0.3, 0.9, 0.5]]))
    np.testing.assert_allclose(found, -(1.0 - x / A), atol=1e-9)
    for load in PATCHES:
        x = load.at[0] if isinstance(load, PointForce) else load.centre[0]
        push = -load.force * (1.0 - x / A)
        assert surface.under([load]) == pytest.approx(push, rel=1e-9)


def test_a_line_reaction_is_its_kernels_and_refuses_loads_on_its_disc():
    solution = solved(*PATCHES)
    goal = LineReaction(at=(0.7, 0.0))
    surface = influence(solution, goal)
    own = kernelled_on(solution.mesh, surface.kernel, 3)
    weights = kernel_forces(solution.system, own)
    far = RectanglePatch(force=-1e3, centre=(0.15, 0.8), size=(0.1, 0.1))
    exact = weights @ solved(far).state.unknowns[:, 0]
    assert surface.under([far]) == pytest.approx(exact, rel=1e-9)
    with pytest.raises(InputError, match="where LineReaction is asked for; solve"):
        surface.under([PointForce(force=1.0, at=(0.7, 0.1))])


def test_a_line_reaction_under_even_pressure_is_levys():
    """Navier's plate: v_n at mid-side, the load on the kernel's disc counted too."""
    plate = rectangle(SIMPLY_SUPPORTED, a=A, b=B)
    solution = solved(Pressure(-1e3), plate=plate, n=10)
    surface = influence(solution, LineReaction(at=(0.6, 0.0)))
    load = oracles.LinearPressure(at_origin=-1e3)
    state = oracles.navier([(0.6, 0.0)], (A, B), load)
    exact = float(np.abs(state.effective_shears[0, 1]))
    assert surface.under([Pressure(-1e3)]) == pytest.approx(exact, rel=2e-3)


def test_a_mean_is_the_integral():
    solution = solved(Pressure(-1e3))
    surface = influence(solution, MeanDeflection())
    mean = solution.load_work() / solution.load_force()
    assert surface.under([Pressure(-1e3)]) == pytest.approx(mean, rel=1e-9)


def test_the_surface_of_the_middle_is_naviers():
    """Deflection at the centre by a force anywhere, double sine series."""
    plate = rectangle(SIMPLY_SUPPORTED, a=A, b=B)
    surface = influence(
        solved(Pressure(1.0), plate=plate, n=8), Deflection(at=(0.6, 0.5))
    )
    places = np.array([(0.2, 0.3), (0.6, 0.5), (1.0, 0.8)])
    load = oracles.PointForce(at=(0.6, 0.5), force=1.0)
    exact = oracles.navier(places, (A, B), load).w / 1e4
    np.testing.assert_allclose(surface.at(places), exact, rtol=2e-3)
    points, values, triangles = surface.sampled()
    assert values[np.argmax(values)] == pytest.approx(exact[1], rel=2e-3)
    np.testing.assert_allclose(surface.at(points[::50]), values[::50], atol=1e-15)
    corners = points[triangles]
    first, second = corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]
    twice = first[:, 0] * second[:, 1] - first[:, 1] * second[:, 0]
    assert 0.5 * twice.sum() == pytest.approx(A * B)


def test_what_has_no_surface_is_refused():
    solution = solved(Pressure(1.0))
    with pytest.raises(InputError, match="does not follow from forces linearly"):
        influence(solution, Peak(quantity="von Mises"))
    with pytest.raises(InputError, match="surface: east does not hold the deflection"):
        influence(solution, Resultant(of="east"))
    with pytest.raises(InputError, match="'west' has no influence surface: west meets"):
        influence(solution, Resultant(of="west"))
    with pytest.raises(InputError, match="smoothed and have no influence surface"):
        influence(
            solved(Pressure(1.0), element="dkt"),
            Moment(at=(0.5, 0.5), component="m_xx"),
        )
    with pytest.raises(InputError, match="shears of a Hsieh-Clough-Tocher"):
        influence(
            solved(Pressure(1.0), element="hct"),
            Shear(at=(0.5, 0.4), direction=(1.0, 0.0)),
        )
