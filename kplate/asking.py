"""Values where somebody wants them: at points, and at stations along a line.

What is a linear functional of the deflection can be given to the solver as a goal, so
that it has a band; criteria are read off the fields, without one.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from kplate.arrays import Floats
from kplate.errors import InputError
from kplate.goals import Deflection, Goal, Moment, Place, Shear, Slope
from kplate.peaks import Candidates, local
from kplate.singular import shear_places
from kplate.solution import Solution
from kplate.values import Value

# What can be asked for at a point, and what it is measured in.
ASKED = {
    "deflection": "m",
    "slope_x": "rad",
    "slope_y": "rad",
    "m_xx": "N",
    "m_yy": "N",
    "m_xy": "N",
    "q_x": "N/m",
    "q_y": "N/m",
    "von Mises": "Pa",
    "Tresca": "Pa",
    "largest principal": "Pa",
    "smallest principal": "Pa",
    "shear stress": "Pa",
}
_AXES: dict[str, Place] = {"x": (1.0, 0.0), "y": (0.0, 1.0)}
MOST_STATIONS = 1000


@dataclass(frozen=True, kw_only=True)
class Ask:
    """Points at which values are wanted.

    Parameters
    ----------
    name : str
        How it is called in tables.
    values : tuple of str
        Quantities wanted, keys of `ASKED`.
    places : tuple of (float, float)
        One point in m, or the two ends of a straight line.
    stations : int, optional
        Of a line: how many points, its ends included.

    Raises
    ------
    InputError
        If there is no name, no such quantity, or the places are neither.
    """

    name: str
    values: tuple[str, ...]
    places: tuple[Place, ...]
    stations: int = 21

    def __post_init__(self) -> None:
        """Check what is wanted."""
        object.__setattr__(self, "values", tuple(self.values))
        object.__setattr__(self, "places", tuple(self.places))
        if not self.name:
            raise InputError("a point or line asked for has no name; give it one.")
        for quantity in self.values:
            if quantity not in ASKED:
                raise InputError(
                    f"{self.name}: there is no value {quantity!r}; the values are "
                    f"{', '.join(ASKED)}."
                )
        if not self.values:
            raise InputError(f"{self.name}: no values are asked for; name some.")
        if len(self.places) not in (1, 2) or len(set(self.places)) < len(self.places):
            raise InputError(
                f"{self.name}: give one place, or two different ends of a line."
            )
        if self.is_line and not 2 <= self.stations <= MOST_STATIONS:
            raise InputError(
                f"{self.name}: stations = {self.stations}; a line has 2 to "
                f"{MOST_STATIONS}."
            )

    @property
    def is_line(self) -> bool:
        """Whether it is a line, not a point."""
        return len(self.places) == 2

    @property
    def points(self) -> Floats:
        """The points in m, (k, 2)."""
        if not self.is_line:
            return np.array(self.places)
        start, end = np.array(self.places)
        share = np.linspace(0.0, 1.0, self.stations)[:, None]
        points: Floats = start + share * (end - start)
        return points

    @property
    def distance(self) -> Floats:
        """Distance of the points from the first in m, (k,)."""
        away: Floats = np.hypot(*(self.points - self.points[0]).T)
        return away

    @property
    def goals(self) -> tuple[Goal, ...]:
        """Goals that give a point's values bands; a line has none."""
        if self.is_line:
            return ()
        found = [goal_of(quantity, self.places[0]) for quantity in self.values]
        return tuple(goal for goal in found if goal is not None)


def goal_of(quantity: str, place: Place) -> Goal | None:
    """The goal that a quantity at a place is, if it is one."""
    match quantity:
        case "deflection":
            return Deflection(at=place)
        case "m_xx" | "m_yy" | "m_xy":
            return Moment(at=place, component=quantity)
        case "slope_x" | "slope_y":
            return Slope(at=place, direction=_AXES[quantity[-1]])
        case "q_x" | "q_y":
            return Shear(at=place, direction=_AXES[quantity[-1]])
    return None


def values_at(
    solution: Solution, quantity: str, points: ArrayLike, *, case: str | None = None
) -> Floats:
    """A quantity at points of a solved plate.

    Parameters
    ----------
    solution : Solution
        The plate.
    quantity : str
        A key of `ASKED`.
    points : array_like, shape (k, 2)
        Places in m.
    case : str, optional
        The load case; may be left out where there is only one.

    Returns
    -------
    ndarray, shape (k,)
        In SI units, with its sign; principal stresses are the extreme ones of both
        faces. Moments, shears and stresses are nan within the discs that are left out
        of peaks (`left_out`).

    Raises
    ------
    InputError
        If there is no such quantity or case, or a point is not on the plate.
    """
    if quantity not in ASKED:
        raise InputError(
            f"there is no value {quantity!r}; the values are {', '.join(ASKED)}."
        )
    if quantity == "deflection":
        return solution.deflection(points, case=case)
    axis = ("x", "y").index(quantity[-1]) if quantity[-1] in "xy" else 0
    if quantity.startswith("slope"):
        return solution.slopes(points, case=case)[:, axis]
    places = np.asarray(points, dtype=float)
    lost = [bool(left_out(solution, quantity, (x, y), case)) for x, y in places]
    if quantity in ("q_x", "q_y"):
        shears = solution.shears(points, case=case)[:, axis]
        return np.where(lost, np.nan, shears)
    triangles, _ = solution.mesh.locate(places)
    at = Candidates(
        places,
        solution.moments(places, case=case),
        solution.shears(places, case=case),
        solution.plate.thicknesses[solution.mesh.zones[triangles]],
        triangles,
    )
    return np.where(lost, np.nan, local(quantity, at))


def left_out(
    solution: Solution, quantity: str, place: Place, case: str | None = None
) -> str:
    """Why a quantity has no value to report at a place; empty where it has one."""
    if quantity in ("deflection", "slope_x", "slope_y"):
        return ""
    discs = [disc for disc in solution.excluded if disc.case in ("", case or disc.case)]
    if quantity in ("q_x", "q_y", "shear stress"):
        radius = solution.excluded_radius or solution.plate.thickness
        discs += shear_places(solution.plate, radius)
    for disc in discs:
        if math.dist(disc.place, place) < disc.radius * (1.0 - 1e-9):
            return f"no finite value: {disc.reason}"
    return ""


def asked_values(
    solution: Solution, ask: Ask, *, cases: Sequence[str] | None = None
) -> dict[tuple[str, str], Value]:
    """Values at a point that is asked for, by quantity and case.

    Each has the band of its goal where the plate was solved to a tolerance with it;
    others have none, and say why where the goal has a reason.
    """
    found = {}
    for case in solution.cases if cases is None else cases:
        for quantity in ask.values:
            goal = goal_of(quantity, ask.places[0])
            known = None if goal is None else solution.known.get((goal, case))
            if known is None or known.kind == "none":
                value = values_at(solution, quantity, ask.points[:1], case=case)
                reason = left_out(solution, quantity, ask.places[0], case)
                if known is not None and not reason:
                    reason = f"no band: {known.reason}"
                known = Value(
                    value=float(value[0]), place=ask.places[0], case=case, reason=reason
                )
            found[quantity, case] = known
    return found
