"""Rows of the tables that a check prints: values with bands, limits and places."""

from collections.abc import Iterator

import numpy as np

from kplate.goals import Deflection
from kplate.output.tables import Line
from kplate.panel import Panel
from kplate.reactions import CornerForce
from kplate.solution import Solution
from kplate.values import Value
from kplate.woodarmer import DESIGN

CAUTION = (
    "Not checked: welds, bolts, the frame, fatigue, impact, buckling. Results are for "
    "a qualified\nengineer's judgement; local codes and licensed practice decide."
)
ROUND_OFF = 1e-9  # share of the sum of magnitudes below which a total is none
SLIGHT = 0.01  # share of the largest line reaction below which uplift is not listed


def table_lines(panel: Panel, solution: Solution) -> Iterator[Line]:
    """Numbers of the table, case by case."""
    for case in solution.cases:
        yield from _case_lines(panel, solution, case)


def _case_lines(panel: Panel, solution: Solution, case: str) -> Iterator[Line]:
    units, limits = panel.units, panel.limits
    size = units.length.size
    deflection = solution.peak("deflection", case=case)
    limit = limits.deflection.at_most if limits.deflection is not None else None
    way = "up" if deflection.value > 0.0 else "down"
    yield Line(
        case=case,
        quantity="peak deflection",
        value=deflection,
        unit=units.deflection,
        limit=limit,
        where=f"{at(deflection, panel)}, {way}",
    )
    there = _deflection_there(solution, case)
    if there is not None:
        yield Line(
            case=case,
            quantity="deflection there",
            value=there,
            unit=units.deflection,
            where=at(there, panel),
        )
    criterion = limits.stress.criterion if limits.stress is not None else "von Mises"
    stress = solution.peak(criterion, case=case)
    yield Line(
        case=case,
        quantity=f"peak {criterion}",
        value=stress,
        unit=units.stress,
        limit=limits.stress.at_most if limits.stress is not None else None,
        where=at(stress, panel) + (f", {stress.face}" if stress.face else ""),
    )
    for quantity in DESIGN if panel.design else ():
        moment = solution.peak(quantity, case=case)
        yield Line(
            case=case,
            quantity=quantity.replace("design", "design moment"),
            value=moment,
            unit=units.moment,
            where=at(moment, panel),
        )
    reactions = solution.reactions(case=case)
    total = reactions.total.force
    if abs(total) < ROUND_OFF * reactions.magnitude:
        total = 0.0
    yield Line(
        case=case,
        quantity="total reaction",
        value=_exact(total, solution, case),
        unit=units.force,
        where=f"supports push {'up' if total > 0.0 else 'down'}" if total else "",
    )
    pull, forces = solution.hold_down(case=case)
    if forces or pull.reason or limits.hold_down is not None:
        words = [_corner_words(solution, forces, case, size)] if forces else []
        where = "; ".join([*words, *([pull.reason] if pull.reason else [])])
        yield Line(
            case=case,
            quantity="corner hold-down",
            value=pull,
            unit=units.force,
            limit=limits.hold_down,
            where=where or "none needed",
        )
    points = [p for p in solution.reactions(case=case).points if p.force.value < 0.0]
    for point in points:
        yield Line(
            case=case,
            quantity=f"{point.mark} hold-down",
            value=-point.force,
            unit=units.force,
            limit=limits.hold_down,
            where=f"{at(point.force, panel)}",
        )
    uplift, side = solution.side_uplift(case=case)
    if uplift.value > SLIGHT * _largest_line_reaction(solution, case):
        yield Line(
            case=case,
            quantity="side hold-down",
            value=uplift,
            unit=units.line_force,
            where=f"{side} at {at(uplift, panel)}",
        )


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
