"""Rectangles and clamped discs by their own formulas, to check a solution against.

Nothing here comes from a mesh or an element. Loads are forces F at places, those of a
quadrature of what is spread.

Rectangle a x b with all sides simply supported, Navier's series:

    w = sum of c_mn sin(m pi x/a) sin(n pi y/b),
    c_mn = 4 (sum of F sin sin) / (a b D pi^4 (m^2/a^2 + n^2/b^2)^2).

Rectangle with sides clamped, simply supported or free, Ritz's method: w is a sum of
products of Legendre polynomials of x and of y, each times (1 + x)^i (1 - x)^j with i, j
= 0 at a free end, 1 at a supported, 2 at a clamped one. Work comes from below.

Clamped disc of radius r, Ritz's method with the one shape s = (1 - rho^2)^2, exact for
an even pressure: the work of the loads is at least

    (sum of F s)^2 / A,   A = integral of D (lap s)^2 = 64 pi D / (3 r^2).

Source: S. Timoshenko and S. Woinowsky-Krieger, "Theory of Plates and Shells", 2nd ed.,
McGraw-Hill, 1959, art. 17, 28 and 80 (from memory).
"""

from dataclasses import dataclass

import numpy as np
from numpy.polynomial import Legendre

from kplate.arrays import Floats
from kplate.quadrature import gauss

TERMS = 64  # of Navier's series, each way
DEGREE = 16  # polynomials of Ritz's method, each way
# Beyond this condition number a rectangle counts as not held.
LOOSE = 1e14
_END = {"free": 0, "simply supported": 1, "clamped": 2}


@dataclass(frozen=True, eq=False, kw_only=True)
class Shaped:
    """Deflection of a rectangle as a sum of products.

    Parameters
    ----------
    size : tuple of float
        a and b in m.
    ends : tuple of str
        Supports at x = 0, x = a, y = 0, y = b.
    coefficients : ndarray, shape (m, n)
        Of the products, in m.
    """

    size: tuple[float, float]
    ends: tuple[str, str, str, str]
    coefficients: Floats

    def deflection(self, places: Floats) -> Floats:
        """Deflection w in m at places (k, 2), x from 0 to a and y from 0 to b, (k,)."""
        rows = _rows(self.size, self.ends, places, len(self.coefficients))
        w: Floats = np.einsum("mk,mn,nk->k", rows[0], self.coefficients, rows[1])
        return w


def rectangle(
    size: tuple[float, float],
    ends: tuple[str, str, str, str],
    places: Floats,
    forces: Floats,
    *,
    D: float,
    nu: float,
    terms: int | None = None,
) -> Shaped | None:
    """Bend a rectangle.

    Parameters
    ----------
    size : tuple of float
        a and b in m.
    ends : tuple of str
        "clamped", "simply supported" or "free" at x = 0, x = a, y = 0, y = b.
    places : ndarray, shape (k, 2)
        Where forces act, x from 0 to a and y from 0 to b; others count as well.
    forces : ndarray, shape (k,)
        In N, positive up.
    D, nu : float
        Bending stiffness in N m and Poisson's ratio.
    terms : int, optional
        How many each way; `TERMS` or `DEGREE` if left out.

    Returns
    -------
    Shaped or None
        ``None`` where the rectangle can move as a rigid body.
    """
    navier = set(ends) == {"simply supported"}
    count = terms or (TERMS if navier else DEGREE)
    across, along = _rows(size, ends, places, count)
    work = (across * forces) @ along.T
    a, b = size
    if navier:
        m = np.arange(1, count + 1)
        wave = (m[:, None] / a) ** 2 + (m / b) ** 2
        coefficients = 4.0 * work / (a * b * D * np.pi**4 * wave**2)
        return Shaped(size=size, ends=ends, coefficients=coefficients)
    x, y = _products(a, ends[:2], count), _products(b, ends[2:], count)
    mixed = np.einsum("ik,jl->ijkl", x[2, 0], y[0, 2])
    mixed = mixed + np.einsum("ik,jl->ijkl", x[0, 2], y[2, 0])
    K = D * (
        np.einsum("ik,jl->ijkl", x[2, 2], y[0, 0])
        + np.einsum("ik,jl->ijkl", x[0, 0], y[2, 2])
        + nu * mixed
        + 2.0 * (1.0 - nu) * np.einsum("ik,jl->ijkl", x[1, 1], y[1, 1])
    ).reshape(count**2, count**2)
    scale = 1.0 / np.sqrt(np.maximum(np.diag(K), np.finfo(float).tiny))
    values, vectors = np.linalg.eigh(scale[:, None] * K * scale)
    if values[0] * LOOSE < values[-1]:
        return None
    found = scale * (vectors @ ((vectors.T @ (scale * work.ravel())) / values))
    return Shaped(size=size, ends=ends, coefficients=found.reshape(count, count))


def clamped_disc_work(
    centres: Floats, radii: Floats, places: Floats, forces: Floats, *, D: float
) -> Floats:
    """What loads do at least as work on clamped discs (k, 2), (k,), in J, (k,)."""
    found = np.empty(len(radii))
    for k, (centre, radius) in enumerate(zip(centres, radii, strict=True)):
        rho = np.hypot(*(places - centre).T) / radius
        own = float(forces @ np.maximum(1.0 - rho**2, 0.0) ** 2)
        found[k] = 3.0 * radius**2 * own**2 / (64.0 * np.pi * D)
    return found


def disc_centre(
    pressure: float, radius: float, *, D: float, nu: float, clamped: bool
) -> float:
    """Deflection in m at the centre of a disc under an even pressure in Pa.

    p a^4 / 64 D where it is clamped, (5 + nu)/(1 + nu) times that where it is simply
    supported (Timoshenko and Woinowsky-Krieger, art. 16, from memory).
    """
    fixed = pressure * radius**4 / (64.0 * D)
    return fixed if clamped else fixed * (5.0 + nu) / (1.0 + nu)


def _rows(
    size: tuple[float, float],
    ends: tuple[str, str, str, str],
    places: Floats,
    count: int,
) -> tuple[Floats, Floats]:
    """Values of the functions of x and of y at places, each (count, k)."""
    if set(ends) == {"simply supported"}:
        wave = np.pi * np.arange(1, count + 1)[:, None]
        return (
            np.sin(wave * places[:, 0] / size[0]),
            np.sin(wave * places[:, 1] / size[1]),
        )
    x, y = 2.0 * places[:, 0] / size[0] - 1.0, 2.0 * places[:, 1] / size[1] - 1.0
    return (
        np.stack([f(x) for f in _functions(ends[:2], count)]),
        np.stack([f(y) for f in _functions(ends[2:], count)]),
    )


def _functions(ends: tuple[str, str], count: int) -> list[Legendre]:
    """Polynomials on [-1, 1] that keep to what the ends hold."""
    factor = Legendre([1.0, 0.0])
    for end, root in zip(
        ends, (Legendre([1.0, 1.0]), Legendre([1.0, -1.0])), strict=True
    ):
        factor = factor * root ** _END[end]
    return [factor * Legendre.basis(k) for k in range(count)]


def _products(
    length: float, ends: tuple[str, str], count: int
) -> dict[tuple[int, int], Floats]:
    """Integrals over a length of products of the functions' derivatives."""
    share, weights = gauss(count + 6)  # exact: degrees are 2 count + 6 at the most
    functions = _functions(ends, count)
    x = 2.0 * share - 1.0
    values = [
        np.stack([(f.deriv(k) if k else f)(x) for f in functions]) * (2.0 / length) ** k
        for k in range(3)
    ]
    pairs = ((0, 0), (1, 1), (2, 2), (0, 2), (2, 0))
    return {(i, j): (values[i] * weights * length) @ values[j].T for i, j in pairs}
