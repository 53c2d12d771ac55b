"""Envelopes against brute force: each combination solved, and searched, by itself."""

import numpy as np
import pytest
from plates import rectangle

from kplate.adapt import solve
from kplate.asking import ASKED, values_at
from kplate.combinations import Combination, combined_cases, expanded
from kplate.combining import combine
from kplate.envelope import Envelope
from kplate.errors import InputError
from kplate.extremes import stress_range
from kplate.loads import Case, Pressure, RectanglePatch
from kplate.peaks import QUANTITIES
from kplate.recovery import surface_stress
from kplate.solution import Solution
from kplate.solve.dual import solve_dual
from kplate.solve.static import solve_static
from kplate.supports import SIMPLY_SUPPORTED

PLATE = rectangle(
    {"south": SIMPLY_SUPPORTED, "east": SIMPLY_SUPPORTED, "north": SIMPLY_SUPPORTED},
    a=1.2,
    thickness=0.02,
)
CASES = [
    Case(name="dead", loads=[Pressure(-500.0)]),
    Case(
        name="foot",
        loads=[RectanglePatch(force=-900.0, centre=(0.3, 0.4), size=(0.2, 0.2))],
    ),
    Case(name="wind", loads=[Pressure(900.0)], reverses=True),
]
STATED = [
    Combination(name="A", factors={"dead": 1.35, "foot": 1.5}, purpose="strength"),
    Combination(name="B", factors={"dead": 0.9, "wind": 1.5}, purpose="strength"),
    Combination(name="C", factors={"dead": 1.0}, purpose="service"),
]
POINTS = np.random.default_rng(7).uniform((0.05, 0.05), (1.15, 0.95), (40, 2))


@pytest.fixture(scope="module")
def envelope():
    solution = solve(PLATE, CASES, triangles=400, balanced=True)
    return Envelope(solution=combine(solution, STATED))


@pytest.fixture(scope="module")
def alone(envelope):
    """Each combination solved for itself on the same mesh."""
    mesh = envelope.solution.mesh
    return [
        Solution(
            state=solve_static(PLATE, mesh, [case], element="quintic"),
            dual=solve_dual(PLATE, mesh, [case]),
        )
        for case in combined_cases(CASES, expanded(CASES, STATED))
    ]


def close(found, wanted):
    return pytest.approx(wanted, abs=1e-9 * np.abs(wanted).max()) == found


@pytest.mark.parametrize("quantity", ASKED)
def test_the_envelope_at_points_is_that_of_brute_force(envelope, alone, quantity):
    found = envelope.at(POINTS, quantity)
    values = np.column_stack([values_at(own, quantity, POINTS) for own in alone])
    assert close(found.largest, values.max(axis=1))
    assert close(found.smallest, values.min(axis=1))
    rows = np.arange(len(POINTS))
    size = 1e-9 * np.abs(values).max()
    assert (values[rows, found.largest_in] >= values.max(axis=1) - size).all()
    assert (values[rows, found.smallest_in] <= values.min(axis=1) + size).all()
    assert found.names == ("A", "B", "B, wind reversed", "C")


@pytest.mark.parametrize("quantity", QUANTITIES)
def test_the_peak_of_the_envelope_is_the_worst_of_brute_force(
    envelope, alone, quantity
):
    peak = envelope.peak(quantity)
    values = [own.peak(quantity) for own in alone]
    signed = quantity == "largest principal"
    wanted = max(values, key=lambda v: v.value if signed else abs(v.value))
    assert peak.value == pytest.approx(wanted.value, rel=1e-8)
    assert peak.upper == pytest.approx(wanted.upper, rel=1e-8)
    assert peak.case == wanted.case
    field = envelope.field(quantity)
    most = max(abs(field.largest).max(), abs(field.smallest).max())
    assert most <= abs(peak.value) * (1.0 + 1e-9)
    assert most >= abs(peak.value) * 0.98


def test_reactions_have_their_extremes_and_what_governs(envelope, alone):
    by_name = {own.name: own for own in envelope.supports()}
    assert set(by_name) >= {"south", "east", "north", "south / east", "east / north"}
    for name in ("south", "east", "north"):
        forces = [own.resultant(name).value for own in alone]
        found = by_name[name]
        assert found.most.value == pytest.approx(max(forces), rel=1e-8)
        assert found.least.value == pytest.approx(min(forces), rel=1e-8)
        assert found.most.case == envelope.cases[int(np.argmax(forces))]
        reactions = [own.reactions().sides for own in alone]
        lines = np.column_stack(
            [
                next(side for side in sides if side.side == name).line_reaction
                for sides in reactions
            ]
        )
        known = ~np.isnan(lines).any(axis=1)
        assert close(found.line.largest[known], lines.max(axis=1)[known])
        assert np.isnan(found.line.largest[~known]).all()
    corner = by_name["south / east"]
    forces = [
        next(
            own.force.value
            for own in each.reactions().corners
            if own.corner.sides == ("south", "east")
        )
        for each in alone
    ]
    assert corner.least.value == pytest.approx(min(forces), rel=1e-8)
    assert corner.most.value == pytest.approx(max(forces), rel=1e-8)


def test_a_criterion_is_not_made_of_enveloped_components(envelope):
    """Of components that peak in different combinations it would be larger."""
    at = [(0.3, 0.4)]
    components = [envelope.at(at, m) for m in ("m_xx", "m_yy", "m_xy")]
    worst = [
        max(abs(own.largest[0]), abs(own.smallest[0])) * sign
        for own, sign in zip(components, (1.0, -1.0, 1.0), strict=True)
    ]
    xx, yy, xy = surface_stress(np.array(worst), 0.02, "bottom")
    mixed = np.sqrt(xx**2 - xx * yy + yy**2 + 3.0 * xy**2)
    assert envelope.at(at, "von Mises").largest[0] < 0.95 * mixed


def test_the_range_of_a_component_is_the_peak_of_a_difference(envelope):
    """Of two combinations: the peak of |A - C|, a combination of its own."""
    apart = [
        Combination(name="A-C", factors={"dead": 0.35, "foot": 1.5}, purpose="every")
    ]
    unit = solve(PLATE, CASES, triangles=400, balanced=True)
    difference = combine(unit, apart)
    for component in ("xx", "yy", "xy"):
        found = stress_range(envelope.solution, f"stress {component}", cases=["A", "C"])
        peak = difference.peak(f"m_{component}")
        assert found.value == pytest.approx(6.0 / 0.02**2 * abs(peak.value), rel=2e-3)
        assert found.kind == "estimate"
        assert found.lower <= found.value <= found.upper


def test_the_range_of_a_stress_that_reverses_is_twice_its_size():
    both = [Combination(name="W", factors={"wind": 1.0}, purpose="service")]
    together = combine(solve(PLATE, CASES, triangles=400), both)
    found = stress_range(together, "stress xx")
    peak = together.peak("m_xx", case="W")
    assert found.value == pytest.approx(12.0 / 0.02**2 * abs(peak.value), rel=1e-9)
    # A criterion has no sign; von Mises does not change at all.
    assert stress_range(together, "von Mises").value < 1e-6 * found.value
    assert stress_range(together, "largest principal").value > 0.0


def test_unknown_names_are_refused(envelope):
    with pytest.raises(InputError, match="there is no load case 'D'; the cases are A"):
        Envelope(solution=envelope.solution, cases=("D",))
    with pytest.raises(InputError, match="there is no quantity 'stress'; the quant"):
        envelope.field("stress")
    with pytest.raises(InputError, match="there is no value 'w'; the values are defl"):
        envelope.at(POINTS, "w")
    with pytest.raises(InputError, match="there is no stress 'm_xx'; they are stress"):
        envelope.stress_range("m_xx")
