"""Rows of the table of what a panel asks for, at points and along lines."""

from collections.abc import Iterator

import numpy as np

from kplate.asking import ASKED, Ask, asked_values, left_out, values_at
from kplate.checklines import ROUND_OFF, at
from kplate.judging import Judged
from kplate.output.tables import AskedRow
from kplate.panel import Panel
from kplate.units import DisplayUnits, Unit
from kplate.values import Value

# Of what has no sign, or is an extreme itself, one end is of use.
_ENDS = {
    "von Mises": slice(1),
    "Tresca": slice(1),
    "shear stress": slice(1),
    "largest principal": slice(1),
    "smallest principal": slice(-1, None),
}


def asked_unit(quantity: str, units: DisplayUnits) -> Unit:
    """Unit in which a quantity is shown."""
    match ASKED[quantity]:
        case "m":
            return units.deflection
        case "rad":
            return Unit("mrad", 1e-3)
        case "N":
            return units.moment
        case "N/m":
            return units.line_force
        case _:
            return units.stress


def asked_rows(panel: Panel, judged: Judged) -> list[AskedRow]:
    """What is asked for: case by case, or the extremes of all combinations.

    Of a line they are the largest and the smallest value along it.
    """
    rows: list[AskedRow] = []
    for ask in panel.asks:
        for quantity in ask.values:
            unit = asked_unit(quantity, panel.units)
            rows += [
                AskedRow(
                    name=ask.name,
                    quantity=quantity,
                    value=value,
                    unit=unit,
                    where=_where(value, panel),
                )
                for value in _values(judged, ask, quantity)
            ]
    return rows


def _where(value: Value, panel: Panel) -> str:
    where = at(value, panel)
    return f"{where}; {value.reason}" if value.reason and value.place else where


def _values(judged: Judged, ask: Ask, quantity: str) -> Iterator[Value]:
    """Values of a quantity, those of combinations largest and smallest only."""
    solution = judged.solution
    found: list[Value] = []
    for case in solution.cases:
        if not ask.is_line:
            found.append(asked_values(solution, ask, cases=[case])[quantity, case])
            continue
        along = values_at(solution, quantity, ask.points, case=case)
        if np.isnan(along).all():
            reason = left_out(solution, quantity, ask.places[0], case)
            found.append(Value(value=np.nan, case=case, reason=reason))
            continue
        along = np.where(
            np.abs(along) < ROUND_OFF * np.nanmax(np.abs(along)), 0.0, along
        )
        ends = [int(np.nanargmax(along)), int(np.nanargmin(along))]
        for best in dict.fromkeys(ends[_ENDS.get(quantity, slice(2))]):
            x, y = ask.points[best].tolist()
            found.append(Value(value=float(along[best]), place=(x, y), case=case))
    lost = [value for value in found if np.isnan(value.value)]
    if lost:
        yield lost[0]
        found = [value for value in found if not np.isnan(value.value)]
    if found and judged.combinations:
        most = max(found, key=lambda value: value.value)
        least = min(found, key=lambda value: value.value)
        both = [most] if most.value == least.value else [most, least]
        found = both[_ENDS.get(quantity, slice(2))]
    yield from found
