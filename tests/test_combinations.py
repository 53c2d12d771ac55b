"""Combinations: what stands for what, and what is refused."""

import itertools

import numpy as np
import pytest

from kplate.combinations import (
    PRESETS,
    Combination,
    combined_cases,
    expanded,
    factor_table,
    preset_combinations,
    scaled,
)
from kplate.errors import InputError
from kplate.loads import (
    Case,
    DiscPatch,
    EdgeMoment,
    Hydrostatic,
    LineForce,
    PointForce,
    PointMoment,
    Pressure,
    PressureField,
    RectanglePatch,
    SelfWeight,
)

WEIGHT = Case(name="weight", loads=[SelfWeight()])
CROWD = Case(name="crowd", loads=[Pressure(-5e3)])
WIND = Case(name="wind", loads=[Pressure(800.0)], reverses=True)
SNOW = Case(name="snow", loads=[Pressure(-700.0)], reverses=True)


def gust(**factors):
    return Combination(name="gust", factors=factors, purpose="uplift")


def test_a_case_that_reverses_stands_for_both_its_signs():
    found = expanded([WEIGHT, WIND], [gust(weight=0.9, wind=1.5)])
    assert [own.name for own in found] == ["gust", "gust, wind reversed"]
    assert [dict(own.factors) for own in found] == [
        {"weight": 0.9, "wind": 1.5},
        {"weight": 0.9, "wind": -1.5},
    ]
    both = expanded([WIND, SNOW], [gust(wind=1.0, snow=0.5)])
    signs = {(own.factors["wind"], own.factors["snow"]) for own in both}
    assert signs == {(1.0, 0.5), (1.0, -0.5), (-1.0, 0.5), (-1.0, -0.5)}
    assert both[3].name == "gust, wind and snow reversed"


def test_a_case_that_does_not_act_is_not_reversed():
    assert len(expanded([WEIGHT, WIND], [gust(weight=1.0, wind=0.0)])) == 1


def test_without_combinations_each_case_stands_for_itself():
    assert expanded([WEIGHT, CROWD], []) == ()
    found = expanded([WEIGHT, WIND], [])
    assert [own.name for own in found] == ["weight", "wind", "wind reversed"]
    assert {own.purpose for own in found} == {"every"}


def test_factors_stand_case_by_case():
    table = factor_table([WEIGHT, CROWD, WIND], [gust(wind=1.5, weight=0.9)])
    np.testing.assert_array_equal(table, [[0.9], [0.0], [1.5]])


@pytest.mark.parametrize(
    "load",
    [
        Pressure(3.0, zone="pad"),
        Hydrostatic(level=1.0, specific_weight=9.81e3),
        RectanglePatch(force=4.0, centre=(1, 2), size=(1, 1), angle=0.1),
        DiscPatch(force=4.0, centre=(1, 2), radius=1.0),
        PointForce(force=4.0, at=(1, 2)),
        PointMoment(moment=(4.0, -5.0), at=(1, 2)),
        LineForce(force=4.0, along="rib"),
        EdgeMoment(moment=4.0, along="east"),
        SelfWeight(),
    ],
    ids=lambda load: type(load).__name__,
)
def test_a_load_is_scaled_in_its_one_amount(load):
    assert scaled(scaled(load, -2.0), -0.5) == load
    changed = [
        key
        for key, value in vars(load).items()
        if vars(scaled(load, 3.0))[key] != value
    ]
    assert len(changed) == 1
    np.testing.assert_allclose(
        vars(scaled(load, 3.0))[changed[0]], 3.0 * np.array(vars(load)[changed[0]])
    )


def test_a_pressure_that_is_a_function_is_scaled_too():
    load = scaled(PressureField(lambda x, y: x + 2.0 * y), -3.0)
    assert load.function(np.array([1.0]), np.array([2.0])) == pytest.approx([-15.0])


def test_a_combination_is_a_case_with_scaled_loads():
    (case,) = combined_cases([WEIGHT, CROWD, WIND], [gust(crowd=2.0, wind=-0.5)])
    assert case == Case(name="gust", loads=[Pressure(-10e3), Pressure(-400.0)])


def test_a_preset_makes_every_choice_of_adverse_and_helpful():
    """EN 1990, STR 1.35/1.00/1.50 and EQU 1.10/0.90/1.50 (read in a public copy)."""
    found = preset_combinations("EN 1990 STR", permanent=["g"], variable=["q", "s"])
    assert len(found) == 8
    assert {own.purpose for own in found} == {"strength"}
    choices = {tuple(own.factors.values()) for own in found}
    assert choices == set(itertools.product((1.35, 1.0), (0.0, 1.5), (0.0, 1.5)))
    assert found[5].words == "1 g + 1.5 q"
    alone = preset_combinations("EN 1990 EQU", variable=["w"])
    assert [dict(own.factors) for own in alone] == [{"w": 1.5}]
    service = preset_combinations(
        "EN 1990 characteristic", permanent=["g"], variable=["q"]
    )
    assert [own.words for own in service] == ["1 g", "1 g + 1 q"]
    assert all("from memory: check" in own.source for own in service)
    for name, preset in PRESETS.items():
        assert preset.source.startswith(name[:7])


def test_mistakes_are_named():
    with pytest.raises(InputError) as caught:
        Combination(name="", factors={"a": 1.0}, purpose="service")
    assert str(caught.value) == "a combination has no name; give it one."
    with pytest.raises(InputError) as caught:
        gust(wind=0.0)
    assert str(caught.value) == (
        "combination 'gust' has no factor but 0; give at least one."
    )
    with pytest.raises(InputError, match="factor of case 'wind' is nan; it must"):
        gust(wind=float("nan"))
    with pytest.raises(InputError) as caught:
        Combination(name="A", factors={"a": 1.0}, purpose="ULS")
    assert str(caught.value) == (
        "combination 'A': purpose 'ULS'; it must be one of strength, service, uplift, "
        "every."
    )
    with pytest.raises(InputError) as caught:
        expanded([WEIGHT], [gust(snow=1.0)])
    assert str(caught.value) == (
        "combination 'gust' names case 'snow'; the cases are weight."
    )
    with pytest.raises(InputError) as caught:
        expanded([WEIGHT], [gust(weight=1.0), gust(weight=0.9)])
    assert str(caught.value) == (
        "2 combinations are called 'gust'; each needs a name of its own."
    )
    many = [
        Combination(name=f"C{i}", factors={"weight": 1.0}, purpose="service")
        for i in range(201)
    ]
    with pytest.raises(InputError, match="there are more than 200 combinations"):
        expanded([WEIGHT], many)
    with pytest.raises(InputError, match="there is no preset 'EN 1991'; the presets a"):
        preset_combinations("EN 1991", permanent=["g"])
    with pytest.raises(InputError, match="preset EN 1990 STR has no cases"):
        preset_combinations("EN 1990 STR")
