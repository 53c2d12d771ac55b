"""Closed lines with arcs: measures, tidying, parting, rounding, refusals."""

import math
import re

import numpy as np
import pytest
import shapely
from hypothesis import assume, given
from hypothesis import strategies as st

from kplate.errors import InputError
from kplate.polygon import Polygon
from kplate.rounding import corner, filleted, relieved

SQUARE = np.array([(0.0, 0.0), (1.0, 0.0), (1.0, 1.0), (0.0, 1.0)])
SIDES = ("south", "east", "north", "west")
LABEL = "the polygon with side 'south'"
RIGHT = math.tan(math.pi / 8)  # bulge of a quarter circle


def square(**changes):
    return Polygon(**{"points": SQUARE, "sides": SIDES, **changes})


def refusal(build):
    with pytest.raises(InputError) as caught:
        build()
    return str(caught.value)


def stadium(radius=0.5, length=1.0, sides=("rim",) * 4):
    """Two straight pieces and two half circles."""
    points = [(0, -radius), (length, -radius), (length, radius), (0, radius)]
    return Polygon(points=points, sides=sides, bulges=[0, 1, 0, 1])


@st.composite
def bulged(draw):
    """A star of three to seven corners whose pieces bulge either way."""
    n = draw(st.integers(3, 7))
    shift = draw(st.lists(st.floats(-0.25, 0.25), min_size=n, max_size=n))
    radii = draw(st.lists(st.floats(0.6, 1.0), min_size=n, max_size=n))
    bulges = draw(st.lists(st.floats(-0.15, 0.3), min_size=n, max_size=n))
    angle = 2.0 * np.pi * (np.arange(n) + shift) / n
    points = np.array(radii)[:, None] * np.c_[np.cos(angle), np.sin(angle)]
    bulges = np.where(np.abs(bulges) < 0.01, 0.0, bulges)
    try:
        line = Polygon(points=points, sides=[f"s{k}" for k in range(n)], bulges=bulges)
    except InputError:
        assume(False)
    return line


def fine(line, n=4001):
    """The region with each arc parted into n chords, by shapely."""
    points = []
    for start, end, bulge in zip(line.points, line.ends, line.bulges, strict=True):
        if bulge == 0.0:
            points.append(start[None])
            continue
        sweep = 4.0 * math.atan(bulge)
        half = 0.5 * (end - start)
        centre = start + half + np.array([-half[1], half[0]]) / math.tan(0.5 * sweep)
        arm = start - centre
        angle = np.linspace(0.0, sweep, n)[:-1]
        c, s = np.cos(angle), np.sin(angle)
        points.append(centre + np.c_[c * arm[0] - s * arm[1], s * arm[0] + c * arm[1]])
    return shapely.Polygon(np.vstack(points))


# Measures


@given(bulged())
def test_a_line_with_arcs_measures_as_its_fine_chords_do(line):
    region = fine(line)
    assert line.area == pytest.approx(region.area, rel=1e-6)
    assert line.perimeter == pytest.approx(region.length, rel=1e-6)
    assert line.box == pytest.approx(region.bounds, abs=1e-6)
    assert line.region.symmetric_difference(region).area < 1e-5
    # Turns at vertices and along arcs add up to a full turn.
    whole = line.turns.sum() + 4.0 * np.arctan(line.bulges).sum()
    assert whole == pytest.approx(2.0 * np.pi)


def test_a_stadium_measures_as_a_rectangle_and_a_circle():
    line = stadium()
    assert line.area == pytest.approx(1.0 + 0.25 * math.pi, rel=1e-14)
    assert line.perimeter == pytest.approx(2.0 + math.pi, rel=1e-14)
    assert line.box == (-0.5, -0.5, 1.5, 0.5)
    assert line.straight.all()
    np.testing.assert_allclose(line.circles[1], (1.0, 0.0, 0.5))


def test_two_arcs_are_enough_for_a_line():
    line = Polygon(points=[(0, -1), (0, 1)], sides=["a", "b"], bulges=[1, 0])
    assert line.area == pytest.approx(0.5 * math.pi)
    np.testing.assert_allclose(np.abs(line.turns), 0.5 * math.pi)
    assert refusal(lambda: Polygon(points=[(0, 0), (1, 0)], sides=SIDES[:2])) == (
        f"{LABEL} has points of shape (2, 2); it takes at least three pairs (x, y), "
        "two where a piece is an arc."
    )


# Tidying


@pytest.mark.parametrize("side", ["north", "roof"])
def test_a_vertex_hardly_off_a_line_is_merged_and_noted(side):
    """Dropped within a side; put on the line where two sides meet."""
    off = 2e-7
    points = np.insert(SQUARE, 3, (0.5, 1.0 + off), axis=0)
    line = Polygon(points=points, sides=("south", "east", "north", side, "west"))
    assert line.notes == ("merged into the straight line: (0.5, 1) m by 2e-07 m",)
    assert line.area == pytest.approx(1.0, rel=1e-14)
    assert len(line.points) == (4 if side == "north" else 5)
    assert line.straight.sum() == len(line.points) - 4


def test_many_merged_vertices_are_counted():
    x = np.linspace(0.0, 1.0, 12)[1:-1]
    wavy = np.c_[x, 1e-7 * (-1.0) ** np.arange(10)]
    points = np.vstack([SQUARE[:1], wavy, SQUARE[1:]])
    line = Polygon(points=points, sides=["south"] * 11 + ["east", "north", "west"])
    assert len(line.points) == 4
    assert line.notes[0].endswith(" and 5 more")
    assert line.notes[0].count(" by ") == 5


def test_the_snap_distance_can_be_set():
    points = np.insert(SQUARE, 1, (0.5, -1e-4), axis=0)
    sides = ("south", *SIDES)
    assert len(Polygon(points=points, sides=sides).points) == 5
    assert len(Polygon(points=points, sides=sides, snap=1e-3).points) == 4
    assert len(Polygon(points=points, sides=sides, snap=0.0).points) == 5


def test_far_from_the_origin_round_off_is_no_offset():
    """Coordinates of 1e6 m have steps of 1e-10 m; nothing is merged for ever."""
    here, third = np.array([1e6, 2e6 / 3]), np.insert(SQUARE, 1, 0.0, axis=0)
    third[1:3] = (1 / 3, 0.1 / 3), (1.0, 0.1)
    names = ("a", "b", "c", "d", "e")
    line = Polygon(points=third + here, sides=names)
    assert line.straight.tolist() == [False, True, False, False, False]
    assert line.notes == ()
    third[1, 1] += 1e-7
    moved = Polygon(points=third + here, sides=names)
    assert moved.straight[1]
    assert len(moved.notes) == 1


@pytest.mark.parametrize("n", [48, 5000])
def test_chords_of_a_circle_are_arcs_before_they_are_straight(n):
    """The vertices of 5000 chords are off by less than the snap distance."""
    angle = 2.0 * np.pi * np.arange(n) / n
    line = Polygon(points=np.c_[np.cos(angle), np.sin(angle)], sides=["rim"] * n)
    assert line.area == pytest.approx(math.pi, rel=1e-12)
    assert line.notes == (
        f"{n} chords of 'rim' from (1, 0) m taken for an arc of radius 1 m",
    )


@pytest.mark.parametrize(("chords", "area"), [("ask", 0), ("polygon", 0), ("arc", 1)])
def test_a_24_gon_is_what_it_is_said_to_be(chords, area):
    angle = 2.0 * np.pi * np.arange(24) / 24
    points = np.c_[np.cos(angle), np.sin(angle)]
    line = Polygon(points=points, sides=["rim"] * 24, chords=chords)
    expected = math.pi if area else 12.0 * math.sin(math.pi / 12.0)
    assert line.area == pytest.approx(expected, rel=1e-12)


# Parting


@given(bulged(), st.floats(0.05, 0.95), st.data())
def test_a_split_piece_stays_where_it_is(line, share, data):
    piece = data.draw(st.integers(0, len(line.points) - 1))
    parted = line.split(piece, share, ("a", "b"))
    assert parted.area == pytest.approx(line.area, rel=1e-12)
    assert parted.sides[piece : piece + 2] == ("a", "b")
    np.testing.assert_allclose(
        parted.lengths[piece : piece + 2],
        line.lengths[piece] * np.array([share, 1.0 - share]),
    )
    assert parted.straight[piece + 1]


def test_a_part_of_a_side_takes_its_own_name():
    line = square().parted("south", "door", (0.25, 0.5))
    assert line.sides == ("south", "door", "south", "east", "north", "west")
    np.testing.assert_allclose(line.lengths[:3], (0.25, 0.25, 0.5))
    assert square().parted("south", "door", (0.0, 1.0)).sides[0] == "door"
    half = square().parted("south", "door", (0.0, 0.5))
    assert half.sides == ("door", "south", "east", "north", "west")


def test_a_part_may_reach_over_pieces_of_its_side():
    """The stretch runs through the first vertex."""
    sides = ("edge", "east", "north", "edge")
    line = square(sides=sides).parted("edge", "door", (0.25, 0.75))
    own = [i for i, side in enumerate(line.sides) if side == "door"]
    assert sum(line.lengths[own]) == pytest.approx(1.0)
    ends = np.vstack([line.points[own], line.ends[own]])
    assert {tuple(p) for p in ends} == {(0.0, 0.5), (0.0, 0.0), (0.5, 0.0)}


def test_a_part_of_a_closed_side_is_measured_from_its_first_point():
    line = stadium().parted("rim", "bend", (1.0 / (2.0 + math.pi), 0.5))
    own = [i for i, side in enumerate(line.sides) if side == "bend"]
    assert line.bulges[own].tolist() == [1.0]


def test_parts_are_found_between_points_near_the_side():
    line = square()
    for ends in (((0.2, 1.01), (0.9, 1.0)), ((0.9, 1.0), (0.2, 1.01))):
        assert line.fractions("north", ends) == pytest.approx((0.1, 0.8))
    far = refusal(lambda: line.fractions("south", ((0.1, 0.0), (0.5, 0.1))))
    assert far == "(0.5, 0.1) m is 0.1 m away from side 'south'; give a point on it."
    rim = stadium()
    whole = 2.0 + math.pi
    found = rim.fractions("rim", ((1.5, 0.0), (0.5, 0.5)))
    assert found == pytest.approx(
        ((1 + math.pi / 4) / whole, (1.5 + math.pi / 2) / whole)
    )


@pytest.mark.parametrize("fractions", [(0.5, 0.5), (0.7, 0.2), (-0.1, 0.5), (0.5, 1.1)])
def test_a_part_has_a_length_on_its_side(fractions):
    low, high = fractions
    assert refusal(lambda: square().parted("south", "door", fractions)) == (
        f"the part 'door' of side 'south' runs from {low:g} to {high:g} of its length; "
        "it must run from a smaller to a larger share, 0 to 1."
    )


def test_a_side_in_two_stretches_cannot_be_parted():
    line = square(sides=("a", "east", "a", "west"))
    assert refusal(lambda: line.parted("a", "door", (0.2, 0.4))) == (
        "side 'a' is in 2 stretches; give each a name of its own before parting one."
    )


# Rounding


@pytest.mark.parametrize("order", [("south", "east"), ("east", "south")])
def test_a_fillet_touches_both_sides(order):
    """It takes (1 - pi/4) r^2 off a right corner."""
    line = filleted(square(), order, 0.2)
    assert line.area == pytest.approx(1.0 - (1.0 - math.pi / 4.0) * 0.04, rel=1e-14)
    assert line.straight.tolist() == [False, True, True, False, False]
    assert line.sides[1] == "fillet of south and east"
    np.testing.assert_allclose(line.circles[1], (0.8, 0.2, 0.2))
    assert filleted(square(), order, 0.2, "bend").sides[1] == "bend"


@given(st.floats(15.0, 165.0), st.booleans())
def test_a_fillet_of_any_corner_touches_both_sides(degrees, hollow):
    """Its points are r cot(a/2) off the corner, a the angle between the sides."""
    a = math.radians(degrees)
    arm = 2.0 * np.array([math.cos(a), math.sin(a)])
    points = [(0.0, 0.0), (2.0, 0.0), arm]
    sides = ("first", "far", "last")
    if hollow:
        points = [(0, 0), tuple(arm), (-5, 5), (-5, -5), (5, -5), (2, 0)]
        sides = ("last", "a", "b", "c", "d", "first")
    line = Polygon(points=points, sides=sides)
    radius = 0.1 * math.tan(0.5 * a)
    rounded = filleted(line, ("first", "last"), radius, "bend")
    bend = rounded.sides.index("bend")
    assert rounded.circles[bend, 2] == pytest.approx(radius)
    assert np.hypot(*rounded.points[bend]) == pytest.approx(0.1)
    ends = [bend, (bend + 1) % len(rounded.sides)]
    np.testing.assert_allclose(rounded.turns[ends], 0.0, atol=1e-9)


def test_a_relief_takes_off_what_is_within_its_radius():
    """Three quarters of a disc at a re-entrant right corner, a quarter at a corner."""
    L = [(0, 0), (2, 0), (2, 1), (1, 1), (1, 2), (0, 2)]
    line = Polygon(points=L, sides=("a", "b", "c", "d", "e", "f"))
    cut = relieved(line, ("c", "d"), 0.1)
    assert cut.area == pytest.approx(3.0 - 0.75 * math.pi * 0.01, rel=1e-14)
    assert cut.sides[3] == "relief of c and d"
    notched = relieved(square(), ("south", "east"), 0.1)
    assert notched.area == pytest.approx(1.0 - 0.25 * math.pi * 0.01, rel=1e-14)


def test_what_cannot_be_rounded_is_refused():
    corner = "the fillet at (1, 0) m"
    line = square()
    assert refusal(lambda: filleted(line, ("south", "east"), 1.0)) == (
        f"{corner} takes 1 m of both sides but the shorter has 1 m; take a smaller "
        "radius."
    )
    for radius in (0.0, -1.0, math.nan, math.inf):
        assert refusal(lambda r=radius: filleted(line, ("south", "east"), r)) == (
            f"the radius of {corner} must be positive and finite."
        )
    assert refusal(lambda: filleted(line, ("south", "north"), 0.1)) == (
        "sides 'south' and 'north' do not meet at a corner; the corners are "
        "west/south, south/east, east/north, north/west."
    )
    round_east = square(bulges=[0, 0.2, 0, 0])
    assert refusal(lambda: filleted(round_east, ("south", "east"), 0.1)) == (
        "the corner at (1, 0) m is not between straight pieces; a fillet needs two."
    )


def test_a_side_that_meets_itself_has_a_corner_with_itself():
    sides = ("rim", "rim", "north", "rim")
    line = square(sides=sides)
    assert refusal(lambda: corner(line, ("rim", "rim"))).startswith(
        "sides 'rim' and 'rim' meet more than once; the corners are "
    )
    one = square(sides=("rim", "rim", "north", "west"))
    assert corner(one, ("rim", "rim")) == 1
    rounded = filleted(one, ("rim", "rim"), 0.1, "rim")
    assert rounded.sides == ("rim", "rim", "rim", "north", "west")
    assert rounded.area == pytest.approx(1.0 - (1.0 - math.pi / 4.0) * 0.01)


def test_a_variant_keeps_the_notes():
    points = np.insert(SQUARE, 3, (0.5, 1.0 + 2e-7), axis=0)
    line = Polygon(points=points, sides=("south", "east", "north", "north", "west"))
    assert len(line.notes) == 1
    for variant in (
        filleted(line, ("south", "east"), 0.1),
        line.parted("south", "door", (0.2, 0.4)),
        line.split(0, 0.5, ("a", "b")),
    ):
        assert variant.notes == line.notes


# Refusals


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        (
            {"bulges": [0, 0, 1]},
            " has 4 points and 3 bulges; give one for each piece, from each point to "
            "the next.",
        ),
        (
            {"bulges": [0, 0, 31, 0]},
            ": piece 3 has bulge 31; it must lie between -30 and 30.",
        ),
        (
            {"bulges": [0, math.nan, 0, 0]},
            ": piece 2 has bulge nan; it must lie between -30 and 30.",
        ),
        (
            {"chords": "round"},
            ": chords is 'round'; it must be ask, arc or polygon.",
        ),
        (
            {"snap": 2.0},
            ": snap is 2 m; it must be at least 0 and less than the size.",
        ),
        (
            {"snap": -1.0},
            ": snap is -1 m; it must be at least 0 and less than the size.",
        ),
        (
            {"bulges": [0, -1, 0, 0]},
            ": the line turns back on itself at point 2, (1, 0) m; take the spike out.",
        ),
        (
            {"points": SQUARE[::-1], "bulges": [0, 0.1, 0, 0]},
            " runs clockwise from (0, 1) m; list its points counter-clockwise, with "
            "their side names.",
        ),
    ],
)
def test_a_line_that_cannot_be_is_refused(changes, words):
    assert refusal(lambda: square(**changes)) == LABEL + words


def test_arcs_that_cross_are_refused_where_they_do():
    """Both come 0.45 into a plate of width 0.8, by symmetry at half the width."""
    words = refusal(lambda: square(points=SQUARE * (1, 0.8), bulges=[-0.9, 0, -0.9, 0]))
    assert re.match(rf"{LABEL} crosses or touches itself at \(\S+, 0\.4\) m; ", words)


@pytest.mark.parametrize("bulges", ["half", [0, 1j, 0, 0], [[0, 0, 0, 0]], 3.0])
def test_bulges_are_numbers(bulges):
    words = refusal(lambda: square(bulges=bulges))
    assert words == f"bulges are {bulges!r}; give a number for each piece."


@pytest.mark.parametrize("gap", [0.4e-6, 3e-6])
def test_arcs_do_not_come_next_to_the_line_itself(gap):
    """A slot whose round bottom all but touches the side below it."""
    points = [
        (0, 0), (1, 0), (1, 1), (0.55, 1), (0.55, 0.05 + gap), (0.45, 0.05 + gap),
        (0.45, 1), (0, 1),
    ]  # fmt: skip
    bulges = [0, 0, 0, 0, -1, 0, 0, 0]
    build = lambda: Polygon(points=points, sides=["rim"] * 8, bulges=bulges)  # noqa: E731
    if gap < 1e-6:
        assert re.fullmatch(
            r"the polygon with side 'rim' comes within 4\S*e-07 m of itself at "
            r"\((0\.5|0\.4999\d*|0\.5000\d*), 4\S*e-07\) m; part it there, or leave "
            r"a gap\.",
            refusal(build),
        )
    else:
        assert build().area < 1.0


def test_a_tiny_fillet_is_no_neck():
    line = filleted(square(), ("south", "east"), 1e-5)
    assert line.area == pytest.approx(1.0, abs=1e-10)
