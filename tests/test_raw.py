"""Moments and shears of C1 elements themselves: exact states, samples, peaks, steps."""

from dataclasses import replace
from functools import cache

import numpy as np
import oracles
import pytest
import pyvista
from hypothesis import given, settings
from plates import SIDES, THICKNESS, grid, rectangle, unit_material
from strategies import numbers

from kplate.adapt import solve
from kplate.elements.triangle import edge_normals
from kplate.loads import Case, EdgeMoment, PointForce, Pressure, PressureField
from kplate.materials import STEEL
from kplate.mesh import Mesh
from kplate.outline import Outline
from kplate.output.vtk import write_vtk
from kplate.plate import Plate, Section
from kplate.raw import MOST_STEPS, TOLERANCE, RawMoments
from kplate.recovery import von_mises
from kplate.shapes import Circle, Rectangle
from kplate.solution import Solution
from kplate.solve.static import solve_static
from kplate.supports import CLAMPED, FREE, GUIDED, SIMPLY_SUPPORTED

D, NU = 1e4, 0.3
UP = oracles.LinearPressure(at_origin=1.0)
ELEMENTS = ("quintic", "hct")
DEGREE = {"quintic": 5, "hct": 3}
ORDERS = ((0, 0), (1, 0), (0, 1), (2, 0), (1, 1), (0, 2))
# Middles of the edges of what is quadratic between samples are off by no more than the
# tolerance; its middle may then be by four thirds of it.
WITHIN = 4.0 / 3.0 * TOLERANCE

both = pytest.mark.parametrize("element", ELEMENTS)


def solved(element, plate, mesh, *loads):
    """Solution with an element on a given mesh."""
    case = Case(name="load", loads=loads)
    return Solution(state=solve_static(plate, mesh, [case], element=element))


def warped(n):
    """A grid over the unit square whose inner vertices are off by up to a fifth."""
    mesh = grid(n)
    inner = np.setdiff1d(np.arange(len(mesh.points)), mesh.boundary_edges)
    points = mesh.points.copy()
    points[inner] += 0.2 / n * np.random.default_rng(7).uniform(-1, 1, (len(inner), 2))
    return replace(mesh, points=points)


def triangular(values, degree):
    """Coefficients of ``x^i y^j``, those beyond the degree left out."""
    i, j = np.indices(values.shape)
    return np.where(i + j <= degree, values, 0.0)


@cache
def base(element):
    return solve_static(
        rectangle(CLAMPED, D=D),
        warped(4),
        [Case(name="any", loads=[Pressure(1.0)])],
        element=element,
    )


def imposed(state, coefficients):
    """The state whose D w is a polynomial of x and y, in every triangle."""
    mesh, numbering = state.mesh, state.constraints.numbering
    at = oracles.polynomial(mesh.points, coefficients, nu=NU, rigidity=D)
    orders = ORDERS[: numbering.per_vertex]
    unknowns = np.stack([at.derivatives[order] for order in orders], axis=1).ravel()
    middles = mesh.points[mesh.edges].mean(axis=1)
    slopes = oracles.polynomial(middles, coefficients, nu=NU, rigidity=D).slopes
    normals = np.empty((len(middles), 2))
    normals[mesh.triangle_edges] = edge_normals(mesh.points[mesh.triangles])
    across = np.einsum("ec,ec->e", slopes, normals)
    return replace(state, unknowns=np.concatenate([unknowns, across])[:, None])


def scattered(mesh, count, seed=0):
    """Triangles drawn at random, and points of theirs: barycentrics and places."""
    rng = np.random.default_rng(seed)
    triangles = rng.integers(0, len(mesh.triangles), count)
    barycentrics = rng.dirichlet(np.ones(3), count)
    places = np.einsum(
        "kv,kvc->kc", barycentrics, mesh.points[mesh.triangles[triangles]]
    )
    return triangles, barycentrics, places


# Exact states


@both
@settings(max_examples=15)
@given(values=numbers(6, 6))
def test_moments_and_shears_of_a_polynomial_are_its_own(element, values):
    """Of degree 5 (3): m = D kappa, q_x = -(m_xx,x + m_xy,y), in every triangle."""
    coefficients = triangular(values, DEGREE[element])
    raw = RawMoments(state=imposed(base(element), coefficients))
    triangles, barycentrics, places = scattered(base(element).mesh, 40)
    exact = oracles.polynomial(places, coefficients, nu=NU, rigidity=D)
    found = raw.moments_at(triangles, barycentrics)[..., 0]
    np.testing.assert_allclose(found, exact.moments, rtol=0.0, atol=1e-8)
    found = raw.shears_at(triangles, barycentrics)[..., 0]
    np.testing.assert_allclose(found, exact.shears, rtol=0.0, atol=1e-6)


@both
@settings(max_examples=15)
@given(values=numbers(6, 6))
def test_moments_at_the_ends_of_boundary_edges_are_those_of_their_triangles(
    element, values
):
    coefficients = triangular(values, DEGREE[element])
    state = imposed(base(element), coefficients)
    edges = np.arange(len(state.mesh.boundary_edges))
    for end in (0, 1):
        places = state.mesh.points[state.mesh.boundary_edges[:, end]]
        exact = oracles.polynomial(places, coefficients, nu=NU, rigidity=D).moments
        ends = np.full(len(edges), end)
        found = RawMoments(state=state).corner_moments(edges, ends)[..., 0]
        np.testing.assert_allclose(found, exact, rtol=0.0, atol=1e-6)


def corner_marks(mesh, a, b, corners):
    """The outline of a rectangle with some corners marked, and such a mesh."""
    outline = Outline.polygon([(0, 0), (a, 0), (a, b), (0, b)], sides=SIDES)
    for k, place in enumerate(corners):
        outline = outline.mark(place, name=f"pin {k + 1}")
    vertices = [int(np.hypot(*(mesh.points - p).T).argmin()) for p in corners]
    names = tuple(mark.name for mark in outline.marks)
    return outline, replace(mesh, mark_vertices=vertices, mark_names=names)


def pinned(a, b, corners, n=4):
    """A rectangle on pins at some of its corners, and a grid on it."""
    outline, mesh = corner_marks(grid(n, a=a, b=b), a, b, corners)
    plate = Plate(
        outline=outline,
        thickness=THICKNESS,
        material=unit_material(NU, D=D),
        supports=dict.fromkeys(mesh.mark_names, SIMPLY_SUPPORTED),
    )
    return plate, mesh


@both
def test_moments_along_two_edges_bend_a_plate_to_a_cylinder(element):
    """M on the edges along y and nu M on those along x: m_xx = M, w,yy = 0.

    M > 0 compresses the top face: the plate is hollow above, w,xx > 0.
    """
    plate, mesh = pinned(1.2, 0.8, [(0, 0), (1.2, 0), (0, 0.8)])
    ends = [EdgeMoment(moment=5.0, along=side) for side in ("east", "west")]
    others = [EdgeMoment(moment=NU * 5.0, along=side) for side in ("south", "north")]
    solution = solved(element, plate, mesh, *ends, *others)
    _, _, places = scattered(mesh, 50)
    expected = np.tile([5.0, NU * 5.0, 0.0], (50, 1))
    np.testing.assert_allclose(solution.moments(places), expected, atol=1e-8)
    np.testing.assert_allclose(solution.shears(places), 0.0, atol=1e-6)
    x = places[:, 0]
    w = 5.0 / (2 * D) * (x**2 - 1.2 * x)
    np.testing.assert_allclose(solution.deflection(places), w, atol=1e-12)


@both
def test_a_force_at_a_corner_twists_a_plate_on_three_pins(element):
    """P up at the corner +x, +y: m_xy = P/2 all over, nothing else; statics."""
    plate, mesh = pinned(1.2, 0.8, [(0, 0), (1.2, 0), (0, 0.8)])
    solution = solved(element, plate, mesh, PointForce(force=6.0, at=(1.2, 0.8)))
    _, _, places = scattered(mesh, 50)
    expected = np.tile([0.0, 0.0, 3.0], (50, 1))
    np.testing.assert_allclose(solution.moments(places), expected, atol=1e-8)
    np.testing.assert_allclose(solution.shears(places), 0.0, atol=1e-6)
    pins = [point.force.value for point in solution.reactions().points]
    np.testing.assert_allclose(pins, [6.0, -6.0, -6.0], rtol=1e-9)


def strip(support):
    """A plate that bends along x only: w, v = 0 on lines of symmetry along x."""
    held = {"west": CLAMPED, "south": GUIDED, "north": GUIDED, "east": support}
    return rectangle(held, D=D, nu=NU)


def test_a_clamped_strip_on_an_unstructured_mesh_is_exact():
    """D w = p x^2 (1 - x)^2 / 24, of degree 4: the quintic has it on any mesh."""
    solution = solve(strip(CLAMPED), [Pressure(-24.0)], triangles=60, element="quintic")
    coefficients = -np.array([[0.0], [0.0], [1.0], [-2.0], [1.0]])
    triangles, barycentrics, places = scattered(solution.mesh, 100)
    exact = oracles.polynomial(places, coefficients, nu=NU, rigidity=D)
    raw = RawMoments(state=solution.state)
    found = raw.moments_at(triangles, barycentrics)[..., 0]
    np.testing.assert_allclose(found, exact.moments, atol=1e-9)
    found = raw.shears_at(triangles, barycentrics)[..., 0]
    np.testing.assert_allclose(found, exact.shears, atol=1e-7)


@both
def test_a_strip_bent_by_its_end_on_an_unstructured_mesh_is_exact(element):
    """m_xx = M and m_yy = nu M all over, as w,yy = 0."""
    loads = [EdgeMoment(moment=-2.0, along="east")]
    solution = solve(
        strip(FREE), loads, triangles=80, element=element, excluded_radius=0.3
    )
    _, _, places = scattered(solution.mesh, 100)
    expected = np.tile([-2.0, -NU * 2.0, 0.0], (100, 1))
    np.testing.assert_allclose(solution.moments(places), expected, atol=1e-8)
    np.testing.assert_allclose(solution.shears(places), 0.0, atol=1e-6)


@pytest.mark.parametrize(
    ("element", "of_moments", "of_shears"), [("quintic", 4.0, 3.0), ("hct", 2.0, None)]
)
def test_moments_and_shears_converge_with_their_order(element, of_moments, of_shears):
    """Root mean square over the square's inside; shears of HCT are smoothed ones."""
    places = 0.1 + 0.8 * np.random.default_rng(4).random((300, 2))
    exact = oracles.navier(places, (1.0, 1.0), UP)
    off = []
    for n in (5, 10, 20):
        found = solved(element, rectangle(SIMPLY_SUPPORTED), grid(n), Pressure(1.0))
        differences = [
            found.moments(places) - exact.moments,
            found.shears(places) - exact.shears,
        ]
        off.append([np.sqrt(np.mean(d**2)) for d in differences])
    orders = -np.diff(np.log2(off), axis=0)[-1]
    assert orders[0] == pytest.approx(of_moments, abs=0.3)
    if of_shears is not None:
        assert orders[1] == pytest.approx(of_shears, abs=0.3)


# Samples


def ell(support, **options):
    """An L-shaped plate, its corner inside at (1, 1)."""
    points = [(0, 0), (2, 0), (2, 1), (1, 1), (1, 2), (0, 2)]
    outline = Outline.polygon(points, sides=list("abcdef"))
    return Plate(
        outline=outline,
        thickness=0.02,
        material=STEEL,
        supports=dict.fromkeys("abcdef", support),
    )


@pytest.fixture(scope="module", params=ELEMENTS)
def notched(request):
    """Solved on an unstructured mesh, the disc about its corner left out."""
    return solve(
        ell(CLAMPED),
        [Pressure(-1e4)],
        triangles=500,
        element=request.param,
        excluded_radius=0.06,
    )


def nine_fields(moments, shears):
    """Moments, shears and what von Mises's stress goes with, (k, 6, c)."""
    stress = von_mises(np.moveaxis(moments, 1, -1))[:, None]
    return np.concatenate([moments, shears, stress], axis=1)


def interpolation_errors(solution, count=2000):
    """Errors at random places of small triangles as shares of ranges, and values.

    Places in excluded discs are left out; the range of a field is that of the samples.
    """
    samples, mesh = solution.samples, solution.mesh
    raw = RawMoments(state=solution.state)
    rng = np.random.default_rng(3)
    small = rng.integers(0, len(samples.triangles), count)
    share, corners = rng.dirichlet(np.ones(3), count), samples.triangles[small]
    places = np.einsum("kv,kvc->kc", share, samples.points[corners])
    owners = samples.owners[small]
    local = mesh.barycentrics(owners, places)
    known = nine_fields(samples.moments, samples.shears)
    linear = np.einsum("kv,kvac->kac", share, known[corners])
    true = nine_fields(raw.moments_at(owners, local), raw.shears_at(owners, local))
    out = np.ones((2, max(count, len(known))), dtype=bool)
    for disc in solution.excluded:
        for row, at in zip(out, (places, samples.points), strict=True):
            row[: len(at)] &= np.hypot(*(at - disc.place).T) >= disc.radius
    ranges = np.ptp(known[out[1, : len(known)]], axis=0)
    return (np.abs(linear - true) / ranges)[out[0, :count]], true[out[0, :count]]


def assert_linear_enough(solution, within=WITHIN):
    """The stress has a kink where it is nothing, which the finest lattice may miss."""
    errors, values = interpolation_errors(solution)
    assert errors[:, :5].max() < within
    strong = values[:, 5] > 0.1 * values[:, 5].max(axis=0)
    assert errors[:, 5][strong].max() < WITHIN


@both
@pytest.mark.parametrize("support", [SIMPLY_SUPPORTED, CLAMPED], ids=lambda s: s.name)
@pytest.mark.parametrize("n", [4, 8])
def test_fields_are_linear_between_samples_on_grids(element, support, n):
    solution = solved(element, rectangle(support), grid(n), Pressure(-1.0))
    assert_linear_enough(solution, within=TOLERANCE)


def test_fields_are_linear_between_samples_outside_the_disc(notched):
    assert len(notched.excluded) == 1
    assert_linear_enough(notched)


def test_a_field_that_is_nothing_asks_for_no_samples():
    """Bent to a cylinder: m is even, m_xy and the shears are round-off."""
    plate, mesh = pinned(1.0, 1.0, [(0, 0), (1, 0), (0, 1)], n=8)
    ends = [EdgeMoment(moment=5.0, along=side) for side in ("east", "west")]
    others = [EdgeMoment(moment=NU * 5.0, along=side) for side in ("south", "north")]
    samples = solved("quintic", plate, mesh, *ends, *others).samples
    assert len(samples.triangles) <= 12 * len(mesh.triangles)


def test_the_finest_lattice_is_enough_for_a_point_force():
    """Under it moments of the polynomials swing, and no triangle is parted further."""
    load = PointForce(force=-1.0, at=(0.52, 0.51))
    solution = solved("quintic", rectangle(CLAMPED), grid(4), load)
    assert np.bincount(solution.samples.owners).max() == MOST_STEPS**2


def areas_and_sides(solution):
    """Areas of the small triangles and lengths of the pieces of the boundary."""
    points, samples = solution.samples.points, solution.samples
    a, b, c = np.moveaxis(points[samples.triangles], 1, 0)
    areas = 0.5 * np.linalg.det(np.stack([b - a, c - a], axis=1))
    start, end = np.moveaxis(points[samples.rim], 1, 0)
    return areas, np.hypot(*(end - start).T)


def test_small_triangles_and_pieces_of_the_rim_make_up_the_plate(notched):
    areas, lengths = areas_and_sides(notched)
    samples, mesh = notched.samples, notched.mesh
    assert areas.min() > 0.0
    assert areas.sum() == pytest.approx(3.0, rel=1e-9)
    assert lengths.sum() == pytest.approx(8.0, rel=1e-9)
    np.testing.assert_allclose(np.bincount(samples.owners, areas), mesh.areas)
    step = np.diff(mesh.points[mesh.boundary_edges], axis=1)[:, 0]
    np.testing.assert_allclose(
        np.bincount(samples.rim_owners, lengths), np.hypot(*step.T)
    )


def test_samples_lie_in_the_triangles_that_hold_them(notched):
    """And small triangles, with all their corners, in those that own them."""
    samples, mesh = notched.samples, notched.mesh
    local = mesh.barycentrics(samples.holders, samples.points)
    assert local.min() > -1e-8
    holders = samples.holders[samples.triangles]
    np.testing.assert_array_equal(holders, np.tile(samples.owners, (3, 1)).T)
    np.testing.assert_array_equal(samples.sections, mesh.zones[samples.holders])


def test_pieces_of_the_rim_lie_on_their_edges(notched):
    """And run as these do, the plate on their left."""
    samples, mesh = notched.samples, notched.mesh
    start, end = np.moveaxis(mesh.points[mesh.boundary_edges[samples.rim_owners]], 1, 0)
    along = (end - start) / np.hypot(*(end - start).T)[:, None]
    for own in samples.rim.T:
        arm = samples.points[own] - start
        across = along[:, 0] * arm[:, 1] - along[:, 1] * arm[:, 0]
        np.testing.assert_allclose(across, 0.0, atol=1e-12)
    step = np.diff(samples.points[samples.rim], axis=1)[:, 0]
    assert (np.einsum("kc,kc->k", step, along) > 0.0).all()


def test_the_rim_of_a_hole_is_part_of_the_rim():
    hole = Circle(centre=(0.5, 0.5), radius=0.2, name="hole")
    outline = Outline.polygon([(0, 0), (1, 0), (1, 1), (0, 1)], sides=SIDES).cut(hole)
    plate = Plate(
        outline=outline,
        thickness=0.01,
        material=STEEL,
        supports=dict.fromkeys(SIDES, SIMPLY_SUPPORTED),
    )
    solution = solve(plate, [Pressure(-1e3)], triangles=400, element="hct")
    areas, lengths = areas_and_sides(solution)
    assert areas.sum() == pytest.approx(solution.mesh.area, rel=1e-9)
    assert areas.sum() == pytest.approx(1.0 - 0.04 * np.pi, rel=0.01)
    assert lengths.sum() == pytest.approx(4.0 + 0.4 * np.pi, rel=0.01)


# Peaks, fields and files


def on_discs(solution, count=400):
    """Places on the rims of the excluded discs that are on the plate."""
    angle = 2 * np.pi * np.arange(count) / count
    around = np.column_stack([np.cos(angle), np.sin(angle)])
    places = np.concatenate(
        [disc.place + disc.radius * around for disc in solution.excluded]
    )
    return places[solution.mesh.covers(places)]


def outside_discs(solution, places):
    out = np.ones(len(places), dtype=bool)
    for disc in solution.excluded:
        out &= np.hypot(*(places - disc.place).T) >= disc.radius
    return out


def test_the_peak_of_the_stress_is_that_of_the_fields_and_of_the_file(
    notched, tmp_path
):
    """Outside the disc and on its rim, between the points by lines; within 0.5 %."""
    peak = notched.peak("von Mises")
    name = "von Mises [Pa]"
    found = pyvista.read(write_vtk(notched, tmp_path / "a.vtu"))
    written = np.float32(notched.point_fields()[name])
    np.testing.assert_array_equal(found[name], written)
    reach = np.hypot(*(found.points[:, :2] - (1.0, 1.0)).T)
    rim = on_discs(notched)
    rim = pyvista.PolyData(np.column_stack([rim, np.zeros(len(rim))]))
    triangles = found.extract_cells(found.celltypes == pyvista.CellType.TRIANGLE)
    probed = rim.sample(triangles)
    assert probed["vtkValidPointMask"].mean() > 0.99
    largest = max(found[name][reach >= 0.06].max(), probed[name].max())
    assert peak.value == pytest.approx(largest, rel=TOLERANCE)
    # Around the peak it is sought on a finer lattice than that of the rim.
    reach = np.hypot(*np.subtract(peak.place, (1.0, 1.0)))
    assert 0.06 * (1.0 - 1e-9) <= reach < 0.061


@both
def test_without_discs_the_peak_is_the_largest_value_of_the_field(element):
    solution = solved(element, rectangle(CLAMPED), grid(6), Pressure(-1.0))
    assert solution.excluded == ()
    largest = solution.point_fields()["von Mises [Pa]"].max()
    peak = solution.peak("von Mises").value
    assert largest <= peak * (1.0 + 1e-9)
    assert peak < (1.0 + TOLERANCE) * largest


def test_no_point_outside_the_disc_is_stressed_more_than_the_peak(notched):
    """Evaluated in the triangles themselves; the tolerance is that of the samples."""
    triangles, barycentrics, places = scattered(notched.mesh, 6_000)
    moments = RawMoments(state=notched.state).moments_at(triangles, barycentrics)
    stress = 6.0 / 0.02**2 * von_mises(moments[..., 0])
    largest = stress[outside_discs(notched, places)].max()
    assert largest <= notched.peak("von Mises").value * (1.0 + WITHIN)
    assert largest > 0.8 * notched.peak("von Mises").value
    assert stress.max() > 1.2 * largest


def test_values_at_points_are_those_of_the_samples_there():
    """Samples inside triangles, where there is but one value."""
    solution = solved("quintic", rectangle(CLAMPED), grid(4), Pressure(-1.0))
    samples, mesh = solution.samples, solution.mesh
    owner = np.empty(len(samples.points), dtype=int)
    owner[samples.triangles] = samples.owners[:, None]
    inside = mesh.barycentrics(owner, samples.points).min(axis=1) > 0.01
    assert inside.sum() > 1000
    places = samples.points[inside]
    for found, known in (
        (solution.moments(places), samples.moments),
        (solution.shears(places), samples.shears),
        (solution.slopes(places), samples.bent[:, 1:]),
    ):
        scale = np.abs(known).max()
        np.testing.assert_allclose(found, known[inside, :, 0], atol=1e-9 * scale)


# Steps of the section


def stepped(second, nu=NU, n=8):
    """A square, thicker (by this factor) where x > 1/2, hinged; its mesh follows."""
    thick = Rectangle(centre=(0.75, 0.5), size=(0.5, 1.0), name="own")
    outline = Outline.polygon([(0, 0), (1, 0), (1, 1), (0, 1)], sides=SIDES)
    plate = Plate(
        outline=outline.zone(thick, name="thick"),
        thickness=THICKNESS,
        material=unit_material(nu, D=D),
        supports=dict.fromkeys(SIDES, SIMPLY_SUPPORTED),
        zones={"thick": Section(thickness=second * THICKNESS)},
    )
    mesh = grid(n)
    right = mesh.points[mesh.triangles].mean(axis=1)[:, 0] > 0.5
    return plate, replace(mesh, zones=right.astype(int), zone_names=("plate", "thick"))


def beside_the_step(mesh: Mesh, share=0.3):
    """Triangles left and right of x = 1/2, and barycentrics of points between them."""
    middles = mesh.points[mesh.triangles].mean(axis=1)[:, 0]
    ends = mesh.points[mesh.edges]
    edges = np.flatnonzero(np.abs(ends[..., 0] - 0.5).max(axis=1) < 1e-9)
    places = ends[edges, 0] + share * (ends[edges, 1] - ends[edges, 0])
    found = []
    for side in (-1.0, 1.0):
        own = [
            next(
                t
                for t in np.flatnonzero((mesh.triangle_edges == edge).any(axis=1))
                if side * (middles[t] - 0.5) > 0.0
            )
            for edge in edges
        ]
        inside = places + side * 1e-12 * np.array([1.0, 0.0])
        found.append((np.array(own), mesh.barycentrics(np.array(own), inside)))
    return found


@both
def test_moments_jump_at_a_step_as_the_rigidity_does(element):
    """One curvature on both sides, imposed: the moments are as 1 to 8, unsmoothed."""
    plate, mesh = stepped(2.0)
    case = Case(name="any", loads=[Pressure(1.0)])
    state = solve_static(plate, mesh, [case], element=element)
    coefficients = triangular(np.arange(1.0, 37.0).reshape(6, 6), 2)
    raw = RawMoments(state=imposed(state, coefficients))
    left, right = (raw.moments_at(*own)[..., 0] for own in beside_the_step(mesh))
    np.testing.assert_allclose(right, 8.0 * left, rtol=1e-9)
    samples = raw.samples
    exact = oracles.polynomial(samples.points, coefficients, nu=NU, rigidity=D).moments
    factor = np.where(samples.sections == 1, 8.0, 1.0)[:, None]
    np.testing.assert_allclose(samples.moments[..., 0], factor * exact, atol=1e-8)
    step = np.abs(samples.points[:, 0] - 0.5) < 1e-6
    assert set(samples.sections[step]) == {0, 1}


def across_the_step(element, n):
    """Moments left and right of the step of a hinged square pressed down, (k, 3)."""
    plate, mesh = stepped(2.0, n=n)
    raw = RawMoments(state=solved(element, plate, mesh, Pressure(-1.0)).state)
    return [raw.moments_at(*own)[..., 0] for own in beside_the_step(mesh)]


def jump(left, right):
    """Root mean square of the jump of m_nn as a share of its largest value."""
    off = left[:, 0] - right[:, 0]
    return np.sqrt(np.mean(off**2)) / np.abs(left[:, 0]).max()


def test_moments_across_a_step_meet_as_the_mesh_gets_finer():
    """HCT: w,tt and w,nt are one on both sides to round-off, m_nn within its error."""
    jumps = []
    for n in (8, 16, 32):
        left, right = across_the_step("hct", n)
        bends = [
            (m[:, 1] - NU * m[:, 0]) / (k * D * (1 - NU**2))
            for m, k in ((left, 1.0), (right, 8.0))
        ]
        np.testing.assert_allclose(*bends, atol=1e-9 * np.abs(bends[0]).max())
        np.testing.assert_allclose(right[:, 2], 8.0 * left[:, 2], rtol=1e-6)
        jumps.append(jump(left, right))
    assert jumps[-1] < 0.005
    assert (np.diff(np.log2(jumps)) < -1.3).all()


def test_the_quintic_cannot_carry_a_moment_over_a_step():
    """One curvature at a vertex: m_nn is off by its own size on every mesh."""
    for n in (4, 8):
        assert jump(*across_the_step("quintic", n)) > 1.0


# Load cases


def lopsided(x, y):
    return 1e-6 * (x - 0.2) * (1.0 + y)


@both
def test_each_case_has_the_moments_it_has_alone(element):
    cases = [
        Case(name="even", loads=[Pressure(-1.0)]),
        Case(name="odd", loads=[PressureField(lopsided)]),
    ]
    plate, mesh = rectangle(SIMPLY_SUPPORTED), grid(6)
    together = Solution(state=solve_static(plate, mesh, cases, element=element))
    triangles, barycentrics, places = scattered(mesh, 30)
    raw = RawMoments(state=together.state)
    for index, case in enumerate(cases):
        alone = solved(element, plate, mesh, *case.loads)
        own = RawMoments(state=alone.state)
        np.testing.assert_allclose(
            raw.moments_at(triangles, barycentrics)[..., index],
            own.moments_at(triangles, barycentrics)[..., 0],
            atol=1e-9 * abs(alone.peak("m_xx").value),
        )
        np.testing.assert_allclose(
            together.shears(places, case=case.name),
            alone.shears(places),
            atol=1e-7 * np.abs(alone.shears(places)).max(),
        )
        found = together.peak("von Mises", case=case.name)
        assert found.value == pytest.approx(
            alone.peak("von Mises").value, rel=TOLERANCE
        )
        assert found.case == case.name


def bump(x, y):
    return 1e-6 * np.exp(-((x - 0.3) ** 2 + (y - 0.4) ** 2) / 0.05**2)


@both
def test_every_case_is_sampled_finely_enough_for_itself(element):
    """A case that is a million times weaker than the other, and narrow, too."""
    cases = [
        Case(name="even", loads=[Pressure(-1.0)]),
        Case(name="narrow", loads=[PressureField(bump)]),
    ]
    state = solve_static(rectangle(SIMPLY_SUPPORTED), grid(12), cases, element=element)
    solution = Solution(state=state)
    assert solution.samples.moments.shape[2] == 2
    assert_linear_enough(solution)
