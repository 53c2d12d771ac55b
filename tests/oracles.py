"""Exact solutions of the Kirchhoff plate, the ground the tests stand on.

Signs and units are kplate's: SI; z up; deflection, pressure and force positive
upwards; ``m_xx = D (w,xx + nu w,yy)``, positive when it compresses the top face;
``m_xy = D (1 - nu) w,xy``; ``D lap lap w = p``. Shears act upwards on a face with
outward normal +x or +y: ``q_x = -(m_xx,x + m_xy,y)``, and the effective shear is
``v_x = q_x - m_xy,y``. A support pushes up with ``v_n = v_x`` on a side with
outward normal +x and with ``v_n = -v_x`` on one with outward normal -x.

The rectangles come from Levy's single series, ``w = sum_m Y_m(y) sin(alpha_m x)``.
What falls off slowly with m (the load carried one way, as by a strip) is summed in
closed form; the rest is made of ``exp(-alpha |y - level|)`` alone, which overflows
nowhere, and takes as many terms as the distance to the nearest level (a loaded side,
an end of a patch, a force) asks for. Where all sides are simply supported the series
may run along x or along y, and each point takes the shorter.

Arrays: derivatives (4, 4, n), entry ``[i, j]`` is ``d^(i+j) w / dx^i dy^j`` for
``i + j <= 3``, zero elsewhere; functions of y (4, m), order of the derivative first,
one column a term of the series.

Source, unless a function names its own: S. Timoshenko and S. Woinowsky-Krieger,
"Theory of Plates and Shells", 2nd ed., McGraw-Hill, 1959, chapters 3, 5, 6 and 9
(from memory). test_oracles.py checks every function on its own.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.polynomial import legendre
from numpy.polynomial import polynomial as power
from numpy.typing import ArrayLike, NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

CLAMPED, SIMPLY_SUPPORTED, FREE = "clamped", "simply supported", "free"

ORDERS = [(i, j) for i in range(4) for j in range(4 - i)]  # derivatives of w we keep
DECAY = 40.0  # exp(-40) = 4e-18: what is left out is below round-off
FEWEST_TERMS, MOST_TERMS = 48, 40_000  # most: a tail of 1/m**3 is 3e-10 of the sum
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


@dataclass(frozen=True, kw_only=True)
class LinearPressure:
    """Pressure ``at_origin + gradient . (x, y)`` in Pa, positive upwards."""

    at_origin: float = 0.0
    gradient: tuple[float, float] = (0.0, 0.0)


@dataclass(frozen=True, kw_only=True)
class PatchForce:
    """Force in N, positive upwards, spread evenly over a rectangle on the plate.

    Centre and size (along x, along y) in m.
    """

    centre: tuple[float, float]
    size: tuple[float, float]
    force: float = 1.0


@dataclass(frozen=True, kw_only=True)
class PointForce:
    """Force in N at a point inside the plate, positive upwards."""

    at: tuple[float, float]
    force: float = 1.0


Load = LinearPressure | PatchForce | PointForce


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
    turned = xy[:, ::-1], size[::-1], _swapped(load)
    across = _term_counts(*turned) < _term_counts(xy, size, load)
    ends = (SIMPLY_SUPPORTED, SIMPLY_SUPPORTED)
    W = np.zeros((4, 4, len(xy)))
    W[..., ~across] = _series(xy[~across], size, load, ends, nu)
    W[..., across] = _series(turned[0][across], *turned[1:], ends, nu).swapaxes(0, 1)
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
    W = _series(xy, size, load, ends, nu)
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


@dataclass(frozen=True, eq=False, kw_only=True)
class RadialState:
    """Round plate under a load symmetric about its axis; every array is (n,).

    ``w`` in m, up; ``slope`` dw/dr; radial and tangential moment ``m_rr``, ``m_tt``
    in N, positive compress the top face; shear ``q_r`` in N/m, upwards on a face with
    outward normal +r: an outer support pushes up with q_r, an inner one with -q_r.
    """

    w: Floats
    slope: Floats
    m_rr: Floats
    m_tt: Floats
    q_r: Floats


def disc(
    r: ArrayLike,
    radius: float,
    support: str,
    *,
    pressure: float = 0.0,
    force: float = 0.0,
    nu: float = 0.3,
    rigidity: float = 1.0,
) -> RadialState:
    """Disc under an even pressure and a point force at its centre, closed form.

    Parameters
    ----------
    r : array_like, shape (n,)
        Distances from the centre in m.
    radius : float
        In m.
    support : str
        Of the rim, "clamped" or "simply supported".
    pressure, force : float
        In Pa and N, positive upwards.
    nu, rigidity : float
        Poisson's ratio; bending rigidity D in N m.

    Returns
    -------
    RadialState
        Moments and shear under a force are nan: they have no finite value.
    """
    rows = _radial_conditions(_radial([radius]), support, nu)[:, :, 0]
    c = np.array([0.0, 0.0, 0.0, force / (8 * np.pi), pressure / 64])
    c[:2] = np.linalg.solve(rows[:, :2], -rows @ c)
    return _radial_state(r, c, nu, rigidity)


def annulus(
    r: ArrayLike,
    radii: tuple[float, float],
    supports: tuple[str, str],
    *,
    pressure: float = 1.0,
    nu: float = 0.3,
    rigidity: float = 1.0,
) -> RadialState:
    """Ring plate under an even pressure, closed form.

    Parameters
    ----------
    r, pressure, nu, rigidity
        As in `disc`.
    radii : (float, float)
        Inner and outer radius in m.
    supports : (str, str)
        Of the inner and the outer rim: "clamped", "simply supported" or "free".

    Returns
    -------
    RadialState
        From 1, r^2, ln r, r^2 ln r and p r^4 / 64 D and the four rim conditions.
    """
    rims = _radial(radii)
    rows = np.concatenate(
        [_radial_conditions(rims, s, nu)[:, :, k] for k, s in enumerate(supports)]
    )
    c = np.append(np.zeros(4), pressure / 64)
    c[:4] = np.linalg.solve(rows[:, :4], -rows @ c)
    return _radial_state(r, c, nu, rigidity)


def clamped_disc_force(
    points: ArrayLike, radius: float, load: PointForce, *, rigidity: float = 1.0
) -> Floats:
    """Deflection of a clamped disc about the origin under a point force anywhere.

    Parameters
    ----------
    points : array_like, shape (n, 2)
        Points in m.
    radius, load, rigidity
        In m; the force; bending rigidity D in N m.

    Returns
    -------
    ndarray, shape (n,)
        Deflection in m, positive upwards. Source: J. H. Michell, Proc. London Math.
        Soc. 34 (1902) (from memory).
    """
    a2 = radius**2
    xy, at = np.atleast_2d(np.asarray(points, dtype=float)), np.asarray(load.at)
    r2, s2 = np.sum(xy**2, axis=1), float(at @ at)
    apart = np.sum((xy - at) ** 2, axis=1)
    image = (a2**2 - 2 * a2 * (xy @ at) + r2 * s2) / a2
    ratio = np.where(apart > 0.0, apart / image, 1.0)  # x ln x -> 0 under the force
    bracket = (a2 - r2) * (a2 - s2) / a2 + apart * np.log(ratio)
    return np.asarray(load.force * bracket / (16 * np.pi * rigidity))


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
        W[i, j] = k**i * _sine(i, k * x) * l**j * _sine(j, l * y)
    W *= pressure / (rigidity * (k**2 + l**2) ** 2)
    return State(derivatives=W, nu=nu, rigidity=rigidity)


# The single series, with D = 1


@dataclass(frozen=True, kw_only=True)
class _Area:
    """Pressure ``c + d x + e y`` between two x and two y, as the series takes it."""

    density: tuple[float, float, float]
    x: tuple[float, float]
    levels: tuple[tuple[float, float], ...]  # y where it starts (+1) or ends (-1)
    starts: float  # 1 where it acts from y = 0 on

    def amplitudes(self, alpha: Floats, a: float) -> tuple[Floats, Floats]:
        """Return A, B of the load ``(A + B y) sin(alpha x)``."""
        (c, d, e), (x1, x2) = self.density, self.x
        (s1, s2), (c1, c2) = (
            f(np.multiply.outer(self.x, alpha)) for f in (np.sin, np.cos)
        )
        even = (c1 - c2) / alpha
        tilt = (s2 - s1) / alpha**2 + (x1 * c1 - x2 * c2) / alpha
        return 2 / a * (c * even + d * tilt), 2 / a * e * even

    def acts(self, y: float) -> float:
        return self.starts + sum(sign for level, sign in self.levels if y >= level)

    def decaying(self, alpha: Floats, y: float, a: float) -> Floats:
        """Return what the levels add to a particular solution; there B = 0."""
        A, _ = self.amplitudes(alpha, a)
        Y = np.zeros((4, len(alpha)))
        for level, sign in self.levels:
            side = sign if y >= level else -sign
            Y -= side * A / alpha**4 * _decay(alpha, y - level, 0.5, 0.25)
        return Y

    def profile(self, alpha: Floats, y: float, a: float) -> Floats:
        """Return a particular solution."""
        A, B = self.amplitudes(alpha, a)
        Y = self.decaying(alpha, y, a)
        Y[:2] += self.acts(y) * np.array([A + B * y, B]) / alpha**4
        return Y

    def strip(self, x: float, y: float, a: float) -> Floats:
        """Return derivatives (4, 4) of a strip that carries along x alone."""
        c, d, e = self.density
        W = np.zeros((4, 4))
        W[:, 0] = _beam(x, a, self.x, (c + e * y, d))
        W[:3, 1] = _beam(x, a, self.x, (e, 0.0))[:3]
        return self.acts(y) * W


@dataclass(frozen=True, kw_only=True)
class _Point:
    """Point force, as the series takes it."""

    force: float
    at: tuple[float, float]

    @property
    def levels(self) -> tuple[tuple[float, float], ...]:
        return ((self.at[1], 1.0),)

    def acts(self, y: float) -> float:
        return 0.0

    def profile(self, alpha: Floats, y: float, a: float) -> Floats:
        """Return a particular solution; all of it decays."""
        factor = self.force / (2 * a) * np.sin(alpha * self.at[0]) / alpha**3
        return factor * _decay(alpha, y - self.at[1], 1.0, 1.0)

    decaying = profile

    def strip(self, x: float, y: float, a: float) -> Floats:
        """Nothing; nan where the series ends before moments and shears are reached."""
        W = np.zeros((4, 4))
        near = DECAY * a / np.pi / MOST_TERMS
        if max(abs(x - self.at[0]), abs(y - self.at[1])) < near:
            W[np.add.outer(range(4), range(4)) >= 2] = np.nan
        return W


def _series(
    xy: Floats, size: tuple[float, float], load: Load, ends: tuple[str, str], nu: float
) -> Floats:
    W = np.zeros((4, 4, len(xy)))
    if W.size == 0:
        return W
    (a, b), source = size, _source(load, size)
    counts = _term_counts(xy, size, load)
    alpha = np.pi / a * np.arange(1, counts.max() + 1)
    factors = _end_factors(alpha, size, source, ends, nu)
    for n, ((x, y), m) in enumerate(zip(xy.tolist(), counts.tolist(), strict=True)):
        k = alpha[:m]
        Y = source.decaying(k, y, a)
        Y += np.einsum("fm,fjm->jm", factors[:, :m], _end_functions(k, y, b))
        W[..., n] = source.strip(x, y, a)
        for i, j in ORDERS:
            W[i, j, n] += Y[j] @ (k**i * _sine(i, k * x))
    return W


def _source(load: Load, size: tuple[float, float]) -> _Area | _Point:
    a, b = size
    if isinstance(load, PointForce):
        return _Point(force=load.force, at=load.at)
    if isinstance(load, LinearPressure):
        density = (load.at_origin, *load.gradient)
        return _Area(density=density, x=(0.0, a), levels=(), starts=1.0)
    (x0, y0), (u, v) = load.centre, load.size
    ends = ((y0 - v / 2, 1.0), (y0 + v / 2, -1.0))
    return _Area(
        density=(load.force / (u * v), 0.0, 0.0),
        x=(x0 - u / 2, x0 + u / 2),
        levels=tuple((y, sign) for y, sign in ends if 0.0 < y < b),
        starts=float(ends[0][0] <= 0.0),
    )


def _swapped(load: Load) -> Load:
    """Return the load with x and y exchanged."""
    if isinstance(load, PointForce):
        return replace(load, at=load.at[::-1])
    if isinstance(load, LinearPressure):
        return replace(load, gradient=load.gradient[::-1])
    return replace(load, centre=load.centre[::-1], size=load.size[::-1])


def _term_counts(xy: Floats, size: tuple[float, float], load: Load) -> Ints:
    """How many terms each point needs, (n,).

    An end where no load acts asks for none: its factors have decayed already.
    """
    source = _source(load, size)
    levels = [level for level, _ in source.levels]
    levels += [y for y in (0.0, size[1]) if source.acts(y)]
    distance = np.abs(xy[:, 1, None] - levels).min(axis=1)
    reach = DECAY * size[0] / np.pi  # one term reaches this far
    counts = np.ceil(reach / np.maximum(distance, reach / MOST_TERMS))
    return np.asarray(np.maximum(counts, FEWEST_TERMS), dtype=np.int64)


def _end_factors(
    alpha: Floats,
    size: tuple[float, float],
    source: _Area | _Point,
    ends: tuple[str, str],
    nu: float,
) -> Floats:
    """Factors (4, m) of the end functions that meet the conditions at both ends."""
    a, b = size
    rows: list[Floats] = []
    right: list[Floats] = []
    for y, end in zip((0.0, b), ends, strict=True):
        rows += _end_conditions(end, _end_functions(alpha, y, b), alpha, nu)
        right += _end_conditions(end, source.profile(alpha, y, a), alpha, nu)
    matrices = np.stack(rows).transpose(2, 0, 1)
    factors = np.linalg.solve(matrices, -np.stack(right).T[..., None])
    return np.asarray(factors[..., 0].T, dtype=float)


def _end_conditions(end: str, Y: Floats, alpha: Floats, nu: float) -> list[Floats]:
    """Two numbers a term that vanish at an end; Y (..., 4, m)."""
    w, slope, bend, third = (Y[..., j, :] / alpha**j for j in range(4))
    return {
        SIMPLY_SUPPORTED: [w, bend],
        CLAMPED: [w, slope],
        FREE: [bend - nu * w, third - (2 - nu) * slope],
    }[end]


def _end_functions(alpha: Floats, y: float, b: float) -> Floats:
    """exp(-s) and s exp(-s) from y = 0 and from y = b, (4, 4, m)."""
    forms = ((1.0, 0.0), (0.0, 1.0))
    near = [_decay(alpha, y, *c) for c in forms]
    flip = np.array([1.0, -1.0, 1.0, -1.0])[:, None]  # the far end looks back
    far = [flip * _decay(alpha, b - y, *c) for c in forms]
    return np.stack(near + far)


def _decay(alpha: Floats, t: float, c0: float, c1: float) -> Floats:
    """(c0 + c1 s) exp(-s) with s = alpha |t|, as a function of t, (4, m)."""
    s = alpha * abs(t)
    fall, rate = np.exp(-s), -alpha if t >= 0.0 else alpha
    return np.stack([rate**k * (c0 - k * c1 + c1 * s) * fall for k in range(4)])


def _beam(x: float, a: float, ends: tuple[float, float], q: Sequence[float]) -> Floats:
    """Deflection of a strip on [0, a], loaded q0 + q1 x over ends, and derivatives."""

    def loaded(at: float, k: int) -> float:
        total = 0.0
        for end, sign in zip(ends, (1.0, -1.0), strict=True):
            t = max(at - end, 0.0)
            step = (q[0] + q[1] * end) * t ** (4 - k) / (24, 6, 2, 1)[k]
            total += sign * (step + q[1] * t ** (5 - k) / (120, 24, 6, 2)[k])
        return total

    c3 = -loaded(a, 2) / (6 * a)
    c1 = -loaded(a, 0) / a - c3 * a**2
    cubic = (c1 * x + c3 * x**3, c1 + 3 * c3 * x**2, 6 * c3 * x, 6 * c3)
    return np.array([loaded(x, k) + cubic[k] for k in range(4)])


# Round plates and polynomials


def _radial(r: ArrayLike) -> Floats:
    """1, r^2, ln r, r^2 ln r, r^4: w, w', w'', w'/r, (lap w)' of each, (5, 5, n).

    First axis the quantity, second the function. What has no finite value at r = 0 is
    nan there.
    """
    r = np.atleast_1d(np.asarray(r, dtype=float))
    zero, two = np.zeros_like(r), np.full_like(r, 2.0)
    s = np.where(r > 0.0, r, np.nan)
    ln = np.log(s)
    r2_ln, slope = np.where(r > 0.0, [s**2 * ln, 2 * s * ln + s], 0.0)
    return np.array(
        [
            [zero + 1.0, r**2, ln, r2_ln, r**4],
            [zero, 2 * r, 1 / s, slope, 4 * r**3],
            [zero, two, -1 / s**2, 2 * ln + 3, 12 * r**2],
            [zero, two, 1 / s**2, 2 * ln + 1, 4 * r**2],
            [zero, zero, zero, 4 / s, 32 * r],
        ]
    )


def _radial_conditions(table: Floats, support: str, nu: float) -> Floats:
    """Two numbers a function that vanish at a rim, (2, 5, n)."""
    w, slope, bend, hoop, shear = table
    m = bend + nu * hoop
    pairs = {CLAMPED: [w, slope], SIMPLY_SUPPORTED: [w, m], FREE: [m, shear]}
    return np.stack(pairs[support])


def _radial_state(r: ArrayLike, c: Floats, nu: float, D: float) -> RadialState:
    used = np.flatnonzero(c)  # an absent logarithm must not spoil the centre
    w, slope, bend, hoop, shear = np.einsum("qfn,f->qn", _radial(r)[:, used], c[used])
    m_rr, m_tt = bend + nu * hoop, hoop + nu * bend
    return RadialState(w=w / D, slope=slope / D, m_rr=m_rr, m_tt=m_tt, q_r=-shear)


def _clamped_polynomials(terms: int, t: Floats) -> Floats:
    """Polynomials clamped at -1 and 1, derivatives 0 to 3, (4, terms, n)."""
    k = np.arange(terms)
    L = np.zeros((terms + 4, terms))  # Legendre coefficients, one column each
    L[k, k] = 1.0
    L[k + 2, k] = -2 * (2 * k + 5) / (2 * k + 7)
    L[k + 4, k] = (2 * k + 3) / (2 * k + 7)
    L /= (2 * k + 3) * np.sqrt(2 * (2 * k + 5))  # the integral of phi''^2 becomes 1
    return np.stack([legendre.legval(t, legendre.legder(L, j)) for j in range(4)])


def _sine(k: int, t: Floats) -> Floats:
    """Sine, differentiated k times."""
    return np.asarray((np.sin, np.cos)[k % 2](t) * (1, 1, -1, -1)[k])


def _derivative(coefficients: ArrayLike, i: int, j: int) -> Floats:
    c = np.asarray(coefficients, dtype=float)
    return np.asarray(power.polyder(power.polyder(c, i, axis=0), j, axis=1))


def _product(f: Floats, g: Floats) -> Floats:
    """Coefficients of the product of two polynomials in x and y."""
    h = np.zeros((f.shape[0] + g.shape[0] - 1, f.shape[1] + g.shape[1] - 1))
    for i, j in np.argwhere(f):
        h[i : i + g.shape[0], j : j + g.shape[1]] += f[i, j] * g
    return h
