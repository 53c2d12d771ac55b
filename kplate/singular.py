"""Corners of a plate, and the places where plate theory gives no finite answer.

They follow from the statement alone, before anything is meshed: corners by Williams's
exponent for their angle and the way their sides are held, changes of support along a
straight side, point supports, ends of supports inside, corners of a thickness step, and
point forces. Moments there have no value to report.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np
from numpy.typing import ArrayLike

from kplate import corners, curves
from kplate.arrays import Bools
from kplate.loads import (
    Case,
    DiscPatch,
    EdgeMoment,
    Load,
    PointForce,
    PointMoment,
    RectanglePatch,
)
from kplate.plate import Plate
from kplate.polygon import SNAP, Polygon
from kplate.supports import Support

Place = tuple[float, float]

# Curvatures that differ by less than this share of the larger are those of arcs that
# stand for a smooth curve.
JUMPS = 0.5
JUMP = "a simply supported side changes its curvature: its line reaction goes with 1/r"


@dataclass(frozen=True, kw_only=True)
class Corner:
    """A vertex of the outline that is a corner, or where the support changes.

    Parameters
    ----------
    place : tuple of float
        Where, in m.
    angle : float
        Angle in rad inside the plate.
    sides : tuple of str
        The side that arrives and the one that leaves, the plate on the left.
    supports : tuple of Support
        How those are held.
    exponent : complex
        Williams's exponent lambda: moments go with r^(lambda - 1).
    unbounded : bool
        Whether moments grow without bound towards it.
    """

    place: tuple[float, float]
    angle: float
    sides: tuple[str, str]
    supports: tuple[Support, Support]
    exponent: complex
    unbounded: bool

    @property
    def carries_force(self) -> bool:
        """Whether a corner force can arise: a held corner with no clamped side."""
        return any(s.holds_deflection for s in self.supports) and not any(
            s.holds_slope for s in self.supports
        )

    @property
    def shear_unbounded(self) -> bool:
        """Whether the effective shear grows without bound towards it.

        It goes with r^(lambda - 2). At lambda = 1 (a hinged right angle, a line of
        symmetry square to a clamped side) the field is a quadratic, without shear.
        """
        exponent = self.exponent.real
        quadratic = abs(exponent - 1.0) <= corners.UNBOUNDED
        return exponent < 2.0 - corners.UNBOUNDED and not quadratic

    @property
    def both_held(self) -> bool:
        """Whether both sides hold the deflection."""
        return all(s.holds_deflection for s in self.supports)

    @property
    def words(self) -> str:
        """What is special here, for a checker."""
        first, second = (s.name for s in self.supports)
        degrees = math.degrees(self.angle)
        if abs(degrees - 180.0) < 1e-6:
            what = f"support changes from {first} to {second}"
        else:
            what = f"corner of {degrees:.4g} degrees, {first} to {second}"
        if self.unbounded:
            what += f": moments go with r^{self.exponent.real - 1.0:.3f}"
        return what


@dataclass(frozen=True, kw_only=True)
class Excluded:
    """A disc left out of the peaks; its rim is included.

    Parameters
    ----------
    place : tuple of float
        Its centre in m.
    radius : float
        Its radius in m.
    reason : str
        Why.
    case : str
        The one load case it holds for, or "" for all.
    """

    place: tuple[float, float]
    radius: float
    reason: str
    case: str = ""


def shear_places(plate: Plate, radius: float) -> tuple[Excluded, ...]:
    """Places at which moments are finite and the effective shear is not.

    Corners, and where a simply supported side changes its curvature without a corner:
    w,tt along it is the curvature times the slope across, so that it jumps there, and
    v_n goes with 1/r.
    """
    found = [
        Excluded(place=corner.place, radius=radius, reason=corner.words)
        for corner in plate_corners(plate)
        if corner.shear_unbounded
    ]
    found += [
        Excluded(place=place, radius=radius, reason=JUMP)
        for line in plate.outline.boundaries
        for place in _curvature_jumps(plate, line)
    ]
    return tuple(found)


def _curvature_jumps(plate: Plate, line: Polygon) -> list[tuple[float, float]]:
    """Where simply supported pieces of different curvature meet without a corner."""
    curvatures = np.zeros(len(line.points))
    bent = line.bulges != 0.0
    curvatures[bent] = np.sign(line.bulges[bent]) / line.circles[bent, 2]
    found = []
    for i, side in enumerate(line.sides):
        both = (plate.support(line.sides[i - 1]), plate.support(side))
        hinged = all(own.holds_deflection and not own.holds_slope for own in both)
        a, b = curvatures[i - 1], curvatures[i]
        jumps = abs(a - b) > JUMPS * max(abs(a), abs(b))
        if hinged and jumps and abs(line.turns[i]) < plate.bend_turn:
            x, y = line.points[i].tolist()
            found.append((x, y))
    return found


def plate_corners(plate: Plate) -> tuple[Corner, ...]:
    """Corners and changes of support, rim first."""
    found: list[Corner] = []
    for number, line in enumerate(plate.outline.boundaries):
        found += _line_corners(plate, line, hole=number > 0)
    return tuple(found)


def excluded_places(
    plate: Plate, cases: Sequence[Case], radius: float | None = None
) -> tuple[Excluded, ...]:
    """Discs where moments have no finite value, left out of the peaks.

    Parameters
    ----------
    plate : Plate
        The statement.
    cases : sequence of Case
        Their point forces count.
    radius : float, optional
        Radius of the discs in m; the plate's thickness if left out.

    Returns
    -------
    tuple of Excluded
    """
    r = plate.thickness if radius is None else radius
    found = [
        Excluded(place=corner.place, radius=r, reason=corner.words)
        for corner in plate_corners(plate)
        if corner.unbounded
    ]
    inside = [*_held_inside(plate), *_steps(plate)]
    found += [Excluded(place=p, radius=r, reason=why) for p, why in inside]
    for case in cases:
        found += [
            Excluded(place=p, radius=r, reason="end of an edge moment", case=case.name)
            for p in moment_ends(plate, case)
        ]
        for load in case.loads:
            what, place = _concentrated(load, plate)
            if what:
                found.append(
                    Excluded(place=place, radius=r, reason=what, case=case.name)
                )
    return tuple(found)


def moment_ends(plate: Plate, case: Case) -> list[Place]:
    """Places where an applied edge moment begins or ends.

    Around such a place m_xy grows with the logarithm of the distance, unless the side
    goes on with the same moment, or two free sides meet at a corner.
    """
    applied: dict[str, float] = {}
    for load in case.loads:
        if isinstance(load, EdgeMoment):
            applied[load.along] = applied.get(load.along, 0.0) + load.moment
    found: list[Place] = []
    for line in plate.outline.boundaries if applied else ():
        for i, point in enumerate(line.points):
            sides = (line.sides[i - 1], line.sides[i])
            moments = [applied.get(side, 0.0) for side in sides]
            smooth = line.straight[i] or abs(line.turns[i]) < plate.bend_turn
            free = not any(plate.support(side).holds for side in sides)
            bounded = moments[0] == moments[1] if smooth else free
            if any(moments) and not bounded:
                found.append(_pair(point))
    return found


def _concentrated(load: Load, plate: Plate) -> tuple[str, Place]:
    """What makes a load a point load, and where; no words where it is none."""
    match load:
        case PointForce(at=place):
            return "point force", place
        case PointMoment(at=place):
            return "point moment", place
        case RectanglePatch(centre=place, size=size):
            small = max(size) < plate.thickness
        case DiscPatch(centre=place, radius=radius):
            small = 2.0 * radius < plate.thickness
        case _:
            return "", (0.0, 0.0)
    return ("patch smaller than the thickness" if small else ""), place


def _held_inside(plate: Plate) -> list[tuple[Place, str]]:
    """Point supports, and ends, corners and crossings of held seams."""
    found: list[tuple[Place, str]] = []
    for mark in plate.outline.marks:
        if plate.support(mark.name).holds:
            found.append((mark.at, f"point support {mark.name}"))
    held = [seam for seam in plate.outline.seams if plate.support(seam.name).holds]
    for seam in held:
        ends = (seam.points[0], seam.points[-1])
        if not np.array_equal(*ends):
            found += [(_pair(end), f"end of the support {seam.name}") for end in ends]
        turns = [seam.closing_turn, *seam.turns]
        found += [
            (_pair(point), f"corner of the support {seam.name}")
            for point, turn in zip(seam.points[:-1], turns, strict=True)
            if turn != 0.0 and abs(turn) >= plate.bend_turn
        ]
    for a, b in combinations(held, 2):
        common = a.path.intersection(b.path)
        found += [
            (_pair(point.coords[0]), f"supports {a.name} and {b.name} meet")
            for point in getattr(common, "geoms", [common])
            if point.geom_type == "Point"
        ]
    return found


def _steps(plate: Plate) -> list[tuple[Place, str]]:
    """Corners of zones with a section of their own: the exponent there is not known."""
    found = []
    for number, zone in enumerate(plate.outline.zones, start=1):
        if plate.sections[number] == plate.sections[0]:
            continue
        line = zone.shape.line
        inner = _inside(plate, line)
        for i, turn in enumerate(line.turns):
            if abs(turn) >= plate.bend_turn and (inner[i] or inner[i - 1]):
                place = _pair(line.points[i])
                found.append((place, f"corner of the step at zone {zone.name}"))
    return found


def _inside(plate: Plate, line: Polygon) -> Bools:
    """Pieces of a line that do not run along the plate's boundary, (n,)."""
    middle = curves.points_at(
        line.points, line.ends, line.bulges, np.full(len(line.bulges), 0.5)
    )
    off = [
        curves.distances(middle, own.points, own.ends, own.bulges).min(axis=1)
        for own in plate.outline.boundaries
    ]
    return np.min(off, axis=0) > SNAP * plate.outline.size


def _pair(point: ArrayLike) -> Place:
    x, y = np.asarray(point, dtype=float)
    return float(x), float(y)


def _line_corners(plate: Plate, line: Polygon, *, hole: bool) -> list[Corner]:
    found = []
    for i, (x, y) in enumerate(line.points):
        turn = 0.0 if line.straight[i] else float(line.turns[i])
        sides = (line.sides[i - 1], line.sides[i])
        if hole:  # the plate lies outside: on the left when run the other way
            sides, turn = (sides[1], sides[0]), -turn
        held = (plate.support(sides[0]), plate.support(sides[1]))
        bend = turn == 0.0 or abs(turn) < plate.bend_turn
        if held[0] == held[1] and bend:
            continue
        angle = math.pi - turn
        names, nu = (held[0].name, held[1].name), plate.material.nu
        exponent = corners.exponent(angle, names, nu)
        found.append(
            Corner(
                place=(float(x), float(y)),
                angle=angle,
                sides=sides,
                supports=held,
                exponent=exponent,
                unbounded=corners.is_unbounded(angle, names, nu),
            )
        )
    return found
