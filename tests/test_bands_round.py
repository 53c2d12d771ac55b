"""Bands on plates with true arcs: they contain the answer, or say that they may not.

Rings and discs against closed forms (oracles_round.py), the others against bands of
finer meshes: two bounds of one number must have a common part.
"""

import math

import numpy as np
import oracles_round
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from oracles_series import CLAMPED, FREE, SIMPLY_SUPPORTED
from test_round_plates import PAIRS, RADII, SUPPORTS, D, P, half_disc, plate

from kplate import supports
from kplate.bands import certify
from kplate.errors import InputError
from kplate.following import followed
from kplate.functionals import functional
from kplate.goals import Deflection, MeanDeflection, Moment, Resultant
from kplate.loads import (
    Case,
    DiscPatch,
    EdgeMoment,
    Hydrostatic,
    LineForce,
    Pressure,
    RectanglePatch,
)
from kplate.meshing import mesh_outline
from kplate.outline import Outline
from kplate.roundedges import fitted, round_edges
from kplate.shapes import Circle, Ellipse, Slot
from kplate.worth import worth

HELD = (CLAMPED, SIMPLY_SUPPORTED)
SS, CL, FR, GU = (
    supports.SIMPLY_SUPPORTED,
    supports.CLAMPED,
    supports.FREE,
    supports.GUIDED,
)


def certified(stated, loads, goals, *, size=0.35, around=12):
    case = Case(name="load", loads=loads)
    outline = followed(stated.outline, [case], goals)
    mesh = fitted(mesh_outline(outline, size=size, around=around))
    there = plate(outline, dict(stated.supports))
    wanted = [functional(there, mesh, goal, [case]) for goal in goals]
    return certify(there, mesh, [case], wanted, element="quintic")


def bands(stated, loads, goals, **options):
    found = certified(stated, loads, goals, **options)
    return [own[0] for own in found.values]


def assert_contains(value, exact, slack=1e-9):
    assert value.kind == "bound", value.reason
    off = slack * abs(exact)
    assert value.lower - off <= exact <= value.upper + off


def width(value):
    return (value.upper - value.lower) / abs(value.value)


def ring(inner, outer):
    hole = Circle(centre=(0.0, 0.0), radius=RADII[0], name="hole")
    outline = Outline.circle((0.0, 0.0), radius=RADII[1]).cut(hole)
    return plate(outline, {"hole": SUPPORTS[inner], "rim": SUPPORTS[outer]})


@pytest.mark.parametrize(("inner", "outer"), PAIRS)
def test_bands_of_rings_contain_the_closed_form(inner, outer):
    """At a place, on the whole, and of what the rims bring; with loads along them."""
    pair = {"hole": inner, "rim": outer}
    loads = [Pressure(P)]
    loads += [LineForce(force=300.0, along=n) for n, s in pair.items() if s == FREE]
    loads += [EdgeMoment(moment=90.0, along=n) for n, s in pair.items() if s != CLAMPED]
    x, y = 0.7 * math.cos(0.3), 0.7 * math.sin(0.3)
    held = [name for name, support in pair.items() if support != FREE]
    goals = [Deflection(at=(x, y)), MeanDeflection()]
    goals += [Resultant(of=name) for name in held]
    share, weights = np.polynomial.legendre.leggauss(20)
    r = 0.5 * (RADII[0] + RADII[1]) + 0.5 * (RADII[1] - RADII[0]) * share

    def exact_at(places):
        return oracles_round.annulus(
            places,
            RADII,
            (inner, outer),
            pressure=P,
            forces=(300.0, 300.0),
            moments=(90.0, 90.0),
            rigidity=D,
        )

    mean = (weights * r) @ exact_at(r).w / ((weights * r).sum())
    shears = dict(zip(pair, exact_at(RADII).q_r * (-1.0, 1.0), strict=True))
    rims = dict(zip(pair, RADII, strict=True))
    exact = [float(exact_at([0.7]).w[0]), mean]
    exact += [2.0 * math.pi * rims[name] * shears[name] for name in held]
    coarse = bands(ring(inner, outer), loads, goals)
    fine = bands(ring(inner, outer), loads, goals, size=0.15, around=32)
    for a, b, own in zip(coarse, fine, exact, strict=True):
        assert_contains(a, own)
        assert_contains(b, own)
    assert width(coarse[0]) < 0.03
    assert width(fine[0]) < 0.003


@pytest.mark.parametrize("support", HELD)
def test_energies_of_discs_bracket_the_closed_form(support):
    """And meet it: w is a quartic, the moments are quadratic."""
    stated = plate(Outline.circle((0.0, 0.0), radius=1.0), {"rim": SUPPORTS[support]})
    share, weights = np.polynomial.legendre.leggauss(10)
    r = 0.5 + 0.5 * share
    w = oracles_round.disc(r, 1.0, support, pressure=P, rigidity=D).w
    exact = 0.5 * P * 2.0 * math.pi * 0.5 * (weights * r) @ w
    for loads in ([Pressure(P)], [Pressure(P), EdgeMoment(moment=0.0, along="rim")]):
        (energy,) = certified(stated, loads, []).energies
        assert_contains(energy, exact)
        assert width(energy) < 1e-9


SQUARE = Outline.polygon([(0, 0), (1, 0), (1, 1), (0, 1)], sides=("s", "e", "n", "w"))
HOLE = SQUARE.cut(Circle(centre=(0.5, 0.5), radius=0.2, name="hole"))
PANELS = {
    "square, free hole": plate(HOLE, dict.fromkeys("senw", SS)),
    "square, supported hole": plate(HOLE, {"hole": SS, "s": CL}),
    "square, clamped hole": plate(HOLE, {"hole": CL}),
    "half disc": half_disc(SS, SS),
    "half disc, clamped": half_disc(FR, CL),
    "sector of 60 degrees": plate(
        Outline.polygon(
            [(0, 0), (1, 0), (0.5, math.sqrt(0.75))],
            sides=("s", "arc", "n"),
            bulges=[0.0, math.tan(math.pi / 12.0), 0.0],
        ),
        {"s": SS, "n": SS, "arc": CL},
    ),
    "slot and fillet": plate(
        SQUARE.fillet("s", "e", radius=0.25, name="fillet").cut(
            Slot(centre=(0.45, 0.55), length=0.4, width=0.16, name="slot", angle=0.5)
        ),
        {"w": CL, "n": SS, "fillet": SS},
    ),
}


@pytest.mark.parametrize("stated", PANELS.values(), ids=PANELS)
def test_bands_of_a_coarse_mesh_contain_those_of_a_finer_one(stated):
    goals = [Deflection(at=(0.25, 0.25)), MeanDeflection()]
    goals.append(Moment(at=(0.25, 0.2), component="m_xx"))
    goals += [
        Resultant(of=name)
        for name in stated.outline.side_names
        if stated.support(name).holds_deflection
    ]
    coarse = bands(stated, [Pressure(P)], goals, size=0.3)
    fine = bands(stated, [Pressure(P)], goals, size=0.1, around=24)
    assert coarse[0].kind == fine[0].kind == coarse[1].kind == "bound"
    for a, b in zip(coarse, fine, strict=True):
        assert a.kind == b.kind
        if a.reason:  # of sides that share a corner there is none
            assert a.kind == "none"
            continue
        assert max(a.lower, b.lower) <= min(a.upper, b.upper)
        assert a.lower <= b.value <= a.upper
    assert width(fine[0]) < width(coarse[0])


@st.composite
def round_panels(draw):
    """A disc with one or two round holes, supports at random."""
    outline = Outline.circle((0.0, 0.0), radius=1.0)
    held = {"rim": draw(st.sampled_from([SS, CL]))}
    for k, side in enumerate((1.0, -1.0)[: draw(st.integers(1, 2))]):
        x, y = side * draw(st.floats(0.35, 0.55)), draw(st.floats(-0.4, 0.4))
        radius = draw(st.floats(0.05, 0.25))
        hole = Circle(centre=(x, y), radius=radius, name=f"hole {k}")
        outline = outline.cut(hole)
        held[hole.name] = draw(st.sampled_from([FR, SS, CL]))
    return plate(outline, held)


@settings(max_examples=3)
@given(round_panels())
def test_bands_of_random_panels_do_not_exclude_each_other(stated):
    goals = [Deflection(at=(0.0, 0.0)), Deflection(at=(0.05, 0.8)), MeanDeflection()]
    goals += [Resultant(of="rim")]
    loads = [Pressure(P), LineForce(force=100.0, along="hole 0")]
    found = [
        bands(stated, loads, goals, size=size, around=around)
        for size, around in ((0.5, 12), (0.2, 24))
    ]
    for a, b in zip(*found, strict=True):
        assert a.kind == b.kind == "bound"
        assert max(a.lower, b.lower) <= min(a.upper, b.upper)


# What is no bound.


def reason(stated, *loads, **options):
    (value,) = bands(stated, loads, [MeanDeflection()], **options)
    assert value.kind == "estimate"
    return value.reason


DISC = plate(Outline.circle((0.0, 0.0), radius=1.0), {"rim": CL})


def test_a_round_side_that_holds_the_slope_alone_gives_an_estimate():
    stated = plate(Outline.circle((0.0, 0.0), radius=1.0), {"rim": GU})
    stated = plate(
        stated.outline.mark((0.0, 0.0), name="post"), {**stated.supports, "post": SS}
    )
    assert "slope alone" in reason(stated, Pressure(P))


def test_a_round_zone_of_load_gives_an_estimate():
    outline = DISC.outline.zone(
        Circle(centre=(0.2, 0.0), radius=0.3, name="edge"), name="zone"
    )
    stated = plate(outline, {"rim": CL})
    assert "drawn by chords" in reason(stated, Pressure(P, zone="zone"))


def worth_on(load, around=12):
    """What bands are worth on a mesh of the disc that does not follow the load."""
    mesh = fitted(mesh_outline(DISC.outline, size=0.5, around=around))
    arcs = round_edges(DISC, mesh)
    return worth(DISC, mesh, [Case(name="load", loads=[load])], arcs), arcs


def test_loads_that_part_triangles_at_a_round_side_give_estimates():
    for load in (
        RectanglePatch(force=-1e3, centre=(0.9, 0.0), size=(0.1, 0.2)),
        DiscPatch(force=-1e3, centre=(0.85, 0.0), radius=0.1),
        Hydrostatic(level=0.2, specific_weight=-1e3),
    ):
        kind, why = worth_on(load)[0]
        assert (kind, "round side" in why) == ("estimate", True)
    within = DiscPatch(force=-1e3, centre=(0.0, 0.0), radius=0.1)
    assert worth_on(within)[0] == ("bound", "")
    assert worth_on(Hydrostatic(level=1.1, specific_weight=-1e3))[0][0] == "bound"


def test_loads_that_end_between_a_chord_and_its_arc_give_estimates():
    """No vertex of the triangle tells: all are wet, or outside the patch."""
    _, arcs = worth_on(Pressure(P))
    middle = arcs.at(np.array([0.5]))[0][0, 0]
    chord = arcs.chords[0][0]
    between = 0.5 * (middle + chord)
    up = chord / np.hypot(*chord)
    water = Hydrostatic(
        level=float(between @ up), specific_weight=-1e3, up=tuple(up.tolist())
    )
    spot = DiscPatch(force=-1.0, centre=tuple(between.tolist()), radius=1e-3)
    patch = RectanglePatch(
        force=-1.0, centre=tuple(between.tolist()), size=(1e-3, 1e-3)
    )
    for load in (water, spot, patch):
        kind, why = worth_on(load)[0]
        assert (kind, "round side" in why) == ("estimate", True)


def test_an_ellipse_is_no_run_of_circles():
    shape = Ellipse(centre=(0.0, 0.0), size=(2.0, 1.0), name="rim")
    assert "ellipse" in reason(plate(Outline.of(shape), {"rim": CL}), Pressure(P))


def test_a_load_in_a_hole_is_refused():
    stated = PANELS["square, free hole"]
    with pytest.raises(InputError):
        bands(stated, [Pressure(P)], [Deflection(at=(0.5, 0.69))])
