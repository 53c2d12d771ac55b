"""Factor a symmetric positive definite matrix once, solve for many right sides.

CHOLMOD (through cvxopt) where it is installed; otherwise SuperLU told that the matrix
is symmetric and needs no pivoting. The matrix is scaled to a unit diagonal first, since
deflections and slopes have different units, and each solution is refined once.
"""

from typing import Any

import numpy as np
import scipy.sparse as sp

from kplate.arrays import Floats
from kplate.errors import SolveError


class Factor:
    """A factored matrix.

    Parameters
    ----------
    lower : csc_array, shape (n, n)
        Lower triangle with its diagonal, rows sorted.

    Raises
    ------
    SolveError
        If the matrix is not positive definite.
    """

    def __init__(self, lower: sp.csc_array) -> None:
        diagonal = lower.diagonal()
        if not (diagonal > 0.0).all():
            raise SolveError(
                "the stiffness has a vanishing diagonal; a part of the plate is loose."
            )
        self._scale = 1.0 / np.sqrt(diagonal)
        columns = np.repeat(np.arange(lower.shape[1]), np.diff(lower.indptr))
        data = lower.data * self._scale[lower.indices] * self._scale[columns]
        self._lower = sp.csc_array((data, lower.indices, lower.indptr), lower.shape)
        with _one_thread():
            self._back = _cholmod(self._lower, columns) or _superlu(self._lower)

    def solve(self, right: Floats) -> Floats:
        """Solve for right sides (n,) or (n, k)."""
        scale = self._scale if right.ndim == 1 else self._scale[:, None]
        b = scale * right
        with _one_thread():
            x = self._back(b)
            x += self._back(b - self._product(x))
        return scale * x

    def _product(self, x: Floats) -> Floats:
        """Scaled matrix, whose diagonal is one, times x."""
        return self._lower @ x + self._lower.T @ x - x


def _cholmod(lower: sp.csc_array, columns: Any) -> Any:
    """Back substitution with CHOLMOD, or None where it is not installed."""
    try:
        from cvxopt import cholmod, matrix, spmatrix
    except ImportError:
        return None
    rows = matrix(lower.indices.astype(np.int64))
    A = spmatrix(matrix(lower.data), rows, matrix(columns.astype(np.int64)), lower.shape)
    factor = cholmod.symbolic(A, uplo="L")
    try:
        cholmod.numeric(A, factor)
    except ArithmeticError as error:
        raise SolveError(
            "the stiffness is not positive definite: the plate, or a part of it, can "
            "still move, or a triangle is almost flat."
        ) from error

    def back(right: Floats) -> Floats:
        x = matrix(np.asfortranarray(right))
        cholmod.solve(factor, x)
        return np.array(x).reshape(right.shape)

    return back


def _superlu(lower: sp.csc_array) -> Any:
    """Back substitution with SuperLU in symmetric mode."""
    from scipy.sparse.linalg import splu

    whole = (lower + sp.tril(lower, k=-1).T).tocsc()
    try:
        factor = splu(
            whole,
            permc_spec="MMD_AT_PLUS_A",
            diag_pivot_thresh=0.0,
            options={"SymmetricMode": True},
        )
    except RuntimeError as error:
        raise SolveError(
            "the stiffness is singular: the plate, or a part of it, can still move."
        ) from error
    return factor.solve


def _one_thread() -> Any:
    """BLAS threads on a busy machine cost more than they bring."""
    from threadpoolctl import threadpool_limits

    return threadpool_limits(limits=1)
