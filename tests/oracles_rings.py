"""Exact solutions of discs and rings under loads on circles, of sectors and ellipses.

Signs and units are those of oracles.py. Sources: the general solution 1, r^2, ln r,
r^2 ln r of the plate equation in r, and r^k sin(k theta), r^(k+2) sin(k theta) of the
harmonics of a sector (Timoshenko and Woinowsky-Krieger, 2nd ed. 1959, arts. 15 and 62,
from memory); the ellipse is Bryan's (the same, art. 70, from memory).
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike
from oracles_round import RadialState, _radial, _radial_state
from oracles_series import CLAMPED, FREE, SIMPLY_SUPPORTED, Floats

GUIDED = "guided"


@dataclass(frozen=True, kw_only=True)
class Circle:
    """A circle about the axis on which something is held or acts.

    Parameters
    ----------
    radius : float
        In m.
    support : str
        Of a rim: "clamped", "simply supported", "free" or "guided".
    force, moment : float
        Line force in N/m, up; of a rim also the moment m_rr in N applied to it.
    """

    radius: float
    support: str = FREE
    force: float = 0.0
    moment: float = 0.0


def rings(
    r: ArrayLike,
    circles: Sequence[Circle],
    pressures: Sequence[float],
    *,
    inner_rim: bool,
    nu: float = 0.3,
) -> RadialState:
    """Disc or ring in parts between circles, each under a pressure of its own, D = 1.

    Parameters
    ----------
    r : array_like, shape (n,)
        Distances from the axis in m; on a circle the part outside it is read.
    circles : sequence of Circle
        The inner rim if there is one, lines between parts, the outer rim.
    pressures : sequence of float
        Of each part from the axis on, in Pa, up.
    inner_rim : bool
        Whether the first circle is a rim; else the first part is a disc.
    nu : float
        Poisson's ratio.
    """
    parts = len(pressures)
    rows, right = [], []

    def put(terms: dict[int, Floats], value: float) -> None:
        """Add a condition: coefficients (5,) of the functions of each part."""
        row = np.zeros(4 * parts)
        for part, own in terms.items():
            row[4 * part : 4 * part + 4] = own[:4]
            value = value - own[4] * pressures[part] / 64
        rows.append(row)
        right.append(value)

    for number, circle in enumerate(circles):
        w, slope, bend, hoop, lap = _radial([circle.radius])[:, :, 0]
        m_rr = bend + nu * hoop
        inner = inner_rim and number == 0
        if inner or number == len(circles) - 1:
            part, out = (0, -1.0) if inner else (parts - 1, 1.0)
            # On the outer rim the shear q_r = -lap is what is put on it from outside,
            # on the inner one it is -q_r.
            pairs = {
                CLAMPED: [(w, 0.0), (slope, 0.0)],
                SIMPLY_SUPPORTED: [(w, 0.0), (m_rr, circle.moment)],
                FREE: [(m_rr, circle.moment), (lap, -out * circle.force)],
                GUIDED: [(slope, 0.0), (lap, -out * circle.force)],
            }
            for own, value in pairs[circle.support]:
                put({part: own}, value)
            continue
        before = number - 1 if inner_rim else number
        for own in (w, slope, m_rr):
            put({before: own, before + 1: -own}, 0.0)
        put({before: -lap, before + 1: lap}, circle.force)
    if not inner_rim:  # ln r and r^2 ln r have no place at the axis
        for k in (2, 3):
            put({0: np.eye(5)[k]}, 0.0)
    c = np.linalg.solve(np.array(rows), np.array(right)).reshape(parts, 4)
    lines = [one.radius for one in circles][(1 if inner_rim else 0) : -1]
    r = np.atleast_1d(np.asarray(r, dtype=float))
    owner = np.searchsorted(lines, r, side="right")
    c = np.column_stack([c, np.asarray(pressures) / 64])
    if not inner_rim:
        c[0, 2:4] = 0.0
    states = [_radial_state(r, own, nu, 1.0) for own in c]
    keys = ("w", "slope", "m_rr", "m_tt", "q_r")
    read = {
        key: np.choose(owner, [getattr(state, key) for state in states]) for key in keys
    }
    return RadialState(**read)


def sector_bisector(
    r: ArrayLike,
    opening: float,
    support: str,
    *,
    pressure: float = 1.0,
    nu: float = 0.3,
    terms: int = 4000,
) -> tuple[Floats, Floats, Floats]:
    """Deflection, m_rr, m_tt on the bisector of a sector of radius 1, D = 1, (n,) each.

    Straight sides simply supported, the arc "clamped" or "simply supported"; opening in
    rad. The sums over harmonics alternate: the last two partial sums are averaged.
    """
    r = np.atleast_1d(np.asarray(r, dtype=float))
    k = (2 * np.arange(terms) + 1) * np.pi / opening
    load = 4 * pressure / (np.pi * (2 * np.arange(terms) + 1))
    factor = (16 - k**2) * (4 - k**2)
    resonant = np.abs(factor) < 1e-9
    slope_of_factor = 8 * (4 - k**2) + 4 * (16 - k**2)
    P = load / np.where(resonant, slope_of_factor, factor)

    def table(x: Floats) -> Floats:
        """w, w', w'' of r^k, r^(k+2) and the particular solution, (3, 3, terms)."""
        ln = np.log(x)
        found = [
            [x**m, m * x ** (m - 1), m * (m - 1) * x ** (m - 2)] for m in (k, k + 2)
        ]
        own = np.where(
            resonant,
            np.array([x**4 * ln, 4 * x**3 * ln + x**3, 12 * x**2 * ln + 7 * x**2])[
                :, None
            ],
            np.array([x**4, 4 * x**3, 12 * x**2])[:, None],
        )
        return np.array([found[0], found[1], own]).transpose(1, 0, 2)

    def m_rr(t: Floats, x: float) -> Floats:
        w, d, dd = t
        return dd + nu * (d / x - k**2 * w / x**2)

    def m_tt(t: Floats, x: float) -> Floats:
        w, d, dd = t
        return nu * dd + d / x - k**2 * w / x**2

    rim = table(np.array(1.0))
    second = rim[1] if support == CLAMPED else m_rr(rim, 1.0)
    A = np.array([rim[0][:2], second[:2]]).transpose(2, 0, 1)
    b = -np.array([rim[0][2] * P, second[2] * P]).T
    c = np.column_stack([np.linalg.solve(A, b[..., None])[..., 0], P]).T
    turns = (-1.0) ** np.arange(terms)
    out = []
    for x in r:
        t = table(np.array(float(x)))
        rows = [t[0], m_rr(t, float(x)), m_tt(t, float(x))]
        sums = [np.cumsum(turns * np.sum(own * c, axis=0)) for own in rows]
        out.append([0.5 * (s[-1] + s[-2]) for s in sums])
    w, radial, hoop = np.array(out).T
    return w, radial, hoop


def clamped_ellipse(
    points: ArrayLike, axes: tuple[float, float], *, pressure: float = 1.0
) -> tuple[Floats, Floats, Floats]:
    """w, w,xx, w,yy of a clamped ellipse about the origin, half axes in m, D = 1."""
    a, b = axes
    x, y = np.atleast_2d(np.asarray(points, dtype=float)).T
    w0 = pressure / (24 / a**4 + 24 / b**4 + 16 / (a**2 * b**2))
    s = 1 - x**2 / a**2 - y**2 / b**2
    w_xx = w0 * (8 * x**2 / a**4 - 4 * s / a**2)
    w_yy = w0 * (8 * y**2 / b**4 - 4 * s / b**2)
    return w0 * s**2, w_xx, w_yy
