"""Envelopes: the extremes over cases or combinations, and which one governs where.

A criterion is found inside each combination first; the envelope is of its values, never
of the components that go into it.

Axes: k places, m combinations.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike

from kplate.arrays import Floats, Ints
from kplate.asking import values_at
from kplate.errors import InputError
from kplate.extremes import stress_range
from kplate.peaks import QUANTITIES, Candidates, local
from kplate.solution import Solution
from kplate.values import Value


@dataclass(frozen=True, eq=False, kw_only=True)
class Extremes:
    """Largest and smallest values at places, and what governs them.

    Parameters
    ----------
    names : tuple of str
        The cases or combinations.
    largest, smallest : ndarray, shape (k,)
        SI units, with their signs.
    largest_in, smallest_in : ndarray, shape (k,)
        Numbers, in `names`, of those that govern.
    """

    names: tuple[str, ...]
    largest: Floats
    smallest: Floats
    largest_in: Ints
    smallest_in: Ints

    @classmethod
    def of(cls, names: Sequence[str], values: Floats) -> "Extremes":
        """Of values (k, m)."""
        largest_in, smallest_in = values.argmax(axis=1), values.argmin(axis=1)
        rows = np.arange(len(values))
        return cls(
            names=tuple(names),
            largest=values[rows, largest_in],
            smallest=values[rows, smallest_in],
            largest_in=largest_in,
            smallest_in=smallest_in,
        )


@dataclass(frozen=True, eq=False, kw_only=True)
class SupportExtremes:
    """What a support brings at the most and at the least.

    Parameters
    ----------
    name : str
        Side, seam or mark, or the two sides of a corner.
    most, least : Value
        Forces in N, positive up, each with its case; of a side without its corners.
    line : Extremes, optional
        Line reactions in N/m at the stations of a side or seam.
    """

    name: str
    most: Value
    least: Value
    line: Extremes | None = None


@dataclass(frozen=True, eq=False, kw_only=True)
class Envelope:
    """The envelope of a solution's cases, or of some of them.

    Parameters
    ----------
    solution : Solution
        A solved plate; `kplate.combine` makes its cases combinations.
    cases : sequence of str, optional
        Those enveloped; all if left out.

    Raises
    ------
    InputError
        If there is no such case.

    Examples
    --------
    >>> from kplate import *
    >>> plate = Plate(
    ...     outline=Outline.polygon([(0, 0), (1, 0), (0, 1)], sides=["a", "b", "c"]),
    ...     thickness=0.01,
    ...     material=STEEL,
    ...     supports={"b": CLAMPED},
    ... )
    >>> cases = [
    ...     Case(name="down", loads=[Pressure(-1000.0)]),
    ...     Case(name="up", loads=[Pressure(600.0)]),
    ... ]
    >>> envelope = Envelope(solution=solve(plate, cases, triangles=200))
    >>> found = envelope.at([(0.1, 0.1)], "deflection")
    >>> [found.names[found.largest_in[0]], found.names[found.smallest_in[0]]]
    ['up', 'down']
    """

    solution: Solution
    cases: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        """Take all cases where none are named."""
        own = tuple(self.cases) or self.solution.cases
        object.__setattr__(self, "cases", own)
        for name in own:
            if name not in self.solution.cases:
                raise InputError(
                    f"there is no load case {name!r}; the cases are "
                    f"{', '.join(self.solution.cases)}."
                )

    def at(self, points: ArrayLike, quantity: str) -> Extremes:
        """Extremes of a quantity (`kplate.asking.ASKED`) at points (k, 2) in m."""
        columns = [
            values_at(self.solution, quantity, points, case=name) for name in self.cases
        ]
        return Extremes.of(self.cases, np.column_stack(columns))

    def field(self, quantity: str) -> Extremes:
        """Extremes of a quantity of `Solution.peak` at `Solution.field_points`.

        Raises
        ------
        InputError
            If there is no such quantity.
        """
        if quantity not in QUANTITIES:
            raise InputError(
                f"there is no quantity {quantity!r}; the quantities are "
                f"{', '.join(QUANTITIES)}."
            )
        samples, columns = self.solution.samples, []
        thickness = self.solution.plate.thicknesses[samples.sections]
        for name in self.cases:
            index = self.solution.cases.index(name)
            at = Candidates(
                samples.points,
                samples.moments[:, :, index],
                samples.shears[:, :, index],
                thickness,
                samples.holders,
            )
            if quantity == "deflection":
                columns.append(samples.bent[:, 0, index])
            else:
                columns.append(local(quantity, at))
        return Extremes.of(self.cases, np.column_stack(columns))

    def peak(self, quantity: str) -> Value:
        """Peak of a quantity inside each case, the worst of all, with its band."""
        values = [self.solution.peak(quantity, case=name) for name in self.cases]
        lost = [value for value in values if np.isnan(value.value)]
        signed = quantity == "largest principal"
        return (
            lost[0]
            if lost
            else max(values, key=lambda v: v.value if signed else abs(v.value))
        )

    def stress_range(self, of: str) -> Value:
        """Largest change of a stress at a place between the cases."""
        return stress_range(self.solution, of, cases=self.cases)

    def supports(self) -> tuple[SupportExtremes, ...]:
        """What sides and seams, corners and held marks bring."""
        every = [self.solution.reactions(case=name) for name in self.cases]
        found = []
        for k, side in enumerate(every[0].sides):
            forces = [
                self.solution.resultant(side.side, case=name) for name in self.cases
            ]
            lines = np.column_stack([own.sides[k].line_reaction for own in every])
            # What has no finite value in some case has none in the envelope.
            lost = np.isnan(lines).any(axis=1, keepdims=True)
            line = Extremes.of(self.cases, np.where(lost, np.nan, lines))
            found.append(_support(side.side, forces, line))
        for k, corner in enumerate(every[0].corners):
            forces = [
                replace(own.corners[k].force, case=name)
                for own, name in zip(every, self.cases, strict=True)
            ]
            found.append(_support(" / ".join(corner.corner.sides), forces))
        for k, point in enumerate(every[0].points):
            found.append(_support(point.mark, [own.points[k].force for own in every]))
        return tuple(found)


def _support(
    name: str, forces: Sequence[Value], line: Extremes | None = None
) -> SupportExtremes:
    """Extremes of forces; not known where one of them is not."""
    lost = [force for force in forces if np.isnan(force.value)]
    by: Callable[[Value], float] = lambda force: force.value  # noqa: E731
    return SupportExtremes(
        name=name,
        most=lost[0] if lost else max(forces, key=by),
        least=lost[0] if lost else min(forces, key=by),
        line=line,
    )
