"""What a panel asks for: a CSV table of points and lines, and pictures of lines."""

import csv
from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import Any

import numpy as np

from kplate.asking import ASKED, Ask, asked_values, left_out, values_at
from kplate.errors import InputError
from kplate.files import replacing
from kplate.solution import Solution
from kplate.units import Unit

COLUMNS = (
    "asked",
    "case",
    "quantity",
    "unit",
    "x [m]",
    "y [m]",
    "distance [m]",
    "value",
    "lower",
    "upper",
    "band",
    "remark",
)
SIZE = (8.0, 2.6)  # inches, of one quantity
MOST_NAMED = 8  # curves that get a colour and a name each


def write_asked(solution: Solution, asks: Sequence[Ask], path: Path) -> Path:
    """Write what is asked for, in every case, as a CSV table in SI units.

    Parameters
    ----------
    solution : Solution
        What was judged.
    asks : sequence of Ask
        Points and lines.
    path : Path
        The file, in UTF-8; one that exists is replaced.

    Returns
    -------
    Path
        The file.

    Raises
    ------
    InputError
        If a point is not on the plate, or the file cannot be written.
    """
    path = Path(path)
    with (
        replacing(path) as temporary,
        temporary.open("w", encoding="utf-8", newline="") as file,
    ):
        table = csv.DictWriter(file, COLUMNS, restval="", lineterminator="\n")
        table.writeheader()
        for ask in asks:
            table.writerows(_rows(solution, ask))
    return path


def _rows(solution: Solution, ask: Ask) -> Iterator[dict[str, Any]]:
    for case in solution.cases:
        for quantity in ask.values:
            row: dict[str, Any] = {"asked": ask.name, "case": case}
            row |= {"quantity": quantity, "unit": ASKED[quantity]}
            if not ask.is_line:
                value = asked_values(solution, ask, cases=[case])[quantity, case]
                x, y = ask.places[0]
                row |= {"x [m]": x, "y [m]": y, "distance [m]": 0.0}
                row |= {"value": _known(value.value), "band": value.kind}
                row |= {"lower": value.lower, "upper": value.upper}
                yield row | {"remark": value.reason}
                continue
            along = values_at(solution, quantity, ask.points, case=case)
            for (x, y), distance, number in zip(
                ask.points.tolist(), ask.distance.tolist(), along.tolist(), strict=True
            ):
                row |= {"x [m]": x, "y [m]": y, "distance [m]": distance}
                remark = left_out(solution, quantity, (x, y), case)
                yield row | {"value": _known(number), "band": "none", "remark": remark}


def _known(number: float) -> float | str:
    """A number, blank where there is none."""
    return "" if np.isnan(number) else number


def write_line_plot(
    solution: Solution,
    ask: Ask,
    path: Path,
    *,
    length: Unit,
    units: Sequence[Unit],
    title: str = "",
) -> Path:
    """Draw each quantity along a line, case by case, below one another.

    Parameters
    ----------
    solution : Solution
        What was judged.
    ask : Ask
        A line.
    path : Path
        The file: ``.png``, ``.svg`` or ``.pdf``.
    length : Unit
        Of the distance along the line.
    units : sequence of Unit
        Of each of the quantities.
    title : str, optional
        What it is.

    Returns
    -------
    Path
        The file.

    Raises
    ------
    InputError
        If it is a point, or the file cannot be written.
    """
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    path = Path(path)
    if path.suffix not in (".png", ".svg", ".pdf"):
        raise InputError(f"{str(path)!r} must end in .png, .svg or .pdf; name it so.")
    if not ask.is_line:
        raise InputError(f"{ask.name} is a point; only a line can be drawn.")
    count = len(ask.values)
    drawn = Figure(figsize=(SIZE[0], 0.8 + SIZE[1] * count), layout="constrained")
    FigureCanvasAgg(drawn)
    panes = drawn.subplots(count, 1, sharex=True, squeeze=False)[:, 0]
    along = ask.distance / length.size
    for axes, quantity, unit in zip(panes, ask.values, units, strict=True):
        curves = np.array(
            [
                values_at(solution, quantity, ask.points, case=case) / unit.size
                for case in solution.cases
            ]
        )
        axes.axhline(0.0, color="0.6", linewidth=0.8)
        if len(curves) <= MOST_NAMED:
            for case, curve in zip(solution.cases, curves, strict=True):
                axes.plot(along, curve, label=case)
        else:
            low, high = curves.min(axis=0), curves.max(axis=0)
            axes.plot(along, curves.T, color="0.75", linewidth=0.7)
            axes.plot(along, high, color="C3", label="largest of all")
            axes.plot(along, low, color="C0", label="smallest of all")
        axes.set_ylabel(f"{quantity} [{unit.symbol}]")
        axes.grid(visible=True, color="0.9")
        axes.margins(x=0.0)
    (x0, y0), (x1, y1) = (np.array(place) / length.size for place in ask.places)
    panes[-1].set_xlabel(
        f"distance from ({x0:.6g}, {y0:.6g}) towards ({x1:.6g}, {y1:.6g}) "
        f"[{length.symbol}]"
    )
    if len(solution.cases) > 1:
        panes[0].legend(loc="center left", bbox_to_anchor=(1.0, 0.5), frameon=False)
    panes[0].set_title(title or ask.name)
    with replacing(path) as temporary:
        drawn.savefig(temporary, format=path.suffix[1:], dpi=120)
    return path
