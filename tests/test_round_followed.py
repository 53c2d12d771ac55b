"""What follows arcs beyond the quintic, and what is drawn otherwise than stated."""

import numpy as np
import pytest

from kplate.adapt import solve
from kplate.goals import Deflection
from kplate.loads import DiscPatch, LineForce, Pressure
from kplate.materials import STEEL
from kplate.outline import Outline
from kplate.plate import Plate
from kplate.shapes import Ellipse, Slot
from kplate.supports import CLAMPED, SIMPLY_SUPPORTED

H = 0.01
D = STEEL.bending_stiffness(H)
CENTRE = Deflection(at=(0.0, 0.0))


def plate(outline, support):
    return Plate(
        outline=outline,
        thickness=H,
        material=STEEL,
        supports=dict.fromkeys(outline.side_names, support),
    )


DISC = Outline.circle((0.0, 0.0), radius=1.0)


def test_hct_follows_a_hinged_rim_and_bounds_what_it_finds():
    """(5 + nu) p a^4 / (64 (1 + nu) D), Timoshenko and Woinowsky-Krieger, from memory.

    By chords the deflection is 0.15 % off.
    """
    own = plate(DISC, SIMPLY_SUPPORTED)
    solution = solve(
        own, [Pressure(1e3)], element="hct", tolerance=0.01, goals=[CENTRE]
    )
    exact = 5.3 / (64.0 * 1.3) * 1e3 / D
    value = solution.value(CENTRE)
    assert value.kind == "bound"
    assert value.lower < exact < value.upper
    assert value.value == pytest.approx(exact, rel=1e-5)


def test_hct_takes_chords_where_a_rim_is_clamped():
    own = plate(DISC, CLAMPED)
    solution = solve(own, [Pressure(1e3)], element="hct", triangles=600)
    assert not len(solution.state.constraints.numbering.arcs)


@pytest.mark.parametrize(
    ("outline", "loads", "exact", "words"),
    [
        # A clamped ellipse: p / (D (24/a^4 + 24/b^4 + 16/(a b)^2)), Bryan, from memory.
        (
            Outline.of(Ellipse(centre=(0.0, 0.0), size=(4.0, 2.0), name="rim")),
            [Pressure(-1e3)],
            -1e3 / (24.0 / 16.0 + 24.0 + 16.0 / 4.0),
            "drawn by arcs",
        ),
        # A ring of 1 N/m at r = c on a clamped disc of radius 1:
        # c/8 ((1 - c^2) + 2 c^2 ln c) upwards, the closed form of r.
        (
            DISC.seam([(0.6, 0.0), (-0.6, 0.0)], bulges=[1.0], name="half").seam(
                [(-0.6, 0.0), (0.6, 0.0)], bulges=[1.0], name="other half"
            ),
            [LineForce(force=1.0, along=name) for name in ("half", "other half")],
            0.6 / 8.0 * (1.0 - 0.36 + 0.72 * np.log(0.6)),
            "drawn by chords",
        ),
    ],
    ids=["ellipse", "ring"],
)
def test_estimates_reach_what_is_drawn_otherwise(outline, loads, exact, words):
    solution = solve(plate(outline, CLAMPED), loads, tolerance=0.01, goals=[CENTRE])
    value = solution.value(CENTRE)
    assert value.kind == "estimate"
    assert words in value.reason
    assert value.lower < exact / D < value.upper


def test_a_slot_near_a_round_rim_is_meshed():
    """Triangles between the two have no room for their arcs unless they are small."""
    slot = Slot(
        centre=(0.60663578, 0.72259217),
        length=0.27794577,
        width=0.10383589,
        name="slot",
        angle=2.44756066,
    )
    outline = Outline.polygon(
        [(0.0, 0.0), (1.0, 0.0), (0.13725745, 0.99053541)],
        sides=("south", "arc", "west"),
        bulges=[0.0, 0.37443593, 0.0],
    ).cut(slot)
    solution = solve(plate(outline, CLAMPED), [Pressure(-1e3)], triangles=250)
    assert (solution.state.constraints.numbering.arcs.steepness > 0.0).all()


def test_a_patch_over_the_whole_disc_is_its_pressure():
    """To round-off: the triangles at its rim are loaded whole, not slice by slice."""
    own = plate(DISC, CLAMPED)
    patch = DiscPatch(force=np.pi, centre=(0.0, 0.0), radius=1.0)
    solution = solve(own, [patch], triangles=200)
    assert solution.load_force() == pytest.approx(np.pi, rel=1e-12)
    exact = 1.0 / (64.0 * D)
    assert solution.deflection([(0.0, 0.0)])[0] == pytest.approx(exact, rel=1e-9)
