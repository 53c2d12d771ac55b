"""Solving to a tolerance: mesh, certify, refine where the bands are widest.

The first mesh is graded beforehand towards corners by their Williams exponents. On each
mesh the plate and its dual are solved for all cases and goals with one factorisation
each. Triangles that together make most of the gaps of unmet goals are bisected twice,
once where little is missing, until every goal is inside the tolerance or the budget is
spent. Bounds of all meshes hold, so that the best ends are kept.
"""

import math
import time
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from kplate.answers import Step
from kplate.arrays import Bools, Floats
from kplate.bands import Certified, certify
from kplate.combinations import Combination, factor_table
from kplate.combining import combined
from kplate.errors import SolveError
from kplate.functionals import functional
from kplate.goals import Goal, Moment, Peak, Resultant
from kplate.loads import Case
from kplate.mesh import Mesh
from kplate.plate import Plate
from kplate.refine import refined
from kplate.roundedges import fitted
from kplate.solution import Solution
from kplate.solve.static import Progress
from kplate.values import Value

BUDGET = 100_000  # unknowns of the plate
MOST_STEPS = 24
# Share of the gaps that the triangles to be bisected make (Doerfler's marking).
BULK = 0.7
# Bands wider than this many tolerances have their triangles bisected twice, not once.
FAR = 2.0
# Numbers smaller than this share of the largest of their kind need no narrower band.
SMALL = 0.03
DISJOINT = "bounds on two meshes exclude each other"


def refine_to(
    plate: Plate,
    mesh: Mesh,
    cases: Sequence[Case],
    goals: Sequence[Goal],
    *,
    tolerance: float,
    element: str,
    combinations: Sequence[Combination] = (),
    budget: int = BUDGET,
    excluded_radius: float | None = None,
    progress: Progress | None = None,
) -> Solution:
    """Refine a mesh until every goal is inside a tolerance.

    Parameters
    ----------
    plate : Plate
        The statement.
    mesh : Mesh
        Where to begin.
    cases : sequence of Case
        The load cases.
    goals : sequence of Goal
        What must be inside the tolerance, in every case, or in every combination.
    tolerance : float
        Half width of the bands as a share of the value.
    element : str
        A C1 element.
    combinations : sequence of Combination, optional
        What is judged instead of the cases.
    budget : int, optional
        Unknowns of the plate beyond which no finer mesh is made.
    excluded_radius : float, optional
        As in `Solution`.
    progress : callable, optional
        Called with a line for each step and the fraction done.

    Returns
    -------
    Solution
        With its history; the last step tells whether the tolerance was reached.
    """
    start = time.perf_counter()
    steps: list[Step] = []
    solution: Solution | None = None
    known: dict[tuple[Goal, str], Value] = {}
    linear = [goal for goal in goals if not isinstance(goal, Peak)]
    while True:
        functionals = [functional(plate, mesh, goal, cases) for goal in linear]
        try:
            certified = certify(plate, mesh, cases, functionals, element=element)
        except SolveError:
            if solution is None:
                raise
            # Round-off ends the way; the bands reached before it stand.
            return replace(solution, tolerance=tolerance, history=tuple(steps))
        _keep_best(known, certified)
        solution = Solution(
            state=certified.state,
            dual=certified.dual,
            excluded_radius=excluded_radius,
            known=dict(known),
            energies=certified.energies,
            brackets=certified.brackets,
        )
        unmet, bands = _unmet(solution, certified, goals, tolerance, combinations)
        unknowns = int(np.count_nonzero(certified.state.constraints.free))
        steps.append(
            Step(
                unknowns=unknowns,
                triangles=len(mesh.triangles),
                seconds=time.perf_counter() - start,
                bands=bands,
                reached=bool(bands)
                and not unmet.any()
                and max(bands.values()) <= tolerance,
            )
        )
        if progress is not None:
            progress(steps[-1].words, min(0.99, unknowns / budget))
        if not unmet.any() or unknowns >= budget or len(steps) >= MOST_STEPS:
            return replace(solution, tolerance=tolerance, history=tuple(steps))
        far = max(bands.values(), default=math.inf) > FAR * tolerance
        mesh = _bisected(mesh, _bulk(unmet), twice=far)
        if len(certified.state.constraints.numbering.arcs):
            mesh = fitted(mesh, certified.state.element.shape)


def _keep_best(known: dict[tuple[Goal, str], Value], certified: Certified) -> None:
    """Keep the newest values, with the best ends of all bounds so far."""
    for f, row in zip(certified.functionals, certified.values, strict=True):
        for value in row:
            old = known.get((f.goal, value.case))
            best = value
            if old is not None and old.kind == value.kind == "bound":
                assert old.lower is not None
                assert old.upper is not None
                assert value.lower is not None
                assert value.upper is not None
                low, high = max(old.lower, value.lower), min(old.upper, value.upper)
                if low <= high:
                    middle = min(max(value.value, low), high)
                    best = replace(value, value=middle, lower=low, upper=high)
                else:  # one of them is false, whatever the reason
                    best = replace(value, kind="estimate", reason=DISJOINT)
            known[f.goal, value.case] = best


def _unmet(
    solution: Solution,
    certified: Certified,
    goals: Sequence[Goal],
    tolerance: float,
    combinations: Sequence[Combination],
) -> tuple[Floats, dict[str, float]]:
    """What each triangle has of the gaps of unmet goals, and the widest band of each.

    Returns
    -------
    shares : ndarray, shape (n_triangles,)
        Zero everywhere where every goal is met.
    bands : dict of str to float
        Half width of each goal's band as a share of its value, the widest of the cases;
        goals without one are not among them.
    """
    shares = np.zeros(len(solution.mesh.triangles))
    bands: dict[str, float] = {}
    column = 0
    columns = {}
    case_gaps = certified.case_gaps
    if combinations:
        # Of what is judged: more than its gap on each triangle, by the triangle
        # inequality, which does to find where gaps are.
        factors = np.abs(factor_table(solution.state.cases, combinations))
        case_gaps = (np.sqrt(case_gaps) @ factors) ** 2
        solution = combined(solution, combinations)
    for f in certified.functionals:
        if not f.reason:
            columns[f.goal] = column
            column += 1
        elif len(f.too_large):
            shares[f.too_large] += 1.0 / len(f.too_large)
    for goal in goals:
        if not isinstance(goal, Peak) and goal not in columns:
            continue  # no bounded functional: it holds nothing up
        widths = [bands[_words(goal)]] if _words(goal) in bands else []
        for k, case in enumerate(solution.cases):
            if isinstance(goal, Peak):
                value = solution.peak(goal.quantity, case=case)
                if value.lower is None:
                    continue
                width = _half(value) / max(abs(value.value), np.finfo(float).tiny)
                if width > tolerance:
                    band = solution.peak_band(goal.quantity, case=case)
                    shares += _share(case_gaps[:, k])
                    shares += _share(np.where(band.candidates, band.doubt, 0.0) ** 2)
            else:
                value = solution.known[goal, case]
                size = _size(solution, goal, value)
                width = _half(value) / size if size > 0.0 else 0.0
                # What is drawn otherwise than stated no finer mesh makes less.
                fixed = certified.brackets.drawn * abs(value.value)
                if size > 0.0 and _half(value) - fixed > tolerance * size:
                    shares += _share(case_gaps[:, k])
                    shares += _share(certified.goal_gaps[:, columns[goal]])
            widths.append(width)
        if widths:
            bands[_words(goal)] = max(widths)
    return shares, bands


def _half(value: Value) -> float:
    assert value.lower is not None
    assert value.upper is not None
    return 0.5 * (value.upper - value.lower)


def _size(solution: Solution, goal: Goal, value: Value) -> float:
    """What a band is measured by: the value, or a share of the largest of its kind."""
    alike = [
        abs(other.value)
        for (own, _), other in solution.known.items()
        if type(own) is type(goal) and np.isfinite(other.value)
    ]
    if isinstance(goal, Resultant):
        alike.append(abs(solution.load_force(case=value.case)))
    return max(abs(value.value), SMALL * max(alike, default=0.0))


def _share(gaps: Floats) -> Floats:
    total = float(gaps.sum())
    return gaps / total if total > 0.0 else gaps


def _bulk(shares: Floats) -> Bools:
    """The fewest triangles that make a share `BULK` of the whole."""
    order = np.argsort(-shares, kind="stable")
    summed = np.cumsum(shares[order])
    count = int(np.searchsorted(summed, BULK * summed[-1])) + 1
    marked = np.zeros(len(shares), dtype=bool)
    marked[order[:count]] = True
    return marked


def _bisected(mesh: Mesh, marked: Bools, *, twice: bool) -> Mesh:
    """Bisect the marked triangles, and their parts once more if wanted."""
    finer = refined(mesh, marked)
    if not twice:
        return finer
    middles = finer.points[finer.triangles].mean(axis=1)
    owners, _ = mesh.locate(middles)
    return refined(finer, marked[owners])


def _words(goal: Goal) -> str:
    """A goal in words."""
    match goal:
        case Peak(quantity=quantity):
            return f"peak {quantity}"
        case Resultant(of=name):
            return f"resultant of {name}"
        case Moment(at=(x, y), component=component):
            return f"{component} at ({x:.4g}, {y:.4g})"
    name = "".join(f" {c.lower()}" if c.isupper() else c for c in type(goal).__name__)
    at = getattr(goal, "at", None)
    where = "" if at is None else f" at ({at[0]:.4g}, {at[1]:.4g})"
    return name.strip() + where
