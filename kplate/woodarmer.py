"""Design moments of reinforced plates with bars along x and y, by Wood and Armer.

A bottom layer of bars takes moments that compress the top face (positive in kplate), a
top layer those that compress the bottom face. Bars along x that resist a moment m_x per
unit width and bars along y that resist m_y resist

    m_x c^2 + m_y s^2     on a face whose normal is at an angle theta from x,

with c = cos theta, s = sin theta; the plate's own moment there is

    m_nn = m_xx c^2 + m_yy s^2 + 2 m_xy c s.

The design moments of a layer are those of the least sum m_x + m_y, neither of them
negative, that are nowhere exceeded:

    m_x = m_xx + |m_xy|,   m_y = m_yy + |m_xy|,

or, where the one along x would be negative,

    m_x = 0,   m_y = m_yy + m_xy^2 / |m_xx|   (0 if that is negative, too),

and likewise with x and y exchanged. For the top layer m is turned to -m. Moments are
the same for any reinforcement; bars at other angles are not treated here.

Source: R. H. Wood, "The reinforcement of slabs in accordance with a pre-determined
field of moments", Concrete 2 (1968) 69-76, and G. S. T. Armer's discussion of it,
Concrete 2 (1968) 319-320 (both from memory). Safety and least sum are tested here on
random moments.
"""

import numpy as np
from numpy.typing import ArrayLike

from kplate.arrays import Floats
from kplate.errors import InputError

# The four design moments in the order of the last axis.
DESIGN = ("design bottom x", "design bottom y", "design top x", "design top y")


def design_moments(moments: ArrayLike) -> Floats:
    """Design moments of bars along x and y, in a bottom and a top layer.

    Parameters
    ----------
    moments : array_like, shape (..., 3)
        Moments ``m_xx, m_yy, m_xy`` per unit width in N, positive where they compress
        the top face.

    Returns
    -------
    ndarray, shape (..., 4)
        Moments per unit width in N that must be resisted by the bars at the bottom
        along x and along y, and by those at the top along x and along y; 0 or more.

    Raises
    ------
    InputError
        If the last axis does not have length 3.

    Examples
    --------
    Pure twist needs bars in both layers and both directions:

    >>> design_moments([0.0, 0.0, 50.0])
    array([50., 50., 50., 50.])
    """
    m = np.asarray(moments, dtype=float)
    if m.shape[-1:] != (3,):
        raise InputError(
            f"moments has shape {m.shape}; its last axis must hold m_xx, m_yy, m_xy."
        )
    return np.concatenate([_layer(m), _layer(-m)], axis=-1)


def largest_change(difference: Floats) -> Floats:
    """How far design moments can move where moments move by a difference (k, 3), (k,).

    No derivative of a design moment by m_xx or m_yy exceeds 1, none by m_xy exceeds 2.
    """
    xx, yy, xy = np.abs(difference).T
    most: Floats = xx + yy + 2.0 * xy
    return most


def _layer(m: Floats) -> Floats:
    """Design moments (..., 2) of the layer that takes positive moments (..., 3)."""
    xx, yy, xy = np.moveaxis(m, -1, 0)
    twist = np.abs(xy)
    along_x, along_y = xx + twist, yy + twist
    # Where one is negative the other moment is beyond the twist, so that the divisor
    # is larger than the twist; elsewhere it is not used.
    no_x, no_y = along_x < 0.0, along_y < 0.0
    only_y = yy + twist * (twist / np.where(no_x, -xx, 1.0))
    only_x = xx + twist * (twist / np.where(no_y, -yy, 1.0))
    x = np.where(no_x, 0.0, np.where(no_y, only_x, along_x))
    y = np.where(no_y, 0.0, np.where(no_x, only_y, along_y))
    return np.maximum(np.stack([x, y], axis=-1), 0.0)
