"""Solved panels that the tests of files and pictures share."""

import pytest

from kplate.adapt import solve
from kplate.loads import (
    Case,
    EdgeMoment,
    LineForce,
    PointForce,
    PointMoment,
    Pressure,
    SelfWeight,
)
from kplate.materials import ALUMINIUM, STEEL
from kplate.outline import Outline
from kplate.plate import Plate, Section
from kplate.shapes import Circle, Ellipse, Slot
from kplate.supports import CLAMPED, GUIDED, SIMPLY_SUPPORTED


@pytest.fixture(scope="session")
def cover():
    """An L-shaped cover with a hole in two cases, one with a point force."""
    points = [(0, 0), (1.6, 0), (1.6, 0.8), (1.0, 0.8), (1.0, 1.2), (0, 1.2)]
    sides = ["south", "east", "notch-south", "notch-east", "north", "west"]
    plate = Plate(
        outline=Outline.polygon(points, sides=sides).cut(
            Circle(centre=(0.45, 0.4), radius=0.12, name="shaft")
        ),
        thickness=0.012,
        material=STEEL,
        supports={
            "south": CLAMPED,
            "notch-south": SIMPLY_SUPPORTED,
            "north": SIMPLY_SUPPORTED,
            "west": SIMPLY_SUPPORTED,
        },
    )
    crowd = Case(name="crowd", loads=[Pressure(-5e3), SelfWeight()])
    jack = Case(name="jack", loads=[PointForce(force=2e3, at=(1.35, 0.4))])
    return solve(plate, [crowd, jack], triangles=1500)


@pytest.fixture(scope="session")
def lid():
    """A simply supported rectangle in one case."""
    sides = ["south", "east", "north", "west"]
    plate = Plate(
        outline=Outline.polygon([(0, 0), (0.8, 0), (0.8, 0.6), (0, 0.6)], sides=sides),
        thickness=0.006,
        material=STEEL,
        supports=dict.fromkeys(sides, SIMPLY_SUPPORTED),
    )
    return solve(plate, [Case(name="wind", loads=[Pressure(-5e3)])], triangles=800)


@pytest.fixture(scope="session")
def deck():
    """A bowed plate with a zone, two seams and three marks, held inside too."""
    outline = (
        Outline.polygon(
            [(0, 0), (1.2, 0), (1.2, 0.8), (0, 0.8)],
            sides=["south", "bow", "north", "west"],
            bulges=[0.0, 0.25, 0.0, 0.0],
        )
        .cut(Ellipse(centre=(0.3, 0.6), size=(0.2, 0.1), name="oval"))
        .cut(Slot(centre=(1.0, 0.2), length=0.2, width=0.06, name="slot"))
        .zone(Circle(centre=(0.3, 0.25), radius=0.12, name="edge"), name="pad")
        .seam([(0.6, 0.0), (0.6, 0.8)], name="sill")
        .seam([(0.8, 0.4), (1.0, 0.6)], name="track", bulges=[0.2])
        .mark((0.9, 0.4), name="bolt")
        .mark((0.45, 0.45), name="stud")
        .mark((1.1, 0.6), name="lamp")
    )
    plate = Plate(
        outline=outline,
        thickness=0.008,
        material=STEEL,
        supports={
            "bow": CLAMPED,
            "west": GUIDED,
            "sill": SIMPLY_SUPPORTED,
            "bolt": SIMPLY_SUPPORTED,
            "stud": SIMPLY_SUPPORTED,
        },
        zones={"pad": Section(thickness=0.012, material=ALUMINIUM)},
    )
    loads = [
        Pressure(-5e3, zone="pad"),
        LineForce(force=-1e3, along="track"),
        EdgeMoment(moment=50.0, along="north"),
        PointMoment(moment=(0.0, -20.0), at=(1.1, 0.6)),
    ]
    return solve(plate, [Case(name="winch", loads=loads)], triangles=1500)
