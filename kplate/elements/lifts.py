"""What is taken off a polynomial so that it vanishes along a held arc.

A polynomial w cannot be zero along an arc. On the true triangle of `kplate.elements.
arcs`, with t along the rays from the apex and s along the arc, the *lift*

    z = h(t) (e0(s) + (t - 1) e1(s)),   h = t^4 (1 + 4 (1 - t)),

has on the arc (t = 1, where h = 1 and dh/dt = 0) the value e0 and the derivative e1
along the ray, and vanishes with its slopes on the two rays that are the triangle's
straight edges, if e0, de0/ds, e1, de1/ds vanish at the ends of the arc. With e0 the
value of w on the arc, and where the slope is held e1 its derivative along the ray,
w - z is held exactly and still C1. For w held at the ends of the arc as the support
asks, the conditions there are met: w, its slope along the arc, and on a clamped arc all
slopes and their derivatives along it vanish.

Of any w, held or not, the affine function with the same values at the ends of the arc
and the same difference of slopes along it is taken off before: it is nothing for held
ones, and leaves rigid motions as they are.

Axes: m triangles, q points, k ordinates, d unknowns.
"""

import numpy as np

from kplate.arrays import Floats, Ints
from kplate.elements import bernstein
from kplate.elements.arcs import Arcs

_COUNT = 18  # Chebyshev points on an arc; on 60 degrees their error is round-off
_NEAR = 1e-6  # share of a ray below which the lift, t^4, is nothing


def lift(
    arcs: Arcs, degree: int, C: Floats, barycentrics: Floats, order: int, ends: Ints
) -> Floats:
    """Rows of the lift of each unknown at points (m, q, 3) of held triangles.

    Parameters
    ----------
    arcs : Arcs
        All of them held.
    degree : int
        Of the polynomials.
    C : ndarray, shape (m, k, d)
        Ordinates of each unknown.
    barycentrics : ndarray, shape (m, q, 3)
        The points.
    order : int
        1 for w and its slopes, 2 for curvatures ``w,xx, w,yy, 2 w,xy``.
    ends : ndarray, shape (m, 2)
        Which vertices of the element the arcs begin and end at; its unknowns begin
        with w, w,x, w,y at each of the three, and end with one on each edge.

    Returns
    -------
    ndarray, shape (m, q, 3, d)
    """
    t, s = arcs.cone(barycentrics)
    near = t < _NEAR
    t = np.where(near, 1.0, t)
    on_arc = _on_arc(arcs, degree, C, ends)
    (a, a1, a2), (b, b1, b2) = (_interpolated(e, s) for e in on_arc)
    h = t**4 * (5.0 - 4.0 * t)
    h1 = 20.0 * t**3 * (1.0 - t)
    h2 = 60.0 * t**2 - 80.0 * t**3
    k, k1, k2 = h * (t - 1.0), h1 * (t - 1.0) + h, h2 * (t - 1.0) + 2.0 * h1
    z = _sum(a, h, b, k)
    by_t, by_s = _sum(a, h1, b, k1), _sum(a1, h, b1, k)
    arc, step, bow = arcs.at(s)
    ray = arc - arcs.corners[0][:, None]
    jacobian = np.stack([ray, t[..., None] * step], axis=-1)  # dx/d(t, s)
    inverse = np.linalg.inv(jacobian)
    slopes = np.einsum("mqic,mqid->mqcd", inverse, np.stack([by_t, by_s], axis=2))
    if order == 1:
        rows = np.concatenate([z[:, :, None], slopes], axis=2)
    else:
        second = np.empty((*t.shape, 2, 2, z.shape[-1]))
        second[:, :, 0, 0] = _sum(a, h2, b, k2)
        mixed = _sum(a1, h1, b1, k1) - np.einsum("mqcd,mqc->mqd", slopes, step)
        second[:, :, 0, 1] = second[:, :, 1, 0] = mixed
        second[:, :, 1, 1] = _sum(a2, h, b2, k) - np.einsum(
            "mqcd,mqc->mqd", slopes, t[..., None] * bow
        )
        turned = np.einsum(
            "mqia,mqijd,mqjb->mqabd", inverse, second, inverse, optimize=True
        )
        rows = np.stack(
            [turned[:, :, 0, 0], turned[:, :, 1, 1], 2.0 * turned[:, :, 0, 1]], axis=2
        )
    return np.where(near[..., None, None], 0.0, rows)


def _sum(a: Floats, h: Floats, b: Floats, k: Floats) -> Floats:
    return a * h[..., None] + b * k[..., None]


def _on_arc(arcs: Arcs, degree: int, C: Floats, ends: Ints) -> tuple[Floats, Floats]:
    """e0 and e1 of each unknown at the Chebyshev points, (m, n, d)."""
    s = 0.5 * (1.0 - np.cos(np.pi * np.arange(_COUNT) / (_COUNT - 1)))
    arc, _, _ = arcs.at(s)
    at = arcs.barycentrics(arc)
    constant, slope = _affine(arcs, C.shape[-1], ends)
    middle = arcs.chords[0]
    away = arc - middle[:, None]
    value = bernstein.values(degree, at) @ C
    value = value - constant[:, None] - away @ slope
    by = bernstein.gradients(degree, at) @ C[:, None]  # (m, n, 3, d)
    slopes = np.einsum("mvc,mnvd->mncd", arcs.gradients, by) - slope[:, None]
    ray = arc - arcs.corners[0][:, None]
    along = np.einsum("mnc,mncd->mnd", ray, slopes)
    return (
        value * arcs.holds[:, None, None],
        along * arcs.clamps[:, None, None],
    )


def _affine(arcs: Arcs, count: int, ends: Ints) -> tuple[Floats, Floats]:
    """Value in the middle of the chord, and slopes, of the affine part.

    Rows (m, d) and (m, 2, d) of the unknowns.
    """
    m = len(arcs)
    _, start, end = arcs.corners
    _, tangent, normal = arcs.chords
    length = np.hypot(*(end - start).T)
    value, slopes = np.zeros((m, count)), np.zeros((m, 2, count))
    along, across = np.zeros((m, count)), np.zeros((m, count))
    per_vertex = (count - 3) // 3
    number = np.arange(m)
    directions, _ = arcs.frames(np.array([0.0, 1.0]))
    half = 2.0 * np.sin(0.5 * arcs.turn)
    for end_of, sign in ((0, 1.0), (1, -1.0)):
        first = per_vertex * ends[:, end_of]
        value[number, first] = 0.5
        along[number, first] = -sign / length
        for c in (0, 1):
            across[number, first + 1 + c] = sign * directions[:, end_of, c] / half
    slopes += (
        tangent[:, :, None] * along[:, None] + normal[:, :, None] * across[:, None]
    )
    return value, slopes


def _interpolated(ends: Floats, s: Floats) -> tuple[Floats, Floats, Floats]:
    """The polynomial through Chebyshev values (m, n, d), and derivatives, at (m, q)."""
    nodes = -np.cos(np.pi * np.arange(_COUNT) / (_COUNT - 1))
    chebyshev = np.polynomial.chebyshev
    net = np.linalg.solve(chebyshev.chebvander(nodes, _COUNT - 1), ends)
    x = 2.0 * s - 1.0
    found = []
    for derivative in range(3):
        table = chebyshev.chebder(np.eye(_COUNT), derivative, scl=2.0)
        rows = chebyshev.chebvander(x, len(table) - 1) @ table
        found.append(rows @ net)
    return found[0], found[1], found[2]
