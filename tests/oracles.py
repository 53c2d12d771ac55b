"""Exact solutions of the Kirchhoff plate, the ground the tests stand on.

Signs and units are kplate's: SI; z up; deflection, pressure and force positive
upwards; ``m_xx = D (w,xx + nu w,yy)``, positive when it compresses the top face;
``m_xy = D (1 - nu) w,xy``; ``D lap lap w = p``. Shears act upwards on a face with
outward normal +x or +y: ``q_x = -(m_xx,x + m_xy,y)``, and the effective shear is
``v_x = q_x - m_xy,y``. A support pushes up with ``v_n = v_x`` on a side with
outward normal +x and with ``v_n = -v_x`` on one with outward normal -x.

Rectangles with two opposite sides simply supported come from the single series in
oracles_series.py; where all four are, it may run along x or along y, and each point
takes the shorter. Discs and rings are in oracles_round.py.

Arrays: derivatives (4, 4, n), entry ``[i, j]`` is ``d^(i+j) w / dx^i dy^j`` for
``i + j <= 3``, zero elsewhere.

Source, unless a function names its own: S. Timoshenko and S. Woinowsky-Krieger,
"Theory of Plates and Shells", 2nd ed., McGraw-Hill, 1959, chapters 3, 5, 6 and 9
(from memory). test_oracles.py checks every function on its own.
"""

from dataclasses import dataclass

import numpy as np
from numpy.polynomial import legendre
from numpy.polynomial import polynomial as power
from numpy.typing import ArrayLike
from oracles_round import RadialState, annulus, clamped_disc_force, disc
from oracles_series import (
    ORDERS,
    SIMPLY_SUPPORTED,
    Floats,
    LinearPressure,
    Load,
    PatchForce,
    PointForce,
    series,
    sine_derivative,
    swapped,
    term_counts,
)

__all__ = [
    "LinearPressure",
    "Load",
    "PatchForce",
    "PointForce",
    "RadialState",
    "State",
    "annulus",
    "clamped_bubble",
    "clamped_disc_force",
    "clamped_rectangle",
    "disc",
    "levy",
    "navier",
    "navier_corner_forces",
    "polynomial",
    "polynomial_pressure",
    "sine",
    "tilted_disc",
    "triangle",
]

FILTER_ORDER = 9  # of the Ritz polynomials: 8 to 11 agree to 1e-9 with 64 terms


@dataclass(frozen=True, eq=False, kw_only=True)
class State:
    """Deflection of a plate at n points, and what follows from it.

    Parameters
    ----------
    derivatives : ndarray, shape (4, 4, n)
        Derivatives of the deflection, entry ``[i, j]`` in m^(1 - i - j).
    nu, rigidity : float
        Poisson's ratio; bending rigidity D in N m.
    """

    derivatives: Floats
    nu: float
    rigidity: float

    @property
    def w(self) -> Floats:
        """Deflection in m, (n,), positive upwards."""
        return np.asarray(self.derivatives[0, 0])

    @property
    def slopes(self) -> Floats:
        """Slopes dw/dx, dw/dy, (n, 2)."""
        return np.stack([self.derivatives[1, 0], self.derivatives[0, 1]], axis=-1)

    @property
    def moments(self) -> Floats:
        """Moments m_xx, m_yy, m_xy in N, (n, 3), positive compress the top face."""
        w, nu = self.derivatives, self.nu
        m_xx, m_yy = w[2, 0] + nu * w[0, 2], w[0, 2] + nu * w[2, 0]
        return self.rigidity * np.stack([m_xx, m_yy, (1 - nu) * w[1, 1]], axis=-1)

    @property
    def shears(self) -> Floats:
        """Transverse shears q_x, q_y in N/m, (n, 2), upwards on faces +x, +y."""
        return self._shears(1.0)

    @property
    def effective_shears(self) -> Floats:
        """Effective shears v_x, v_y in N/m, (n, 2), upwards on faces +x, +y."""
        return self._shears(2.0 - self.nu)

    def _shears(self, cross: float) -> Floats:
        w = self.derivatives
        q = [w[3, 0] + cross * w[1, 2], w[0, 3] + cross * w[2, 1]]
        return -self.rigidity * np.stack(q, axis=-1)


def navier(
    points: ArrayLike,
    size: tuple[float, float],
    load: Load,
    *,
    nu: float = 0.3,
    rigidity: float = 1.0,
) -> State:
    """Rectangle, all sides simply supported (Navier's problem).

    Parameters
    ----------
    points : array_like, shape (n, 2)
        Points in m, 0 <= x <= a, 0 <= y <= b.
    size : (float, float)
        Sides a, b in m; one corner is the origin.
    load : LinearPressure, PatchForce or PointForce
        What acts.
    nu, rigidity : float
        Poisson's ratio; bending rigidity D in N m.

    Returns
    -------
    State
        Good to 1e-9 of the largest value, in the corners and under a force too; shears
        nearer than 3e-4 of the span to a corner of the plate or of a patch to 1e-4.
        That near a point force moments and shears are nan: they grow without bound.
    """
    xy = np.atleast_2d(np.asarray(points, dtype=float))
    turned = xy[:, ::-1], size[::-1], swapped(load)
    across = term_counts(*turned) < term_counts(xy, size, load)
    ends = (SIMPLY_SUPPORTED, SIMPLY_SUPPORTED)
    W = np.zeros((4, 4, len(xy)))
    W[..., ~across] = series(xy[~across], size, load, ends, nu)
    W[..., across] = series(turned[0][across], *turned[1:], ends, nu).swapaxes(0, 1)
    return State(derivatives=W / rigidity, nu=nu, rigidity=rigidity)


def navier_corner_forces(
    size: tuple[float, float], load: Load, *, nu: float = 0.3
) -> Floats:
    """Corner forces of the supports of a simply supported rectangle.

    Parameters
    ----------
    size, load, nu
        As in `navier`.

    Returns
    -------
    ndarray, shape (4,)
        In N, positive up, at (0, 0), (a, 0), (a, b), (0, b): the jump of m_ns, side
        that arrives minus side that leaves, the boundary run with the plate on the
        left.
    """
    a, b = size
    corners = navier([(0.0, 0.0), (a, 0.0), (a, b), (0.0, b)], size, load, nu=nu)
    return np.array([2.0, -2.0, 2.0, -2.0]) * corners.moments[:, 2]


def levy(
    points: ArrayLike,
    size: tuple[float, float],
    load: Load,
    *,
    ends: tuple[str, str],
    nu: float = 0.3,
    rigidity: float = 1.0,
) -> State:
    """Rectangle, x = 0 and x = a simply supported, the ends as stated (Levy).

    Parameters
    ----------
    points, size, load, nu, rigidity
        As in `navier`.
    ends : (str, str)
        Supports of y = 0 and y = b: "clamped", "simply supported" or "free".

    Returns
    -------
    State
        Good to 1e-9 of the largest value, shears on the ends to 1e-8; near corners,
        patches and forces as for `navier`.
    """
    xy = np.atleast_2d(np.asarray(points, dtype=float))
    W = series(xy, size, load, ends, nu)
    return State(derivatives=W / rigidity, nu=nu, rigidity=rigidity)


def clamped_rectangle(
    points: ArrayLike,
    size: tuple[float, float],
    load: LinearPressure,
    *,
    nu: float = 0.3,
    rigidity: float = 1.0,
    terms: int = 64,
) -> State:
    """Rectangle, all sides clamped, under a linear pressure (Ritz).

    Parameters
    ----------
    points, size, nu, rigidity
        As in `navier`.
    load : LinearPressure
        What acts.
    terms : int
        Polynomials along each side; the highest degree is ``terms + 3``.

    Returns
    -------
    State
        At points a fifth of a side from the corners deflections are good to 1e-10,
        moments to 1e-8, effective shears on the sides to 1e-7 relative, for side
        ratios up to 2.

    Notes
    -----
    In a clamped corner w grows as r^3.74 and leaves a slow tail in the factors. A
    spectral filter, ``exp(-36 (k / terms)^9)`` on polynomial k, takes it out: without
    it moments in the middle of a side are good to 1e-6 only.

    References
    ----------
    .. [1] J. Shen, SIAM J. Sci. Comput. 15 (1994) 1489-1505 (from memory): the
       polynomials, each with value and slope zero at both ends.
    .. [2] D. Gottlieb and J. S. Hesthaven, J. Comput. Appl. Math. 128 (2001) 83-131
       (from memory): spectral filters.
    """
    (a, b), p, q = size, 2.0 / size[0], 2.0 / size[1]
    xy = np.atleast_2d(np.asarray(points, dtype=float))
    node, weight = legendre.leggauss(terms + 4)
    phi = _clamped_polynomials(terms, node)  # derivative, polynomial, node
    grams = [np.einsum("kg,lg,g->kl", f, f, weight) for f in phi[:3]]
    flat, tilt = phi[0] @ weight, phi[0] @ (weight * node)
    g_x, g_y = load.gradient[0] * a / 2, load.gradient[1] * b / 2
    f = (load.at_origin + g_x + g_y) * np.outer(flat, flat)
    f += g_x * np.outer(tilt, flat) + g_y * np.outer(flat, tilt)
    c = np.zeros((terms, terms))
    for i, j in np.ndindex(2, 2):  # even and odd polynomials do not mix
        k, l = slice(i, None, 2), slice(j, None, 2)
        (M_x, B_x, A_x), (M_y, B_y, A_y) = ([g[s, s] for g in grams] for s in (k, l))
        K = p**4 * np.kron(A_x, M_y) + q**4 * np.kron(M_x, A_y)
        K += 2 * p**2 * q**2 * np.kron(B_x, B_y)
        c[k, l] = np.linalg.solve(K, f[k, l].ravel()).reshape(c[k, l].shape)
    keep = np.exp(-36.0 * (np.arange(terms) / terms) ** FILTER_ORDER)
    X, Y = (_clamped_polynomials(terms, t) for t in (xy * [p, q] - 1.0).T)
    W = np.zeros((4, 4, len(xy)))
    for i, j in ORDERS:
        W[i, j] = p**i * q**j * np.sum(X[i] * (c * np.outer(keep, keep) @ Y[j]), axis=0)
    return State(derivatives=W / rigidity, nu=nu, rigidity=rigidity)


def polynomial(
    points: ArrayLike,
    coefficients: ArrayLike,
    *,
    nu: float = 0.3,
    rigidity: float = 1.0,
) -> State:
    """State of a plate whose deflection is a polynomial over D.

    Parameters
    ----------
    points : array_like, shape (n, 2)
        Points in m.
    coefficients : array_like, shape (k, l)
        Factors of ``x^i y^j`` in D w, in N m^(2 - i - j).
    nu, rigidity : float
        Poisson's ratio; bending rigidity D in N m.

    Returns
    -------
    State
        Exact; `polynomial_pressure` gives the load.
    """
    x, y = np.atleast_2d(np.asarray(points, dtype=float)).T
    W = np.zeros((4, 4, len(x)))
    for i, j in ORDERS:
        W[i, j] = power.polyval2d(x, y, _derivative(coefficients, i, j))
    return State(derivatives=W / rigidity, nu=nu, rigidity=rigidity)


def polynomial_pressure(points: ArrayLike, coefficients: ArrayLike) -> Floats:
    """Pressure in Pa, (n,), positive upwards, that bends a plate into `polynomial`."""
    x, y = np.atleast_2d(np.asarray(points, dtype=float)).T
    fourth = ((4, 0, 1.0), (2, 2, 2.0), (0, 4, 1.0))
    parts = [
        factor * power.polyval2d(x, y, _derivative(coefficients, i, j))
        for i, j, factor in fourth
    ]
    return np.asarray(np.sum(parts, axis=0))


def clamped_bubble(size: tuple[float, float]) -> Floats:
    """Coefficients (5, 5) of ``(x (a - x) y (b - y))^2``, sides a, b in m.

    A rectangle with all sides clamped, for convergence tests with `polynomial`.
    """
    x, y = (power.polypow([0.0, side, -1.0], 2) for side in size)
    return np.outer(x, y)


def triangle(height: float, pressure: float = 1.0) -> Floats:
    """Coefficients (6, 5) for the simply supported equilateral triangle.

    The pressure is even, in Pa, positive upwards. The height is in m; the centroid is
    the origin, one vertex is (2 height / 3, 0), the side opposite x = -height / 3.
    Source: S. Woinowsky-Krieger, Ingenieur-Archiv 4 (1933) (from memory).
    """
    h = height
    sides, circle = np.zeros((4, 3)), np.zeros((3, 3))
    sides[[3, 1, 2, 0, 0], [0, 2, 0, 2, 0]] = 1.0, -3.0, -h, -h, 4 * h**3 / 27
    circle[[0, 2, 0], [0, 0, 2]] = 4 * h**2 / 9, -1.0, -1.0
    return pressure / (64 * h) * _product(sides, circle)


def tilted_disc(
    radius: float, support: str, gradient: float = 1.0, *, nu: float = 0.3
) -> Floats:
    """Coefficients (6, 5) for a disc about the origin under ``gradient * x``.

    The radius is in m, the gradient in Pa/m, upwards; the rim is "clamped" or "simply
    supported". The factors of x and x r^2 meet the two rim conditions, derived here.
    """
    inner, middle = 1.0, -2.0
    if support == SIMPLY_SUPPORTED:
        inner, middle = (7 + nu) / (3 + nu), -(10 + 2 * nu) / (3 + nu)
    r2 = np.zeros((3, 3))
    r2[[2, 0], [0, 2]] = 1.0
    bowl = _product(r2, r2)
    bowl[:3, :3] += middle * radius**2 * r2
    bowl[0, 0] += inner * radius**4
    return gradient / 192 * _product(np.array([[0.0], [1.0]]), bowl)


def sine(
    points: ArrayLike,
    size: tuple[float, float],
    *,
    waves: tuple[int, int] = (1, 1),
    pressure: float = 1.0,
    nu: float = 0.3,
    rigidity: float = 1.0,
) -> State:
    """Simply supported rectangle under one term of Navier's load, closed form.

    Parameters
    ----------
    points, size, nu, rigidity
        As in `navier`.
    waves : (int, int)
        Half waves i along x and j along y.
    pressure : float
        Factor in Pa, positive upwards, of ``sin(i pi x / a) sin(j pi y / b)``.
    """
    x, y = np.atleast_2d(np.asarray(points, dtype=float)).T
    k, l = (np.pi * n / side for n, side in zip(waves, size, strict=True))
    W = np.zeros((4, 4, len(x)))
    for i, j in ORDERS:
        W[i, j] = k**i * sine_derivative(i, k * x) * l**j * sine_derivative(j, l * y)
    W *= pressure / (rigidity * (k**2 + l**2) ** 2)
    return State(derivatives=W, nu=nu, rigidity=rigidity)


def _clamped_polynomials(terms: int, t: Floats) -> Floats:
    """Polynomials clamped at -1 and 1, derivatives 0 to 3, (4, terms, n)."""
    k = np.arange(terms)
    L = np.zeros((terms + 4, terms))  # Legendre coefficients, one column each
    L[k, k] = 1.0
    L[k + 2, k] = -2 * (2 * k + 5) / (2 * k + 7)
    L[k + 4, k] = (2 * k + 3) / (2 * k + 7)
    L /= (2 * k + 3) * np.sqrt(2 * (2 * k + 5))  # the integral of phi''^2 becomes 1
    return np.stack([legendre.legval(t, legendre.legder(L, j)) for j in range(4)])


def _derivative(coefficients: ArrayLike, i: int, j: int) -> Floats:
    c = np.asarray(coefficients, dtype=float)
    return np.asarray(power.polyder(power.polyder(c, i, axis=0), j, axis=1))


def _product(f: Floats, g: Floats) -> Floats:
    """Coefficients of the product of two polynomials in x and y."""
    h = np.zeros((f.shape[0] + g.shape[0] - 1, f.shape[1] + g.shape[1] - 1))
    for i, j in np.argwhere(f):
        h[i : i + g.shape[0], j : j + g.shape[1]] += f[i, j] * g
    return h
