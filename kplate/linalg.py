"""Factor a symmetric positive definite matrix once, solve for many right sides.

CHOLMOD (through cvxopt) where it is installed; otherwise SuperLU told that the matrix
is symmetric and needs no pivoting. The matrix is scaled to a unit diagonal first, since
deflections and slopes have different units.
"""

from contextlib import suppress
from functools import cache
from typing import Any

import numpy as np
import scipy.sparse as sp

from kplate.arrays import Floats
from kplate.errors import SolveError

# Pivots of a matrix scaled to a unit diagonal are at most one; below this, round-off.
ROUND_OFF = 1e-14
LARGE = 200_000  # unknowns from which memory is given back before factoring


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
        # Large arrays go as soon as they are used: the factor needs the room.
        data = lower.data * self._scale[lower.indices]
        data *= np.repeat(self._scale, np.diff(lower.indptr))
        scaled = sp.csc_array((data, lower.indices, lower.indptr), lower.shape)
        if len(diagonal) > LARGE:
            _give_back()
        with _one_thread():
            self._back = _cholmod(scaled) or _superlu(scaled)

    def solve(self, right: Floats) -> Floats:
        """Solve for right sides (n,) or (n, k)."""
        scale = self._scale if right.ndim == 1 else self._scale[:, None]
        with _one_thread():
            return scale * self._back(scale * right)


def _cholmod(lower: sp.csc_array) -> Any:
    """Back substitution with CHOLMOD, or None where it is not installed."""
    try:
        from cvxopt import cholmod, matrix, spmatrix
    except ImportError:
        return None
    columns = np.arange(lower.shape[1], dtype=np.int64)
    A = spmatrix(
        matrix(lower.data),
        matrix(lower.indices.astype(np.int64, copy=False)),
        matrix(np.repeat(columns, np.diff(lower.indptr))),
        lower.shape,
    )
    factor = cholmod.symbolic(A, uplo="L")
    try:
        cholmod.numeric(A, factor)
    except ArithmeticError as error:
        raise _loose() from error
    _check_pivots(np.array(cholmod.diag(factor)) ** 2)

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
        raise _loose() from error
    _check_pivots(factor.U.diagonal())
    return factor.solve


def _give_back() -> None:
    """Return what meshing and assembly freed to the system, where it can be asked.

    At 300,000 unknowns 0.2 GB of it would lie beside a factor of 0.5 GB.
    """
    import ctypes

    with suppress(OSError, AttributeError, TypeError):
        ctypes.CDLL(None).malloc_trim(0)


def _check_pivots(pivots: Floats) -> None:
    if not (pivots > ROUND_OFF).all():
        raise _loose()


def _loose() -> SolveError:
    return SolveError(
        "the stiffness is not positive definite: the plate, or a part of it, can still "
        "move, or a triangle is almost flat."
    )


def _one_thread() -> Any:
    """BLAS threads on a busy machine cost more than they bring."""
    return _libraries().limit(limits=1)


@cache
def _libraries() -> Any:
    """The BLAS libraries that come with the solver; finding them takes time."""
    from threadpoolctl import ThreadpoolController

    with suppress(ImportError):
        import cvxopt  # noqa: F401  # brings a BLAS of its own
    return ThreadpoolController()
