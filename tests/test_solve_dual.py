"""The dual of whole plates: balance to round-off, energies from above, convergence."""

from dataclasses import replace

import numpy as np
import oracles
import pytest
from duals import IN_A_TRIANGLE, tractions
from plates import grid, rectangle

from kplate.elements.triangle import area, edge_normals, edge_senses
from kplate.errors import InputError, SolveError
from kplate.loads import (
    Case,
    DiscPatch,
    EdgeMoment,
    LineForce,
    PointForce,
    PointMoment,
    Pressure,
    PressureField,
)
from kplate.materials import STEEL
from kplate.meshing import mesh_outline
from kplate.outline import Outline
from kplate.plate import Plate, Section
from kplate.quadrature import triangle_rule
from kplate.shapes import Circle, Rectangle
from kplate.solve import dual as solve_module
from kplate.solve.dual import solve_dual
from kplate.solve.static import solve_static
from kplate.supports import CLAMPED, SIMPLY_SUPPORTED

both_orders = pytest.mark.parametrize("order", [2, 3])
UNIT = oracles.LinearPressure(at_origin=1.0)
FORCE_AT, FORCE = (1.1, 0.4), -350.0
LINE, BEND, SEAM, RIM = -200.0, 90.0, 120.0, 40.0
PLATE = Plate(
    outline=Outline.polygon(
        [(0, 0), (2.4, 0), (2.4, 1.2), (1.5, 1.2), (1.5, 1.8), (0, 1.8)],
        sides=["south", "east", "notch-south", "notch-east", "north", "west"],
    )
    .cut(Circle(centre=(0.6, 0.9), radius=0.15, name="shaft"))
    .zone(Rectangle(centre=(1.9, 0.5), size=(0.6, 0.5), name="step"), name="thick")
    .seam([(0.3, 1.4), (1.1, 1.5)], name="wall")
    .mark(FORCE_AT, name="post"),
    thickness=0.01,
    material=STEEL,
    supports={"south": CLAMPED, "west": SIMPLY_SUPPORTED},
    zones={"thick": Section(thickness=0.014)},
)
CASES = {
    "uniform": [Pressure(-5e3)],
    "in a zone": [Pressure(-9e3, zone="thick")],
    "point": [PointForce(force=FORCE, at=FORCE_AT)],
    "side": [LineForce(force=LINE, along="notch-east")],
    "seam": [LineForce(force=SEAM, along="wall")],
    "moment": [EdgeMoment(moment=BEND, along="north")],
    "round": [EdgeMoment(moment=RIM, along="shaft")],
    "linear": [PressureField(lambda x, y: 2e3 * x - 3e3 * y + 1e3)],
}
NAMES = list(CASES)


@pytest.fixture(scope="module", params=[2, 3])
def state(request):
    """An unstructured mesh of a plate with everything, all loads as cases."""
    cases = [Case(name=name, loads=loads) for name, loads in CASES.items()]
    if request.param == 2:
        cases.pop()  # its moments of degree 2 carry no linear pressure
    mesh = mesh_outline(PLATE.outline, size=0.2)
    return solve_dual(PLATE, mesh, cases, order=request.param)


@pytest.fixture(scope="module")
def found(state):
    mesh = state.mesh
    return tractions(state.dual, mesh.points, mesh.triangles, state.moments)


@pytest.fixture(scope="module")
def scale(state):
    """Largest moment of each case."""
    return np.abs(state.moments).max(axis=(0, 1, 2))


def edges_on(found, edges):
    """Numbers in `found` of edges (k, 2)."""
    numbers = [np.flatnonzero((found.edges == np.sort(e)).all(axis=1)) for e in edges]
    return np.concatenate(numbers)


def side_edges(mesh, *names):
    numbers = [mesh.side_names.index(name) for name in names]
    return mesh.boundary_edges[np.isin(mesh.boundary_sides, numbers)]


def assert_small(values, scale, least):
    """Values (..., c) against a length times what is usual in each case."""
    np.testing.assert_array_less(np.abs(values) / scale, least)


def test_moments_carry_the_pressure_that_acts(state, scale):
    mesh = state.mesh
    every = np.arange(len(mesh.triangles))
    at = np.broadcast_to(IN_A_TRIANGLE, (len(every), *IN_A_TRIANGLE.shape))
    carried = state.carried_at(every, at)
    expected = np.zeros_like(carried)
    expected[..., NAMES.index("uniform")] = -5e3
    thick = mesh.zones == mesh.zone_names.index("thick")
    expected[thick, :, NAMES.index("in a zone")] = -9e3
    if state.order == 3:
        x, y = np.moveaxis(at @ mesh.points[mesh.triangles], -1, 0)
        expected[..., NAMES.index("linear")] = 2e3 * x - 3e3 * y + 1e3
    size2 = area(mesh.points[mesh.triangles]).min()
    assert_small((carried - expected) * size2, scale, 2e-12)


def test_normal_moments_pass_across_every_inner_edge(found, scale):
    assert_small(found.bends[found.inner], scale, 1e-13)


def test_effective_shears_pass_across_every_inner_edge(state, found, scale):
    """Less the force of a line along it."""
    jumps = found.pushes.copy()
    seam = edges_on(found, state.mesh.seam_edges)
    assert len(seam) > 2
    jumps[seam, :, NAMES.index("seam")] -= SEAM
    assert_small(jumps[found.inner], scale, 2e-10)


def test_twisting_moments_add_up_to_the_force_at_every_vertex(state, found, scale):
    """Those that no support holds, inside and on free sides and rims."""
    mesh = state.mesh
    held = np.unique(side_edges(mesh, "south", "west"))
    free = np.setdiff1d(np.arange(len(mesh.points)), held)
    (post,) = mesh.mark_vertices
    corners = found.corners.copy()
    corners[post, NAMES.index("point")] -= FORCE
    assert_small(corners[free], scale, 1e-12)


def test_free_edges_carry_what_acts_on_them_and_no_more(state, found, scale):
    mesh = state.mesh
    held = edges_on(found, side_edges(mesh, "south", "west"))
    free = np.setdiff1d(np.flatnonzero(~found.inner), held)
    bends, pushes = found.bends.copy(), found.pushes.copy()
    loaded = edges_on(found, side_edges(mesh, "notch-east"))
    pushes[loaded, :, NAMES.index("side")] -= LINE
    north = edges_on(found, side_edges(mesh, "north"))
    bends[north, :, NAMES.index("moment")] -= BEND * own_sense(mesh, found, north)
    shaft = edges_on(found, side_edges(mesh, "shaft"))
    stretch = mesh.boundary_stretch[
        mesh.boundary_sides == mesh.side_names.index("shaft")
    ]
    turning = RIM * stretch[:, None] * own_sense(mesh, found, shaft)
    bends[shaft, :, NAMES.index("round")] -= turning  # of the arc on its chord
    assert_small(bends[free], scale, 1e-13)
    assert_small(pushes[free], scale, 2e-10)
    west = edges_on(found, side_edges(mesh, "west"))
    assert_small(bends[west], scale, 1e-13)
    south = edges_on(found, side_edges(mesh, "south"))
    assert (np.abs(bends[south]).max(axis=(0, 1)) > 1e-3 * scale).all()


def own_sense(mesh, found, edges):
    """Sense, to the triangle there, of boundary edges, (k, 1)."""
    triangles = mesh.triangles_at(found.edges[edges])
    senses = edge_senses(mesh.points[mesh.triangles[triangles]])
    own = np.sort(mesh.triangles[triangles][:, [[1, 2], [2, 0], [0, 1]]], axis=2)
    return senses[(own == found.edges[edges][:, None]).all(axis=2)][:, None]


def motions(state):
    """Unknowns of w = 1, x and y, (count, 3)."""
    mesh, numbering, k = state.mesh, state.constraints.numbering, state.order
    X = mesh.points[mesh.triangles]
    result = np.zeros((numbering.count, 3))
    result[numbering.table[:, :3]] = np.stack(
        [np.ones(X.shape[:2]), *np.moveaxis(X, 2, 0)], axis=2
    )
    senses, normals = edge_senses(X), edge_normals(X)
    for e, (i, j) in enumerate(((1, 2), (2, 0), (0, 1))):
        own = numbering.table[:, 3 + e * (2 * k + 1) :][:, : 2 * k + 1]
        ends = np.where(senses[:, e, None, None] > 0, X[:, [i, j]], X[:, [j, i]])
        for a in range(k):
            share = (a + 1) / (k + 1)
            at = (1.0 - share) * ends[:, 0] + share * ends[:, 1]
            result[own[:, a]] = np.column_stack([np.ones(len(X)), at])
        result[own[:, k], 1:] = normals[:, e]
    return result


def test_supports_balance_every_load_in_force_and_moments(state):
    rigid = motions(state)
    own = np.take(rigid, state.constraints.numbering.table, axis=0)
    mesh = state.mesh
    inside = np.zeros((len(own), state.dual.whole - state.dual.left, 3))
    # Inner control points of degree k + 1, in the order of their ordinates.
    k = state.order + 1
    points = [(a, b, k - a - b) for a in range(k, -1, -1) for b in range(k - a, -1, -1)]
    inner = np.array([p for p in points if min(p) > 0]) / k
    inside[:, :, 0] = 1.0
    inside[:, :, 1:] = inner @ mesh.points[mesh.triangles]
    whole = np.concatenate([own, inside], axis=1)
    loads = np.einsum("ndm,ndc->mc", whole, state.forces)
    supports = rigid.T @ state.support_forces
    usual = np.abs(rigid).T @ np.abs(state.support_forces)
    np.testing.assert_array_less(np.abs(loads + supports), 1e-11 * usual)
    area_of = mesh.area
    assert loads[0, NAMES.index("uniform")] == pytest.approx(-5e3 * area_of, rel=1e-12)
    assert loads[0, NAMES.index("point")] == pytest.approx(FORCE, rel=1e-12)
    assert loads[0, NAMES.index("moment")] == pytest.approx(0.0, abs=1e-9)
    assert loads[2, NAMES.index("moment")] == pytest.approx(1.5 * BEND, rel=1e-12)


def test_work_of_the_loads_is_twice_the_energy(state):
    np.testing.assert_allclose(state.load_work, 2.0 * state.energy, rtol=1e-12)
    assert (state.energies > 0.0).all()


@pytest.mark.parametrize("element", ["hct", "quintic"])
def test_energies_enclose_the_true_one_by_the_gap_of_the_moments(state, element):
    """Half the energy of the difference of the moments is the whole difference.

    So it is for any conforming deflection and any balanced moments; here chords are
    straight edges to both.
    """
    mesh = replace(state.mesh, boundary_circles=None)
    state = solve_dual(PLATE, mesh, state.cases, order=state.order)
    primal = solve_static(PLATE, mesh, state.cases, element=element)
    pieces = primal.element.pieces
    rule = triangle_rule(8)
    points = np.einsum("qv,svc->sqc", rule.points, pieces).reshape(-1, 3)
    shares = np.abs(np.linalg.det(pieces))
    weights = (shares[:, None] * rule.weights).ravel()
    X = mesh.points[mesh.triangles]
    D = PLATE.rigidities[mesh.zones]
    u = primal.unknowns[primal.constraints.numbering.table]
    kappa = np.einsum("nqad,ndc->nqac", primal.element.curvature(X, points), u)
    gap = state.dual.moments(state.moments, points) - D[:, None] @ kappa
    gap = np.einsum(
        "n,q,nqac,nab,nqbc->c",
        area(X),
        weights,
        gap,
        np.linalg.inv(D),
        gap,
        optimize=True,
    )
    difference = state.energy - primal.strain_energy
    assert (difference > 0.0).all()
    np.testing.assert_allclose(difference, 0.5 * gap, rtol=1e-7)


SQUARES = {
    "simply supported": (SIMPLY_SUPPORTED, oracles.navier),
    "clamped": (CLAMPED, oracles.clamped_rectangle),
}


@both_orders
@pytest.mark.parametrize("name", SQUARES)
def test_energy_of_a_square_is_above_the_exact_and_comes_down_to_it(name, order):
    support, exact = SQUARES[name]
    rule, weights = np.polynomial.legendre.leggauss(40)
    x, y = np.meshgrid(0.5 * (rule + 1.0), 0.5 * (rule + 1.0))
    w = exact(np.column_stack([x.ravel(), y.ravel()]), (1, 1), UNIT).w
    energy = 0.5 * np.outer(weights, weights).ravel() @ w / 4.0
    error = []
    for n in (4, 8, 16):
        case = Case(name="p", loads=[Pressure(1.0)])
        state = solve_dual(rectangle(support, D=1e4), grid(n), [case], order=order)
        error.append(state.energy[0] * 1e4 / energy - 1.0)
    assert (np.array(error) > 0.0).all()
    assert error[-1] < {2: 1e-6, 3: 3e-8}[order]
    # The singularity of the corners, not the order, bounds the rate.
    assert np.log2(error[1] / error[2]) > 4.9


@both_orders
def test_moments_converge_with_order_k_plus_one(order):
    """In the energy of the error; manufactured: w = sin pi x sin pi y."""
    D, error = 1e4, []
    load = PressureField(
        lambda x, y: 4 * np.pi**4 * D * np.sin(np.pi * x) * np.sin(np.pi * y)
    )
    rule = triangle_rule(8)
    for n in (4, 8, 16):
        mesh, plate = grid(n), rectangle(SIMPLY_SUPPORTED, D=D)
        state = solve_dual(plate, mesh, [Case(name="p", loads=[load])], order=order)
        X = mesh.points[mesh.triangles]
        flat = (rule.points @ X).reshape(-1, 2)
        exact = oracles.sine(flat, (1, 1), pressure=4 * np.pi**4 * D, rigidity=D)
        every = np.arange(len(X))
        at = np.broadcast_to(rule.points, (len(X), *rule.points.shape))
        m = state.moments_at(every, at)[..., 0] - exact.moments.reshape(*at.shape)
        kappa = m @ np.linalg.inv(plate.rigidities[0])
        error.append(np.einsum("n,q,nqa,nqa", area(X), rule.weights, m, kappa) ** 0.5)
    rate = np.log2(error[-2] / error[-1])
    assert rate == pytest.approx(order + 1.0, abs=0.15)


@both_orders
def test_deflection_and_shear_of_a_square_meet_the_series(order):
    mesh = grid(16)
    places = np.array([(0.5, 0.5), (0.3, 0.21), (0.77, 0.6)])
    triangles, barycentrics = mesh.locate(places)
    case = Case(name="p", loads=[Pressure(1.0)])
    state = solve_dual(rectangle(SIMPLY_SUPPORTED, D=1e4), mesh, [case], order=order)
    exact = oracles.navier(places, (1, 1), UNIT, rigidity=1e4)
    at = barycentrics[:, None]
    w = state.deflections_at(triangles, at)[:, 0, 0]
    np.testing.assert_allclose(w, exact.w, rtol={2: 1e-5, 3: 1e-7}[order])
    q = state.shears_at(triangles, at)[:, 0, :, 0]
    tolerance = {2: 6e-3, 3: 2e-4}[order] * np.abs(exact.shears).max()
    np.testing.assert_allclose(q, exact.shears, rtol=0.0, atol=tolerance)


def cantilever(least):
    """A square clamped on one side, its mesh graded towards a free corner."""
    plate = rectangle({"west": CLAMPED}, D=1e4)
    mesh = mesh_outline(plate.outline, size=0.2, graded=[((1, 1), least)])
    return solve_dual(plate, mesh, [Case(name="p", loads=[Pressure(-1e3)])])


def defect(state):
    """Largest jump of m_nn inside, relative to the largest moment."""
    mesh = state.mesh
    found = tractions(state.dual, mesh.points, mesh.triangles, state.moments)
    return np.abs(found.bends[found.inner]).max() / np.abs(state.moments).max()


def test_corrections_take_away_the_round_off_of_small_triangles(monkeypatch):
    """At the free corner of a cantilever, where w is large and triangles are tiny."""
    assert defect(cantilever(1e-5)) < 1e-13
    monkeypatch.setattr(solve_module, "SMALL", np.inf)  # so that the first is the last
    assert defect(cantilever(1e-5)) > 1e-8


def test_triangles_too_small_for_balance_are_refused():
    message = (
        r"^round-off leaves the moments unbalanced: the triangle at \(1, 1\) m is "
    )
    with pytest.raises(SolveError, match=message):
        cantilever(1e-7)


def test_a_load_that_supports_take_at_once_leaves_no_moments():
    case = Case(name="l", loads=[LineForce(force=100.0, along="west")])
    state = solve_dual(rectangle(CLAMPED), grid(3), [case])
    assert np.abs(state.moments).max() < 1e-12
    deflections = motions(state)[:, 0]
    assert deflections @ state.support_forces[:, 0] == pytest.approx(-100.0, rel=1e-12)


def test_loads_over_parts_of_triangles_arrive_in_full(state):
    load = DiscPatch(force=-700.0, centre=(2.0, 0.6), radius=0.21)
    case = Case(name="patch", loads=[load])
    patch = solve_dual(PLATE, state.mesh, [case], order=state.order)
    by_motion = motions(patch).T @ patch.support_forces[:, 0]
    np.testing.assert_allclose(by_motion, [700.0, 1400.0, 420.0], rtol=1e-12)


def test_unknown_orders_are_refused():
    with pytest.raises(
        InputError, match=r"^order = 4; the dual has the orders 2 and 3\.$"
    ):
        solve_dual(
            rectangle(CLAMPED),
            grid(2),
            [Case(name="p", loads=[Pressure(1.0)])],
            order=4,
        )


def test_couples_at_points_are_refused():
    case = Case(name="c", loads=[PointMoment(moment=(1.0, 0.0), at=(0.5, 0.5))])
    message = r"a couple acts at \(0\.5, 0\.5\) m; .* no finite energy and no bound"
    with pytest.raises(InputError, match=message):
        solve_dual(rectangle(CLAMPED), grid(2), [case])


def test_moments_along_unknown_sides_are_refused():
    case = Case(name="c", loads=[EdgeMoment(moment=1.0, along="rim")])
    message = r"^a moment acts along 'rim'; the sides are south, east, north, west\.$"
    with pytest.raises(InputError, match=message):
        solve_dual(rectangle(CLAMPED), grid(2), [case])


def test_loose_plates_are_refused():
    case = Case(name="p", loads=[Pressure(1.0)])
    plate = rectangle({"west": SIMPLY_SUPPORTED})
    message = r"rigid body \(1 free motion: tilt about x = 0 m\); add a support\.$"
    with pytest.raises(SolveError, match=message):
        solve_dual(plate, grid(2), [case])
