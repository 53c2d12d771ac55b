"""What presses on a plate, and the cases in which it does.

Pressures and forces are positive along +z, up out of the plate. Positions are in the
plate's own x, y in m.
"""

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

from kplate.arrays import Floats
from kplate.errors import InputError

STANDARD_GRAVITY = 9.80665  # m/s2, ISO 80000-3 (from memory)


@dataclass(frozen=True)
class Pressure:
    """The same pressure all over the plate or one of its zones.

    Parameters
    ----------
    value : float
        Pressure in Pa, positive up.
    zone : str, optional
        The zone it acts on; the whole plate if left out.
    """

    value: float
    zone: str | None = None

    def __post_init__(self) -> None:
        """Check the number."""
        _check_finite("pressure", self.value)


@dataclass(frozen=True, kw_only=True)
class Hydrostatic:
    """A liquid standing against the plate up to a level, nothing above it.

    The pressure is ``specific_weight`` times the depth ``level - up . (x, y)``.

    Parameters
    ----------
    level : float
        Where the surface is, measured from the origin along `up`, in m.
    specific_weight : float
        Weight of the liquid per volume in N/m3, positive where it pushes up (+z).
    up : tuple of float
        The direction in the plate's plane that points out of the liquid; its length
        does not matter. A panel that stands on its south side has (0, 1).

    Raises
    ------
    InputError
        If a number is not finite, or the direction has no length.
    """

    level: float
    specific_weight: float
    up: tuple[float, float] = (0.0, 1.0)

    def __post_init__(self) -> None:
        """Check the numbers."""
        _check_finite("level of a liquid", self.level)
        _check_finite("specific weight of a liquid", self.specific_weight)
        _check_finite("up direction of a liquid", *self.up)
        if math.hypot(*self.up) == 0.0:
            raise InputError(
                "the up direction of a liquid is (0, 0); give a direction."
            )


@dataclass(frozen=True)
class PressureField:
    """A pressure that varies over the plate.

    Parameters
    ----------
    function : callable
        Takes arrays x, y of one shape in m and returns the pressure in Pa, positive
        up, of the same shape.
    """

    function: Callable[[Floats, Floats], Floats]


@dataclass(frozen=True, kw_only=True)
class RectanglePatch:
    """A force spread evenly over a rectangle: a wheel, a foot, a pallet.

    Parameters
    ----------
    force : float
        Total force in N, positive up.
    centre : tuple of float
        Centre of the rectangle in m.
    size : tuple of float
        Its two lengths in m.
    angle : float
        By how much the first length is turned from the x axis, in rad.
    """

    force: float
    centre: tuple[float, float]
    size: tuple[float, float]
    angle: float = 0.0

    def __post_init__(self) -> None:
        """Check the numbers."""
        _check_finite("force of a patch", self.force)
        _check_finite("centre of a patch", *self.centre)
        _check_finite("angle of a patch", self.angle)
        _check_positive("size of a patch", *self.size)

    @property
    def corners(self) -> list[tuple[float, float]]:
        """Its four corners, counter-clockwise, in m."""
        c, s = math.cos(self.angle), math.sin(self.angle)
        corners = []
        for a, b in ((-0.5, -0.5), (0.5, -0.5), (0.5, 0.5), (-0.5, 0.5)):
            u, v = a * self.size[0], b * self.size[1]
            corners.append(
                (self.centre[0] + c * u - s * v, self.centre[1] + s * u + c * v)
            )
        return corners


@dataclass(frozen=True, kw_only=True)
class DiscPatch:
    """A force spread evenly over a disc.

    Parameters
    ----------
    force : float
        Total force in N, positive up.
    centre : tuple of float
        Centre of the disc in m.
    radius : float
        Its radius in m.
    """

    force: float
    centre: tuple[float, float]
    radius: float

    def __post_init__(self) -> None:
        """Check the numbers."""
        _check_finite("force of a patch", self.force)
        _check_finite("centre of a patch", *self.centre)
        _check_positive("radius of a patch", self.radius)


@dataclass(frozen=True, kw_only=True)
class PointForce:
    """A force at one point.

    Moments under it have no finite value: the surroundings (radius: the plate's
    thickness) are left out of peaks. A patch of the real size is nearly always better.

    Parameters
    ----------
    force : float
        Force in N, positive up.
    at : tuple of float
        Where, in m.
    """

    force: float
    at: tuple[float, float]

    def __post_init__(self) -> None:
        """Check the numbers."""
        _check_finite("force", self.force)
        _check_finite("place of a force", *self.at)


@dataclass(frozen=True, kw_only=True)
class SelfWeight:
    """The plate's own weight.

    Parameters
    ----------
    acceleration : float
        Acceleration of gravity along z in m/s2; negative, down, for a plate that lies
        face up.
    """

    acceleration: float = -STANDARD_GRAVITY

    def __post_init__(self) -> None:
        """Check the number."""
        _check_finite("acceleration of gravity", self.acceleration)


@dataclass(frozen=True, kw_only=True)
class PointMoment:
    """A couple at one point.

    Moments at it have no finite value: the surroundings are left out of peaks.

    Parameters
    ----------
    moment : tuple of float
        Its components about the x and y axes in N m, right-handed.
    at : tuple of float
        Where, in m.
    """

    moment: tuple[float, float]
    at: tuple[float, float]

    def __post_init__(self) -> None:
        """Check the numbers."""
        _check_finite("couple", *self.moment)
        _check_finite("place of a couple", *self.at)


@dataclass(frozen=True, kw_only=True)
class LineForce:
    """A force spread evenly along a side or a seam.

    Parameters
    ----------
    force : float
        Force per length in N/m, positive up.
    along : str
        Name of the side or seam.
    """

    force: float
    along: str

    def __post_init__(self) -> None:
        """Check the number."""
        _check_finite("line force", self.force)


@dataclass(frozen=True, kw_only=True)
class EdgeMoment:
    """A moment applied evenly along a side.

    Parameters
    ----------
    moment : float
        m_nn per unit length in N, positive where it compresses the top face.
    along : str
        Name of the side.
    """

    moment: float
    along: str

    def __post_init__(self) -> None:
        """Check the number."""
        _check_finite("edge moment", self.moment)


Load = (
    Pressure
    | Hydrostatic
    | PressureField
    | RectanglePatch
    | DiscPatch
    | PointForce
    | PointMoment
    | LineForce
    | EdgeMoment
    | SelfWeight
)


@dataclass(frozen=True, kw_only=True)
class Case:
    """Loads that act together.

    Parameters
    ----------
    name : str
        How the case is called in tables.
    loads : sequence of loads
        At least one.
    reverses : bool, optional
        Whether they act the other way too, as wind does, so that the case is judged
        with both signs.

    Raises
    ------
    InputError
        If the case has no name or no loads.
    """

    name: str
    loads: Sequence[Load] = field(default=())
    reverses: bool = False

    def __post_init__(self) -> None:
        """Check that there is something to carry."""
        object.__setattr__(self, "loads", tuple(self.loads))
        if not self.name:
            raise InputError("a load case has no name; give it one.")
        if not self.loads:
            raise InputError(f"case {self.name!r} has no loads; give at least one.")
        for load in self.loads:
            if not isinstance(load, Load):
                raise InputError(
                    f"case {self.name!r} holds {load!r}, which is not a load; use "
                    "Pressure, Hydrostatic, PressureField, RectanglePatch, DiscPatch, "
                    "PointForce, PointMoment, LineForce, EdgeMoment or SelfWeight."
                )


def _check_finite(what: str, *numbers: float) -> None:
    if not all(math.isfinite(number) for number in numbers):
        shown = ", ".join(f"{number:g}" for number in numbers)
        raise InputError(f"the {what} is {shown}; it must be finite.")


def _check_positive(what: str, *numbers: float) -> None:
    _check_finite(what, *numbers)
    if min(numbers) <= 0.0:
        shown = " x ".join(f"{number:g}" for number in numbers)
        raise InputError(f"the {what} is {shown} m; it must be positive.")
