"""Stated plates: what is refused, chords told from corners, mass and rigidity."""

import math
import pickle
from dataclasses import replace

import numpy as np
import pytest

from kplate.errors import InputError
from kplate.materials import STEEL, Isotropic
from kplate.outline import Outline
from kplate.plate import Plate
from kplate.polygon import Polygon
from kplate.shapes import Circle
from kplate.supports import CLAMPED, FREE, GUIDED, SIMPLY_SUPPORTED, Support

SIDES = ("south", "east", "north", "west")
SQUARE = Outline.polygon([(0, 0), (2, 0), (2, 1), (0, 1)], sides=SIDES)


def plate(outline=SQUARE, **changes):
    stated = {"outline": outline, "thickness": 0.01, "material": STEEL, **changes}
    return Plate(**stated)


def refusal(build):
    with pytest.raises(InputError) as caught:
        build()
    return str(caught.value)


def gon(n, radius=1.0, start=0.3):
    """Vertices of a regular polygon, (n, 2)."""
    angle = start + 2.0 * np.pi * np.arange(n) / n
    return radius * np.c_[np.cos(angle), np.sin(angle)]


def turning(*degrees):
    """A line of unit pieces with these turns between them, closed over two corners.

    The pieces are called "curve", those that close the line "east", "north", "west".
    """
    headings = np.radians(np.cumsum([0.0, *degrees]))
    steps = np.c_[np.cos(headings), np.sin(headings)]
    curve = np.vstack([(0.0, 0.0), np.cumsum(steps, axis=0)])
    points = [*curve, (curve[-1, 0] - 0.2, 20.0), (0.2, 20.0)]
    return points, [*["curve"] * len(steps), "east", "north", "west"]


def chords(where, side, support):
    return (
        f"side {side!r} is {support} and bends at three or more vertices in a row from "
        f"{where} m: a curve drawn by chords. State it by arcs, as an ellipse, or drop "
        "vertices until each turn is a corner."
    )


# Numbers


@pytest.mark.parametrize("thickness", [0.0, -0.01, math.nan, math.inf])
def test_a_thickness_is_a_positive_number(thickness):
    assert refusal(lambda: plate(thickness=thickness)) == (
        f"the thickness is {thickness:g} m; it must be a positive number."
    )


@pytest.mark.parametrize("bend_turn", [-0.01, math.pi / 2, math.nan])
def test_a_bend_turns_by_less_than_a_right_angle(bend_turn):
    assert refusal(lambda: plate(bend_turn=bend_turn)) == (
        f"bend_turn is {bend_turn:g} rad; it must be at least 0 and less than a right "
        "angle."
    )


def test_mass_is_that_of_what_is_left_beside_the_holes():
    outline = SQUARE.cut(Circle(centre=(1, 0.5), radius=0.3, name="shaft"))
    stated = plate(outline, thickness=0.02)
    assert stated.mass == pytest.approx(7850.0 * 0.02 * (2.0 - 0.09 * math.pi))


def test_a_material_without_density_gives_no_mass():
    assert plate(material=Isotropic(name="unknown", E=1e9, nu=0.3)).mass is None


# D = E h^3 / 12 (1 - nu^2): Timoshenko and Woinowsky-Krieger, "Theory of Plates and
# Shells", 2nd ed. 1959, eq. 3 (from memory).
def test_rigidity_is_that_of_the_material_at_this_thickness():
    D = 210e9 * 0.01**3 / (12 * (1 - 0.3**2))
    expected = D * np.array([[1, 0.3, 0], [0.3, 1, 0], [0, 0, 0.35]])
    np.testing.assert_allclose(plate().rigidity, expected)


# Supports


def test_a_side_that_no_support_names_is_free():
    outline = SQUARE.cut(Circle(centre=(1, 0.5), radius=0.3, name="shaft"))
    held = plate(outline, supports={"south": CLAMPED})
    assert held.support("south") is CLAMPED
    assert held.support("shaft") is FREE


@pytest.mark.parametrize(
    ("name", "hint"),
    [
        ("nroth", " Did you mean 'north'?"),
        ("South", " Did you mean 'south'?"),
        ("bottom", ""),
        (3, ""),
    ],
)
def test_a_support_names_a_side(name, hint):
    assert refusal(lambda: plate(supports={name: CLAMPED})) == (
        f"unknown side {name!r}; the sides are east, north, south, west.{hint}"
    )


def test_a_support_is_not_its_word():
    assert refusal(lambda: plate(supports={"south": "clamped"})) == (
        "side 'south' is held by 'clamped'; a support is one of clamped, simply "
        "supported, free, guided."
    )


def test_a_support_that_no_equation_knows_is_refused():
    """What it holds must be what its word says."""
    sliding = Support(
        name="sliding", holds_deflection=False, holds_slope=True, words="slope held"
    )
    words = refusal(lambda: plate(supports={"south": sliding}))
    assert words.startswith("side 'south' is held by Support(name='sliding', ")
    assert words.endswith(
        "; a support is one of clamped, simply supported, free, guided."
    )


def test_supports_cannot_be_changed_from_outside():
    supports = {"south": CLAMPED}
    held = plate(supports=supports)
    supports["north"] = CLAMPED
    assert held.support("north") is FREE
    with pytest.raises(TypeError):
        held.supports["north"] = CLAMPED


def test_a_variant_is_checked_again():
    held = plate(supports={"south": CLAMPED})
    assert replace(held, thickness=0.02).support("south") is CLAMPED
    assert "thickness" in refusal(lambda: replace(held, thickness=-1.0))


def test_a_plate_survives_a_copy_to_another_process():
    copy = pickle.loads(pickle.dumps(plate(supports={"south": CLAMPED})))
    assert copy.support("south") == CLAMPED
    assert copy.support("north") == FREE
    with pytest.raises(TypeError):
        copy.supports["north"] = CLAMPED


# Curves drawn by chords


HELD = [SIMPLY_SUPPORTED, CLAMPED, GUIDED]


def ask(n, where, side, support, first=""):
    return (
        f"side {side!r} is {support} and has {n} pieces from {where} m that turn by "
        f"{360 / n:.3g} degrees each on a circle; {first}say whether they are an "
        '"arc" or a "polygon" (chords).'
    )


@pytest.mark.parametrize("support", HELD)
@pytest.mark.parametrize("n", [37, 48, 500])
def test_a_48_gon_is_a_circle(n, support):
    outline = Outline.polygon(gon(n), sides=["rim"] * n)
    assert outline.area == pytest.approx(math.pi, rel=1e-12)
    assert plate(outline, supports={"rim": support}).support("rim") is support


@pytest.mark.parametrize("support", HELD)
@pytest.mark.parametrize("n", [13, 24, 36])
def test_a_supported_24_gon_asks_what_it_is(n, support):
    held = {"supports": {"rim": support}}
    outline = Outline.polygon(gon(n), sides=["rim"] * n)
    words = refusal(lambda: plate(outline, **held))
    assert words == ask(n, "(0.955336, 0.29552)", "rim", support.name)
    arc = Outline.polygon(gon(n), sides=["rim"] * n, chords="arc")
    assert plate(arc, **held).outline.area == pytest.approx(math.pi, rel=1e-12)
    sharp = Outline.polygon(gon(n), sides=["rim"] * n, chords="polygon")
    exact = 0.5 * n * math.sin(2.0 * math.pi / n)
    assert plate(sharp, **held).outline.area == pytest.approx(exact, rel=1e-12)


def test_a_24_gon_of_many_names_asks_as_well():
    outline = Outline.polygon(gon(24))
    names = dict.fromkeys(outline.side_names, CLAMPED)
    words = ask(
        24, "(0.955336, 0.29552)", "side-1", "clamped", "give them one name and "
    )
    assert refusal(lambda: plate(outline, supports=names)) == words
    arc = Outline.polygon(gon(24), chords="arc")  # an arc of one piece each is none
    assert refusal(lambda: plate(arc, supports=names)) == words
    sharp = Outline.polygon(gon(24), chords="polygon")
    assert plate(sharp, supports=names).support("side-3") is CLAMPED


def test_a_free_24_gon_stands():
    outline = Outline.polygon(gon(24), sides=["rim"] * 24)
    assert plate(outline).support("rim") is FREE


def test_the_pieces_of_a_curve_may_have_names_of_their_own():
    outline = Outline.polygon(gon(48))
    names = dict.fromkeys(outline.side_names, SIMPLY_SUPPORTED)
    assert "a curve drawn by chords" in refusal(lambda: plate(outline, supports=names))


def test_a_supported_hole_of_chords_is_a_circle_or_asks():
    def cut(n):
        points = np.array([1.0, 0.5]) + gon(n, 0.2)
        return SQUARE.cut(Polygon(points=points, sides=["shaft"] * n))

    held = plate(cut(48), supports={"shaft": CLAMPED})
    assert held.outline.area == pytest.approx(2.0 - 0.04 * math.pi, rel=1e-12)
    words = refusal(lambda: plate(cut(24), supports={"shaft": CLAMPED}))
    assert words == ask(24, "(1.19107, 0.559104)", "shaft", "clamped")


def test_arcs_whose_tangents_were_rounded_are_no_chords():
    """A slot of a drawing to the micrometre turns by 1e-5 rad where arcs begin."""
    points = [(-0.1, -0.05), (0.1, -0.050001), (0.100001, 0.05), (-0.1, 0.049999)]
    outline = Outline.polygon(points, sides=["rim"] * 4, bulges=[0, 1, 0, 1])
    assert not outline.boundaries[0].straight.any()
    assert plate(outline, supports={"rim": SIMPLY_SUPPORTED}).mass > 0.0


def test_a_supported_octagon_stands():
    outline = Outline.polygon(gon(8), sides=["rim"] * 8)
    assert plate(outline, supports={"rim": SIMPLY_SUPPORTED}).mass > 0.0


@pytest.mark.parametrize(
    ("turns", "refused"),
    [
        ((1,), False),
        ((1, 1), False),
        ((1, 1, 1), True),
        ((-1, -1, -1), True),
        ((1, -1, 1), True),
        ((1, -30, 1), False),
        ((9.9, 9.9, 9.9), True),
        ((10.1, 10.1, 10.1), False),
        ((1, 1, 12, 1, 1), False),
        ((1, 1, 12, 1, 1, 1), True),
        ((1, 0, 1, 0, 1), True),  # a straight vertex does not part the curve
        ((1, 0, 1), False),
        ((0, 0, 0, 0), False),
    ],
)
def test_three_bends_in_a_row_are_a_curve(turns, refused):
    points, sides = turning(*turns)
    outline = Outline.polygon(points, sides=sides)
    assert plate(outline, supports={"east": CLAMPED}).mass > 0.0
    build = lambda: plate(outline, supports={"curve": CLAMPED})  # noqa: E731
    if refused:
        assert "a curve drawn by chords" in refusal(build)
    else:
        assert build().support("curve") is CLAMPED


def test_the_place_named_is_where_the_run_begins():
    points, sides = turning(0, 12, 1, 1, 1)
    outline = Outline.polygon(points, sides=sides)
    words = refusal(lambda: plate(outline, supports={"curve": CLAMPED}))
    assert words == chords("(2.97815, 0.207912)", "curve", "clamped")


def rolled(turns, shift):
    points, sides = turning(*turns)
    points, sides = np.roll(points, shift, axis=0), list(np.roll(sides, shift))
    return Outline.polygon(points, sides=sides)


@pytest.mark.parametrize("shift", range(8))
def test_a_run_that_passes_the_first_vertex_is_found(shift):
    outline = rolled((1, 1, 1, 1), shift)
    words = refusal(lambda: plate(outline, supports={"curve": CLAMPED}))
    assert words == chords("(1, 0)", "curve", "clamped")


@pytest.mark.parametrize("shift", range(6))
def test_two_bends_that_pass_the_first_vertex_stand(shift):
    outline = rolled((1, 1), shift)
    assert plate(outline, supports={"curve": CLAMPED}).support("curve") is CLAMPED


def test_a_change_of_support_parts_a_run():
    points, _ = turning(1, 1, 1, 1, 1)
    sides = ["a", "a", "a", "b", "b", "b", "east", "north", "west"]
    outline = Outline.polygon(points, sides=sides)
    for b in (FREE, SIMPLY_SUPPORTED):
        assert plate(outline, supports={"a": CLAMPED, "b": b}).support("b") is b
    alike = {"a": CLAMPED, "b": CLAMPED}
    assert "a curve drawn by chords" in refusal(lambda: plate(outline, supports=alike))


def test_a_straight_vertex_where_the_support_changes_parts_a_run():
    points, _ = turning(1, 1, 0, 1, 1)
    sides = ["a", "a", "a", "b", "b", "b", "east", "north", "west"]
    outline = Outline.polygon(points, sides=sides)
    held = {"a": CLAMPED, "b": SIMPLY_SUPPORTED}
    assert plate(outline, supports=held).support("a") is CLAMPED


@pytest.mark.parametrize(("n", "degrees"), [(48, 7.4), (24, 14.9)])
def test_the_turn_of_a_bend_can_be_set(n, degrees):
    outline = Outline.polygon(gon(n), sides=["rim"] * n, chords="polygon")
    held = {"outline": outline, "supports": {"rim": SIMPLY_SUPPORTED}}
    assert plate(**held, bend_turn=math.radians(degrees)).bend_turn > 0.0
    wider = math.radians(degrees + 0.2)
    assert "drawn by chords" in refusal(lambda: plate(**held, bend_turn=wider))


def test_a_circle_is_no_chords():
    disc = plate(Outline.circle((0, 0), radius=1), supports={"rim": SIMPLY_SUPPORTED})
    assert disc.support("rim") is SIMPLY_SUPPORTED
