"""Numbers that a band can be asked for.

Each is a linear functional of the deflection. Those at a point inside need the mesh to
have a vertex there (deflections) or a disc around it that is free of supports, loads on
lines and steps (moments, shears, slopes), those on a round rim a ring around the rim.
"""

from dataclasses import dataclass
from typing import Literal

Component = Literal["m_xx", "m_yy", "m_xy"]
Place = tuple[float, float]


@dataclass(frozen=True, kw_only=True)
class Deflection:
    """The deflection w in m at a place.

    Parameters
    ----------
    at : tuple of float
        The place in m, on the plate.
    """

    at: Place


@dataclass(frozen=True, kw_only=True)
class MeanDeflection:
    """The mean deflection in m of a zone, or of the whole plate.

    Parameters
    ----------
    zone : str, optional
        Name of the zone; the whole plate if left out.
    """

    zone: str | None = None


@dataclass(frozen=True, kw_only=True)
class Slope:
    """The slope of w at a place in a direction.

    Parameters
    ----------
    at : tuple of float
        The place in m, inside the plate.
    direction : tuple of float
        A unit vector.
    """

    at: Place
    direction: Place


@dataclass(frozen=True, kw_only=True)
class Moment:
    """A moment in N at a place inside.

    Parameters
    ----------
    at : tuple of float
        The place in m, inside the plate.
    component : {"m_xx", "m_yy", "m_xy"}
        Which.
    """

    at: Place
    component: Component


@dataclass(frozen=True, kw_only=True)
class Shear:
    """The transverse shear q in N/m at a place inside, on a face.

    Parameters
    ----------
    at : tuple of float
        The place in m, inside the plate.
    direction : tuple of float
        The face's normal, a unit vector.
    """

    at: Place
    direction: Place


@dataclass(frozen=True, kw_only=True)
class ClampingMoment:
    """The moment m_nn in N at a place on a straight clamped side.

    Parameters
    ----------
    at : tuple of float
        The place in m, on the side.
    """

    at: Place


@dataclass(frozen=True, kw_only=True)
class LineReaction:
    """The effective shear v_n in N/m on a straight simply supported side.

    Parameters
    ----------
    at : tuple of float
        The place in m, on the side.
    """

    at: Place


@dataclass(frozen=True, kw_only=True)
class RimMoment:
    """The moment in N along the rim at a place of a free side that is a whole circle.

    It is m_tt, t along the rim of the round hole or disc; m_nn is zero there.

    Parameters
    ----------
    at : tuple of float
        The place in m, on the rim.
    """

    at: Place


@dataclass(frozen=True, kw_only=True)
class Resultant:
    """The force in N, positive up, that a side, seam or mark brings.

    Of a side with its corner forces where no other support meets it, without them
    elsewhere.

    Parameters
    ----------
    of : str
        Name of the side, seam or mark.
    """

    of: str


@dataclass(frozen=True, kw_only=True)
class Peak:
    """The extreme value of a quantity over the plate.

    Parameters
    ----------
    quantity : str
        One of those of `Solution.peak`.
    """

    quantity: str


Goal = (
    Deflection
    | MeanDeflection
    | Slope
    | Moment
    | Shear
    | ClampingMoment
    | LineReaction
    | RimMoment
    | Resultant
    | Peak
)
