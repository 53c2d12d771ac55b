"""Reactions by side and corner against series, statics and handbook coefficients."""

import numpy as np
import oracles
import pytest
from hypothesis import given
from hypothesis import strategies as st
from plates import SIDES, grid, rectangle, solved

from kplate.adapt import solve
from kplate.loads import Case, Hydrostatic, PointForce, Pressure, RectanglePatch
from kplate.materials import STEEL
from kplate.outline import Outline
from kplate.plate import Plate
from kplate.reactions import hold_down
from kplate.shapes import Circle
from kplate.supports import CLAMPED, SIMPLY_SUPPORTED

DOWN = oracles.LinearPressure(at_origin=-1.0)


@pytest.fixture(scope="module")
def square():
    """Simply supported, pressed down by 1 Pa; about 10,000 unknowns."""
    return solve(rectangle(SIMPLY_SUPPORTED), [Pressure(-1.0)], triangles=6500)


def test_mid_edge_reaction_of_the_square(square):
    """Series: 0.420471 p a.

    Timoshenko and Woinowsky-Krieger 1959, Table 8, print 0.420 (from memory).
    """
    assert 9_000 < 3 * len(square.mesh.points) < 11_000
    for side in square.reactions().sides:
        middle = np.hypot(*(side.stations - 0.5).T).argmin()
        assert side.line_reaction[middle] == pytest.approx(0.420471, rel=0.02)


def test_line_reaction_follows_the_series_along_a_side(square):
    side = square.reactions().sides[0]
    x = side.stations[:, 0]
    middle = np.abs(x - 0.5) < 0.35
    points = np.column_stack([x, np.zeros_like(x)])[middle]
    exact = -oracles.navier(points, (1.0, 1.0), DOWN).effective_shears[:, 1]
    ratio = side.line_reaction[middle] / exact
    assert ratio.mean() == pytest.approx(1.0, abs=0.005)
    np.testing.assert_allclose(ratio, 1.0, atol=0.02)


def test_corners_of_a_plate_pressed_down_must_be_held_down(square):
    """0.0649647 p a^2: series; the handbook prints 0.065."""
    exact = oracles.navier_corner_forces((1.0, 1.0), DOWN)
    forces = square.reactions().corners
    assert [f.corner.place for f in forces] == [(0, 0), (1, 0), (1, 1), (0, 1)]
    found = np.array([f.force.value for f in forces])
    np.testing.assert_allclose(found, exact, rtol=0.005)
    assert (found < 0.0).all()
    most, where = hold_down(forces)
    assert most == pytest.approx(0.0649647, rel=0.005)
    assert 1 <= len(where) <= 4


def test_sides_and_corners_add_up_to_the_load(square):
    reactions = square.reactions()
    for name in ("force", "moment_x", "moment_y"):
        parts = sum(getattr(side.resultant, name) for side in reactions.sides)
        x, y = 0.0, 0.0
        for corner in reactions.corners:
            x, y = corner.corner.place
            arm = {"force": 1.0, "moment_x": y, "moment_y": -x}[name]
            parts += arm * corner.force.value
        assert parts == pytest.approx(-getattr(reactions.load, name), abs=1e-12)
        assert parts == pytest.approx(getattr(reactions.total, name), abs=1e-12)
    assert reactions.imbalance < 1e-12


def test_clamping_moment_from_the_equations():
    """0.0513338 p a^2: superposition; the handbook prints 0.0513."""
    solution = solve(rectangle(CLAMPED), [Pressure(1.0)], triangles=6500)
    exact = oracles.clamped_rectangle([(0.0, 0.5)], (1.0, 1.0), _up()).moments[0, 0]
    for side in solution.reactions().sides:
        middle = np.hypot(*(side.stations - 0.5).T).argmin()
        assert side.line_moment[middle] == pytest.approx(exact, rel=0.01)
    assert solution.reactions().corners == ()


def _up():
    return oracles.LinearPressure(at_origin=1.0)


def test_simply_supported_sides_bring_no_moment(square):
    for side in square.reactions().sides:
        np.testing.assert_array_equal(side.line_moment, 0.0)


def test_a_cantilever_takes_force_and_moment_at_its_root():
    """Statics: p a^2 and p a^3/2 about the root, whatever Poisson's ratio."""
    solution = solved(rectangle({"west": CLAMPED}), grid(8), Pressure(-3.0))
    (root,) = solution.reactions().sides
    assert root.resultant.force == pytest.approx(3.0, rel=1e-10)
    assert root.resultant.moment_x == pytest.approx(1.5, rel=1e-10)
    assert root.resultant.moment_y == pytest.approx(-1.5, rel=1e-10)


def test_water_on_a_wall_reacts_as_statics_has_it():
    """A wall held all round: totals 1/2 g b^2 a, and g b^3 a/6 about the bottom."""
    a, b, weight = 1.2, 0.9, 9810.0
    solution = solved(
        rectangle(CLAMPED, a=a, b=b),
        grid(8, a=a, b=b),
        Hydrostatic(level=b, specific_weight=weight),
    )
    total = solution.reactions().total
    assert total.force == pytest.approx(-weight * b**2 * a / 2, rel=1e-10)
    assert total.moment_x == pytest.approx(-weight * b**3 * a / 6, rel=1e-10)
    assert total.moment_y == pytest.approx(weight * b**2 * a**2 / 4, rel=1e-10)


@given(st.integers(0, 10_000))
def test_random_supports_and_loads_balance(seed):
    rng = np.random.default_rng(seed)
    sides = rng.permutation(SIDES)[: rng.integers(2, 5)]
    supports = {s: (CLAMPED, SIMPLY_SUPPORTED)[rng.integers(2)] for s in sides}
    loads = [
        Pressure(rng.normal()),
        PointForce(force=rng.normal(), at=tuple(rng.random(2))),
        RectanglePatch(force=rng.normal(), centre=(0.5, 0.4), size=(0.3, 0.21)),
    ]
    reactions = solved(rectangle(supports), grid(4), *loads).reactions()
    assert reactions.imbalance < 1e-12
    for name in ("force", "moment_x", "moment_y"):
        balance = getattr(reactions.load, name) + getattr(reactions.total, name)
        assert balance == pytest.approx(0.0, abs=1e-11)


def test_a_supported_hole_rim_is_a_side_of_its_own():
    """A disc on an inner ring: the ring carries all; statics."""
    ring = Circle(centre=(0.0, 0.0), radius=0.3, name="ring")
    plate = Plate(
        outline=Outline.circle((0.0, 0.0), radius=1.0).cut(ring),
        thickness=0.01,
        material=STEEL,
        supports={"ring": CLAMPED},
    )
    solution = solve(plate, [Pressure(-1e3)], triangles=3000)
    (side,) = solution.reactions().sides
    assert side.side == "ring"
    assert side.resultant.force == pytest.approx(1e3 * plate.outline.area, rel=1e-10)
    load = 1e3 * np.pi * (1.0 - 0.3**2)
    around = 2 * np.pi * 0.3
    ratio = side.line_reaction[:-1] / (load / around)
    assert ratio.mean() == pytest.approx(1.0, abs=0.005)
    assert ratio.std() < 0.03


def test_an_unbounded_corner_has_no_force_but_its_reason():
    plate = Plate(
        outline=Outline.polygon([(0, 0), (2, 0), (1, 1)], sides=["a", "b", "c"]),
        thickness=0.01,
        material=STEEL,
        supports=dict.fromkeys("abc", SIMPLY_SUPPORTED),
    )
    blunt = Plate(
        outline=Outline.polygon([(0, 0), (2, 0), (1, 0.5)], sides=["a", "b", "c"]),
        thickness=0.01,
        material=STEEL,
        supports=dict.fromkeys("abc", SIMPLY_SUPPORTED),
    )
    known = solve(plate, [Pressure(-1e3)], triangles=2000).reactions()
    assert not any(np.isnan(f.force.value) for f in known.corners)
    reactions = solve(blunt, [Pressure(-1e3)], triangles=2000).reactions()
    (unbounded,) = [f for f in reactions.corners if np.isnan(f.force.value)]
    assert unbounded.corner.place == (1.0, 0.5)
    assert unbounded.force.reason.startswith(
        "no finite value: corner of 126.9 degrees, simply supported to simply supported"
    )
    forces = sum(s.resultant.force for s in reactions.sides)
    forces += sum(np.nan_to_num(f.force.value) for f in reactions.corners)
    assert forces == pytest.approx(reactions.total.force, rel=1e-10)
    b, c = reactions.sides[1], reactions.sides[2]
    assert np.isnan(b.line_reaction[-1])
    assert np.isnan(c.line_reaction[0])


def test_a_side_in_two_stretches_lists_both():
    """One name on two opposite sides: both stretches, distance going on."""
    outline = Outline.polygon([(0, 0), (1, 0), (1, 1), (0, 1)], sides=list("abac"))
    plate = Plate(
        outline=outline,
        thickness=0.01,
        material=STEEL,
        supports={"a": SIMPLY_SUPPORTED},
    )
    case = Case(name="p", loads=[Pressure(-1.0)])
    (side,) = solve(plate, [case], size=0.2).reactions().sides
    assert side.distance[-1] == pytest.approx(2.0)
    assert (np.diff(side.distance) >= 0.0).all()
    assert set(np.round(side.stations[:, 1], 9)) == {0.0, 1.0}
    assert side.resultant.force == pytest.approx(1.0, rel=0.2)
