"""What the theory leaves out is measured and said."""

from dataclasses import replace

import pytest
from plates import grid, rectangle, solved

from kplate.adapt import solve
from kplate.loads import Pressure
from kplate.shapes import Circle
from kplate.supports import CLAMPED, SIMPLY_SUPPORTED
from kplate.validity import validity


def loaded(ratio, supports=SIMPLY_SUPPORTED, **options):
    """A square 100 h wide whose centre deflects by this share of h."""
    plate = rectangle(supports)
    unit = solved(plate, grid(8), Pressure(1.0)).peak("deflection").value
    pressure = ratio * plate.thickness / unit
    solution = solved(plate, grid(8), Pressure(pressure))
    return validity(solution, **options)


def test_a_thin_plate_with_small_deflection_is_not_flagged():
    found = loaded(0.28)
    assert found.slenderness == pytest.approx(0.01, rel=1e-3)
    assert found.largest_deflection == pytest.approx(0.28, rel=1e-6)
    assert found.holds
    assert found.words == ["thin: h/L 1/100.", "small deflection: w/h 0.28."]


def test_a_large_deflection_is_flagged_with_what_it_means():
    found = loaded(-0.97, held_in_plane=False)
    assert not found.small
    assert not found.holds
    assert found.words[1] == (
        "FLAG: beyond small deflection, w/h 0.97 (0.5 is): linear theory is "
        "conservative for the deflection and, as a rule, for the stress of a panel "
        "supported all round (with the edges free in plane)."
    )
    cantilever = loaded(0.97, {"west": CLAMPED})
    assert cantilever.words[1].endswith(
        "membrane action is left out; judge it by hand."
    )
    assert "is not stated" in loaded(0.97).words[1]


def test_a_thick_plate_is_flagged():
    plate = rectangle(CLAMPED)
    thick = replace(plate, thickness=0.08)
    found = validity(solved(thick, grid(6), Pressure(1.0)))
    assert not found.thin
    assert found.words[0] == (
        "FLAG: not thin, h/L 1/12.5 (1/20 is): shear deformation, left out here, adds "
        "to the deflection."
    )


def test_a_small_hole_is_flagged():
    plate = rectangle(CLAMPED)
    hole = Circle(centre=(0.5, 0.5), radius=0.005, name="bolt")
    holed = replace(plate, outline=plate.outline.cut(hole))
    found = validity(solve(holed, [Pressure(1.0)], triangles=500))
    assert found.smallest_hole == pytest.approx(0.5)
    assert "smallest hole radius/h 0.5, less than 1" in found.words[2]
    wide = Circle(centre=(0.5, 0.5), radius=0.15, name="shaft")
    holed = replace(plate, outline=plate.outline.cut(wide))
    found = validity(solve(holed, [Pressure(1.0)], triangles=500))
    assert found.words[2] == "smallest hole radius/h 15."
    assert found.holds
