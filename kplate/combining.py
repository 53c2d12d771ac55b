"""Combinations of solved load cases, by superposition: nothing is solved again.

What follows from the loads linearly (unknowns, forces, reactions, balanced moments) is
added up; what does not (criteria, peaks, bands, energies) is found again inside each
combination.
"""

from collections.abc import Sequence
from dataclasses import replace

from kplate.combinations import Combination, combined_cases, expanded, factor_table
from kplate.errors import InputError
from kplate.goals import Goal
from kplate.solution import Solution
from kplate.values import Value


def combine(solution: Solution, combinations: Sequence[Combination]) -> Solution:
    """A solution whose cases are combinations of those of another.

    Parameters
    ----------
    solution : Solution
        A plate solved in its cases.
    combinations : sequence of Combination
        What to combine; one that holds a case that reverses stands for two.

    Returns
    -------
    Solution
        Its cases have the names of the combinations. Bands of goals are those that
        each combination would have as a case of its own.

    Raises
    ------
    InputError
        If there is nothing to combine, a combination names a case that is not there,
        or two have one name.

    Examples
    --------
    >>> from kplate.adapt import solve
    >>> from kplate.loads import Case, Pressure, SelfWeight
    >>> from kplate.materials import STEEL
    >>> from kplate.outline import Outline
    >>> from kplate.plate import Plate
    >>> from kplate.supports import CLAMPED
    >>> plate = Plate(
    ...     outline=Outline.polygon([(0, 0), (1, 0), (0, 1)], sides=["a", "b", "c"]),
    ...     thickness=0.01,
    ...     material=STEEL,
    ...     supports={"b": CLAMPED},
    ... )
    >>> cases = [
    ...     Case(name="weight", loads=[SelfWeight()]),
    ...     Case(name="wind", loads=[Pressure(-600.0)], reverses=True),
    ... ]
    >>> gust = Combination(
    ...     name="gust", factors={"weight": 0.9, "wind": 1.5}, purpose="uplift"
    ... )
    >>> found = combine(solve(plate, cases, triangles=200), [gust])
    >>> found.cases
    ('gust', 'gust, wind reversed')
    """
    judged = expanded(solution.state.cases, combinations)
    if not judged:
        raise InputError("there is nothing to combine; give at least one combination.")
    return combined(solution, judged)


def combined(solution: Solution, judged: Sequence[Combination]) -> Solution:
    """As `combine`, of combinations whose signs are chosen already."""
    state = solution.state
    names = [combination.name for combination in judged]
    factors = factor_table(state.cases, judged)
    cases = combined_cases(state.cases, judged)
    state = replace(
        state,
        cases=cases,
        unknowns=state.unknowns @ factors,
        forces=state.forces @ factors,
        support_forces=state.support_forces @ factors,
    )
    dual = solution.dual
    if dual is not None:
        dual = replace(
            dual,
            cases=cases,
            unknowns=dual.unknowns @ factors,
            inside=dual.inside @ factors,
            moments=dual.moments @ factors,
            forces=dual.forces @ factors,
            support_forces=dual.support_forces @ factors,
        )
    known: dict[tuple[Goal, str], Value] = {}
    energies = solution.energies
    if solution.brackets is not None:
        brackets = solution.brackets
        rows = brackets.values(factors, names)
        for f, row in zip(brackets.functionals, rows, strict=True):
            known |= {(f.goal, value.case): value for value in row}
        energies = brackets.energies(factors, names, state.strain_energy)
    return replace(
        solution,
        state=state,
        dual=dual,
        known=known,
        energies=energies,
        brackets=None,
        coarser=tuple(combined(own, judged) for own in solution.coarser),
    )
