"""Line reactions of C1 elements: series, exact states, balance, seams, corners, bends.

Signs: v_n positive where the support pushes the plate up; resultants right-handed.
"""

import itertools
from dataclasses import replace
from functools import cache

import numpy as np
import oracles
import pytest
from plates import SIDES, grid, rectangle, unit_material

from benchmarks import cases, records
from kplate.adapt import solve
from kplate.boundary import rigid_motions
from kplate.elements.triangle import edge_normals
from kplate.loads import Case, PointForce, Pressure, PressureField
from kplate.meshing import mesh_outline
from kplate.outline import Outline
from kplate.plate import Plate
from kplate.quadrature import gauss
from kplate.raw import RawMoments
from kplate.solution import Solution
from kplate.solve.static import solve_static
from kplate.supports import CLAMPED, FREE, GUIDED, SIMPLY_SUPPORTED, SUPPORTS

C, S, G, F = CLAMPED, SIMPLY_SUPPORTED, GUIDED, FREE
ELEMENTS = ("quintic", "hct")
DOWN = oracles.LinearPressure(at_origin=-1.0)
HINGED = dict.fromkeys(SIDES, S)
PAIRS = list(itertools.product((C, S, G, F), repeat=2))
# Nothing about these is even: a pressure that varies both ways, and a force.
UNEVEN = (
    PressureField(lambda x, y: -1.0 - x + 2.0 * y**2),
    PointForce(force=-0.4, at=(0.31, 0.17)),
)

both = pytest.mark.parametrize("element", ELEMENTS)
each_pair = pytest.mark.parametrize(
    "pair", PAIRS, ids=lambda pair: "-".join(support.name for support in pair)
)


def solved(element, plate, mesh, *loads):
    """Solution with an element on a given mesh."""
    case = Case(name="load", loads=loads)
    return Solution(state=solve_static(plate, mesh, [case], element=element))


def a_plate(outline, supports, **options):
    return Plate(
        outline=outline,
        thickness=0.01,
        material=unit_material(D=1e4),
        supports=supports,
        **options,
    )


def side_of(solution, name):
    """What the support along a side brings."""
    (found,) = [s for s in solution.reactions().sides if s.side == name]
    return found


def at_middle(side, values):
    """A value halfway along a side, where a station is."""
    middle = len(values) // 2
    assert side.distance[middle] == pytest.approx(0.5 * side.distance[-1])
    return values[middle]


# Series


@pytest.mark.parametrize("name", SIDES)
def test_mid_edge_reaction_of_the_square(name):
    """Series: 0.420471 p a; 700 unknowns."""
    solution = solved("quintic", rectangle(S), grid(8), Pressure(-1.0))
    assert solution.state.constraints.numbering.count < 700
    side = side_of(solution, name)
    assert at_middle(side, side.line_reaction) == pytest.approx(0.420471, rel=1e-3)


ENDS = [
    ("simply supported", "simply supported"),
    ("clamped", "clamped"),
    ("clamped", "simply supported"),
    ("clamped", "free"),
    ("simply supported", "free"),
    ("free", "free"),
]
each_ends = pytest.mark.parametrize("ends", ENDS, ids=" to ".join)


@cache
def levy_square(element, ends, n):
    """West and east hinged, south and north as stated, pressed down."""
    held = {"west": S, "east": S}
    held |= {"south": SUPPORTS[ends[0]], "north": SUPPORTS[ends[1]]}
    return solved(element, rectangle(held), grid(n), Pressure(-1.0))


def series_on(side, places, ends):
    """v_n and the clamping moment at places of a side, each (k,)."""
    exact = oracles.levy(np.clip(places, 0, 1), (1.0, 1.0), DOWN, ends=ends)
    axis = 0 if side.side in ("west", "east") else 1
    sign = 1.0 if side.side in ("north", "east") else -1.0
    moment = exact.moments[:, axis] * side.support.holds_slope
    return sign * exact.effective_shears[:, axis], moment


def middle_half(side):
    return np.abs(side.distance - 0.5) < 0.26


def thinned(side):
    """Every fifth station of the middle half: ends, middles and quarters of edges."""
    return np.flatnonzero(middle_half(side))[::5]


@each_ends
def test_reactions_follow_the_series_along_every_side(ends):
    """In the middle half, as shares of the largest there.

    Beside a clamped end v_n of a hinged side is unbounded, and swings.
    """
    for side in levy_square("quintic", ends, 12).reactions().sides[:3]:
        some = thinned(side)
        reaction, moment = series_on(side, side.stations[some], ends)
        off = np.abs(side.line_reaction[some] - reaction) / np.abs(reaction).max()
        rough = "clamped" in ends and side.side in ("west", "east")
        assert off.max() < (0.01 if rough else 1.2e-3)
        found, middle = at_middle(side, side.line_reaction), len(side.stations) // 2
        exact, _ = series_on(side, side.stations[[middle]], ends)
        assert found == pytest.approx(exact[0], rel=5e-4)
        off = np.abs(side.line_moment[some] - moment)
        assert off.max() <= 1e-3 * np.abs(moment).max()


@each_ends
def test_corner_forces_are_those_of_the_series(ends):
    """Twice m_xy, where no side is clamped: hinged to hinged and hinged to free."""
    corners = levy_square("quintic", ends, 12).reactions().corners
    assert len(corners) == 4 - 2 * ends.count("clamped")
    for corner in corners[:2]:
        x, y = corner.corner.place
        exact = oracles.levy([(x, y)], (1.0, 1.0), DOWN, ends=ends).moments[0, 2]
        sign = 1.0 if x == y else -1.0
        assert corner.force.value == pytest.approx(2.0 * sign * exact, rel=2e-3)


def uneven(n):
    """A grid, every second column of its vertices moved by two fifths of an edge."""
    mesh = grid(n)
    points = mesh.points.copy()
    odd = np.rint(n * points[:, 0]).astype(int) % 2 == 1
    points[odd, 0] += 0.4 / n
    return replace(mesh, points=points)


def test_edges_of_uneven_lengths_follow_the_series():
    solution = solved("quintic", rectangle(S), uneven(12), Pressure(-1.0))
    side = side_of(solution, "south")
    some = thinned(side)
    exact, _ = series_on(side, side.stations[some], ENDS[0])
    assert np.abs(side.line_reaction[some] - exact).max() < 5e-3 * exact.max()


@both
def test_along_a_run_the_line_reaction_and_its_derivatives_go_on(element):
    """From edge to edge, per metre, however long they are and however listed."""
    outline = Outline.polygon([(0, 0), (1, 0), (1, 1), (0, 1)], sides=SIDES)
    mesh = ruled(uneven(6), {"rib": ACROSS}, "mixed")
    plate = a_plate(outline.seam(ACROSS, name="rib"), HINGED | {"rib": S})
    solution = solved(element, plate, mesh, *UNEVEN)
    found = RawMoments(state=solution.state).traces
    held, jets = found.held, found.shears.shape[1] // 2
    step = mesh.points[held.edges[:, 1]] - mesh.points[held.edges[:, 0]]
    lengths = np.hypot(*step.T)[:, None]
    order = np.arange(jets)
    known = {}
    for end in (0, 1):
        at = found.shears[:, end * jets : (end + 1) * jets, 0]
        per_metre = at / (lengths * held.senses[:, [end]]) ** order
        for joint, row in zip(held.joints[:, end].tolist(), per_metre, strict=True):
            known.setdefault(joint, []).append(row)
    pairs = np.array([rows for rows in known.values() if len(rows) == 2])
    assert len(pairs) == 5 * 5  # four sides and a seam, of six edges each
    largest = np.abs(pairs).max(axis=(0, 1))
    np.testing.assert_allclose(
        pairs[:, 0] / largest, pairs[:, 1] / largest, rtol=0.0, atol=1e-12
    )


def test_line_reactions_converge_with_third_order_and_with_first_in_a_corner():
    """There, where the series has none, v_n has a derivative less."""
    sides = [side_of(levy_square("quintic", ENDS[0], n), "south") for n in (6, 12, 24)]
    some = thinned(sides[0])
    exact, _ = series_on(sides[0], sides[0].stations[some], ENDS[0])
    off = []
    for k, side in enumerate(sides):
        np.testing.assert_allclose(side.distance[2**k * some], sides[0].distance[some])
        errors = np.abs(side.line_reaction[2**k * some] - exact)
        off.append([errors.max(), abs(side.line_reaction[0])])
    orders = -np.diff(np.log2(off), axis=0)
    assert orders[:, 0].mean() > 3.0
    np.testing.assert_allclose(orders[:, 1], 1.0, atol=0.15)


def test_a_clamped_square_follows_its_own_solution():
    """Ritz: v_n = 0.441301 p a and m_nn = 0.0513338 p a^2 in the middle of a side."""
    solution = solved("quintic", rectangle(C), grid(12), Pressure(-1.0))
    exact = oracles.clamped_rectangle([(0.0, 0.5)], (1.0, 1.0), DOWN)
    for side in solution.reactions().sides:
        found = at_middle(side, side.line_reaction)
        assert found == pytest.approx(-exact.effective_shears[0, 0], rel=1e-3)
        found = at_middle(side, side.line_moment)
        assert found == pytest.approx(exact.moments[0, 0], rel=1e-3)
    assert solution.reactions().corners == ()


@each_ends
def test_hct_follows_the_series_along_every_side(ends):
    """Between means over edges; their sum over the middle half is closer still."""
    share, weights = gauss(5)
    for side in levy_square("hct", ends, 24).reactions().sides[:3]:
        inner = np.flatnonzero(np.abs(side.distance - 0.5) < 0.2501)
        first, last = side.stations[inner[[0, -1]]]
        places = first + share[:, None] * (last - first)
        reaction, moment = series_on(side, places, ends)
        along = (side.distance[inner] - side.distance[inner[0]]) / 0.5
        off = np.interp(share, along, side.line_reaction[inner]) - reaction
        rough = "clamped" in ends and side.side in ("west", "east")
        assert np.abs(off).max() < (0.05 if rough else 0.02) * np.abs(reaction).max()
        total = np.trapezoid(side.line_reaction[inner], along)
        assert total == pytest.approx(weights @ reaction, rel=0.025)
        off = np.interp(share, along, side.line_moment[inner]) - moment
        assert np.abs(off).max() <= 0.03 * np.abs(moment).max()


# Exact states


def strip(south, north, **others):
    """Bends along y only: east and west are lines of symmetry."""
    return {"south": south, "north": north, "east": G, "west": G, **others}


@pytest.mark.parametrize(
    ("supports", "forces", "moments"),
    [
        ((S, S), (1 / 2, 1 / 2), (0.0, 0.0)),
        ((C, C), (1 / 2, 1 / 2), (1 / 12, 1 / 12)),
        ((C, S), (5 / 8, 3 / 8), (1 / 8, 0.0)),
        ((C, F), (1.0,), (1 / 2,)),
    ],
    ids=["hinged", "clamped", "clamped to hinged", "cantilever"],
)
def test_a_strip_reacts_as_a_beam_does(supports, forces, moments):
    """The quintic has w, of degree 4, exactly: the line reaction is even.

    Pressed down the plate hogs over its clamped ends: their top is in tension, m < 0.
    Where a clamped side meets a line of symmetry both hold the same slopes, so that
    what either brings is known to 1 % only.
    """
    solution = solved("quintic", rectangle(strip(*supports)), grid(5), Pressure(-1.0))
    ends = [s for s in solution.reactions().sides if s.support.holds_deflection]
    for side, force, moment in zip(ends, forces, moments, strict=False):
        np.testing.assert_allclose(side.line_reaction, force, rtol=1e-5)
        inner = side.line_moment[middle_half(side)]
        np.testing.assert_allclose(inner, -moment, rtol=1e-3)
        np.testing.assert_allclose(side.line_moment, -moment, rtol=0.015)
        assert side.resultant.force == pytest.approx(force, rel=1e-9)


def test_an_equilateral_triangle_reacts_as_its_closed_form():
    """So does its quintic on any mesh: v_n = 0.29375 p h amid a side.

    At the corners of 60 degrees nothing pulls.
    """
    corners = [(2 / 3, 0), (-1 / 3, 1 / np.sqrt(3)), (-1 / 3, -1 / np.sqrt(3))]
    plate = a_plate(
        Outline.polygon(corners, sides=list("abc")), dict.fromkeys("abc", S)
    )
    solution = solve(plate, [Pressure(-1.0)], element="quintic", triangles=60)
    west = side_of(solution, "b")
    y = west.stations[:, 1]
    exact = closed_form_of_the_triangle(west.stations)
    assert np.abs(west.line_reaction - exact)[np.abs(y) < 0.45].max() < 1e-4
    assert np.abs(west.line_reaction - exact).max() < 2e-3
    for side in solution.reactions().sides:
        assert side.resultant.force == pytest.approx(np.sqrt(3.0) / 9.0, rel=1e-9)
    for corner in solution.reactions().corners:
        assert corner.force.value == pytest.approx(0.0, abs=1e-8)


def closed_form_of_the_triangle(places):
    """v_n on the side x = -1/3: -(q_x - m_xy,y), from w of degree 5."""
    coefficients = oracles.triangle(1.0, -1.0)
    return -oracles.polynomial(places, coefficients).effective_shears[:, 0]


# Balance


def total_of(reactions):
    """Force and moments of all sides, corners and points, (3,)."""
    total = np.zeros(3)
    for part in (*reactions.sides, *reactions.points):
        r = part.resultant
        total += r.force, r.moment_x, r.moment_y
    for corner in reactions.corners:
        (x, y), force = corner.corner.place, np.nan_to_num(corner.force.value)
        total += np.array([1.0, y, -x]) * force
    return total


def assert_balance(solution):
    """Sides, corners and points add up to the loads to 1e-10, and to the total."""
    reactions = solution.reactions()
    found = total_of(reactions)
    for other, sign in ((reactions.load, -1.0), (reactions.total, 1.0)):
        wanted = np.array([other.force, other.moment_x, other.moment_y])
        off = np.abs(found - sign * wanted).max()
        assert off < 1e-10 * np.abs(wanted).max()
    assert np.abs(found).max() > 0.1


@both
@each_pair
def test_a_rectangle_balances_with_any_two_supports_in_a_corner(element, pair):
    held = dict(zip(SIDES, (*pair, S, C), strict=True))
    mesh = grid(5, a=1.3, b=0.9, m=3)
    plate = rectangle(held, a=1.3, b=0.9)
    assert_balance(solved(element, plate, mesh, *UNEVEN))


@both
@each_pair
def test_a_rhombus_of_30_degrees_balances_with_any_two_supports(element, pair):
    """Its blunt corners hold no finite force; that goes to the sides."""
    turn = np.array([[1.0, 0.0], [np.sqrt(0.75), 0.5]])
    corners = np.array([(0, 0), (1, 0), (1, 1), (0, 1)]) @ turn
    plate = a_plate(
        Outline.polygon(corners, sides=SIDES),
        dict(zip(SIDES, (*pair, S, C), strict=True)),
    )
    mesh = grid(4)
    mesh = replace(mesh, points=mesh.points @ turn)
    assert_balance(solved(element, plate, mesh, *UNEVEN))


@pytest.fixture(scope="module")
def ell():
    points = [(0, 0), (2, 0), (2, 1), (1, 1), (1, 2), (0, 2)]
    outline = Outline.polygon(points, sides=list("abcdef"))
    return outline, mesh_outline(outline, size=0.4)


@both
@each_pair
def test_an_l_shape_balances_with_any_two_supports_in_its_corner(element, pair, ell):
    outline, mesh = ell
    held = dict(zip("abcdef", (S, F, *pair, C, S), strict=True))
    assert_balance(solved(element, a_plate(outline, held), mesh, *UNEVEN))


# Seams and marks


def ruled(mesh, lines, sense="forward"):
    """A mesh with seams along its edges, through these points, listed as said."""
    edges, numbers = [], []
    for number, line in enumerate(lines.values()):
        own = []
        for start, end in itertools.pairwise(np.array(line, dtype=float)):
            step, arm = end - start, mesh.points - start
            share = arm @ step / (step @ step)
            off = np.abs(arm[:, 0] * step[1] - arm[:, 1] * step[0])
            on = np.flatnonzero((off < 1e-9) & (share > -1e-9) & (share < 1 + 1e-9))
            on = on[np.argsort(share[on])]
            own += list(itertools.pairwise(on.tolist()))
        own = np.array(own)
        if sense == "backward":
            own = own[::-1, ::-1]
        if sense == "mixed":
            own[1::2] = own[1::2, ::-1]
        edges.append(own)
        numbers.append(np.full(len(own), number))
    return replace(
        mesh,
        seam_edges=np.vstack(edges),
        seam_numbers=np.concatenate(numbers),
        seam_names=tuple(lines),
    )


def marked(mesh, places):
    vertices = [int(np.hypot(*(mesh.points - p).T).argmin()) for p in places.values()]
    return replace(mesh, mark_vertices=vertices, mark_names=tuple(places))


def inside(
    element, supports, *, seams=(), marks=(), sense="forward", n=8, loads=UNEVEN
):
    """A unit square with seams and marks on a grid, solved."""
    seams, marks = dict(seams), dict(marks)
    outline = Outline.polygon([(0, 0), (1, 0), (1, 1), (0, 1)], sides=SIDES)
    mesh = grid(n)
    for name, line in seams.items():
        outline = outline.seam(line, name=name)
    for name, place in marks.items():
        outline = outline.mark(place, name=name)
    if seams:
        mesh = ruled(mesh, seams, sense)
    if marks:
        mesh = marked(mesh, marks)
    return solved(element, a_plate(outline, supports), mesh, *loads)


ACROSS = [(0.0, 0.5), (1.0, 0.5)]
UPWARD = [(0.5, 0.0), (0.5, 1.0)]
SEAMS = {
    "across": {"rib": ACROSS},
    "ends inside": {"rib": [(0.0, 0.5), (0.5, 0.5)]},
    "both ends inside": {"rib": [(0.25, 0.5), (0.75, 0.5)]},
    "bent": {"rib": [(0.0, 0.5), (0.5, 0.5), (0.5, 1.0)]},
    "closed": {
        "rib": [(0.25, 0.25), (0.75, 0.25), (0.75, 0.75), (0.25, 0.75), (0.25, 0.25)]
    },
    "two that cross": {"rib": ACROSS, "post": UPWARD},
    "two that cross, ends inside": {
        "rib": [(0.125, 0.5), (0.875, 0.5)],
        "post": [(0.5, 0.25), (0.5, 0.75)],
    },
    "one that ends on the other": {"rib": ACROSS, "post": [(0.5, 0.5), (0.5, 1.0)]},
    "from a corner": {"rib": [(0.0, 0.0), (1.0, 1.0)]},
}
each_seam = pytest.mark.parametrize("name", SEAMS)


@both
@each_seam
@pytest.mark.parametrize(
    "sides",
    [HINGED, {"south": C, "west": S}, {"east": G, "west": S}],
    ids=["hinged", "clamped to hinged", "guided"],
)
def test_plates_on_seams_balance(element, name, sides):
    if name == "from a corner" and "north" not in sides:
        sides = {**sides, "south": S}
    held = sides | dict.fromkeys(SEAMS[name], S)
    assert_balance(inside(element, held, seams=SEAMS[name]))


@both
@pytest.mark.parametrize("support", [C, G], ids=lambda s: s.name)
def test_plates_on_seams_that_hold_the_slope_balance(element, support):
    held = {"south": S, "west": C, "rib": support}
    assert_balance(inside(element, held, seams=SEAMS["ends inside"]))


def by_place(solution):
    """Line reactions by side and place."""
    return {
        (side.side, *np.round(place, 9)): value
        for side in solution.reactions().sides
        for place, value in zip(side.stations, side.line_reaction, strict=True)
    }


@both
@each_seam
@pytest.mark.parametrize("sense", ["backward", "mixed"])
def test_reactions_do_not_depend_on_the_sense_of_a_seam(element, name, sense):
    held = {"south": S, "west": C} | dict.fromkeys(SEAMS[name], S)
    if name == "from a corner":
        held |= {"west": S}
    first = by_place(inside(element, held, seams=SEAMS[name]))
    second = by_place(inside(element, held, seams=SEAMS[name], sense=sense))
    assert first.keys() == second.keys()
    values = np.array([(value, second[place]) for place, value in first.items()])
    known = ~np.isnan(values[:, 0])
    largest = np.abs(values[known]).max()
    np.testing.assert_allclose(*values.T, rtol=0.0, atol=1e-8 * largest)
    assert known.sum() > 8


@both
@pytest.mark.parametrize("sense", ["backward", "mixed"])
def test_a_clamped_seam_does_not_depend_on_its_sense(element, sense):
    """Its moment turns its sign with the normal, on the right of the seam."""
    held = {"south": S, "west": C, "rib": C}
    one, other = (
        side_of(
            inside(element, held, seams=SEAMS["both ends inside"], sense=way), "rib"
        )
        for way in ("forward", sense)
    )
    turn = -1 if sense == "backward" else 1  # a mixed one begins as it did
    np.testing.assert_allclose(one.stations, other.stations[::turn], atol=1e-12)
    found = turn * other.line_moment[::turn]
    np.testing.assert_allclose(one.line_moment, found, atol=1e-9)
    np.testing.assert_allclose(
        one.line_reaction, other.line_reaction[::turn], atol=1e-7
    )
    assert np.abs(one.line_moment).max() > 1e-3


def test_a_closed_seam_has_the_same_reaction_wherever_it_begins():
    """Its four corners are all left out, the first one too."""
    held = HINGED | {"rib": S}
    solution = inside("quintic", held, seams=SEAMS["closed"])
    side = side_of(solution, "rib")
    for corner in SEAMS["closed"]["rib"]:
        there = np.hypot(*(side.stations - corner).T) < 1e-9
        assert np.isnan(side.line_reaction[there]).all()


@pytest.mark.parametrize("sense", ["forward", "backward", "mixed"])
def test_a_strip_over_two_spans_reacts_as_a_beam_does(sense):
    """5/4, 3/8 and 3/8 of p l; the quintic has w exactly."""
    solution = inside(
        "quintic",
        strip(S, S, rib=S),
        seams={"rib": ACROSS},
        sense=sense,
        n=6,
        loads=[Pressure(-1.0)],
    )
    for name, share in (("rib", 5 / 4), ("south", 3 / 8), ("north", 3 / 8)):
        found = side_of(solution, name).line_reaction
        assert (np.isnan(found).sum() == 0) == (name != "rib")  # it ends inside discs
        known = found[~np.isnan(found)]
        np.testing.assert_allclose(known, share * 0.5, rtol=1e-5)
        assert len(known) > 6


@both
def test_seams_that_cross_share_what_they_carry(element):
    """By symmetry two equal ones bring the same, each a part of the load."""
    held = HINGED | {"rib": S, "post": S}
    both_ways = {"rib": ACROSS, "post": UPWARD}
    solution = inside(element, held, seams=both_ways, loads=[Pressure(-1.0)])
    rib, post = (side_of(solution, name) for name in both_ways)
    assert rib.resultant.force == pytest.approx(post.resultant.force, rel=1e-6)
    assert 0.2 < rib.resultant.force < 0.5


@both
def test_seams_that_cross_and_end_inside_share_what_they_carry(element):
    """Neither brings more than the whole load; on fine meshes 0.31 and 0.27 of it."""
    seams = SEAMS["two that cross, ends inside"]
    held = HINGED | {"rib": S, "post": S}
    solution = inside(element, held, seams=seams, n=16, loads=[Pressure(-1.0)])
    forces = [side_of(solution, name).resultant.force for name in seams]
    assert sum(forces) == pytest.approx(0.58, abs=0.05)
    assert np.abs(forces).max() < 1.0


@both
@pytest.mark.parametrize(
    ("marks", "held"),
    [
        ({"pin": (0.5, 0.5)}, {"rib": S, "pin": S}),
        ({"pin": (0.5, 0.5)}, {"pin": S}),
        ({"pin": (0.5, 0.5)}, {"rib": S}),
        ({"pin": (0.25, 0.75)}, {"rib": S, "pin": S}),
        ({"pin": (0.5, 0.0), "other": (1.0, 1.0)}, {"pin": S, "other": S}),
    ],
    ids=[
        "on a held seam",
        "on a free seam",
        "free on a seam",
        "in the field",
        "on sides",
    ],
)
def test_plates_on_pins_balance(element, marks, held):
    sides = {"south": S, "west": C}
    solution = inside(element, sides | held, seams={"rib": ACROSS}, marks=marks)
    assert_balance(solution)
    lined = {"rib"} & held.keys() and marks["pin"] == (0.5, 0.5)
    pins = {name for name in held if name in marks and not lined}
    pins -= {"pin"} if marks["pin"] == (0.5, 0.0) else set()
    assert {point.mark for point in solution.reactions().points} == pins


@both
def test_a_pin_across_from_a_hinge_carries_half(element):
    """Statics: moments about the hinged side."""
    solution = inside(
        element,
        {"west": S, "pin": S},
        marks={"pin": (1.0, 0.5)},
        loads=[Pressure(-1.0)],
    )
    (pin,) = solution.reactions().points
    assert pin.force.value == pytest.approx(0.5, rel=1e-9)
    assert pin.force.place == (1.0, 0.5)
    assert_balance(solution)


@pytest.mark.parametrize("element", ["quintic", "hct", "dkt"])
def test_a_pin_on_a_line_of_symmetry_is_a_point_that_carries(element):
    solution = inside(
        element, {"south": G, "north": S, "pin": S}, marks={"pin": (0.5, 0.0)}
    )
    assert_balance(solution)


# The equations


@both
@pytest.mark.parametrize("name", ["across", "two that cross", "ends inside"])
def test_what_edges_bring_is_what_supports_bring_in_all_held_directions(element, name):
    """On hinges, clamps and lines of symmetry, and at a pin on one of these."""
    held = {"south": S, "west": C, "north": G, "pin": S}
    held |= dict.fromkeys(SEAMS[name], S)
    pin = {"pin": (0.75, 1.0)}
    state = inside(element, held, seams=SEAMS[name], marks=pin).state
    found = RawMoments(state=state).traces
    numbering = state.constraints.numbering
    brought = np.zeros((numbering.count, 1))
    np.add.at(brought, found.unknowns, found.nodal)
    brought[numbering.at_vertices(found.vertices)[:, 0]] += found.forces
    turned = state.constraints.turn(brought - state.support_forces)
    off = turned[~state.constraints.free]
    assert np.abs(off).max() < 1e-9 * np.abs(state.support_forces).max()
    motions = rigid_motions(numbering)
    wanted = motions.T @ state.support_forces
    np.testing.assert_allclose(motions.T @ brought, wanted, atol=1e-9)


# Corners


def slanted(degrees, support=S, n=4):
    """A rhombus with this angle at the origin, its sides held alike, and a mesh."""
    a = np.radians(degrees)
    turn = np.array([[1.0, 0.0], [np.cos(a), np.sin(a)]])
    corners = np.array([(0, 0), (1, 0), (1, 1), (0, 1)]) @ turn
    outline = Outline.polygon(corners, sides=SIDES)
    mesh = grid(n)
    return a_plate(outline, dict.fromkeys(SIDES, support)), replace(
        mesh, points=mesh.points @ turn
    )


def bent_by_hand(state, xx, xy, yy):
    """The state with w = xx x^2/2 + xy x y + yy y^2/2 in every triangle."""
    mesh, numbering = state.mesh, state.constraints.numbering
    H = np.array([[xx, xy], [xy, yy]])
    points, middles = mesh.points, mesh.points[mesh.edges].mean(axis=1)
    w = 0.5 * np.einsum("ki,ij,kj->k", points, H, points)
    second = np.tile([xx, xy, yy], (len(points), 1))
    unknowns = np.column_stack([w, points @ H, second])[:, : numbering.per_vertex]
    normals = np.empty((len(middles), 2))
    normals[mesh.triangle_edges] = edge_normals(points[mesh.triangles])
    across = np.einsum("ec,ec->e", middles @ H, normals)
    return replace(state, unknowns=np.append(unknowns.ravel(), across)[:, None])


@both
@pytest.mark.parametrize("degrees", [60.0, 90.0])
def test_a_corner_force_is_the_jump_of_the_twisting_moment(element, degrees):
    """Arriving side less leaving side, n on the right; moments set by hand."""
    plate, mesh = slanted(degrees)
    state = solve_static(
        plate, mesh, [Case(name="any", loads=[Pressure(1.0)])], element=element
    )
    xx, xy, yy = 3e-4, -2e-4, 5e-4
    corners = Solution(state=bent_by_hand(state, xx, xy, yy)).reactions().corners
    m_xx, m_yy, m_xy = 1e4 * np.array([xx + 0.3 * yy, yy + 0.3 * xx, 0.7 * xy])
    m = np.array([[m_xx, m_xy], [m_xy, m_yy]])
    points = plate.outline.rim.points
    found = {c.corner.place: c.force.value for c in corners}
    for i, place in enumerate(points):
        if np.degrees(plate_angle(points, i)) > 90.1:
            assert np.isnan(found[tuple(place)])
            continue
        jump = 0.0
        for start, end, sign in ((i - 1, i, 1.0), (i, (i + 1) % 4, -1.0)):
            t = points[end] - points[start]
            t = t / np.hypot(*t)
            jump += sign * np.array([t[1], -t[0]]) @ m @ t
        assert found[tuple(place)] == pytest.approx(jump, rel=1e-6)
    assert sum(~np.isnan(list(found.values()))) == (4 if degrees == 90.0 else 2)


def plate_angle(points, i):
    """Angle inside a convex outline at a vertex in rad."""
    a, b = points[i - 1] - points[i], points[(i + 1) % len(points)] - points[i]
    return np.arccos(a @ b / np.hypot(*a) / np.hypot(*b))


def test_sharp_corners_pull_by_nothing_and_blunt_ones_have_no_finite_force():
    """Hinged: w = r^(pi/alpha): at 60 degrees m goes with r, at 120 with r^(-1/2)."""
    pulls = []
    for n in (4, 8, 16):
        plate, mesh = slanted(60.0, n=n)
        reactions = solved("quintic", plate, mesh, Pressure(-1.0)).reactions()
        sharp = [c for c in reactions.corners if c.corner.angle < 1.5]
        blunt = [c for c in reactions.corners if c.corner.angle > 1.5]
        pulls.append(max(abs(c.force.value) for c in sharp))
        assert len(sharp) == len(blunt) == 2
        for corner in blunt:
            assert np.isnan(corner.force.value)
            assert corner.force.reason == (
                "no finite value: corner of 120 degrees, simply supported to simply "
                "supported: moments go with r^-0.500"
            )
    assert pulls[-1] < 0.2 * pulls[0]
    assert pulls[-1] < 1e-3


REFERENCE = [
    "ssss_u_1",
    "ssss_u_2",
    "ssss_u_1_nu0",
    "ssss_h_1",
    "csss_u_1",
    "ccss_u_1",
    "ssfs_u_1",
    "tri_ri_s_u",
]


@pytest.mark.parametrize("name", REFERENCE)
def test_corner_forces_of_the_reference_file_are_met(name):
    """At 90 degrees: series and collocation; within 0.3 %."""
    problem = records.record(name)
    solution = solve(
        cases.plate(problem), cases.loads(problem), element="quintic", triangles=250
    )
    wanted = [q for q in problem["quantities"] if q["quantity"] == "corner force"]
    assert wanted
    for item in wanted:
        (force,) = [
            corner.force.value
            for corner in solution.reactions().corners
            if np.hypot(*np.subtract(corner.corner.place, item["at"])) < 1e-9
        ]
        assert force == pytest.approx(item["value"], rel=3e-3)


@both
def test_a_force_on_a_corner_goes_straight_into_its_support(element):
    load = PointForce(force=-7.0, at=(1.0, 0.0))
    solution = solved(element, rectangle(S), grid(4), load)
    found = {c.corner.place: c.force.value for c in solution.reactions().corners}
    assert found == pytest.approx(
        {(0, 0): 0.0, (1, 0): 7.0, (1, 1): 0.0, (0, 1): 0.0}, abs=1e-9
    )
    for side in solution.reactions().sides:
        assert side.resultant.force == pytest.approx(0.0, abs=1e-9)


# Bends and round sides


def with_vertex(degrees, support, n=8):
    """A square whose south side turns by so much in its middle, and a grid on it."""
    out = 0.5 * np.tan(np.radians(0.5 * degrees))
    outline = Outline.polygon(
        [(0, 0), (0.5, -out), (1, 0), (1, 1), (0, 1)], sides=("south", *SIDES)
    )
    mesh = grid(n)
    x, y = mesh.points.T
    moved = np.column_stack([x, y - out * (1 - np.abs(2 * x - 1)) * (1 - y)])
    return a_plate(outline, dict.fromkeys(SIDES, support)), replace(mesh, points=moved)


@both
@pytest.mark.parametrize("support", [C, S], ids=lambda s: s.name)
def test_a_bend_of_one_degree_hardly_changes_what_sides_bring(element, support):
    bent, straight = (
        solved(element, *with_vertex(turn, support), Pressure(-1.0)) for turn in (1, 0)
    )
    for name in SIDES:
        first, second = (side_of(solution, name) for solution in (bent, straight))
        found = first.resultant.force
        assert found == pytest.approx(second.resultant.force, rel=0.02)


@pytest.mark.parametrize("support", [C, S], ids=lambda s: s.name)
def test_a_bend_hardly_changes_line_reactions_away_from_it(support):
    """Those of the other sides, in their middle half."""
    bent, straight = (
        solved("quintic", *with_vertex(turn, support, n=16), Pressure(-1.0))
        for turn in (1, 0)
    )
    along = np.linspace(0.25, 0.75, 21)
    for name in ("east", "north", "west"):
        first, second = (
            np.interp(along, side.distance, side.line_reaction)
            for side in (side_of(solution, name) for solution in (bent, straight))
        )
        assert np.abs(first - second).max() < 0.04 * second.max()


@both
def test_clamped_sides_with_a_bend_balance(element):
    assert_balance(solved(element, *with_vertex(1.0, C), *UNEVEN))


@both
def test_hinged_sides_with_a_bend_balance(element):
    assert_balance(solved(element, *with_vertex(1.0, S), *UNEVEN))


def test_a_vertex_off_a_hinged_side_changes_neither_shear_nor_reaction():
    """By 1 mm on 1 m, a turn of a quarter of a degree: within a fifth."""
    plate, _ = with_vertex(np.degrees(4e-3), S)
    bent = solve(plate, [Pressure(-1.0)], triangles=2000)
    straight = solve(rectangle(S), [Pressure(-1.0)], triangles=2000)
    found = side_of(bent, "south").line_reaction
    assert found.max() == pytest.approx(0.420, rel=0.2)
    stress = straight.peak("shear stress").value
    assert bent.peak("shear stress").value == pytest.approx(stress, rel=0.2)


@pytest.mark.parametrize("support", [C, S], ids=lambda s: s.name)
def test_the_rim_of_a_disc_reacts_evenly(support):
    """By statics with p a / 2; round sides take windows of vertices."""
    disc = a_plate(Outline.circle((0.0, 0.0), radius=1.0), {"rim": support})
    solution = solve(disc, [Pressure(-1.0)], element="hct", triangles=2000)
    found = side_of(solution, "rim").line_reaction
    assert found.mean() == pytest.approx(0.5, rel=0.01)
    assert np.abs(found - 0.5).max() < 0.02
    assert_balance(solution)
