"""Judging solved plates: what each limit measures, in which combinations, and laws."""

import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from plates import rectangle

from kplate.adapt import solve
from kplate.combinations import Combination
from kplate.combining import combine
from kplate.errors import InputError
from kplate.extremes import corner_extreme, point_extreme, side_extreme, step
from kplate.judging import Judged, judge, judgements
from kplate.limits import (
    DeflectionLimit,
    Outcome,
    ReactionLimit,
    StepLimit,
    StressLimit,
    StressRangeLimit,
)
from kplate.loads import Case, PointForce, Pressure, RectanglePatch
from kplate.supports import SIMPLY_SUPPORTED

PLATE = rectangle(
    {"south": SIMPLY_SUPPORTED, "east": SIMPLY_SUPPORTED, "west": SIMPLY_SUPPORTED},
    a=1.2,
    thickness=0.02,
)
CASES = [
    Case(name="dead", loads=[Pressure(-500.0)]),
    Case(
        name="foot",
        loads=[RectanglePatch(force=-900.0, centre=(0.6, 0.7), size=(0.2, 0.2))],
    ),
    Case(name="wind", loads=[Pressure(900.0)], reverses=True),
]
STATED = [
    Combination(name="A", factors={"dead": 1.35, "foot": 1.5}, purpose="strength"),
    Combination(name="B", factors={"dead": 1.0, "foot": 1.0}, purpose="service"),
    Combination(name="C", factors={"dead": 1.0, "wind": 1.0}, purpose="service"),
    Combination(name="D", factors={"dead": 0.9, "wind": 1.5}, purpose="uplift"),
]


@pytest.fixture(scope="module")
def solution():
    return solve(PLATE, CASES, tolerance=0.03, combinations=STATED)


def limits(size=1.0):
    """One of each kind, all of the same tightness."""
    return [
        DeflectionLimit(at_most=8e-4 * size),
        StepLimit(along="north", at_most=8e-4 * size),
        StressLimit(criterion="von Mises", strength=5e6 * size, factor=1.5),
        StressLimit(criterion="Tresca", strength=4e6 * size),
        StressLimit(criterion="largest principal", strength=3e6 * size),
        StressRangeLimit(of="stress xx", at_most=3e6 * size),
        ReactionLimit(at="corners", sense="hold-down", at_most=60.0 * size),
        ReactionLimit(at="corners", sense="bearing", at_most=90.0 * size),
        ReactionLimit(at="sides", sense="hold-down", at_most=400.0 * size),
        ReactionLimit(at="sides", sense="bearing", at_most=900.0 * size, only=["east"]),
    ]


def test_each_limit_is_judged_in_the_combinations_of_its_purpose(solution):
    judged = Judged.of(solution, STATED)
    assert judged.names("strength") == ("A",)
    assert judged.names("service") == ("B", "C", "C, wind reversed")
    assert judged.names("uplift") == ("D", "D, wind reversed")
    for judgement in judgements(judged, limits()):
        names = judged.names(judgement.stated.purpose)
        if isinstance(judgement.stated, StressRangeLimit):
            assert judgement.value.case == ""
        else:
            assert judgement.value.case in names
    count = 3 + 3 + 1 + 1 + 1 + 1 + 2 + 1 + 2 + 1
    assert len(judgements(judged, limits())) == count


def test_a_limit_that_no_combination_serves_is_refused(solution):
    with pytest.raises(InputError) as caught:
        judge(solution, limits(), combinations=STATED[:3])
    assert str(caught.value) == (
        "a limit on corner hold-down is judged in combinations for uplift, of which "
        "there are none; add one."
    )


def test_a_limit_on_what_is_not_there_is_refused(solution):
    def refused(limit):
        with pytest.raises(InputError) as caught:
            judge(solution, [limit])
        return str(caught.value)

    assert refused(StepLimit(along="nort", at_most=1.0)) == (
        "there is no side 'nort' to judge the step along; the sides are south, east, "
        "north, west."
    )
    assert refused(StepLimit(along="east", at_most=1.0)) == (
        "side 'east' is simply supported: it does not move; judge the step along a "
        "free side."
    )
    assert refused(
        ReactionLimit(at="points", sense="bearing", at_most=1.0, only=["bolt"])
    ) == ("limit on bearing: 'bolt' is none of the held points; they are none.")


def test_the_unfavourable_end_of_the_band_is_judged(solution):
    verdict = judge(solution, limits(), combinations=STATED)
    for judgement in verdict.judgements:
        value = judgement.value
        most = (
            max(abs(value.lower), abs(value.upper))
            if value.lower is not None
            else (abs(value.value))
        )
        assert judgement.used == pytest.approx(most / judgement.limit)
    # A limit within the band: not proven, whatever the middle says.
    value = judge(solution, limits()[2:3], combinations=STATED).judgements[0].value
    assert value.lower < value.value < value.upper
    inside = StressLimit(
        criterion="von Mises", strength=0.5 * (value.value + value.upper)
    )
    assert judge(solution, [inside], combinations=STATED).outcome is Outcome.NOT_PROVEN


def test_without_combinations_each_case_is_judged_with_every_sign(solution):
    verdict = judge(solution, limits()[:1])
    cases = [judgement.value.case for judgement in verdict.judgements]
    assert cases == ["dead", "foot", "wind", "wind reversed"]
    up, down = (judgement.value for judgement in verdict.judgements[2:])
    assert up.value == pytest.approx(-down.value, rel=1e-9)


@settings(max_examples=20, derandomize=True, deadline=None)
@given(size=st.floats(0.05, 20.0), more=st.floats(1.0, 5.0))
def test_a_larger_limit_never_fails_what_passed(solution, size, more):
    together = Judged.of(solution, STATED)
    for limit in (limits()[0], limits()[2], limits()[6]):
        tight, loose = (
            judgements(together, [_sized(limit, s)]) for s in (size, size * more)
        )
        for a, b in zip(tight, loose, strict=True):
            assert b.outcome <= a.outcome
            assert b.used == pytest.approx(a.used / more)


def _sized(limit, size):
    if isinstance(limit, StressLimit):
        return replace(limit, strength=limit.strength * size)
    return replace(limit, at_most=limit.at_most * size)


@settings(max_examples=6, derandomize=True, deadline=None)
@given(size=st.floats(0.1, 10.0))
def test_scaling_the_loads_scales_every_utilisation(solution, size):
    scaled = [
        replace(own, factors={case: size * f for case, f in own.factors.items()})
        for own in STATED
    ]
    before = judge(solution, limits(), combinations=STATED).judgements
    after = judge(solution, limits(), combinations=scaled).judgements
    for a, b in zip(before, after, strict=True):
        assert b.used == pytest.approx(size * a.used, rel=1e-6, abs=1e-9)


def test_a_step_is_the_largest_deflection_along_the_side(solution):
    found = step(solution, "north", case="foot")
    x = np.linspace(0.0, 1.2, 4001)
    w = solution.deflection(np.column_stack([x, np.ones_like(x)]), case="foot")
    assert abs(found.value) == pytest.approx(np.abs(w).max(), rel=1e-5)
    assert found.value < 0.0
    assert found.place[1] == pytest.approx(1.0)
    assert found.kind == "estimate"
    assert found.lower <= found.value <= found.upper
    with pytest.raises(InputError, match="there is no side 'up'; the sides are south"):
        step(solution, "up", case="foot")


def test_hold_down_and_bearing_are_the_two_senses_of_the_same_force(solution):
    together = combine(solution, STATED)
    for case in together.cases:
        down, corners = corner_extreme(together, "hold-down", case=case)
        up, _ = corner_extreme(together, "bearing", case=case)
        forces = [own.force.value for own in together.reactions(case=case).corners]
        known = [force for force in forces if not math.isnan(force)]
        assert down.value == pytest.approx(max(0.0, -min(known)))
        assert up.value == pytest.approx(max(0.0, max(known)))
        assert all(own.force.value <= -0.99 * down.value for own in corners)
        lines = np.concatenate(
            [own.line_reaction for own in together.reactions(case=case).sides]
        )
        pull, _ = side_extreme(together, "hold-down", case=case)
        push, side = side_extreme(together, "bearing", case=case)
        assert pull.value == pytest.approx(max(0.0, -np.nanmin(lines)))
        assert push.value == pytest.approx(max(0.0, np.nanmax(lines)))
        own, name = side_extreme(together, "bearing", case=case, only=["south"])
        assert name in ("south", "")
        assert own.value <= push.value
        assert (own.value == push.value) == (side == "south")


def test_a_post_is_judged_in_the_sense_it_is_loaded_in():
    plate = replace(
        PLATE,
        outline=PLATE.outline.mark((0.6, 0.5), name="post"),
        supports={**PLATE.supports, "post": SIMPLY_SUPPORTED},
    )
    cases = [
        Case(name="down", loads=[PointForce(force=-100.0, at=(0.6, 0.5))]),
        Case(name="up", loads=[PointForce(force=100.0, at=(0.6, 0.5))]),
    ]
    solution = solve(plate, cases, triangles=300)
    for case, pull, push in (("down", 0.0, 100.0), ("up", 100.0, 0.0)):
        found = point_extreme(solution, "hold-down", case=case)
        assert found[0].value == pytest.approx(pull, abs=1e-6)
        found = point_extreme(solution, "bearing", case=case)
        assert found[0].value == pytest.approx(push, abs=1e-6)
    verdict = judge(
        solution,
        [
            ReactionLimit(at="points", sense="hold-down", at_most=50.0),
            ReactionLimit(at="points", sense="bearing", at_most=150.0),
        ],
    )
    outcomes = [judgement.outcome for judgement in verdict.judgements]
    assert outcomes == [Outcome.PASSES, Outcome.FAILS, Outcome.PASSES, Outcome.PASSES]
    assert verdict.words == "fails: point hold-down"


def test_places_left_out_are_counted_by_what_is_judged(solution):
    """A free corner is no place to judge for a deflection; support changes are."""
    assert judge(solution, limits()[:1]).to_judge == 0
    corners = {c.place for c in solution.excluded}
    assert judge(solution, limits()[2:3]).to_judge == len(corners)
