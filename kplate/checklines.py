"""Rows of the tables that a check prints: values with bands, limits and places."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from kplate.combinations import Purpose
from kplate.envelope import Envelope
from kplate.extremes import corner_extreme, point_extreme, side_extreme
from kplate.goals import Deflection
from kplate.judging import Judged
from kplate.limits import (
    Criterion,
    DeflectionLimit,
    Judgement,
    ReactionLimit,
    Sense,
    StepLimit,
    StressLimit,
    StressRangeLimit,
    Where,
    worst,
)
from kplate.output.tables import Line
from kplate.panel import Panel
from kplate.reactions import CornerForce
from kplate.solution import Solution
from kplate.units import DisplayUnits, Unit
from kplate.values import Value
from kplate.woodarmer import DESIGN

ROUND_OFF = 1e-9  # share of the sum of magnitudes below which a total is none
ZERO = Value(value=0.0)
SLIGHT = 0.01  # share of the largest line reaction below which uplift is not listed


def criteria(panel: Panel) -> tuple[Criterion, ...]:
    """The criteria by which stresses are judged; von Mises where none is."""
    own = [x.criterion for x in panel.limits if isinstance(x, StressLimit)]
    return tuple(dict.fromkeys(own)) or ("von Mises",)


def table_lines(
    panel: Panel, judged: Judged, judgements: Sequence[Judgement]
) -> Iterator[Line]:
    """Numbers of the table: case by case, or of all combinations the worst."""
    ranges = [x for x in judgements if isinstance(x.stated, StressRangeLimit)]
    rest = [x for x in judgements if x not in ranges]
    if judged.combinations:
        yield from _Rows(panel, judged, rest).lines()
    else:
        for case in judged.solution.cases:
            own = [x for x in rest if x.value.case == case]
            yield from _Rows(panel, judged, own, case).lines()
    for judgement in ranges:
        yield Line(
            case="service" if judged.combinations else "all",
            quantity=judgement.quantity,
            value=judgement.value,
            unit=panel.units.stress,
            limit=judgement.limit,
            where=at(judgement.value, panel),
        )


@dataclass(frozen=True, eq=False)
class _Rows:
    """Rows of one case, or of all combinations."""

    panel: Panel
    judged: Judged
    judgements: Sequence[Judgement]
    only: str = ""

    def lines(self) -> Iterator[Line]:
        """All rows."""
        units = self.panel.units
        yield from self._deflections()
        yield from self._limited(StepLimit, units.deflection)
        yield from self._stresses()
        yield from self._design()
        if not self.judged.combinations:
            yield self._total()
        yield from self._corners()
        yield from self._points()
        yield from self._sides()

    def _names(self, purpose: Purpose) -> tuple[str, ...]:
        """What serves a purpose, or everything where nothing does."""
        if self.only:
            return (self.only,)
        return self.judged.names(purpose) or self.judged.names("every")

    def _worst(self, kind: type) -> list[Judgement]:
        """The judgement that decides of each limit of a kind."""
        own = [x for x in self.judgements if isinstance(x.stated, kind)]
        limits = list(dict.fromkeys(x.stated for x in own))
        decides = [worst(x for x in own if x.stated == limit) for limit in limits]
        return [x for x in decides if x is not None]

    def _line(
        self, quantity: str, value: Value, unit: Unit, where: str, limit: float | None
    ) -> Line:
        return Line(
            case=value.case,
            quantity=quantity,
            value=value,
            unit=unit,
            limit=limit,
            where=where,
        )

    def _limited(self, kind: type, unit: Unit) -> Iterator[Line]:
        for found in self._worst(kind):
            where = at(found.value, self.panel)
            yield self._line(found.quantity, found.value, unit, where, found.limit)

    def _deflections(self) -> Iterator[Line]:
        solution, unit = self.judged.solution, self.panel.units.deflection
        found: list[tuple[Value, float | None]] = [
            (x.value, x.limit) for x in self._worst(DeflectionLimit)
        ]
        if not found:
            values = [
                solution.peak("deflection", case=name)
                for name in self._names("service")
            ]
            found = [(max(values, key=lambda value: abs(value.value)), None)]
        for value, limit in found:
            way = "up" if value.value > 0.0 else "down"
            where = f"{at(value, self.panel)}, {way}"
            yield self._line("peak deflection", value, unit, where, limit)
        there = _deflection_there(solution, found[0][0].case)
        if there is not None:
            where = at(there, self.panel)
            yield self._line("deflection there", there, unit, where, None)

    def _stresses(self) -> Iterator[Line]:
        found: list[tuple[str, Value, float | None]] = [
            (x.quantity, x.value, x.limit) for x in self._worst(StressLimit)
        ]
        if not found:
            values = [
                self.judged.solution.peak("von Mises", case=name)
                for name in self._names("strength")
            ]
            most = max(values, key=lambda value: np.nan_to_num(value.value, nan=np.inf))
            found = [("peak von Mises", most, None)]
        for quantity, value, limit in found:
            where = at(value, self.panel) + (f", {value.face}" if value.face else "")
            yield self._line(quantity, value, self.panel.units.stress, where, limit)

    def _design(self) -> Iterator[Line]:
        for quantity in DESIGN if self.panel.design else ():
            moments = [
                self.judged.solution.peak(quantity, case=name)
                for name in self._names("strength")
            ]
            most = max(moments, key=lambda own: np.nan_to_num(own.value, nan=np.inf))
            where = at(most, self.panel)
            words = quantity.replace("design", "design moment")
            yield self._line(words, most, self.panel.units.moment, where, None)

    def _total(self) -> Line:
        solution = self.judged.solution
        reactions = solution.reactions(case=self.only)
        total = reactions.total.force
        if abs(total) < ROUND_OFF * reactions.magnitude:
            total = 0.0
        value = _exact(total, solution, self.only)
        where = f"supports push {'up' if total > 0.0 else 'down'}" if total else ""
        unit = self.panel.units.force
        return self._line("total reaction", value, unit, where, None)

    def _reaction_limits(self, where: Where) -> list[tuple[ReactionLimit, float, str]]:
        """Limits on some supports with what they allow, and what decides each."""
        return [
            (x.stated, x.limit, x.value.case)
            for x in self._worst(ReactionLimit)
            if isinstance(x.stated, ReactionLimit) and x.stated.at == where
        ]

    def _corners(self) -> Iterator[Line]:
        solution, size = self.judged.solution, self.panel.units.length.size
        rows: list[tuple[Sense, float | None, str]] = [
            (stated.sense, limit, case)
            for stated, limit, case in self._reaction_limits("corners")
        ]
        if all(sense != "hold-down" for sense, _, _ in rows):
            pulls = [
                corner_extreme(solution, "hold-down", case=name)[0]
                for name in self._names("uplift")
            ]
            most = max(pulls, key=lambda pull: np.nan_to_num(pull.value, nan=-1.0))
            if most.value != 0.0 or most.reason:
                rows.insert(0, ("hold-down", None, most.case))
        for sense, limit, case in rows:
            force, corners = corner_extreme(solution, sense, case=case)
            words = [_corner_words(solution, corners, case, size)] if corners else []
            where = "; ".join([*words, *([force.reason] if force.reason else [])])
            unit, quantity = self.panel.units.force, f"corner {sense}"
            yield self._line(quantity, force, unit, where or "none needed", limit)

    def _points(self) -> Iterator[Line]:
        solution, unit = self.judged.solution, self.panel.units.force
        limited = self._reaction_limits("points")
        for stated, limit, case in limited:
            force, mark = point_extreme(
                solution, stated.sense, case=case, only=stated.only
            )
            where = at(force, self.panel) if mark else "none needed"
            quantity = f"{mark or 'point'} {stated.sense}"
            yield self._line(quantity, force, unit, where, limit)
        if any(stated.sense == "hold-down" for stated, _, _ in limited):
            return
        pulls: dict[str, Value] = {}
        for name in self._names("uplift"):
            for point in solution.reactions(case=name).points:
                if point.force.value < min(0.0, -pulls.get(point.mark, ZERO).value):
                    pulls[point.mark] = -point.force
        for mark, pull in pulls.items():
            where = at(pull, self.panel)
            yield self._line(f"{mark} hold-down", pull, unit, where, None)

    def _sides(self) -> Iterator[Line]:
        solution, unit = self.judged.solution, self.panel.units.line_force
        limited = self._reaction_limits("sides")
        for stated, limit, case in limited:
            force, side = side_extreme(
                solution, stated.sense, case=case, only=stated.only
            )
            where = f"{side} at {at(force, self.panel)}" if side else "none needed"
            yield self._line(stated.quantity, force, unit, where, limit)
        if any(stated.sense == "hold-down" for stated, _, _ in limited):
            return
        pulls = [
            side_extreme(solution, "hold-down", case=name)
            for name in self._names("uplift")
        ]
        uplift, side = max(pulls, key=lambda pull: pull[0].value)
        if uplift.value > SLIGHT * _largest_line_reaction(solution, uplift.case):
            where = f"{side} at {at(uplift, self.panel)}"
            yield self._line("side hold-down", uplift, unit, where, None)


def _deflection_there(solution: Solution, case: str) -> Value | None:
    """Bound of the deflection at the vertex that deflects most, if there is one."""
    own = [
        value
        for (goal, name), value in solution.known.items()
        if name == case and isinstance(goal, Deflection) and value.value != 0.0
    ]
    return max(own, key=lambda value: abs(value.value), default=None)


def _exact(total: float, solution: Solution, case: str) -> Value:
    """All supports' force: it balances the loads, whatever the mesh.

    Where a side is drawn by chords, or a load is not quite where it is stated, the
    loads themselves are a little off, so that no band is given.
    """
    kinds = {energy.kind for energy in solution.energies}
    if kinds != {"bound"}:
        return Value(value=total, case=case)
    off = 1e-9 * abs(total)
    return Value(
        value=total, case=case, lower=total - off, upper=total + off, kind="bound"
    )


def _largest_line_reaction(solution: Solution, case: str) -> float:
    sides = solution.reactions(case=case).sides
    sizes = [np.nanmax(np.abs(side.line_reaction), initial=0.0) for side in sides]
    return float(max(sizes, default=0.0))


def support_rows(
    solution: Solution,
) -> list[tuple[str, str, Value, float, float]]:
    """What each side, seam and point support brings, case by case."""
    rows = []
    for case in solution.cases:
        reactions = solution.reactions(case=case)
        for side in reactions.sides:
            known = side.line_reaction[~np.isnan(side.line_reaction)]
            ends = (
                (float(known.min()), float(known.max()))
                if known.size
                else (np.nan,) * 2
            )
            force = solution.resultant(side.side, case=case)
            rows.append((case, side.side, force, *ends))
        rows += [
            (case, point.mark, point.force, np.nan, np.nan)
            for point in reactions.points
        ]
    return rows


def extremes_rows(
    judged: Judged, units: DisplayUnits
) -> list[tuple[str, Value, Value, str]]:
    """What each support brings over all combinations, with its line reactions."""
    rows = []
    size, symbol = units.line_force.size, units.line_force.symbol
    for own in Envelope(solution=judged.solution).supports():
        words = "-"
        if own.line is not None and not np.isnan(own.line.largest).all():
            least = float(np.nanmin(own.line.smallest)) / size
            most = float(np.nanmax(own.line.largest)) / size
            words = f"{least:+.3g} to {most:+.3g} {symbol}"
        if np.isnan(own.most.value):
            words = own.most.reason
        rows.append((own.name, own.most, own.least, words))
    return rows


def _corner_words(
    solution: Solution, forces: list[CornerForce], case: str, size: float
) -> str:
    """Which corners need the largest pull."""
    known = [
        f for f in solution.reactions(case=case).corners if not np.isnan(f.force.value)
    ]
    if len(forces) > 2 and len(forces) == len(known):
        counts = {3: "three", 4: "four"}
        return f"all {counts.get(len(forces), len(forces))} corners"
    return ", ".join(place_words(f.corner.place, size) for f in forces)


def at(value: Value, panel: Panel) -> str:
    """Where a value is, or why there is none."""
    if value.place is None:
        return value.reason
    length = panel.units.length
    return f"{place_words(value.place, length.size)} {length.symbol}"


def place_words(place: tuple[float, float], size: float) -> str:
    """A place to four digits of the unit of length."""
    return f"({short(place[0], size, 4)}, {short(place[1], size, 4)})"


def short(value: float, size: float, digits: int = 6) -> str:
    """A number in a unit's size, without what is round-off."""
    shown = value / size
    return f"{0.0 if abs(shown) < 1e-6 else shown:.{digits}g}"


def signed(force: float, panel: Panel) -> str:
    """A force with its sign and unit."""
    return f"{force / panel.units.force.size:+.6g} {panel.units.force.symbol}"
