"""Error of one number against unknowns: ``python -m benchmarks convergence CASE``.

Each element solves the plate on even meshes, finer and finer (graded towards corners
with unbounded moments, as `kplate.solve` makes them); the C1 elements solve it to
tolerances as well, refining where the bands ask for it, which gives a band to each
number.
"""

import math
import time
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np

import kplate as kp
from benchmarks import cases
from benchmarks.asking import ask, combined
from kplate.elements import ELEMENTS
from kplate.errors import InputError, KplateError

MOST = 40_000  # unknowns
COUNTS = tuple(round(24 * 1.8**k) for k in range(15))  # triangles
TOLERANCES = (0.1, 0.03, 0.01, 3e-3, 1e-3, 3e-4, 1e-4)
EVEN, ADAPTIVE = "even", "adaptive"


@dataclass(frozen=True, kw_only=True)
class Run:
    """One solution on the way.

    Parameters
    ----------
    unknowns : int
        Free unknowns.
    error : float
        Share by which the number is off its value.
    half_band : float or None
        Half the width of its band, as a share.
    seconds : float
        CPU time with meshing.
    """

    unknowns: int
    error: float
    half_band: float | None
    seconds: float


@dataclass(frozen=True, kw_only=True)
class Series:
    """One element on one kind of meshes.

    Parameters
    ----------
    element, meshes : str
        Which; "even" or "adaptive".
    runs : tuple of Run
        From coarse to fine.
    """

    element: str
    meshes: str
    runs: tuple[Run, ...]

    def order(self, least: float) -> float | None:
        """Power of the triangles' size with which the error falls.

        The slope through the runs whose error is more than `least`, the two coarsest
        left out; ``None`` with fewer than three of them. Adaptive meshes have no one
        size: theirs is that of as many unknowns spread evenly.
        """
        used = [run for run in self.runs[2:] if run.error > least]
        if len(used) < 3:
            return None
        h = [-0.5 * math.log(run.unknowns) for run in used]
        return float(np.polyfit(h, [math.log(run.error) for run in used], 1)[0])


@dataclass(frozen=True, kw_only=True)
class Study:
    """How one number of a case converges.

    Parameters
    ----------
    case, title, words : str
        The case and the number in words.
    value : float
        What the number is, without finite elements.
    resolution : float
        Half a unit of its last trusted digit, as a share: no error below is known.
    series : tuple of Series
        Element by element.
    """

    case: str
    title: str
    words: str
    value: float
    resolution: float
    series: tuple[Series, ...]


def study(problem: dict[str, Any], number: int = 1, most: int = MOST) -> Study:
    """Measure one number of a case.

    Parameters
    ----------
    problem : dict
        Its record.
    number : int
        Which of its numbers, from 1.
    most : int
        Unknowns to stop at.

    Raises
    ------
    InputError
        If there is no such number, or no value of it.
    """
    items = problem["quantities"]
    if not 1 <= number <= len(items):
        raise InputError(
            f"{problem['id']} has numbers 1 to {len(items)}, not {number}."
        )
    item = items[number - 1]
    if not item.get("value"):
        raise InputError(
            f"number {number} of {problem['id']} has no value to converge to, or it is "
            "0; choose another."
        )
    plate = cases.plate(problem)
    series = []
    for element in ELEMENTS:
        try:
            runs = tuple(_even(problem, plate, item, element, most))
        except KplateError:  # the element does not suit the plate
            continue
        series.append(Series(element=element, meshes=EVEN, runs=runs))
        if ELEMENTS[element].conforming:
            runs = tuple(_adaptive(problem, plate, item, element, most))
            series.append(Series(element=element, meshes=ADAPTIVE, runs=runs))
    digits = 10.0 ** (1 - item["digits"])
    return Study(
        case=problem["id"],
        title=problem["title"],
        words=f"{item['coefficient']} at {item['place']}",
        value=item["value"],
        resolution=0.5 * digits,
        series=tuple(one for one in series if one.runs),
    )


def lines(own: Study) -> Iterator[str]:
    """Lines of a table."""
    row = "{:8s} {:9s} {:>9s} {:>12s} {:>12s} {:>9s}"
    yield f"{own.case}: {own.title}"
    yield f"{own.words}, {own.value:.10g}; errors below {own.resolution:.0e} unknown"
    yield row.format("element", "meshes", "unknowns", "error", "half band", "CPU s")
    for series in own.series:
        for run in series.runs:
            band = "-" if run.half_band is None else f"{run.half_band:.2e}"
            cells = (
                f"{run.unknowns:,}",
                f"{run.error:.2e}",
                band,
                f"{run.seconds:.2f}",
            )
            yield row.format(series.element, series.meshes, *cells)
    yield "observed order, as a power of the size of triangles:"
    for series in own.series:
        order = series.order(10.0 * own.resolution)
        words = "not known" if order is None else f"{order:.2f}"
        yield f"  {series.element:8s} {series.meshes:9s} {words}"


def _even(
    problem: dict[str, Any],
    plate: kp.Plate,
    item: dict[str, Any],
    element: str,
    most: int,
) -> Iterator[Run]:
    last = 0
    for count in COUNTS:
        start = time.process_time()
        solution = kp.solve(
            plate, cases.loads(problem), triangles=count, element=element
        )
        unknowns = _unknowns(solution)
        if unknowns > most:
            return
        found = cases.computed(solution, item)
        if unknowns <= last or math.isnan(found):
            continue
        last = unknowns
        error = abs(found / item["value"] - 1.0)
        cpu = time.process_time() - start
        yield Run(unknowns=unknowns, error=error, half_band=None, seconds=cpu)


def _adaptive(
    problem: dict[str, Any],
    plate: kp.Plate,
    item: dict[str, Any],
    element: str,
    most: int,
) -> Iterator[Run]:
    asked = ask(plate, problem, item)
    if asked.reason:
        return
    last = 0
    for tolerance in TOLERANCES:
        start = time.process_time()
        solution = kp.solve(
            plate,
            cases.loads(problem),
            tolerance=tolerance,
            goals=asked.goals,
            element=element,
            budget=most,
        )
        values = [solution.value(goal) for goal in asked.goals]
        if any(value.lower is None for value in values):
            return
        unknowns = _unknowns(solution)
        if unknowns > last:
            last = unknowns
            value, lower, upper = combined(asked, values)
            yield Run(
                unknowns=unknowns,
                error=abs(value / item["value"] - 1.0),
                half_band=abs(0.5 * (upper - lower) / item["value"]),
                seconds=time.process_time() - start,
            )
        if not solution.reached:
            return


def _unknowns(solution: kp.Solution) -> int:
    return int(np.count_nonzero(solution.state.constraints.free))
