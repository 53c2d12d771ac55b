"""Every number of a case beside what kplate finds, and how near it comes.

A plate is solved to a tolerance for all its numbers that have a goal, which gives them
bands; the others (corner forces, numbers on round, free and guided sides) are read from
one fine mesh, without a band.
"""

import math
import time
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

import kplate as kp
from benchmarks import cases, records
from benchmarks.asking import Asked, ask, combined
from benchmarks.bands import is_round
from kplate.errors import KplateError

TOLERANCE = 1e-3  # half width of the bands asked for
NEAR = 1e-3  # a deviation below is within 0.1 %
BUDGET = 12_000  # unknowns beyond which round plates are not refined for their bands
BAR = 0.02  # of the largest of its kind: what is smaller is measured against that


@dataclass(frozen=True, kw_only=True)
class Number:
    """One number of one case beside what kplate finds, as handbooks count it.

    Parameters
    ----------
    case, family, quantity, place, coefficient : str
        Which.
    value : float or None
        Computed without finite elements, to `digits` significant digits.
    digits : int
        How many digits of it are meant.
    method : str
        How it was computed, by its short name (`sources` of the reference file).
    figures : tuple of Figure
        What is in print; the first is the one judged.
    computed : float
        What kplate finds.
    lower, upper : float or None
        Ends of its band.
    kind : str
        What the band is worth; "none" without one.
    reason : str
        Why there is no band.
    scale : float
        Largest of the same kind in the case, for small numbers.
    """

    case: str
    family: str
    quantity: str
    place: str
    coefficient: str
    value: float | None
    digits: int
    method: str
    figures: tuple[records.Figure, ...]
    computed: float
    lower: float | None = None
    upper: float | None = None
    kind: str = "none"
    reason: str = ""
    scale: float = 0.0

    @property
    def deviation(self) -> float:
        """Share by which the magnitude is too large, of value or 2 % of the scale.

        From the value computed without finite elements, from the figure without one.
        """
        against = self.figures[0].published if self.value is None else self.value
        larger = max(abs(against), BAR * self.scale)
        return math.copysign(1.0, against) * (self.computed - against) / larger

    @property
    def half_band(self) -> float | None:
        """Half the band's width as a share of the computed number."""
        if self.lower is None or self.upper is None:
            return None
        return (
            0.5 * (self.upper - self.lower) / max(abs(self.computed), BAR * self.scale)
        )

    @property
    def rounding(self) -> float:
        """Half a unit of the last trusted digit of the value."""
        if not self.value:
            return 0.5 * 10.0**-self.digits
        return 0.5 * 10.0 ** (math.floor(math.log10(abs(self.value))) + 1 - self.digits)

    def print_class(self) -> str:
        """How the computed number stands to the first figure in print.

        "inside" its last printed digit, "0.1 %" where it is not but that near,
        "beyond"; empty without a figure.
        """
        if not self.figures:
            return ""
        figure = self.figures[0]
        if figure.holds(self.computed):
            return "inside"
        larger = max(abs(figure.published), BAR * self.scale)
        near = abs(self.computed - figure.published) <= NEAR * larger
        return "0.1 %" if near else "beyond"

    def value_class(self) -> str:
        """The same to the value: "digits", "0.1 %" or "beyond"."""
        if self.value is None:
            return ""
        if abs(self.computed - self.value) <= self.rounding:
            return "digits"
        return "0.1 %" if abs(self.deviation) <= NEAR else "beyond"

    def misprints(self) -> list[records.Figure]:
        """Figures in print to which the value does not round."""
        if self.value is None:
            return []
        return [f for f in self.figures if not f.holds(self.value, self.rounding)]

    def excludes(self, figure: records.Figure) -> bool:
        """Whether a proven bound leaves out all that rounds to a figure."""
        if self.kind != "bound" or self.lower is None or self.upper is None:
            return False
        room = figure.half_unit * (1.0 + 1e-9)
        low, high = figure.published - room, figure.published + room
        return low > self.upper or high < self.lower


@dataclass(frozen=True, kw_only=True)
class Measured:
    """A case as it was solved.

    Parameters
    ----------
    problem : dict
        Its record.
    numbers : tuple of Number
        Its numbers; empty where it could not be solved.
    element : str
        Name of the element.
    unknowns : int
        Of the mesh that has the bands, or of the one mesh.
    seconds : float
        Wall clock, which another's work on the machine lengthens.
    failure : str
        Why it was not solved, or why there are no bands; empty where all is well.
    """

    problem: dict[str, Any]
    numbers: tuple[Number, ...]
    element: str = ""
    unknowns: int = 0
    seconds: float = 0.0
    failure: str = ""


def measure(
    problem: dict[str, Any],
    *,
    tolerance: float | None = None,
    element: str = "auto",
    triangles: int | None = None,
) -> Measured:
    """Solve a case and set every number beside its reference.

    Parameters
    ----------
    problem : dict
        Its record.
    tolerance : float, optional
        Half width of the bands asked for; 0.1 % if left out.
    element : str
        As for `kplate.solve`.
    triangles : int, optional
        One mesh of about so many triangles instead of bands.
    """
    start = time.perf_counter()
    try:
        plate, loads = cases.plate(problem), cases.loads(problem)
        asked = [ask(plate, problem, item) for item in problem["quantities"]]
        banded, failure = None, ""
        if triangles is None and element != "dkt":
            banded, failure = _banded(plate, loads, problem, asked, tolerance, element)
        plain = None
        if banded is None or any(one.reason for one in asked):
            plain = kp.solve(plate, loads, triangles=triangles, element=element)
        numbers = tuple(_numbers(problem, asked, banded, plain))
    except KplateError as error:
        return Measured(problem=problem, numbers=(), failure=str(error))
    told = plain if banded is None else banded
    assert told is not None
    return Measured(
        problem=problem,
        numbers=numbers,
        element=told.state.element.name,
        unknowns=int(np.count_nonzero(told.state.constraints.free)),
        seconds=time.perf_counter() - start,
        failure=failure,
    )


def _banded(
    plate: kp.Plate,
    loads: list[Any],
    problem: dict[str, Any],
    asked: Sequence[Asked],
    tolerance: float | None,
    element: str,
) -> tuple[kp.Solution | None, str]:
    """Solve to a tolerance for all goals; nothing, and why, where that fails."""
    goals = tuple(dict.fromkeys(goal for one in asked for goal in one.goals))
    if not goals:
        return None, ""
    tolerance = TOLERANCE if tolerance is None else tolerance
    more = {"budget": BUDGET} if is_round(problem) else {}
    try:
        solution = kp.solve(
            plate,
            loads,
            tolerance=tolerance,
            goals=goals,
            element=element,
            **more,
        )
    except KplateError as error:
        return None, str(error)
    return solution, "" if solution.reached else "tolerance not reached"


def _numbers(
    problem: dict[str, Any],
    asked: Sequence[Asked],
    banded: kp.Solution | None,
    plain: kp.Solution | None,
) -> Iterator[Number]:
    largest: dict[str, float] = {}
    for item in problem["quantities"]:
        kind = cases.kind(item["quantity"])
        known = [f.published for f in records.figures(item)]
        known += [item["value"]] if "value" in item else []
        largest[kind] = max([largest.get(kind, 0.0), *(abs(one) for one in known)])
    for one in asked:
        item, sign = one.item, records.sign(one.item)
        computed, lower, upper, worth, reason = _found(one, banded, plain)
        ends = sorted([sign * lower, sign * upper]) if worth != "none" else [None, None]
        yield Number(
            case=problem["id"],
            family=problem["family"],
            quantity=item["quantity"],
            place=item["place"],
            coefficient=item["coefficient"],
            value=sign * item["value"] + 0.0 if "value" in item else None,
            digits=item.get("digits", 0),
            method=records.method_name(item),
            figures=tuple(_turned(f, sign) for f in records.figures(item)),
            computed=sign * computed,
            lower=ends[0],
            upper=ends[1],
            kind=worth,
            reason=reason,
            scale=largest[cases.kind(item["quantity"])],
        )


def _found(
    asked: Asked, banded: kp.Solution | None, plain: kp.Solution | None
) -> tuple[float, float, float, str, str]:
    """What kplate finds: value, ends, what the band is worth, or why there is none."""
    if banded is not None and not asked.reason:
        values = [banded.value(goal) for goal in asked.goals]
        lost = [value.reason for value in values if value.lower is None]
        if not lost:
            worth = next((v.kind for v in values if v.kind != "bound"), "bound")
            return *combined(asked, values), worth, ""
        return cases.computed(banded, asked.item), 0.0, 0.0, "none", lost[0]
    solution = banded if plain is None else plain
    assert solution is not None
    value = cases.computed(solution, asked.item)
    return value, 0.0, 0.0, "none", asked.reason or "no bands were asked for"


def _turned(figure: records.Figure, sign: float) -> records.Figure:
    return records.Figure(
        published=sign * figure.published,
        half_unit=figure.half_unit,
        publication=figure.publication,
        from_memory=figure.from_memory,
    )
