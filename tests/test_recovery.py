"""Moments, shears and stresses against exact states and series."""

import numpy as np
import oracles
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp
from plates import grid, rectangle, solved

from kplate.adapt import solve
from kplate.errors import InputError
from kplate.loads import Case, Pressure
from kplate.recovery import (
    principal_moments,
    smoothed_moments,
    surface_stress,
    von_mises,
)
from kplate.solve.static import StaticState, solve_static
from kplate.supports import CLAMPED, SIMPLY_SUPPORTED

UNIT = oracles.LinearPressure(at_origin=1.0)
MOMENTS = hnp.arrays(float, (4, 3), elements=st.floats(-1e3, 1e3))


def state_of(w, slopes, mesh, plate):
    """A state with given deflections and slopes at the vertices."""
    base = solve_static(plate, mesh, [Case(name="any", loads=[Pressure(1.0)])])
    u = np.column_stack([w, slopes]).reshape(-1, 1)
    return StaticState(
        plate=plate,
        cases=base.cases,
        element=base.element,
        constraints=base.constraints,
        unknowns=u,
        forces=base.forces,
        support_forces=base.support_forces,
    )


@given(hnp.arrays(float, 3, elements=st.floats(-1.0, 1.0)))
def test_constant_curvature_is_recovered_to_round_off(c):
    """The signs too: w = x^2/2 (a smile, seen along y) compresses the top face."""
    mesh, plate = grid(5), rectangle(CLAMPED, D=1e4)
    x, y = mesh.points.T
    w = 0.5 * (c[0] * x**2 + c[1] * y**2) + c[2] * x * y
    slopes = np.column_stack([c[0] * x + c[2] * y, c[1] * y + c[2] * x])
    found = smoothed_moments(state_of(w, slopes, mesh, plate))
    nu, D = 0.3, 1e4
    expected = D * np.array([c[0] + nu * c[1], c[1] + nu * c[0], (1 - nu) * c[2]])
    np.testing.assert_allclose(
        found.moments[..., 0], np.tile(expected, (len(x), 1)), atol=1e-8 * D
    )
    np.testing.assert_allclose(found.shears, 0.0, atol=1e-6 * D)


@pytest.mark.parametrize(
    ("support", "exact"),
    [(SIMPLY_SUPPORTED, oracles.navier), (CLAMPED, oracles.clamped_rectangle)],
    ids=["simply supported", "clamped"],
)
def test_smoothed_moments_converge_with_first_order(support, exact):
    """Largest error over inner vertices; at 32 squares a side below 1 % of the peak."""
    error = []
    for n in (8, 16, 32):
        mesh = grid(n)
        solution = solved(rectangle(support), mesh, Pressure(1.0))
        found = solution.moments(mesh.points)
        inside = np.abs(mesh.points - 0.5).max(axis=1) < 0.4
        series = exact(mesh.points[inside], (1.0, 1.0), UNIT).moments
        error.append(np.abs(found[inside] - series).max())
    order = -np.diff(np.log(error)) / np.log(2.0)
    assert order[-1] > 1.0
    assert error[-1] < 0.01 * 0.0479


def test_edge_and_corner_moments_on_an_unstructured_mesh():
    """Clamped edge within 1 %, twist at a simply supported corner within 0.2 %."""
    clamped = solve(rectangle(CLAMPED), [Pressure(1.0)], triangles=10_000)
    edge = oracles.clamped_rectangle([(0.0, 0.5)], (1.0, 1.0), UNIT).moments[0, 0]
    assert clamped.moments([(0.0, 0.5)])[0, 0] == pytest.approx(edge, rel=0.01)
    hinged = solve(rectangle(SIMPLY_SUPPORTED), [Pressure(1.0)], triangles=10_000)
    twist = oracles.navier([(0.0, 0.0)], (1.0, 1.0), UNIT).moments[0, 2]
    assert hinged.moments([(0.0, 0.0)])[0, 2] == pytest.approx(twist, rel=0.002)


def test_shears_inside_and_on_the_edge():
    solution = solve(rectangle(SIMPLY_SUPPORTED), [Pressure(1.0)], triangles=10_000)
    points = [(0.1, 0.5), (0.25, 0.25), (0.3, 0.6)]
    exact = oracles.navier(points, (1.0, 1.0), UNIT).shears
    np.testing.assert_allclose(solution.shears(points), exact, atol=0.004)
    edge = oracles.navier([(0.0, 0.5)], (1.0, 1.0), UNIT).shears[0, 0]
    assert solution.shears([(0.0, 0.5)])[0, 0] == pytest.approx(edge, rel=0.12)
    stress = solution.shear_stress(points)
    np.testing.assert_allclose(
        stress, 1.5 * np.hypot(*solution.shears(points).T) / 0.01, rtol=1e-12
    )


@given(MOMENTS)
def test_principal_moments_are_eigenvalues(m):
    principal, angle = principal_moments(m)
    tensor = np.stack([m[:, [0, 2]], m[:, [2, 1]]], axis=1)
    np.testing.assert_allclose(
        principal[:, ::-1], np.linalg.eigvalsh(tensor), atol=1e-9
    )
    direction = np.column_stack([np.cos(angle), np.sin(angle)])
    along = np.einsum("ki,kij,kj->k", direction, tensor, direction)
    np.testing.assert_allclose(along, principal[:, 0], atol=1e-9)


@given(MOMENTS)
def test_von_mises_is_that_of_the_principal_stresses(m):
    first, second = principal_moments(m)[0].T
    expected = np.sqrt(first**2 - first * second + second**2)
    np.testing.assert_allclose(von_mises(m), expected, atol=1e-7)


def test_a_positive_moment_compresses_the_top_face():
    top = surface_stress(np.array([100.0, 0.0, 0.0]), 0.01, "top")
    np.testing.assert_allclose(top, [-6e6, 0.0, 0.0])
    np.testing.assert_allclose(
        surface_stress(np.array([100.0, 0.0, 0.0]), 0.01, "bottom"), -top
    )


def test_wrong_shapes_and_faces_are_refused():
    with pytest.raises(InputError) as caught:
        principal_moments([1.0, 2.0])
    assert str(caught.value) == (
        "moments has shape (2,); its last axis must hold m_xx, m_yy, m_xy."
    )
    with pytest.raises(InputError, match="no face 'left'; the faces are top and"):
        surface_stress(np.zeros(3), 0.01, "left")


def test_a_mesh_of_two_triangles_still_gives_its_constant_moment():
    mesh, plate = grid(1), rectangle(CLAMPED, D=1e4)
    x, y = mesh.points.T
    found = smoothed_moments(
        state_of(0.5 * x**2, np.column_stack([x, 0 * y]), mesh, plate)
    )
    np.testing.assert_allclose(found.moments[:, 0, 0], 1e4, rtol=1e-6)
