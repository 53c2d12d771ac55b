"""The sections of a panel file turned into what they state, in SI units.

Coordinates of the outline and its holes are plain numbers in the outline's unit; every
other quantity is text with its unit. A field of a later version is refused by its name.
"""

import math
import re
from collections.abc import Collection, Mapping, Sequence
from typing import Any, cast

from kplate.arrays import read_only_floats
from kplate.errors import InputError
from kplate.fields import Fields, closest, one_line, shown, within
from kplate.limits import CRITERIA, Criterion, DeflectionLimit, Limits, StressLimit
from kplate.loads import (
    STANDARD_GRAVITY,
    Case,
    DiscPatch,
    Hydrostatic,
    Load,
    PointForce,
    Pressure,
    RectanglePatch,
    SelfWeight,
)
from kplate.materials import STOCK, Isotropic
from kplate.outline import Outline
from kplate.polygon import Polygon
from kplate.quantities import (
    angle,
    bare_number,
    check_reach,
    positive,
    quantity,
    stated_unit,
)
from kplate.shapes import Circle, ClosedLine
from kplate.supports import SUPPORTS, Support
from kplate.units import Unit

# What each table may hold, each field with a value as it is written.
MATERIAL = {
    "name": '"larch board"',
    "E": '"11 GPa"',
    "nu": "0.3",
    "density": '"590 kg/m^3"',
    "source": '"data sheet"',
}
OUTLINE = {
    "unit": '"mm"',
    "points": "[[0, 0], [800, 0], [800, 600], [0, 600]]",
    "sides": '["south", "east", "north", "west"]',
    "circle": '{ centre = [0, 0], radius = 300, name = "rim" }',
}
CIRCLE = {"centre": "[400, 300]", "radius": "50", "diameter": "100"}
HOLE = {
    "name": '"shaft"',
    "circle": "{ centre = [400, 300], radius = 50 }",
    "points": "[[100, 100], [200, 100], [200, 200]]",
    "sides": '["low", "right", "left"]',
}
CASE = {"name": '"wheel"', "loads": '[{ pressure = "5 kPa down" }]'}
GRAVITY = {"gravity": '"9.81 m/s^2"'}
LOADS = {
    "pressure": {"pressure": '"5 kPa down"'},
    "force": {
        "force": '"1.5 kN down"',
        "over": '"200 mm x 200 mm"',
        "at": '["400 mm", "300 mm"]',
        "angle": '"30 deg"',
    },
    "liquid": {
        "liquid": '"1000 kg/m^3"',
        "level": '"900 mm"',
        "pushes": '"down"',
        **GRAVITY,
    },
    "self_weight": {"self_weight": '"down"', **GRAVITY},
}
LIMITS = {
    "deflection": '{ span = "600 mm", at_most = "span/200" }',
    "stress": '{ criterion = "von Mises", strength = "235 MPa", factor = 1.5 }',
    "hold_down": '"200 N"',
    "stock": '["6 mm", "8 mm", "10 mm"]',
}
DEFLECTION = {"span": '"600 mm"', "at_most": '"span/200"'}
STRESS = {"criterion": '"von Mises"', "strength": '"235 MPa"', "factor": "1.5"}

# What the panel file is to hold one day.
LATER_OUTLINE = ("arcs", "dxf", "step", "msh")
LATER_HOLE = ("slot", "rectangle")
LATER_SIDES = ("points", "lines", "bedding")
LATER_SUPPORTS = ("guided", "springs")
LATER_LIMITS = ("frequency",)

_SHARE = re.compile(r"span ?/ ?([0-9]{1,6}(?:\.[0-9]{1,6})?)")


def read_material(head: Fields) -> Isotropic:
    """Material of a [panel]: one from stock by its name, or a table of its own."""
    stated = head.value("material")
    if not isinstance(stated, Mapping):
        return STOCK[head.choice("material", STOCK)]
    fields = Fields(where="[panel] material", table=stated, examples=MATERIAL)
    density = fields.positive("density", "density") if "density" in fields else None
    name, nu = fields.word("name"), fields.number("nu")
    E = fields.positive("E", "stress")
    source = fields.word("source", default="")
    with within("[panel]"):
        return Isotropic(name=name, E=E, nu=nu, density=density, source=source)


def read_outline(
    table: Mapping[str, Any], holes: Sequence[Any]
) -> tuple[Outline, Unit]:
    """Outline with its holes, and the unit of their coordinates."""
    refuse_later("[outline]", table, LATER_OUTLINE)
    fields = Fields(where="[outline]", table=table, examples=OUTLINE)
    length = fields.unit("unit", "length")
    if "circle" in fields:
        refuse_beside(fields, "circle", ("points", "sides"))
        rim: ClosedLine = _circle(fields, length, name="rim")
    else:
        rim = _polygon(fields, length, name=None)
    with within("[outline]"):
        outline = Outline(rim=rim)
    lines = [_hole(i, hole, length) for i, hole in enumerate(holes, 1)]
    with within("[[hole]]"):
        return outline.cut(*lines), length


def read_supports(table: Mapping[str, Any], outline: Outline) -> dict[str, Support]:
    """How each side that is named is held."""
    sides = outline.side_names
    refuse_later("[supports]", table, set(LATER_SIDES).difference(sides))
    supports = {}
    for side, word in table.items():
        place = f"[supports] {shown(side)} = {shown(word)}"
        if side not in sides:
            raise InputError(
                f"{place}: there is no such side; the sides are "
                f"{_some(sides)}.{closest(side, sides)}"
            )
        if isinstance(word, Mapping) or word in LATER_SUPPORTS:
            raise InputError(
                f"{place}: such a support is not read by this version; use one "
                f"of {', '.join(SUPPORTS)}."
            )
        if not isinstance(word, str) or word not in SUPPORTS:
            hint = closest(word, SUPPORTS) if isinstance(word, str) else ""
            raise InputError(f"{place}: it must be one of {', '.join(SUPPORTS)}.{hint}")
        supports[side] = SUPPORTS[word]
    return supports


def read_cases(tables: Sequence[Any], material: Isotropic) -> tuple[Case, ...]:
    """Load cases of a panel of this material."""
    cases: dict[str, Case] = {}
    for i, table in enumerate(tables, 1):
        where = _numbered("[[case]]", i, table)
        fields = Fields(where=where, table=table, examples=CASE)
        name = fields.word("name")
        if name in cases:
            raise InputError(f"{where}: another case has this name; give each its own.")
        stated = [item for _, item in fields.items("loads")]
        loads = [
            _load(f"{where}, load {j}", item, material)
            for j, item in enumerate(stated, 1)
        ]
        with within(where):
            cases[name] = Case(name=name, loads=loads)
    return tuple(cases.values())


def read_limits(
    table: Mapping[str, Any],
) -> tuple[Limits, tuple[float, ...], Unit | None]:
    """Limits, the stock thicknesses in m, and the unit in which strength is stated."""
    refuse_later("[limits]", table, LATER_LIMITS)
    fields = Fields(where="[limits]", table=table, examples=LIMITS)
    stress, shown_in = _stress(fields) if "stress" in fields else (None, None)
    hold_down = fields.positive("hold_down", "force") if "hold_down" in fields else None
    deflection = _deflection(fields) if "deflection" in fields else None
    stock = []
    for place, item in fields.items("stock") if "stock" in fields else ():
        with within(place):
            stock.append(positive(item, "length"))
    limits = Limits(deflection=deflection, stress=stress, hold_down=hold_down)
    return limits, tuple(stock), shown_in


def refuse_later(where: str, table: Mapping[str, Any], later: Collection[str]) -> None:
    """Refuse fields that this version does not read yet."""
    for key in table:
        if key in later:
            raise InputError(f"{where} {key} is not read by this version; take it out.")


def refuse_beside(fields: Fields, key: str, others: Collection[str]) -> None:
    """Refuse fields that say twice what one field says."""
    for other in others:
        if other in fields:
            raise InputError(
                f"{fields.where}: {key} and {other} exclude each other; keep one."
            )


def _hole(number: int, table: Any, length: Unit) -> ClosedLine:
    where = _numbered("[[hole]]", number, table)
    if isinstance(table, Mapping):
        refuse_later(where, table, LATER_HOLE)
    fields = Fields(where=where, table=table, examples=HOLE)
    name = fields.word("name", default=f"hole-{number}")
    if "circle" in fields:
        refuse_beside(fields, "circle", ("points", "sides"))
        return _circle(fields, length, name=name)
    if "name" in fields:
        refuse_beside(fields, "name", ("sides",))
    return _polygon(fields, length, name=name)


def _circle(fields: Fields, length: Unit, *, name: str) -> Circle:
    """Read a circle; that of an [outline] carries the name of its one side itself."""
    where = f"{fields.where} circle"
    own_name = {} if "name" in fields.examples else {"name": f'"{name}"'}
    circle = Fields(
        where=where, table=fields.value("circle"), examples=CIRCLE | own_name
    )
    with within(circle.place("centre")):
        centre = _pair(circle.value("centre"), length)
    if "diameter" in circle:
        refuse_beside(circle, "diameter", ("radius",))
    key, share = ("diameter", 0.5) if "diameter" in circle else ("radius", 1.0)
    radius = share * circle.number(key) * length.size
    with within(circle.place(key)):
        check_reach(radius, "length")
    if own_name:
        name = circle.word("name", default=name)
    with within(where):
        return Circle(centre=centre, radius=radius, name=name)


def _polygon(fields: Fields, length: Unit, *, name: str | None) -> Polygon:
    """Read a polygon; without sides it is one side of this name, or numbered sides."""
    points = []
    for place, item in fields.items("points"):
        with within(place):
            points.append(_pair(item, length))
    if len(points) < 3:
        raise fields.refuse("points", "it takes at least three points [x, y].")
    with within(fields.place("points")):
        check_reach(max(map(math.dist, points, points[1:])), "length")
    if "sides" in fields:
        sides = []
        for place, item in fields.items("sides"):
            with within(place):
                sides.append(one_line(item))
    else:
        sides = [name or f"side-{i}" for i in range(1, len(points) + 1)]
    with within(fields.where):
        return Polygon(points=read_only_floats(points), sides=tuple(sides))


def _pair(value: Any, length: Unit) -> tuple[float, float]:
    """Read two coordinates in the outline's unit, in m."""
    if not isinstance(value, list) or len(value) != 2:
        raise InputError("a place is two numbers [x, y] in the outline's unit.")
    x, y = (bare_number(item) * length.size for item in value)
    check_reach(max(abs(x), abs(y), 1.0), "length")  # a tiny one is 0 but for round-off
    return x, y


def _load(where: str, table: Any, material: Isotropic) -> Load:
    """Read one load; the field that leads tells its kind."""
    kinds = [kind for kind in LOADS if isinstance(table, Mapping) and kind in table]
    if len(kinds) > 1:
        raise InputError(f"{where}: {' and '.join(kinds)} are two loads; part them.")
    if not kinds:
        stated = _some(table) if isinstance(table, Mapping) else shown(table)
        raise InputError(
            f"{where} states {stated or 'nothing'}; a load states one of "
            f"{', '.join(LOADS)}, such as {CASE['loads'][1:-1]}."
        )
    kind = kinds[0]
    fields = Fields(where=where, table=table, examples=LOADS[kind])
    if kind == "pressure":
        return Pressure(fields.directed("pressure", "pressure"))
    if kind == "force":
        return _force(fields)
    gravity = STANDARD_GRAVITY
    if "gravity" in fields:
        gravity = fields.positive("gravity", "acceleration")
    if kind == "self_weight":
        if material.density is None:
            raise fields.refuse(
                kind, f"material {shown(material.name)} states no density; add it."
            )
        return SelfWeight(acceleration=_sign(fields, kind) * gravity)
    density = fields.positive("liquid", "density")
    return Hydrostatic(
        level=fields.quantity("level", "length"),
        specific_weight=_sign(fields, "pushes") * density * gravity,
    )


def _sign(fields: Fields, key: str) -> float:
    return 1.0 if fields.choice(key, ("up", "down")) == "up" else -1.0


def _force(fields: Fields) -> Load:
    """Read a force at a point, or spread over a rectangle or a disc."""
    force = fields.directed("force", "force")
    places = fields.items("at")
    if len(places) != 2:
        raise fields.refuse("at", f"it takes x and y, {fields.examples['at']}.")
    at = []
    for place, item in places:
        with within(place):
            at.append(quantity(item, "length"))
    centre = (at[0], at[1])
    lengths = _patch(fields) if "over" in fields else []
    if len(lengths) == 2:
        turn = 0.0
        if "angle" in fields:
            with within(fields.place("angle")):
                turn = angle(fields.value("angle"))
        size = (lengths[0], lengths[1])
        return RectanglePatch(force=force, centre=centre, size=size, angle=turn)
    if "angle" in fields:
        raise fields.refuse("angle", "only a rectangle can be turned; take it out.")
    if lengths:
        return DiscPatch(force=force, centre=centre, radius=0.5 * lengths[0])
    return PointForce(force=force, at=centre)


def _patch(fields: Fields) -> list[float]:
    """Read the two lengths of a rectangle, or the diameter of a disc, in m."""
    text = fields.word("over")
    disc, is_disc, diameter = text.partition("disc ")
    parts = [diameter] if is_disc and not disc else re.split("[x\u00d7]", text)
    with within(fields.place("over")):
        if not (is_disc or len(parts) == 2):
            raise InputError(
                'it must be a rectangle "200 mm x 100 mm" or, by its diameter, a '
                '"disc 150 mm".'
            )
        return [positive(part, "length") for part in parts]


def _deflection(limits: Fields) -> DeflectionLimit:
    """Read a share of a span, a length, or a list of them: the least counts."""
    where = "[limits] deflection"
    fields = Fields(where=where, table=limits.value("deflection"), examples=DEFLECTION)
    stated = fields.value("at_most")
    places = [(fields.place("at_most"), stated)]
    if isinstance(stated, list):
        places = fields.items("at_most")
    lengths = []
    for place, text in places:
        with within(place):
            part = _part_of_span(text)
            lengths.append(positive(text, "length") if part is None else part)
    shares = [_part_of_span(text) is not None for _, text in places]
    if "span" in fields and not any(shares):
        raise fields.refuse("span", "at_most does not use it; take it out.")
    if any(shares):
        span = fields.positive("span", "length")
        lengths = [
            length * span if is_share else length
            for length, is_share in zip(lengths, shares, strict=True)
        ]
    words = " and ".join(text for _, text in places)
    return DeflectionLimit(at_most=min(lengths), words=words)


def _part_of_span(text: Any) -> float | None:
    """Read "span/200" as 1/200; ``None`` for what starts like a length."""
    if isinstance(text, str) and text[:1] in set("+-.0123456789"):
        return None
    match = _SHARE.fullmatch(text) if isinstance(text, str) else None
    if match is None or float(match[1]) < 1.0:
        raise InputError('it must be "span/200", say, or a length such as "3 mm".')
    return 1.0 / float(match[1])


def _stress(limits: Fields) -> tuple[StressLimit, Unit]:
    """Read the stress limit, and the unit in which its strength is stated."""
    where = "[limits] stress"
    fields = Fields(where=where, table=limits.value("stress"), examples=STRESS)
    criterion = cast(Criterion, fields.choice("criterion", CRITERIA))
    strength, factor = fields.positive("strength", "stress"), fields.number("factor")
    shown_in = stated_unit(fields.value("strength"), "stress")
    with within(where):
        limit = StressLimit(criterion=criterion, strength=strength, factor=factor)
    return limit, shown_in


def _some(names: Collection[str]) -> str:
    """List names, but no more than a line holds."""
    first = list(names)[:8]
    more = len(names) - len(first)
    return ", ".join(map(shown, first)) + (f" and {more} more" if more else "")


def _numbered(section: str, number: int, table: Any) -> str:
    """How messages name one of several tables: by its number and its name."""
    name = table.get("name") if isinstance(table, Mapping) else None
    return f"{section} {number}" + (f" {shown(name)}" if isinstance(name, str) else "")
