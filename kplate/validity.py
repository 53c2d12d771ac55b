"""Whether thin-plate, small-deflection theory holds for a solved panel."""

import math
from dataclasses import dataclass

from kplate.singular import plate_corners
from kplate.solution import Solution

# Beyond, shear deformation matters: common practice for "thin".
THIN = 1.0 / 20.0  # h/L
# Beyond, the plate also carries as a membrane: common practice for "small".
SMALL = 0.5  # w/h
# Deflections near a hinged corner blunter than this come out some percent too small
# with this element: on a rectangle's gable 0.4 % at 160 degrees, 1.6 % at 169; on
# regular polygons of 16 and 20 sides 3 and 7 %.
BLUNT = math.radians(155.0)
FLAG = "FLAG: "


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
    """

    slenderness: float
    largest_deflection: float
    smallest_hole: float | None
    held_in_plane: bool | None
    supported_all_round: bool
    blunt_corners: int = 0

    @property
    def thin(self) -> bool:
        """Whether the plate is thin."""
        return self.slenderness <= THIN

    @property
    def small(self) -> bool:
        """Whether the deflections are small."""
        return self.largest_deflection <= SMALL

    @property
    def holds(self) -> bool:
        """Whether nothing is flagged."""
        sound = self.thin and self.small and not self._hole_is_small
        return sound and not self.blunt_corners

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
        words.append(self._deflection_words)
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
        return words

    @property
    def _hole_is_small(self) -> bool:
        return self.smallest_hole is not None and self.smallest_hole < 1.0

    @property
    def _deflection_words(self) -> str:
        ratio = f"w/h {self.largest_deflection:.2f}"
        if self.small:
            return f"small deflection: {ratio}."
        flag = f"{FLAG}beyond small deflection, {ratio} (0.5 is): "
        if not self.supported_all_round:
            return flag + "membrane action is left out; judge it by hand."
        held = {
            True: "more so with the edges held in plane, which pull on their frame",
            False: "with the edges free in plane",
            None: "whether the edges are held in plane is not stated",
        }[self.held_in_plane]
        return (
            flag
            + "linear theory is conservative for the deflection and, as a rule, for "
            f"the stress of a panel supported all round ({held})."
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
    return Validity(
        slenderness=float(plate.thicknesses.max()) / plate.outline.span,
        largest_deflection=abs(solution.peak("deflection").value)
        / float(plate.thicknesses.min()),
        smallest_hole=None if radius is None else radius / plate.thickness,
        held_in_plane=held_in_plane,
        supported_all_round=all(
            plate.support(side).holds_deflection for side in plate.outline.rim.sides
        ),
        blunt_corners=sum(
            corner.angle > BLUNT and corner.carries_force and corner.both_held
            for corner in plate_corners(plate)
        ),
    )
