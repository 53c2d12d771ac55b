"""From a solution and limits to a verdict.

Where combinations are stated, limits are judged in those of their purpose: stresses and
bearing in strength, deflections, steps and stress ranges in service, hold-down in
uplift. Where none are, each case is judged for itself.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass

from kplate.combinations import Combination, Purpose, expanded
from kplate.combining import combined
from kplate.errors import InputError
from kplate.extremes import (
    corner_extreme,
    point_extreme,
    side_extreme,
    step,
    stress_range,
)
from kplate.limits import (
    DeflectionLimit,
    Judgement,
    Limit,
    ReactionLimit,
    StepLimit,
    StressLimit,
    StressRangeLimit,
    Verdict,
)
from kplate.plate import Plate
from kplate.singular import plate_corners
from kplate.solution import Solution
from kplate.values import Value


@dataclass(frozen=True, eq=False, kw_only=True)
class Judged:
    """What is judged: the cases of a plate, or combinations of them.

    Parameters
    ----------
    solution : Solution
        Its cases are those judged.
    combinations : tuple of Combination
        What they are combined of, in the same order; empty where the cases of the
        plate are judged for themselves.
    """

    solution: Solution
    combinations: tuple[Combination, ...] = ()

    @classmethod
    def of(cls, solution: Solution, combinations: Sequence[Combination]) -> "Judged":
        """Combine a solution of the cases, where there is something to combine.

        Raises
        ------
        InputError
            If a combination does not fit the cases.
        """
        chosen = expanded(solution.state.cases, combinations)
        if not chosen:
            return cls(solution=solution)
        return cls(solution=combined(solution, chosen), combinations=chosen)

    def names(self, purpose: Purpose) -> tuple[str, ...]:
        """Names of what serves a purpose."""
        if not self.combinations:
            return self.solution.cases
        return tuple(
            own.name
            for own in self.combinations
            if purpose == "every" or own.purpose in (purpose, "every")
        )


def judge(
    solution: Solution,
    limits: Sequence[Limit],
    *,
    combinations: Sequence[Combination] = (),
) -> Verdict:
    """Judge a solved plate.

    Parameters
    ----------
    solution : Solution
        The plate solved in its load cases.
    limits : sequence of Limit
        What it is judged by; what is not stated is not judged.
    combinations : sequence of Combination, optional
        Of the cases; each case is judged for itself if left out.

    Returns
    -------
    Verdict
        With a judgement of each limit in each case or combination of its purpose.

    Raises
    ------
    InputError
        If no combination serves a limit's purpose, a name is not there, or the
        plate is thicker than any strength that is known.
    """
    judged = Judged.of(solution, combinations)
    return Verdict(
        judgements=judgements(judged, limits), to_judge=to_judge(judged, limits)
    )


def judgements(judged: Judged, limits: Sequence[Limit]) -> tuple[Judgement, ...]:
    """Each limit in each case or combination of its purpose."""
    found: list[Judgement] = []
    check_limits(judged.solution.plate, limits, judged.combinations)
    for limit in limits:
        names = judged.names(limit.purpose)
        if isinstance(limit, StressRangeLimit):
            values = [stress_range(judged.solution, limit.of, cases=names)]
        else:
            values = [measured(judged.solution, limit, case=name) for name in names]
        most = allowed(judged.solution.plate, limit)
        found += [
            Judgement(quantity=limit.quantity, value=value, limit=most, stated=limit)
            for value in values
        ]
    return tuple(found)


def allowed(plate: Plate, limit: Limit) -> float:
    """The largest magnitude that a limit allows, in SI units.

    A strength that goes by thickness is that of the thickest part of the plate.
    """
    if isinstance(limit, StressLimit):
        return limit.allowed(float(plate.thicknesses.max()))
    return limit.at_most


def measured(solution: Solution, limit: Limit, *, case: str) -> Value:
    """What a limit judges, in one case or combination of a solution."""
    match limit:
        case DeflectionLimit():
            return solution.peak("deflection", case=case)
        case StepLimit(along=side):
            return step(solution, side, case=case)
        case StressLimit(criterion=criterion):
            return solution.peak(criterion, case=case)
        case ReactionLimit(at="corners", sense=sense):
            return corner_extreme(solution, sense, case=case)[0]
        case ReactionLimit(at="sides", sense=sense, only=only):
            return side_extreme(solution, sense, case=case, only=only)[0]
        case ReactionLimit(sense=sense, only=only):
            return point_extreme(solution, sense, case=case, only=only)[0]
        case StressRangeLimit():
            raise InputError("a stress range is judged over all cases at once.")


def to_judge(judged: Judged, limits: Sequence[Limit]) -> int:
    """Count the places left out of what limits judge: no finite value there."""
    solution = judged.solution
    places: set[tuple[float, float]] = set()
    for limit in limits:
        names = judged.names(limit.purpose)
        if isinstance(limit, StressLimit | StressRangeLimit):
            places |= {
                disc.place for disc in solution.excluded if disc.case in ("", *names)
            }
        elif isinstance(limit, ReactionLimit) and limit.at == "corners":
            places |= {
                corner.corner.place
                for name in names
                for corner in solution.reactions(case=name).corners
                if math.isnan(corner.force.value)
            }
        elif isinstance(limit, ReactionLimit) and limit.at == "sides":
            places |= {
                corner.place
                for corner in plate_corners(solution.plate)
                if corner.shear_unbounded
                and any(own.holds_deflection for own in corner.supports)
            }
    return len(places)


def check_limits(
    plate: Plate, limits: Sequence[Limit], combinations: Sequence[Combination]
) -> None:
    """Refuse limits that fit neither the plate nor the combinations.

    Raises
    ------
    InputError
        If no combination serves a limit's purpose, a step is judged along a side that
        is not there or is held, or a name is that of no support.
    """
    served = {combination.purpose for combination in combinations}
    for limit in limits:
        if served and not served & {limit.purpose, "every"}:
            raise InputError(
                f"a limit on {limit.quantity} is judged in combinations for "
                f"{limit.purpose}, of which there are none; add one."
            )
        _check_limit(plate, limit)
        allowed(plate, limit)


def _check_limit(plate: Plate, limit: Limit) -> None:
    if isinstance(limit, StepLimit):
        sides = plate.outline.side_names
        if limit.along not in sides:
            raise InputError(
                f"there is no side {limit.along!r} to judge the step along; the sides "
                f"are {', '.join(sides)}."
            )
        if plate.support(limit.along).holds_deflection:
            raise InputError(
                f"side {limit.along!r} is {plate.support(limit.along).name}: it does "
                "not move; judge the step along a free side."
            )
    if isinstance(limit, ReactionLimit):
        outline = plate.outline
        marks = [mark.name for mark in outline.marks]
        lines = [*outline.side_names, *(seam.name for seam in outline.seams)]
        names = marks if limit.at == "points" else lines
        held = [name for name in names if plate.support(name).holds_deflection]
        for name in limit.only:
            if name not in held:
                raise InputError(
                    f"limit on {limit.sense}: {name!r} is none of the held "
                    f"{limit.at}; they are {', '.join(held) or 'none'}."
                )
