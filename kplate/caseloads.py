"""The load cases of a panel file, each load with its sense in words.

A force or pressure says up or down, an edge moment which face it stretches, a couple
which way it lifts the plate; a sign is refused. Every quantity has its unit.
"""

from collections.abc import Mapping, Sequence
from typing import Any

from kplate.errors import InputError
from kplate.fields import Fields, named, numbered, shown, some, within
from kplate.loads import (
    STANDARD_GRAVITY,
    Case,
    DiscPatch,
    EdgeMoment,
    Hydrostatic,
    LineForce,
    Load,
    PointForce,
    PointMoment,
    Pressure,
    RectanglePatch,
    SelfWeight,
)
from kplate.outline import Outline
from kplate.patches import Roaming
from kplate.plate import Plate
from kplate.quantities import positive, quantity, two_lengths

# What each table may hold, each field with a value as it is written.
CASE = {
    "name": '"wheel"',
    "loads": '[{ pressure = "5 kPa down" }]',
    "reverses": '"yes"',
    "roaming": '{ force = "1.5 kN down", over = "200 mm x 200 mm", step = "100 mm" }',
}
ROAMING = {
    "force": '"1.5 kN down"',
    "over": '"200 mm x 200 mm"',
    "angle": '"30 deg"',
    "on": '"panel"',
    "step": '"100 mm"',
}
PANEL = "panel"  # what a patch roams on where that is no zone
GRAVITY = {"gravity": '"9.81 m/s^2"'}
AT = {"at": '["400 mm", "300 mm"]'}
# The field that leads tells the kind.
LOADS = {
    "pressure": {"pressure": '"5 kPa down"', "on": '"pad"'},
    "force": {
        "force": '"1.5 kN down"',
        "over": '"200 mm x 200 mm"',
        **AT,
        "angle": '"30 deg"',
    },
    "line": {"line": '"2 kN/m down"', "along": '"rib"'},
    "edge_moment": {
        "edge_moment": '"100 N m/m"',
        "along": '"east"',
        "stretches": '"top"',
    },
    "moment": {"moment": '"50 N m"', "lifts": '"+x"', **AT},
    "liquid": {
        "liquid": '"1000 kg/m^3"',
        "level": '"900 mm"',
        "pushes": '"down"',
        **GRAVITY,
    },
    "self_weight": {"self_weight": '"down"', **GRAVITY},
}
# Components about x and y, right-handed, of a couple that lifts the plate on the side
# named and presses it down on the other: about x it raises dw/dy, about y it lowers
# dw/dx.
LIFTS = {"+x": (0.0, -1.0), "-x": (0.0, 1.0), "+y": (1.0, 0.0), "-y": (-1.0, 0.0)}
# m_nn is positive where it compresses the top face.
STRETCHES = {"bottom": 1.0, "top": -1.0}


def read_cases(
    tables: Sequence[Any], plate: Plate
) -> tuple[tuple[Case, ...], tuple[Roaming, ...]]:
    """Load cases of a plate, each name once, and those with a patch that roams."""
    cases: dict[str, Case | Roaming] = {}
    for i, table in enumerate(tables, 1):
        where = numbered("[[case]]", i, table)
        fields = Fields(where=where, table=table, examples=CASE)
        name = fields.word("name")
        if name in cases:
            raise InputError(f"{where}: another case has this name; give each its own.")
        roams = "roaming" in fields
        stated = []
        if "loads" in fields or not roams:
            stated = [item for _, item in fields.items("loads")]
        loads = [
            _load(f"{where}, load {j}", item, plate) for j, item in enumerate(stated, 1)
        ]
        reverses = False
        if "reverses" in fields:
            reverses = fields.choice("reverses", ("yes", "no")) == "yes"
        if roams and reverses:
            raise fields.refuse(
                "reverses", "a patch that roams acts one way; state a second case."
            )
        if roams:
            cases[name] = _roaming(name, fields, loads, plate.outline)
            continue
        with within(where):
            cases[name] = Case(name=name, loads=loads, reverses=reverses)
    return (
        tuple(case for case in cases.values() if isinstance(case, Case)),
        tuple(case for case in cases.values() if isinstance(case, Roaming)),
    )


def _roaming(
    name: str, case: Fields, loads: Sequence[Load], outline: Outline
) -> Roaming:
    """Read a patch that roams over the panel or a zone."""
    fields = Fields(
        where=f"{case.where} roaming", table=case.value("roaming"), examples=ROAMING
    )
    force, lengths = fields.directed("force", "force"), _patch(fields)
    zone = None
    if "on" in fields and fields.word("on") != PANEL:
        zone = named(fields, "on", (PANEL, *outline.zone_names), "zone")
    patch: RectanglePatch | DiscPatch
    if len(lengths) == 2:
        turn = fields.angle("angle")
        patch = RectanglePatch(force=force, centre=(0.0, 0.0), size=lengths, angle=turn)
    elif "angle" in fields:
        raise fields.refuse("angle", "only a rectangle can be turned; take it out.")
    else:
        patch = DiscPatch(force=force, centre=(0.0, 0.0), radius=0.5 * lengths[0])
    return Roaming(
        name=name,
        patch=patch,
        step=fields.positive("step", "length"),
        zone=zone,
        loads=tuple(loads),
    )


def _load(where: str, table: Any, plate: Plate) -> Load:
    """Read one load; the field that leads tells its kind."""
    kinds = [kind for kind in LOADS if isinstance(table, Mapping) and kind in table]
    if len(kinds) > 1:
        raise InputError(f"{where}: {' and '.join(kinds)} are two loads; part them.")
    if not kinds:
        stated = some(table) if isinstance(table, Mapping) else shown(table)
        raise InputError(
            f"{where} states {stated or 'nothing'}; a load states one of "
            f"{', '.join(LOADS)}, such as {CASE['loads'][1:-1]}."
        )
    fields = Fields(where=where, table=table, examples=LOADS[kinds[0]])
    match kinds[0]:
        case "pressure":
            return _pressure(fields, plate.outline)
        case "force":
            return _force(fields, plate.outline)
        case "moment":
            return _moment(fields, plate.outline)
        case "line":
            return _line(fields, plate.outline)
        case "edge_moment":
            return _edge_moment(fields, plate.outline)
        case "liquid":
            return _liquid(fields)
        case _:
            return _self_weight(fields, plate)


def _pressure(fields: Fields, outline: Outline) -> Pressure:
    pressure = fields.directed("pressure", "pressure")
    if "on" not in fields:
        return Pressure(pressure)
    return Pressure(pressure, zone=named(fields, "on", outline.zone_names, "zone"))


def _line(fields: Fields, outline: Outline) -> LineForce:
    force = fields.directed("line", "line force")
    names = (*outline.side_names, *(seam.name for seam in outline.seams))
    return LineForce(force=force, along=named(fields, "along", names, "side or seam"))


def _edge_moment(fields: Fields, outline: Outline) -> EdgeMoment:
    moment = fields.positive("edge_moment", "line moment")
    sign = STRETCHES[fields.choice("stretches", STRETCHES)]
    along = named(fields, "along", outline.side_names, "side")
    return EdgeMoment(moment=sign * moment, along=along)


def _moment(fields: Fields, outline: Outline) -> PointMoment:
    moment = fields.positive("moment", "moment")
    about_x, about_y = LIFTS[fields.choice("lifts", LIFTS)]
    components = (about_x * moment, about_y * moment)
    return PointMoment(moment=components, at=_place(fields, outline))


def _liquid(fields: Fields) -> Hydrostatic:
    density = fields.positive("liquid", "density")
    return Hydrostatic(
        level=fields.quantity("level", "length"),
        specific_weight=_sign(fields, "pushes") * density * _gravity(fields),
    )


def _self_weight(fields: Fields, plate: Plate) -> SelfWeight:
    for _, material in plate.sections:
        if material.density is None:
            raise fields.refuse(
                "self_weight",
                f"material {shown(material.name)} states no density; add it.",
            )
    return SelfWeight(acceleration=_sign(fields, "self_weight") * _gravity(fields))


def _gravity(fields: Fields) -> float:
    if "gravity" in fields:
        return fields.positive("gravity", "acceleration")
    return STANDARD_GRAVITY


def _sign(fields: Fields, key: str) -> float:
    return 1.0 if fields.choice(key, ("up", "down")) == "up" else -1.0


def _force(fields: Fields, outline: Outline) -> Load:
    """Read a force at a point, or spread over a rectangle or a disc."""
    force, centre = fields.directed("force", "force"), _place(fields, outline)
    lengths = _patch(fields) if "over" in fields else ()
    if len(lengths) == 2:
        turn = fields.angle("angle")
        return RectanglePatch(force=force, centre=centre, size=lengths, angle=turn)
    if "angle" in fields:
        raise fields.refuse("angle", "only a rectangle can be turned; take it out.")
    if lengths:
        return DiscPatch(force=force, centre=centre, radius=0.5 * lengths[0])
    return PointForce(force=force, at=centre)


def _place(fields: Fields, outline: Outline) -> tuple[float, float]:
    """Read where a load acts: x and y with their units, or a mark."""
    if isinstance(fields.value("at"), str):
        marks = {mark.name: mark.at for mark in outline.marks}
        return marks[named(fields, "at", marks, "mark")]
    places = fields.items("at")
    if len(places) != 2:
        raise fields.refuse("at", f"it takes x and y, {AT['at']}, or a mark's name.")
    at = []
    for place, item in places:
        with within(place):
            at.append(quantity(item, "length"))
    return at[0], at[1]


def _patch(fields: Fields) -> tuple[float, float] | tuple[float]:
    """Read the two lengths of a rectangle, or the diameter of a disc, in m."""
    text = fields.word("over")
    disc, is_disc, diameter = text.partition("disc ")
    with within(fields.place("over")):
        if is_disc and not disc:
            return (positive(diameter, "length"),)
        lengths = two_lengths(text)
        if lengths is None:
            raise InputError(
                'it must be a rectangle "200 mm x 100 mm" or, by its diameter, a '
                '"disc 150 mm".'
            )
        return lengths
