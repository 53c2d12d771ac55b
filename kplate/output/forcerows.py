"""The support forces of all cases as a CSV table.

SI units stand in the headings; forces are positive up. What has no finite value is
blank.
"""

import csv
import math
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from kplate.files import replacing
from kplate.reactions import CornerForce, Reactions, Resultant, SideReaction
from kplate.solution import Solution

COLUMNS = (
    "case",
    "kind",
    "side",
    "x [m]",
    "y [m]",
    "distance [m]",
    "line reaction [N/m]",
    "line moment [N]",
    "force [N]",
    "moment_x [N m]",
    "moment_y [N m]",
)


def write_reactions(solution: Solution, path: Path) -> Path:
    """Write the support forces of all cases as a CSV table.

    One row for each station of a supported side or seam ("station": line reaction and
    clamping moment), each side or seam in all without its corners ("side"), each corner
    ("corner"), each held mark ("point"), the loads ("loads"), and the sum of it all
    ("sum": nothing but round-off). The moments of forces are about the axes through the
    origin.

    Parameters
    ----------
    solution : Solution
        What to write.
    path : Path
        The file, in UTF-8; one that exists is replaced.

    Returns
    -------
    Path
        The file.

    Raises
    ------
    InputError
        If the file cannot be written.
    """
    path = Path(path)
    with (
        replacing(path) as temporary,
        temporary.open("w", encoding="utf-8", newline="") as file,
    ):
        table = csv.DictWriter(file, COLUMNS, restval="", lineterminator="\n")
        table.writeheader()
        for case in solution.cases:
            table.writerows(_rows(solution.reactions(case=case)))
    return path


def _rows(reactions: Reactions) -> Iterator[dict[str, Any]]:
    """Rows of one case."""
    total = reactions.load
    row: dict[str, Any]
    for side in reactions.sides:
        yield from _stations(reactions.case, side)
    for side in reactions.sides:
        total += side.resultant
        row = {"case": reactions.case, "kind": "side", "side": side.side}
        yield row | resultant(side.resultant)
    for corner in reactions.corners:
        x, y = numbers(corner.corner.place)
        row = {"case": reactions.case, "kind": "corner", "x [m]": x, "y [m]": y}
        row["side"] = " / ".join(corner.corner.sides)
        force = _corner_resultant(corner)
        if force is not None:
            total += force
            row |= resultant(force)
        yield row
    for point in reactions.points:
        total += point.resultant
        x, y = numbers(point.force.place)
        row = {"case": reactions.case, "kind": "point", "x [m]": x, "y [m]": y}
        row["side"] = point.mark
        yield row | resultant(point.resultant)
    yield {"case": reactions.case, "kind": "loads"} | resultant(reactions.load)
    yield {"case": reactions.case, "kind": "sum"} | resultant(total)


def _stations(case: str, side: SideReaction) -> Iterator[dict[str, Any]]:
    """Rows of a side's stations."""
    for (x, y), *found in zip(
        side.stations,
        side.distance,
        side.line_reaction,
        side.line_moment,
        strict=True,
    ):
        values = (x, y, *found)
        row = {"case": case, "kind": "station", "side": side.side}
        yield row | dict(zip(COLUMNS[3:8], map(number, values), strict=True))


def _corner_resultant(corner: CornerForce) -> Resultant | None:
    """A corner force with its moments; nothing where it has no finite value."""
    force = corner.force.value
    if not math.isfinite(force):
        return None
    x, y = corner.corner.place
    return Resultant(force=force, moment_x=y * force, moment_y=-x * force)


def resultant(found: Resultant) -> dict[str, float | None]:
    """A force with its moments, in plain numbers."""
    return {
        "force [N]": number(found.force),
        "moment_x [N m]": number(found.moment_x),
        "moment_y [N m]": number(found.moment_y),
    }


def number(value: float) -> float | None:
    """A plain number; nothing where it is not finite."""
    return float(value) + 0.0 if math.isfinite(value) else None  # no -0.0


def numbers(values: Any) -> list[float | None]:
    """Plain numbers of some values."""
    return [number(value) for value in values]
