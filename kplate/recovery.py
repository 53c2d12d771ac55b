"""Moments, shears and stresses from unknowns.

The curvature of an element of low degree jumps from triangle to triangle. At each vertex
a quadratic is fitted, by weighted least squares, to the moments of the triangles in two
layers around it; its value there is the *smoothed* moment and its gradient gives the
transverse shear. Between vertices both are interpolated linearly.

    q_x = -(m_xx,x + m_xy,y),   q_y = -(m_xy,x + m_yy,y)
    stress on a face = -+ 6 m / h^2, minus on top;   shear stress at mid-depth = 3 q / 2h

Source of the fit: O. C. Zienkiewicz and J. Z. Zhu, "The superconvergent patch recovery
and a posteriori error estimates. Part 1", Int. J. Numer. Meth. Engng 33 (1992) 1331-1364
(from memory); with two layers and a weight in place of one layer and superconvergent
points.
"""

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp
from numpy.typing import ArrayLike

from kplate.arrays import Floats, Ints
from kplate.errors import InputError
from kplate.mesh import Mesh
from kplate.quadrature import triangle_rule
from kplate.solve.static import StaticState
from kplate.values import Face

LAYERS = 2
# A quadratic has six coefficients; twice as many triangles make the fit a fit. Corners
# reach a layer further for them.
ENOUGH = 12
_SAMPLES = triangle_rule(2).points
_BLOCK = 2048  # vertices


@dataclass(frozen=True, eq=False, kw_only=True)
class SmoothedMoments:
    """Moments and transverse shears at the vertices.

    Parameters
    ----------
    moments : ndarray, shape (n_points, 3, c)
        m_xx, m_yy, m_xy in N of each case.
    shears : ndarray, shape (n_points, 2, c)
        q_x, q_y in N/m.
    """

    moments: Floats
    shears: Floats


def smoothed_moments(state: StaticState) -> SmoothedMoments:
    """Fit moments and shears at every vertex."""
    mesh, cases = state.mesh, len(state.cases)
    samples = element_moments(state, _SAMPLES)
    places = np.einsum("qv,nvc->nqc", _SAMPLES, mesh.points[mesh.triangles])
    patches, radius = _patches(mesh)
    fitted = np.empty((len(mesh.points), 3, 3, cases))  # value and gradient
    for start in range(0, len(mesh.points), _BLOCK):
        stop = min(start + _BLOCK, len(mesh.points))
        first, last = patches.indptr[start], patches.indptr[stop]
        triangles = patches.indices[first:last]
        pointers = patches.indptr[start:stop] - first
        owner = np.repeat(np.arange(start, stop), np.diff(patches.indptr[start : stop + 1]))
        arms = (places[triangles] - mesh.points[owner, None]) / radius[owner, None, None]
        coefficients = _fit(arms, samples[triangles], pointers)
        coefficients[:, 1:] /= radius[start:stop, None, None, None]
        fitted[start:stop] = coefficients
    by_x, by_y = fitted[:, 1], fitted[:, 2]
    shears = -np.stack([by_x[:, 0] + by_y[:, 2], by_x[:, 2] + by_y[:, 1]], axis=1)
    return SmoothedMoments(moments=fitted[:, 0], shears=shears)


def element_moments(state: StaticState, barycentrics: Floats) -> Floats:
    """Moments of the elements themselves at points (q, 3), (n_triangles, q, 3, c)."""
    mesh, table = state.mesh, state.constraints.numbering.table
    result = np.empty((len(mesh.triangles), len(barycentrics), 3, len(state.cases)))
    for start in range(0, len(mesh.triangles), _BLOCK):
        block = slice(start, start + _BLOCK)
        B = state.element.curvature(mesh.points[mesh.triangles[block]], barycentrics)
        n, q, _, d = B.shape
        strain = B.reshape(n, 3 * q, d) @ state.unknowns[table[block]]
        result[block] = state.plate.rigidity @ strain.reshape(n, q, 3, -1)
    return result


def principal_moments(moments: ArrayLike) -> tuple[Floats, Floats]:
    """Principal bending moments and their direction.

    Parameters
    ----------
    moments : array_like, shape (..., 3)
        Moments ``m_xx, m_yy, m_xy`` per unit width in N, positive when they compress
        the top face.

    Returns
    -------
    principal : ndarray, shape (..., 2)
        Larger and smaller principal moment in N, ``m_1 >= m_2``.
    angle : ndarray, shape (...)
        Angle from the x axis to the direction of ``m_1`` in rad, in [-pi/2, pi/2]; 0
        where ``m_1 = m_2``.

    Raises
    ------
    InputError
        If the last axis does not have length 3.

    References
    ----------
    .. [1] S. Timoshenko and S. Woinowsky-Krieger, "Theory of Plates and Shells", 2nd
       ed., McGraw-Hill, 1959, ch. 2 (from memory).

    Examples
    --------
    Pure twist bends the plate along its diagonals:

    >>> principal, angle = principal_moments([0.0, 0.0, 50.0])
    >>> principal
    array([ 50., -50.])
    """
    m = np.asarray(moments, dtype=float)
    if m.shape[-1:] != (3,):
        raise InputError(
            f"moments has shape {m.shape}; its last axis must hold m_xx, m_yy, m_xy."
        )
    m_xx, m_yy, m_xy = np.moveaxis(m, -1, 0)
    centre, half = 0.5 * (m_xx + m_yy), 0.5 * (m_xx - m_yy)
    radius = np.hypot(half, m_xy)
    principal = np.stack([centre + radius, centre - radius], axis=-1)
    return principal, 0.5 * np.arctan2(m_xy, half)


def surface_stress(moments: Floats, thickness: float, face: Face) -> Floats:
    """Bending stress on a face in Pa, tension positive, of moments (..., 3) in N.

    Raises
    ------
    InputError
        If the face is neither "top" nor "bottom".
    """
    if face not in ("top", "bottom"):
        raise InputError(f"there is no face {face!r}; the faces are top and bottom.")
    sign = -1.0 if face == "top" else 1.0
    return sign * 6.0 / thickness**2 * moments


def von_mises(stress: Floats) -> Floats:
    """Von Mises stress of plane stresses (..., 3) in Pa: the same on both faces."""
    xx, yy, xy = np.moveaxis(stress, -1, 0)
    return np.sqrt(xx**2 - xx * yy + yy**2 + 3.0 * xy**2)


def _patches(mesh: Mesh) -> tuple[sp.csr_array, Floats]:
    """Triangles around each vertex, and the radius in m their weight fades over."""
    n, m = len(mesh.points), len(mesh.triangles)
    ones = np.ones(3 * m)
    vertices, owner = mesh.triangles.ravel(), np.repeat(np.arange(m), 3)
    touch = sp.csr_array((ones, (vertices, owner)), shape=(n, m))
    near = touch @ touch.T
    patches = (near @ touch).tocsr()
    few = np.diff(patches.indptr) < ENOUGH
    if few.any():
        rows = np.flatnonzero(few)
        wider = near[rows] @ near @ touch
        select = sp.csr_array(
            (np.ones(rows.size), (rows, np.arange(rows.size))), shape=(n, rows.size)
        )
        patches = (patches + select @ wider).tocsr()
    patches.sort_indices()
    a, b = np.moveaxis(mesh.points[mesh.edges], 1, 0)
    lengths = np.hypot(*(b - a).T)
    ends = mesh.edges.ravel()
    mean = np.bincount(ends, np.repeat(lengths, 2), n) / np.bincount(ends, minlength=n)
    return patches, LAYERS * mean


def _fit(arms: Floats, samples: Floats, pointers: Ints) -> Floats:
    """Weighted quadratics at some vertices; value and gradient, (k, 3, 3, c).

    arms (pairs, q, 2) lead from the vertex to the samples (pairs, q, 3, c) of the pairs of
    a vertex and a triangle; those of vertex i begin at pointers[i].
    """
    x, y = arms[..., 0], arms[..., 1]
    p = np.stack([np.ones_like(x), x, y, x * x, x * y, y * y], axis=-1)
    weighted = p * np.exp(-0.5 * (x * x + y * y))[..., None]
    pairs, q, _, c = samples.shape
    normal = weighted.swapaxes(1, 2) @ p
    right = weighted.swapaxes(1, 2) @ samples.reshape(pairs, q, 3 * c)
    normal = np.add.reduceat(normal, pointers, axis=0)
    right = np.add.reduceat(right, pointers, axis=0)
    # A mesh of a few triangles may not determine a quadratic: take the smallest fit.
    inverse = np.linalg.pinv(normal, rcond=1e-10, hermitian=True)
    return (inverse @ right)[:, :3].reshape(len(pointers), 3, 3, c)
