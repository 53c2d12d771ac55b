"""Solved panels that the tests of files and pictures share."""

import pytest

from kplate.adapt import solve
from kplate.loads import Case, PointForce, Pressure, SelfWeight
from kplate.materials import STEEL
from kplate.outline import Outline
from kplate.plate import Plate
from kplate.shapes import Circle
from kplate.supports import CLAMPED, SIMPLY_SUPPORTED


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
