"""The bending moment along a free round rim, as an integral over a ring.

At a place of a free circle r = R the moment m_tt (t along the rim; m_nn is zero) is

    J = integral of w b dA + constant,

b zero but in a ring around the circle's centre. It holds exactly where between the rim
and the ring's far edge ``D lap lap w = p``, D is constant, the plate isotropic and p
linear, and the rim is free and unloaded all around. The plate may lie outside the
circle (a hole) or inside (a disc).

Lengths are in R; the complex z has the place at 1 and ``kappa = (3 + nu) / (1 - nu)``.

- A biharmonic field ``Z = Re(conj(z) f + chi)``, f and chi' analytic, has m_nn = 0 and
  v_n = 0 on a line where ``kappa f - z conj(f') - conj(chi')`` is constant (N. I.
  Muskhelishvili, "Some basic problems of the mathematical theory of elasticity", in
  which the same condition is that of plane stress; from memory). On the circle
  conj(z) = 1/z: with ``f = 1 / (z - 1)`` and zero for the constant

      chi' = -kappa z / (z - 1) + 1 / (z (z - 1)^2),

  which leaves the rim free on both sides, but for the pole at the place.
- Green's second identity for w and eta Z, eta a cut-off in r that is 1 from the rim to
  the ring and 0 beyond it: both are free at the rim, the pole sees of w its second
  derivatives alone (Z grows as log, w less a rigid motion falls as the distance
  squared; Z brings no force or couple), and as Z is even about the normal and m_nn = 0,
  only m_tt of them. With lap lap Z = 0

      lap lap (eta Z) = lap lap eta Z + 4 (lap eta)' Z,r + 4 (eta'' - eta'/r) Z,rr
                        + (2 lap eta + 4 eta'/r) lap Z + 4 eta' (lap Z),r

  and ``c m_tt = D integral of w lap lap (eta Z) - integral of eta Z p``.
- c follows from ``w = r^2 + 2 (1 + nu) / (1 - nu) log r``, free at the rim with
  ``m_tt = 4 (1 + nu) D``, and the mean of Z around the centre, ``-kappa log r`` outside
  and ``log r - r^2`` inside (but for rigid motions): ``c = 2 pi kappa / (1 + nu)`` for
  both.
- The load's part takes Z's parts of no and one wave around the centre: those means, and
  ``kappa / r cos`` outside, ``-r^3 cos`` inside.
- A rigid motion A + B x added to Z changes nothing of this. A and B make those parts
  vanish halfway along the ring, where eta falls most: b, which a mesh must follow, is
  half as large for it in narrow rings and an eighth in wide ones.

Arrays: points (..., 2) in m; weights (...).
"""

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.polynomial import Polynomial
from numpy.typing import ArrayLike, NDArray

from kplate.arrays import Floats, read_only_floats
from kplate.kernels import Kernel
from kplate.quadrature import gauss

# The cut-off's derivatives up to this order vanish at both edges of the ring. The
# weights go to zero as the distance to the edge to this less three: their Laplacian,
# which the width of a band follows, is square integrable, and least for this order.
SMOOTH = 5
_POINTS = 40  # of the rule along a radius for the load's part


def rim_moment_kernel(
    at: ArrayLike, circle: ArrayLike, ring: tuple[float, float], *, D: float, nu: float
) -> Kernel:
    """Kernel of the bending moment m_tt at a place of a free round rim.

    Parameters
    ----------
    at : array_like, shape (2,)
        The place in m, on the rim.
    circle : array_like, shape (3,)
        The rim's centre and radius in m.
    ring : tuple of float
        Radii in m between which the weights are not zero, the one next to the rim
        first: both are larger than the rim's at a hole, both smaller on a disc.
    D : float
        Bending stiffness in N m.
    nu : float
        Poisson's ratio.

    Returns
    -------
    Kernel
        J is m_tt in N, t along the rim. With weights of the deflection in N/m3, and
        the pressure of its constant that at the centre of the circle.

    Examples
    --------
    A plate with a hole of radius 1 that is bent to ``r^2 + 4 log r`` with nu = 1/3:

    >>> kernel = rim_moment_kernel((1, 0), (0, 0, 1), (1.2, 3.0), D=1.0, nu=1 / 3)
    >>> r, a = np.meshgrid(np.linspace(1.2, 3, 400), np.arange(64) * np.pi / 32)
    >>> b = kernel.pressure(np.stack([r * np.cos(a), r * np.sin(a)], axis=-1))
    >>> J = np.sum(b * (r**2 + 4 * np.log(r)) * r) * 1.8 / 399 * np.pi / 32
    >>> round(float(J), 4), round(4 * (1 + 1 / 3), 4)
    (5.3333, 5.3333)
    """
    x, y, R = read_only_floats(circle).tolist()
    centre = np.array([x, y])
    towards = (read_only_floats(at) - centre) / R
    field = _Field(kappa=(3.0 + nu) / (1.0 - nu), near=ring[0] / R, far=ring[1] / R)
    scale = (1.0 + nu) / (2.0 * math.pi * field.kappa)
    even, tilt = field.with_linear()

    def weights(points: ArrayLike) -> Floats:
        offset = np.asarray(points, dtype=float) - centre
        z = (offset[..., 0] + 1j * offset[..., 1]) / R
        return D * scale / R**4 * field.bilaplacian(z * complex(*towards).conjugate())

    def constant(pressure: float, gradient: ArrayLike) -> float:
        slope = float(towards @ np.asarray(gradient, dtype=float))
        return -scale * R**2 * (pressure * even + slope * R * tilt)

    return Kernel(
        centre=centre,
        radius=max(ring),
        inner=min(ring),
        exponent=SMOOTH - 3,
        pressure=weights,
        constant=constant,
    )


@dataclass(frozen=True, kw_only=True)
class _Field:
    """The field eta Z at the unit circle, with the pole at 1.

    Eta falls from 1 at the radius `near` to 0 at the radius `far`.
    """

    kappa: float
    near: float
    far: float

    @property
    def rigid(self) -> tuple[float, float]:
        """A and B of the rigid motion that is added to Z."""
        middle = 0.5 * (self.near + self.far)
        even, tilt = (float(part(middle)) for part in self._waves)
        return -even, -tilt / middle

    @property
    def _waves(self) -> tuple[Callable[..., Floats], Callable[..., Floats]]:
        """Z's parts of no and of one wave, but for the rigid motion, by radius."""
        k = self.kappa
        if self.far > 1.0:
            return (lambda r: -k * np.log(r)), (lambda r: k / r - k * r)
        return (lambda r: np.log(r) - r**2 + 1.0), (lambda r: r - r**3)

    def cut_off(self, r: Floats) -> list[Floats]:
        """Eta at radii and its derivatives up to the fourth."""
        span = self.far - self.near
        t = np.clip((r - self.near) / span, 0.0, 1.0)
        falls = [-_STEP.deriv(k)(t) / span**k for k in range(1, 5)]
        return [1.0 - _STEP(t), *falls]

    def bilaplacian(self, z: NDArray[np.complex128]) -> Floats:
        """Lap lap (eta Z) at complex places (...)."""
        found = np.zeros(z.shape)
        low, high = sorted((self.near, self.far))
        ring = (np.abs(z) > low) & (np.abs(z) < high)
        z, k = z[ring], self.kappa
        r: Floats = np.hypot(z.real, z.imag)
        f, chi_1 = 1.0 / (z - 1.0), -k * z / (z - 1.0) + 1.0 / (z * (z - 1.0) ** 2)
        chi = -k * z - (k + 1.0) * np.log(z - 1.0) + np.log(z) - f
        chi_2 = (k - 1.0 / z**2) * f**2 - 2.0 / z * f**3
        A, B = self.rigid
        f_1, f_2, mirrored = -(f**2), 2.0 * f**3, np.conj(z)
        Z: Floats = (mirrored * f + chi + A + B * z).real
        # r d/dr once and twice
        once = (mirrored * (f + z * f_1) + z * (chi_1 + B)).real
        second = mirrored * (f + 3.0 * z * f_1 + z**2 * f_2)
        twice = (second + z * (chi_1 + B) + z**2 * chi_2).real
        laplacian, outward = 4.0 * f_1.real, 4.0 * (z * f_2).real / r
        _, e_1, e_2, e_3, e_4 = self.cut_off(r)
        found[ring] = (
            (e_4 + 2.0 * e_3 / r - e_2 / r**2 + e_1 / r**3) * Z
            + 4.0 * (e_3 + e_2 / r - e_1 / r**2) * once / r
            + 4.0 * (e_2 - e_1 / r) * (twice - once) / r**2
            + (2.0 * e_2 + 6.0 * e_1 / r) * laplacian
            + 4.0 * e_1 * outward
        )
        return found

    def with_linear(self) -> tuple[float, float]:
        """Integrals of eta Z times 1 and times x over the plate."""
        share, weights = gauss(_POINTS)
        totals = np.zeros(2)
        (A, B), (even, tilt) = self.rigid, self._waves
        for start, end in ((1.0, self.near), (self.near, self.far)):
            r = start + (end - start) * share
            own = abs(end - start) * weights * r * self.cut_off(r)[0]
            totals += (
                2.0 * math.pi * own @ (even(r) + A),
                math.pi * own @ (r * (tilt(r) + B * r)),
            )
        return float(totals[0]), float(totals[1])


def _step() -> Polynomial:
    """From 0 at 0 to 1 at 1, derivatives up to the order `SMOOTH` zero at both."""
    t = Polynomial([0.0, 1.0])
    slope = t**SMOOTH * (1.0 - t) ** SMOOTH
    return slope.integ() / slope.integ()(1.0)


_STEP = _step()
