"""Bands on the moment along free round rims, against numbers found without elements."""

from dataclasses import replace

import numpy as np
import pytest
from plates import rectangle

import kplate as kp
from benchmarks import cases, records
from kplate.functionals import functional
from kplate.meshing import mesh_outline
from kplate.refine import refined

REFERENCES = {
    "ann_0.3_iF_oS_u": {(0.3, 0.0): "m_yy"},
    "ann_0.3_iC_oF_u": {(1.0, 0.0): "m_yy"},
    "hole_ssss_0.15_0.5_F": {(0.65, 0.5): "m_yy", (0.606066017177982,) * 2: "moment"},
    "hole_cccc_0.25_0.5_F": {(0.75, 0.5): "m_yy", (0.676776695296637,) * 2: "moment"},
}


def reference(problem, at, quantity):
    """A number of the reference file."""
    found = [
        item["value"]
        for item in problem["quantities"]
        if item["quantity"] == quantity and tuple(item["at"]) == at
    ]
    assert len(found) == 1
    return found[0]


@pytest.mark.slow
@pytest.mark.parametrize("name", REFERENCES)
def test_bounds_hold_the_reference(name):
    problem = records.record(name)
    goals = [kp.RimMoment(at=at) for at in REFERENCES[name]]
    solution = kp.solve(
        cases.plate(problem), cases.loads(problem), tolerance=0.01, goals=goals
    )
    assert solution.reached
    for goal in goals:
        value = solution.value(goal)
        exact = reference(problem, goal.at, REFERENCES[name][goal.at])
        assert value.kind == "bound"
        assert value.lower < exact < value.upper
        assert value.upper - value.lower < 0.021 * abs(exact)
        assert value.value == pytest.approx(exact, rel=2e-3)


SQUARE = kp.Outline.polygon(
    [(0, 0), (1, 0), (1, 1), (0, 1)], sides=["south", "east", "north", "west"]
)
HOLE = kp.Circle(centre=(0.5, 0.5), radius=0.2, name="hole")
ON_RIM = (0.5, 0.7)
NO_ROOM = {
    "a side": (
        SQUARE.cut(kp.Circle(centre=(0.5, 0.24), radius=0.2, name="hole")),
        (0.7, 0.24),
        [kp.Pressure(1.0)],
        "a side leaves no room at the rim",
    ),
    "a load on the rim": (
        SQUARE.cut(HOLE),
        ON_RIM,
        [kp.EdgeMoment(moment=1.0, along="hole")],
        "a load acts along hole",
    ),
    "a point load": (
        SQUARE.cut(HOLE),
        ON_RIM,
        [kp.PointForce(force=1.0, at=(0.5, 0.74))],
        "a point load leaves no room at the rim",
    ),
    "a liquid": (
        SQUARE.cut(HOLE),
        ON_RIM,
        [kp.Hydrostatic(level=0.6, specific_weight=1.0)],
        "the surface of the liquid leaves no room at the rim",
    ),
    "a patch": (
        SQUARE.cut(HOLE),
        ON_RIM,
        [kp.DiscPatch(force=1.0, centre=(0.5, 0.5), radius=0.22)],
        "the edge of a patch leaves no room at the rim",
    ),
}


@pytest.mark.parametrize("name", NO_ROOM)
def test_a_rim_without_room_has_a_reason(name):
    outline, at, loads, reason = NO_ROOM[name]
    supports = dict.fromkeys(["south", "north"], kp.CLAMPED)
    plate = replace(rectangle({}), outline=outline, supports=supports)
    mesh = mesh_outline(outline, size=0.1)
    made = functional(
        plate, mesh, kp.RimMoment(at=at), [kp.Case(name="one", loads=loads)]
    )
    assert (made.kernel, made.reason) == (None, reason)


def test_a_coarse_mesh_names_the_triangles_to_be_parted():
    """And parting them makes room for the ring."""
    low = kp.Circle(centre=(0.5, 0.285), radius=0.2, name="hole")
    plate = replace(rectangle(kp.CLAMPED), outline=SQUARE.cut(low))
    mesh = mesh_outline(plate.outline, size=0.2)
    goal = kp.RimMoment(at=(0.5, 0.485))
    made = functional(plate, mesh, goal, [])
    assert "triangles at the rim" in made.reason
    for _ in range(8):
        if not made.reason:
            break
        marked = np.zeros(len(mesh.triangles), dtype=bool)
        marked[made.too_large] = True
        assert marked.any()
        mesh = refined(mesh, marked)
        made = functional(plate, mesh, goal, [])
    assert not made.reason
    assert made.kernel.radius == pytest.approx(0.95 * 0.285)
    assert not len(made.too_large)


@pytest.mark.parametrize(
    ("at", "supports", "words"),
    [
        ((0.5, 0.0), {}, "does not lie on a side that is a whole circle"),
        ((0.5, 0.6), {}, "does not lie on a side that is a whole circle"),
        (ON_RIM, {"hole": kp.CLAMPED}, "of which side 'hole' is clamped"),
    ],
)
def test_a_place_off_a_free_round_rim_is_refused(at, supports, words):
    outline = SQUARE.cut(HOLE)
    held = {"south": kp.CLAMPED, **supports}
    plate = replace(rectangle({}), outline=outline, supports=held)
    mesh = mesh_outline(outline, size=0.1)
    with pytest.raises(kp.InputError, match=words):
        functional(plate, mesh, kp.RimMoment(at=at), [])
