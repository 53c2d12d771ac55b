"""Leading exponents of the Kirchhoff plate at a corner (Williams).

Near a corner of interior angle alpha the deflection behaves as
``r**(lambda + 1) F(theta)`` and the moments as ``r**(lambda - 1)``: they have no finite
value at the corner where Re lambda < 1. A field has finite energy where Re lambda > 0;
lambda = 0 is a rigid motion.

F is a combination of cos and sin of ``(lambda + 1) theta`` and ``(lambda - 1) theta``;
two conditions on each edge give a 4 x 4 determinant, and that a scalar equation for
each pair of edges. With k = (1 - nu)/(3 + nu) and C clamped, S simply supported,
F free, G guided (slope held, deflection free, no effective shear: a line of symmetry):

    C-C   sin(lambda alpha) = +-lambda sin(alpha)
    F-F   sin(lambda alpha) = +-k lambda sin(alpha)
    C-S   sin(2 lambda alpha) = lambda sin(2 alpha)
    C-G   sin(2 lambda alpha) = -lambda sin(2 alpha)
    S-F   sin(2 lambda alpha) = -k lambda sin(2 alpha)
    F-G   sin(2 lambda alpha) = k lambda sin(2 alpha)
    C-F   sin(lambda alpha)**2 = 4/((3 + nu)(1 - nu)) - k lambda**2 sin(alpha)**2
    S-S, G-G   cos(2 lambda alpha) = cos(2 alpha)
    S-G   cos(2 lambda alpha) = -cos(2 alpha)

Not counted: lambda = 1 in C-S, in S-S and with the plus sign in C-C, where the four
functions depend on each other (a field belongs to it only where the root is double);
and lambda = 1 of the determinant of F-F and F-G, absent above: a constant curvature
that needs a force at the corner.

Source: M. L. Williams, "Surface stress singularities resulting from various boundary
conditions in angular corners of plates under bending", Proc. First U.S. National
Congress of Applied Mechanics, 1952 (from memory). The equations do not rest on it: the
tests check each against the determinant.
"""

import cmath
import functools
import math
from collections.abc import Callable, Sequence

import numpy as np

from kplate.errors import InputError

UNBOUNDED = 0.02
"""A corner counts as unbounded where 1 - Re lambda exceeds this.

Wide enough that a rectangle drawn at 90.01 degrees keeps its corners.
"""

# Exponents below this are rigid motions: angles are known to some 1e-12 rad.
_RIGID = 1e-9

# Where sin(z)/z is stationary, tan z = z. Its real roots lie on the pieces between.
_TURNS = (0.0, 4.493409457909064, 7.725251836937707)

# From the start in `_sine_root` four steps reach round-off for all -1 < q < 1.
_NEWTON_STEPS = 6

# cos(y) to round-off for abs(y) <= 6 takes 20 powers of y**2.
_RADIUS, _POWERS = 6.0, 20


@functools.lru_cache(maxsize=1024)
def exponent(angle: float, edges: tuple[str, str], nu: float) -> complex:
    """Leading corner exponent.

    Parameters
    ----------
    angle : float
        Interior angle of the corner in rad, above 0 and at most 2 pi; pi is a change of
        support on a straight side, 2 pi a slit.
    edges : tuple of two str
        How the two edges are held, in any order: "clamped", "simply supported", "free"
        or "guided".
    nu : float
        Poisson's ratio, from 0 to 0.5.

    Returns
    -------
    complex
        The exponent lambda of smallest positive real part, imaginary part not negative;
        moments behave as ``r**(lambda - 1)``. It has no upper limit: moments vanish at
        a corner with Re lambda > 1, the faster the sharper it is.

    Raises
    ------
    InputError
        If the angle, a word or Poisson's ratio is outside what is listed above.

    Notes
    -----
    The angle is taken as it stands: simply supported edges 0.01 degrees from straight
    have an exponent near 0. Whether a vertex is a corner or a bend of a curve is
    decided where supports meet the outline.

    A larger angle is not always worse: between simply supported edges lambda falls to 0
    towards 180 degrees, is 1 there, and is 0.2 at 225 and 1/3 at 270 degrees.

    References
    ----------
    .. [1] M. L. Williams, "Surface stress singularities resulting from various boundary
       conditions in angular corners of plates under bending", Proc. First U.S. National
       Congress of Applied Mechanics, 1952 (from memory).

    Examples
    --------
    A re-entrant corner between clamped edges:

    >>> round(exponent(1.5 * math.pi, ("clamped", "clamped"), 0.3).real, 4)
    0.5445
    """
    _check(angle, edges, nu)
    return complex(_LEADING[frozenset(edges)](angle, nu))


def is_unbounded(angle: float, edges: tuple[str, str], nu: float) -> bool:
    """Whether the moments have no finite value at a corner.

    Parameters
    ----------
    angle : float
        Interior angle in rad, above 0 and at most 2 pi.
    edges : tuple of two str
        How the two edges are held, as for `exponent`.
    nu : float
        Poisson's ratio, from 0 to 0.5.

    Returns
    -------
    bool
        True where 1 - Re lambda exceeds `UNBOUNDED`.

    Raises
    ------
    InputError
        As `exponent`.
    """
    return 1.0 - exponent(angle, edges, nu).real > UNBOUNDED


def _check(angle: float, edges: tuple[str, str], nu: float) -> None:
    if not 0.0 < angle <= 2.0 * math.pi:
        raise InputError(
            f"corner angle {angle:.6g} rad ({math.degrees(angle):.6g} degrees) is out "
            "of range; it must be above 0 and at most 2 pi rad (360 degrees). "
            "Give the angle inside the plate, in rad."
        )
    if len(edges) != 2:
        raise InputError(
            f"a corner has two edges, not {len(edges)}; give how the arriving and the "
            "leaving edge are held."
        )
    for word in edges:
        if word not in _WORDS:
            raise InputError(
                f"unknown edge condition {word!r} at a corner; the conditions are "
                f"{', '.join(_WORDS)}. Use one of these words."
            )
    if not 0.0 <= nu <= 0.5:
        raise InputError(
            f"nu = {nu:g} at a corner; Poisson's ratio must lie between 0 and 0.5."
        )


def _sine(z: float, factor: float) -> complex:
    """Exponent from sin(lambda z) = factor lambda sin(z)."""
    return _sine_root(factor * _sinc(z)) / z


def _sine_root(q: float, piece: int = 0) -> complex:
    """Root of sin z = q z on the piece of sin(z)/z that ends at a turn, -1 < q < 1.

    Beyond the value at the turn the root has left the real axis there.
    """
    low, turn = _TURNS[piece : piece + 2]
    ratio = q / _sinc(turn)
    if ratio <= 1.0:
        return complex(_crossing(lambda z: _sinc(z) - q, low, turn))
    z = complex(turn, math.acosh(ratio))
    for _ in range(_NEWTON_STEPS):
        z -= (cmath.sin(z) - q * z) / (cmath.cos(z) - q)
    return z


def _crossing(f: Callable[[float], float], low: float, high: float) -> float:
    """Zero of a monotone function, by halving down to neighbouring floats."""
    rising = f(high) > f(low)
    while low < (middle := 0.5 * (low + high)) < high:
        if (f(middle) > 0.0) == rising:
            high = middle
        else:
            low = middle
    return high


def _sinc(z: float) -> float:
    return math.sin(z) / z if z else 1.0


def _ratio(nu: float) -> float:
    """Return k of the module's equations."""
    return (1.0 - nu) / (3.0 + nu)


def _clamped_supported(angle: float) -> complex:
    """C-S: the root beside lambda = 1, which lies on the first piece or the second."""
    z = 2.0 * angle
    return _sine_root(_sinc(z), piece=1 if z < _TURNS[1] else 0) / z


def _clamped_free(angle: float, nu: float) -> complex:
    """C-F, with y = 2 lambda alpha: cos y = 1 - 2 a + b y**2 / 2.

    A power series in y**2: its companion matrix gives all roots near 0, to 1e-11
    (1e-7 where two roots meet).
    """
    a = 4.0 / ((3.0 + nu) * (1.0 - nu))
    b = _ratio(nu) * _sinc(angle) ** 2
    series = [(-(_RADIUS**2)) ** n / math.factorial(2 * n) for n in range(_POWERS + 1)]
    series[0] -= 1.0 - 2.0 * a
    series[1] -= 0.5 * b * _RADIUS**2
    squares = np.polynomial.polynomial.polyroots(series)
    roots = _RADIUS * np.sqrt(squares[np.abs(squares) <= 1.0].astype(complex))
    leading = roots[np.argmin(roots.real)] / (2.0 * angle)
    return complex(leading.real, abs(leading.imag))


def _harmonic(order: float, multiples: Sequence[float]) -> float:
    """Exponent from r**m and r**(2 - m) times cos or sin of m theta."""
    return min(x for i in multiples if (x := abs(i * order - 1.0)) > _RIGID)


_WORDS = ("clamped", "free", "guided", "simply supported")
_C, _F, _G, _S = _WORDS

# The root of sin z = q z falls as q grows, so of two signs the one with the larger q
# leads; but where that is the plus sign of C-C the root is lambda = 1, the next far up.
_LEADING: dict[frozenset[str], Callable[[float, float], complex]] = {
    frozenset((_C, _C)): lambda angle, _: _sine(angle, -1.0),
    frozenset((_C, _F)): _clamped_free,
    frozenset((_C, _G)): lambda angle, _: _sine(2.0 * angle, -1.0),
    frozenset((_C, _S)): lambda angle, _: _clamped_supported(angle),
    frozenset((_F, _F)): lambda angle, nu: _sine(
        angle, math.copysign(_ratio(nu), math.sin(angle))
    ),
    frozenset((_F, _G)): lambda angle, nu: _sine(2.0 * angle, _ratio(nu)),
    frozenset((_F, _S)): lambda angle, nu: _sine(2.0 * angle, -_ratio(nu)),
    frozenset((_G, _G)): lambda angle, _: _harmonic(math.pi / angle, (0, 1, 2)),
    frozenset((_G, _S)): lambda angle, _: _harmonic(math.pi / angle, (0.5, 1.5)),
    frozenset((_S, _S)): lambda angle, _: _harmonic(math.pi / angle, (1, 2)),
}
