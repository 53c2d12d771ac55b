"""Exact solutions of discs and rings, in closed form.

Signs, units and source, unless a function names its own, are those of oracles.py.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike
from oracles_series import CLAMPED, FREE, SIMPLY_SUPPORTED, Floats, PointForce


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
    forces: tuple[float, float] = (0.0, 0.0),
    moments: tuple[float, float] = (0.0, 0.0),
    nu: float = 0.3,
    rigidity: float = 1.0,
) -> RadialState:
    """Ring plate under an even pressure, forces and moments on its rims, closed form.

    Parameters
    ----------
    r, pressure, nu, rigidity
        As in `disc`.
    radii : (float, float)
        Inner and outer radius in m.
    supports : (str, str)
        Of the inner and the outer rim: "clamped", "simply supported" or "free".
    forces, moments : (float, float)
        On the inner and the outer rim, in N/m up, and in N as m_rr; where they work.

    Returns
    -------
    RadialState
        From 1, r^2, ln r, r^2 ln r and p r^4 / 64 D and the four rim conditions.
    """
    rims = _radial(radii)
    rows = np.concatenate(
        [_radial_conditions(rims, s, nu)[:, :, k] for k, s in enumerate(supports)]
    )
    given = [0.0] * 4
    for k, support in enumerate(supports):
        first = 2 * k
        if support == FREE:  # (lap w)' is -q_r; the inner rim's own shear is -q_r too
            given[first : first + 2] = moments[k], forces[k] * (1.0 - 2.0 * k)
        elif support == SIMPLY_SUPPORTED:
            given[first + 1] = moments[k]
    c = np.append(np.zeros(4), pressure / 64)
    c[:4] = np.linalg.solve(rows[:, :4], given - rows @ c)
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
