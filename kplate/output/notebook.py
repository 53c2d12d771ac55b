"""How plates, solutions, reactions and checked panels show themselves in a notebook.

A notebook asks an object for its picture or its table by methods of agreed names
(IPython's rich display). `attach` gives them to classes of lower floors, which know
nothing of pictures.
"""

import html
from collections.abc import Sequence
from io import BytesIO
from typing import Any

import numpy as np

from kplate.output.plot import draw_outline, new_axes, plot
from kplate.plate import Plate
from kplate.reactions import Reactions
from kplate.solution import Solution
from kplate.units import DisplayUnits

DPI = 90
PEAKS = ("deflection", "von Mises", "largest principal", "smallest principal")


def attach(checked: type) -> None:
    """Give plates, solutions, reactions and checked panels their display."""
    for kind, name, show in (
        (Plate, "_repr_png_", plate_png),
        (Solution, "_repr_png_", solution_png),
        (Solution, "_repr_html_", solution_html),
        (Reactions, "_repr_html_", reactions_html),
        (checked, "_repr_html_", checked_html),
    ):
        setattr(kind, name, show)


def plate_png(plate: Plate) -> bytes:
    """The plan of a plate: sides with their supports and names."""
    units = DisplayUnits()
    axes = new_axes()
    draw_outline(axes, plate, units)
    size = units.length.size
    held: dict[str, list[str]] = {}
    for name in plate.outline.names:
        held.setdefault(plate.support(name).name, []).append(name)
    words = "; ".join(f"{kind}: {', '.join(names)}" for kind, names in held.items())
    axes.set_title(
        f"thickness {plate.thickness / size:.4g} {units.length.symbol}, "
        f"{plate.material.name}\n{words if len(words) < 160 else ''}",
        fontsize="medium",
        loc="left",
        wrap=True,
    )
    return _png(axes)


def solution_png(solution: Solution) -> bytes:
    """The deflection of the case with the largest."""
    worst = solution.peak("deflection").case
    return _png(plot(solution, "deflection", case=worst))


def solution_html(solution: Solution) -> str:
    """Peaks of all cases with their bands, under the picture of the deflection."""
    from base64 import b64encode

    units, rows = DisplayUnits(), []
    for case in solution.cases:
        for quantity in PEAKS:
            value = solution.peak(quantity, case=case)
            unit = units.deflection if quantity == "deflection" else units.stress
            known = np.isfinite(value.value)
            band = "not estimated"
            if value.lower is not None and value.upper is not None:
                band = f"{unit.show(value.lower)} to {unit.show(value.upper)}"
                band += f" ({value.kind})"
            place = ""
            if value.place is not None:
                x, y = (c / units.length.size for c in value.place)
                place = f"({x:.4g}, {y:.4g}) {units.length.symbol}"
            number = unit.show(value.value) if known else value.reason
            rows.append((case, f"peak {quantity}", number, band, place))
    picture = b64encode(solution_png(solution)).decode()
    left_out = len({disc.place for disc in solution.excluded})
    words = f"{left_out} places without a finite moment are left out of the peaks. "
    return (
        f'<img src="data:image/png;base64,{picture}" alt="deflection"/>'
        + _table(("case", "quantity", "value", "band", "where"), rows)
        + f"<p>{words if left_out else ''}Results are for a qualified engineer's "
        "judgement; local codes and licensed practice decide.</p>"
    )


def reactions_html(reactions: Reactions) -> str:
    """What each support brings, and the balance with the loads."""
    units = DisplayUnits()
    rows = []
    for side in reactions.sides:
        own = side.line_reaction[np.isfinite(side.line_reaction)]
        most = own[np.abs(own).argmax()] if own.size else np.nan
        largest = units.line_force.show(float(most), 3) if own.size else "-"
        rows.append((side.side, units.force.show(side.resultant.force), largest))
    for corner in reactions.corners:
        force = corner.force.value
        shown = units.force.show(force) if np.isfinite(force) else "no finite value"
        rows.append((f"corner {' / '.join(corner.corner.sides)}", shown, ""))
    rows += [
        (f"mark {point.mark}", units.force.show(point.force.value), "")
        for point in reactions.points
    ]
    rows.append(("all supports", units.force.show(reactions.total.force), ""))
    rows.append(("loads", units.force.show(reactions.load.force), ""))
    head = (f"case {reactions.case}", "pushes up", "largest line reaction")
    return _table(head, rows)


def checked_html(checked: Any) -> str:
    """What the command prints of a checked panel."""
    return f"<pre>{html.escape(checked.text)}</pre>"


def _table(head: Sequence[str], rows: Sequence[Sequence[str]]) -> str:
    """An HTML table."""

    def line(cells: Sequence[str], tag: str) -> str:
        parts = [f"<{tag}>{html.escape(cell)}</{tag}>" for cell in cells]
        return f"<tr>{''.join(parts)}</tr>"

    body = "".join(line(row, "td") for row in rows)
    return f"<table><thead>{line(head, 'th')}</thead><tbody>{body}</tbody></table>"


def _png(axes: Any) -> bytes:
    content = BytesIO()
    axes.figure.savefig(content, format="png", dpi=DPI)
    return content.getvalue()
