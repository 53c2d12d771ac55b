"""Straight-sided problems computed without finite elements, met by the C1 elements.

Problems and sources are those of ``python -m benchmarks``. They are grouped by what
limits the error: a strong corner, a force or a support at a point, or none of these.
Tolerances are about twice the largest discretisation errors measured, since meshes
differ from one version of the mesher to the next: of the quintic as shares of each
value (of 2 % of the largest of its kind where that is more), of HCT, whose moments are
linear, as shares of the largest of the kind.
"""

import numpy as np
import pytest
import test_reference

from benchmarks import cases, numbers, records
from benchmarks.bands import is_round
from kplate.choice import choose
from kplate.loads import Case
from kplate.singular import excluded_places, plate_corners

STRAIGHT = {
    problem["id"]: problem
    for problem in records.records()
    if not is_round(problem) and not problem["holes"]
}
# Those with walls, columns, steps or loaded lines, and those bent by their sides.
INSIDE = [
    name
    for name, problem in STRAIGHT.items()
    if {"zones", "seams", "marks"} & set(problem)
    or problem["load"]["kind"] == "edge moment"
]
PLAIN = [name for name in STRAIGHT if name not in INSIDE]
HCT = [
    "ssss_h_2",
    "ssss_p_1.2",
    "ssss_patch_2",
    "cccs_u_1",
    "ssfs_u_2",
    "csfs_u_0.5",
    "cffc_u_1",
    "tri_ri_s_u",
    "rhomb_s_u_60",
    "ngon6_c_u",
    "lshape_S_u",
]
TRIANGLES = {"quintic": 2_000, "hct": 2_500}
TOLERANCE = {
    ("quintic", "none"): {
        "deflection": 4e-6,
        "moment": 2e-5,
        "line reaction": 2e-4,
        "corner force": 6e-4,
        "shear": 4e-5,
    },
    ("quintic", "point"): {
        "deflection": 1e-6,
        "moment": 6e-4,
        "line reaction": 6e-4,
        "corner force": 4e-6,
        "point reaction": 2e-7,
    },
    ("quintic", "strong corner"): {
        "deflection": 1.5e-3,
        "moment": 2e-3,
        "line reaction": 2e-4,
    },
    ("hct", "none"): {
        "deflection": 2e-5,
        "moment": 6e-3,
        "line reaction": 8e-3,
        "corner force": 8e-3,
        "shear": 0.25,  # of the second derivatives of a cubic: first order
    },
    ("hct", "point"): {
        "deflection": 4e-5,
        "moment": 1e-2,
        "line reaction": 8e-3,
        "corner force": 2e-3,
        "point reaction": 1e-5,
    },
    ("hct", "strong corner"): {"deflection": 5e-4, "moment": 1e-3},
}


def limit(problem):
    """What limits the error: a corner of a small exponent, or something at a point."""
    corners = plate_corners(cases.plate(problem))
    if any(corner.exponent.real <= 0.5 for corner in corners):
        return "strong corner"
    point = problem["load"]["kind"] == "point" or "marks" in problem
    return "point" if point else "none"


def missed(name, element):
    """Lines about the numbers that an element misses."""
    problem = STRAIGHT[name]
    chosen = choose(cases.plate(problem), element).element
    tolerance = TOLERANCE[chosen, limit(problem)]
    made = numbers.measure(problem, triangles=TRIANGLES[chosen], element=element)
    assert len(made.numbers) == len(problem["quantities"])
    found = []
    for own in made.numbers:
        off = own.deviation
        if chosen == "hct":
            off = (own.computed - own.value) / own.scale
        if not abs(off) <= tolerance[cases.kind(own.quantity)]:
            found.append(
                f"{own.quantity} {own.place}: {own.computed:.8g}, value "
                f"{own.value:.8g}, off by {off:.2g}, {own.method}"
            )
    return "\n".join(found)


@pytest.mark.slow  # seventy problems, 15 s in all
@pytest.mark.parametrize("name", PLAIN)
def test_the_quintic_meets_the_reference_file(name):
    assert not missed(name, "quintic")


@pytest.mark.slow
@pytest.mark.parametrize("name", INSIDE)
def test_the_element_chosen_meets_walls_columns_steps_and_edge_moments(name):
    assert not missed(name, "auto")


@pytest.mark.slow
@pytest.mark.parametrize("name", [*HCT, *(n for n in INSIDE if n != "step_half")])
def test_hct_meets_the_reference_file(name):
    assert not missed(name, "hct")


def test_only_the_step_is_left_to_hct():
    chosen = {name: choose(cases.plate(STRAIGHT[name])).element for name in STRAIGHT}
    assert [name for name in STRAIGHT if chosen[name] != "quintic"] == ["step_half"]


def test_hundreds_of_numbers_are_met_beyond_those_met_by_dkt():
    further = [name for name in STRAIGHT if name not in test_reference.PROBLEMS]
    assert sum(len(STRAIGHT[name]["quantities"]) for name in further) > 480
    assert sum(len(STRAIGHT[name]["quantities"]) for name in [*HCT, *INSIDE]) > 150
    assert len(INSIDE) == 18
    groups = {limit(STRAIGHT[name]) for name in further}
    assert groups == {"none", "point", "strong corner"}


@pytest.mark.parametrize("name", STRAIGHT)
def test_no_moment_or_shear_is_asked_for_where_there_may_be_none(name):
    """None within a twentieth of the side of a corner or a point load or support.

    Corner forces stand only where two hinged sides meet at no more than 90 degrees.
    """
    problem = STRAIGHT[name]
    plate, case = cases.plate(problem), Case(name="all", loads=cases.loads(problem))
    corners = plate_corners(plate)
    places = [c.place for c in corners]
    places += [e.place for e in excluded_places(plate, [case])]
    for item in problem["quantities"]:
        if item["quantity"] == "corner force":
            (own,) = (c for c in corners if c.place == tuple(item["at"]))
            assert own.carries_force
            assert own.angle <= np.radians(90.0) + 1e-9
        elif item["quantity"] not in ("deflection", "point reaction"):
            assert np.hypot(*np.subtract(places, item["at"]).T).min() > 0.05, item
