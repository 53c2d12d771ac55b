"""Values asked for at points and along lines."""

from dataclasses import replace

import numpy as np
import pytest
from plates import rectangle

from kplate.adapt import solve
from kplate.asking import ASKED, Ask, asked_values, goal_of, left_out, values_at
from kplate.errors import InputError
from kplate.loads import Case, Pressure
from kplate.recovery import principal_moments, surface_stress, tresca, von_mises
from kplate.supports import SIMPLY_SUPPORTED

PLATE = rectangle(SIMPLY_SUPPORTED, a=1.2, thickness=0.02)
BOLTED = replace(
    PLATE,
    outline=PLATE.outline.mark((0.5, 0.5), name="bolt"),
    supports={**PLATE.supports, "bolt": SIMPLY_SUPPORTED},
)
CASES = [Case(name="snow", loads=[Pressure(-900.0)])]
EVERY = Ask(name="all", values=tuple(ASKED), places=((0.3, 0.4),))


def test_what_can_have_a_band_has_one_and_agrees_with_the_fields():
    solution = solve(PLATE, CASES, tolerance=0.05, goals=EVERY.goals)
    found = asked_values(solution, EVERY)
    for quantity in ASKED:
        value = found[quantity, "snow"]
        read = values_at(solution, quantity, [(0.3, 0.4)])[0]
        assert (value.kind == "bound") == (goal_of(quantity, (0.3, 0.4)) is not None)
        if value.kind == "bound":
            # The field itself is less exact than the middle of the band.
            assert read == pytest.approx(value.value, rel=0.05)
        else:
            assert value.value == read
            assert value.lower is None


def test_criteria_are_those_of_the_stresses_there():
    solution = solve(PLATE, CASES, triangles=300)
    points = [(0.3, 0.4), (0.9, 0.2)]
    faces = [
        surface_stress(solution.moments(points), 0.02, face)
        for face in ("top", "bottom")
    ]
    principal = [principal_moments(stress)[0] for stress in faces]
    expected = {
        "von Mises": von_mises(faces[0]),
        "Tresca": tresca(faces[1]),
        "largest principal": np.max(principal, axis=(0, 2)),
        "smallest principal": np.min(principal, axis=(0, 2)),
    }
    for quantity, values in expected.items():
        np.testing.assert_allclose(
            values_at(solution, quantity, points), values, rtol=1e-12
        )


def test_no_stress_is_quoted_where_there_is_none():
    """A point support: moments grow with the logarithm of the distance."""
    solution = solve(BOLTED, CASES, triangles=600)
    line = Ask(
        name="cut", values=("m_xx",), places=((0.1, 0.5), (0.9, 0.5)), stations=17
    )
    along = values_at(solution, "m_xx", line.points)
    at_bolt = np.isclose(line.points[:, 0], 0.5)
    assert np.isnan(along[at_bolt]).all()
    assert np.isfinite(along[~at_bolt]).all()
    point = Ask(name="bolt", values=("q_x", "von Mises"), places=((0.5, 0.5),))
    for value in asked_values(solution, point).values():
        assert np.isnan(value.value)
        assert value.reason == "no finite value: point support bolt"
    assert left_out(solution, "deflection", (0.5, 0.5)) == ""
    assert values_at(solution, "deflection", [(0.5, 0.5)])[0] == pytest.approx(0.0)


def test_mistakes_are_named():
    def refused(**changes):
        with pytest.raises(InputError) as caught:
            replace(EVERY, **changes)
        return str(caught.value)

    assert refused(name="") == "a point or line asked for has no name; give it one."
    assert refused(values=()) == "all: no values are asked for; name some."
    assert refused(values=("w",)).startswith("all: there is no value 'w'; the values")
    assert refused(places=()) == (
        "all: give one place, or two different ends of a line."
    )
    assert refused(places=((0, 0), (1, 1)), stations=1) == (
        "all: stations = 1; a line has 2 to 1000."
    )
