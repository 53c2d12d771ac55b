"""Mean-value kernels: a value at a point as an integral over a disc about it.

A moment, shear or slope at a point is no bounded functional of the deflection; bounds
need one. A kernel gives it the form

    J = integral of (m_xx a_0 + m_yy a_1 + m_xy a_2 + w b) dA + constant,

weights a (`Kernel.moments`) and b (`Kernel.pressure`), over the disc of radius R about
the centre, or its half where the centre lies on a straight edge. It holds exactly where
in that disc ``D lap lap w = p``, D is constant, the plate isotropic and p linear, and
the edge, if any, is held over the whole diameter.

Below, ``u = 1 - r^2 / R^2``, lengths are in R and g is grad p. Where a gradient is
moved from the field to a kernel by parts, the kernel's zero at the rim leaves nothing
over.

- Over a circle the mean of f is ``f + r^2/4 lap f + r^4/64 lap lap f`` at its centre,
  if lap lap f is constant. `_mean`, of integral 1, thus gives f where lap f = 0, and
  `_level`, of second moment 0 too, where lap lap f = 0.
- Moments: lap lap m = 0 as p is linear, so `_level` times m.
- Shears: q = -grad H with ``H = D lap w = (m_xx + m_yy) / (1 + nu)`` and lap H = p.
  ``H - p(0) r^2/4 - (g.x) r^2/8`` is harmonic and has the same gradient at the centre:
  grad `_mean` times H, and ``M_2 / 4 g`` for what was taken off; M_j is the integral
  of the profile times r^j.
- Slopes: lap lap grad w = g / D, so -grad `_level` times w, and ``-M_4 / (64 D) g``. A
  slope is no integral of moments over the disc: rigid motions have none.
- Clamped edge y = 0, plate at y > 0: ``z = y^2 / (pi r^2)`` is biharmonic, zero on the
  edge, and z,y there is Dirac's delta at the centre. Green's second identity for w and
  c z, c a cut-off in r that is 1 at the centre, leaves on the edge D w,yy, which is
  m_nn: it is the integral of ``c z p - D w lap lap (c z)``. With t = r^2

      lap lap (c z) = 16 / pi (c'' + y^2 (4 c''' + t c'''')),  ' = d/dt,

  by ``lap lap r^2j (1 - cos 2a) = 16 j (j - 1) (j (j - 1) (1 - cos 2a) + 2 cos 2a)
  r^(2j - 4)``: a polynomial, for the singular part of c z is biharmonic.
- Simply supported edge y = 0, plate at y > 0: ``v_n = D (lap w),y + (m_xy),x`` there.
  Less ``p(0) y^4/24 + g_x x y^4/24 + g_y y^5/120``, which adds nothing to v_n, D w goes
  on oddly across the edge as a biharmonic field: -grad `_mean` times H and -grad
  `_level` times m_xy over the whole disc, twice over the half. What was taken off has
  no part in the second, and in the first it leaves the constant.

Arrays: points (..., 2) in m; weights (..., 3) or (...).
"""

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.polynomial import Polynomial
from numpy.typing import ArrayLike

from kplate.arrays import Bools, Floats, read_only_floats

Weights = Callable[[ArrayLike], Floats]
Constant = Callable[[float, ArrayLike], float]

# Weights go to zero at the rim as u^6, smooth enough for rules that do not follow it.
EXPONENT = 6

# A point this far behind the edge, in radii, is on it but for round-off.
BEHIND = 1e-9

_U = Polynomial([0.0, 1.0])

# Falls by u^10 as its fourth derivatives must by u^6; without the second factor lap b,
# which a mesh must follow, is 1.4 times as large (root mean square).
_CUT_OFF = _U ** (EXPONENT + 4) * (3.0 - 2.0 * _U)


def _nothing(pressure: float, gradient: ArrayLike) -> float:
    """The load adds nothing."""
    return 0.0


@dataclass(frozen=True, eq=False, kw_only=True)
class Kernel:
    """Weights whose integral with a plate's fields is a value at a point.

    Parameters
    ----------
    centre : array_like, shape (2,)
        The point in m.
    radius : float
        Radius R of the disc in m.
    inner : float, optional
        Where the kernel is a ring, not a disc: its inner radius in m. The centre need
        not be on the plate then.
    inward : array_like, shape (2,), optional
        Unit normal into the plate of the straight edge through the centre: the disc is
        its half on that side. Whole if left out.
    degree : int, optional
        The weights are polynomials of this degree in the disc; none in a ring.
    exponent : int
        They go to zero at the rim as the distance to this power, and are zero outside:
        derivatives are continuous across the rim up to the order before it.
    moments : function of points (..., 2), optional
        Weights (..., 3) of m_xx, m_yy, m_xy: the curvature ``w,xx, w,yy, 2 w,xy`` that
        is imposed on the adjoint plate.
    pressure : function of points (..., 2), optional
        Weights (...) of w: the pressure that loads the adjoint plate.
    constant : function of a pressure and its gradient (2,)
        What the load adds: pressure at the centre in Pa, positive up (of a ring's load
        continued to there); gradient in Pa/m.
    """

    centre: Floats
    radius: float
    inner: float = 0.0
    inward: Floats | None = None
    degree: int | None = None
    exponent: int = EXPONENT
    moments: Weights | None = None
    pressure: Weights | None = None
    constant: Constant = _nothing

    def __post_init__(self) -> None:
        """Freeze the arrays."""
        object.__setattr__(self, "centre", read_only_floats(self.centre))
        if self.inward is not None:
            object.__setattr__(self, "inward", read_only_floats(self.inward))

    def holds(self, points: ArrayLike) -> Bools:
        """Whether points (..., 2) lie in the disc, half disc or ring, off its rims."""
        disc = _Disc(centre=self.centre, radius=self.radius, inward=self.inward)
        u = disc.local(points)[1]
        held: Bools = (u > 0.0) & (u < 1.0 - (self.inner / self.radius) ** 2)
        return held if self.inner else u > 0.0


def moment_kernel(centre: ArrayLike, radius: float, component: ArrayLike) -> Kernel:
    """Kernel of a moment at a point inside the plate.

    Parameters
    ----------
    centre : array_like, shape (2,)
        The point in m.
    radius : float
        Radius of the disc in m.
    component : array_like, shape (3,)
        J is this times m_xx, m_yy, m_xy, in N. For m_nn it is
        ``(n_x^2, n_y^2, 2 n_x n_y)``.

    Returns
    -------
    Kernel
        With weights of the moments in 1/m2; the load adds nothing.

    Examples
    --------
    >>> kernel = moment_kernel((2.0, 1.0), 0.5, (1.0, 0.0, 0.0))
    >>> kernel.moments([(2.0, 1.0), (2.0, 1.4), (2.0, 1.6)]).round(2)
    array([[20.37,  0.  ,  0.  ],
           [-0.08, -0.  , -0.  ],
           [ 0.  ,  0.  ,  0.  ]])
    """
    disc = _disc(centre, radius)
    parts, profile = read_only_floats(component), _level(EXPONENT)

    def moments(points: ArrayLike) -> Floats:
        _, u = disc.local(points)
        return np.multiply.outer(profile(u) / radius**2, parts)

    return Kernel(
        centre=disc.centre,
        radius=radius,
        degree=2 * profile.degree(),
        moments=moments,
    )


def shear_kernel(
    centre: ArrayLike, radius: float, direction: ArrayLike, *, nu: float
) -> Kernel:
    """Kernel of a transverse shear at a point inside the plate.

    Parameters
    ----------
    centre : array_like, shape (2,)
        The point in m.
    radius : float
        Radius of the disc in m.
    direction : array_like, shape (2,)
        J is this times q_x, q_y, in N/m, positive upwards on the face it points to.
    nu : float
        Poisson's ratio.

    Returns
    -------
    Kernel
        With weights of the moments in 1/m3.
    """
    disc = _disc(centre, radius)
    d, profile = read_only_floats(direction), _mean(EXPONENT + 1)

    def moments(points: ArrayLike) -> Floats:
        slopes = disc.gradient(profile, points) @ d
        return np.multiply.outer(slopes / (radius**2 * (1.0 + nu)), [1.0, 1.0, 0.0])

    def constant(pressure: float, gradient: ArrayLike) -> float:
        return float(d @ np.asarray(gradient)) * radius**2 * _moment(profile, 2) / 4.0

    return Kernel(
        centre=disc.centre,
        radius=radius,
        degree=2 * profile.degree() - 1,
        moments=moments,
        constant=constant,
    )


def slope_kernel(
    centre: ArrayLike, radius: float, direction: ArrayLike, *, D: float
) -> Kernel:
    """Kernel of a slope at a point inside the plate.

    Parameters
    ----------
    centre : array_like, shape (2,)
        The point in m.
    radius : float
        Radius of the disc in m.
    direction : array_like, shape (2,)
        J is this times dw/dx, dw/dy.
    D : float
        Bending stiffness in N m.

    Returns
    -------
    Kernel
        With weights of the deflection in 1/m3.
    """
    disc = _disc(centre, radius)
    d, profile = read_only_floats(direction), _level(EXPONENT + 1)

    def weights(points: ArrayLike) -> Floats:
        return -disc.gradient(profile, points) @ d / radius**2

    def constant(pressure: float, gradient: ArrayLike) -> float:
        fourth = _moment(profile, 4) * radius**4
        return -float(d @ np.asarray(gradient)) * fourth / (64.0 * D)

    return Kernel(
        centre=disc.centre,
        radius=radius,
        degree=2 * profile.degree() - 1,
        pressure=weights,
        constant=constant,
    )


def clamping_kernel(
    centre: ArrayLike, radius: float, inward: ArrayLike, *, D: float
) -> Kernel:
    """Kernel of the bending moment at a point of a straight clamped edge.

    Parameters
    ----------
    centre : array_like, shape (2,)
        The point in m; radius to both sides of it the edge is straight and clamped.
    radius : float
        Radius of the half disc in m.
    inward : array_like, shape (2,)
        Unit normal of the edge, into the plate.
    D : float
        Bending stiffness in N m.

    Returns
    -------
    Kernel
        J is m_nn in N, n the normal of the edge. With weights of the deflection in
        N/m3.
    """
    disc = _disc(centre, radius, inward)
    normal = read_only_floats(inward)
    second, third, fourth = (_CUT_OFF.deriv(k) for k in (2, 3, 4))

    def weights(points: ArrayLike) -> Floats:
        x, u = disc.local(points)
        # d/dt = -d/du
        bend = (1.0 - u) * fourth(u) - 4.0 * third(u)
        return (
            -16.0 * D / (math.pi * radius**4) * (second(u) + (x @ normal) ** 2 * bend)
        )

    def constant(pressure: float, gradient: ArrayLike) -> float:
        # c z times 1 and y over the half disc: means of sin^2 / pi and sin^3 / pi.
        even = _moment(_CUT_OFF, 0) * radius**2 / (4.0 * math.pi)
        tilt = _moment(_CUT_OFF, 1) * radius**3 * 2.0 / (3.0 * math.pi**2)
        return float(pressure * even + normal @ np.asarray(gradient) * tilt)

    return Kernel(
        centre=disc.centre,
        radius=radius,
        inward=normal,
        degree=2 * _CUT_OFF.degree() - 4,
        pressure=weights,
        constant=constant,
    )


def line_reaction_kernel(
    centre: ArrayLike, radius: float, inward: ArrayLike, *, nu: float
) -> Kernel:
    """Kernel of the line reaction at a point of a straight simply supported edge.

    Parameters
    ----------
    centre : array_like, shape (2,)
        The point in m; radius to both sides of it the edge is straight and simply
        supported.
    radius : float
        Radius of the half disc in m.
    inward : array_like, shape (2,)
        Unit normal of the edge, into the plate.
    nu : float
        Poisson's ratio.

    Returns
    -------
    Kernel
        J is the effective shear v_n in N/m, positive where the support pushes the plate
        up. With weights of the moments in 1/m3.
    """
    disc = _disc(centre, radius, inward)
    normal = read_only_floats(inward)
    e_x, e_y = normal
    along = np.array([e_y, -e_x])
    twist = np.array(
        [e_x * e_y, -e_x * e_y, e_y**2 - e_x**2]
    )  # m_xy of the edge's axes
    mean, level = _mean(EXPONENT + 1), _level(EXPONENT + 1)

    def moments(points: ArrayLike) -> Floats:
        into = disc.gradient(mean, points) @ normal / (1.0 + nu)
        aside = disc.gradient(level, points) @ along
        weights = np.multiply.outer(into, [1.0, 1.0, 0.0])
        weights += np.multiply.outer(aside, twist)
        return -2.0 / radius**2 * weights

    def constant(pressure: float, gradient: ArrayLike) -> float:
        even = _moment(mean, 1) * radius * 2.0 / math.pi
        tilt = _moment(mean, 2) * radius**2 / 4.0
        return -float(pressure * even + normal @ np.asarray(gradient) * tilt)

    return Kernel(
        centre=disc.centre,
        radius=radius,
        inward=normal,
        degree=2 * level.degree() - 1,
        moments=moments,
        constant=constant,
    )


@dataclass(frozen=True, eq=False, kw_only=True)
class _Disc:
    """The disc, or half disc, of a kernel."""

    centre: Floats
    radius: float
    inward: Floats | None

    def local(self, points: ArrayLike) -> tuple[Floats, Floats]:
        """Offsets from the centre in radii (..., 2); u (...), 0 outside the disc."""
        x = (np.asarray(points, dtype=float) - self.centre) / self.radius
        u = np.maximum(1.0 - np.sum(x * x, axis=-1), 0.0)
        if self.inward is not None:
            u = np.where(x @ self.inward >= -BEHIND, u, 0.0)
        return x, u

    def gradient(self, profile: Polynomial, points: ArrayLike) -> Floats:
        """Gradient (..., 2) in 1/m of a profile in u."""
        x, u = self.local(points)
        return -2.0 / self.radius * profile.deriv()(u)[..., None] * x


def _disc(centre: ArrayLike, radius: float, inward: ArrayLike | None = None) -> _Disc:
    normal = None if inward is None else read_only_floats(inward)
    return _Disc(centre=read_only_floats(centre), radius=radius, inward=normal)


def _mean(n: int) -> Polynomial:
    """Profile u^n scaled to integral 1 over the unit disc."""
    return (n + 1) / math.pi * _U**n


def _level(n: int) -> Polynomial:
    """Profile u^n (a + b u) of integral 1 and second moment 0 over the unit disc."""
    return (n + 2) / math.pi * ((n + 3) * _U - (n + 1)) * _U**n


def _moment(profile: Polynomial, power: int) -> float:
    """Integral of a profile times r^power over the unit disc.

    u^k gives ``pi`` times Euler's beta function of k + 1 and power/2 + 1.
    """
    b = power / 2 + 1
    terms = (
        c * math.gamma(k + 1) * math.gamma(b) / math.gamma(k + 1 + b)
        for k, c in enumerate(np.asarray(profile.coef, dtype=float))
    )
    return math.pi * math.fsum(terms)
