"""Sums of unit cases at any thickness against solving them anew on the same mesh."""

from dataclasses import replace
from functools import cache

import numpy as np
import plates
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from kplate.adapt import solve
from kplate.basis import Basis
from kplate.errors import InputError
from kplate.goals import Deflection, Moment, Resultant
from kplate.loads import Case, PointForce, Pressure, RectanglePatch, SelfWeight
from kplate.materials import STEEL
from kplate.mesh import Mesh
from kplate.outline import Outline
from kplate.plate import Plate, Section
from kplate.shapes import Rectangle
from kplate.solution import Solution
from kplate.solve.dual import solve_dual
from kplate.solve.static import solve_static
from kplate.superposed import Superposed, added, follows, unit_cases
from kplate.supports import CLAMPED, SIMPLY_SUPPORTED
from kplate.values import Value

QUANTITIES = (
    "deflection",
    "von Mises",
    "largest principal",
    "shear stress",
    "m_xy",
    "design top y",
)
H = 0.01
WHEEL = RectanglePatch(force=-800.0, centre=(0.6, 0.4), size=(0.2, 0.3))
PIN = PointForce(force=-200.0, at=(0.25, 0.5))
CASES = (
    Case(name="wind", loads=[Pressure(1.2e3), SelfWeight()]),
    Case(name="wheel", loads=[WHEEL, PIN, SelfWeight(acceleration=-4.0)]),
    Case(name="alone", loads=[SelfWeight()]),
    Case(name="other", loads=[Pressure(-700.0)]),
)


def plate(h=H, **zones):
    """A notch-free plate with a clamped side and a free one."""
    return Plate(
        outline=Outline.polygon(
            [(0, 0), (1.0, 0), (1.0, 0.8), (0, 0.8)], sides=plates.SIDES
        ),
        thickness=h,
        material=STEEL,
        supports={"south": CLAMPED, "east": SIMPLY_SUPPORTED, "west": SIMPLY_SUPPORTED},
        **zones,
    )


def anew(mesh: Mesh, h: float, cases, element="quintic") -> Solution:
    own = plate(h)
    return Solution(
        state=solve_static(own, mesh, cases, element=element),
        dual=solve_dual(own, mesh, cases),
    )


@cache
def basis() -> tuple[Basis, np.ndarray]:
    units, weights = unit_cases(CASES)
    mesh = plates.grid(5, b=0.8, m=4)
    return Basis(solution=anew(mesh, H, units)), weights


def at_thickness(h: float) -> Superposed:
    found, weights = basis()
    own = weights.copy()
    own[-1] *= h / H
    return Superposed.of(found, plate(h), CASES, own)


def test_unit_cases_take_the_self_weight_apart():
    units, weights = unit_cases(CASES)
    assert [case.name for case in units] == ["wind", "wheel", "other", "self-weight"]
    assert units[1].loads == (WHEEL, PIN)
    assert units[-1].loads == (SelfWeight(),)
    expected = np.zeros((4, 4))
    expected[0, 0] = expected[1, 1] = expected[2, 3] = 1.0
    expected[3, :3] = 1.0, 4.0 / 9.80665, 1.0
    np.testing.assert_allclose(weights, expected)
    alike, ones = unit_cases([Case(name="self-weight", loads=[Pressure(1.0)])])
    assert [case.name for case in alike] == ["self-weight"]
    np.testing.assert_array_equal(ones, [[1.0]])
    both, _ = unit_cases(
        [Case(name="self-weight", loads=[Pressure(1.0), SelfWeight()])]
    )
    assert [case.name for case in both] == ["self-weight", "self-weight alone"]


@settings(max_examples=6, deadline=None)
@given(st.floats(0.3, 4.0))
def test_scaled_fields_are_those_solved_anew(factor):
    """Peaks, bands, hold-down and reactions at another thickness, on the same mesh."""
    h = factor * H
    found, other = at_thickness(h), anew(basis()[0].solution.mesh, h, CASES)
    assert found.excluded == other.excluded
    for case in other.cases:
        for quantity in QUANTITIES:
            own, expected = (s.peak(quantity, case=case) for s in (found, other))
            if own.value * expected.value < 0.0:  # as large on the other side
                own = -own
            assert own.value == pytest.approx(expected.value, rel=1e-9), quantity
            # Which of equally large places get a finer lattice is round-off's.
            near = 1e-6 if quantity in QUANTITIES[:2] else 5e-3
            assert own.lower == pytest.approx(expected.lower, rel=near)
            assert own.upper == pytest.approx(expected.upper, rel=near)
            assert own.kind == expected.kind
            assert own.case == case
        own, expected = (s.reactions(case=case) for s in (found, other))
        size = expected.magnitude
        assert own.total.force == pytest.approx(expected.total.force, abs=1e-9 * size)
        assert own.imbalance < 1e-11
        for a, b in zip(own.sides, expected.sides, strict=True):
            assert a.resultant.force == pytest.approx(
                b.resultant.force, abs=1e-9 * size
            )
            np.testing.assert_allclose(
                a.line_reaction, b.line_reaction, atol=1e-7 * size
            )
        pull, expected = (s.hold_down(case=case)[0] for s in (found, other))
        assert pull.value == pytest.approx(expected.value, abs=1e-9 * size)
    x = [(0.31, 0.47)]
    np.testing.assert_allclose(
        found.moments(x, case="wheel"), other.moments(x, case="wheel"), rtol=1e-8
    )


@settings(max_examples=25, deadline=None)
@given(st.lists(st.floats(-2.0, 2.0), min_size=4, max_size=4), st.floats(0.3, 4.0))
def test_deflection_and_stress_of_given_loads_go_with_powers_of_the_thickness(w, k):
    """Deflections with 1/h^3, stresses with 1/h^2, moments not at all."""
    found, _ = basis()
    weights = np.array(w)[:, None]
    if not np.abs(weights[:3]).any():
        return
    case = [Case(name="sum", loads=[Pressure(1.0)])]
    thin = Superposed.of(found, plate(H), case, weights)
    thick = Superposed.of(found, plate(k * H), case, weights)
    for quantity, power in (("deflection", 3), ("von Mises", 2), ("m_xx", 0)):
        own, expected = thick.peak(quantity), thin.peak(quantity)
        for end in ("value", "lower", "upper"):
            assert getattr(own, end) == pytest.approx(
                getattr(expected, end) / k**power, rel=1e-12, abs=1e-15
            )


def test_a_sum_on_round_sides_and_many_triangles_is_that_solved_anew():
    """HCT, whose triangles have three pieces; a hole, and triangles passed over."""
    outline = Outline.circle((0.0, 0.0), radius=0.4)
    disc = Plate(
        outline=outline, thickness=H, material=STEEL, supports={"rim": CLAMPED}
    )
    cases = [
        Case(name="a", loads=[Pressure(-1e3), SelfWeight()]),
        Case(name="b", loads=[PointForce(force=-50.0, at=(0.1, 0.05)), SelfWeight()]),
    ]
    units, weights = unit_cases(cases)
    first = solve(disc, units, triangles=800, element="hct")
    found = Superposed.of(Basis(solution=first), disc, cases, weights)
    state = solve_static(disc, first.mesh, cases, element="hct")
    other = Solution(state=state)
    for case in ("a", "b"):
        for quantity in QUANTITIES:
            own, expected = (s.peak(quantity, case=case) for s in (found, other))
            assert own.value == pytest.approx(expected.value, rel=1e-8), quantity
            assert own.kind == expected.kind == "none"


def test_a_dkt_solution_is_summed_too():
    units, weights = unit_cases(CASES)
    mesh = plates.grid(10, b=0.8, m=8)
    state = solve_static(plate(), mesh, units, element="dkt")
    h = 2.0 * H
    weights[-1] *= 2.0
    found = Superposed.of(
        Basis(solution=Solution(state=state)), plate(h), CASES, weights
    )
    other = Solution(state=solve_static(plate(h), mesh, CASES, element="dkt"))
    for quantity in ("deflection", "von Mises"):
        own, expected = (s.peak(quantity, case="wind") for s in (found, other))
        assert own.value == pytest.approx(expected.value, rel=1e-9)


def test_bounds_add_up_to_a_bound_that_holds_the_sum():
    """Half widths add up with the sizes of the weights; the sum solved is inside."""
    units, weights = unit_cases(CASES)
    at = (0.4, 0.3)
    goals = [
        Deflection(at=at),
        Moment(at=(0.3, 0.25), component="m_yy"),
        Resultant(of="south"),
    ]
    first = solve(plate(), units, tolerance=0.02, goals=goals)
    h = 1.7 * H
    weights[-1] *= 1.7
    found = Superposed.of(Basis(solution=first), plate(h), CASES, weights)
    other = solve(plate(h), CASES, tolerance=0.002, goals=goals)
    for case in found.cases:
        for goal in goals[:2]:
            own, expected = (s.value(goal, case=case) for s in (found, other))
            assert own.kind == "bound"
            assert own.lower <= expected.upper
            assert expected.lower <= own.upper
            assert own.value == pytest.approx(expected.value, rel=0.02)
    for own, exact in zip(found.energies, other.energies, strict=True):
        assert own.lower <= exact.upper
        assert exact.lower <= own.upper


def test_a_sum_is_worth_no_more_than_the_worst_of_its_parts():
    bound = Value(value=2.0, lower=1.5, upper=3.0, kind="bound")
    guess = Value(value=1.0, lower=0.9, upper=1.2, kind="estimate")
    total = added([bound, guess], np.array([-2.0, 1.0]))
    assert (total.value, total.kind) == (-3.0, "estimate")
    assert (total.lower, total.upper) == (pytest.approx(-5.1), pytest.approx(-1.8))
    assert added([bound, guess], np.array([3.0, 0.0])).kind == "bound"
    none = Value(value=np.nan, reason="no finite value")
    lost = added([bound, none], np.array([1.0, 1.0]))
    assert np.isnan(lost.value)
    assert lost.reason == "no finite value"
    assert added([bound, none], np.array([1.0, 0.0])).value == 2.0


def test_a_zone_with_a_thickness_of_its_own_does_not_follow():
    outline = Outline.polygon(
        [(0, 0), (1, 0), (1, 1), (0, 1)], sides=plates.SIDES
    ).zone(Rectangle(centre=(0.5, 0.5), size=(0.4, 0.4), name="pad"), name="pad")
    own = Plate(
        outline=outline,
        thickness=H,
        material=STEEL,
        supports={"south": CLAMPED},
        zones={"pad": Section(thickness=0.02)},
    )
    assert not follows(own)
    assert follows(replace(own, zones={"pad": Section(material=STEEL)}))
    cases = [Case(name="a", loads=[Pressure(-1.0)])]
    first = solve(own, cases, triangles=200)
    one = np.ones((1, 1))
    same = Superposed.of(Basis(solution=first), own, cases, one)
    assert same.peak("deflection").value == pytest.approx(
        first.peak("deflection").value, rel=1e-12
    )
    with pytest.raises(InputError) as caught:
        Superposed.of(Basis(solution=first), replace(own, thickness=0.02), cases, one)
    assert str(caught.value) == (
        "a zone has a thickness of its own, which does not follow the plate's; solve "
        "for each thickness."
    )
