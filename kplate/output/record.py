"""A solution as plain data: a JSON record, and the reactions as a CSV table.

Everything is in SI units, which stand in brackets in the keys and headings, and in the
signs of the package: deflections and forces positive up. What has no finite value is
``null`` in the record, with a reason, and blank in the table.
"""

import csv
import json
import math
import re
from collections.abc import Iterator, Mapping
from dataclasses import fields
from pathlib import Path
from typing import Any

from kplate.arrays import Floats
from kplate.errors import InputError
from kplate.files import replacing
from kplate.goals import Goal
from kplate.loads import (
    Case,
    DiscPatch,
    EdgeMoment,
    Hydrostatic,
    LineForce,
    Load,
    PointForce,
    PointMoment,
    Pressure,
    PressureField,
    RectanglePatch,
    SelfWeight,
)
from kplate.materials import Isotropic
from kplate.outline import Outline
from kplate.output.vtk import array_name
from kplate.reactions import CornerForce, Reactions, Resultant, SideReaction
from kplate.shapes import Circle, ClosedLine
from kplate.solution import Solution
from kplate.values import Value
from kplate.woodarmer import DESIGN

# The quantities of `Solution.peak` with their units.
PEAKS = {
    "deflection": "m",
    "von Mises": "Pa",
    "Tresca": "Pa",
    "largest principal": "Pa",
    "smallest principal": "Pa",
    "shear stress": "Pa",
    "m_xx": "N",
    "m_yy": "N",
    "m_xy": "N",
}
# Each kind of load in words, and the unit of each field; "" where it has none.
LOADS: dict[type, tuple[str, dict[str, str]]] = {
    Pressure: ("pressure", {"value": "Pa", "zone": ""}),
    Hydrostatic: (
        "hydrostatic pressure",
        {"level": "m", "specific_weight": "N/m3", "up": ""},
    ),
    PressureField: ("pressure field", {"function": ""}),
    RectanglePatch: (
        "rectangle patch",
        {"force": "N", "centre": "m", "size": "m", "angle": "rad"},
    ),
    DiscPatch: ("disc patch", {"force": "N", "centre": "m", "radius": "m"}),
    PointForce: ("point force", {"force": "N", "at": "m"}),
    PointMoment: ("point moment", {"moment": "N m", "at": "m"}),
    LineForce: ("line force", {"force": "N/m", "along": ""}),
    EdgeMoment: ("edge moment", {"moment": "N", "along": ""}),
    SelfWeight: ("self-weight", {"acceleration": "m/s2"}),
}
# A list of numbers as `json` breaks it into lines: no text holds a bare line break.
_NUMBERS = re.compile(r"\[\n[^\[\]{}\"]*\]")
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


def solution_record(
    solution: Solution, version: str, *, design: bool = False
) -> dict[str, Any]:
    """What was stated and what was found, as plain JSON types.

    Parameters
    ----------
    solution : Solution
        What to record.
    version : str
        Version of kplate.
    design : bool, optional
        Whether to record the peaks of the design moments of reinforcement, too.

    Returns
    -------
    dict
        "statement" (outline with zones, seams and marks, thickness, material, zones,
        supports, cases), "mesh", "results" (case by case: peaks, energy, reactions),
        "excluded" (places left out of the peaks of moments and stresses), "asked"
        (goals with their bands, in SI units), "tolerance" and "history" (the meshes on
        the way to it), and what a VTU file cannot hold: "side_names", by their number
        in it, and "field_names", by their array in it.
    """
    mesh, state = solution.mesh, solution.state
    return {
        "kplate": version,
        "statement": _statement(solution),
        "mesh": {
            "triangles": len(mesh.triangles),
            "points": len(mesh.points),
            "field triangles": len(solution.samples.triangles),
            "field points": len(solution.samples.points),
            "unknowns": state.constraints.numbering.count,
            "element": state.element.name,
        },
        "results": [_case_results(solution, case, design) for case in solution.cases],
        "excluded": [
            {
                "place [m]": _numbers(excluded.place),
                "radius [m]": _number(excluded.radius),
                "reason": excluded.reason,
                "case": excluded.case or None,
            }
            for excluded in solution.excluded
        ],
        "asked": [
            {"goal": type(goal).__name__, **_goal(goal), "case": case, **_value(value)}
            for (goal, case), value in solution.known.items()
        ],
        "tolerance": solution.tolerance,
        "history": [
            {
                "unknowns": step.unknowns,
                "triangles": step.triangles,
                "bands": dict(step.bands),
                "reached": step.reached,
            }
            for step in solution.history
        ],
        "side_names": list(mesh.side_names),
        "field_names": {
            array_name(solution, case, field): {"case": case, "field": field}
            for case in solution.cases
            for field in solution.point_fields(case=case, design=design)
        },
    }


def write_json(record: Mapping[str, Any], path: Path) -> Path:
    """Write a record as strict JSON: UTF-8, no NaN, the same bytes for the same record.

    Lists of numbers stand on one line each.

    Parameters
    ----------
    record : mapping
        Plain JSON types.
    path : Path
        The file; one that exists is replaced.

    Returns
    -------
    Path
        The file.

    Raises
    ------
    InputError
        If JSON has no word for something in it, such as NaN, or the file cannot be
        written.
    """
    path = Path(path)
    try:
        text = json.dumps(record, allow_nan=False, ensure_ascii=False, indent=1)
        text = _NUMBERS.sub(lambda found: " ".join(found[0].split()), text)
        content = f"{text}\n".encode()
    except (TypeError, ValueError) as error:
        raise InputError(
            f"cannot write {str(path)!r}: JSON has no word for something in the record "
            f"({error}); put plain numbers, text and null into it."
        ) from error
    with replacing(path) as temporary:
        temporary.write_bytes(content)
    return path


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


def _statement(solution: Solution) -> dict[str, Any]:
    """The plate and its loads as stated."""
    plate = solution.plate
    outline = plate.outline
    return {
        "outline": {
            "rim": _line(outline.rim),
            "holes": [_line(hole) for hole in outline.holes],
            "area [m2]": _number(outline.area),
            **_inside(outline),
            "notes": list(outline.notes),
        },
        "thickness [m]": _number(plate.thickness),
        "material": _material(plate.material),
        "zones": [
            {
                "name": name,
                "thickness [m]": _number(thickness),
                "material": _material(material),
            }
            for name, (thickness, material) in zip(
                outline.zone_names, plate.sections[1:], strict=True
            )
        ],
        "supports": {
            name: {"name": plate.support(name).name, "words": plate.support(name).words}
            for name in outline.names
        },
        "bend_turn [rad]": _number(plate.bend_turn),
        "mass [kg]": None if plate.mass is None else _number(plate.mass),
        "cases": [case_record(case) for case in solution.state.cases],
    }


def _inside(outline: Outline) -> dict[str, Any]:
    """Zones, seams and marks of an outline by name."""
    return {
        "zones": [
            {"name": zone.name, **_line(zone.shape)}
            | {"area [m2]": _number(outline.zone_area(zone.name))}
            for zone in outline.zones
        ],
        "seams": [
            {"name": seam.name, "points [m]": [_numbers(p) for p in seam.points]}
            | _bulges(seam.bulges)
            for seam in outline.seams
        ],
        "marks": [
            {"name": mark.name, "at [m]": _numbers(mark.at)} for mark in outline.marks
        ],
    }


def _line(shape: ClosedLine) -> dict[str, Any]:
    """A closed line: a circle as stated, everything else by its pieces."""
    if isinstance(shape, Circle):
        return {
            "shape": "circle",
            "centre [m]": _numbers(shape.centre),
            "radius [m]": _number(shape.radius),
            "sides": list(shape.sides),
        }
    line = shape.line
    return {
        "shape": type(shape).__name__.lower(),
        "points [m]": [_numbers(point) for point in line.points],
        "sides": list(line.sides),
        **_bulges(line.bulges),
    }


def _bulges(bulges: Floats) -> dict[str, Any]:
    """Bulges of pieces, where not all are straight."""
    return {"bulges": _numbers(bulges)} if (bulges != 0.0).any() else {}


def _material(material: Isotropic) -> dict[str, Any]:
    density = material.density
    return {
        "name": material.name,
        "E [Pa]": _number(material.E),
        "nu": _number(material.nu),
        "density [kg/m3]": None if density is None else _number(density),
        "source": material.source,
    }


def case_record(case: Case) -> dict[str, Any]:
    """A load case as plain JSON types."""
    record: dict[str, Any] = {"name": case.name}
    record["loads"] = [_load(load) for load in case.loads]
    if case.reverses:
        record["reverses"] = True
    return record


def _load(load: Load) -> dict[str, Any]:
    """A load with all its fields."""
    kind, units = LOADS[type(load)]
    record: dict[str, Any] = {"kind": kind}
    for field in fields(load):
        unit, value = units[field.name], getattr(load, field.name)
        key = f"{field.name} [{unit}]" if unit else field.name
        if callable(value):
            record[key] = _qualified_name(value)
        elif isinstance(value, tuple):
            record[key] = _numbers(value)
        elif value is None or isinstance(value, str):
            record[key] = value
        else:
            record[key] = _number(value)
    return record


def _qualified_name(function: Any) -> str:
    """Module and name of a function, or of the class of a callable object."""
    named = function if hasattr(function, "__qualname__") else type(function)
    return f"{named.__module__}.{named.__qualname__}"


def _case_results(solution: Solution, case: str, design: bool) -> dict[str, Any]:
    """What was found in one case."""
    peaks = PEAKS | (dict.fromkeys(DESIGN, "N") if design else {})
    return {
        "case": case,
        "peaks": {
            f"{quantity} [{unit}]": _value(solution.peak(quantity, case=case))
            for quantity, unit in peaks.items()
        },
        "strain energy [J]": _number(solution.strain_energy(case=case)),
        "load work [J]": _number(solution.load_work(case=case)),
        "reactions": _reactions(solution.reactions(case=case)),
    }


def _value(value: Value) -> dict[str, Any]:
    """A number with its band, in the unit of the key it stands under."""
    record: dict[str, Any] = {
        "value": _number(value.value),
        "kind": value.kind,
        "lower": None if value.lower is None else _number(value.lower),
        "upper": None if value.upper is None else _number(value.upper),
        "place [m]": None if value.place is None else _numbers(value.place),
        "face": value.face,
    }
    if value.reason:
        record["reason"] = value.reason
    return record


def _goal(goal: Goal) -> dict[str, Any]:
    """What a goal is asked of: place, direction, name."""
    own = {field.name: getattr(goal, field.name) for field in fields(goal)}
    return {k: _numbers(v) if isinstance(v, tuple) else v for k, v in own.items()}


def _reactions(reactions: Reactions) -> dict[str, Any]:
    """Support forces by side, corner and point, and their balance with the loads."""
    return {
        "sides": [
            {"side": side.side, "support": side.support.name}
            | _resultant(side.resultant)
            | {
                "stations [m]": [_numbers(place) for place in side.stations],
                "distance [m]": _numbers(side.distance),
                "line reaction [N/m]": _numbers(side.line_reaction),
                "line moment [N]": _numbers(side.line_moment),
            }
            for side in reactions.sides
        ],
        "corners": [
            {"sides": list(corner.corner.sides), "force [N]": _value(corner.force)}
            for corner in reactions.corners
        ],
        "points": [
            {"mark": point.mark, "support": point.support.name}
            | {"place [m]": _numbers(point.force.place)}
            | _resultant(point.resultant)
            for point in reactions.points
        ],
        "loads": _resultant(reactions.load),
        "supports": _resultant(reactions.total),
        "imbalance": _number(reactions.imbalance),
    }


def _resultant(resultant: Resultant) -> dict[str, float | None]:
    return {
        "force [N]": _number(resultant.force),
        "moment_x [N m]": _number(resultant.moment_x),
        "moment_y [N m]": _number(resultant.moment_y),
    }


def _rows(reactions: Reactions) -> Iterator[dict[str, Any]]:
    """Rows of one case."""
    total = reactions.load
    row: dict[str, Any]
    for side in reactions.sides:
        yield from _stations(reactions.case, side)
    for side in reactions.sides:
        total += side.resultant
        row = {"case": reactions.case, "kind": "side", "side": side.side}
        yield row | _resultant(side.resultant)
    for corner in reactions.corners:
        x, y = _numbers(corner.corner.place)
        row = {"case": reactions.case, "kind": "corner", "x [m]": x, "y [m]": y}
        row["side"] = " / ".join(corner.corner.sides)
        force = _corner_resultant(corner)
        if force is not None:
            total += force
            row |= _resultant(force)
        yield row
    for point in reactions.points:
        total += point.resultant
        x, y = _numbers(point.force.place)
        row = {"case": reactions.case, "kind": "point", "x [m]": x, "y [m]": y}
        row["side"] = point.mark
        yield row | _resultant(point.resultant)
    yield {"case": reactions.case, "kind": "loads"} | _resultant(reactions.load)
    yield {"case": reactions.case, "kind": "sum"} | _resultant(total)


def _stations(case: str, side: SideReaction) -> Iterator[dict[str, Any]]:
    """Rows of a side's stations."""
    for (x, y), *numbers in zip(
        side.stations,
        side.distance,
        side.line_reaction,
        side.line_moment,
        strict=True,
    ):
        values = (x, y, *numbers)
        row = {"case": case, "kind": "station", "side": side.side}
        yield row | dict(zip(COLUMNS[3:8], map(_number, values), strict=True))


def _corner_resultant(corner: CornerForce) -> Resultant | None:
    """A corner force with its moments; nothing where it has no finite value."""
    force = corner.force.value
    if not math.isfinite(force):
        return None
    x, y = corner.corner.place
    return Resultant(force=force, moment_x=y * force, moment_y=-x * force)


def _number(value: float) -> float | None:
    """A plain number; nothing where it is not finite."""
    return float(value) + 0.0 if math.isfinite(value) else None  # no -0.0


def _numbers(values: Any) -> list[float | None]:
    return [_number(value) for value in values]
