"""Sums of solved unit cases, at any thickness of the plate, without solving again.

A plate whose sections all follow its thickness h keeps its moments, shears and support
forces under given loads when h changes; deflections go with 1/h^3, surface stresses
with 1/h^2. Only the self-weight follows h, so that it is a unit case of its own. What
does change is where a peak may be: the discs left out of peaks have the radius h.

Sums and scaled fields are those of the elements and of the dual, so that a peak is
sought, and its band made, as if the sum itself had been solved on the same mesh. The
band of a goal is the sum of those of the unit cases: a bound stays one.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from kplate.arrays import Floats
from kplate.basis import Basis, power
from kplate.errors import InputError
from kplate.goals import Deflection, Goal, MeanDeflection, Slope
from kplate.loads import Case, Load, SelfWeight
from kplate.plate import Plate
from kplate.reactions import CornerForce, PointReaction, Reactions, Resultant
from kplate.samples import Samples
from kplate.singular import shear_places
from kplate.solution import Solution
from kplate.solve.dual import DualState
from kplate.values import Kind, Value, scaled

KINDS: tuple[Kind, ...] = ("bound", "estimate", "indicator", "none")  # worse and worse
WEIGHT = "self-weight"  # name of the unit case


def unit_cases(cases: Sequence[Case]) -> tuple[tuple[Case, ...], Floats]:
    """Unit cases of which some cases are sums: what depends on the thickness apart.

    Parameters
    ----------
    cases : sequence of Case
        Each name once.

    Returns
    -------
    units : tuple of Case
        The given loads of each case that has any, under its name, and the self-weight
        under standard gravity, downwards, if some case has one.
    weights : ndarray, shape (n_units, n_cases)
        How much of each unit case makes each case.
    """
    whole = SelfWeight()
    given: list[tuple[int, Case]] = []
    pull = np.zeros(len(cases))
    for k, case in enumerate(cases):
        rest: list[Load] = []
        for load in case.loads:
            if isinstance(load, SelfWeight):
                pull[k] += load.acceleration / whole.acceleration
            else:
                rest.append(load)
        if rest:
            given.append((k, Case(name=case.name, loads=rest)))
    found = [case for _, case in given]
    weights = np.zeros((len(given), len(cases)))
    weights[np.arange(len(given)), [k for k, _ in given]] = 1.0
    weighed = any(isinstance(own, SelfWeight) for case in cases for own in case.loads)
    if weighed:
        name = WEIGHT
        while name in (case.name for case in found):
            name += " alone"
        found.append(Case(name=name, loads=[whole]))
        weights = np.vstack([weights, pull])
    return tuple(found), weights


def follows(plate: Plate) -> bool:
    """Whether every section of a plate follows its thickness, so that the law holds."""
    return all(section.thickness is None for section in plate.zones.values())


@dataclass(frozen=True, eq=False, kw_only=True)
class Superposed(Solution):
    """Sums of solved unit cases at some thickness, as if they had been solved.

    Parameters
    ----------
    basis : Basis
        The unit cases.
    weights : ndarray, shape (n_units, n_cases)
        How much of the moments of each unit case makes those of each case.
    """

    basis: Basis
    weights: Floats

    @classmethod
    def of(
        cls, basis: Basis, plate: Plate, cases: Sequence[Case], weights: Floats
    ) -> "Superposed":
        """Scale and sum.

        Parameters
        ----------
        basis : Basis
            The unit cases.
        plate : Plate
            The same plate at the thickness wanted.
        cases : sequence of Case
            The sums, as loads of that plate.
        weights : ndarray, shape (n_units, n_cases)
            How much of the loads of each unit case makes each; a self-weight of a plate
            twice as thick has twice the weight.

        Raises
        ------
        InputError
            If the thickness differs and a zone states one of its own, which does not
            follow the plate's.
        """
        own = basis.solution
        if plate.thickness != own.plate.thickness and not follows(plate):
            raise InputError(
                "a zone has a thickness of its own, which does not follow the plate's; "
                "solve for each thickness."
            )
        bends = (own.plate.thickness / plate.thickness) ** 3
        state = own.state
        names = [case.name for case in cases]
        known, energies = _bands(basis, weights, names)
        for goal, name in known:
            if isinstance(goal, Deflection | MeanDeflection | Slope):
                known[goal, name] = scaled(known[goal, name], bends)
        summed = replace(
            state,
            plate=plate,
            cases=tuple(cases),
            unknowns=bends * (state.unknowns @ weights),
            forces=state.forces @ weights,
            support_forces=state.support_forces @ weights,
        )
        return cls(
            basis=basis,
            weights=weights,
            state=summed,
            energies=tuple(scaled(energy, bends) for energy in energies),
            dual=_summed_dual(own.dual, plate, cases, weights, bends),
            excluded_radius=own.excluded_radius,
            known=known,
            tolerance=own.tolerance,
            history=own.history,
        )

    @cached_property
    def _scale(self) -> float:
        """Thickness of the basis over that of the plate."""
        return self.basis.solution.plate.thickness / self.plate.thickness

    @cached_property
    def samples(self) -> Samples:
        """Places of the fields, what they are there, and the triangles between."""
        own = self.basis.solution.samples
        return replace(
            own,
            bent=self._scale**3 * (own.bent @ self.weights),
            moments=own.moments @ self.weights,
            shears=own.shears @ self.weights,
        )

    def _peak(self, quantity: str, index: int) -> Value:
        if not self.state.element.conforming:
            return super()._peak(quantity, index)
        case = self.cases[index]
        discs = [e for e in self.excluded if e.case in ("", case)]
        value = self.basis.peak(quantity, self.weights[:, index], discs, case)
        return scaled(value, self._scale ** power(quantity))

    def _reactions(self, index: int) -> Reactions:
        known = self._known_reactions
        if index not in known:
            weights, unit = self.weights[:, index], self.basis.solution
            parts = [unit.reactions(case=case) for case in unit.cases]
            case = self.cases[index]
            radius = self.excluded_radius or self.plate.thickness
            discs = (*self.excluded, *shear_places(self.plate, radius))
            found = _added_reactions(parts, weights, case)
            for disc in discs:
                if disc.case in ("", case):
                    for side in found.sides:
                        off = np.hypot(*(side.stations - disc.place).T)
                        side.line_reaction[off <= disc.radius * (1.0 + 1e-9)] = np.nan
            known[index] = found
        return known[index]


def added(values: Sequence[Value], weights: Floats) -> Value:
    """A weighted sum of values with their bands.

    It is of the worst kind that enters: a sum of bounds is a bound.
    """
    entering = [
        (value, float(w)) for value, w in zip(values, weights, strict=True) if w != 0.0
    ]
    if not entering:
        return Value(value=0.0, place=values[0].place)
    kind = max((value.kind for value, _ in entering), key=KINDS.index)
    total = sum(w * value.value for value, w in entering)
    reasons = dict.fromkeys(value.reason for value, _ in entering if value.reason)
    low = high = None
    if kind != "none":
        low = high = 0.0
        for value, w in entering:
            assert value.lower is not None
            assert value.upper is not None
            ends = (w * value.lower, w * value.upper)
            low, high = low + min(ends), high + max(ends)
        # Round-off must not put the sum outside its band.
        low, high = min(low, total), max(high, total)
    return Value(
        value=total,
        kind=kind,
        lower=low,
        upper=high,
        place=values[0].place,
        reason="; ".join(reasons),
    )


def _bands(
    basis: Basis, weights: Floats, names: Sequence[str]
) -> tuple[dict[tuple[Goal, str], Value], tuple[Value, ...]]:
    """Goals and strain energies of sums of unit cases, at their thickness.

    From the gaps of the sums where they are known; otherwise bands add up.
    """
    known: dict[tuple[Goal, str], Value] = {}
    unit = basis.solution
    brackets = unit.brackets
    if brackets is not None:
        rows = brackets.values(weights, names)
        for f, row in zip(brackets.functionals, rows, strict=True):
            known |= {(f.goal, value.case): value for value in row}
        least = 0.5 * np.einsum("km,kl,lm->m", weights, basis.works, weights)
        return known, brackets.energies(weights, names, least)
    for goal in dict.fromkeys(goal for goal, _ in unit.known):
        parts = [unit.known[goal, case] for case in unit.cases]
        for name, weight in zip(names, weights.T, strict=True):
            known[goal, name] = replace(added(parts, weight), case=name)
    return known, ()


def _summed_dual(
    dual: DualState | None,
    plate: Plate,
    cases: Sequence[Case],
    weights: Floats,
    bends: float,
) -> DualState | None:
    if dual is None:
        return None
    return replace(
        dual,
        plate=plate,
        cases=tuple(cases),
        unknowns=bends * (dual.unknowns @ weights),
        inside=bends * (dual.inside @ weights),
        moments=dual.moments @ weights,
        forces=dual.forces @ weights,
        support_forces=dual.support_forces @ weights,
    )


def _added_reactions(
    parts: Sequence[Reactions], weights: Floats, case: str
) -> Reactions:
    """Weighted sum of the reactions of unit cases."""
    first = parts[0]
    magnitude = float(
        sum(abs(w) * p.magnitude for p, w in zip(parts, weights, strict=True))
    )
    off = sum(
        abs(w) * p.magnitude * p.imbalance for p, w in zip(parts, weights, strict=True)
    )
    return Reactions(
        case=case,
        sides=tuple(
            replace(
                side,
                resultant=_sum_of([p.sides[i].resultant for p in parts], weights),
                line_reaction=_sum_along(
                    [p.sides[i].line_reaction for p in parts], weights
                ),
                line_moment=_sum_along(
                    [p.sides[i].line_moment for p in parts], weights
                ),
            )
            for i, side in enumerate(first.sides)
        ),
        corners=tuple(
            CornerForce(
                corner=own.corner,
                force=replace(
                    added([p.corners[i].force for p in parts], weights), case=case
                ),
            )
            for i, own in enumerate(first.corners)
        ),
        points=tuple(
            PointReaction(
                mark=own.mark,
                support=own.support,
                force=replace(
                    added([p.points[i].force for p in parts], weights), case=case
                ),
                resultant=_sum_of([p.points[i].resultant for p in parts], weights),
            )
            for i, own in enumerate(first.points)
        ),
        load=_sum_of([p.load for p in parts], weights),
        total=_sum_of([p.total for p in parts], weights),
        magnitude=magnitude,
        imbalance=float(off) / magnitude if magnitude > 0.0 else 0.0,
    )


def _sum_of(parts: Sequence[Resultant], weights: Floats) -> Resultant:
    own = np.array([(p.force, p.moment_x, p.moment_y) for p in parts])
    force, moment_x, moment_y = (weights @ own).tolist()
    return Resultant(force=force, moment_x=moment_x, moment_y=moment_y)


def _sum_along(parts: Sequence[Floats], weights: Floats) -> Floats:
    """Sum of line reactions or moments, without what a weight of 0 leaves out."""
    entering = [w * part for part, w in zip(parts, weights, strict=True) if w != 0.0]
    return np.sum(entering, axis=0) if entering else np.zeros_like(parts[0])
