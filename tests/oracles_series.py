"""Loads on rectangles, and Levy's single series for what they do.

Signs, units and source are those of oracles.py, D = 1 and the deflection is
``w = sum_m Y_m(y) sin(alpha_m x)``. What falls off slowly with m (the load carried one
way, as by a strip) is summed in closed form; the rest is made of
``exp(-alpha |y - level|)`` alone, which overflows nowhere, and takes as many terms as
the distance to the nearest level (a loaded side, an end of a patch, a force) asks for.

A rectangle of several bands across y (steps of thickness or material, walls, a line
force, moments on the ends) takes the same end functions, four to a band.

Arrays: derivatives (4, 4, n), entry ``[i, j]`` is ``d^(i+j) w / dx^i dy^j`` for
``i + j <= 3``, zero elsewhere; functions of y (4, m), order of the derivative first,
one column a term of the series.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

CLAMPED, SIMPLY_SUPPORTED, FREE = "clamped", "simply supported", "free"

ORDERS = [(i, j) for i in range(4) for j in range(4 - i)]  # derivatives of w we keep
DECAY = 40.0  # exp(-40) = 4e-18: what is left out is below round-off
FEWEST_TERMS, MOST_TERMS = 48, 40_000  # most: a tail of 1/m**3 is 3e-10 of the sum


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


@dataclass(frozen=True, kw_only=True)
class Band:
    """Part of a rectangle between two y, all the way along x.

    Width along y in m, bending rigidity D in N m, Poisson's ratio, even pressure in Pa.
    """

    width: float
    rigidity: float = 1.0
    nu: float = 0.3
    pressure: float = 0.0


def series(
    xy: Floats, size: tuple[float, float], load: Load, ends: tuple[str, str], nu: float
) -> Floats:
    """Derivatives (4, 4, n) at points (n, 2) of a rectangle, ends as in `levy`."""
    W = np.zeros((4, 4, len(xy)))
    if W.size == 0:
        return W
    (a, b), source = size, _source(load, size)
    counts = term_counts(xy, size, load)
    alpha = np.pi / a * np.arange(1, counts.max() + 1)
    factors = _end_factors(alpha, size, source, ends, nu)
    for n, ((x, y), m) in enumerate(zip(xy.tolist(), counts.tolist(), strict=True)):
        k = alpha[:m]
        Y = source.decaying(k, y, a)
        Y += np.einsum("fm,fjm->jm", factors[:, :m], _end_functions(k, y, b))
        W[..., n] = source.strip(x, y, a)
        for i, j in ORDERS:
            W[i, j, n] += Y[j] @ (k**i * sine_derivative(i, k * x))
    return W


def banded(
    xy: Floats,
    number: int,
    bands: Sequence[Band],
    ends: tuple[str, str],
    *,
    a: float = 1.0,
    walls: bool = False,
    line_force: float = 0.0,
    end_moments: tuple[float, float] = (0.0, 0.0),
) -> Floats:
    """Derivatives (4, 4, n) of w in m, at points (n, 2) of one band of a rectangle.

    Parameters
    ----------
    xy : ndarray, shape (n, 2)
        Points in m of band `number`, its own side of the joints included.
    number : int
        The band they are in.
    bands : sequence of Band
        From y = 0 up; x = 0 and x = a are simply supported.
    ends : (str, str)
        Supports of the first and the last y, as in `oracles.levy`.
    a : float
        Length in m along x.
    walls : bool
        Whether w = 0 along every joint of two bands.
    line_force : float
        Force in N/m along every joint without a wall, positive upwards.
    end_moments : (float, float)
        Moments m_yy in N applied to ends that are simply supported.
    """
    y0 = sum(band.width for band in bands[:number])
    own = bands[number]
    local = xy[:, 1] - y0
    distance = np.minimum(np.abs(local), np.abs(own.width - local))
    counts = _counts(distance, a)
    alpha = np.pi / a * np.arange(1, counts.max() + 1)
    factors = _band_factors(alpha, a, bands, ends, walls, line_force, end_moments)
    W = np.zeros((4, 4, len(xy)))
    for n, (x, y, m) in enumerate(zip(xy[:, 0], local, counts, strict=True)):
        k = alpha[:m]
        Y = _end_functions(k, y, own.width)
        Y = np.einsum("fm,fjm->jm", factors[number, :, :m], Y)
        W[:, 0, n] = _beam(x, a, (0.0, a), (own.pressure / own.rigidity, 0.0))
        for i, j in ORDERS:
            W[i, j, n] += Y[j] @ (k**i * sine_derivative(i, k * x))
    return W


def swapped(load: Load) -> Load:
    """Return the load with x and y exchanged."""
    if isinstance(load, PointForce):
        return replace(load, at=load.at[::-1])
    if isinstance(load, LinearPressure):
        return replace(load, gradient=load.gradient[::-1])
    return replace(load, centre=load.centre[::-1], size=load.size[::-1])


def term_counts(xy: Floats, size: tuple[float, float], load: Load) -> Ints:
    """How many terms each point needs, (n,).

    An end where no load acts asks for none: its factors have decayed already.
    """
    source = _source(load, size)
    levels = [level for level, _ in source.levels]
    levels += [y for y in (0.0, size[1]) if source.acts(y)]
    return _counts(np.abs(xy[:, 1, None] - levels).min(axis=1), size[0])


def _counts(distance: Floats, a: float) -> Ints:
    """How many terms points at these distances from the nearest level need."""
    reach = DECAY * a / np.pi  # one term reaches this far
    counts = np.ceil(reach / np.maximum(distance, reach / MOST_TERMS))
    return np.asarray(np.maximum(counts, FEWEST_TERMS), dtype=np.int64)


def sine_derivative(k: int, t: Floats) -> Floats:
    """Sine, differentiated k times."""
    return np.asarray((np.sin, np.cos)[k % 2](t) * (1, 1, -1, -1)[k])


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


def _band_factors(
    alpha: Floats,
    a: float,
    bands: Sequence[Band],
    ends: tuple[str, str],
    walls: bool,
    line_force: float,
    end_moments: tuple[float, float],
) -> Floats:
    """Factors (bands, 4, m) of each band's end functions."""
    one = 2.0 / a * (1.0 - np.cos(alpha * a)) / alpha  # terms of an even load of one
    zero, count = 0.0 * one, 4 * len(bands)
    rows: list[Floats] = []
    right: list[Floats] = []

    def state(j: int, y: float) -> tuple[Floats, Floats]:
        """w, slope, moment, shear of all factors (4, count, m), of the load (4, m)."""
        band = bands[j]
        every = np.zeros((4, count, len(alpha)))
        F = _end_functions(alpha, y, band.width)
        every[:, 4 * j : 4 * j + 4] = _band_state(band, F, alpha).swapaxes(0, 1)
        flat = np.stack([band.pressure / band.rigidity * one / alpha**4, *3 * [zero]])
        return every, _band_state(band, flat, alpha)

    last = len(bands) - 1
    for j, y, end, moment in (
        (0, 0.0, ends[0], end_moments[0]),
        (last, bands[last].width, ends[1], end_moments[1]),
    ):
        every, load = state(j, y)
        given = np.stack([zero, zero, moment * one / alpha**2, zero])
        vanish = {CLAMPED: [0, 1], SIMPLY_SUPPORTED: [0, 2], FREE: [2, 3]}[end]
        rows += list(every[vanish])
        right += list((given - load)[vanish])
    for j in range(last):
        below, above = state(j, bands[j].width), state(j + 1, 0.0)
        jump = np.stack([zero, zero, zero, line_force * one / alpha**3])
        meet = [0, 1, 2] if walls else [0, 1, 2, 3]
        rows += list((above[0] - below[0])[meet])
        right += list((jump - above[1] + below[1])[meet])
        if walls:
            rows.append(below[0][0])
            right.append(-below[1][0])
    A, f = np.stack(rows).transpose(2, 0, 1), np.stack(right).T
    factors = np.linalg.solve(A, f[..., None])[..., 0]
    return np.asarray(factors.T.reshape(len(bands), 4, -1), dtype=float)


def _band_state(band: Band, Y: Floats, alpha: Floats) -> Floats:
    """w, slope, m_yy and -v_y over powers of alpha; Y (..., 4, m)."""
    w, slope, bend, third = (Y[..., j, :] / alpha**j for j in range(4))
    D, nu = band.rigidity, band.nu
    moment, shear = D * (bend - nu * w), D * (third - (2 - nu) * slope)
    return np.stack([w, slope, moment, shear], axis=-2)


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
