"""What the theory leaves out is measured and said."""

from dataclasses import replace

import numpy as np
import pytest
from plates import grid, rectangle, solved

from kplate.adapt import solve
from kplate.loads import EdgeMoment, Pressure
from kplate.materials import GLASS, STEEL
from kplate.outline import Outline
from kplate.plate import Plate
from kplate.shapes import Circle
from kplate.supports import CLAMPED, SIMPLY_SUPPORTED
from kplate.validity import ONE_WAY, STEEP, State, validity


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
    assert found.state is State.HOLDS
    assert found.words == [
        "thin: h/L 1/100.",
        "small deflection: w/h 0.28.",
        "theory holds.",
    ]


def test_a_large_deflection_is_flagged_with_what_it_means():
    found = loaded(-0.97, held_in_plane=False)
    assert not found.small
    assert not found.holds
    assert found.words[1] == (
        "FLAG: beyond small deflection, w/h 0.97 (0.5 is): linear theory is "
        "conservative for the deflection and, as a rule, for the stress of a panel "
        "supported all round (with the edges free in plane). Corners need holding both "
        "ways."
    )
    assert found.state is State.CONSERVATIVE
    assert found.words[-1] == "theory holds, conservative."
    three = dict.fromkeys(("west", "south", "east"), SIMPLY_SUPPORTED)
    flap = loaded(0.97, three)
    assert flap.state is State.DOES_NOT_HOLD
    assert "of the bending is two-way and sides are free" in flap.words[1]
    assert flap.words[1].endswith("of the stress nothing is known: judge it by hand.")
    assert "is not stated" in loaded(0.97).words[1]


def test_a_thick_plate_is_flagged():
    plate = rectangle(CLAMPED)
    thick = replace(plate, thickness=0.08)
    found = validity(solved(thick, grid(6), Pressure(1.0)))
    assert not found.thin
    assert found.state is State.DOES_NOT_HOLD
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
    assert found.state is State.DOES_NOT_HOLD
    wide = Circle(centre=(0.5, 0.5), radius=0.15, name="shaft")
    holed = replace(plate, outline=plate.outline.cut(wide))
    found = validity(solve(holed, [Pressure(1.0)], triangles=500))
    assert found.words[2] == "smallest hole radius/h 15."
    assert found.holds


STRIP = {"west": SIMPLY_SUPPORTED, "east": SIMPLY_SUPPORTED}


def test_a_strip_is_linear_far_beyond_half_its_thickness():
    found = loaded(2.0, STRIP, held_in_plane=False)
    assert found.one_way
    assert not found.small
    assert found.state is State.HOLDS
    assert found.words[1] == (
        f"w/h 2.00, but it bends like a strip ({100 * found.two_way:.2g} % of the "
        f"bending is two-way) with slopes up to {found.steepest:.2g}: linear theory "
        "holds."
    )
    unknown = loaded(2.0, STRIP)
    assert unknown.state is State.HOLDS
    assert "which is not stated: then it is conservative" in unknown.words[1]
    held = loaded(2.0, STRIP, held_in_plane=True)
    assert held.state is State.CONSERVATIVE
    assert "held in plane and pull on their frame" in held.words[1]


def test_a_strip_is_not_linear_where_it_is_steep():
    found = loaded(20.0, {"west": CLAMPED})
    assert found.steepest > STEEP
    assert found.state is State.DOES_NOT_HOLD
    assert "large rotations are left out" in found.words[1]


def test_a_sign_on_two_posts_holds():
    """A panel 2 x 1 m on posts 1.2 m apart, in a wind that bends it by w/h 1.7."""
    outline = Outline.polygon([(0, 0), (2, 0), (2, 1), (0, 1)])
    for name, x in (("left", 0.4), ("right", 1.6)):
        outline = outline.seam([(x, 0), (x, 1)], name=name)
    sign = Plate(
        outline=outline,
        thickness=0.004,
        material=STEEL,
        supports={"left": SIMPLY_SUPPORTED, "right": SIMPLY_SUPPORTED},
    )
    wind = Pressure(-600.0)
    found = validity(solve(sign, [wind], triangles=500), held_in_plane=False)
    assert found.largest_deflection > 1.5
    assert found.two_way < ONE_WAY
    assert found.state is State.HOLDS


def test_the_glass_pane_is_conservative():
    """S8 of the project's scenarios, Navier's series: w 5.81 mm, w/h 0.97."""
    plate = Plate(
        outline=Outline.polygon([(0, 0), (1.5, 0), (1.5, 1.0), (0, 1.0)]),
        thickness=0.006,
        material=GLASS,
        supports={f"side-{k}": SIMPLY_SUPPORTED for k in (1, 2, 3, 4)},
    )
    found = validity(solve(plate, [Pressure(-1e3)], triangles=400))
    assert found.largest_deflection == pytest.approx(0.97, abs=0.005)
    assert found.state is State.CONSERVATIVE
    assert (
        "conservative for the deflection and, as a rule, for the stress"
        in (found.words[1])
    )
    assert found.words[1].endswith("Corners need holding both ways.")


@pytest.mark.parametrize(
    ("m_xx", "m_yy", "share"),
    [
        (1.0, 1.0, 1.0),  # a sphere
        (1.0, -1.0, 1.0),  # a saddle
        (1.0, 0.0, 0.0),  # a strip with its free edges' own curvature
        (1.0, 0.3, 0.0),  # a cylinder
        (1.0, -0.4, (0.7 / 1.12 - 0.3) / 0.7),  # by hand, k2/k1 = -0.7/1.12
        (1.0, 0.65, 0.35 / 0.805),  # by hand, k2/k1 = 0.35/0.805
    ],
)
def test_uniform_bending_has_the_two_way_share_of_its_curvature(m_xx, m_yy, share):
    """Moments all round bend a free plate evenly; a corner holds it."""
    outline = Outline.polygon(
        [(0, 0), (1, 0), (1, 1), (0, 1)], sides=("south", "east", "north", "west")
    )
    for name, at in (("a", (0.2, 0.2)), ("b", (0.8, 0.3)), ("c", (0.4, 0.8))):
        outline = outline.mark(at, name=name)
    plate = Plate(
        outline=outline,
        thickness=0.01,
        material=STEEL,
        supports=dict.fromkeys("abc", SIMPLY_SUPPORTED),
    )
    loads = [EdgeMoment(moment=1e3 * m_xx, along=name) for name in ("west", "east")]
    loads += [EdgeMoment(moment=1e3 * m_yy, along=name) for name in ("south", "north")]
    found = validity(solve(plate, loads, triangles=60, element="quintic"))
    assert found.two_way == pytest.approx(share, abs=1e-6)


def test_the_two_way_share_does_not_depend_on_the_size_of_the_load():
    first, second = loaded(0.1), loaded(-3.0)
    assert first.two_way == pytest.approx(second.two_way, rel=1e-9)
    assert 0.05 < first.two_way < 1.0
    assert np.isclose(second.steepest, 30.0 * first.steepest)
