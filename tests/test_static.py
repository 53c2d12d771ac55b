"""The discrete plate: exact states, balance, reciprocity, scaling, convergence."""

from dataclasses import replace

import numpy as np
import oracles
import pytest
from hypothesis import given
from hypothesis import strategies as st
from plates import grid, rectangle, solved

from kplate.adapt import solve
from kplate.boundary import rigid_motions
from kplate.errors import InputError, SolveError
from kplate.loads import (
    Case,
    DiscPatch,
    Hydrostatic,
    PointForce,
    Pressure,
    PressureField,
    RectanglePatch,
    SelfWeight,
)
from kplate.materials import STEEL
from kplate.outline import Outline
from kplate.plate import Plate
from kplate.shapes import Circle
from kplate.solve.static import solve_static
from kplate.supports import CLAMPED, SIMPLY_SUPPORTED

D = 1e4
UNIT = oracles.LinearPressure(at_origin=1.0)


def nodal_resultant(state, forces):
    """Force and first moments of nodal forces, (3, c)."""
    return rigid_motions(state.constraints.numbering).T @ forces


def irregular(supports, **changes):
    """An L-shape with a shaft hole."""
    outline = Outline.polygon(
        [(0, 0), (2.4, 0), (2.4, 1.2), (1.5, 1.2), (1.5, 1.8), (0, 1.8)],
        sides=["south", "east", "notch-south", "notch-east", "north", "west"],
    ).cut(Circle(centre=(0.6, 0.9), radius=0.15, name="shaft"))
    plate = Plate(outline=outline, thickness=0.01, material=STEEL, supports=supports)
    return replace(plate, **changes)


LOADS = [
    Pressure(-5e3),
    Hydrostatic(level=1.1, specific_weight=9.81e3),
    Hydrostatic(level=-0.4, specific_weight=-7e3, up=(-0.6, 0.8)),
    PressureField(lambda x, y: 1e3 * x * y - 2e3),
    RectanglePatch(force=-900.0, centre=(1.2, 0.7), size=(0.3, 0.17), angle=0.4),
    DiscPatch(force=-700.0, centre=(2.0, 0.6), radius=0.21),
    PointForce(force=-350.0, at=(0.31, 1.4)),
    SelfWeight(),
]


@pytest.fixture(scope="module")
def all_loads():
    plate = irregular({"south": CLAMPED, "west": SIMPLY_SUPPORTED})
    cases = [Case(name=f"load {i}", loads=[load]) for i, load in enumerate(LOADS)]
    return solve(plate, cases, triangles=1500).state


def test_supports_balance_every_kind_of_load(all_loads):
    loads = nodal_resultant(all_loads, all_loads.forces)
    supports = nodal_resultant(all_loads, all_loads.support_forces)
    scale = np.abs(loads).max(axis=0)
    assert (np.abs(loads + supports) < 1e-11 * scale).all()


def test_work_of_the_loads_is_twice_the_energy(all_loads):
    np.testing.assert_allclose(
        all_loads.load_work, 2.0 * all_loads.strain_energy, rtol=1e-8
    )


def test_stated_forces_arrive_in_full(all_loads):
    force = nodal_resultant(all_loads, all_loads.forces)[0]
    area = all_loads.plate.outline.area
    weight = -STEEL.density * 0.01 * 9.80665 * area
    expected = {0: -5e3 * area, 4: -900.0, 5: -700.0, 6: -350.0, 7: weight}
    for index, value in expected.items():
        assert force[index] == pytest.approx(value, rel=1e-12)


def test_two_loads_are_reciprocal(all_loads):
    work = all_loads.forces.T @ all_loads.unknowns
    np.testing.assert_allclose(work, work.T, rtol=1e-8, atol=1e-10 * np.abs(work).max())


def test_water_up_to_a_level_weighs_what_it_does():
    """Hydrostatic pressure below a level that cuts triangles: closed form."""
    level, weight = 0.537, -9.81e3
    mesh = grid(7)
    plate = rectangle(CLAMPED)
    load = Hydrostatic(level=level, specific_weight=weight)
    state = solve_static(plate, mesh, [Case(name="water", loads=[load])])
    force, by_x, by_y = nodal_resultant(state, state.forces)[:, 0]
    total = weight * level**2 / 2
    assert force == pytest.approx(total, rel=1e-12)
    assert by_x == pytest.approx(total * 0.5, rel=1e-12)
    assert by_y == pytest.approx(weight * level**3 / 6, rel=1e-12)


@given(st.integers(0, 10_000))
def test_patches_keep_total_and_centroid_however_they_cut(seed):
    rng = np.random.default_rng(seed)
    mesh, plate = grid(6), rectangle(CLAMPED)
    centre = tuple(0.3 + 0.4 * rng.random(2))
    size = tuple(0.02 + 0.3 * rng.random(2))
    loads = [
        RectanglePatch(force=3.0, centre=centre, size=size, angle=7.0 * rng.random()),
        DiscPatch(force=-2.0, centre=centre, radius=0.02 + 0.25 * rng.random()),
    ]
    state = solve_static(
        plate, mesh, [Case(name=str(k), loads=[load]) for k, load in enumerate(loads)]
    )
    found = nodal_resultant(state, state.forces)
    for k, load in enumerate(loads):
        expected = load.force * np.array([1.0, *centre])
        np.testing.assert_allclose(found[:, k], expected, rtol=1e-12)


@pytest.mark.parametrize(
    ("support", "exact"),
    [
        (SIMPLY_SUPPORTED, lambda p: oracles.navier(p, (1, 1), UNIT).w[0]),
        (CLAMPED, lambda p: oracles.clamped_rectangle(p, (1, 1), UNIT).w[0]),
    ],
    ids=["simply supported", "clamped"],
)
def test_deflection_converges_with_second_order(support, exact):
    error, centre = [], [(0.5, 0.5)]
    for n in (8, 16, 32):
        solution = solved(rectangle(support, D=D), grid(n), Pressure(1.0))
        w = solution.deflection(centre)[0] * D
        error.append(abs(w - exact(centre)))
    order = -np.diff(np.log(error)) / np.log(2.0)
    assert order[-1] == pytest.approx(2.0, abs=0.15)


def test_energy_error_of_a_smooth_state_converges_with_first_order():
    """Manufactured: w = sin pi x sin pi y under p = 4 pi^4 D w; energy of the error.

    The error's energy is that of the exact curvature less the elements', sampled.
    """
    error = []
    for n in (8, 16, 32):
        mesh = grid(n)
        plate = rectangle(SIMPLY_SUPPORTED, D=D)
        load = PressureField(
            lambda x, y: 4 * np.pi**4 * D * np.sin(np.pi * x) * np.sin(np.pi * y)
        )
        state = solve_static(plate, mesh, [Case(name="p", loads=[load])])
        rule = state.element.rule
        corners = mesh.points[mesh.triangles]
        x, y = np.moveaxis(np.einsum("qv,nvc->nqc", rule.points, corners), -1, 0)
        s = np.sin(np.pi * x) * np.sin(np.pi * y)
        c = np.cos(np.pi * x) * np.cos(np.pi * y)
        exact = np.pi**2 * np.stack([-s, -s, 2 * c], axis=-1)
        B = state.element.curvature(corners, rule.points)
        u = state.unknowns[state.constraints.numbering.table, 0]
        gap = exact - np.einsum("nqrd,nd->nqr", B, u)
        density = np.einsum("nqr,rs,nqs->nq", gap, plate.rigidity, gap)
        energy = np.sum(density * rule.weights * mesh.areas[:, None])
        error.append(np.sqrt(energy))
    order = -np.diff(np.log(error)) / np.log(2.0)
    assert order[-1] == pytest.approx(1.0, abs=0.1)


def test_results_scale_as_the_theory_does():
    """Deflection with p / h^3, moments with p; half the size gives w / 16."""
    mesh = grid(6)
    plate = Plate(
        outline=rectangle(CLAMPED).outline,
        thickness=0.01,
        material=STEEL,
        supports=dict.fromkeys(("south", "east"), CLAMPED) | {"west": SIMPLY_SUPPORTED},
    )
    w = solved(plate, mesh, Pressure(1e3)).deflection([(0.4, 0.7)])[0]
    thick = solved(replace(plate, thickness=0.02), mesh, Pressure(3e3))
    assert thick.deflection([(0.4, 0.7)])[0] == pytest.approx(w * 3 / 8, rel=1e-9)
    half_plate = replace(plate, outline=rectangle(CLAMPED, a=0.5, b=0.5).outline)
    half = solved(half_plate, grid(6, a=0.5, b=0.5), Pressure(1e3))
    assert half.deflection([(0.2, 0.35)])[0] == pytest.approx(w / 16, rel=1e-9)


@pytest.mark.filterwarnings("ignore:material 'unit'")
@pytest.mark.parametrize("length", [1e-3, 25.4, 1e3])
def test_results_do_not_depend_on_the_unit_of_length(length):
    """The same plate stated in kilometres, twenty-fifths of an inch, millimetres."""
    supports = {"south": CLAMPED, "west": SIMPLY_SUPPORTED, "north": CLAMPED}
    plate = rectangle(supports, D=D)
    w = solved(plate, grid(5), Pressure(1e3)).deflection([(0.3, 0.6)])[0]
    # N m keep their size as N (length)^2 m^2/m: D is a force times a length.
    other = rectangle(
        supports, a=length, b=length, thickness=0.01 * length, D=D * length
    )
    scaled = solved(other, grid(5, a=length, b=length), Pressure(1e3 / length**2))
    point = [(0.3 * length, 0.6 * length)]
    assert scaled.deflection(point)[0] == pytest.approx(w * length, rel=1e-8)


def test_an_added_support_stiffens(all_loads):
    plate = irregular(
        {"south": CLAMPED, "west": SIMPLY_SUPPORTED, "shaft": SIMPLY_SUPPORTED}
    )
    cases = all_loads.cases
    stiffer = solve_static(plate, all_loads.mesh, cases)
    assert (stiffer.load_work < all_loads.load_work).all()


def test_turning_the_plate_turns_the_result():
    angle = 0.7
    c, s = np.cos(angle), np.sin(angle)
    turn = np.array([[c, -s], [s, c]])
    mesh = grid(6)
    plate = rectangle({"south": CLAMPED, "east": SIMPLY_SUPPORTED})
    turned_plate = replace(
        plate,
        outline=Outline.polygon(
            plate.outline.rim.points @ turn.T, sides=plate.outline.rim.sides
        ),
    )
    turned_mesh = replace(mesh, points=mesh.points @ turn.T)
    w = solved(plate, mesh, Pressure(1.0)).deflection(mesh.points)
    turned = solved(turned_plate, turned_mesh, Pressure(1.0))
    np.testing.assert_allclose(
        turned.deflection(turned_mesh.points), w, rtol=1e-9, atol=1e-18
    )


def test_a_loose_plate_is_refused_with_its_motion_named():
    plate = rectangle({"west": SIMPLY_SUPPORTED})
    with pytest.raises(SolveError) as caught:
        solved(plate, grid(3), Pressure(1.0))
    assert str(caught.value) == (
        "the plate can still move as a rigid body (1 free motion: tilt about "
        "x = 0 m); add a support."
    )


def test_a_patch_over_an_edge_is_refused():
    plate = rectangle(CLAMPED)
    load = RectanglePatch(force=1.0, centre=(0.95, 0.5), size=(0.2, 0.2))
    with pytest.raises(InputError) as caught:
        solved(plate, grid(4), load)
    assert str(caught.value) == (
        "only 75 % of the patch at (0.95, 0.5) m lies on the plate; move or shrink "
        "it until it does not reach over an edge or a hole."
    )


@pytest.mark.parametrize(
    ("load", "message"),
    [
        (
            PointForce(force=1.0, at=(2.0, 0.5)),
            "a point force of 1 N: point (2, 0.5) m is not on the plate; it lies "
            "outside the outline or in a hole.",
        ),
        (
            SelfWeight(),
            "material 'unit' states no density; a self-weight needs one.",
        ),
        (
            PressureField(lambda x, y: np.where(x > 0.9, np.inf, 0.0)),
            "a pressure function returned inf at (",
        ),
        (
            PressureField(lambda x, y: x[:1]),
            "a pressure function returned shape (1, 87) for points of shape (96, 87); "
            "it must return one pressure a point.",
        ),
    ],
)
def test_loads_that_do_not_fit_the_plate_are_refused(load, message):
    with pytest.raises(InputError) as caught:
        solved(rectangle(CLAMPED), grid(4), load)
    assert str(caught.value).startswith(message)


def test_case_names_and_elements_are_checked():
    plate, mesh = rectangle(CLAMPED), grid(3)
    case = Case(name="wind", loads=[Pressure(1.0)])
    with pytest.raises(InputError, match="2 load cases are called 'wind'"):
        solve_static(plate, mesh, [case, case])
    with pytest.raises(InputError, match="there is no load case; give at least one"):
        solve_static(plate, mesh, [])
    with pytest.raises(
        InputError, match="there is no element 'cube'; the elements are"
    ):
        solve_static(plate, mesh, [case], element="cube")
