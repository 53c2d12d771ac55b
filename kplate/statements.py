"""Materials, zones, supports and limits of a panel file, in SI units.

Every quantity is text with its unit. A field of a later version is refused by its name.
"""

import re
from collections.abc import Mapping, Sequence
from typing import Any, cast

from kplate.errors import InputError
from kplate.fields import Fields, closest, numbered, refuse_later, shown, some, within
from kplate.limits import (
    CRITERIA,
    Criterion,
    DeflectionLimit,
    Limit,
    ReactionLimit,
    StressLimit,
)
from kplate.materials import STOCK, Isotropic
from kplate.outline import Outline
from kplate.plate import Section
from kplate.quantities import positive, stated_unit
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
# The fields of a [[zone]] that say what it is made of; the rest says where it is.
SECTION = {"thickness": '"20 mm"', "material": '"steel S355"'}
LIMITS = {
    "deflection": '{ span = "600 mm", at_most = "span/200" }',
    "stress": '{ criterion = "von Mises", strength = "235 MPa", factor = 1.5 }',
    "hold_down": '"200 N"',
    "stock": '["6 mm", "8 mm", "10 mm"]',
}
DEFLECTION = {"span": '"600 mm"', "at_most": '"span/200"'}
STRESS = {"criterion": '"von Mises"', "strength": '"235 MPa"', "factor": "1.5"}

# What the panel file is to hold one day.
LATER_SIDES = ("bedding",)
LATER_SUPPORTS = ("springs",)
LATER_LIMITS = ("frequency",)

_SHARE = re.compile(r"span ?/ ?([0-9]{1,6}(?:\.[0-9]{1,6})?)")


def read_material(section: Fields) -> Isotropic:
    """Material of a section: one from stock by its name, or a table of its own."""
    stated = section.value("material")
    if not isinstance(stated, Mapping):
        return STOCK[section.choice("material", STOCK)]
    fields = Fields(where=f"{section.where} material", table=stated, examples=MATERIAL)
    density = fields.positive("density", "density") if "density" in fields else None
    name, nu = fields.word("name"), fields.number("nu")
    E = fields.positive("E", "stress")
    source = fields.word("source", default="")
    with within(section.where):
        return Isotropic(name=name, E=E, nu=nu, density=density, source=source)


def read_zones(tables: Sequence[Mapping[str, Any]]) -> dict[str, Section]:
    """What zones are made of, by their names, which the outline has checked."""
    sections = {}
    for i, table in enumerate(tables, 1):
        own = {key: table[key] for key in SECTION if key in table}
        where = numbered("[[zone]]", i, table)
        fields = Fields(where=where, table=own, examples=SECTION)
        sections[table["name"]] = Section(
            thickness=(
                fields.positive("thickness", "length") if "thickness" in own else None
            ),
            material=read_material(fields) if "material" in own else None,
        )
    return sections


def read_supports(table: Mapping[str, Any], outline: Outline) -> dict[str, Support]:
    """How each side, seam and mark that is named is held."""
    names = outline.names
    refuse_later("[supports]", table, set(LATER_SIDES).difference(names))
    supports = {}
    for name, word in table.items():
        place = f"[supports] {shown(name)} = {shown(word)}"
        if name not in names:
            raise InputError(
                f"{place}: there is no such side, seam or mark; the names are "
                f"{some(names)}.{closest(name, names)}"
            )
        if isinstance(word, Mapping) or word in LATER_SUPPORTS:
            raise InputError(
                f"{place}: such a support is not read by this version; use one "
                f"of {', '.join(SUPPORTS)}."
            )
        if not isinstance(word, str) or word not in SUPPORTS:
            hint = closest(word, SUPPORTS) if isinstance(word, str) else ""
            raise InputError(f"{place}: it must be one of {', '.join(SUPPORTS)}.{hint}")
        supports[name] = SUPPORTS[word]
    return supports


def read_limits(
    table: Mapping[str, Any],
) -> tuple[tuple[Limit, ...], tuple[float, ...], Unit | None]:
    """Limits, the stock thicknesses in m, and the unit in which strength is stated."""
    refuse_later("[limits]", table, LATER_LIMITS)
    fields = Fields(where="[limits]", table=table, examples=LIMITS)
    limits: list[Limit] = []
    shown_in = None
    if "deflection" in fields:
        limits.append(_deflection(fields))
    if "stress" in fields:
        stress, shown_in = _stress(fields)
        limits.append(stress)
    if "hold_down" in fields:
        most = fields.positive("hold_down", "force")
        limits += [
            ReactionLimit(at="corners", sense="hold-down", at_most=most),
            ReactionLimit(at="points", sense="hold-down", at_most=most),
        ]
    stock = []
    for place, item in fields.items("stock") if "stock" in fields else ():
        with within(place):
            stock.append(positive(item, "length"))
    return tuple(limits), tuple(stock), shown_in


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
