"""Whether thin-plate, small-deflection theory holds for a solved panel.

Three states: it holds; it holds and is conservative; it does not hold. What decides is
thickness against span, hole radius against thickness, and, where the deflection is
beyond half the thickness, how the plate bends and what holds its edges.

Bending that stays developable (a strip, a cantilever, a sign on two posts) stretches
nothing and stays linear far beyond half the thickness, until its slopes are no longer
small. The *two-way share* tells it: the part of the bending energy, by the larger
principal curvature k1, whose other curvature k2 makes the surface non-developable,

    share = sum of D k1^2 e / sum of D k1^2,   e = k2/k1 where that is positive,
    (-k2/k1 - nu) / (1 - nu) where that is, 0 between.

Between -nu and 0 lies what Poisson's ratio brings along a strip's free edges: a wide
strip loses it when it bends far, which stiffens it by nu^2, 9 %, at the most. Found
here: strips, cantilevers and signs on two posts 0.0005 to 0.006, all others 0.05 to
0.5 (two rows of bolts 0.09, a square on four sides 0.47).

All other bending stretches the middle plane. In the theory of von Karman the loads then
do less work than in linear theory, whatever holds the edges: with the stretching energy
S of an equilibrium w, of degree 4 in w, and its bending energy U, the work f.w is
2 U + 4 S; as linear theory's w0 makes U - f.w least, f.w0 >= f.w + 4 S. So the mean
deflection under the loads is conservative; the largest one, and the stress, as a rule
only, and of panels supported all round.
"""

import math
from dataclasses import dataclass
from enum import IntEnum

import numpy as np

from kplate.recovery import principal_moments
from kplate.singular import plate_corners
from kplate.solution import Solution

# Beyond, shear deformation matters: common practice for "thin".
THIN = 1.0 / 20.0  # h/L
# Beyond, the plate also carries as a membrane: common practice for "small".
SMALL = 0.5  # w/h
# Below this two-way share a plate bends like a strip.
ONE_WAY = 0.02
# Beyond this slope a strip is no longer linear: the end of a cantilever under a load
# there then deflects 1 to 2 % less (elastica, from memory).
STEEP = 0.2
# Deflections near a hinged corner blunter than this come out some percent too small
# with this element: on a rectangle's gable 0.4 % at 160 degrees, 1.6 % at 169; on
# regular polygons of 16 and 20 sides 3 and 7 %.
BLUNT = math.radians(155.0)
FLAG = "FLAG: "
_CONSERVATIVE = (
    "linear theory is conservative for the deflection and, as a rule, for the stress"
)


class State(IntEnum):
    """Whether the theory holds; the larger, the worse."""

    HOLDS = 0
    CONSERVATIVE = 1
    DOES_NOT_HOLD = 2

    @property
    def words(self) -> str:
        """How it is printed."""
        return ("holds", "holds, conservative", "does not hold")[self]


@dataclass(frozen=True, kw_only=True)
class Validity:
    """What the theory leaves out, measured.

    Parameters
    ----------
    slenderness : float
        h/L: largest thickness over the diameter of the largest circle inside.
    largest_deflection : float
        w/h: largest deflection of all cases over the smallest thickness.
    smallest_hole : float or None
        Smallest radius of a hole or of a hollow of the rim, over the thickness.
    held_in_plane : bool or None
        Whether the supports hold the edges in the plane of the plate; ``None`` where
        it is not stated.
    supported_all_round : bool
        Whether every side of the outer boundary is held against deflection.
    blunt_corners : int
        Simply supported corners of more than 155 degrees inside.
    two_way : float
        Share of the bending that is not like that of a strip, from 0 to 1; the largest
        of the cases whose deflection is not small.
    steepest : float
        Largest slope of all cases in rad.
    corner_forces : bool
        Whether corners bring forces, for which they must be held.
    """

    slenderness: float
    largest_deflection: float
    smallest_hole: float | None
    held_in_plane: bool | None
    supported_all_round: bool
    blunt_corners: int = 0
    two_way: float = 1.0
    steepest: float = 0.0
    corner_forces: bool = False

    @property
    def thin(self) -> bool:
        """Whether the plate is thin."""
        return self.slenderness <= THIN

    @property
    def small(self) -> bool:
        """Whether the deflections are small."""
        return self.largest_deflection <= SMALL

    @property
    def one_way(self) -> bool:
        """Whether the plate bends like a strip."""
        return self.two_way <= ONE_WAY

    @property
    def state(self) -> State:
        """Whether the theory holds."""
        if not self.thin or self._hole_is_small or self.blunt_corners:
            return State.DOES_NOT_HOLD
        return self._deflection[0]

    @property
    def holds(self) -> bool:
        """Whether nothing is flagged."""
        return self.state is State.HOLDS

    @property
    def words(self) -> list[str]:
        """One remark for each thing that was measured."""
        ratio = 1.0 / self.slenderness
        words = [f"thin: h/L 1/{ratio:.0f}."]
        if not self.thin:
            words = [
                f"{FLAG}not thin, h/L 1/{ratio:.3g} (1/20 is): shear deformation, left "
                "out here, adds to the deflection."
            ]
        words.append(self._deflection[1])
        if self.smallest_hole is not None and self._hole_is_small:
            words.append(
                f"{FLAG}smallest hole radius/h {self.smallest_hole:.2g}, less than 1: "
                "stress at its rim is not that of a thin plate."
            )
        elif self.smallest_hole is not None:
            words.append(f"smallest hole radius/h {self.smallest_hole:.3g}.")
        if self.blunt_corners:
            words.append(
                f"{FLAG}{self.blunt_corners} simply supported corner"
                f"{'s' * (self.blunt_corners > 1)} of more than 155 degrees: the "
                "deflection comes out too small, by 1 to 2 % with one, by 3 and 7 % on "
                "polygons of 16 and 20 sides."
            )
        return [*words, f"theory {self.state.words}."]

    @property
    def _hole_is_small(self) -> bool:
        return self.smallest_hole is not None and self.smallest_hole < 1.0

    @property
    def _deflection(self) -> tuple[State, str]:
        """What the deflection makes of the theory, and why."""
        ratio = f"w/h {self.largest_deflection:.2f}"
        if self.small:
            return State.HOLDS, f"small deflection: {ratio}."
        share = f"{100.0 * self.two_way:.2g} % of the bending is two-way"
        if self.one_way and not (self.held_in_plane and self.supported_all_round):
            return self._like_a_strip(ratio, share)
        flag = f"{FLAG}beyond small deflection, {ratio} (0.5 is): "
        if not self.supported_all_round:
            return State.DOES_NOT_HOLD, (
                f"{flag}{share} and sides are free; membrane action is left out. The "
                "mean deflection under the loads comes out too large; of the stress "
                "nothing is known: judge it by hand."
            )
        held = {
            True: "more so with the edges held in plane, which pull on their frame",
            False: "with the edges free in plane",
            None: "whether the edges are held in plane is not stated",
        }[self.held_in_plane]
        corners = " Corners need holding both ways." if self.corner_forces else ""
        return State.CONSERVATIVE, (
            f"{flag}{_CONSERVATIVE} of a panel supported all round ({held}).{corners}"
        )

    def _like_a_strip(self, ratio: str, share: str) -> tuple[State, str]:
        """What a deflection that is not small is to a strip."""
        strip = f"{ratio}, but it bends like a strip ({share})"
        if self.steepest > STEEP:
            return State.DOES_NOT_HOLD, (
                f"{FLAG}{strip}, with slopes up to {self.steepest:.2g} ({STEEP:g} is "
                "small): large rotations are left out."
            )
        if self.held_in_plane:
            return State.CONSERVATIVE, (
                f"{FLAG}{strip} whose edges are held in plane and pull on their frame: "
                f"{_CONSERVATIVE}."
            )
        unknown = (
            ", unless edges that face each other are held in plane, which is not "
            "stated: then it is conservative"
        )
        return State.HOLDS, (
            f"{strip} with slopes up to {self.steepest:.2g}: linear theory holds"
            f"{unknown if self.held_in_plane is None else ''}."
        )


def validity(solution: Solution, *, held_in_plane: bool | None = None) -> Validity:
    """Measure what the theory leaves out.

    Parameters
    ----------
    solution : Solution
        A solved panel.
    held_in_plane : bool, optional
        What the panel states about its edges.

    Returns
    -------
    Validity
    """
    plate = solution.plate
    radius = plate.outline.smallest_radius
    thinnest = float(plate.thicknesses.min())
    largest = [abs(solution.peak("deflection", case=c).value) for c in solution.cases]
    # The cases that decide: all that are not small, or the largest.
    least = min(SMALL * thinnest, max(largest))
    corners = plate_corners(plate)
    return Validity(
        slenderness=float(plate.thicknesses.max()) / plate.outline.span,
        largest_deflection=max(largest) / thinnest,
        smallest_hole=None if radius is None else radius / plate.thickness,
        held_in_plane=held_in_plane,
        supported_all_round=all(
            plate.support(side).holds_deflection for side in plate.outline.rim.sides
        ),
        blunt_corners=sum(
            corner.angle > BLUNT and corner.carries_force and corner.both_held
            for corner in corners
        ),
        two_way=max(_two_way(solution, k) for k, w in enumerate(largest) if w >= least),
        steepest=float(np.hypot(*solution.samples.bent[:, 1:].swapaxes(0, 1)).max()),
        corner_forces=any(corner.carries_force for corner in corners),
    )


def _two_way(solution: Solution, case: int) -> float:
    """Share of a case's bending that is not like that of a strip."""
    plate, samples = solution.plate, solution.samples
    inverse = np.linalg.inv(plate.rigidities)[samples.sections]
    xx, yy, xy = np.einsum("nab,nb->an", inverse, samples.moments[:, :, case])
    k = principal_moments(np.stack([xx, yy, 0.5 * xy], axis=-1))[0]
    order = np.argsort(-np.abs(k), axis=1)
    larger, smaller = np.take_along_axis(k, order, axis=1).T
    nu = np.array([material.nu for _, material in plate.sections])[samples.sections]
    ratio = np.divide(smaller, larger, where=larger != 0.0, out=np.zeros_like(larger))
    part = np.where(ratio > 0.0, ratio, np.maximum(-ratio - nu, 0.0) / (1.0 - nu))
    corners = samples.points[samples.triangles]
    (ax, ay), (bx, by) = (corners[:, 1:] - corners[:, :1]).transpose(1, 2, 0)
    areas = np.zeros(len(larger))
    np.add.at(areas, samples.triangles, np.abs(ax * by - ay * bx)[:, None])
    energy = areas * plate.rigidities[samples.sections, 0, 0] * larger**2
    return float(energy @ part / energy.sum()) if energy.any() else 0.0
