"""The run as text and as JSON: numbers, sums by family, suspected misprints."""

import statistics
from collections.abc import Iterator, Sequence
from dataclasses import asdict, dataclass
from typing import Any

from benchmarks import records
from benchmarks.numbers import Measured, Number

ROW = "  {:14s} {:30.30s} {:>12s} {:>12s} {:>9s} {:>10s} {:>11s} {:7s} {}"
HEAD = (
    "coefficient", "where", "published", "computed", "band", "deviation",
    "value", "print", "published in; value by",
)  # fmt: skip
LEGEND = """Numbers are as handbooks count them: deflection along the load, corner
forces positive where the corner is held down. Values were computed without finite
elements. 'inside': rounds to the last printed digit; '0.1 %': that near; 'beyond':
further off. A deviation is a share of the value, or of 2 % of the largest of its kind
in the case where that is more. No mark: bound; ~ estimate; ? indicator. 'from memory':
recalled, not looked up. Results are for a qualified engineer's judgement; local codes
and licensed practice decide."""
MARKS = {"bound": "", "estimate": " ~", "indicator": " ?"}
FAMILY = "{:28s} {:>8} {:>7} {:>7} {:>7} {:>9} {:>7} {:>7} {:>10} {:>10}"


@dataclass(frozen=True, kw_only=True)
class Tally:
    """Counts of a family, or of all.

    Parameters
    ----------
    family : str
        Its name.
    numbers, near, beyond : int
        Numbers with a value; those within 0.1 % of it; those further off.
    median, largest : float
        Deviation from the values, as shares.
    figures, inside, printed_near, printed_beyond : int
        Numbers with a figure in print; those that round to it; those that do not but
        are within 0.1 % of it; those further off.
    """

    family: str
    numbers: int
    near: int
    beyond: int
    median: float
    largest: float
    figures: int
    inside: int
    printed_near: int
    printed_beyond: int


@dataclass(frozen=True, kw_only=True)
class Misprint:
    """A figure in print that its value does not round to.

    Parameters
    ----------
    number : Number
        The number.
    figure : Figure
        The figure.
    units : float
        How many units of the last printed digit the value is off.
    excluded : bool
        Whether a bound proven by kplate leaves the figure out as well.
    """

    number: Number
    figure: records.Figure
    units: float
    excluded: bool

    @property
    def cut(self) -> bool:
        """Whether its last digit is cut off where it should be rounded."""
        assert self.number.value is not None
        return self.units < 1.0 and abs(self.figure.published) < abs(self.number.value)

    @property
    def words(self) -> str:
        """The evidence in one sentence."""
        own = self.number
        proof = (
            f"; kplate's bound {own.lower:.6g} to {own.upper:.6g} leaves it out"
            if self.excluded
            else ""
        )
        return (
            f"printed {self.figure.published:.6g} in {self.figure.words}, value "
            f"{own.value:.8g} ({own.digits} digits: {own.method}), "
            f"{self.units:.1f} units of the last printed digit off"
            + ", cut off, not rounded" * self.cut
            + proof
        )


def numbers_of(run: Sequence[Measured]) -> list[Number]:
    """All numbers of a run."""
    return [number for one in run for number in one.numbers]


def tally(family: str, numbers: Sequence[Number]) -> Tally:
    """Count a family."""
    with_value = [n for n in numbers if n.value is not None]
    deviations = [abs(n.deviation) for n in with_value]
    printed = [n.print_class() for n in numbers]
    beyond = [n.value_class() for n in with_value].count("beyond")
    return Tally(
        family=family,
        numbers=len(with_value),
        near=len(with_value) - beyond,
        beyond=beyond,
        median=statistics.median(deviations) if deviations else 0.0,
        largest=max(deviations, default=0.0),
        figures=len(printed) - printed.count(""),
        inside=printed.count("inside"),
        printed_near=printed.count("0.1 %"),
        printed_beyond=printed.count("beyond"),
    )


def tallies(run: Sequence[Measured]) -> list[Tally]:
    """Counts by family, then of all."""
    numbers = numbers_of(run)
    names = dict.fromkeys(number.family for number in numbers)
    own = [tally(name, [n for n in numbers if n.family == name]) for name in names]
    return [*own, tally("all", numbers)]


def misprints(run: Sequence[Measured]) -> list[Misprint]:
    """Figures in print that their values do not round to, the furthest off first."""
    found = [
        Misprint(
            number=number,
            figure=figure,
            units=abs((number.value or 0.0) - figure.published)
            / (2.0 * figure.half_unit),
            excluded=number.excludes(figure),
        )
        for number in numbers_of(run)
        for figure in number.misprints()
    ]
    return sorted(found, key=lambda one: -one.units)


def lines(measured: Measured) -> Iterator[str]:
    """Lines about one case."""
    own = measured.problem
    how = f"{measured.element}, {measured.unknowns:,} unknowns"
    yield f"\n{own['id']}: {own['title']} ({own['family']})"
    if not measured.numbers:
        yield f"  not solved: {measured.failure}"
        return
    yield f"  nu {own['nu']:g}; {how}" + f"; {measured.failure}" * bool(
        measured.failure
    )
    yield ROW.format(*HEAD)
    for number in measured.numbers:
        yield _row(number)


def _row(number: Number) -> str:
    figure = number.figures[0] if number.figures else None
    half = number.half_band
    band = "-" if half is None else f"{percent(half)}{MARKS.get(number.kind, '')}"
    printed = "none known" if figure is None else f"{figure.published:.6g}"
    value = "none known" if number.value is None else f"{number.value:.7g}"
    deviation = f"{100.0 * number.deviation:+.4f} %"
    words = f"{figure.words}; " if figure else ""
    return ROW.format(
        number.coefficient, number.place, printed, f"{number.computed:.7g}", band,
        deviation, value, number.print_class() or "-", words + number.method,
    )  # fmt: skip


def percent(share: float) -> str:
    """A share in per cent, two digits."""
    return f"{100.0 * share:.2g} %" if share >= 1e-6 else "< 1e-4 %"


def summary(run: Sequence[Measured]) -> Iterator[str]:
    """Sums by family, suspected misprints, cases that were not solved."""
    yield "\n" + FAMILY.format(
        "family", "in print", "inside", "0.1 %", "beyond",
        "values", "0.1 %", "beyond", "median", "largest",
    )  # fmt: skip
    for one in tallies(run):
        yield FAMILY.format(
            one.family, one.figures, one.inside, one.printed_near,
            one.printed_beyond, one.numbers, one.near, one.beyond,
            f"{100.0 * one.median:.5f} %", f"{100.0 * one.largest:.3f} %",
        )  # fmt: skip
    found = misprints(run)
    yield (
        f"\n{len(found)} figures in print that the values do not round to "
        "(misprints, short series, or wrongly recalled; "
        f"{sum(one.cut for one in found)} cut off where they should be rounded):"
    )
    for one in found:
        own = one.number
        yield f"  {own.case}, {own.coefficient} at {own.place}: {one.words}"
    for measured in run:
        if not measured.numbers:
            yield f"not solved: {measured.problem['id']}: {measured.failure}"
    left = records.reference()["left_out"]
    yield f"\n{len(left)} problems of the reference set that kplate cannot state:"
    for feature in dict.fromkeys(left.values()):
        names = [name for name, why in left.items() if why == feature]
        yield f"  {feature}: {', '.join(names)}"
    yield "\nIn print, and how values were computed:"
    known = records.reference()
    for name, words in (known["publications"] | known["sources"]).items():
        yield f"  {name}: {words}"
    yield f"\n{LEGEND}"


def as_json(run: Sequence[Measured]) -> dict[str, Any]:
    """The run as plain data."""
    return {
        "tallies": [asdict(one) for one in tallies(run)],
        "misprints": [
            {"case": m.number.case, "place": m.number.place, "evidence": m.words}
            for m in misprints(run)
        ],
        "cases": [
            {
                "id": one.problem["id"],
                "title": one.problem["title"],
                "element": one.element,
                "unknowns": one.unknowns,
                "seconds": round(one.seconds, 3),
                "failure": one.failure,
                "numbers": [
                    {
                        **asdict(n),
                        "deviation": n.deviation,
                        "print_class": n.print_class(),
                        "value_class": n.value_class(),
                    }
                    for n in one.numbers
                ],
            }
            for one in run
        ],
    }
