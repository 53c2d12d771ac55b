"""A solution as plain data: a JSON record.

Everything is in SI units, which stand in brackets in the keys and headings, and in the
signs of the package: deflections and forces positive up. What has no finite value is
``null``, with a reason.
"""

import json
import re
from collections.abc import Mapping
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
from kplate.output.forcerows import number, numbers, resultant
from kplate.output.vtk import array_name
from kplate.reactions import Reactions
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
    shown = shown_record(solution)
    reactions = {found["case"]: found for found in shown["results"]}
    return {
        "kplate": version,
        "statement": shown["statement"],
        "mesh": {
            "triangles": len(mesh.triangles),
            "points": len(mesh.points),
            "field triangles": len(solution.samples.triangles),
            "field points": len(solution.samples.points),
            "unknowns": state.constraints.numbering.count,
            "element": state.element.name,
        },
        "results": [
            _case_results(solution, case, design) | reactions[case]
            for case in solution.cases
        ],
        "excluded": shown["excluded"],
        "asked": shown["asked"],
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
        "side_names": shown["side_names"],
        "field_names": {
            array_name(solution, case, field): {"case": case, "field": field}
            for case in solution.cases
            for field in solution.point_fields(case=case, design=design)
        },
    }


def shown_record(solution: Solution) -> dict[str, Any]:
    """What a picture needs of a record: all but what takes long to find."""
    return {
        "statement": _statement(solution),
        "results": [
            {"case": case, "reactions": _reactions(solution.reactions(case=case))}
            for case in solution.cases
        ],
        "excluded": [
            {
                "place [m]": numbers(excluded.place),
                "radius [m]": number(excluded.radius),
                "reason": excluded.reason,
                "case": excluded.case or None,
            }
            for excluded in solution.excluded
        ],
        "asked": [
            {"goal": type(goal).__name__, **_goal(goal), "case": case, **_value(value)}
            for (goal, case), value in solution.known.items()
        ],
        "side_names": list(solution.mesh.side_names),
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


def _statement(solution: Solution) -> dict[str, Any]:
    """The plate and its loads as stated."""
    plate = solution.plate
    outline = plate.outline
    return {
        "outline": {
            "rim": _line(outline.rim),
            "holes": [_line(hole) for hole in outline.holes],
            "area [m2]": number(outline.area),
            **_inside(outline),
            "notes": list(outline.notes),
        },
        "thickness [m]": number(plate.thickness),
        "material": _material(plate.material),
        "zones": [
            {
                "name": name,
                "thickness [m]": number(thickness),
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
        "bend_turn [rad]": number(plate.bend_turn),
        "mass [kg]": None if plate.mass is None else number(plate.mass),
        "cases": [case_record(case) for case in solution.state.cases],
    }


def _inside(outline: Outline) -> dict[str, Any]:
    """Zones, seams and marks of an outline by name."""
    return {
        "zones": [
            {"name": zone.name, **_line(zone.shape)}
            | {"area [m2]": number(outline.zone_area(zone.name))}
            for zone in outline.zones
        ],
        "seams": [
            {"name": seam.name, "points [m]": [numbers(p) for p in seam.points]}
            | _bulges(seam.bulges)
            for seam in outline.seams
        ],
        "marks": [
            {"name": mark.name, "at [m]": numbers(mark.at)} for mark in outline.marks
        ],
    }


def _line(shape: ClosedLine) -> dict[str, Any]:
    """A closed line: a circle as stated, everything else by its pieces."""
    if isinstance(shape, Circle):
        return {
            "shape": "circle",
            "centre [m]": numbers(shape.centre),
            "radius [m]": number(shape.radius),
            "sides": list(shape.sides),
        }
    line = shape.line
    return {
        "shape": type(shape).__name__.lower(),
        "points [m]": [numbers(point) for point in line.points],
        "sides": list(line.sides),
        **_bulges(line.bulges),
    }


def _bulges(bulges: Floats) -> dict[str, Any]:
    """Bulges of pieces, where not all are straight."""
    return {"bulges": numbers(bulges)} if (bulges != 0.0).any() else {}


def _material(material: Isotropic) -> dict[str, Any]:
    density = material.density
    return {
        "name": material.name,
        "E [Pa]": number(material.E),
        "nu": number(material.nu),
        "density [kg/m3]": None if density is None else number(density),
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
            record[key] = numbers(value)
        elif value is None or isinstance(value, str):
            record[key] = value
        else:
            record[key] = number(value)
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
        "strain energy [J]": number(solution.strain_energy(case=case)),
        "load work [J]": number(solution.load_work(case=case)),
    }


def _value(value: Value) -> dict[str, Any]:
    """A number with its band, in the unit of the key it stands under."""
    record: dict[str, Any] = {
        "value": number(value.value),
        "kind": value.kind,
        "lower": None if value.lower is None else number(value.lower),
        "upper": None if value.upper is None else number(value.upper),
        "place [m]": None if value.place is None else numbers(value.place),
        "face": value.face,
    }
    if value.reason:
        record["reason"] = value.reason
    return record


def _goal(goal: Goal) -> dict[str, Any]:
    """What a goal is asked of: place, direction, name."""
    own = {field.name: getattr(goal, field.name) for field in fields(goal)}
    return {k: numbers(v) if isinstance(v, tuple) else v for k, v in own.items()}


def _reactions(reactions: Reactions) -> dict[str, Any]:
    """Support forces by side, corner and point, and their balance with the loads."""
    return {
        "sides": [
            {"side": side.side, "support": side.support.name}
            | resultant(side.resultant)
            | {
                "stations [m]": [numbers(place) for place in side.stations],
                "distance [m]": numbers(side.distance),
                "line reaction [N/m]": numbers(side.line_reaction),
                "line moment [N]": numbers(side.line_moment),
            }
            for side in reactions.sides
        ],
        "corners": [
            {"sides": list(corner.corner.sides), "force [N]": _value(corner.force)}
            for corner in reactions.corners
        ],
        "points": [
            {"mark": point.mark, "support": point.support.name}
            | {"place [m]": numbers(point.force.place)}
            | resultant(point.resultant)
            for point in reactions.points
        ],
        "loads": resultant(reactions.load),
        "supports": resultant(reactions.total),
        "imbalance": number(reactions.imbalance),
    }
