"""Thicknesses chosen: whole decisions, and the law against solving each anew.

Check values: Navier and Ritz series of the project's own scenarios S1, S2 and S8.
"""

from dataclasses import replace
from functools import cache
from pathlib import Path

import plates
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from kplate.adapt import solve
from kplate.combinations import Combination
from kplate.errors import InputError
from kplate.extremes import corner_extreme
from kplate.judging import Judged, judgements
from kplate.limits import (
    DeflectionLimit,
    ReactionLimit,
    StressLimit,
)
from kplate.loads import STANDARD_GRAVITY, Case, Pressure, RectanglePatch, SelfWeight
from kplate.materials import STEEL
from kplate.outline import Outline
from kplate.panel import read_panel
from kplate.plate import Plate, Section
from kplate.shapes import Rectangle
from kplate.sizing import allowed_at, size, steel_strength
from kplate.solution import Solution
from kplate.solve.static import solve_static
from kplate.stock import Stock
from kplate.supports import SIMPLY_SUPPORTED
from kplate.validity import State

MESHES = Path(__file__).parents[1] / "meshes"
LIMITS = (
    DeflectionLimit(at_most=0.003),
    StressLimit(criterion="von Mises", strength=235e6, factor=1.5),
    ReactionLimit(at="corners", sense="hold-down", at_most=400.0),
)
WHEEL = RectanglePatch(force=-1.5e3, centre=(0.4, 0.3), size=(0.2, 0.2))
CROWD = Pressure(-5e3)


def millimetres(*thicknesses, **allowances):
    return Stock(thicknesses=tuple(1e-3 * h for h in thicknesses), **allowances)


def cover(h=0.006, **other):
    outline = Outline.polygon(
        [(0, 0), (0.8, 0), (0.8, 0.6), (0, 0.6)], sides=plates.SIDES
    )
    return Plate(
        outline=outline,
        thickness=h,
        material=STEEL,
        supports=dict.fromkeys(plates.SIDES, SIMPLY_SUPPORTED),
        **other,
    )


def sized(name, *stock):
    panel = read_panel(MESHES / name)
    return size(
        panel.plate,
        panel.cases,
        panel.limits,
        millimetres(*stock),
        combinations=panel.combinations,
        held_in_plane=panel.held_in_plane,
    )


def peaks(found, quantity, case):
    return [
        abs(own.judged.solution.peak(quantity, case=case).value) for own in found.sizes
    ]


def test_pit_cover_takes_5_mm_with_a_flag_and_6_mm_without():
    """S1: 800 x 600, simply supported, 5 kPa or 1.5 kN on 200 x 200 mm."""
    found = sized("pit-cover.toml", 3, 4, 5, 6, 8, 10)
    assert found.solves == 1
    series = {
        "uniform": [8.273, 3.490, 1.787, 1.034, 0.436, 0.223],
        "wheel": [13.254, 5.591, 2.863, 1.657, 0.699, 0.358],
    }
    for case, w in series.items():
        expected = [1e-3 * own for own in w]
        assert peaks(found, "deflection", case) == pytest.approx(expected, rel=2e-3)
    stress = [1e6 * own for own in (172, 97, 62, 43, 24, 15.5)]
    assert peaks(found, "von Mises", "wheel") == pytest.approx(stress, rel=0.012)
    at_corner = peaks(found, "von Mises", "uniform")[2]
    assert at_corner == pytest.approx(30.4e6, rel=2e-3)
    for own in found.sizes:
        solution = own.judged.solution
        for case, pull in (("wheel", 155.2), ("uniform", 146.1)):
            value = corner_extreme(solution, "hold-down", case=case)[0].value
            assert value == pytest.approx(pull, rel=3e-3)
        assert own.hold_down.value == pytest.approx(155.2, rel=1e-3)
        assert own.governs.quantity == "peak deflection"
        assert own.governs.value.case == "wheel"
        assert own.mass == pytest.approx(0.48 * own.nominal * 7850.0)
    assert [own.passes for own in found.sizes] == [False, False, True, True, True, True]
    assert found.thinnest.nominal == 0.005
    assert found.thinnest.validity.largest_deflection == pytest.approx(0.57, abs=0.005)
    assert found.thinnest.verdict.words == "passes, theory flagged"
    assert found.thinnest_clean.nominal == 0.006
    # By the series the wheel's 2.8633 mm at 5 mm are 3 mm at 5 (2.8633 / 3)^(1/3) mm.
    assert found.changes == pytest.approx((5e-3 * (2.8633 / 3.0) ** (1 / 3),), rel=1e-3)
    assert found.thinnest.load_factor == pytest.approx(3.0 / 2.863, rel=2e-3)


def test_tank_wall_takes_6_mm():
    """S2: clamped 1200 x 900, water; foot edge 309.6 N, w 1.3832 mm at 6 mm."""
    found = sized("tank-wall.toml", 6, 8, 10)
    case = found.sizes[0].judged.solution.cases[0]
    centre = [
        1e3 * abs(own.judged.solution.deflection([(0.6, 0.45)])[0])
        for own in found.sizes
    ]
    assert centre == pytest.approx([1.3716, 0.5786, 0.2963], rel=1e-3)
    assert peaks(found, "deflection", case)[0] == pytest.approx(1.3832e-3, rel=1e-3)
    assert peaks(found, "largest principal", case)[0] == pytest.approx(51.6e6, rel=2e-3)
    first = found.thinnest
    assert first is found.thinnest_clean
    assert first.nominal == 0.006
    assert first.validity.largest_deflection == pytest.approx(0.23, abs=0.002)
    total = first.judged.solution.reactions().total
    assert abs(total.force) == pytest.approx(4767.7, rel=1e-3)
    assert first.hold_down.value == 0.0
    assert found.changes[0] < 0.006


def test_pane_takes_6_mm_conservatively_and_8_mm_clean():
    """S8: float glass 1500 x 1000, wind 1 kPa; corners need holding both ways."""
    found = sized("pane.toml", 6, 8, 10)
    case = found.sizes[0].judged.solution.cases[0]
    w = [1e-3 * own for own in (5.81, 2.45, 1.25)]
    assert peaks(found, "deflection", case) == pytest.approx(w, rel=4e-3)
    stress = [1e6 * own for own in (13.20, 7.42, 4.75)]
    assert peaks(found, "largest principal", case) == pytest.approx(stress, rel=1e-3)
    for own in found.sizes:
        assert own.hold_down.value == pytest.approx(94.4, rel=4e-3)
    assert found.thinnest.nominal == 0.006
    assert found.thinnest.validity.state is State.CONSERVATIVE
    assert "conservative for the deflection" in " ".join(found.thinnest.validity.words)
    assert "Corners need holding both ways" in " ".join(found.thinnest.validity.words)
    assert found.thinnest_clean.nominal == 0.008


@cache
def weighed(under=0.0):
    """Self-weight, two cases and two combinations, one of them lifting."""
    cases = (
        Case(name="dead", loads=[SelfWeight()]),
        Case(name="crowd", loads=[CROWD]),
        Case(name="lift", loads=[Pressure(600.0)]),
    )
    both = (
        Combination(name="full", factors={"dead": 1.35, "crowd": 1.5}, purpose="every"),
        Combination(name="up", factors={"dead": 0.9, "lift": 1.5}, purpose="every"),
    )
    stock = millimetres(3, 4, 6, 9, under_tolerance=under)
    return cases, both, size(cover(), cases, LIMITS, stock, combinations=both)


@pytest.mark.slow
def test_sizes_by_the_law_are_those_solved_anew():
    """On the same mesh: w to 1e-9, what is judged with it; weight of the nominal h."""
    under = 0.3e-3
    cases, both, found = weighed(under)
    assert found.solves == 1
    for own in found.sizes:
        assert own.net == pytest.approx(own.nominal - under)
        heavier = own.nominal / own.net
        heavy = [
            replace(
                cases[0],
                loads=[SelfWeight(acceleration=-STANDARD_GRAVITY * heavier)],
            ),
            *cases[1:],
        ]
        mesh = own.judged.solution.mesh
        state = solve_static(cover(own.net), mesh, heavy, element="quintic")
        judged = Judged.of(Solution(state=state), both)
        expected = judgements(judged, LIMITS)
        assert len(expected) == len(own.verdict.judgements) == 6
        for a, b in zip(own.verdict.judgements, expected, strict=True):
            assert (a.quantity, a.value.case) == (b.quantity, b.value.case)
            near = 1e-9 if a.quantity == "peak deflection" else 1e-8
            assert a.value.value == pytest.approx(b.value.value, rel=near, abs=1e-9)
            assert a.limit == b.limit
    gravity = own.judged.solution.load_force(case="full")
    assert gravity == pytest.approx(
        -0.48 * (1.35 * 7850.0 * own.nominal * STANDARD_GRAVITY + 1.5 * 5e3), rel=1e-9
    )


@settings(max_examples=4, deadline=None)
@given(st.floats(0.2, 3.0))
def test_load_factor_brings_the_plate_to_its_limit(share):
    """Loads but the self-weight times it: utilisation just below 1."""
    limits = tuple(
        replace(limit, at_most=share * limit.at_most)
        for limit in LIMITS
        if isinstance(limit, DeflectionLimit)
    )
    cases = [Case(name="sum", loads=[SelfWeight(), CROWD])]
    found = size(cover(), cases, limits, millimetres(3, 6), triangles=60)
    for own in found.sizes:
        factor = own.load_factor
        heavy = [Case(name="sum", loads=[SelfWeight(), Pressure(factor * CROWD.value)])]
        again = size(
            cover(), heavy, limits, millimetres(own.nominal * 1e3), triangles=60
        )
        used = again.sizes[0].governs.used
        assert used <= 1.0 + 1e-9
        assert used == pytest.approx(1.0, abs=3e-3)


def test_a_weight_that_fails_alone_leaves_no_load_factor():
    limits = (DeflectionLimit(at_most=1e-6),)
    cases = [Case(name="sum", loads=[SelfWeight(), CROWD])]
    found = size(cover(), cases, limits, millimetres(3), triangles=60)
    assert found.sizes[0].load_factor == 0.0
    given = size(
        cover(), [Case(name="p", loads=[CROWD])], limits, millimetres(3), triangles=60
    )
    own = given.sizes[0]
    assert own.load_factor == pytest.approx(1.0 / own.governs.used, rel=1e-12)
    alone = [Case(name="w", loads=[SelfWeight()])]
    easy = size(
        cover(), alone, (DeflectionLimit(at_most=1.0),), millimetres(3), triangles=60
    )
    assert easy.sizes[0].load_factor == float("inf")


@pytest.mark.slow
def test_the_verdict_changes_where_the_utilisation_passes_one():
    _, _, found = weighed()
    (h,) = found.changes
    fails = [own.nominal for own in found.sizes if not own.passes]
    passes = [own.nominal for own in found.sizes if own.passes]
    assert max(fails) < h < min(passes)
    cases, both, _ = weighed()
    beside = size(
        cover(), cases, LIMITS, millimetres(3, 999 * h, 1001 * h), combinations=both
    )
    assert [own.passes for own in beside.sizes] == [False, False, True]
    thick = size(
        cover(), [Case(name="p", loads=[CROWD])], LIMITS[:1], millimetres(9, 12)
    )
    assert thick.changes[0] == pytest.approx(
        0.009 * thick.sizes[0].governs.used ** (1 / 3), rel=1e-5
    )


@pytest.mark.slow
def test_a_zone_of_its_own_thickness_is_solved_anew():
    """Only the plate around it varies; each size is that of its own solution."""
    outline = cover().outline.zone(
        Rectangle(centre=(0.4, 0.3), size=(0.2, 0.2), name="pad"), name="pad"
    )
    own = replace(cover(), outline=outline, zones={"pad": Section(thickness=0.012)})
    cases = [Case(name="sum", loads=[SelfWeight(), CROWD])]
    found = size(own, cases, LIMITS[:2], millimetres(4, 8), triangles=120)
    assert found.solves == 2
    assert found.changes == ()
    for one in found.sizes:
        plate = replace(own, thickness=one.nominal)
        again = solve(plate, cases, triangles=120)
        for quantity in ("deflection", "von Mises"):
            value = one.judged.solution.peak(quantity).value
            near = 1e-9 if quantity == "deflection" else 1e-4  # places are sampled
            assert value == pytest.approx(again.peak(quantity).value, rel=near)
    alike = replace(own, zones={"pad": Section(material=STEEL)})
    assert size(alike, cases, LIMITS[:2], millimetres(4, 8), triangles=120).solves == 1


def test_strength_goes_by_the_nominal_thickness():
    """EN 10025-2: S235 235, 225, 215 MPa to 16, 40, 63 mm."""
    limit = LIMITS[1]
    for h, strength in ((0.016, 235e6), (0.0161, 225e6), (0.04, 225e6), (0.06, 215e6)):
        assert steel_strength("steel S235", h) == strength
        assert allowed_at(cover(), limit, h) == pytest.approx(strength / 1.5)
    assert steel_strength("steel S355", 0.03) == 345e6
    assert steel_strength("steel S235", 0.064) is None
    assert steel_strength("float glass", 0.01) is None
    low = replace(limit, strength=100e6)
    assert allowed_at(cover(), low, 0.06) == pytest.approx(100e6 / 1.5)
    cases = [Case(name="p", loads=[CROWD])]
    stock = millimetres(16, 20, under_tolerance=0.5e-3)
    found = size(cover(), cases, LIMITS, stock, triangles=60)
    assert [own.verdict.judgements[1].limit for own in found.sizes] == pytest.approx(
        [235e6 / 1.5, 225e6 / 1.5]
    )


def test_a_stock_that_leaves_nothing_is_refused():
    with pytest.raises(InputError) as caught:
        millimetres(1, 2, under_tolerance=0.3e-3, corrosion=1e-3)
    assert str(caught.value) == (
        "under_tolerance and corrosion, 1.3 mm, leave nothing of the stock thickness "
        "1 mm; take it off the list."
    )
    with pytest.raises(InputError, match="there is no thickness to choose from"):
        Stock(thicknesses=())
    with pytest.raises(InputError, match=r"corrosion is .* it must be 0 or more"):
        millimetres(3, corrosion=-1e-3)
    assert millimetres(8, 3, 3).thicknesses == (0.003, 0.008)
    with pytest.raises(InputError, match="no limit is stated"):
        size(cover(), [Case(name="p", loads=[CROWD])], (), millimetres(3))
