"""Outlines from lists of vertices (CSV).

One vertex a line, in the order in which a pencil would draw the rim: x, y and, where
wanted, the name of the side and the bulge of the piece that begins there. Columns are
parted by commas, or by semicolons; only then may decimals have a comma.
"""

import csv
import math
import re
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from kplate import curves
from kplate.arrays import Floats
from kplate.chaining import Chained, Loop, Piece, place
from kplate.drawings import Drawing, crossing, drawing_of, signed_area, turned_round
from kplate.errors import InputError
from kplate.outline import Outline
from kplate.polygon import MOST_BULGE, SNAP, Chords, Polygon
from kplate.quantities import unit as parse_unit
from kplate.units import Unit

COLUMNS = ("x", "y", "side", "bulge")
_NUMBER = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?", re.ASCII)


@dataclass(frozen=True, kw_only=True)
class _Row:
    """A vertex: the line of the file it stands on, and what stands there, in m."""

    line: int
    x: float
    y: float
    side: str | None
    bulge: float


def read_csv(path: Path, *, unit: str, chords: Chords = "ask") -> Drawing:
    """Read the rim of a panel from a list of vertices.

    Parameters
    ----------
    path : Path
        The file; empty lines and lines that begin with # are passed over. Without a
        header its columns are x, y, side, bulge.
    unit : str
        Unit of length of the coordinates.
    chords : {"ask", "arc", "polygon"}
        What runs of straight pieces on a circle are, as in `Polygon`.

    Returns
    -------
    Drawing

    Raises
    ------
    InputError
        If the file cannot be read, a line of it is wrong, or the vertices are not those
        of a closed line that meets itself nowhere; lines of the file are named.
    """
    its_unit = parse_unit(unit, "length")
    rows = _rows(_text(Path(path)), its_unit)
    rows, notes = _without_last(rows)
    _check_rows(rows, its_unit)
    points = np.array([(row.x, row.y) for row in rows])
    bulges = np.array([row.bulge for row in rows])
    _check_crossing(points, bulges, rows, its_unit)
    if rows[0].side is None:
        pieces = tuple(
            Piece(start=(row.x, row.y), end=(row.x, row.y), bulge=row.bulge)
            for row in rows
        )
        loop = Loop(points=points, bulges=bulges, pieces=pieces)
        chained = Chained(loops=(loop,), notes=(), ignored=())
        return drawing_of(chained, unit=its_unit, chords=chords, notes=notes)
    sides = [str(row.side) for row in rows]
    if signed_area(points, bulges) < 0.0:
        points, bulges = turned_round(points, bulges)
        sides = [*sides[-2::-1], sides[-1]]
        notes = [*notes, "turned round: it runs clockwise"]
    rim = Polygon(points=points, sides=tuple(sides), bulges=bulges, chords=chords)
    return Drawing(
        outline=Outline(rim=rim), unit=its_unit.symbol, notes=(*notes, *rim.notes)
    )


def _text(path: Path) -> str:
    """What stands in the file."""
    shown = repr(str(path))
    try:
        if path.is_dir():
            raise InputError(f"{shown} is a folder; name a .csv file.")
        return path.read_text("utf-8-sig")
    except FileNotFoundError as error:
        raise InputError(f"there is no file {shown}; name a .csv file.") from error
    except UnicodeDecodeError as error:
        raise InputError(
            f"{shown} is not text in UTF-8; save it as CSV in UTF-8."
        ) from error
    except (OSError, ValueError) as error:
        if isinstance(error, InputError):
            raise
        why = getattr(error, "strerror", None) or error
        raise InputError(f"cannot read {shown}: {why}.") from error


def _rows(text: str, unit: Unit) -> list[_Row]:
    """Vertices of all lines that hold one."""
    lines = [
        (number, line)
        for number, line in enumerate(text.splitlines(), start=1)
        if line.strip(" ,;\t") and not line.lstrip().startswith("#")
    ]
    mark = ";" if any(";" in line for _, line in lines) else ","
    cells = [
        (number, [cell.strip() for cell in next(csv.reader([line], delimiter=mark))])
        for number, line in lines
    ]
    columns, cells = _columns(cells, mark)
    return [_row(number, own, (columns, mark), unit) for number, own in cells]


def _columns(
    cells: list[tuple[int, list[str]]], mark: str
) -> tuple[tuple[str, ...], list[tuple[int, list[str]]]]:
    """Names of the columns, and the lines that hold vertices."""
    if not cells:
        raise InputError("the file holds no vertices; write x,y in each line.")
    number, first = cells[0]
    if _value(first[0], mark) is not None:
        return COLUMNS[: max(2, len(first))], cells
    names = tuple(cell.lower() for cell in first)
    wrong = [name for name in names if name not in COLUMNS or names.count(name) > 1]
    if wrong or not {"x", "y"} <= set(names):
        raise InputError(
            f"line {number}: the header is {mark.join(first)!r}; its columns must be "
            "x, y and, where wanted, side and bulge, each once."
        )
    return names, cells[1:]


def _row(
    number: int, cells: list[str], form: tuple[tuple[str, ...], str], unit: Unit
) -> _Row:
    """The vertex of one line."""
    columns, mark = form
    while len(cells) > len(columns) and not cells[-1]:
        cells = cells[:-1]  # spreadsheets close lines with empty cells
    if len(cells) != len(columns):
        hint = (
            "; decimals with a comma need semicolons between the columns"
            if mark == ","
            else ""
        )
        raise InputError(
            f"line {number} has {len(cells)} columns; it must have {len(columns)}: "
            f"{', '.join(columns)}{hint}."
        )
    named = dict(zip(columns, cells, strict=True))
    numbers = {}
    for key in ("x", "y", "bulge"):
        value = _value(named.get(key, "0"), mark)
        if value is None:
            raise InputError(
                f"line {number}: {key} is {named[key]!r}; it must be a number."
            )
        numbers[key] = value
    side = named.get("side")
    if side is not None and (not side or _value(side, mark) is not None):
        raise InputError(
            f"line {number}: the side is {side!r}; name the piece that begins here. A "
            "file without side names needs a header, such as x,y,bulge."
        )
    if abs(numbers["bulge"]) > MOST_BULGE:
        raise InputError(
            f"line {number}: the bulge is {numbers['bulge']:g}; it must lie between "
            f"-{MOST_BULGE:g} and {MOST_BULGE:g}."
        )
    return _Row(
        line=number,
        x=numbers["x"] * unit.size,
        y=numbers["y"] * unit.size,
        side=side,
        bulge=numbers["bulge"],
    )


def _value(cell: str, mark: str) -> float | None:
    """A number, with a decimal comma where semicolons part the columns."""
    plain = cell.replace(",", ".") if mark == ";" else cell
    if not _NUMBER.fullmatch(plain):
        return None
    value = float(plain)
    return value if math.isfinite(value) else None


def _without_last(rows: list[_Row]) -> tuple[list[_Row], list[str]]:
    """Drop the last vertex where it repeats the first."""
    if len(rows) > 2 and (rows[0].x, rows[0].y) == (rows[-1].x, rows[-1].y):
        return rows[:-1], [f"line {rows[-1].line} repeats the first vertex"]
    return rows, []


def _check_rows(rows: list[_Row], unit: Unit) -> None:
    """Refuse too few vertices, and vertices that coincide."""
    bent = any(row.bulge != 0.0 for row in rows)
    if len(rows) < (2 if bent else 3):
        raise InputError(
            f"the file holds {len(rows)} vertices; a closed line has at least three, "
            "two where a piece is an arc."
        )
    points = np.array([(row.x, row.y) for row in rows])
    size = float(np.hypot(*np.ptp(points, axis=0)))
    for i, row in enumerate(rows):
        after = rows[(i + 1) % len(rows)]
        if math.dist((row.x, row.y), (after.x, after.y)) <= SNAP * size:
            raise InputError(
                f"lines {row.line} and {after.line} give the same vertex, "
                f"{place((row.x, row.y), unit)}; drop one of them."
            )


def _check_crossing(
    points: Floats, bulges: Floats, rows: list[_Row], unit: Unit
) -> None:
    """Refuse a line that crosses itself, with the lines of the file."""
    where = crossing(points, bulges)
    if where is None:
        return
    ends = np.roll(points, -1, axis=0)
    off = curves.distances(np.array([where]), points, ends, bulges)[0]
    i, j = sorted(np.argsort(off, kind="stable")[:2].tolist())
    raise InputError(
        f"the pieces that begin in lines {rows[i].line} and {rows[j].line} cross or "
        f"touch at {place(where, unit)}; list the vertices in the order in which a "
        "pencil would draw them."
    )
