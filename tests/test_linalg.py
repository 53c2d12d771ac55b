"""Factor and solve, with CHOLMOD and with SuperLU, against dense elimination."""

import re
import sys

import numpy as np
import pytest
import scipy.sparse as sp
from plates import grid

from kplate import linalg
from kplate.elements import ELEMENTS
from kplate.elements.triangle import Geometry
from kplate.errors import SolveError
from kplate.linalg import Factor
from kplate.materials import STEEL

LOOSE = (
    "the stiffness is not positive definite: the plate, or a part of it, can still "
    "move, or a triangle is almost flat."
)
SEEDS = range(5)


@pytest.fixture(params=["CHOLMOD", "SuperLU"])
def solver(request, monkeypatch):
    """Either solver, the other made unusable."""
    if request.param == "SuperLU":
        without_cholmod(monkeypatch)
    else:
        without_superlu(monkeypatch)
    return request.param


def without_cholmod(monkeypatch):
    monkeypatch.setitem(sys.modules, "cvxopt", None)


def without_superlu(monkeypatch):
    monkeypatch.setattr("scipy.sparse.linalg.splu", None)


def lower(A):
    return sp.csc_array(np.tril(A))


def random_matrix(seed, n=60):
    """A sparse positive definite matrix, its numbers off the diagonal of any sign."""
    random = np.random.default_rng(seed)
    A = random.standard_normal((n, n)) * (random.random((n, n)) < 0.1)
    return A @ A.T + 0.1 * np.eye(n), random


def chain(n, stiffness):
    """Springs of one stiffness from point to point and from each to the ground."""
    A = (2.0 + stiffness) * np.eye(n) - np.eye(n, k=1) - np.eye(n, k=-1)
    A[0, 0] = A[-1, -1] = 1.0 + stiffness
    return A


def plate_stiffness(n):
    """Dense stiffness of a plate without supports."""
    mesh, element = grid(n), ELEMENTS["dkt"]
    geometry = Geometry(vertices=mesh.points[mesh.triangles], rule=element.rule)
    count = len(mesh.triangles)
    rigidity = np.broadcast_to(STEEL.rigidity(0.01), (count, 3, 3, 3))
    table = (3 * mesh.triangles[:, :, None] + np.arange(3)).reshape(count, 9)
    A = np.zeros((3 * len(mesh.points),) * 2)
    for own, K in zip(table, element.stiffness(geometry, rigidity), strict=True):
        A[np.ix_(own, own)] += K
    return A


@pytest.mark.parametrize("seed", SEEDS)
def test_solutions_agree_with_dense_elimination(solver, seed):
    A, random = random_matrix(seed)
    b = random.standard_normal(len(A))
    exact = np.linalg.solve(A, b)
    size = np.abs(exact).max()
    found = Factor(lower(A)).solve(b)
    np.testing.assert_allclose(found, exact, rtol=0.0, atol=1e-10 * size)


def test_a_supported_plate_agrees_with_dense_elimination(solver):
    A = plate_stiffness(6)[9:, 9:]
    b = np.random.default_rng(1).standard_normal(len(A))
    exact = np.linalg.solve(A, b)
    found = Factor(lower(A)).solve(b)
    np.testing.assert_allclose(found, exact, rtol=0.0, atol=1e-8 * np.abs(exact).max())


@pytest.mark.parametrize("k", [1, 3])
def test_several_right_sides_are_solved_one_by_one(solver, k):
    A, random = random_matrix(7)
    b = random.standard_normal((len(A), k))
    kept = b.copy()
    factor = Factor(lower(A))
    found = factor.solve(b)
    assert found.shape == b.shape
    singly = np.column_stack([factor.solve(column) for column in b.T])
    np.testing.assert_allclose(found, singly, rtol=1e-13, atol=1e-13)
    np.testing.assert_array_equal(b, kept)


@pytest.mark.parametrize("seed", SEEDS)
def test_badly_scaled_rows_lose_no_digits(solver, seed):
    """Rows and columns in units a factor 1e16 apart."""
    A, random = random_matrix(seed)
    S = 10.0 ** random.uniform(-8.0, 8.0, len(A))
    b = random.standard_normal(len(A))
    exact = np.linalg.solve(A, b)
    found = S * Factor(lower(A * np.outer(S, S))).solve(S * b)
    size = np.abs(exact).max()
    np.testing.assert_allclose(found, exact, rtol=0.0, atol=1e-10 * size)


def test_the_matrix_is_left_as_it_was(solver):
    matrix = lower(100.0 * random_matrix(3)[0])
    kept = matrix.copy()
    Factor(matrix)
    np.testing.assert_array_equal(matrix.toarray(), kept.toarray())


def test_nothing_to_solve_is_solved(solver):
    assert Factor(sp.csc_array((0, 0))).solve(np.zeros(0)).shape == (0,)


INDEFINITE = {
    "thin": chain(50, -0.1),
    "full": 1.5 * np.eye(40) - np.full((40, 40), 0.05),
    "two by two": np.array([[1.0, 2.0], [2.0, 1.0]]),
}
# Short chains: in a large plate free to move, round-off leaves pivots up to 1e-11,
# which a fine mesh may have as well. Rigid motions are counted before, in boundary.
SINGULAR = {
    "two by two": np.ones((2, 2)),
    "two by two, to round-off": np.array([[1.0, 1.0 - 2e-15], [1.0 - 2e-15, 1.0]]),
    "springs without a support": chain(30, 0.0),
    "two chains, one without a support": np.block(
        [[chain(9, 0.1), np.zeros((9, 9))], [np.zeros((9, 9)), chain(9, 0.0)]]
    ),
}


@pytest.mark.parametrize("name", INDEFINITE)
def test_an_indefinite_matrix_is_refused(solver, name):
    A = INDEFINITE[name]
    assert np.linalg.eigvalsh(A)[0] < 0.0 < np.diag(A).min()
    with pytest.raises(SolveError, match=f"^{re.escape(LOOSE)}$"):
        Factor(lower(A))


@pytest.mark.parametrize("name", SINGULAR)
def test_a_singular_matrix_is_refused(solver, name):
    with pytest.raises(SolveError, match=f"^{re.escape(LOOSE)}$"):
        Factor(lower(SINGULAR[name]))


@pytest.mark.parametrize("value", [0.0, -1.0, np.nan])
def test_a_diagonal_that_is_not_positive_is_refused(solver, value):
    A = np.diag([1.0, value, 2.0])
    text = "the stiffness has a vanishing diagonal; a part of the plate is loose."
    with pytest.raises(SolveError, match=f"^{re.escape(text)}$"):
        Factor(lower(A))


def test_a_large_matrix_is_factored_after_memory_is_given_back(monkeypatch):
    """The same answer, whether there is anything to give back or not."""
    lower = sp.csc_array(sp.diags_array(np.full(400, 2.0)).tocsc())
    right = np.linspace(0.0, 1.0, 400)
    small = linalg.Factor(lower).solve(right)
    monkeypatch.setattr(linalg, "LARGE", 100)
    np.testing.assert_array_equal(linalg.Factor(lower).solve(right), small)
