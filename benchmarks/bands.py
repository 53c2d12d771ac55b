"""Bands against the reference: ``python -m benchmarks bands --tolerance 0.01``.

Every number of a bending problem, round ones too, is stated as a goal where its kind
allows a bound, the plate is solved to the tolerance for all of them together, and the
band is set beside the value computed without finite elements. Numbers without a bound
are listed with the reason.
"""

import math
import resource
import statistics
import time
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from typing import Any

import kplate as kp
from benchmarks import cases, records
from benchmarks.asking import Asked, ask, combined
from benchmarks.energies import Energy, energy
from kplate.errors import SolveError

LINE = "{:22s} {:28s} {:>13s} {:>13s} {:>13s} {:>13s} {:>4s} {:>7s}"


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
    energies: list[Energy] = field(default_factory=list)


def main(tolerance: float, names: Sequence[str] | None = None) -> int:
    """Print every number and the counts; return how many bounds are false."""
    start, tally = time.perf_counter(), Tally()
    head = ("case", "quantity", "value", "lower", "upper", "reference", "in", "eff.")
    print(LINE.format(*head))
    for problem in records.chosen(names or (), None):
        for band in bands(problem, tolerance, tally):
            numbers = (band.value, band.lower, band.upper, band.reference)
            mark = "yes" if band.inside else "NO"
            ratio = "-" if math.isnan(band.effectivity) else f"{band.effectivity:.3g}"
            cells = (f"{number:.8g}" for number in numbers)
            first = (band.case, band.quantity)
            print(LINE.format(*first, *cells, mark, ratio), flush=True)
    _print_counts(tally, tolerance, time.perf_counter() - start)
    outside = [e for e in tally.energies if not e.inside]
    return len(_false(tally)) + len(outside)


def is_round(problem: dict[str, Any]) -> bool:
    """Whether a record has an arc in its outline, its holes or its seams."""
    lines = [problem["outline"], *problem["holes"], *problem.get("seams", ())]
    return any("bulges" in l or "circle" in l or "ellipse" in l for l in lines)


def bands(problem: dict[str, Any], tolerance: float, tally: Tally) -> Iterator[Band]:
    """Solve a problem to a tolerance for all its numbers, and add to the tally."""
    plate, name = cases.plate(problem), problem["id"]
    items = [item for item in problem["quantities"] if "value" in item]
    asked = [ask(plate, problem, item) for item in items]
    goals = tuple(dict.fromkeys(goal for one in asked for goal in one.goals))
    tally.left_out += [(name, one, one.reason) for one in asked if one.reason]
    if not goals:
        return
    start = _cpu()
    try:
        solution = kp.solve(
            plate, cases.loads(problem), tolerance=tolerance, goals=goals
        )
    except SolveError as error:
        tally.failed.append((name, str(error)))
        return
    tally.seconds.append(_cpu() - start)
    tally.unknowns.append(solution.history[-1].unknowns)
    if not solution.reached:
        tally.unreached.append(name)
    try:
        found = energy(problem, plate, cases.loads(problem), solution.energies[0])
        tally.energies.append(found)
    except SolveError as error:
        tally.failed.append((f"{name} (finer)", str(error)))
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


def _band(name: str, asked: Asked, found: Sequence[kp.Value]) -> Band:
    """One number's band from those of its goals."""
    item = asked.item
    value, lower, upper = combined(asked, found)
    exponent = math.floor(math.log10(abs(item["value"]))) if item["value"] else 0
    return Band(
        case=name,
        quantity=asked.words,
        value=value,
        lower=lower,
        upper=upper,
        kind=next((v.kind for v in found if v.kind != "bound"), "bound"),
        reference=item["value"],
        rounding=0.5 * 10.0 ** (exponent + 1 - item["digits"]),
    )


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
    _print_energies(tally)
    if tally.unknowns:
        print(
            f"unknowns: median {statistics.median(tally.unknowns):.0f}, largest "
            f"{max(tally.unknowns)}; CPU seconds: median "
            f"{statistics.median(tally.seconds):.2f}, largest "
            f"{max(tally.seconds):.2f}, sum {sum(tally.seconds):.1f}; {seconds:.0f} s "
            "in all"
        )


def _print_energies(tally: Tally) -> None:
    """Print the gap beside the true error of each energy, by source."""
    line = "{:22s} {:>16s} {:>16s} {:>16s} {:>4s} {:>6s}  {}"
    print("\nenergies for D = 1; gap / true error in the norm of the energy")
    print(line.format("case", "lower", "upper", "reference", "in", "eff.", "source"))
    for own in tally.energies:
        cells = (f"{x:.10g}" for x in (own.lower, own.upper, own.reference))
        ratio = "-" if math.isnan(own.effectivity) else f"{own.effectivity:.3f}"
        print(
            line.format(
                own.case, *cells, "yes" if own.inside else "NO", ratio, own.source
            )
        )
    for source in dict.fromkeys(own.source for own in tally.energies):
        ratios = sorted(
            own.effectivity
            for own in tally.energies
            if own.source == source and not math.isnan(own.effectivity)
        )
        if ratios:
            print(
                f"by {source}: median {statistics.median(ratios):.3f}, smallest "
                f"{ratios[0]:.3f}, largest {ratios[-1]:.3f} ({len(ratios)} energies)"
            )
    print()
