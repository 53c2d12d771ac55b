"""Bands against the reference: ``python -m benchmarks bands --tolerance 0.01``.

Every number of a bending problem with straight sides is stated as a goal where its kind
allows a bound, the plate is solved to the tolerance for all of them together, and the
band is set beside the value computed without finite elements. A principal moment takes
the eigenvalues over the box of three components; a moment at a clamped edge follows
from m_nn alone. Numbers without a bound are listed with the reason.
"""

import math
import resource
import statistics
import time
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

import kplate as kp
from benchmarks import cases
from kplate.errors import SolveError

COMPONENTS = ("m_xx", "m_yy", "m_xy")
ON_A_LINE = 1e-9  # m from a side or a vertex; the plates are about 1 m wide
LINE = "{:22s} {:28s} {:>13s} {:>13s} {:>13s} {:>13s} {:>4s} {:>7s}"


@dataclass(frozen=True, kw_only=True)
class Asked:
    """A number of a problem as goals, or why it is none.

    Parameters
    ----------
    item : dict
        The number as the reference file states it.
    goals : tuple of Goal
        What it follows from; empty where there is a reason.
    share : float
        What it is of m_nn, where it lies on a clamped edge; 0 elsewhere.
    reason : str
        Why there is no bound.
    """

    item: dict[str, Any]
    goals: tuple[kp.Goal, ...] = ()
    share: float = 0.0
    reason: str = ""

    @property
    def words(self) -> str:
        """What, and where."""
        x, y = self.item["at"]
        return f"{self.item['quantity']} at ({x:.4g}, {y:.4g})"


@dataclass(frozen=True, kw_only=True)
class Band:
    """A number with its band, scaled as the reference is.

    Parameters
    ----------
    case, quantity : str
        Which.
    value, lower, upper : float
        What kplate finds.
    kind : str
        What the band is worth.
    reference, rounding : float
        The value computed otherwise, and half a unit of its last trusted digit.
    """

    case: str
    quantity: str
    value: float
    lower: float
    upper: float
    kind: str
    reference: float
    rounding: float

    @property
    def inside(self) -> bool:
        """Whether the reference lies in the band, but for its rounding."""
        low, high = self.lower - self.rounding, self.upper + self.rounding
        return low <= self.reference <= high

    @property
    def effectivity(self) -> float:
        """Half width over true error; nan where the reference does not resolve it."""
        error = abs(self.value - self.reference)
        half = 0.5 * (self.upper - self.lower)
        return half / error if error > 10.0 * self.rounding else math.nan


@dataclass(kw_only=True)
class Tally:
    """What a run adds up to."""

    bands: list[Band] = field(default_factory=list)
    left_out: list[tuple[str, Asked, str]] = field(default_factory=list)
    failed: list[tuple[str, str]] = field(default_factory=list)
    unreached: list[str] = field(default_factory=list)
    unknowns: list[int] = field(default_factory=list)
    seconds: list[float] = field(default_factory=list)


def main(tolerance: float, names: Sequence[str] | None = None) -> int:
    """Print every number and the counts; return how many bounds are false."""
    start, tally = time.perf_counter(), Tally()
    head = ("case", "quantity", "value", "lower", "upper", "reference", "in", "eff.")
    print(LINE.format(*head))
    for problem in straight(names):
        for band in bands(problem, tolerance, tally):
            numbers = (band.value, band.lower, band.upper, band.reference)
            mark = "yes" if band.inside else "NO"
            ratio = "-" if math.isnan(band.effectivity) else f"{band.effectivity:.3g}"
            cells = (f"{number:.8g}" for number in numbers)
            first = (band.case, band.quantity)
            print(LINE.format(*first, *cells, mark, ratio), flush=True)
    _print_counts(tally, tolerance, time.perf_counter() - start)
    return len(_false(tally))


def straight(names: Sequence[str] | None = None) -> Iterator[dict[str, Any]]:
    """Problems whose sides are all straight, those of these names only if given."""
    for problem in cases.records():
        lines = [problem["outline"], *problem["holes"]]
        wanted = names is None or problem["id"] in names
        if wanted and all("polygon" in line for line in lines):
            yield problem


def bands(problem: dict[str, Any], tolerance: float, tally: Tally) -> Iterator[Band]:
    """Solve a problem to a tolerance for all its numbers, and add to the tally."""
    plate, name = cases.plate(problem), problem["id"]
    asked = [ask(plate, problem, item) for item in problem["quantities"]]
    goals = tuple(dict.fromkeys(goal for one in asked for goal in one.goals))
    tally.left_out += [(name, one, one.reason) for one in asked if one.reason]
    if not goals:
        return
    start = _cpu()
    try:
        solution = kp.solve(plate, loads(problem), tolerance=tolerance, goals=goals)
    except SolveError as error:
        tally.failed.append((name, str(error)))
        return
    tally.seconds.append(_cpu() - start)
    tally.unknowns.append(solution.history[-1].unknowns)
    if not solution.reached:
        tally.unreached.append(name)
    for one in asked:
        if one.reason:
            continue
        found = [solution.value(goal) for goal in one.goals]
        lost = [value.reason for value in found if value.lower is None]
        if lost:
            tally.left_out.append((name, one, lost[0]))
            continue
        band = _band(name, one, found)
        tally.bands.append(band)
        yield band


def loads(problem: dict[str, Any]) -> list[Any]:
    """Loads of a problem; a linear pressure as a liquid and an even one.

    As a function kplate could not know that it is linear.
    """
    stated = problem["load"]
    if stated["kind"] != "linear":
        return [cases.load(problem)]
    steep = math.hypot(*stated["gradient"])
    up = tuple(-slope / steep for slope in stated["gradient"])
    deep = 100.0  # m above the origin: the surface is off the plate
    liquid = kp.Hydrostatic(level=deep, specific_weight=steep, up=up)
    return [liquid, kp.Pressure(stated["at_origin"] - deep * steep)]


def ask(plate: kp.Plate, problem: dict[str, Any], item: dict[str, Any]) -> Asked:
    """State a number as goals."""
    quantity, at = item["quantity"], tuple(item["at"])
    if quantity == "corner force":
        return Asked(item=item, reason="a corner force is no bounded functional")
    if quantity == "deflection":
        return Asked(item=item, goals=(kp.Deflection(at=at),))
    if quantity == "point reaction":
        marks = problem["marks"]
        names = [mark["name"] for mark in marks if tuple(mark["at"]) == at]
        return Asked(item=item, goals=(kp.Resultant(of=names[0]),))
    sides = _sides_at(plate, at)
    if len(sides) > 1:
        return Asked(item=item, reason="lies in a corner")
    support, normal = sides[0] if sides else (None, (0.0, 0.0))
    if quantity == "line reaction":
        if support != kp.SIMPLY_SUPPORTED:
            where = f"on a {support.name} side" if support else "on a line support"
            return Asked(item=item, reason=f"lies {where}")
        return Asked(item=item, goals=(kp.LineReaction(at=at),))
    if support == kp.CLAMPED:
        share = _share_of_clamping(item, normal, problem["nu"])
        return Asked(item=item, goals=(kp.ClampingMoment(at=at),), share=share)
    if support is not None:
        return Asked(item=item, reason=f"lies on a {support.name} side")
    wanted = (quantity,) if quantity in COMPONENTS else COMPONENTS
    goals = tuple(kp.Moment(at=at, component=component) for component in wanted)
    return Asked(item=item, goals=goals)


def _sides_at(
    plate: kp.Plate, at: tuple[float, float]
) -> list[tuple[Any, tuple[float, float]]]:
    """Support and outward normal of the sides on which a place lies."""
    found = []
    for line in plate.outline.boundaries:
        for start, end, name in zip(line.points, line.ends, line.sides, strict=True):
            length = float(np.hypot(*(end - start)))
            x, y = (end - start) / length
            along, across = np.array([[x, y], [y, -x]]) @ (np.asarray(at) - start)
            if abs(across) < ON_A_LINE and -ON_A_LINE < along < length + ON_A_LINE:
                found.append((plate.support(name), (float(y), float(-x))))
    return found


def _band(name: str, asked: Asked, found: Sequence[kp.Value]) -> Band:
    """One number's band from those of its goals."""
    item = asked.item
    ends = [[v.value, v.lower, v.upper] for v in found]
    value, lower, upper = _combined(asked, np.array(ends, dtype=float).T)
    scale = cases.STIFFNESS if item["quantity"] == "deflection" else 1.0
    exponent = math.floor(math.log10(abs(item["value"]))) if item["value"] else 0
    return Band(
        case=name,
        quantity=asked.words,
        value=value * scale,
        lower=lower * scale,
        upper=upper * scale,
        kind=next((v.kind for v in found if v.kind != "bound"), "bound"),
        reference=item["value"],
        rounding=0.5 * 10.0 ** (exponent + 1 - item["digits"]),
    )


def _combined(asked: Asked, ends: np.ndarray) -> tuple[float, float, float]:
    """Value and ends of a number from those of its goals (3, k)."""
    quantity = asked.item["quantity"]
    if asked.share:
        value, *own = (asked.share * ends[:, 0]).tolist()
        return value, min(own), max(own)
    if quantity in ("m_1", "m_2"):
        sign = 1.0 if quantity == "m_1" else -1.0
        low, high = ends[1].copy(), ends[2].copy()
        # The larger moment grows with both bending moments and with |m_xy|, the
        # smaller falls with |m_xy|.
        size = np.abs([low[2], high[2]])
        least = 0.0 if low[2] < 0.0 < high[2] else float(size.min())
        twists = (least, float(size.max()))[:: int(sign)]
        low[2], high[2] = twists
        number = 0 if quantity == "m_1" else 1
        three = kp.principal_moments(np.array([ends[0], low, high]))[0][:, number]
        return float(three[0]), float(three[1]), float(three[2])
    weights = np.ones(len(ends[0]))
    if quantity == "moment":
        n_x, n_y = asked.item["normal"]
        weights = np.array([n_x * n_x, n_y * n_y, 2.0 * n_x * n_y])
    middle, half = 0.5 * (ends[1] + ends[2]), 0.5 * (ends[2] - ends[1])
    centre, reach = float(weights @ middle), float(np.abs(weights) @ half)
    return float(weights @ ends[0]), centre - reach, centre + reach


def _share_of_clamping(
    item: dict[str, Any], normal: tuple[float, float], nu: float
) -> float:
    """A moment at a clamped edge over m_nn there; along it m_tt is nu m_nn."""
    n = np.array(normal)
    tensor = np.outer(n, n) + nu * (np.eye(2) - np.outer(n, n))
    if item["quantity"] == "moment":
        given = np.array(item["normal"])
        return float(given @ tensor @ given)
    i, j = {"m_xx": (0, 0), "m_yy": (1, 1), "m_xy": (0, 1)}[item["quantity"]]
    return float(tensor[i, j])


def _cpu() -> float:
    """CPU seconds of this process and of those it waited for."""
    whose = (resource.RUSAGE_SELF, resource.RUSAGE_CHILDREN)
    used = [resource.getrusage(who) for who in whose]
    return sum(own.ru_utime + own.ru_stime for own in used)


def _false(tally: Tally) -> list[Band]:
    return [b for b in tally.bands if b.kind == "bound" and not b.inside]


def _print_counts(tally: Tally, tolerance: float, seconds: float) -> None:
    print("\nnot offered:")
    for name, asked, reason in tally.left_out:
        print(f"  {name:20s} {asked.words:32s} {reason}")
    for name, message in tally.failed:
        print(f"  {name:20s} not solved: {message}")
    proven = [b for b in tally.bands if b.kind == "bound"]
    ratios = sorted(b.effectivity for b in proven if not math.isnan(b.effectivity))
    print(f"\ntolerance {100 * tolerance:g} %, {len(tally.unknowns)} problems")
    print(f"bounds {len(proven)}, estimates {len(tally.bands) - len(proven)}")
    print(f"false bounds {len(_false(tally))}")
    for band in _false(tally):
        print(f"  {band.case} {band.quantity}")
    print(f"not offered {len(tally.left_out)}, not solved {len(tally.failed)}")
    print(f"tolerance not reached in {len(tally.unreached)}", *tally.unreached)
    if ratios:
        print(
            f"half width / true error: median {statistics.median(ratios):.3g}, "
            f"largest {ratios[-1]:.3g}, smallest {ratios[0]:.3g} ({len(ratios)} bounds)"
        )
    if tally.unknowns:
        print(
            f"unknowns: median {statistics.median(tally.unknowns):.0f}, largest "
            f"{max(tally.unknowns)}; CPU seconds: median "
            f"{statistics.median(tally.seconds):.2f}, largest "
            f"{max(tally.seconds):.2f}, sum {sum(tally.seconds):.1f}; {seconds:.0f} s "
            "in all"
        )
