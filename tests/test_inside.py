"""Zones, seams, marks, guided sides and edge loads against exact states and series.

Values with many digits were computed without finite elements (Levy series, closed
forms in 40-digit arithmetic), D = 1 and the load 1 unless said.
"""

import numpy as np
import pytest
from plates import SIDES, unit_material

from kplate.adapt import solve
from kplate.errors import InputError, SolveError
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
from kplate.shapes import Circle, Rectangle
from kplate.supports import CLAMPED, GUIDED, SIMPLY_SUPPORTED

D = 1e4
UNIT = unit_material(D=D, thickness=0.01)


def square(a=1.0, b=1.0, x=0.0, y=0.0):
    return Outline.polygon(
        [(x, y), (x + a, y), (x + a, y + b), (x, y + b)], sides=SIDES
    )


def plate(outline, supports, **options):
    return Plate(
        outline=outline,
        thickness=0.01,
        material=UNIT,
        supports=supports,
        **options,
    )


@pytest.fixture(scope="module")
def on_three_points():
    """A free rectangle about the origin, held by marks at three corners."""
    outline = square(1.2, 0.8, -0.6, -0.4)
    for k, place in enumerate([(-0.6, -0.4), (0.6, -0.4), (-0.6, 0.4)]):
        outline = outline.mark(place, name=f"mount-{k}")
    return plate(outline, {f"mount-{k}": SIMPLY_SUPPORTED for k in range(3)})


STATES = {
    "pure bending": ({"east": 50.0, "west": 50.0}, (50.0, 0.0)),
    "spherical": (dict.fromkeys(SIDES, 50.0), (50.0, 50.0)),
    "cylindrical": (
        {"east": 50.0, "west": 50.0, "south": 15.0, "north": 15.0},
        (50.0, 15.0),
    ),
}


@pytest.mark.parametrize("name", STATES)
def test_edge_moments_bend_to_a_constant_state_to_round_off(on_three_points, name):
    moments, (m_xx, m_yy) = STATES[name]
    loads = [EdgeMoment(moment=m, along=side) for side, m in moments.items()]
    solution = solve(on_three_points, loads, size=0.15)
    points = solution.mesh.points
    found = solution.moments(points)
    np.testing.assert_allclose(
        found, np.tile([m_xx, m_yy, 0], (len(points), 1)), atol=1e-9
    )
    nu = 0.3
    k_x, k_y = (m_xx - nu * m_yy), (m_yy - nu * m_xx)
    x, y = points.T
    w = 0.5 * (k_x * (x**2 - 0.36) + k_y * (y**2 - 0.16)) / (D * (1 - nu**2))
    np.testing.assert_allclose(solution.deflection(points), w, atol=1e-12)
    for point in solution.reactions().points:
        assert abs(point.force.value) < 1e-9
    assert solution.reactions().imbalance < 1e-11


def test_corner_forces_twist_to_a_constant_state_to_round_off(on_three_points):
    """Forces P, down at (+,+) and (-,-): m_xy = -P/2, w = -P x y / (2 D (1 - nu))."""
    loads = [
        PointForce(force=-20.0 * sx * sy, at=(0.6 * sx, 0.4 * sy))
        for sx in (-1, 1)
        for sy in (-1, 1)
    ]
    solution = solve(on_three_points, loads, size=0.15)
    points = solution.mesh.points
    expected = np.tile([0.0, 0.0, -10.0], (len(points), 1))
    np.testing.assert_allclose(solution.moments(points), expected, atol=1e-8)
    for point in solution.reactions().points:
        assert abs(point.force.value) < 1e-9


def test_an_edge_moment_on_one_side_of_the_square():
    """Levy series: w .018417838, m_xx .196905, m_yy .128095 at the centre."""
    held = plate(square(), dict.fromkeys(SIDES, SIMPLY_SUPPORTED))
    loads = [EdgeMoment(moment=1.0, along="south")]
    solution = solve(held, loads, triangles=6000)
    centre = [(0.5, 0.5)]
    assert solution.deflection(centre)[0] * D == pytest.approx(-0.0184178383, rel=0.002)
    # The south side runs along x: its moment bends about x, m_yy.
    np.testing.assert_allclose(
        solution.moments(centre)[0, :2], [0.196905, 0.128095], rtol=0.01
    )


def test_a_moment_around_a_disc_bends_it_to_a_sphere():
    """Closed form: w = M a^2 / 2 D (1 + nu) at the centre, .3846154."""
    disc = plate(Outline.circle((0.0, 0.0), radius=1.0), {"rim": SIMPLY_SUPPORTED})
    solution = solve(disc, [EdgeMoment(moment=1.0, along="rim")], triangles=4000)
    w = solution.deflection([(0.0, 0.0)])[0] * D
    assert w == pytest.approx(-0.38461538, rel=0.003)


def test_a_plate_over_a_line_support():
    """Levy series, two spans a x a: w .002785494 and m_yy .0391781 at mid-span.

    Over the support m_yy is -.0838752 and the support brings 1.16154 at mid-width.
    """
    outline = square(1.0, 2.0).seam([(0, 1), (1, 1)], name="wall")
    held = plate(outline, dict.fromkeys([*SIDES, "wall"], SIMPLY_SUPPORTED))
    solution = solve(held, [Pressure(-1.0)], triangles=12_000)
    middle = [(0.5, 0.5)]
    assert solution.deflection(middle)[0] * D == pytest.approx(-0.002785494, rel=0.001)
    assert solution.moments(middle)[0, 1] == pytest.approx(0.0391781, rel=0.002)
    near = solution.moments([(0.5, 1.0 - 1e-6), (0.5, 1.0 + 1e-6)])[:, 1]
    np.testing.assert_allclose(near, -0.0838752, rtol=0.01)
    reactions = solution.reactions()
    wall = next(side for side in reactions.sides if side.side == "wall")
    station = np.abs(wall.stations[:, 0] - 0.5).argmin()
    assert wall.line_reaction[station] == pytest.approx(1.16154, rel=0.03)
    assert reactions.imbalance < 1e-11
    total = sum(side.resultant.force for side in reactions.sides)
    total += sum(corner.force.value for corner in reactions.corners)
    assert total == pytest.approx(2.0, rel=1e-9)


def test_moments_on_both_sides_of_a_step():
    """Levy series: half the square twice as thick, 8 D; w .001361133 on the step.

    m_yy is the same on both sides, .0165258, m_xx .0162968 and .0956706.
    """
    thick = Rectangle(centre=(0.5, 0.75), size=(1.0, 0.5), name="pad")
    outline = square().zone(thick, name="pad")
    stepped = plate(
        outline,
        dict.fromkeys(SIDES, SIMPLY_SUPPORTED),
        zones={"pad": Section(thickness=0.02)},
    )
    solution = solve(stepped, [Pressure(-1.0)], triangles=12_000)
    w = solution.deflection([(0.5, 0.5), (0.5, 0.25)]) * D
    np.testing.assert_allclose(w, [-0.001361133, -0.001397923], rtol=0.001)
    below, above = solution.moments([(0.5, 0.5 - 1e-6), (0.5, 0.5 + 1e-6)])
    assert below[0] == pytest.approx(0.0162968, rel=0.02)
    assert above[0] == pytest.approx(0.0956706, rel=0.01)
    # To a hundredth of the largest moment there, m_xx above.
    np.testing.assert_allclose([below[1], above[1]], 0.0165258, atol=0.0012)
    stress = solution.stresses([(0.5, 0.5 - 1e-6), (0.5, 0.5 + 1e-6)], face="bottom")
    np.testing.assert_allclose(stress[0], below * 6 / 0.01**2, rtol=1e-9)
    np.testing.assert_allclose(stress[1], above * 6 / 0.02**2, rtol=1e-9)
    # A step has a value on either side: one field point for each.
    assert len(solution.field_points) > len(solution.mesh.points)
    assert {e.place for e in solution.excluded} == {(0.0, 0.5), (1.0, 0.5)}


def test_a_zone_like_the_plate_around_it_changes_nothing():
    pad = Circle(centre=(0.4, 0.5), radius=0.2, name="pad")
    held = dict.fromkeys(SIDES, CLAMPED)
    outline = square().zone(pad, name="pad")
    alone = solve(plate(outline, held), [Pressure(-1.0)], triangles=2000)
    same = plate(outline, held, zones={"pad": Section(thickness=0.01)})
    zoned = solve(same, [Pressure(-1.0)], triangles=2000)
    points = np.random.default_rng(2).random((50, 2))
    np.testing.assert_allclose(
        zoned.moments(points), alone.moments(points), rtol=1e-9, atol=1e-12
    )
    assert zoned.excluded == ()
    assert len(zoned.field_points) == len(alone.field_points)


def test_a_pressure_on_a_zone_and_the_weight_of_two_materials():
    pad = Rectangle(centre=(0.5, 0.5), size=(0.4, 0.2), name="pad")
    outline = square().zone(pad, name="pad")
    held = Plate(
        outline=outline,
        thickness=0.01,
        material=STEEL,
        supports=dict.fromkeys(SIDES, SIMPLY_SUPPORTED),
        zones={"pad": Section(thickness=0.03, material=ALUMINIUM)},
    )
    cases = [
        Case(name="pad", loads=[Pressure(-1e3, zone="pad")]),
        Case(name="weight", loads=[SelfWeight(acceleration=-10.0)]),
    ]
    solution = solve(held, cases, triangles=1000)
    load = solution.reactions(case="pad").load
    assert load.force == pytest.approx(-1e3 * 0.08, rel=1e-9)
    assert load.moment_x == pytest.approx(-1e3 * 0.08 * 0.5, rel=1e-9)
    mass = 7850 * 0.01 * 0.92 + 2660 * 0.03 * 0.08
    assert held.mass == pytest.approx(mass, rel=1e-6)
    weight = solution.reactions(case="weight").load.force
    assert weight == pytest.approx(-10.0 * mass, rel=1e-9)
    with pytest.raises(InputError, match="acts on zone 'pod'; the zones are pad"):
        solve(held, [Pressure(1.0, zone="pod")], triangles=500)


def test_four_corner_supports():
    """Collocation with exact corner terms: w .0255065 and m .1117108 at the centre.

    The moment through the mid-line is q a^3 / 8 by statics.
    """
    outline = square()
    corners = [(0, 0), (1, 0), (1, 1), (0, 1)]
    for k, place in enumerate(corners):
        outline = outline.mark(place, name=f"leg-{k}")
    legs = {f"leg-{k}": SIMPLY_SUPPORTED for k in range(4)}
    solution = solve(plate(outline, legs), [Pressure(-1.0)], triangles=8000)
    centre = [(0.5, 0.5)]
    assert solution.deflection(centre)[0] * D == pytest.approx(-0.0255065, rel=0.002)
    np.testing.assert_allclose(solution.moments(centre)[0, :2], 0.1117108, rtol=0.003)
    reactions = solution.reactions()
    assert [p.force.value for p in reactions.points] == pytest.approx(
        [0.25] * 4, rel=0.002
    )
    assert reactions.sides == ()
    assert {e.reason for e in solution.excluded} == {
        f"point support leg-{k}" for k in range(4)
    }
    across = np.linspace(0.0, 1.0, 201)
    m = solution.moments(np.column_stack([np.full(201, 0.5), across]))[:, 0]
    assert np.trapezoid(m, across) == pytest.approx(1 / 8, rel=0.005)


def test_a_quarter_with_guided_sides_is_the_whole():
    """Lines of symmetry: the clamped square and its quarter; series w .00126532."""
    quarter = square(0.5, 0.5)
    held = {"south": CLAMPED, "west": CLAMPED, "north": GUIDED, "east": GUIDED}
    solution = solve(plate(quarter, held), [Pressure(-1.0)], triangles=3000)
    w = solution.deflection([(0.5, 0.5)])[0] * D
    assert w == pytest.approx(-0.00126531908, rel=0.003)
    reactions = solution.reactions()
    by_side = {side.side: side for side in reactions.sides}
    north = by_side["north"]
    assert north.resultant.force == 0.0
    np.testing.assert_array_equal(north.line_reaction, 0.0)
    station = north.stations[:, 0].argmax()
    centre = solution.moments([(0.5, 0.5)])[0, 1]
    assert north.line_moment[station] == pytest.approx(centre, rel=0.03)
    # Where the clamped side meets the line of symmetry its moment is largest.
    west = by_side["west"]
    end = west.stations[:, 1].argmax()
    assert west.line_moment[end] == pytest.approx(-0.0513338, rel=0.02)
    assert reactions.imbalance < 1e-11


def test_an_annulus_guided_inside():
    """Closed form, b/a = 0.5, outer side simply supported: w .010331916 inside."""
    outline = Outline.circle((0.0, 0.0), radius=1.0).cut(
        Circle(centre=(0.0, 0.0), radius=0.5, name="hub")
    )
    held = plate(outline, {"rim": SIMPLY_SUPPORTED, "hub": GUIDED})
    solution = solve(held, [Pressure(-1.0)], triangles=6000)
    w = solution.deflection([(0.5, 0.0), (0.75, 0.0)]) * D
    np.testing.assert_allclose(w, [-0.010331916, -0.007115829], rtol=0.005)


def test_a_part_of_a_side_is_held_by_itself():
    """Support changes on a straight side: its ends are excluded, and it stiffens."""
    free = {"south": CLAMPED}
    outline = square().part("north", name="bracket", fractions=(0.4, 0.6))
    loads = [Pressure(-1.0)]
    alone = solve(plate(outline, free), loads, triangles=2000)
    held = solve(
        plate(outline, {**free, "bracket": SIMPLY_SUPPORTED}), loads, triangles=2000
    )
    assert abs(held.peak("deflection").value) < 0.5 * abs(
        alone.peak("deflection").value
    )
    ends = {tuple(np.round(e.place, 9)) for e in held.excluded}
    assert ends == {(0.6, 1.0), (0.4, 1.0)}
    by_points = square().part(
        "north", name="bracket", between=((0.4, 1.001), (0.6, 1.0))
    )
    assert by_points.side_length("bracket") == pytest.approx(0.2)
    np.testing.assert_allclose(
        by_points.boundaries[0].points, outline.boundaries[0].points, atol=1e-12
    )


def test_line_forces_along_sides_and_seams_arrive_in_full():
    outline = square().seam([(0.2, 0.3), (0.7, 0.8)], name="rail")
    held = plate(outline, {"south": CLAMPED, "north": CLAMPED})
    cases = [
        Case(name="rail", loads=[LineForce(force=-3.0, along="rail")]),
        Case(name="edge", loads=[LineForce(force=2.0, along="east")]),
        Case(name="couple", loads=[PointMoment(moment=(4.0, -5.0), at=(0.3, 0.6))]),
    ]
    solution = solve(held, cases, triangles=800)
    rail = solution.reactions(case="rail").load
    total = -3.0 * np.hypot(0.5, 0.5)
    assert rail.force == pytest.approx(total, rel=1e-12)
    assert rail.moment_x == pytest.approx(total * 0.55, rel=1e-12)
    edge = solution.reactions(case="edge").load
    assert edge.force == pytest.approx(2.0, rel=1e-12)
    assert edge.moment_y == pytest.approx(-2.0, rel=1e-12)
    couple = solution.reactions(case="couple").load
    assert couple.force == pytest.approx(0.0, abs=1e-10)
    assert (couple.moment_x, couple.moment_y) == pytest.approx((4.0, -5.0), rel=1e-12)
    for case in solution.cases:
        assert solution.reactions(case=case).imbalance < 1e-11
    with pytest.raises(
        InputError, match="a load acts along 'rial'; the sides and seams"
    ):
        solve(held, [LineForce(force=1.0, along="rial")], triangles=500)


def test_a_line_force_on_a_round_rim_counts_the_arc_not_the_chords():
    disc = plate(Outline.circle((0.0, 0.0), radius=0.5), {"rim": CLAMPED})
    ring = disc.outline.cut(Circle(centre=(0.0, 0.0), radius=0.2, name="hole"))
    held = plate(ring, {"rim": CLAMPED})
    solution = solve(held, [LineForce(force=-1.0, along="hole")], triangles=1000)
    assert solution.reactions().load.force == pytest.approx(-2 * np.pi * 0.2, rel=1e-9)


def test_supports_inside_are_excluded_where_they_end_and_cross():
    outline = (
        square()
        .seam([(0.2, 0.5), (0.8, 0.5)], name="beam")
        .seam([(0.5, 0.2), (0.5, 0.8), (0.8, 0.8)], name="rib")
        .mark((0.9, 0.1), name="post")
    )
    held = dict.fromkeys((*SIDES, "beam", "rib", "post"), SIMPLY_SUPPORTED)
    solution = solve(plate(outline, held), [Pressure(-1.0)], triangles=3000)
    reasons = sorted(e.reason for e in solution.excluded)
    assert reasons == sorted(
        [
            "end of the support beam",
            "end of the support beam",
            "end of the support rib",
            "end of the support rib",
            "corner of the support rib",
            "supports beam and rib meet",
            "point support post",
        ]
    )
    w = solution.deflection([(0.3, 0.5), (0.5, 0.3), (0.7, 0.8), (0.9, 0.1)])
    np.testing.assert_allclose(w, 0.0, atol=1e-12)
    assert solution.reactions().imbalance < 1e-11


def test_where_an_edge_moment_ends_nothing_finite_is_reported():
    """Moments grow with the logarithm of the distance there, corner forces with them.

    Beside the corners they settle: the peak on the rims of the discs keeps to 2 %.
    """
    held = plate(square(), dict.fromkeys(SIDES, SIMPLY_SUPPORTED))
    loads = [EdgeMoment(moment=1.0, along="south")]
    peaks = []
    for triangles in (2000, 8000):
        solution = solve(held, loads, triangles=triangles)
        assert [e.place for e in solution.excluded] == [(0.0, 0.0), (1.0, 0.0)]
        assert {e.reason for e in solution.excluded} == {"end of an edge moment"}
        forces = {c.corner.place: c.force.value for c in solution.reactions().corners}
        assert np.isnan(forces[0.0, 0.0])
        assert np.isnan(forces[1.0, 0.0])
        assert np.isfinite(forces[0.0, 1.0])
        peaks.append(solution.peak("von Mises").value)
    assert peaks[1] == pytest.approx(peaks[0], rel=0.02)


@pytest.mark.parametrize(
    ("supports", "ends"),
    [
        ({"south": CLAMPED}, {(0.7, 1.0), (0.3, 1.0)}),
        ({"west": CLAMPED}, {(0.7, 1.0), (0.3, 1.0)}),
    ],
)
def test_a_moment_on_a_part_of_a_free_side_ends_too(supports, ends):
    outline = square().part("north", name="part", fractions=(0.3, 0.7))
    loads = [EdgeMoment(moment=1.0, along="part")]
    solution = solve(plate(outline, supports), loads, triangles=500)
    found = {tuple(np.round(e.place, 9)) for e in solution.excluded}
    assert ends <= found


def test_a_moment_all_round_a_free_plate_ends_nowhere(on_three_points):
    loads = [EdgeMoment(moment=1.0, along=side) for side in SIDES]
    solution = solve(on_three_points, loads, size=0.2)
    assert {e.reason.split()[0] for e in solution.excluded} == {"point"}


def test_a_force_on_a_corner_goes_straight_into_its_support():
    held = plate(square(), dict.fromkeys(SIDES, SIMPLY_SUPPORTED))
    cases = [
        Case(name="both", loads=[Pressure(-1.0), PointForce(force=7.0, at=(0, 0))]),
        Case(name="pressure", loads=[Pressure(-1.0)]),
    ]
    solution = solve(held, cases, triangles=1500)
    forces = [
        {c.corner.place: c.force.value for c in solution.reactions(case=name).corners}
        for name in solution.cases
    ]
    assert forces[0][0.0, 0.0] == pytest.approx(forces[1][0.0, 0.0] - 7.0)
    assert solution.hold_down(case="both")[0].value == pytest.approx(7.065, rel=0.01)


def test_line_reactions_under_a_force_on_the_side_are_left_out():
    held = plate(square(), dict.fromkeys(SIDES, SIMPLY_SUPPORTED))
    loads = [PointForce(force=-5.0, at=(0.5, 0.0))]
    solution = solve(held, loads, triangles=2000)
    south = solution.reactions().sides[0]
    near = np.abs(south.stations[:, 0] - 0.5) < 0.01
    assert np.isnan(south.line_reaction[near]).all()
    assert south.resultant.force == pytest.approx(5.0, rel=1e-6)
    known = south.line_reaction[~np.isnan(south.line_reaction)]
    assert np.abs(known).max() < 1.0


def test_shears_without_a_finite_value_are_left_out_and_others_kept():
    """At 90 degrees a clamped side beside a free one: v_n grows, moments do not."""
    solution = solve(
        plate(square(), {"west": CLAMPED}), [Pressure(-1.0)], triangles=2000
    )
    assert solution.excluded == ()
    (root,) = solution.reactions().sides
    assert np.isnan(root.line_reaction[[0, -1]]).all()
    hinged = plate(square(), dict.fromkeys(SIDES, SIMPLY_SUPPORTED))
    for side in solve(hinged, [Pressure(-1.0)], triangles=500).reactions().sides:
        assert not np.isnan(side.line_reaction).any()


def test_what_cannot_be_held_is_refused():
    outline = (
        square().mark((0.5, 0.5), name="post").seam([(0.2, 0), (0.8, 0)], name="a")
    )
    with pytest.raises(InputError, match="mark 'post' is clamped; a point of a thin"):
        plate(outline, {"post": CLAMPED})
    with pytest.raises(InputError, match="seam 'a' runs along 'south', which is held"):
        plate(outline, {"a": SIMPLY_SUPPORTED, "south": CLAMPED})
    twice = outline.seam([(0.3, 0.5), (0.9, 0.5)], name="b")
    twice = twice.seam([(0.1, 0.5), (0.6, 0.5)], name="c")
    with pytest.raises(InputError, match="seam 'c' runs along 'b', which is held too"):
        plate(twice, {"b": SIMPLY_SUPPORTED, "c": SIMPLY_SUPPORTED})


def test_a_mark_on_a_held_side_adds_nothing_of_its_own():
    outline = square().mark((0.4, 0.0), name="bolt")
    held = dict.fromkeys((*SIDES, "bolt"), SIMPLY_SUPPORTED)
    reactions = solve(plate(outline, held), [Pressure(-1.0)], triangles=800).reactions()
    assert reactions.points == ()
    total = sum(side.resultant.force for side in reactions.sides)
    total += sum(corner.force.value for corner in reactions.corners)
    assert total == pytest.approx(1.0, rel=1e-9)


@pytest.mark.parametrize(
    ("side", "axis"), [("west", "parallel to x"), ("south", "parallel to y")]
)
def test_a_guided_side_alone_leaves_two_motions(side, axis):
    with pytest.raises(SolveError) as caught:
        solve(plate(square(), {side: GUIDED}), [Pressure(1.0)], triangles=100)
    assert str(caught.value) == (
        "the plate can still move as a rigid body (2 free motions: move up and down, "
        f"tilt about any line {axis}); add a support."
    )


def test_discs_that_cover_the_plate_leave_no_number():
    held = plate(square(), dict.fromkeys(SIDES, SIMPLY_SUPPORTED))
    loads = [PointForce(force=-1.0, at=(0.5, 0.5))]
    solution = solve(held, loads, triangles=200, excluded_radius=5.0)
    for quantity in ("von Mises", "largest principal", "m_xx", "shear stress"):
        value = solution.peak(quantity)
        assert np.isnan(value.value)
        assert value.reason == "is not known: the places left out cover the plate"
    assert np.isfinite(solution.peak("deflection").value)
    with pytest.raises(InputError, match="the mesh size is 0 m; it must be a positive"):
        solve(held, loads, size=0.0)
