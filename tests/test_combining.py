"""Superposition against brute force: each combination solved as a case of its own."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from plates import rectangle

from kplate.adapt import solve
from kplate.bands import certify
from kplate.combinations import Combination, combined_cases, expanded
from kplate.combining import combine, combined
from kplate.errors import InputError
from kplate.functionals import functional
from kplate.goals import (
    ClampingMoment,
    Deflection,
    LineReaction,
    Moment,
    Peak,
    Resultant,
)
from kplate.loads import Case, Hydrostatic, PointForce, Pressure, RectanglePatch
from kplate.peaks import QUANTITIES
from kplate.supports import CLAMPED, SIMPLY_SUPPORTED

PLATE = rectangle(
    {"south": CLAMPED, "east": SIMPLY_SUPPORTED, "north": SIMPLY_SUPPORTED}, a=1.5
)
CASES = [
    Case(name="dead", loads=[Pressure(-500.0)]),
    Case(
        name="live",
        loads=[
            RectanglePatch(force=-1500.0, centre=(0.7, 0.6), size=(0.2, 0.2)),
            PointForce(force=-40.0, at=(0.0, 1.0)),  # at a corner
        ],
    ),
    Case(name="water", loads=[Hydrostatic(level=0.6, specific_weight=3e3)]),
    Case(name="wind", loads=[Pressure(1000.0)], reverses=True),
]
GOALS = [
    Deflection(at=(0.4, 0.5)),
    Moment(at=(0.4, 0.5), component="m_xy"),
    ClampingMoment(at=(0.9, 0.0)),
    LineReaction(at=(0.5, 1.0)),
    Resultant(of="south"),
]


def combination(name, *factors):
    names = [case.name for case in CASES]
    return Combination(
        name=name, factors=dict(zip(names, factors, strict=True)), purpose="every"
    )


STATED = [
    combination("A", 1.35, 1.5, 0.0, 0.0),
    combination("B", 0.9, 0.0, 0.0, 1.5),
    combination("C", 1.0, 1.0, -1.0, 0.6),
]


@pytest.fixture(scope="module")
def both():
    """Combined, and each combination solved as a case, on the same mesh."""
    cases = [CASES[0], CASES[1], CASES[2], CASES[3]]
    alone = combined_cases(cases, expanded(cases, STATED))
    unit = solve(PLATE, cases, triangles=600, balanced=True)
    brute = solve(PLATE, alone, triangles=600, balanced=True)
    np.testing.assert_array_equal(unit.mesh.points, brute.mesh.points)
    return combine(unit, STATED), brute


def test_fields_are_those_of_a_case_of_its_own(both):
    together, brute = both
    assert together.cases == brute.cases
    assert len(together.cases) == 5
    for name in ("unknowns", "forces", "support_forces"):
        own, other = getattr(together.state, name), getattr(brute.state, name)
        for a, b in zip(own.T, other.T, strict=True):
            np.testing.assert_allclose(a, b, atol=2e-10 * np.abs(b).max())
    moments, wanted = together.dual.moments, brute.dual.moments
    for k in range(5):
        size = np.abs(wanted[..., k]).max()
        np.testing.assert_allclose(moments[..., k], wanted[..., k], atol=1e-9 * size)


@pytest.mark.parametrize("quantity", QUANTITIES)
def test_peaks_and_their_bands_are_found_inside_each_combination(both, quantity):
    for name in both[0].cases:
        own, other = (x.peak(quantity, case=name) for x in both)
        assert own.kind == other.kind == "estimate"
        for key in ("value", "lower", "upper"):
            assert getattr(own, key) == pytest.approx(getattr(other, key), rel=1e-8)


def test_reactions_corner_forces_and_balance_follow(both):
    for name in both[0].cases:
        own, other = (x.reactions(case=name) for x in both)
        assert own.imbalance < 1e-11
        size = other.magnitude
        for a, b in zip(own.sides, other.sides, strict=True):
            assert a.resultant.force == pytest.approx(
                b.resultant.force, abs=1e-10 * size
            )
            np.testing.assert_allclose(
                a.line_reaction, b.line_reaction, atol=1e-8 * size
            )
        for a, b in zip(own.corners, other.corners, strict=True):
            assert a.force.value == pytest.approx(
                b.force.value, abs=1e-9 * size, nan_ok=True
            )


FACTOR = st.floats(-2.0, 2.0).map(lambda f: round(f, 3))


@pytest.fixture(scope="module")
def mesh():
    return solve(PLATE, CASES[:1], triangles=150).mesh


@settings(max_examples=15, derandomize=True, deadline=None)
@given(factors=st.lists(FACTOR, min_size=3, max_size=3).filter(any))
def test_a_bound_of_any_combination_is_that_of_a_case_of_its_own(mesh, factors):
    cases = [CASES[0], CASES[2], CASES[3]]
    goals = [functional(PLATE, mesh, goal, cases) for goal in GOALS[1:]]
    own = Combination(
        name="own",
        factors=dict(zip((case.name for case in cases), factors, strict=True)),
        purpose="every",
    )
    unit = certify(PLATE, mesh, cases, goals, element="quintic")
    alone = certify(PLATE, mesh, combined_cases(cases, [own]), goals, element="quintic")
    table = np.array(factors)[:, None]
    rows = unit.brackets.values(table, ["own"])
    for (value,), (wanted,) in zip(rows, alone.values, strict=True):
        assert value.kind == wanted.kind
        assert value.reason == wanted.reason
        if value.kind == "none":
            continue
        width = wanted.upper - wanted.lower
        # Oscillation and round-off are added up by their sizes, never less.
        assert value.upper - value.lower >= width * (1.0 - 1e-4)
        assert value.lower == pytest.approx(wanted.lower, abs=1e-2 * width)
        assert value.upper == pytest.approx(wanted.upper, abs=1e-2 * width)


def test_goals_are_inside_the_tolerance_in_combinations():
    """Dead load and wind nearly cancel: the cases' own bands would be too wide."""
    cases = [CASES[0], CASES[3]]
    nearly = [
        Combination(name="A", factors={"dead": 1.0, "wind": 0.45}, purpose="service")
    ]
    goals = [Peak(quantity="deflection"), Peak(quantity="von Mises"), GOALS[0]]
    solution = solve(PLATE, cases, tolerance=0.01, goals=goals, combinations=nearly)
    together = combine(solution, nearly)
    assert solution.reached
    assert together.cases == ("A", "A, wind reversed")
    for name in together.cases:
        there = together.value(GOALS[0], case=name)
        assert there.kind == "bound"
        assert there.upper - there.lower <= 2.0 * 0.01 * abs(there.value)
        peak = together.value(goals[1], case=name)
        assert peak.upper - peak.lower <= 2.0 * 0.01 * abs(peak.value)
    energies = [energy.value for energy in together.energies]
    np.testing.assert_allclose(energies, together.state.strain_energy)
    assert all(energy.upper >= energy.value for energy in together.energies)


def test_a_bound_of_a_combination_holds_that_of_a_finer_mesh():
    cases = [CASES[0], CASES[3]]
    stated = [
        Combination(name="A", factors={"dead": 1.0, "wind": 0.45}, purpose="service")
    ]
    coarse, fine = (
        combine(
            solve(PLATE, cases, tolerance=t, goals=GOALS[:4], combinations=stated),
            stated,
        )
        for t in (0.2, 0.002)
    )
    for name in coarse.cases:
        for goal in GOALS[:4]:
            wide, narrow = coarse.value(goal, case=name), fine.value(goal, case=name)
            assert wide.kind == narrow.kind == "bound"
            assert wide.lower <= narrow.lower
            assert narrow.upper <= wide.upper


def test_nothing_to_combine_is_refused():
    solution = solve(PLATE, CASES[:1], triangles=100)
    with pytest.raises(InputError) as caught:
        combine(solution, [])
    assert str(caught.value) == (
        "there is nothing to combine; give at least one combination."
    )
    (alone,) = combined(
        solution, [Combination(name="x", factors={"dead": 2.0}, purpose="every")]
    ).cases
    assert alone == "x"
