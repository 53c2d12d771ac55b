"""What a user asks of a solved plate: values at points, peaks, reactions, fields.

Everything is in SI units and in the signs of the package: deflections, pressures and
forces positive up, moments positive where they compress the top face, stresses positive
in tension. Methods that take a `case` want its name where there are several.
"""

import math
from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from functools import cached_property

import numpy as np

from kplate import reactions as support_reactions
from kplate.answers import Growth, Step
from kplate.brackets import Brackets
from kplate.coarser import compared, indicated
from kplate.dualforces import side_forces
from kplate.errors import InputError
from kplate.goals import Goal, Peak, Resultant
from kplate.peaks import (
    QUANTITIES,
    Candidates,
    Extreme,
    PeakBand,
    climb,
    extreme,
    measures,
    peak_band,
    smoothing,
)
from kplate.polygon import SNAP
from kplate.raw import RawMoments
from kplate.reactions import CornerForce, Reactions
from kplate.recovery import SmoothedMoments
from kplate.rims import rim
from kplate.searched import Searched
from kplate.singular import (
    plate_corners,
    shear_places,
)
from kplate.summits import deflected, deflection_band
from kplate.values import Kind, Value
from kplate.woodarmer import DESIGN


@dataclass(frozen=True, eq=False, kw_only=True)
class Solution(Searched):
    """A solved plate in all its load cases.

    Parameters
    ----------
    state : StaticState
        Plate, mesh, cases and unknowns.
    excluded_radius : float, optional
        Radius in m of the discs left out of the peaks of moments and stresses; the
        plate's thickness if left out.
    dual : DualState, optional
        Balanced moments on the same mesh.
    known : mapping, optional
        Values with bands, by goal and case.
    energies : tuple of Value, optional
        Strain energy of each case with its band.
    tolerance : float, optional
        Half width of bands that was asked for, as a share.
    history : tuple of Step, optional
        The meshes on the way to it.
    brackets : Brackets, optional
        What the bands are made of, for those of combinations.
    coarser : tuple of Solution, optional
        Of an element without bands, the same on meshes of two and four times the edge
        (`kplate.coarser`).
    """

    known: Mapping[tuple[Goal, str], Value] = field(default_factory=dict)
    energies: tuple[Value, ...] = ()
    tolerance: float | None = None
    history: tuple[Step, ...] = ()
    brackets: Brackets | None = None
    coarser: tuple["Solution", ...] = ()

    @property
    def reached(self) -> bool:
        """Whether every goal that has a band is inside the tolerance asked for.

        Not where no goal has one.
        """
        return bool(self.history) and self.history[-1].reached

    def value(self, goal: Goal, *, case: str | None = None) -> Value:
        """A goal's value and band.

        Parameters
        ----------
        goal : Goal
            One of those the plate was solved for, or a peak.
        case : str, optional
            The load case; may be left out where there is only one.

        Returns
        -------
        Value

        Raises
        ------
        InputError
            If the plate was solved without that goal.
        """
        if isinstance(goal, Peak):
            return self.peak(goal.quantity, case=case)
        name = self.cases[self._index(case)]
        if (goal, name) not in self.known:
            raise InputError(
                f"{goal} was not asked for; call solve(..., tolerance=..., "
                "goals=[...])."
            )
        return self.known[goal, name]

    def reactions(self, *, case: str | None = None) -> Reactions:
        """Support forces by side and corner, and their balance with the loads."""
        return self._reactions(self._index(case))

    def hold_down(self, *, case: str | None = None) -> tuple[Value, list[CornerForce]]:
        """Largest pull in N that a corner needs, and the corners that need it.

        Corners without a finite force are left out and counted in the value's reason.
        The value is 0 where no corner has to be held down, nan where none is known.
        """
        names = self.cases if case is None else (self.cases[self._index(case)],)
        pulls = []
        for name in names:
            corners = self.reactions(case=name).corners
            most, forces = support_reactions.hold_down(corners)
            unknown = sum(math.isnan(corner.force.value) for corner in corners)
            words = f"not known at {unknown} corner{'s' * (unknown > 1)}"
            value = Value(value=most, case=name, reason=words if unknown else "")
            if forces:
                worst = -min(forces, key=lambda own: own.force.value).force
                value = replace(worst, case=name, reason=value.reason)
            pulls.append((value, forces))
        lost = [pull for pull in pulls if np.isnan(pull[0].value)]
        return max(lost or pulls, key=lambda pull: pull[0].value)

    def side_uplift(self, *, case: str | None = None) -> tuple[Value, str]:
        """Largest line force in N/m that holds a side down, and the side's name."""
        index = self._index(case)
        sides = self._reactions(index).sides
        most, place, side = support_reactions.side_uplift(sides)
        return Value(value=most, place=place, case=self.cases[index]), side

    def peak(self, quantity: str, *, case: str | None = None) -> Value:
        """Extreme value of a quantity over the plate, and where.

        Parameters
        ----------
        quantity : str
            "deflection" (largest magnitude, with its sign), "von Mises", "Tresca",
            "largest principal" (largest tension of the two faces), "smallest principal"
            (largest compression), "shear stress", "m_xx", "m_yy" or "m_xy" (largest
            magnitude, with its sign), or a design moment of reinforcement along x and
            y: "design bottom x", "design bottom y", "design top x" or "design top y".
        case : str, optional
            A load case; the worst of all if left out.

        Returns
        -------
        Value
            Kind "estimate" where balanced moments were found too; "indicator" of DKT
            where a tolerance was asked for, but of shear stress; "none" elsewhere.
            Moments and stresses leave the discs in `excluded` out, but not their rims.

        Raises
        ------
        InputError
            If there is no such quantity or case.
        """
        self._check_quantity(quantity)
        indices = range(len(self.cases)) if case is None else [self._index(case)]
        values = [self._peak(quantity, index) for index in indices]
        lost = [value for value in values if math.isnan(value.value)]
        key = _largest if quantity == "largest principal" else _magnitude
        return lost[0] if lost else max(values, key=key)

    def near(
        self,
        place: tuple[float, float],
        distance: float,
        *,
        quantity: str = "von Mises",
        case: str | None = None,
    ) -> Growth:
        """Largest value of a quantity at a distance from a place without a finite one.

        Parameters
        ----------
        place : tuple of float
            One of those in `excluded`, in m.
        distance : float
            Radius in m of the circle around it on which to look.
        quantity : str, optional
            As in `peak`, but the deflection.
        case : str, optional
            The load case; may be left out where there is only one.

        Returns
        -------
        Growth

        Raises
        ------
        InputError
            If the place is none of those left out, or nothing of the plate is at that
            distance.
        """
        self._check_quantity(quantity)
        index = self._index(case)
        size = SNAP * self.plate.outline.size
        known = [
            disc
            for disc in self.excluded
            if np.hypot(*np.subtract(disc.place, place)) < size
        ]
        if not known or quantity == "deflection":
            places = ", ".join(f"({x:g}, {y:g})" for x, y in self._left_out())
            raise InputError(
                f"{quantity} at ({place[0]:g}, {place[1]:g}) m: the places without a "
                f"finite moment are {places or 'none'}; use `moments` elsewhere."
            )
        ring = rim(self.mesh, replace(known[0], radius=distance))
        if not len(ring):
            raise InputError(
                f"nothing of the plate is {distance:g} m from ({place[0]:g}, "
                f"{place[1]:g}) m; choose a smaller distance."
            )
        value, at, face = extreme(quantity, self._at(ring, index))
        power = next(
            (
                corner.exponent.real - 1.0
                for corner in plate_corners(self.plate)
                if corner.place == known[0].place
            ),
            None,
        )
        words = known[0].reason
        if power is None:
            words += ": moments and stresses grow with the logarithm of the distance"
        return Growth(
            value=Value(value=value, place=at, face=face, case=self.cases[index]),
            distance=distance,
            power=power,
            words=words,
        )

    def _left_out(self) -> list[tuple[float, float]]:
        return list(dict.fromkeys(disc.place for disc in self.excluded))

    def peak_band(self, quantity: str, *, case: str | None = None) -> PeakBand:
        """Band of the peak's magnitude in one case, and where the peak may be.

        Raises
        ------
        InputError
            If there is no such quantity or case, or no balanced moments are there.
        """
        self._check_quantity(quantity)
        if self.dual is None or not self.state.element.conforming:
            raise InputError(
                "a peak has a band only where balanced moments were found too, with a "
                'C1 element; call solve(..., tolerance=...) with element "auto".'
            )
        index = self._index(case)
        if quantity == "deflection":
            assert isinstance(self.recovered, RawMoments)
            return deflection_band(self.state, self.dual, self.recovered, index)
        at = self._sharpened(quantity, self._candidates(index), index)
        return self._band_among(quantity, at, index)

    def _band_among(self, quantity: str, at: Candidates, index: int) -> PeakBand:
        """Band of a peak among sharpened candidates, from the dual's values there."""
        assert self.dual is not None
        own = self.mesh.barycentrics(at.triangles, at.places)[:, None]
        moments = self.dual.moments_at(at.triangles, own)[:, 0, :, index]
        shears = self.dual.shears_at(at.triangles, own)[:, 0, :, index]
        values, differences = measures(quantity, at, moments, shears)
        return peak_band(self.mesh, at.triangles, values, differences)

    def _check_quantity(self, quantity: str) -> None:
        if quantity not in (*QUANTITIES, *DESIGN):
            raise InputError(
                f"there is no quantity {quantity!r}; the quantities are "
                f"{', '.join((*QUANTITIES, *DESIGN))}."
            )

    def _peak(self, quantity: str, index: int) -> Value:
        """Peak of one case, with its band where there is a dual."""
        case = self.cases[index]
        found: Extreme
        if quantity == "deflection":
            found = self._summit(index)
        else:
            at = self._candidates(index)
            if not len(at.places):
                return Value(
                    value=math.nan,
                    case=case,
                    reason="is not known: the places left out cover the plate",
                )
            at = self._sharpened(quantity, at, index)
            found = extreme(quantity, at)
        value, place, face = found
        result = Value(value=value, place=place, face=face, case=case)
        kind: Kind = "estimate"
        if not self.state.element.conforming:
            if quantity == "deflection" and self.coarser:
                tops = [own.peak(quantity, case=case).value for own in self.coarser]
                return indicated(result, *tops)
            if self.tolerance is None or quantity in ("deflection", "shear stress"):
                return result
            assert isinstance(self.recovered, SmoothedMoments)
            most = smoothing(quantity, self.state, self.recovered, index)
            at = self._candidates(index)
            values, _ = measures(quantity, at, at.moments, at.shears)
            band = peak_band(self.mesh, at.triangles, values, most[at.triangles])
            kind = "indicator"
        elif self.dual is None:
            return result
        elif quantity == "deflection":
            band = self.peak_band(quantity, case=case)
        else:
            band = self._band_among(quantity, at, index)
        size = abs(value)
        low, high = min(band.lower, size), max(band.upper, size)
        low, high = (low, high) if value >= 0.0 else (-high, -low)
        return replace(result, lower=low, upper=high, kind=kind)

    def _summit(self, index: int) -> tuple[float, tuple[float, float], None]:
        """Climb from the sample that deflects most to the summit beside it."""
        places, holders, every = deflected(self.recovered)
        w = every[:, index]
        case, best = self.cases[index], int(np.argmax(np.abs(w)))
        value, place = climb(
            lambda points: self.deflection(points, case=case),
            self.mesh,
            (float(w[best]), places[best]),
            float(np.sqrt(2.0 * self.mesh.areas[holders[best]])),
        )
        return value, place, None

    @cached_property
    def _known_reactions(self) -> dict[int, Reactions]:
        return {}

    def _reactions(self, index: int) -> Reactions:
        known = self._known_reactions
        if index not in known:
            radius = self.excluded_radius or self.plate.thickness
            discs = (*self.excluded, *shear_places(self.plate, radius))
            dual = self.dual if self.state.element.conforming else None
            found = support_reactions.reactions(
                self.state, self.recovered, index, discs, dual
            )
            case = self.cases[index]
            points = tuple(
                replace(point, force=self._banded(point.force, point.mark, case))
                for point in found.points
            )
            found = replace(found, points=points)
            others = [own.reactions(case=case) for own in self.coarser]
            known[index] = compared(found, others) if others else found
        return known[index]

    def _banded(self, force: Value, name: str, case: str) -> Value:
        """A support's force with the band that is known of it."""
        band = self.known.get((Resultant(of=name), case))
        if band is None or band.lower is None or band.upper is None:
            return force
        value = min(max(force.value, band.lower), band.upper)
        return replace(
            force, value=value, lower=band.lower, upper=band.upper, kind=band.kind
        )

    def resultant(self, name: str, *, case: str | None = None) -> Value:
        """Force in N, positive up, that a side, seam or mark brings, with its band.

        A bound where no other support meets it and the plate was solved to a tolerance;
        an indicator, from the balanced moments, on other sides; of DKT an indicator
        from coarser meshes; no band elsewhere.

        Raises
        ------
        InputError
            If there is no such support.
        """
        index = self._index(case)
        found = self._reactions(index)
        for point in found.points:
            if point.mark == name:
                return point.force
        for side in found.sides:
            if side.side == name:
                force = Value(value=side.resultant.force, case=self.cases[index])
                force = self._banded(force, name, self.cases[index])
                seam = name not in self.mesh.side_names
                if force.kind != "none" or (seam and not self.coarser):
                    return force
                return self._indicated(force, name, index)
        held = [own.side for own in found.sides] + [own.mark for own in found.points]
        raise InputError(
            f"there is no held side, seam or mark {name!r}; they are {', '.join(held)}."
        )

    def _indicated(self, force: Value, name: str, index: int) -> Value:
        """A side's force with what balanced moments or coarser meshes make of it."""
        if self.coarser:
            case = self.cases[index]
            forces = [own.resultant(name, case=case).value for own in self.coarser]
            return indicated(force, *forces)
        if self.dual is None or not self.state.element.conforming:
            return force
        points = self.mesh.points
        corners = [
            int(np.hypot(*(points - own.corner.place).T).argmin())
            for own in self._reactions(index).corners
            if not math.isnan(own.force.value)
        ]
        other = float(side_forces(self.dual, name, corners)[index])
        off = abs(other - force.value)
        return replace(
            force, lower=force.value - off, upper=force.value + off, kind="indicator"
        )


def _largest(value: Value) -> float:
    return value.value


def _magnitude(value: Value) -> float:
    return abs(value.value)
