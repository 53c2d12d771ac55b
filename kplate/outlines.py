"""The plan of a panel file: rim, holes, zones, seams and marks, as an `Outline`.

Here a plain number counts in the outline's unit; text brings a unit of its own, such as
``"1 1/2 in"``. A point of a line is ``[x, y]``, or ``{ from = [x, y], through = [x, y]
}`` where an arc runs from it, through another place, to the next point.
"""

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any, cast

from kplate import curves
from kplate.arrays import read_only_floats
from kplate.errors import InputError
from kplate.fields import (
    Fields,
    closest,
    numbered,
    pair,
    refuse_beside,
    some,
    within,
)
from kplate.outline import Mark, Outline, Seam, Zone
from kplate.outlinefiles import read_outline_file
from kplate.polygon import Chords, Polygon
from kplate.quantities import check_reach, fraction, two_lengths, unit
from kplate.shapes import Circle, ClosedLine, Ellipse, Rectangle, Slot
from kplate.units import Unit

Place = tuple[float, float]

# Where the panel read is compared with what is expected. A drawing gives sizes to four
# digits or more; three digits of an area, such as 1.02 m2, are rounded by up to 0.5 %.
SIZE_AGREES, AREA_AGREES = 1e-3, 5e-3
# A place this near to the line between the ends, as a bulge, makes no arc.
LEAST_BULGE = 1e-6

# What each shape may hold, each field with a value as it is written.
CIRCLE = {"centre": "[400, 300]", "radius": "50", "diameter": "100"}
SLOT = {
    "centre": "[400, 300]",
    "length": "120",
    "width": "40",
    "angle": '"30 deg"',
}
ELLIPSE = {"centre": "[400, 300]", "size": "[120, 80]", "angle": '"30 deg"'}
RECTANGLE = {**ELLIPSE, "corner_radius": "10"}
SHAPES = {
    "circle": CIRCLE,
    "slot": SLOT,
    "rectangle": RECTANGLE,
    "ellipse": ELLIPSE,
}
BUILDERS: dict[str, Callable[..., ClosedLine]] = {
    "circle": Circle,
    "slot": Slot,
    "rectangle": Rectangle,
    "ellipse": Ellipse,
}
SHAPE = {
    "circle": "{ centre = [400, 300], radius = 50 }",
    "slot": "{ centre = [400, 300], length = 120, width = 40 }",
    "rectangle": "{ centre = [400, 300], size = [120, 80] }",
    "ellipse": "{ centre = [400, 300], size = [120, 80] }",
}
ARC = {"from": "[800, 0]", "through": "[950, 300]"}
TIDIED = {"chords": '"arc"', "snap": "0.5"}
# What each section may hold.
OUTLINE = {
    "unit": '"mm"',
    "points": "[[0, 0], [800, 0], [800, 600], [0, 600]]",
    "sides": '["south", "east", "north", "west"]',
    **TIDIED,
    **SHAPE,
    "file": '"cover.dxf"',
    "layer": '"outline"',
    "fillets": '[{ corner = ["south", "east"], radius = 20 }]',
    "reliefs": '[{ corner = ["notch-south", "notch-east"], radius = 10 }]',
    "parts": '[{ side = "north", name = "hinge", from = "0 %", to = "40 %" }]',
    "expect": '{ size = "800 mm x 600 mm", holes = 2, area = "0.48 m^2" }',
}
ROUNDED = {"corner": '["south", "east"]', "radius": "20", "name": '"round"'}
PART = {"side": '"north"', "name": '"hinge"', "from": '"0 %"', "to": '"40 %"'}
EXPECT = {"size": '"800 mm x 600 mm"', "holes": "2", "area": '"0.48 m^2"'}
HOLE = {
    "name": '"shaft"',
    **SHAPE,
    "points": "[[100, 100], [200, 100], [200, 200]]",
    "sides": '["low", "right", "left"]',
    **TIDIED,
}
ZONE = {
    "name": '"pad"',
    **SHAPE,
    "points": "[[100, 100], [200, 100], [200, 200]]",
    **TIDIED,
    "thickness": '"20 mm"',
    "material": '"steel S355"',
}
SEAM = {"name": '"rib"', "points": "[[0, 300], [800, 300]]"}
MARK = {"name": '"bolt"', "at": "[400, 300]"}


@dataclass(frozen=True, eq=False, kw_only=True)
class Stated:
    """The outline that a panel file states.

    Parameters
    ----------
    outline : Outline
        With all that lies inside.
    length : Unit
        What plain numbers count in.
    notes : tuple of str
        What was tidied, and what a drawing holds that was not taken.
    file : Path, optional
        The drawing it was taken from.
    """

    outline: Outline
    length: Unit
    notes: tuple[str, ...] = ()
    file: Path | None = None


def read_outline(sections: Mapping[str, Any], folder: Path) -> Stated:
    """Outline of a panel file with all that lies inside.

    Parameters
    ----------
    sections : mapping
        The sections of the file by name: "outline", "hole", "zone", "seam", "mark".
    folder : Path
        Where the panel file is.

    Returns
    -------
    Stated

    Raises
    ------
    InputError
        If a field is missing, unknown or wrong, or the panel is not as expected.
    """
    fields = Fields(where="[outline]", table=sections["outline"], examples=OUTLINE)
    rim = _rim(fields, folder)
    plain = rim.length
    first = len(rim.outline.holes) + 1
    holes = [_hole(i, table, plain, first) for i, table in _listed(sections, "hole")]
    with within("[[hole]]"):
        outline = rim.outline.cut(*holes)
    outline = _parted(_rounded(outline, fields, plain), fields, plain)
    zones = [_zone(i, table, plain) for i, table in _listed(sections, "zone")]
    with within("[[zone]]"):
        outline = replace(outline, zones=tuple(zones))
    seams = [_seam(i, table, plain) for i, table in _listed(sections, "seam")]
    with within("[[seam]]"):
        outline = replace(outline, seams=tuple(seams))
    marks = [_mark(i, table, plain) for i, table in _listed(sections, "mark")]
    with within("[[mark]]"):
        outline = replace(outline, marks=tuple(marks))
    _compare(outline, fields, plain)
    notes = tuple(dict.fromkeys((*rim.notes, *outline.notes)))
    return replace(rim, outline=outline, notes=notes)


def _rim(fields: Fields, folder: Path) -> Stated:
    """Read the rim alone, or a drawing with its holes."""
    if "file" not in fields:
        if "layer" in fields:
            raise fields.refuse("layer", "it goes with a file; take it out.")
        plain = fields.unit("unit", "length")
        line = _closed_line(fields, plain, name=None)
        with within("[outline]"):
            return Stated(outline=Outline.of(line), length=plain)
    refuse_beside(fields, "file", ("points", *SHAPES))
    drawing, path = read_outline_file(fields, folder)
    return Stated(
        outline=drawing.outline,
        length=unit(drawing.unit, "length"),
        notes=(*drawing.notes, *(f"not taken: {entity}" for entity in drawing.ignored)),
        file=path,
    )


def _listed(sections: Mapping[str, Any], key: str) -> list[tuple[int, Any]]:
    return list(enumerate(sections.get(key, []), 1))


def _hole(number: int, table: Any, plain: Unit, first: int) -> ClosedLine:
    """Read a hole; those without a name are numbered on from the first."""
    fields = Fields(
        where=numbered("[[hole]]", number, table), table=table, examples=HOLE
    )
    name = fields.word("name", default=f"hole-{first + number - 1}")
    if "name" in fields:
        refuse_beside(fields, "name", ("sides",))
    return _closed_line(fields, plain, name=name)


def _zone(number: int, table: Any, plain: Unit) -> Zone:
    """Read where a zone is; what it is made of is read with the materials."""
    fields = Fields(
        where=numbered("[[zone]]", number, table), table=table, examples=ZONE
    )
    name = fields.word("name")
    return Zone(shape=_closed_line(fields, plain, name=name), name=name)


def _seam(number: int, table: Any, plain: Unit) -> Seam:
    fields = Fields(
        where=numbered("[[seam]]", number, table), table=table, examples=SEAM
    )
    name = fields.word("name")
    points, bulges = _line(fields, plain, closed=False)
    with within(fields.where):
        return Seam(
            points=read_only_floats(points), name=name, bulges=read_only_floats(bulges)
        )


def _mark(number: int, table: Any, plain: Unit) -> Mark:
    fields = Fields(
        where=numbered("[[mark]]", number, table), table=table, examples=MARK
    )
    return Mark(name=fields.word("name"), at=fields.pair("at", plain))


def _closed_line(fields: Fields, plain: Unit, *, name: str | None) -> ClosedLine:
    """Read the one shape that a section states; without a name it names its sides."""
    kinds = [kind for kind in (*SHAPES, "points") if kind in fields]
    if not kinds:
        raise InputError(
            f"{fields.where}: its shape is missing; add points = "
            f"{fields.examples['points']}, or one of {', '.join(SHAPES)}."
        )
    if kinds[0] == "points":
        return _polygon(fields, plain, name=name)
    refuse_beside(fields, kinds[0], ("points", "sides", *TIDIED, *kinds[1:]))
    return _shape(fields, kinds[0], plain, name=name)


def _shape(fields: Fields, kind: str, plain: Unit, *, name: str | None) -> ClosedLine:
    """Read a circle, slot, rectangle or ellipse."""
    where = f"{fields.where} {kind}"
    named = {"name": '"rim"'} if name is None else {}
    own = Fields(where=where, table=fields.value(kind), examples=SHAPES[kind] | named)
    side = own.word("name", default="rim") if name is None else name
    sizes: dict[str, Any] = {"centre": own.pair("centre", plain), "name": side}
    if kind == "circle":
        sizes["radius"] = _radius(own, plain)
    else:
        sizes["angle"] = own.angle("angle")
    if kind == "slot":
        sizes |= {key: own.length(key, plain) for key in ("length", "width")}
    if kind in ("rectangle", "ellipse"):
        sizes["size"] = _size(own, plain)
    if "corner_radius" in own:
        sizes["corner_radius"] = own.length("corner_radius", plain)
    with within(where):
        return BUILDERS[kind](**sizes)


def _radius(circle: Fields, plain: Unit) -> float:
    if "diameter" in circle:
        refuse_beside(circle, "diameter", ("radius",))
        return 0.5 * circle.length("diameter", plain)
    return circle.length("radius", plain)


def _size(fields: Fields, plain: Unit) -> tuple[float, float]:
    """Read two lengths, each larger than zero."""
    a, b = fields.pair("size", plain)
    with within(fields.place("size")):
        if min(a, b) <= 0.0:
            raise InputError("both lengths must be positive.")
        check_reach(min(a, b), "length")
    return a, b


def _polygon(fields: Fields, plain: Unit, *, name: str | None) -> Polygon:
    """Read a polygon; without sides it is one side of this name, or numbered sides."""
    points, bulges = _line(fields, plain, closed=True)
    if len(points) < (3 if not any(bulges) else 2):
        raise fields.refuse(
            "points",
            "it takes at least three points [x, y], two where an arc runs from one.",
        )
    sides = [name or f"side-{i}" for i in range(1, len(points) + 1)]
    if "sides" in fields:
        sides = fields.words("sides")
    chords = fields.choice("chords", ("arc", "polygon")) if "chords" in fields else ""
    with within(fields.where):
        return Polygon(
            points=read_only_floats(points),
            sides=tuple(sides),
            bulges=read_only_floats(bulges),
            chords=cast(Chords, chords or "ask"),
            snap=fields.length("snap", plain) if "snap" in fields else None,
        )


def _line(
    fields: Fields, plain: Unit, *, closed: bool
) -> tuple[list[Place], list[float]]:
    """Read points in m, and the bulges of the pieces between them."""
    stated: list[tuple[str, Place, Place | None]] = []
    for i, (place, item) in enumerate(fields.items("points"), 1):
        if isinstance(item, Mapping):
            arc = fields.row("points", i, ARC)
            stated.append((place, arc.pair("from", plain), arc.pair("through", plain)))
        else:
            with within(place):
                stated.append((place, pair(item, plain), None))
    points = [point for _, point, _ in stated]
    if len(points) > 1:
        with within(fields.place("points")):
            check_reach(max(map(math.dist, points, points[1:])), "length")
    if not closed and stated[-1][2] is not None:
        raise InputError(f"{stated[-1][0]}: no arc can run from the last point.")
    ends = [*points[1:], points[0]] if closed else points[1:]
    bulges = []
    for (place, start, middle), end in zip(stated, ends, strict=False):
        with within(place):
            bulges.append(0.0 if middle is None else _bulge(start, middle, end))
    return points, bulges


def _bulge(start: Place, middle: Place, end: Place) -> float:
    """Bulge of an arc, which must be one."""
    arms = [math.dist(start, middle), math.dist(middle, end)]
    least = LEAST_BULGE * max(*arms, math.dist(start, end))
    bulge = 0.0
    if min(arms) > least:
        points = (read_only_floats(point) for point in (start, middle, end))
        bulge = curves.through(*points)
    if abs(bulge) < LEAST_BULGE:
        raise InputError(
            "through lies on the straight line to the next point, or is an end of it; "
            "name a place on the arc, or write the point as [x, y]."
        )
    return bulge


def _rounded(outline: Outline, fields: Fields, plain: Unit) -> Outline:
    """Round corners, then cut reliefs at others."""
    for key, operation in (("fillets", Outline.fillet), ("reliefs", Outline.relieve)):
        for own in fields.tables(key, ROUNDED) if key in fields else ():
            corner = own.items("corner")
            if len(corner) != 2:
                raise own.refuse("corner", "it takes the names of the two sides.")
            first, second = (_side(outline, *item) for item in corner)
            radius = own.length("radius", plain)
            name = own.word("name") if "name" in own else None
            with within(own.where):
                outline = operation(outline, first, second, radius=radius, name=name)
    return outline


def _parted(outline: Outline, fields: Fields, plain: Unit) -> Outline:
    """Make parts of sides into sides of their own."""
    for own in fields.tables("parts", PART) if "parts" in fields else ():
        side = _side(outline, own.place("side"), own.value("side"))
        name, ends = own.word("name"), [own.value("from"), own.value("to")]
        with within(own.where):
            if all(isinstance(end, list) for end in ends):
                between = own.pair("from", plain), own.pair("to", plain)
                outline = outline.part(side, name=name, between=between)
                continue
        shares = []
        for key, end in zip(("from", "to"), ends, strict=True):
            with within(own.place(key)):
                if isinstance(end, list):
                    raise InputError("from and to are two shares or two places.")
                shares.append(fraction(end))
        with within(own.where):
            outline = outline.part(side, name=name, fractions=(shares[0], shares[1]))
    return outline


def _side(outline: Outline, place: str, name: Any) -> str:
    """Check the name of a side."""
    sides = outline.side_names
    if not isinstance(name, str) or name not in sides:
        hint = closest(name, sides) if isinstance(name, str) else ""
        raise InputError(
            f"{place}: there is no such side; the sides are {some(sides)}.{hint}"
        )
    return name


def _compare(outline: Outline, fields: Fields, plain: Unit) -> None:
    """Refuse a panel that is not the one that the file expects."""
    if "expect" not in fields:
        return
    own = Fields(
        where="[outline] expect", table=fields.value("expect"), examples=EXPECT
    )
    x0, y0, x1, y1 = outline.box
    size, holes = (x1 - x0, y1 - y0), len(outline.holes)
    found = " x ".join(f"{reach / plain.size:.6g}" for reach in size)
    if "size" in own:
        with within(own.place("size")):
            wanted = two_lengths(own.word("size"))
            if wanted is None:
                raise InputError(f"it must be two lengths, {EXPECT['size']}.")
            if not all(map(_agrees, size, wanted, (SIZE_AGREES, SIZE_AGREES))):
                raise InputError(f"the panel is {found} {plain.symbol}.")
    if "holes" in own:
        count = own.value("holes")
        if isinstance(count, bool) or not isinstance(count, int):
            raise own.refuse("holes", "it must be a whole number, without quotes.")
        if count != holes:
            raise own.refuse("holes", f"the panel has {holes}.")
    if "area" in own and not _agrees(
        outline.area, own.positive("area", "area"), AREA_AGREES
    ):
        raise own.refuse("area", f"the panel has {outline.area:.6g} m^2.")


def _agrees(found: float, wanted: float, within_share: float) -> bool:
    return abs(found - wanted) <= within_share * wanted
