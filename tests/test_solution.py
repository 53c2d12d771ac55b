"""What a user asks: values at points, peaks, cases, excluded places."""

from dataclasses import replace

import numpy as np
import oracles
import pytest
from plates import SIDES, grid, rectangle, solved

from kplate.adapt import solve
from kplate.dualforces import side_forces
from kplate.errors import InputError
from kplate.loads import Case, DiscPatch, PointForce, Pressure, RectanglePatch
from kplate.materials import STEEL
from kplate.outline import Outline
from kplate.plate import Plate
from kplate.shapes import Circle
from kplate.supports import CLAMPED, SIMPLY_SUPPORTED

UP = oracles.LinearPressure(at_origin=1.0)


@pytest.fixture(scope="module")
def square():
    return solved(rectangle(SIMPLY_SUPPORTED), grid(24), Pressure(1.0))


def test_deflection_and_slopes_at_any_point(square):
    points = np.random.default_rng(3).random((40, 2))
    exact = oracles.navier(points, (1.0, 1.0), UP)
    w = square.deflection(points) * 1e4
    np.testing.assert_allclose(w, exact.w, atol=2e-5)
    np.testing.assert_allclose(square.slopes(points) * 1e4, exact.slopes, atol=1e-4)


def test_peak_deflection_is_found_between_vertices():
    """The top of the square is at its centre, which no vertex of this mesh is."""
    solution = solved(rectangle(SIMPLY_SUPPORTED), grid(23), Pressure(-1.0))
    peak = solution.peak("deflection")
    assert peak.place == pytest.approx((0.5, 0.5), abs=0.002)
    assert peak.value * 1e4 == pytest.approx(-0.00406235, rel=0.002)
    assert peak.value == pytest.approx(solution.deflection([peak.place])[0], rel=1e-4)
    assert peak.kind == "none"
    assert peak.lower is None


def test_no_point_deflects_more_than_the_peak(square):
    points = np.random.default_rng(5).random((3000, 2))
    most = np.abs(square.deflection(points)).max()
    assert most <= abs(square.peak("deflection").value) * (1 + 1e-9)


@pytest.mark.parametrize("face", ["top", "bottom"])
def test_stress_peaks_bound_the_points(square, face):
    points = np.random.default_rng(6).random((2000, 2))
    von_mises = square.von_mises(points, face=face)
    assert von_mises.max() <= square.peak("von Mises").value * (1 + 1e-12)
    stress = square.stresses(points, face=face)
    first = 0.5 * (stress[:, 0] + stress[:, 1]) + np.hypot(
        0.5 * (stress[:, 0] - stress[:, 1]), stress[:, 2]
    )
    assert first.max() <= square.peak("largest principal").value * (1 + 1e-12)


def test_faces_swap_when_the_load_turns_round():
    up = solved(rectangle(SIMPLY_SUPPORTED), grid(12), Pressure(1.0))
    down = solved(rectangle(SIMPLY_SUPPORTED), grid(12), Pressure(-1.0))
    above, below = up.peak("largest principal"), down.peak("largest principal")
    assert above.value == pytest.approx(below.value)
    assert {above.face, below.face} == {"top", "bottom"}
    centre = [(0.5, 0.5)]
    # Pressed down the plate sags: its bottom is in tension.
    assert down.stresses(centre, face="bottom")[0, 0] > 0.0
    assert down.stresses(centre, face="top")[0, 0] < 0.0
    smallest = down.peak("smallest principal")
    assert smallest.value == pytest.approx(-below.value)


def test_moments_peak_with_their_sign(square):
    peak = square.peak("m_xx")
    exact = oracles.navier([(0.5, 0.5)], (1.0, 1.0), UP).moments[0, 0]
    assert exact < 0.0
    assert peak.value == pytest.approx(exact, rel=0.005)
    assert abs(square.peak("m_xy").value) == pytest.approx(0.0649647 / 2, rel=0.01)


def test_the_worst_case_is_named():
    cases = [
        Case(name="wind", loads=[Pressure(-1.0)]),
        Case(name="suction", loads=[Pressure(1.5)]),
    ]
    solution = solve(rectangle(CLAMPED), cases, triangles=500)
    assert solution.cases == ("wind", "suction")
    assert solution.peak("deflection").case == "suction"
    assert solution.peak("deflection").value > 0.0
    wind = solution.peak("deflection", case="wind")
    assert wind.value == pytest.approx(-solution.peak("deflection").value / 1.5)
    with pytest.raises(InputError) as caught:
        solution.deflection([(0.5, 0.5)])
    assert str(caught.value) == "there are 2 load cases; name one of wind, suction."
    with pytest.raises(InputError) as caught:
        solution.deflection([(0.5, 0.5)], case="snow")
    assert str(caught.value) == (
        "there is no load case 'snow'; the cases are wind, suction."
    )


def test_unknown_quantities_and_points_off_the_plate_are_refused(square):
    with pytest.raises(InputError) as caught:
        square.peak("stress")
    assert str(caught.value) == (
        "there is no quantity 'stress'; the quantities are deflection, von Mises, "
        "Tresca, largest principal, smallest principal, shear stress, m_xx, m_yy, "
        "m_xy, design bottom x, design bottom y, design top x, design top y."
    )
    with pytest.raises(InputError, match=r"point \(2, 2\) m is not on the plate"):
        square.moments([(2.0, 2.0)])


def test_a_point_force_is_left_out_of_peaks_and_a_patch_is_not():
    plate = rectangle(SIMPLY_SUPPORTED)
    point = solve(plate, [PointForce(force=-1.0, at=(0.5, 0.5))], triangles=4000)
    (excluded,) = point.excluded
    assert (excluded.place, excluded.radius) == ((0.5, 0.5), 0.01)
    assert excluded.reason == "point force"
    peak = point.peak("von Mises")
    reach = np.hypot(*np.subtract(peak.place, (0.5, 0.5)))
    assert reach >= 0.01 * (1 - 1e-6)
    # Near the force m grows with -log r (Timoshenko and Woinowsky-Krieger 1959, art.
    # 35, from memory); the series gives it on the rim of the disc.
    force = oracles.PointForce(at=(0.5, 0.5), force=-1.0)
    exact = oracles.navier([(0.51, 0.5)], (1.0, 1.0), force).moments
    stress = (
        6.0
        / 0.01**2
        * np.sqrt(exact[0, 0] ** 2 - exact[0, 0] * exact[0, 1] + exact[0, 1] ** 2)
    )
    assert peak.value == pytest.approx(stress, rel=0.03)
    patch = DiscPatch(force=-1.0, centre=(0.5, 0.5), radius=0.05)
    assert solve(plate, [patch], triangles=500).excluded == ()


def test_the_excluded_radius_is_settable_and_its_rim_judged():
    """Clamped re-entrant corner: moments go with r^(lambda - 1), lambda = 0.5445.

    Exponent: Williams 1952 (from memory); the bounded part of the field and the mesh
    move the growth by a tenth.
    """
    outline = Outline.polygon(
        [(0, 0), (2, 0), (2, 1), (1, 1), (1, 2), (0, 2)], sides=list("abcdef")
    )
    plate = Plate(
        outline=outline,
        thickness=0.02,
        material=STEEL,
        supports=dict.fromkeys("abcdef", CLAMPED),
    )
    peaks = []
    for radius in (0.04, 0.02, 0.01):
        solution = solve(
            plate, [Pressure(-1e4)], triangles=4000, excluded_radius=radius
        )
        peak = solution.peak("von Mises")
        assert np.hypot(*np.subtract(peak.place, (1.0, 1.0))) == pytest.approx(
            radius, rel=0.3
        )
        peaks.append(peak.value)
    growth = np.diff(np.log(peaks)) / np.log(2.0)
    np.testing.assert_allclose(growth, 1 - 0.5445, atol=0.1)
    with pytest.raises(InputError, match="excluded_radius is 0 m; it must be positive"):
        solve(plate, [Pressure(1.0)], excluded_radius=0.0)


def test_fields_hold_what_points_give(square):
    fields = square.point_fields()
    points = square.mesh.points
    np.testing.assert_allclose(
        fields["deflection [m]"], square.deflection(points), atol=1e-20
    )
    np.testing.assert_allclose(
        fields["moments [N]"], square.moments(points), atol=1e-12
    )
    np.testing.assert_allclose(
        fields["von Mises [Pa]"], square.von_mises(points, face="top"), rtol=1e-9
    )
    assert fields["stress top [Pa]"].shape == (len(points), 3)
    assert all(len(field) == len(points) for field in fields.values())


def test_mixed_or_missing_loads_and_sizes_are_refused():
    plate = rectangle(CLAMPED)
    with pytest.raises(InputError, match="1 of 2 loads are cases"):
        solve(plate, [Case(name="a", loads=[Pressure(1.0)]), Pressure(1.0)])
    with pytest.raises(InputError, match="give the number of triangles or their size"):
        solve(plate, [Pressure(1.0)], triangles=100, size=0.1)
    with pytest.raises(InputError, match="case 'load' has no loads"):
        solve(plate, [])


def test_progress_reports_stages_that_do_not_go_back():
    seen = []
    solve(
        rectangle(CLAMPED),
        [Pressure(1.0)],
        triangles=100,
        progress=lambda stage, done: seen.append((stage, done)),
    )
    done = [d for _, d in seen]
    assert done == sorted(done)
    assert {"mesh", "loads", "factorisation"} <= {stage for stage, _ in seen}


def test_round_plates_keep_their_true_rim():
    """Simply supported and clamped discs against the closed form.

    Within 0.5 % at 4,000 triangles, where two tangents at each vertex are 70 % off.
    """
    for name, support in (("simply supported", SIMPLY_SUPPORTED), ("clamped", CLAMPED)):
        plate = Plate(
            outline=Outline.circle((0.2, -0.1), radius=0.5),
            thickness=0.01,
            material=STEEL,
            supports={"rim": support},
        )
        solution = solve(plate, [Pressure(-1e3)], triangles=4000)
        D = STEEL.bending_stiffness(0.01)
        exact = oracles.disc([0.0], 0.5, name, pressure=-1e3, rigidity=D)
        w = solution.deflection([(0.2, -0.1)])[0]
        assert w == pytest.approx(float(exact.w[0]), rel=0.005)


def test_an_annulus_bends_as_its_closed_form():
    radii = (0.5, 1.0)
    hole = Circle(centre=(0.0, 0.0), radius=0.5, name="hole")
    plate = Plate(
        outline=Outline.circle((0.0, 0.0), radius=1.0).cut(hole),
        thickness=0.01,
        material=STEEL,
        supports={"rim": SIMPLY_SUPPORTED},
    )
    D = STEEL.bending_stiffness(0.01)
    exact = oracles.annulus(
        [0.75], radii, ("free", "simply supported"), pressure=-1.0, rigidity=D
    )
    solution = solve(plate, [Pressure(-1.0)], triangles=6000)
    w = solution.deflection([(0.0, 0.75)])[0]
    assert w == pytest.approx(float(exact.w[0]), rel=0.005)


def test_superposed_patches_act_as_the_pressure_they_make_up():
    plate, mesh = rectangle({"south": CLAMPED, "east": SIMPLY_SUPPORTED}), grid(5)
    quarters = [
        RectanglePatch(force=-0.25, centre=(x, y), size=(0.5, 0.5))
        for x in (0.25, 0.75)
        for y in (0.25, 0.75)
    ]
    patches = solved(plate, mesh, *quarters).deflection([(0.2, 0.9)])
    pressure = solved(plate, mesh, Pressure(-1.0)).deflection([(0.2, 0.9)])
    np.testing.assert_allclose(patches, pressure, rtol=1e-10)


@pytest.mark.parametrize("radius", [0.05, 0.02, 0.01])
def test_stress_under_a_small_patch_is_resolved(radius):
    """A clamped disc of 1 m, h 10 mm, a force on a small disc at its centre.

    Closed form (Timoshenko and Woinowsky-Krieger 1959, art. 16, from memory):
    m = P/4 pi ((1 + nu) ln(a/c) + (1 + nu) c^2 / 4 a^2) at the centre, load radius c.
    """
    plate = Plate(
        outline=Outline.circle((0.0, 0.0), radius=1.0),
        thickness=0.01,
        material=STEEL,
        supports={"rim": CLAMPED},
    )
    solution = solve(plate, [DiscPatch(force=-1.0, centre=(0.0, 0.0), radius=radius)])
    m = 1.3 / (4 * np.pi) * (np.log(1 / radius) + radius**2 / 4)
    stress = 6 * m / 0.01**2
    assert solution.peak("von Mises").value == pytest.approx(stress, rel=0.03)


def test_a_patch_smaller_than_the_thickness_is_left_out_of_peaks():
    load = RectanglePatch(force=-1.0, centre=(0.5, 0.5), size=(0.005, 0.004))
    solution = solve(rectangle(CLAMPED), [load], triangles=1000)
    assert [e.reason for e in solution.excluded] == ["patch smaller than the thickness"]
    place = solution.peak("von Mises").place
    assert np.hypot(*np.subtract(place, (0.5, 0.5))) >= 0.01 * (1 - 1e-6)


# Towards places without a finite moment, and forces with bands


@pytest.fixture(scope="module")
def notched():
    """An L-shape with a free notch, solved to 1 %."""
    outline = Outline.polygon(
        [(0, 0), (2.4, 0), (2.4, 1.2), (1.5, 1.2), (1.5, 1.8), (0, 1.8)],
        sides=["south", "east", "notch-south", "notch-east", "north", "west"],
    )
    held = {"south": CLAMPED, "north": SIMPLY_SUPPORTED, "west": SIMPLY_SUPPORTED}
    plate = Plate(outline=outline, thickness=0.02, material=STEEL, supports=held)
    return solve(plate, [Pressure(-1e3)], tolerance=0.01)


def test_stress_grows_towards_a_corner_by_its_exponent(notched):
    """Free to free at 270 degrees: r^(0.6379 - 1) (computed by kplate.corners, too)."""
    (corner,) = {disc.place for disc in notched.excluded}
    far, near = (notched.near(corner, r) for r in (0.02, 0.01))
    assert near.power == pytest.approx(0.6379 - 1.0, abs=1e-3)
    ratio = near.value.value / far.value.value
    assert ratio == pytest.approx(0.5**near.power, rel=0.05)
    assert near.words.endswith("moments go with r^-0.362")
    rim = notched.peak("von Mises").value
    assert far.value.value == pytest.approx(rim, rel=1e-6)


def test_other_places_have_no_growth(notched):
    with pytest.raises(InputError, match=r"finite moment are \(1\.5, 1\.2\)"):
        notched.near((0.5, 0.5), 0.01)
    with pytest.raises(InputError, match="nothing of the plate is 50 m from"):
        notched.near((1.5, 1.2), 50.0)


def test_a_point_force_grows_with_the_logarithm():
    plate = rectangle(CLAMPED)
    solution = solve(plate, [PointForce(force=-1.0, at=(0.5, 0.5))], triangles=500)
    growth = solution.near((0.5, 0.5), 0.02)
    assert growth.power is None
    assert growth.words.endswith("grow with the logarithm of the distance")


def test_forces_of_sides_and_corners_carry_what_is_known_of_them(notched):
    """Indicators from the balanced moments, small beside the forces."""
    for side in notched.reactions().sides:
        force = notched.resultant(side.side)
        assert force.kind == "indicator"
        assert force.value == side.resultant.force
        assert force.upper - force.lower < 0.1 * abs(force.value)
    for corner in notched.reactions().corners:
        assert corner.force.kind == "indicator"
        assert corner.force.upper - corner.force.lower < 0.1 * abs(corner.force.value)
    with pytest.raises(InputError, match="no held side, seam or mark 'east'"):
        notched.resultant("east")


def test_the_dual_has_the_forces_of_a_square():
    """Sides 0.32483 - corner share: together with the corners they bear the load."""
    solution = solve(rectangle(SIMPLY_SUPPORTED), [Pressure(-1.0)], tolerance=0.01)
    at = np.isin(solution.mesh.points, (0, 1)).all(axis=1)
    corners = np.flatnonzero(at).tolist()
    sides = [side_forces(solution.dual, name, corners)[0] for name in SIDES]
    exact = 0.25 * (1.0 + 4.0 * 0.0649647)
    np.testing.assert_allclose(sides, exact, rtol=2e-3)


def test_dkt_carries_indicators_where_a_tolerance_is_asked_for():
    """Stress: what smoothing moves. Deflection: what coarser meshes tell."""
    plate, load, widths = rectangle(CLAMPED), Pressure(-1.0), []
    for triangles in (500, 4000):
        solution = solve(
            plate, [load], element="dkt", tolerance=0.01, triangles=triangles
        )
        deflection = solution.peak("deflection")
        stress = solution.peak("von Mises")
        assert deflection.kind == stress.kind == "indicator"
        assert solution.peak("shear stress").kind == "none"
        assert deflection.lower < -1.265319087e-7 < deflection.upper  # p a^4 / D
        assert stress.lower < 2738.0 < stress.upper  # 6 x 0.05133 x sqrt(0.79) / h^2
        widths.append([own.upper - own.lower for own in (deflection, stress)])
    assert widths[1][0] < 0.25 * widths[0][0]
    assert widths[1][1] < 0.6 * widths[0][1]
    alone = solve(plate, [load], element="dkt", triangles=500)
    assert alone.coarser == ()
    assert {alone.peak(q).kind for q in ("deflection", "von Mises")} == {"none"}


def test_reactions_of_dkt_carry_indicators_that_hold_navier_s():
    """Sides bear 0.32483 each less the corners, which pull with 0.0649647."""
    plate = rectangle(SIMPLY_SUPPORTED)
    solution = solve(
        plate, [Pressure(-1.0)], element="dkt", tolerance=0.01, triangles=2000
    )
    for corner in solution.reactions().corners:
        assert corner.force.kind == "indicator"
        assert corner.force.lower < -0.0649647 < corner.force.upper
    assert solution.hold_down()[0].kind == "indicator"
    force = solution.resultant("north")
    assert force.kind == "indicator"
    assert force.upper - force.lower < 0.02 * force.value
    column = replace(plate, outline=plate.outline.mark((0.5, 0.5), name="column"))
    column = replace(column, supports={**plate.supports, "column": SIMPLY_SUPPORTED})
    solution = solve(
        column, [Pressure(-1.0)], element="dkt", tolerance=0.01, triangles=2000
    )
    (point,) = solution.reactions().points
    assert point.force.kind == "indicator"
    assert solution.resultant("column") == point.force
    fine = solve(column, [Pressure(-1.0)], triangles=3000)
    (exact,) = fine.reactions().points
    assert point.force.lower < exact.force.value < point.force.upper
