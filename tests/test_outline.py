"""Outlines: measures against exact values, and every refusal with its words."""

import math
import pickle
import re

import numpy as np
import pytest
import shapely
from hypothesis import assume, given
from hypothesis import strategies as st

from kplate.errors import InputError
from kplate.outline import Outline
from kplate.polygon import Polygon
from kplate.shapes import Circle

SQUARE = np.array([(0.0, 0.0), (1.0, 0.0), (1.0, 1.0), (0.0, 1.0)])
L_SHAPE = np.array([(0, 0), (4, 0), (4, 1), (2, 1), (2, 2), (0, 2)])
LABEL = "the polygon with side 'side-1'"


def polygon(points, name="hole"):
    return Polygon(points=points, sides=[name] * len(points))


def square(x, y, half, name="hole"):
    return polygon(2.0 * half * (SQUARE - 0.5) + (x, y), name)


def circle(x, y, radius, name="hole"):
    return Circle(centre=(x, y), radius=radius, name=name)


def refusal(build):
    """The message with which something is refused."""
    with pytest.raises(InputError) as caught:
        build()
    return str(caught.value)


def fan(radii, angles):
    """Points at some radii and rising angles from the origin, (n, 2)."""
    angles = np.asarray(angles)
    return np.asarray(radii)[:, None] * np.c_[np.cos(angles), np.sin(angles)]


@st.composite
def stars(draw, least=3, most=9):
    """A polygon around the origin, counter-clockwise, every vertex a clear turn."""
    n = draw(st.integers(least, most))
    shift = draw(st.lists(st.floats(-0.3, 0.3), min_size=n, max_size=n))
    radii = draw(st.lists(st.floats(0.4, 1.0), min_size=n, max_size=n))
    points = fan(radii, 2.0 * np.pi * (np.arange(n) + shift) / n)
    ahead = np.roll(points, -1, axis=0) - points
    behind = np.roll(ahead, 1, axis=0)
    cross = np.abs(behind[:, 0] * ahead[:, 1] - behind[:, 1] * ahead[:, 0])
    assume((cross > 1e-4).all())
    return points


# Measures


@given(stars(), st.floats(-1e6, 1e6), st.floats(-1e6, 1e6))
def test_a_polygon_measures_as_shapely_does_wherever_it_lies(points, x, y):
    moved = points + np.array([x, y])
    outline, reference = Outline.polygon(moved), shapely.Polygon(points)
    blur = 1e-9 if max(abs(x), abs(y)) > 1.0 else 1e-14  # coordinates are rounded
    assert outline.area == pytest.approx(reference.area, abs=blur)
    assert outline.rim.perimeter == pytest.approx(reference.length, abs=blur)
    assert sum(outline.side_length(s) for s in outline.side_names) == pytest.approx(
        reference.length, abs=blur
    )


@given(stars())
def test_turns_of_a_closed_line_add_up_to_a_full_turn(points):
    assert Outline.polygon(points).rim.turns.sum() == pytest.approx(2 * np.pi)


def test_turns_are_positive_to_the_left():
    turns = Outline.polygon(L_SHAPE).rim.turns
    right = math.pi / 2
    np.testing.assert_allclose(turns, [right, right, right, -right, right, right])


def test_a_regular_polygon_turns_alike_at_every_vertex():
    points = fan(np.full(7, 3.0), 2 * np.pi * np.arange(7) / 7)
    np.testing.assert_allclose(Outline.polygon(points).rim.turns, 2 * np.pi / 7)


def test_area_leaves_the_holes_out():
    outline = Outline.polygon(L_SHAPE).cut(circle(1, 1, 0.5, "a"), square(3, 0.5, 0.25))
    assert outline.area == pytest.approx(6.0 - 0.25 * math.pi - 0.25, rel=1e-15)
    ring = Outline.circle((1, 2), radius=3).cut(circle(1, 2, 1))
    assert ring.area == pytest.approx(8.0 * math.pi, rel=1e-15)


def test_a_side_of_several_pieces_is_as_long_as_all_of_them():
    names = ["low", "right", "low", "right", "high", "left"]
    outline = Outline.polygon(L_SHAPE, sides=names).cut(circle(1, 1, 0.5, "shaft"))
    assert outline.side_names == ("low", "right", "high", "left", "shaft")
    lengths = [outline.side_length(name) for name in outline.side_names]
    np.testing.assert_allclose(lengths, [6.0, 2.0, 2.0, 2.0, math.pi])


def test_size_and_box_are_those_of_the_box_around():
    assert Outline.polygon(L_SHAPE).size == math.hypot(4, 2)
    assert Outline.polygon(L_SHAPE - (1, 3)).box == (-1, -3, 3, -1)
    disc = Outline.circle((1, 2), radius=0.5)
    assert disc.box == (0.5, 1.5, 1.5, 2.5)
    assert disc.size == pytest.approx(math.sqrt(2), rel=1e-15)


# Exact: the incircle of a triangle has the radius area / half perimeter.
@pytest.mark.parametrize(
    ("points", "span"),
    [
        (SQUARE, 1.0),
        (SQUARE * (1.0, 0.001), 0.001),
        ([(0, 0), (3, 0), (0, 4)], 2.0),
        ([(0, 0), (1, 0), (0.5, math.sqrt(0.75))], 1 / math.sqrt(3)),
        (L_SHAPE, 2.0),
    ],
)
def test_span_is_the_largest_circle_inside_the_rim(points, span):
    points = np.asarray(points, dtype=float)
    slack = 2e-4 * np.hypot(*np.ptp(points, axis=0))
    assert span - slack <= Outline.polygon(points).span <= span * (1 + 1e-9)


def test_span_disregards_holes_and_is_the_diameter_of_a_disc():
    disc = Outline.circle((1, 2), radius=0.5).cut(circle(1, 2, 0.3))
    assert disc.span == 1.0
    assert Outline.polygon(SQUARE).cut(circle(0.5, 0.5, 0.4)).span == pytest.approx(1)


def test_a_vertex_on_a_straight_side_is_straight_in_spite_of_round_off():
    third = 1.0 + np.array([(0.0, 0.0), (1 / 3, 0.1), (1.0, 0.3), (0.0, 1.0)])
    line = Outline.polygon(third).rim
    assert line.straight.tolist() == [False, True, False, False]


def test_pieces_that_nobody_names_are_numbered():
    assert Outline.polygon(SQUARE).side_names == (
        "side-1",
        "side-2",
        "side-3",
        "side-4",
    )
    assert Outline.circle((0, 0), radius=1).side_names == ("rim",)


def test_points_cannot_be_changed_from_outside():
    points = SQUARE.copy()
    outline = Outline.polygon(points)
    points[0] = 99.0
    assert outline.area == 1.0
    with pytest.raises(ValueError, match="read-only"):
        outline.rim.points[0] = 99.0


def test_holes_and_names_are_kept_as_plain_tuples():
    holes = [circle(0.5, 0.5, 0.1)]
    outline = Outline(rim=square(0.5, 0.5, 0.5, "rim"), holes=holes)
    holes.clear()
    assert len(outline.holes) == 1
    named = Outline.polygon(SQUARE, sides=np.array(["s", "e", "n", "w"]))
    assert repr(named.side_names) == "('s', 'e', 'n', 'w')"


def test_an_outline_survives_a_copy_to_another_process():
    outline = Outline.polygon(L_SHAPE).cut(circle(1, 1, 0.5))
    assert outline.span > 0.0  # fills what is cached
    copy = pickle.loads(pickle.dumps(outline))
    assert copy.area == outline.area
    assert copy.side_names == outline.side_names


# Refusals of a single line


@pytest.mark.parametrize(
    ("points", "words"),
    [
        (
            [(0, 0), (1, 1), (1, 0), (0, 1)],
            " crosses or touches itself at (0.5, 0.5) m; list its points in the order "
            "in which a pencil would draw it.",
        ),
        (
            [(0, 0), (1, 0), (1, 1), (0.5, 0), (0, 1)],
            " crosses or touches itself at (0.5, 0) m; list its points in the order in "
            "which a pencil would draw it.",
        ),
        (
            [(0, 0), (1, 0), (1, 1), (0.5, 1e-9), (0, 1)],
            " comes within 1e-09 m of itself at (0.5, 1e-09) m; part it there, or "
            "leave a gap.",
        ),
        (
            [(0, 1), (1, 1), (1, 0), (0, 0)],
            " runs clockwise from (0, 1) m; list its points counter-clockwise, with "
            "their side names.",
        ),
        (
            [(0, 0), (1, 0), (1, 1e-7), (1, 1)],
            ": points 2 and 3 coincide near (1, 0) m; drop one of them.",
        ),
        (
            [(0, 0), (1, 0), (1, 1), (0, 0)],
            ": points 4 and 1 coincide near (0, 0) m; drop one of them.",
        ),
        (
            [(2, 3)] * 4,
            ": points 1 and 2 coincide near (2, 3) m; drop one of them.",
        ),
        (
            [(0, 0), (1, 0), (2, 0), (1, 0.0), (1, 1), (0, 1)],
            ": the line turns back on itself at point 3, (2, 0) m; take the spike out.",
        ),
        (
            [(0, 0), (1, 0), (2, 0)],
            ": the line turns back on itself at point 1, (0, 0) m; take the spike out.",
        ),
        (
            [(0, 0), (1, 0), (math.nan, 1)],
            ": point 3 is (nan, 1) m; coordinates must be numbers in m, no larger than "
            "1e+09.",
        ),
        (
            [(0, 0), (math.inf, 0), (0, 1)],
            ": point 2 is (inf, 0) m; coordinates must be numbers in m, no larger than "
            "1e+09.",
        ),
        (
            [(0, 0), (1e200, 0), (0, 1e200)],
            ": point 2 is (1e+200, 0) m; coordinates must be numbers in m, no larger "
            "than 1e+09.",
        ),
        (
            [(0, 0), (1, 0)],
            " has points of shape (2, 2); it takes at least three pairs (x, y), two "
            "where a piece is an arc.",
        ),
        (
            [(0, 0, 0), (1, 0, 0), (0, 1, 0)],
            " has points of shape (3, 3); it takes at least three pairs (x, y), two "
            "where a piece is an arc.",
        ),
        (
            None,
            " has points of shape (); it takes at least three pairs (x, y), two "
            "where a piece is an arc.",
        ),
    ],
)
def test_a_line_that_cannot_be_is_refused(points, words):
    assert refusal(lambda: Outline.polygon(points)) == LABEL + words


@pytest.mark.parametrize(
    ("points", "shown"),
    [
        ([(0, 0), (1, 0), (1,)], "[(0, 0), (1, 0), (1,)]"),
        ([(0, 0), (1, 0), 3], "[(0, 0), (1, 0), 3]"),
        ("square", "'square'"),
        ([("a", "b")] * 3, "[('a', 'b'), ('a', 'b'), ('a', 'b')]"),
        ([("0", "0"), ("1", "0"), ("0", "1")], "[('0', '0'), ('1', '0'), ('0', '1')]"),
        ([(0, 0), (1, 0), (0, 1j)], "[(0, 0), (1, 0), (0, 1j)]"),
        ({}, "{}"),
        ([{}, {}, {}], "[{}, {}, {}]"),
        (
            [(k, k**2) for k in range(9)] + [None],
            "[(0, 0), (1, 1), (2, 4), (3, 9), (4, 16), (5, 25), ...]",
        ),
    ],
)
def test_what_is_no_pairs_of_numbers_is_refused(points, shown):
    words = f"the points of a polygon are {shown}; give pairs (x, y) of numbers in m."
    assert refusal(lambda: Outline.polygon(points)) == words
    assert refusal(lambda: polygon(points)) == words


def test_a_polygon_without_points_is_refused():
    assert refusal(lambda: Outline.polygon([])) == (
        "a polygon has points of shape (0,); it takes at least three pairs (x, y), two "
        "where a piece is an arc."
    )


@pytest.mark.parametrize("gap", [0.5, 2.0])
@pytest.mark.parametrize(
    "build",
    [
        lambda d: [(0, 0), (1, 0), (1, d), (0, 1)],  # points that coincide
        lambda d: [(0, 0), (1, 0), (1, 1), (0.5, d), (0, 1)],  # a neck
    ],
)
def test_lengths_below_the_snap_share_of_the_size_are_none(build, gap):
    """At any scale: what is refused at half the snap length stands at twice it."""
    for scale in (1e-3, 1.0, 1e3):
        points = scale * np.array(build(gap * 1e-6 * math.sqrt(2)))
        if gap < 1.0:
            refusal(lambda points=points: Outline.polygon(points))
        else:
            assert Outline.polygon(points).area > 0.0


def test_a_bend_of_a_curve_is_no_mistake():
    points = [(0, 0), (0.5, -1e-4), (1, 0), (1, 1), (0, 1)]
    assert not Outline.polygon(points).rim.straight[1]


def test_a_tiny_chamfer_is_no_mistake():
    """Its vertices are next to the line between their neighbours but turn clearly."""
    cut = 1.2e-6
    points = [(0, 0), (1 - cut, 0), (1, cut), (1, 1), (0, 1)]
    turns = np.degrees(Outline.polygon(points).rim.turns)
    np.testing.assert_allclose(turns, [90, 45, 45, 90, 90])


# Names


def test_names_and_pieces_must_match():
    assert refusal(lambda: Outline.polygon(SQUARE, sides=["a", "b", "c"])) == (
        "the polygon with side 'a' has 4 points and 3 side names; give one for each "
        "piece, from each point to the next."
    )


@pytest.mark.parametrize("name", ["", " south", "south ", "\t", None, 3])
def test_a_name_is_text_without_space_around_it(name):
    words = (
        f"a side is called {name!r}; a name is text of at least one character, with no "
        "space around it."
    )
    sides = ["a", name, "b", "c"]
    assert refusal(lambda: Outline.polygon(SQUARE, sides=sides)) == words
    assert refusal(lambda: Outline.circle((0, 0), radius=1, side=name)) == words
    assert refusal(
        lambda: Outline.polygon(SQUARE).cut(circle(0.5, 0.5, 0.1, name))
    ) == (words)


@pytest.mark.parametrize("sides", ["abcd", 4])
def test_names_come_in_a_list(sides):
    words = (
        f"the side names of a polygon are {sides!r}; give a list with a name for each "
        "piece."
    )
    assert refusal(lambda: Outline.polygon(SQUARE, sides=sides)) == words
    assert refusal(lambda: Polygon(points=SQUARE, sides=sides)) == words


@pytest.mark.parametrize(
    "holes",
    [
        [circle(0.5, 0.5, 0.1, "side-2")],
        [square(0.5, 0.5, 0.1, "side-2")],
        [circle(0.2, 0.2, 0.1, "a"), square(0.7, 0.7, 0.1, "a")],
    ],
)
def test_a_name_stands_on_one_line_only(holes):
    name = holes[0].sides[0]
    assert refusal(lambda: Outline.polygon(SQUARE).cut(*holes)) == (
        f"side name {name!r} stands on two closed lines; the rim and each hole need "
        "names of their own."
    )


# Circles


@pytest.mark.parametrize(
    ("centre", "radius", "words"),
    [
        ((0, 0), 0.0, "radius 0 m; it must be positive."),
        ((0, 0), -1.0, "radius -1 m; it must be positive."),
        ((0, math.nan), 1.0, "centre nan; it must be finite, no larger than 1e+09."),
        ((0, 0), math.inf, "radius inf; it must be finite, no larger than 1e+09."),
        ((0, 0, 0), 1.0, "centre (0, 0, 0); give a pair of numbers in m."),
        (3.0, 1.0, "centre 3.0; give a pair of numbers in m."),
        (("a", 0), 1.0, "centre ('a', 0); give a pair of numbers in m."),
        ("12", 1, "centre '12'; give a pair of numbers in m."),
        ((1j, 0), 1, "centre 1j; it must be a number."),
        ((0, 0), "10 mm", "radius '10 mm'; it must be a number."),
        ((0, 0), None, "radius None; it must be a number."),
    ],
)
def test_a_circle_that_cannot_be_is_refused(centre, radius, words):
    build = lambda: Circle(centre=centre, radius=radius, name="shaft")  # noqa: E731
    assert refusal(build) == "circle 'shaft' has " + words


def test_only_closed_lines_make_an_outline():
    words = (
        "'shaft' is no closed line; a rim, hole or zone is a Polygon, Circle, Slot, "
        "Rectangle or Ellipse."
    )
    assert refusal(lambda: Outline.polygon(SQUARE).cut("shaft")) == words
    assert refusal(lambda: Outline(rim="shaft")) == words
    assert refusal(lambda: Outline.polygon(SQUARE).zone("shaft", name="a")) == words


# Holes against the rim

RIMS = {"polygon": square(0, 0, 1, "rim"), "circle": circle(0, 0, 1, "rim")}
HOLES = {"polygon": square, "circle": circle}
INSIDE = (
    "a hole must lie strictly inside the plate. Move or shrink it, or cut the notch "
    "into the outline."
)
pairings = [
    pytest.param(rim, hole, id=f"{hole} in {rim}") for rim in RIMS for hole in HOLES
]


@pytest.mark.parametrize(("rim", "hole"), pairings)
@pytest.mark.parametrize(
    ("x", "y", "half"),
    [(0, 0, 0.5), (0.3, -0.2, 0.4), (0, 0, 0.7), (-0.6, 0, 0.3)],
)
def test_a_hole_strictly_inside_is_cut(rim, hole, x, y, half):
    outline = Outline(rim=RIMS[rim]).cut(HOLES[hole](x, y, half))
    area = {"polygon": 4.0, "circle": math.pi}
    assert outline.area == pytest.approx(area[rim] - area[hole] * half**2)


@pytest.mark.parametrize(("rim", "hole"), pairings)
@pytest.mark.parametrize(
    ("x", "half"), [(3, 0.5), (0, 3), (0.5, 3), (1, 0.3), (0.8, 0.5), (1.6, 0.5)]
)
def test_a_hole_that_is_outside_or_around_or_across_is_refused(rim, hole, x, half):
    words = refusal(lambda: Outline(rim=RIMS[rim]).cut(HOLES[hole](x, 0.05, half)))
    start = "hole 1 ('hole') crosses or lies outside the outline near ("
    assert words.startswith(start)
    assert words.endswith(f") m; {INSIDE}")


def place_in(words):
    """The place in m that a message names."""
    x, y = re.search(r"near \((\S+), (\S+)\) m", words).groups()
    return shapely.Point(float(x), float(y))


@pytest.mark.parametrize(
    ("rim", "hole"),
    [
        ("polygon", square(0.5, 0.2, 0.5)),
        ("polygon", circle(0.5, 0.2, 0.5)),
        ("polygon", square(0, 0, 1)),
        ("polygon", square(0.5, 0.2, 0.5 - 1e-6)),
        ("polygon", square(0.5, 0.2, 0.5 + 1e-6)),
        ("polygon", circle(0.5, 0.2, 0.5 - 1e-6)),
        ("polygon", circle(1.5, 0.2, 0.5)),
        ("circle", square(0, 0, math.sqrt(0.5))),
        ("circle", circle(0.3, 0.4, 0.5)),
        ("circle", circle(0.3, 0.4, 0.5 - 1e-6)),
        ("circle", circle(0, 0, 1)),
    ],
)
def test_a_hole_that_touches_is_refused_where_it_touches(rim, hole):
    words = refusal(lambda: Outline(rim=RIMS[rim]).cut(hole))
    # A circle that touches from outside is no nearer to inside than one that crosses.
    outside = isinstance(hole, Circle) and hole.centre[0] > 1
    how = "crosses or lies outside" if outside else "touches"
    assert words.startswith(f"hole 1 ('hole') {how} the outline near (")
    assert words.endswith(f") m; {INSIDE}")
    for line in (RIMS[rim], hole):  # chords of circles are off by up to 1e-6
        assert region(line).exterior.distance(place_in(words)) < 1e-5


def region(line, grow=0.0):
    """A closed line as a shapely polygon, grown by a length; circles to 5e-6."""
    if isinstance(line, Circle):
        return shapely.Point(line.centre).buffer(line.radius + grow, quad_segs=256)
    return shapely.Polygon(line.points).buffer(grow, quad_segs=64)


def agreed(decide):
    """What holds for lines a little larger and smaller; nothing if it differs."""
    answers = {decide(grow) for grow in (-1e-4, 1e-4)}
    assume(len(answers) == 1)
    return answers.pop()


@st.composite
def lines(draw, kind, *, reach, least, most, name="hole"):
    """A polygon or circle of some size somewhere near the origin."""
    x, y = draw(st.tuples(st.floats(-reach, reach), st.floats(-reach, reach)))
    size = math.exp(draw(st.floats(math.log(least), math.log(most))))
    if kind == "circle":
        return circle(x, y, size, name)
    return polygon(size * draw(stars()) + (x, y), name)


@pytest.mark.parametrize(("rim_kind", "hole_kind"), pairings)
@given(data=st.data())
def test_holes_are_cut_where_shapely_finds_them_inside(rim_kind, hole_kind, data):
    rim = data.draw(lines(rim_kind, reach=0.0, least=1.0, most=1.0, name="rim"))
    hole = data.draw(lines(hole_kind, reach=0.7, least=0.05, most=1.5))
    inside = agreed(lambda grow: region(rim).contains_properly(region(hole, grow)))
    if inside:
        assert Outline(rim=rim).cut(hole).holes == (hole,)
    else:
        assert "crosses or lies outside" in refusal(lambda: Outline(rim=rim).cut(hole))


@pytest.mark.parametrize(("first", "second"), pairings)
@given(data=st.data())
def test_two_holes_are_cut_where_shapely_finds_them_apart(first, second, data):
    plate = Outline.polygon(20.0 * (SQUARE - 0.5))
    a = data.draw(lines(first, reach=1.5, least=0.1, most=1.5, name="a"))
    b = data.draw(lines(second, reach=1.5, least=0.1, most=1.5, name="b"))
    apart = agreed(lambda grow: not region(a).intersects(region(b, grow)))
    for one, other in ((a, b), (b, a)):
        if apart:
            assert plate.cut(one, other).holes == (one, other)
        else:
            words = refusal(lambda one=one, other=other: plate.cut(one, other))
            assert words.startswith("holes 1 ")
            assert "overlap or touch near" in words


@pytest.mark.parametrize(
    ("a", "b"),
    [
        (circle(0, 0, 0.2, "a"), circle(0.5, 0, 0.3, "b")),
        (circle(0, 0, 0.9, "a"), circle(0.9, 0, 0.01, "b")),
        (circle(0, 0, 0.2, "a"), circle(0, 0, 0.1, "b")),
        (circle(0, 0, 0.1, "a"), circle(0.3, 0, 0.9, "b")),
        (square(0, 0, 0.2, "a"), circle(0.5, 0, 0.3 - 5e-7, "b")),
        (circle(0.5, 0, 0.3, "a"), square(0, 0, 0.2, "b")),
        (circle(0, 0, 0.5, "a"), square(0.2, 0.2, 0.1, "b")),
        (square(0.2, 0.2, 0.1, "a"), square(0.3, 0.3, 0.5, "b")),
        (square(0, 0, 0.2, "a"), square(0.4, 0, 0.2, "b")),
    ],
)
def test_holes_that_overlap_or_touch_are_refused_where_they_do(a, b):
    words = refusal(lambda: Outline(rim=square(0, 0, 2, "rim")).cut(a, b))
    assert re.fullmatch(
        r"holes 1 \('a'\) and 2 \('b'\) overlap or touch near (.*) m; move them apart, "
        r"or draw them as one hole\.",
        words,
    )
    for line in (a, b):
        assert region(line).distance(place_in(words)) < 1e-5


def test_the_hole_that_is_wrong_is_numbered():
    holes = [circle(0.2, 0.2, 0.1, "a"), circle(0.9, 0.9, 0.2, "b")]
    assert refusal(lambda: Outline.polygon(SQUARE).cut(*holes)).startswith(
        "hole 2 ('b') crosses or lies outside the outline near (1, "
    )
    later = [circle(0.5, 0.5, 0.1, "c"), circle(0.55, 0.5, 0.1, "d")]
    assert refusal(lambda: Outline.polygon(SQUARE).cut(holes[0], *later)).startswith(
        "holes 2 ('c') and 3 ('d') overlap or touch"
    )


def test_a_side_that_is_not_there_has_no_length():
    outline = Outline.polygon(SQUARE, sides=["s", "e", "n", "w"])
    assert refusal(lambda: outline.side_length("north")) == (
        "there is no side 'north'; the sides are s, e, n, w."
    )


# Rounded corners and parts of sides


def test_corners_are_rounded_and_relieved_on_the_line_they_are_on():
    hole = square(0.5, 0.5, 0.2, "unused")
    hole = Polygon(points=hole.points, sides=["a", "b", "c", "d"])
    outline = Outline.polygon(SQUARE).cut(hole)
    both = outline.fillet("side-1", "side-2", radius=0.1).relieve(
        "c", "b", radius=0.05, name="bore"
    )
    rim = 1.0 - (1.0 - math.pi / 4.0) * 0.01
    # Material takes three quarters of a disc around a hole's right corner.
    assert both.area == pytest.approx(rim - 0.16 - 0.75 * math.pi * 0.05**2)
    assert both.side_names[1] == "fillet of side-1 and side-2"
    assert "bore" in both.side_names
    assert both.smallest_radius == pytest.approx(0.05)


def test_a_part_of_a_side_is_given_by_shares_or_between_points():
    outline = Outline.polygon(SQUARE, sides=["s", "e", "n", "w"])
    by_share = outline.part("s", name="door", fractions=(0.25, 0.5))
    by_points = outline.part("s", name="door", between=((0.5, -0.001), (0.25, 0)))
    for found in (by_share, by_points):
        assert found.side_names == ("s", "door", "e", "n", "w")
        assert found.side_length("door") == pytest.approx(0.25)
        assert found.side_length("s") == pytest.approx(0.75)
    disc = Outline.circle((0, 0), radius=1).part("rim", name="a", fractions=(0, 0.25))
    assert disc.side_length("a") == pytest.approx(math.pi / 2)
    assert disc.area == pytest.approx(math.pi)
    words = (
        "a part of side 's' is given by fractions or between two points; give one of "
        "them."
    )
    assert refusal(lambda: outline.part("s", name="door")) == words
    assert refusal(
        lambda: outline.part(
            "s", name="door", fractions=(0, 1), between=((0, 0), (1, 0))
        )
    ) == (words)
    assert refusal(lambda: outline.part("north", name="a", fractions=(0, 1))) == (
        "there is no side 'north'; the sides are s, e, n, w."
    )
    holed = outline.cut(circle(0.5, 0.5, 0.1))
    assert refusal(lambda: holed.fillet("s", "hole", radius=0.1)) == (
        "sides 's' and 'hole' are not on one line; the sides are s, e, n, w, hole."
    )


# Zones


def boxed(x0, y0, x1, y1, name="edge"):
    """A rectangle between two corners."""
    return polygon([(x0, y0), (x1, y0), (x1, y1), (x0, y1)], name)


PLATE = Outline.polygon(SQUARE, sides=["s", "e", "n", "w"])


def test_zones_may_share_edges_with_the_rim_holes_and_each_other():
    outline = (
        PLATE.cut(boxed(0.4, 0.4, 0.6, 0.6, "opening"))
        .zone(boxed(0, 0, 0.4, 1), name="left")
        .zone(boxed(0.4, 0, 1, 0.4), name="below")
    )
    assert outline.zone_names == ("left", "below")
    assert outline.zone_area("left") == pytest.approx(0.4, rel=1e-14)
    assert outline.zone_area("below") == pytest.approx(0.24, rel=1e-14)
    assert outline.joints == ()


def test_holes_are_no_part_of_a_zone():
    outline = PLATE.cut(circle(0.5, 0.5, 0.1))
    around = outline.zone(circle(0.5, 0.5, 0.2, "edge"), name="collar")
    assert around.zone_area("collar") == pytest.approx(0.03 * math.pi, rel=1e-14)
    half = outline.zone(boxed(0, 0, 0.5, 1), name="half")
    assert half.zone_area("half") == pytest.approx(0.5 - 0.005 * math.pi, rel=1e-5)
    assert refusal(lambda: half.zone_area("whole")) == (
        "there is no zone 'whole'; the zones are half."
    )


@pytest.mark.parametrize(
    ("shape", "words"),
    [
        (
            boxed(0.5, 0.25, 1.5, 0.75),
            "zone 'rib' lies outside the outline near (1.25, 0.5) m; draw it within.",
        ),
        (boxed(0.45, 0.45, 0.55, 0.55), "zone 'rib' lies in a hole; move it."),
    ],
)
def test_a_zone_lies_on_the_plate(shape, words):
    outline = PLATE.cut(boxed(0.4, 0.4, 0.6, 0.6, "opening"))
    assert refusal(lambda: outline.zone(shape, name="rib")) == words


def test_zones_do_not_overlap():
    one = PLATE.zone(boxed(0, 0, 0.5, 0.5), name="one")
    assert refusal(lambda: one.zone(boxed(0.25, 0.25, 0.75, 0.75), name="two")) == (
        "zones 'one' and 'two' overlap near (0.375, 0.375) m; zones may share edges "
        "but not areas."
    )


# Seams and marks


def test_seams_may_cross_and_end_on_sides():
    outline = PLATE.seam([(0, 0.3), (1, 0.6)], name="weld").seam(
        [(0.5, 0), (0.5, 0.9)], name="stop"
    )
    assert outline.names == ("s", "e", "n", "w", "weld", "stop")
    np.testing.assert_allclose(outline.seams[0].chords, math.hypot(1, 0.3))
    bent = PLATE.seam([(0.2, 0.2), (0.8, 0.2), (0.8, 0.8)], name="angle")
    np.testing.assert_allclose(bent.seams[0].turns, [math.pi / 2])


@pytest.mark.parametrize(
    ("points", "changes", "words"),
    [
        (
            [(0.2, 0.2), (1.4, 0.2)],
            {},
            "seam 'weld' leaves the plate near (1.2, 0.2) m; end it on the boundary.",
        ),
        (
            [(0.2, 0.5), (0.8, 0.5)],
            {},
            "seam 'weld' leaves the plate near (0.5, 0.5) m; end it on the boundary.",
        ),
        (
            [(0.1, 0.1), (0.3, 0.3), (0.3, 0.1), (0.1, 0.3)],
            {},
            "seam 'weld' crosses itself; draw it as two seams.",
        ),
        (
            [(0.1, 0.1)],
            {},
            "seam 'weld' has points of shape (1, 2); it takes at least two pairs "
            "(x, y).",
        ),
        (
            [(0.1, 0.1), (0.1, math.nan)],
            {},
            "seam 'weld': point 2 is (0.1, nan) m; coordinates must be numbers in m, "
            "no larger than 1e+09.",
        ),
        (
            [(0.1, 0.1), (0.2, 0.1), (0.2, 0.1)],
            {},
            "seam 'weld': points 2 and 3 coincide near (0.2, 0.1) m; drop one of them.",
        ),
        (
            "weld",
            {},
            "the points of seam 'weld' are 'weld'; give pairs (x, y) of numbers in m.",
        ),
        (
            [(0.1, 0.1), (0.2, 0.1)],
            {"bulges": [0, 0]},
            "seam 'weld' has 1 pieces and 2 bulges; give one for each.",
        ),
        (
            [(0.1, 0.1), (0.2, 0.1)],
            {"bulges": [-40]},
            "seam 'weld': piece 1 has bulge -40; it must lie between -30 and 30.",
        ),
    ],
)
def test_a_seam_that_cannot_be_is_refused(points, changes, words):
    outline = PLATE.cut(circle(0.5, 0.5, 0.1))
    assert refusal(lambda: outline.seam(points, name="weld", **changes)) == words


@pytest.mark.parametrize(
    ("place", "words"),
    [
        (
            (0.5, 0.5),
            "mark 'post' at (0.5, 0.5) m is not on the plate; it lies outside the "
            "outline or in a hole.",
        ),
        (
            (2, 0.5),
            "mark 'post' at (2, 0.5) m is not on the plate; it lies outside the "
            "outline or in a hole.",
        ),
        (
            (math.nan, 0.5),
            "mark 'post' has place nan; it must be finite, no larger than 1e+09.",
        ),
        (3, "mark 'post' has place 3; give a pair of numbers in m."),
        ("ab", "mark 'post' has place 'ab'; give a pair of numbers in m."),
    ],
)
def test_a_mark_lies_on_the_plate(place, words):
    outline = PLATE.cut(circle(0.5, 0.5, 0.1))
    assert refusal(lambda: outline.mark(place, name="post")) == words
    assert outline.mark((0.2, 0.2), name="post").marks[0].at == (0.2, 0.2)


@pytest.mark.parametrize(
    ("build", "words"),
    [
        (
            lambda: PLATE.zone(boxed(0, 0, 0.5, 1), name="s"),
            "zone 's' has the name of something else; sides, zones, seams and marks "
            "need names of their own.",
        ),
        (
            lambda: PLATE.mark((0.5, 0.5), name="a").seam([(0, 0), (1, 1)], name="a"),
            "mark 'a' has the name of something else; sides, zones, seams and marks "
            "need names of their own.",
        ),
        (
            lambda: PLATE.mark((0.5, 0.5), name="a").mark((0.2, 0.5), name="a"),
            "mark 'a' has the name of something else; sides, zones, seams and marks "
            "need names of their own.",
        ),
        (
            lambda: PLATE.zone(boxed(0, 0, 0.5, 1), name="plate"),
            "a zone is called 'plate'; that is the name of the plate around the zones, "
            "give it another.",
        ),
        (
            lambda: PLATE.seam([(0, 0), (1, 1)], name=" a"),
            "a seam is called ' a'; a name is text of at least one character, with no "
            "space around it.",
        ),
    ],
)
def test_what_lies_inside_has_a_name_of_its_own(build, words):
    assert refusal(build) == words


# Joined to what they nearly touch


def test_what_nearly_touches_is_joined_and_noted():
    outline = (
        PLATE.zone(boxed(0, 1e-5, 0.5, 1), name="rib")
        .seam([(0.25, 0.5), (0.50001, 0.25)], name="weld")
        .mark((0.75, -1e-4), name="post")
    )
    assert outline.zone_area("rib") == 0.5
    assert outline.seams[0].points.tolist() == [[0.25, 0.5], [0.5, 0.25]]
    assert outline.marks[0].at == (0.75, 0.0)
    assert outline.notes == (
        "zone 'rib': point (0, 1e-05) m moved by 1e-05 m onto side 's'",
        "zone 'rib': point (0.5, 1e-05) m moved by 1e-05 m onto side 's'",
        "seam 'weld': point (0.50001, 0.25) m moved by 1e-05 m onto zone 'rib'",
        "mark 'post': point (0.75, -0.0001) m moved by 0.0001 m onto side 's'",
    )
    assert outline.cut(circle(0.7, 0.7, 0.1)).notes == outline.notes


def test_the_last_digits_of_points_on_a_circle_are_no_news():
    """Six digits: off by up to 1e-6 of the radius, moved without a word."""
    disc = Outline.circle((0, 0), radius=1.0)
    x, y = round(math.cos(1), 6), round(math.sin(1), 6)
    outline = disc.seam([(x, y), (-x, -y)], name="weld").mark((-x, y), name="post")
    for point in (*outline.seams[0].points, outline.marks[0].at):
        assert math.hypot(*point) == pytest.approx(1.0, abs=1e-15)
    assert outline.notes == ()


def test_farther_off_is_meant():
    off = 3e-4  # the size is 1.4
    outline = PLATE.mark((0.75, off), name="post")
    assert outline.marks[0].at == (0.75, off)
